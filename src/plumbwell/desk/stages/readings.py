"""The Readings stage: every raw row with its corrections, and the reading against time by run."""

from __future__ import annotations

import numpy as np

from plumbwell.desk.ledger.table import TEXT, TIME, LedgerColumn, LedgerTable
from plumbwell.desk.shown import READING, Shown
from plumbwell.desk.stages.columns import counted_rows, depth_column, has_any, marks_of, table_column
from plumbwell.files.survey_copy import told_notes
from plumbwell.plates.depth_scale import DepthScale
from plumbwell.study.case import Case
from plumbwell.study.overlay import laid_over
from plumbwell.survey.column import Array, Labels
from plumbwell.survey.survey import Survey

KNOWN = {
    "time", "run", "instrument", "station", "visit", "depth", "reading", "reading_sd", "tide_in_reading",
    "sensor_offset", "use", "note",
}
RARE = ("tilt", "pressure_effect", "to_station")
"""Corrections that stand in the ledger only where there are any."""

MILLIGAL = 1e-5


def _texts(labels: Labels) -> tuple[str, ...]:
    names = (*(name or "" for name in labels.names), "")  # the last for code -1, no label
    return tuple(map(names.__getitem__, labels.code.tolist()))


def _raw_columns(survey: Survey) -> list[LedgerColumn]:
    """Columns of the file that the program does not read, as written."""
    raw = survey.readings.raw
    found = []
    for heading, cells in zip(raw.headings, raw.cells, strict=True):
        name = heading.partition("[")[0].strip()
        if name.lower() not in KNOWN:
            found.append(
                LedgerColumn(
                    key=f"raw {name}", name=name, unit=heading[len(name) :].strip(" []"), heading=heading,
                    values=cells, kind=TEXT, what="as written in the file", shown=False,
                )
            )
    return found


def _own_depths(survey: Survey, scale: DepthScale) -> Array:
    return np.asarray(survey.readings.depth.values) / scale.factor


def _measured(survey: Survey, scale: DepthScale) -> list[LedgerColumn]:
    """What the file gives, row by row; it is there before anything is reduced."""
    readings = survey.readings
    in_counts = readings.in_counts
    factor, unit = (1.0, "counts") if in_counts else (MILLIGAL, "mGal")
    columns = [
        LedgerColumn(
            key="time", name="time", unit="UTC", heading="time", values=readings.time.values, kind=TIME,
            what="as the instrument's clock gave it, brought to UTC",
        ),
        LedgerColumn(key="run", name="run", heading="run", values=_texts(readings.run), kind=TEXT, narrow=False),
        LedgerColumn(key="station", name="station", heading="station", values=_texts(readings.station), kind=TEXT),
        depth_column(
            "depth", "depth", _own_depths(survey, scale), unit=scale.unit, label="MD",
            what="measured depth as written",
        ),
        LedgerColumn(
            key="reading", name="reading", unit=unit, heading=f"reading [{unit}]",
            values=np.asarray(readings.reading.values) / factor, decimals=3, what="as written in the file",
        ),
    ]
    if not has_any(readings.depth.values):
        columns.pop(3)
    if (readings.station.code < 0).all():
        columns.pop(2)
    if len(readings.instrument.names) > 1:
        columns.insert(2, LedgerColumn(
            key="instrument", name="instrument", heading="instrument", values=_texts(readings.instrument), kind=TEXT,
        ))
    if readings.reading_sd is not None:
        columns.append(LedgerColumn(
            key="reading_sd", name="stated sd", unit="µGal", heading="reading_sd [uGal]",
            values=readings.reading_sd.values / MILLIGAL * 1e3, decimals=1, what="its stated sd", shown=False,
        ))
    return columns


def _worked(shown: Shown) -> list[LedgerColumn]:
    """Corrections, drift and what is left, from the reduction."""
    results = shown.results
    table = "readings_reduced"
    rare = [
        table_column(results, table, name, title=title, decimals=4, signed=True, microgal=False)
        for name, title in zip(RARE, ("tilt", "pressure", "to station"), strict=True)
    ]
    columns = [
        table_column(results, table, "calibrated", title="calibrated", decimals=3, shown=False),
        table_column(results, table, "tide", title="tide", decimals=3, signed=True),
        table_column(results, table, "drift", title="drift", microgal=True, decimals=1, signed=True),
        table_column(
            results, table, "visit_effect", title="visit", microgal=True, decimals=1, signed=True, shown=False
        ),
        table_column(results, table, "residual", title="residual", microgal=True, decimals=1, signed=True),
        table_column(
            results, table, "standardised_residual", title="ratio", unit="to sd", decimals=1, signed=True,
            amber_from=3.0,
        ),
        *(one for one in rare if has_any(np.asarray(one.values, dtype=float))),
        table_column(results, table, "redundancy", title="checked", unit="0 to 1", decimals=2, shown=False),
    ]
    return columns


def readings_table(case: Case, shown: Shown | None, scale: DepthScale) -> LedgerTable:
    """The ledger of all readings; before anything is reduced with what the file gives alone.

    Parameters
    ----------
    case : Case
    shown : Shown or None
        None: nothing is reduced yet.
    scale : DepthScale
    """
    survey = laid_over(case.survey, case.overlay) if shown is None else shown.results.survey
    readings, n = survey.readings, len(survey.readings)
    reasons = {one.row: one.reason for one in case.overlay.rows}
    noted = {one.row for one in case.overlay.notes}
    marks: list[str | None] = [None] * n
    hints = [""] * n
    if shown is not None:
        marks, hints = marks_of(shown.results.findings, "rows", n)
    for row in {*reasons, *noted}:
        marks[row] = "changed"
        hints[row] = f"{hints[row]}\n{reasons.get(row, readings.note[row])}".strip()
    for row in np.flatnonzero(~readings.use).tolist():
        marks[row] = "excluded"
        hints[row] = reasons.get(row) or readings.note[row] or "left out by the folder (use=no)"
    told = told_notes(case)
    notes = tuple(told.get(row, text) for row, text in enumerate(readings.note))
    columns = [*_measured(survey, scale), *([] if shown is None else _worked(shown))]
    columns.append(
        LedgerColumn(
            key="note", name="note", heading="note", values=notes, kind=TEXT, italic=True, narrow=False,
            what="note, and why a row was taken out or in", shown=any(notes),
        )
    )
    if shown is None:
        depth = np.full(n, np.nan)
    else:
        station = shown.station_of_row
        at = np.maximum(station, 0)
        placed = (station >= 0) & shown.depths.column[at]
        depth = np.where(placed, shown.depths.stations[at], np.nan)
    return LedgerTable(
        stage="readings",
        level=READING,
        numbers=counted_rows(n),
        number_unit="row",
        columns=(*columns, *_raw_columns(survey)),
        marks=tuple(marks),
        hints=tuple(hints),
        excluded=~readings.use,
        top=depth,
        base=depth,
        density=np.full(n, np.nan),
    )
