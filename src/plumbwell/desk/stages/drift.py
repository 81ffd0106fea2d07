"""The Drift stage: visits with their station's gravity taken out, against the drift of their run."""

from __future__ import annotations

import numpy as np

from plumbwell.desk.ledger.table import TEXT, TIME, LedgerColumn, LedgerTable
from plumbwell.desk.shown import VISIT, Shown
from plumbwell.desk.stages.columns import counted_rows, depth_column
from plumbwell.study.finding import SEVERITIES

MICROGAL = 1e-8


def _changed_visits(shown: Shown) -> set[int]:
    """Visits of which a reading was taken out or in by hand: of its run and station the nearest in time."""
    results, visits = shown.results, shown.results.network.visits
    readings, placement = results.survey.readings, results.stations.located.placement
    found = set()
    for row in {one.row for one in shown.case.overlay.rows}:
        same = (visits.run == readings.run.code[row]) & (visits.station == placement.station[row])
        if same.any():
            away = np.where(same, np.abs(shown.visits.time - readings.time.values[row]), np.inf)
            found.add(int(np.argmin(away)))
    return found


def drift_table(shown: Shown) -> LedgerTable:
    """The ledger of visits."""
    results = shown.results
    visits, network = shown.visits, results.network.visits
    n = len(network)
    names = results.survey.readings.run.names
    station = network.station
    labels, roles = results.stations.label, results.stations.role
    depth = shown.depths.stations[station]
    with np.errstate(invalid="ignore"):
        ratio = visits.residual / visits.residual_sd
    unchecked = np.isnan(visits.residual_sd)
    columns = [
        LedgerColumn(
            key="time", name="time", unit="UTC", heading="time", values=visits.time, kind=TIME,
            what="mean time of the visit's used readings",
        ),
        LedgerColumn(
            key="run", name="run", heading="run", values=tuple(names[code] for code in network.run.tolist()),
            kind=TEXT, shown=len(network.run_order) > 1, narrow=False,
        ),
        LedgerColumn(
            key="station", name="station", heading="station",
            values=tuple(labels[one] for one in station.tolist()), kind=TEXT,
        ),
        LedgerColumn(
            key="role", name="role", heading="role", values=tuple(roles[one] for one in station.tolist()), kind=TEXT,
            shown=False,
        ),
        depth_column(
            "depth", "depth", shown.numbers_of(depth), unit=shown.scale.unit, label=shown.scale.label,
            what="depth of the station",
        ),
        LedgerColumn(
            key="readings", name="readings", heading="readings", values=visits.count.astype(float), decimals=0,
            what="used readings of the visit", narrow=False,
        ),
        LedgerColumn(
            key="less_tide", name="less tide", unit="µGal", heading="less_tide [uGal]",
            values=visits.level / MICROGAL, decimals=1, signed=True,
            what="mean reading with its corrections, less run bias and station gravity: drift and what is left",
        ),
        LedgerColumn(
            key="residual", name="residual", unit="µGal", heading="residual [uGal]",
            values=np.where(unchecked, np.nan, visits.residual / MICROGAL),
            sds=visits.residual_sd / MICROGAL, decimals=1, signed=True,
            what="what drift leaves of it; none where no other visit checks it",
        ),
        LedgerColumn(
            key="ratio", name="ratio", unit="to sd", heading="ratio", values=ratio, decimals=1, signed=True,
            amber_from=3.0, what="residual over its sd",
        ),
    ]
    marks: list[str | None] = [None] * n
    hints = [""] * n
    for finding in results.findings:
        rows = network.of_row[np.array(finding.rows, dtype=np.intp)] if finding.rows else ()
        for visit in sorted({int(one) for one in rows if one >= 0}):
            before = marks[visit]
            if before is None or SEVERITIES.index(finding.severity) > SEVERITIES.index(before):
                marks[visit] = finding.severity
            hints[visit] = f"{hints[visit]}\n{finding.text}".strip()
    for visit in _changed_visits(shown):
        if marks[visit] is None:
            marks[visit], hints[visit] = "changed", "readings of this visit were taken out or in by hand"
    at = np.where(shown.depths.column[station], depth, np.nan)
    return LedgerTable(
        stage="drift",
        level=VISIT,
        numbers=counted_rows(n),
        number_unit="visit",
        columns=tuple(columns),
        marks=tuple(marks),
        hints=tuple(hints),
        excluded=np.zeros(n, dtype=bool),
        top=at,
        base=at,
        density=np.full(n, np.nan),
    )
