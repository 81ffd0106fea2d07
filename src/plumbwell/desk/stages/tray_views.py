"""What the small pages of the tray show: how a visit settled, and how neighbouring densities hang together."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from plumbwell.desk.selection import Selection
from plumbwell.desk.shown import VISIT, Shown
from plumbwell.desk.tray.covariance_view import CovarianceView
from plumbwell.plates.numbers import number
from plumbwell.plates.settle_plot import SettlePlot
from plumbwell.study.finding import Finding
from plumbwell.study.visit_table import correlations
from plumbwell.survey.column import Array

MICROGAL = 1e-8
NEIGHBOURS = 4


def counted_findings(findings: Sequence[Finding]) -> str:
    """How many findings want an eye, as it stands after the name of the docket; notes where there are only those."""
    graver = sum(one.severity != "note" for one in findings)
    return str(graver) if graver else f"{len(findings)} notes" if len(findings) > 1 else "1 note" if findings else ""


def settled_visit(shown: Shown, selection: Selection) -> int | None:
    """The visit whose settling is shown: that of the first chosen row."""
    if not selection.rows:
        return None
    visits = shown.converted(selection.level, selection.rows[:1], VISIT)
    return visits[0] if visits else None


def rows_of_visit(shown: Shown, visit: int) -> tuple[int, ...]:
    """The readings of a visit, and those left out while the instrument stood there, by time."""
    network, utc = shown.results.network.visits, shown.results.readings.utc.values
    own = np.flatnonzero(network.of_row == visit)
    readings, station = shown.results.survey.readings, shown.station_of_row
    between = (
        (network.of_row < 0)
        & (readings.run.code == network.run[visit])
        & (station == network.station[visit])
        & (np.abs(utc - (network.first[visit] + network.last[visit]) / 2) <= _reach(shown, visit))
    )
    rows = np.concatenate([own, np.flatnonzero(between)])
    return tuple(rows[np.argsort(utc[rows], kind="stable")].tolist())


def _reach(shown: Shown, visit: int) -> float:
    """Seconds about a visit's middle in which a row that is left out belongs to it."""
    network = shown.results.network.visits
    return float(network.last[visit] - network.first[visit]) / 2 + shown.results.recipe.visit_gap


def settle_view(shown: Shown, visit: int | None) -> SettlePlot | None:
    """The settle-down plot of a visit; None for none."""
    if visit is None:
        return None
    results = shown.results
    rows = list(rows_of_visit(shown, visit))
    readings, network = results.survey.readings, results.network
    utc = results.readings.utc.values[rows]
    observed = results.readings.observed.values[rows] - results.readings.estimates.drift.values[rows]
    used = network.visits.of_row[rows] == visit
    at = slice(int(network.visits.start[visit]), int(network.visits.start[visit + 1]))
    share = dict(zip(network.visits.rows[at].tolist(), network.adjustment.noise.weight[at].tolist(), strict=True))
    sd = dict(zip(network.visits.rows[at].tolist(), network.adjustment.noise.sd[at].tolist(), strict=True))
    mean = sum(share[row] * value for row, value in zip(rows, observed.tolist(), strict=True) if row in share)
    station = int(network.visits.station[visit])
    depth = shown.depths.stations[station]
    where = f"{number(shown.scale.number_of(float(depth)), 1)} {shown.scale.unit}" if np.isfinite(depth) else ""
    settle, own = network.settling, network.visits.rows[at]
    leave_out = max(int(settle.leave_out[visit]), 0)
    times = (results.readings.utc.values[own] - utc[0]) / 60.0
    codes = np.argsort(_first_times(shown), kind="stable").tolist()
    return SettlePlot(
        title=", ".join(filter(None, (f"Settle-down of visit {visit + 1}", results.stations.label[station], where))),
        unit="µGal",
        run_index=codes.index(int(readings.run.code[rows[0]])),
        minutes=((utc - utc[0]) / 60.0).tolist(),
        values=((observed - mean) / MICROGAL).tolist(),
        rows=rows,
        sds=[sd.get(row, float("nan")) / MICROGAL for row in rows],
        excluded=[not one for one in used.tolist()],
        mean_sd=float(np.sqrt(network.adjustment.noise.variance[visit])) / MICROGAL,
        leave_out=leave_out,
        cut=float(times[leave_out - 1 : leave_out + 1].mean()) if leave_out else None,
        plateau=(float(settle.plateau[visit]) - mean) / MICROGAL,
    )


def _first_times(shown: Shown) -> Array:
    """First reading of each run by code."""
    readings = shown.results.survey.readings
    first = np.full(len(readings.run.names), np.inf)
    np.minimum.at(first, readings.run.code, readings.time.values)
    return first


def neighbour_view(view: CovarianceView, shown: Shown, chosen: int) -> tuple[int, ...]:
    """Show the correlations about an interval; returns the rows that are shown."""
    rows, matrix = correlations(shown.results, chosen, NEIGHBOURS)
    intervals = [shown.plate.intervals[row] for row in rows]
    view.set_matrix(
        [str(row + 1) for row in rows],
        matrix.tolist(),
        rows.index(chosen),
        sds=[one.sd if one.sd is not None else float("nan") for one in intervals],
    )
    return rows
