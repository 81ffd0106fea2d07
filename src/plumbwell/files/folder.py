"""A survey folder on disk read as one frozen survey, or refused with everything that is wrong with it."""

from __future__ import annotations

import hashlib
import os
from dataclasses import replace
from pathlib import Path

import numpy as np

from plumbwell.files.collected import Collected
from plumbwell.files.log_tables import read_log
from plumbwell.files.paths import MEBIBYTE, MISSING_MEND, UnfitFile, inside, named_bytes, plain_bytes
from plumbwell.files.readings_table import read_readings
from plumbwell.files.side_tables import (
    read_calibration,
    read_markers,
    read_path,
    read_places,
    read_series,
    read_ties,
)
from plumbwell.files.statements import NamedFile, Statements
from plumbwell.files.survey_toml import FILE, read_statements
from plumbwell.files.text_table import TextTable, plain_name, read_table
from plumbwell.files.times import iso
from plumbwell.survey.errors import InputError, Problem, SurveyError, shown
from plumbwell.survey.instrument import Calibration, Instrument, Tare
from plumbwell.survey.places import Markers, Places, Ties, TimeSeries
from plumbwell.survey.readings import Readings
from plumbwell.survey.survey import InputFile, Survey

USUAL = ("places", "ties", "path", "markers", "openings", "bodies", "gradients")
LONGEST_PATH = 300  # characters of a path as typed
ROWS_ARE = {"tide": "tide values", "ocean_loading": "loading values", "path": "path points"}


def read_survey(path: str | os.PathLike[str]) -> Survey:
    """The survey that a folder holds, as measured and stated; nothing is computed or written.

    Parameters
    ----------
    path : str or path-like
        The folder, or its survey.toml.

    Returns
    -------
    Survey
        SI values with their origin; `notes` tell what is not an error, `not_applied` what the
        folder names and this version does not take into account.

    Raises
    ------
    InputError
        With all problems of the folder.
    SurveyError
        When the folder names gradients and no readings: this version reduces gravimeter readings.
    """
    folder, data = _open(path)
    collected = Collected()
    collected.files[FILE] = InputFile(name=FILE, sha256=hashlib.sha256(data).hexdigest())
    statements = read_statements(data, collected)
    if statements is None:
        raise InputError(collected.problems)
    _check_unread(folder, statements, collected)
    _tell_unnamed(folder, statements, collected)
    tables = {
        key: table
        for key, file in statements.tables.items()
        if (table := _table(folder, key, file, collected))
    }
    readings = read_readings(tables["readings"], statements, collected) if "readings" in tables else None
    places = read_places(tables["places"], collected) if "places" in tables else None
    ties = read_ties(tables["ties"], collected) if "ties" in tables else None
    track = read_path(tables["path"], collected) if "path" in tables else None
    markers = read_markers(tables["markers"], collected) if "markers" in tables else None
    series: dict[str, TimeSeries | None] = {
        key: read_series(tables[key], key, statements, collected)
        for key in ("tide", "ocean_loading")
        if key in tables
    }
    logs = [read_log(folder, log, collected) for log in statements.logs]
    instruments = _calibrated(folder, statements, readings, collected)
    if readings is not None:
        _check_stations(readings, places, "places" in statements.tables and places is None, collected)
        _check_counts(readings, instruments, statements, collected)
        _check_series(readings, instruments, statements, series, collected)
        _check_runs(readings, statements, collected)
        if "places" not in statements.tables or places is not None:
            _check_named_stations(readings, places, ties, statements, collected)
    _check_recipe(statements, markers, collected)
    if track is not None and not statements.north_stated:
        collected.note(
            "north_assumed",
            "note",
            f"{FILE}, [site] north",
            "azimuths of the path are taken as true north, the default",
            'write north = "true", or "grid" or "magnetic" with north_correction',
        )
    collected.raise_problems()
    if readings is None:
        raise SurveyError(
            "The survey folder names gradients and no readings. This version reduces gravimeter readings "
            "only: name a table of readings under [data] in survey.toml."
        )
    assert statements.site is not None
    return Survey(
        site=statements.site,
        instruments=instruments,
        runs=statements.runs,
        tares=tuple(
            Tare(run=one.run, time=one.time, size=one.size, size_sd=one.size_sd) for one in statements.tares
        ),
        readings=readings,
        places=places,
        ties=ties,
        path=track,
        markers=markers,
        logs=tuple(log for log in logs if log is not None),
        tide_table=series.get("tide"),
        loading=series.get("ocean_loading"),
        barometer_elevation=statements.barometer_elevation,
        recipe=statements.recipe,
        recipe_given=statements.recipe_given,
        not_applied=statements.not_applied,
        notes=tuple(collected.notes),
        files=tuple(collected.files.values()),
    )


