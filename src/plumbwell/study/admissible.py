"""What a case may hold: rows that can be used, and settings that the survey can serve.

The same things are asked of a survey folder when it is read; here they are asked before a person's act, so that
every case can be reduced, and written as a folder that can be read.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.calibration import outside_table
from plumbwell.reduction.tide_effect import utc_time
from plumbwell.study.docket.wording import listed, moment
from plumbwell.survey.column import Column, Index
from plumbwell.survey.errors import shown
from plumbwell.survey.places import TimeSeries
from plumbwell.survey.readings import Readings
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.survey import Survey

LONGEST_LABEL = 200
LONGEST_NOTE = 2000
MEASURED = (
    "time", "reading", "depth", "reading_sd", "tide_in_reading", "sensor_offset", "pressure", "tilt_x", "tilt_y",
    "temperature",
)  # fmt: skip
REQUIRED = ("time", "reading")
ABOVE_ZERO = ("reading_sd", "pressure")

_CONTROL = re.compile("[\x00-\x1f\x7f-\x9f\u2028-\u202e\u2066-\u2069\ud800-\udfff]")
# Numbers that loggers write where they have none: -999.25, 9999, 1e30 ...
_MISSING_MARK = re.compile(r"[+-]?(?:9{3,}(?:\.(?:0*|25))?|1(?:\.0*)?[eE]\+?30)")


def unfit_text(text: str, what: str, longest: int = LONGEST_LABEL) -> str | None:
    """Why a text may not stand as a label, a reason or a note, in a sentence; None when it may."""
    if _CONTROL.search(text):
        return f"{what} stands on one line, without control characters."
    if len(text) > longest:
        return f"{what} has at most {longest} characters; this one has {len(text)}."
    return None


def row_words(readings: Readings, row: int) -> str:
    """A row of the readings by its physical line: "row 17 of readings.csv"."""
    return f"row {int(readings.raw.lines[row])} of {readings.raw.file}"


def unusable(survey: Survey, recipe: Recipe, rows: Index) -> str | None:
    """Why one of some rows that are out of use cannot be used, in a sentence; None when all can.

    Parameters
    ----------
    survey : Survey
        With the overlay on it.
    recipe : Recipe
        The one in force.
    rows : (m,) int array
    """
    readings = survey.readings
    for row, why in (
        *_unreadable(readings, rows),
        *_without_instrument(survey, rows),
        *_without_place(survey, rows),
        *_unfit_labels(readings, rows),
        *_out_of_tables(survey, recipe, rows),
    ):
        words = row_words(readings, row)
        return f"{words[0].upper()}{words[1:]} cannot be used: {why}."
    return None


def _unreadable(readings: Readings, rows: Index) -> list[tuple[int, str]]:
    """Rows whose cells hold no value that can be used, with the reason."""
    found = []
    for name in MEASURED:
        column: Column | None = getattr(readings, name)
        if column is None:
            continue
        values = column.values[rows]
        heading = name if column.origin is None else shown(column.origin.heading)
        cells = None if column.origin is None else column.origin.cells
        for row in rows[np.isnan(values)].tolist():
            if cells is not None and cells[row]:
                found.append((row, f'its {heading} is "{shown(cells[row])}", which cannot be read'))
            elif name in REQUIRED:
                found.append((row, f"it has no {heading}"))
        if name in ABOVE_ZERO:
            found += [(row, f"its {heading} is not above zero") for row in rows[values <= 0.0].tolist()]
        if cells is not None and name != "time":
            found += [
                (row, f'its {heading} is "{shown(cells[row])}", the mark of a missing value')
                for row in rows[_far(column.values, readings.use, rows)].tolist()
                if _MISSING_MARK.fullmatch(cells[row])
            ]
    return found


def _far(values: NDArray[np.float64], use: NDArray[np.bool_], rows: Index) -> NDArray[np.bool_]:
    """True for those of some rows whose value lies far from all values in use."""
    others = values[use & ~np.isnan(values)]
    if not len(others):
        return np.zeros(len(rows), dtype=bool)
    low, high = float(others.min()), float(others.max())
    reach = max(high - low, 1e-3 * max(abs(low), abs(high)))
    return (values[rows] < low - reach) | (values[rows] > high + reach)


def _without_instrument(survey: Survey, rows: Index) -> list[tuple[int, str]]:
    """Rows that do not say which of several instruments gave them."""
    if len(survey.instruments) < 2:
        return []
    readings = survey.readings
    of_run = {one.name for one in survey.runs if one.instrument}
    cells = _raw_cells(readings, "instrument")
    if cells is None:
        return []
    return [
        (row, "it names no instrument, and the survey has several")
        for row in rows.tolist()
        if not (cells and cells[row]) and readings.run[row] not in of_run
    ]


def _raw_cells(readings: Readings, name: str) -> tuple[str, ...] | None:
    """The cells of a column as written; empty when the table has no such column, None without a table."""
    if not readings.raw.headings:
        return None
    for heading, cells in zip(readings.raw.headings, readings.raw.cells, strict=True):
        if heading.partition("[")[0].strip().casefold() == name:
            return cells
    return ()


def _without_place(survey: Survey, rows: Index) -> list[tuple[int, str]]:
    """Rows that have neither a depth nor a surveyed place."""
    known = set(survey.places.station) if survey.places is not None else set()
    readings = survey.readings
    return [
        (row, "it has neither a depth nor a station with a surveyed place")
        for row in rows[np.isnan(readings.depth.values[rows])].tolist()
        if readings.station[row] not in known
    ]


def _unfit_labels(readings: Readings, rows: Index) -> list[tuple[int, str]]:
    """Rows with a label that may not stand."""
    found = []
    for name in ("run", "instrument", "station", "visit"):
        column = getattr(readings, name)
        unfit = [code for code, label in enumerate(column.names) if unfit_text(label, "A label") is not None]
        if unfit:
            found += [
                (row, f'its {name} is "{shown(column[row])}", which may not stand as a label')
                for row in rows[np.isin(column.code[rows], unfit)].tolist()
            ]
    return found


def _out_of_tables(survey: Survey, recipe: Recipe, rows: Index) -> list[tuple[int, str]]:
    """Rows beyond the calibration table, the tide table or the loading series."""
    found = []
    if recipe.out_of_table == "error":
        beyond = outside_table(survey.readings, survey.instruments)
        found += [(row, "its counter value lies outside the calibration table") for row in rows[beyond[rows]].tolist()]
    for series, what in (
        (survey.tide_table if recipe.tide == "table" else None, "tide table"),
        (survey.loading, "loading series"),
    ):
        if series is not None:
            found += [(row, f"its time lies outside the {what}") for row in _outside(survey, series, rows).tolist()]
    return found


def _outside(survey: Survey, series: TimeSeries, rows: Index) -> Index:
    """Those of some rows whose time lies outside a series, by the instrument's clock or by UTC."""
    start, end = float(series.time.values[0]), float(series.time.values[-1])
    clock, utc = survey.readings.time.values[rows], utc_time(survey.readings, survey.instruments).values[rows]
    return rows[(np.minimum(clock, utc) < start) | (np.maximum(clock, utc) > end)]


