"""The tables beside the readings: places, ties, path, markers, calibration, tide and loading series."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from plumbwell.files.collected import Collected, first_rows
from plumbwell.files.known_columns import Known, Matched, match_columns, measured, refuse_unfit, texts
from plumbwell.files.readings_table import read_times
from plumbwell.files.statements import Statements
from plumbwell.files.text_table import TextTable, heading_parts
from plumbwell.reduction.positions import dogleg
from plumbwell.survey.column import Column, Index, Origin, frozen, frozen_index
from plumbwell.survey.errors import shown
from plumbwell.survey.instrument import Calibration
from plumbwell.survey.places import Markers, Path, Places, Ties, TimeSeries

PLACES = (
    Known("station", required=True),
    Known("depth", ("m",)),
    Known("east", ("m",)),
    Known("north", ("m",)),
    Known("elevation", ("m",)),
    Known("elevation_sd", ("m",)),
    Known("role"),
    Known("note"),
)
TIES = (
    Known("station", required=True),
    Known("gravity", ("m/s2",), required=True),
    Known("gravity_sd", ("m/s2",), required=True),
)
PATH = (
    Known("depth", ("m",), required=True),
    Known("inclination", ("rad",), required=True),
    Known("azimuth", ("rad",), required=True),
)
MARKERS = (
    Known("marker", required=True),
    Known("depth", ("m",), required=True),
    Known("density", ("kg/m3",)),
)
CALIBRATION = (Known("counter", ("counts",), required=True), Known("gravity", ("m/s2",), required=True))
DENSEST = 10000.0  # kg/m3
STRAIGHT_BACK = 1e-6  # rad; a bend nearer to 180 deg than this has no arc


def _complete(matched: Matched, known: tuple[Known, ...]) -> bool:
    return not matched.unusable and all(matched.has(one.name) for one in known if one.required)


def _line(table: TextTable, row: int) -> int:
    return int(table.lines[row])


def read_places(table: TextTable, collected: Collected) -> Places | None:
    """The places of places.csv; each has a depth on the path, or east, north and elevation."""
    matched = match_columns(table, PLACES, collected)
    numbers = {name: measured(matched, name, collected) for name in ("depth", "east", "north", "elevation")}
    numbers["elevation_sd"] = measured(matched, "elevation_sd", collected, least=0.0, above=True)
    if not _complete(matched, PLACES):
        return None
    names = _named(matched, "station", collected, once=True)
    roles = []
    for row, cell in enumerate(matched.cells("role")):
        role = cell.lower() or "column"
        if role not in ("column", "base"):
            collected.problem(
                table.file,
                _line(table, row),
                matched.heading("role"),
                found=f'"{shown(cell)}"',
                expected="column or base",
                mend="write base for a station outside the column of densities, else column",
            )
        roles.append(role)
    written = {
        name: np.array([cell != "" for cell in matched.cells(name)], dtype=bool)
        for name in ("depth", "east", "north", "elevation")
    }
    surveyed = written["east"].astype(int) + written["north"] + written["elevation"]
    for row in np.flatnonzero(
        ~(written["depth"] | (surveyed == 3)) | (written["depth"] & (surveyed > 0))
    ).tolist():
        station = shown(names[row])
        if written["depth"][row]:
            found = f'both a depth and a surveyed position for "{station}"'
        else:
            missing = [name for name in ("east", "north", "elevation") if not written[name][row]]
            found = (
                f'neither a depth nor all of east, north, elevation for "{station}" (no {", ".join(missing)})'
            )
        collected.problem(
            table.file,
            _line(table, row),
            None,
            found=found,
            expected="a depth [m] on the path, or east [m], north [m] and elevation [m]",
            mend="fill one of the two ways, and only one",
        )
    return Places(station=names, role=tuple(roles), note=matched.cells("note"), **numbers)


def _named(matched: Matched, name: str, collected: Collected, *, once: bool = False) -> tuple[str, ...]:
    """Labels that every row must have, each only once when asked."""
    table = matched.table
    refuse_unfit(matched, name, collected)
    seen: dict[str, int] = {}
    for row, text in enumerate(texts(matched, name)):
        line = _line(table, row)
        if text is None:
            collected.problem(
                table.file,
                line,
                matched.heading(name),
                found="an empty cell",
                expected=f"the label of a {name}",
                mend="write the label",
            )
        elif once and text in seen:
            collected.problem(
                table.file,
                line,
                matched.heading(name),
                found=f'"{shown(text)}" again (first in row {seen[text]})',
                expected=f"every {name} once",
                mend="remove one of the rows, or rename it",
            )
        else:
            seen[text] = line
    return matched.cells(name)


def read_ties(table: TextTable, collected: Collected) -> Ties | None:
    """Known gravity at stations, with its standard deviation above zero."""
    matched = match_columns(table, TIES, collected)
    gravity = measured(matched, "gravity", collected, required=True)
    sd = measured(matched, "gravity_sd", collected, required=True, least=0.0, above=True)
    if not _complete(matched, TIES):
        return None
    return Ties(station=_named(matched, "station", collected, once=True), gravity=gravity, gravity_sd=sd)


def read_path(table: TextTable, collected: Collected) -> Path | None:
    """The deviation survey of path.csv: depth strictly rising, inclination 0 to 180 deg."""
    matched = match_columns(table, PATH, collected)
    depth = measured(matched, "depth", collected, required=True)
    inclination = measured(matched, "inclination", collected, required=True)
    azimuth = measured(matched, "azimuth", collected, required=True)
    if not _complete(matched, PATH):
        return None
    _must_rise(
        table,
        matched,
        "depth",
        depth,
        collected,
        what="depth",
        mend="order the rows by depth; one row a depth",
    )
    slack = 1e-12  # rad, so that 180 deg in another unit is not refused for its last digit
    for row in np.flatnonzero((inclination.values < 0.0) | (inclination.values > np.pi + slack)).tolist():
        collected.problem(
            table.file,
            _line(table, row),
            matched.heading("inclination"),
            found=f'"{shown(matched.cells("inclination")[row])}"',
            expected="an inclination from 0 (down) through 90 (level) to 180 (up) deg",
            mend="correct the value, or check that inclination and azimuth are not exchanged",
        )
    _refuse_turns(table, depth, inclination, azimuth, collected)
    climbing = [_line(table, row) for row in np.flatnonzero(inclination.values > np.pi / 2).tolist()]
    if climbing:
        collected.note(
            "path_climbs",
            "look",
            f"{table.file}, {first_rows(climbing)}",
            "the inclination is over 90 deg: the hole climbs there",
            "nothing, if the hole was drilled upward",
        )
    turns = [
        _line(table, row)
        for row in np.flatnonzero((azimuth.values < 0) | (azimuth.values >= 2 * np.pi)).tolist()
    ]
    if turns:
        collected.note(
            "azimuth_wrapped",
            "note",
            f"{table.file}, {first_rows(turns)}",
            "azimuths outside 0 to 360 deg are taken as the same direction within it",
            "nothing",
        )
    if len(table) == 1:
        collected.note(
            "path_one_point",
            "look",
            table.file,
            "the path has one point only and is taken as straight",
            "give the whole deviation survey, if there is one",
        )
    elif depth.values[0] > 0.0:
        collected.note(
            "path_starts_below",
            "note",
            f"{table.file}, row {_line(table, 0)}",
            f"the path starts at {depth.values[0]:g} m; above, the hole is taken as vertical",
            "nothing, if it is so",
        )
    return Path(depth=depth, inclination=inclination, azimuth=azimuth)


def _refuse_turns(
    table: TextTable, depth: Column, inclination: Column, azimuth: Column, collected: Collected
) -> None:
    """Two points between which the hole turns back on itself are a problem: no one arc joins them."""
    if not all(np.isfinite(one.values).all() for one in (depth, inclination, azimuth)):
        return
    turn = dogleg(
        inclination_1=inclination.values[:-1],
        azimuth_1=azimuth.values[:-1],
        inclination_2=inclination.values[1:],
        azimuth_2=azimuth.values[1:],
    )
    for row in np.flatnonzero(turn > np.pi - STRAIGHT_BACK).tolist():
        collected.problem(
            table.file,
            _line(table, row + 1),
            None,
            found=f"a path that turns straight back between {depth.values[row]:g} and {depth.values[row + 1]:g} m",
            expected="a hole that bends by less than 180 deg from point to point",
            mend="correct inclination or azimuth, or write a point between the two",
        )


def _must_rise(
    table: TextTable,
    matched: Matched,
    name: str,
    column: Column,
    collected: Collected,
    *,
    what: str,
    mend: str,
) -> None:
    """Every value that is not above the one before is a problem."""
    for row in (np.flatnonzero(np.diff(column.values) <= 0.0) + 1).tolist():
        before, here = matched.cells(name)[row - 1], matched.cells(name)[row]
        collected.problem(
            table.file,
            _line(table, row),
            matched.heading(name),
            found=f"{shown(here)} after {shown(before)}",
            expected=f"a {what} above that of the row before",
            mend=mend,
        )


def read_markers(table: TextTable, collected: Collected) -> Markers | None:
    """Formation tops, ordered by depth; a table in another order is ordered, with a note."""
    matched = match_columns(table, MARKERS, collected)
    depth = measured(matched, "depth", collected, required=True)
    density = measured(matched, "density", collected)
    if not _complete(matched, MARKERS):
        return None
    for row in np.flatnonzero((density.values <= 0.0) | (density.values > DENSEST)).tolist():
        collected.problem(
            table.file,
            _line(table, row),
            matched.heading("density"),
            found=f'"{shown(matched.cells("density")[row])}"',
            expected="a density above 0, at most 10 g/cm3",
            mend="correct the value, or the unit in the heading",
        )
    names = _named(matched, "marker", collected)
    order = np.argsort(depth.values, kind="stable")
    if (np.diff(order) < 0).any():
        collected.note(
            "markers_ordered",
            "note",
            table.file,
            "the markers are not in order of depth and were ordered",
            "nothing, if the depths are right",
        )
        depth, density = reordered(depth, order), reordered(density, order)
        names = tuple(names[row] for row in order.tolist())
    ordered_lines = table.lines[order]
    for row in (np.flatnonzero(np.diff(depth.values) == 0.0) + 1).tolist():
        collected.problem(
            table.file,
            int(ordered_lines[row]),
            matched.heading("depth"),
            found=f"two markers at {depth.values[row]:g} m",
            expected="one marker a depth",
            mend="remove one of the two, or correct its depth",
        )
    return Markers(marker=names, depth=depth, density=density)


def reordered(column: Column, order: Index) -> Column:
    """A measured column with its rows, and their origin, in another order."""
    origin = column.origin
    if origin is not None:
        origin = Origin(
            file=origin.file,
            heading=origin.heading,
            lines=frozen_index(origin.lines[order]),
            cells=tuple(origin.cells[row] for row in order.tolist()),
        )
    return replace(column, values=frozen(column.values[order]), origin=origin)


def read_calibration(table: TextTable, collected: Collected) -> Calibration | None:
    """A calibration table: at least two rows, counter and gravity strictly rising."""
    matched = match_columns(table, CALIBRATION, collected)
    counter = measured(matched, "counter", collected, required=True)
    gravity = measured(matched, "gravity", collected, required=True)
    if not _complete(matched, CALIBRATION):
        return None
    if len(table) < 2:
        collected.problem(
            table.file,
            _line(table, 0),
            None,
            found="one row",
            expected="two rows or more",
            mend="give the whole calibration table",
        )
    for name, column in (("counter", counter), ("gravity", gravity)):
        _must_rise(
            table,
            matched,
            name,
            column,
            collected,
            what="value",
            mend="order the rows by counter value, each once; gravity must rise with it",
        )
    return Calibration(counter=counter, gravity=gravity)


def read_series(
    table: TextTable, name: str, statements: Statements, collected: Collected
) -> TimeSeries | None:
    """A series in time: times rising, at most 1 h apart, values in every row.

    Parameters
    ----------
    name : str
        "tide", or "ocean_loading", whose values may also be called "loading" or "tide".
    """
    written = _value_name(table, name)
    known = (Known("time", required=True), Known(written, ("m/s2",), required=True))
    matched = match_columns(table, known, collected)
    value = measured(matched, written, collected, required=True)
    if not _complete(matched, known):
        return None
    time = read_times(matched, statements, collected)
    _must_rise(
        table, matched, "time", time, collected, what="time", mend="order the rows by time, each time once"
    )
    for row in (np.flatnonzero(np.diff(time.values) > 3600.0 + 1e-3) + 1).tolist():
        collected.problem(
            table.file,
            _line(table, row),
            matched.heading("time"),
            found=f"a gap of {(time.values[row] - time.values[row - 1]) / 3600:.3g} h before this row",
            expected="rows at most 1 h apart",
            mend="give the series in steps of an hour or less",
        )
    return TimeSeries(time=time, value=value)


def _value_name(table: TextTable, name: str) -> str:
    """The column of values in a series; a loading table has the form of the tide table."""
    names = {heading_parts(heading)[0].casefold() for heading in table.raw.headings}
    if name == "ocean_loading":
        return next((one for one in ("tide", "ocean_loading", "loading") if one in names), "tide")
    return name