def _open(path: str | os.PathLike[str]) -> tuple[Path, bytes]:
    """The resolved survey folder and the bytes of its survey.toml."""
    file = shown(path, LONGEST_PATH)
    mend = "name the folder that holds survey.toml; plumbwell new DIR writes one to start from"
    try:
        given = Path(path)
        named = given.name.lower() == FILE and not given.is_dir()
        folder = (given.parent if named else given).resolve()
        if named or folder.is_dir():
            file = FILE
            return folder, plain_bytes(inside(folder, FILE), largest=MEBIBYTE)
        found = "a file that is not survey.toml" if folder.exists() else "no such folder"
        refused = UnfitFile(found, "a survey folder", mend)
    except UnfitFile as unfit:
        refused = unfit
        if unfit.mend == MISSING_MEND:
            file = shown(given if named else given / FILE, LONGEST_PATH)
            refused.mend = f"put the file there; or {mend}"
    except (OSError, ValueError, RuntimeError):  # RuntimeError: links that lead in a circle, before Python 3.13
        refused = UnfitFile("a name that cannot be opened", "a survey folder", mend)
    problem = Problem(
        file=file,
        row=refused.row,
        column=None,
        found=refused.found,
        expected=refused.expected,
        mend=refused.mend,
    )
    raise InputError([problem])


def _check_unread(folder: Path, statements: Statements, collected: Collected) -> None:
    """Files that are named and not read must be there all the same."""
    for file in statements.unread:
        try:
            inside(folder, file.name)
        except UnfitFile as unfit:
            collected.problem(
                FILE, file.row, file.key, found=unfit.found, expected=unfit.expected, mend=unfit.mend
            )


def _tell_unnamed(folder: Path, statements: Statements, collected: Collected) -> None:
    """Tables under their usual names that lie in the folder and are not named are told: they are not read."""
    names = {file.name for file in (*statements.tables.values(), *statements.unread)}
    keys = {*statements.tables, *(file.key.rpartition(" ")[2] for file in statements.unread)}
    for key in USUAL:
        if key not in keys and f"{key}.csv" not in names and (folder / f"{key}.csv").is_file():
            collected.note(
                "table_not_named",
                "look",
                f"{key}.csv",
                f"{key}.csv lies in the folder, but [data] does not name it; it is not read",
                f'write {key} = "{key}.csv" under [data] of survey.toml, if it belongs to the survey',
            )


def _table(folder: Path, key: str, file: NamedFile, collected: Collected) -> TextTable | None:
    data = named_bytes(folder, file.name, key=file.key, row=file.row, collected=collected)
    if data is None:
        return None
    return read_table(data, file=shown(file.name), rows_are=ROWS_ARE.get(key, key), collected=collected)


def _calibrated(
    folder: Path, statements: Statements, readings: Readings | None, collected: Collected
) -> tuple[Instrument, ...]:
    """The instruments with their calibration tables; when none is described, those of the readings."""
    if not statements.instruments_written:
        names = readings.instrument.names if readings is not None else ()
        return tuple(Instrument(name=name) for name in names) or statements.instruments
    read: dict[str, Calibration | None] = {}
    for file in statements.calibrations.values():
        if file.name not in read:
            table = _table(folder, "calibration values", file, collected)
            read[file.name] = read_calibration(table, collected) if table is not None else None
    return tuple(
        replace(one, calibration=read[statements.calibrations[one.name].name])
        if one.name in statements.calibrations
        else one
        for one in statements.instruments
    )


def _check_stations(readings: Readings, places: Places | None, unread: bool, collected: Collected) -> None:
    """Rows are in use, and a used row without a depth needs a station, one that places.csv has."""
    if not readings.use.any():
        collected.problem(
            readings.raw.file,
            None,
            "use",
            found="no reading in use belongs to a station",
            expected="rows in use, each with a depth or a station",
            mend="write yes under use in the rows that count",
        )
    heading = "depth [m]" if readings.depth.origin is None else shown(readings.depth.origin.heading)
    known = set(places.station) if places is not None else set()
    alike = {plain_name(name): name for name in known}
    placed = np.array([cell != "" for cell in _cells(readings)], dtype=bool)
    for row in np.flatnonzero(readings.use & ~placed).tolist():
        station = readings.station[row]
        if station is None:
            collected.problem(
                readings.raw.file,
                int(readings.raw.lines[row]),
                heading,
                found="neither a depth nor a station",
                expected="a depth, or a station that places.csv has",
                mend="write the depth, or the station's label",
            )
        elif station not in known and not unread:
            collected.problem(
                readings.raw.file,
                int(readings.raw.lines[row]),
                heading,
                found=f'no depth for the station "{shown(station)}"'
                + ("" if places is None else ", which places.csv does not have"),
                expected="a depth, or a row of places.csv for the station",
                mend=_alike_mend(station, alike)
                or f'write the depth, or give "{shown(station)}" a row in places.csv, named under [data]',
            )
        if collected.full(readings.raw.file):
            break
    if places is not None:
        _tell_places_alike(readings, places, collected)