def unserved(survey: Survey, recipe: Recipe) -> str | None:
    """Why a survey cannot be reduced by a recipe, in a sentence; None when it can.

    Parameters
    ----------
    survey : Survey
        With the overlay on it.
    recipe : Recipe
    """
    densities = None if survey.markers is None else survey.markers.density.values
    if recipe.reference_density == "markers" and (densities is None or np.isnan(densities).all()):
        return 'The reference density cannot be "markers": no marker has a density.'
    if recipe.reference_density == "log" and not survey.logs:
        return 'The reference density cannot be "log": the survey has no density log.'
    if recipe.layer_boundaries == "markers" and survey.markers is None:
        return 'The layer boundaries cannot be "markers": the survey has no markers.'
    if recipe.tide == "table" and survey.tide_table is None:
        return 'The tide cannot be "table": the survey has no tide table.'
    if (why := _unknown_datum(survey, recipe.datum_station)) is not None:
        return why
    used = np.flatnonzero(survey.readings.use)
    if recipe.tide == "table" and survey.tide_table is not None:
        beyond = _outside(survey, survey.tide_table, used)
        if len(beyond):
            series = survey.tide_table.time.values
            return (
                f'The tide cannot be "table": the table goes from {moment(series[0])} to {moment(series[-1])}, '
                f"which leaves out {row_words(survey.readings, int(beyond[0]))}."
            )
    if recipe.out_of_table == "error":
        beyond = used[outside_table(survey.readings, survey.instruments)[used]]
        if len(beyond):
            return (
                'A counter outside the table cannot be an "error": '
                f"{row_words(survey.readings, int(beyond[0]))} is in use and lies outside."
            )
    return None


def _unknown_datum(survey: Survey, datum: str | None) -> str | None:
    """Why a label cannot be the datum station, where all stations have written labels; None when it can."""
    if datum is None:
        return None
    if (why := unfit_text(datum, "The label of a station")) is not None:
        return why
    readings = survey.readings
    if (readings.use & (readings.station.code < 0)).any():
        return None  # rows without a label may found stations whose labels are not known yet
    written = {*readings.station.names, *(survey.places.station if survey.places is not None else ())}
    if datum in written or datum.removesuffix("b") in written:
        return None
    names = listed([f'"{shown(name)}"' for name in sorted(written)])
    return f'There is no station "{shown(datum)}"; the survey has {names}.'