def _tell_places_alike(readings: Readings, places: Places, collected: Collected) -> None:
    """Stations of the readings whose labels differ from that of a place only by case or blanks are told."""
    alike = {plain_name(name): name for name in places.station}
    for name in readings.station.names:
        place = alike.get(plain_name(name), name)
        if place != name and place not in readings.station.names and name not in places.station:
            collected.note(
                "labels_alike",
                "look",
                f"{readings.raw.file}, station",
                f'the station "{shown(name)}" and the place "{shown(place)}" differ only by case or blanks and count '
                "as two",
                "write them alike, if they are the same place",
            )


def _alike_mend(name: str, alike: dict[str, str]) -> str | None:
    """How to mend a label that differs from a known one only by case or blanks; None where there is none."""
    near = alike.get(plain_name(name))
    return None if near is None else f'write "{shown(near)}", which differs only by case or blanks, if that is meant'


def _cells(readings: Readings) -> tuple[str, ...]:
    """Cells of the depth column; a cell that cannot be read is not a missing one."""
    origin = readings.depth.origin
    return origin.cells if origin is not None else ("",) * len(readings)


def _check_counts(
    readings: Readings, instruments: tuple[Instrument, ...], statements: Statements, collected: Collected
) -> None:
    """Counter readings need a calibration table and must lie within it, unless the recipe extends it."""
    by_name = {one.name: one for one in instruments}
    assert readings.reading.origin is not None
    heading, file = shown(readings.reading.origin.heading), readings.raw.file
    for code, name in enumerate(readings.instrument.names):
        calibration = by_name[name].calibration if name in by_name else None
        rows = readings.use & (readings.instrument.code == code)
        if not readings.in_counts:
            if calibration is not None:
                collected.note(
                    "calibration_unused",
                    "look",
                    f"{FILE}, [instrument.{shown(name)}] calibration",
                    "the readings are in units of gravity, so the calibration table is not used",
                    "remove the table, or give the readings in counts",
                )
            continue
        if calibration is None:
            if rows.any() and name not in statements.calibrations:
                collected.problem(
                    file,
                    None,
                    heading,
                    found=f'counter readings of "{shown(name)}", an instrument without calibration table',
                    expected="a calibration table, or readings in mGal",
                    mend=f'write calibration = "calibration.csv" under [instrument.{shown(name)}]',
                )
            continue
        table = calibration.counter.values
        if statements.recipe.out_of_table == "extend" or np.isnan(table).any():
            continue
        low, high = float(table.min()), float(table.max())
        values = readings.reading.values
        for row in np.flatnonzero(rows & ((values < low) | (values > high))).tolist():
            collected.problem(
                file,
                int(readings.raw.lines[row]),
                heading,
                found=f"the counter value {readings.reading.origin.cells[row]}",
                expected=f'{low:g} to {high:g} counts, the calibration table of "{shown(name)}"',
                mend='correct it, set use = no in the row, or write out_of_table = "extend" under [recipe]',
            )
            if collected.full(file):
                return


def _check_series(
    readings: Readings,
    instruments: tuple[Instrument, ...],
    statements: Statements,
    series: dict[str, TimeSeries | None],
    collected: Collected,
) -> None:
    """A tide or loading table spans the used readings, by the instrument's clock and by UTC."""
    ahead = {one.name: one.clock_ahead for one in instruments}
    clock = np.array([ahead.get(name, 0.0) for name in readings.instrument.names])[readings.instrument.code]
    rows = readings.use & ~np.isnan(readings.time.values)
    if statements.recipe.tide == "table" and "tide" not in statements.tables:
        collected.problem(
            FILE,
            statements.recipe_rows.get("tide"),
            "[recipe] tide",
            found='"table", and [data] names no tide table',
            expected="a tide table",
            mend='write tide = "tide.csv" under [data], or choose another tide',
        )
    if not rows.any():
        return
    times = readings.time.values[rows]
    first = min(float(times.min()), float((times - clock[rows]).min()))
    last = max(float(times.max()), float((times - clock[rows]).max()))
    for key, one in series.items():
        if one is None or not len(one.time) or np.isnan(one.time.values).any():
            continue
        if key == "tide" and statements.recipe.tide != "table":
            collected.note(
                "tide_table_unused",
                "look",
                f"{FILE}, [data] tide",
                f'the tide table is not used, because tide is "{statements.recipe.tide}"',
                'write tide = "table" under [recipe]',
            )
            continue
        start, end = float(one.time.values[0]), float(one.time.values[-1])
        if first < start or last > end:
            collected.problem(
                shown(statements.tables[key].name),
                None,
                "time",
                found=f"a series from {iso(start)} to {iso(end)}",
                expected=f"one that spans the readings, {iso(first)} to {iso(last)}",
                mend="give a longer series",
            )


def _check_runs(readings: Readings, statements: Statements, collected: Collected) -> None:
    """Tares belong to runs that were read; a described run without readings is told."""
    names = readings.run.names
    for tare in statements.tares:
        if tare.run not in names:
            collected.problem(
                FILE,
                tare.row,
                "[[tare]] run",
                found=f'"{shown(tare.run)}"',
                expected="a run of the readings: " + ", ".join(f'"{shown(name)}"' for name in names[:12]),
                mend="correct the label, or remove the tare",
            )
    for run in statements.runs:
        if run.name not in names:
            collected.note(
                "run_without_readings",
                "look",
                f"{FILE}, [[run]]",
                f'the run "{shown(run.name)}" has no readings',
                "correct the label, if it is misspelt",
            )


def _check_named_stations(
    readings: Readings, places: Places | None, ties: Ties | None, statements: Statements, collected: Collected
) -> None:
    """Stations of ties and of the datum are stations of the survey, where all its labels are written."""
    if (readings.use & (readings.station.code < 0)).any():
        return  # rows without a label may found stations whose labels are not known yet
    written = {*readings.station.names, *(places.station if places is not None else ())}
    known = written | {
        f"{name}b" for name in written
    }  # the second place of a label, where rows lie far apart
    names = ", ".join(f'"{shown(name)}"' for name in sorted(written)[:12])
    expected = f"a station of the readings or of places.csv, such as {names}"
    alike = {plain_name(name): name for name in sorted(written)}
    mend = "correct the label; case and blanks count"
    if ties is not None:
        assert ties.gravity.origin is not None
        for row, name in enumerate(ties.station):
            if name and name not in known:
                collected.problem(
                    ties.gravity.origin.file,
                    int(ties.gravity.origin.lines[row]),
                    "station",
                    found=f'"{shown(name)}"',
                    expected=expected,
                    mend=_alike_mend(name, alike) or mend,
                )
    datum = statements.recipe.datum_station
    if datum is not None and datum not in known:
        collected.problem(
            FILE,
            statements.recipe_rows.get("datum_station"),
            "[recipe] datum_station",
            found=f'"{shown(datum)}"',
            expected=expected,
            mend=_alike_mend(datum, alike) or mend,
        )


def _check_recipe(statements: Statements, markers: Markers | None, collected: Collected) -> None:
    """What the recipe asks for must be there: markers, their densities, a log."""
    recipe, named = statements.recipe, statements.tables
    if recipe.reference_density == "markers" and ("markers" not in named or _lacks_density(markers)):
        collected.problem(
            FILE,
            statements.recipe_rows.get("reference_density"),
            "[recipe] reference_density",
            found='"markers", and no marker has a density',
            expected="a table of markers with a column density [g/cm3]",
            mend="give the densities, or write a number in g/cm3",
        )
    if recipe.layer_boundaries == "markers" and "markers" not in named:
        collected.problem(
            FILE,
            statements.recipe_rows.get("layer_boundaries"),
            "[recipe] layer_boundaries",
            found='"markers", and [data] names no markers',
            expected="a table of markers",
            mend='write markers = "markers.csv" under [data], or choose other boundaries',
        )
    if recipe.reference_density == "log" and not statements.logs:
        collected.problem(
            FILE,
            statements.recipe_rows.get("reference_density"),
            "[recipe] reference_density",
            found='"log", and the survey has no log',
            expected="a density log",
            mend="name a log in [[log]], or write a number in g/cm3",
        )


def _lacks_density(markers: Markers | None) -> bool:
    return markers is not None and bool(np.isnan(markers.density.values).all())
