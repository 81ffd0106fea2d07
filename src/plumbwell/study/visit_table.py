"""Visits and drift lines as the Drift stage shows them: what each visit reads with its station's gravity taken out.

Nothing is estimated here: levels, residuals and lines are read off the adjusted network.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment, visit_means
from plumbwell.reduction.design import DriftUnknown
from plumbwell.study.results import Results
from plumbwell.survey.column import Array, Index
from plumbwell.survey.instrument import Tare

CHECKED = 1e-9  # of a visit's variance; below that nothing checks it
LINE_PLACES = 97


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class VisitTable:
    """The visits, (v,) each, in the order of `Visits`.

    Parameters
    ----------
    time : array
        Weighted mean time of its used readings, UTC, s since 2000-01-01.
    count : int array
        Used readings.
    level, level_sd : array, m/s2
        Mean of the corrected readings less run bias and station gravity: drift and tares, and what is left; its
        sd by reading and re-seating noise.
    residual, residual_sd : array, m/s2
        What drift leaves of it; the sd is NaN where no other visit checks this one.
    repeated : bool array
        True where the station has another visit.
    """

    time: Array
    count: Index
    level: Array
    level_sd: Array
    residual: Array
    residual_sd: Array
    repeated: NDArray[np.bool_]


def visit_table(results: Results) -> VisitTable:
    """The visits of a reduction with their levels and residuals."""
    network = results.network
    visits, fit = network.visits, network.adjustment
    solution = fit.solution
    share, rows = fit.noise.weight, visits.rows
    residual = solution.residual[:, 0]
    drift = visit_means(share, results.readings.estimates.drift.values[rows], visits.start)
    variance = 1.0 / solution.weight
    left = variance - solution.variance_of_fit()
    checked = left > CHECKED * variance
    counts = np.bincount(visits.station, minlength=len(results.stations))
    # Times are taken from the first reading, for a weighted mean of seconds since 2000 would lose its microseconds.
    since = results.readings.utc.values[rows] - np.repeat(visits.first, np.diff(visits.start))
    return VisitTable(
        time=visits.first + visit_means(share, since, visits.start),
        count=np.diff(visits.start),
        level=drift + residual,
        level_sd=np.sqrt(variance),
        residual=residual,
        residual_sd=np.where(checked, np.sqrt(np.where(checked, left, 0.0)), np.nan),
        repeated=counts[visits.station] > 1,
    )


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class DriftLine:
    """The drift of one run at a row of times, tares in it.

    Parameters
    ----------
    run : int
        Code of the run.
    time : (n,) array
        UTC, s since 2000-01-01, rising; a tare has a place just before and one at its time.
    drift, sd : (n,) arrays, m/s2
        Drift and tares, run bias left out; sd of the run's line against the gravity of the stations.
    rate, rate_sd : float
        Mean drift rate over the run, m/s3, and its sd; the sd NaN where the rate is held.
    """

    run: int
    time: Array
    drift: Array
    sd: Array
    rate: float
    rate_sd: float


def drift_lines(results: Results) -> tuple[DriftLine, ...]:
    """The drift lines of the runs with used readings, in time order."""
    fit, visits = results.network.adjustment, results.network.visits
    return tuple(_line(results, fit, int(run)) for run in visits.run_order.tolist())


def _line(results: Results, fit: Adjustment, run: int) -> DriftLine:
    basis, shift = fit.basis, results.network.gravity.tare_shift
    start = float(basis.start[run])
    length = float(results.network.visits.run_length[run])
    jumps = [number for number in range(len(basis.tares)) if int(basis.tare_run[number]) == run]
    breaks = [at for number in jumps for at in (basis.tares[number].time - 1e-3, basis.tares[number].time)]
    time = np.unique(np.concatenate([np.linspace(start, start + length, LINE_PLACES), breaks]))
    past = (time - start) / float(basis.length[run])
    unknowns = fit.design.unknowns
    terms = np.zeros((len(unknowns), len(time)))
    drift = np.zeros(len(time))
    for number, what in enumerate(unknowns):
        if what.run != run:
            continue
        if what.kind == "tare":
            terms[number] = time >= basis.tares[what.tare].time
        else:
            terms[number] = past**what.power if what.kind == "drift" else 1.0
        if what.kind != "bias":
            drift = drift + float(fit.solution.unknown[number, 0]) * terms[number]
    if fit.orders[run] == 0:
        drift = drift + float(basis.rate[run]) * (time - start)
    for number in jumps:
        after = time >= basis.tares[number].time
        held = basis.tares[number]
        fixed = held.size if held.size is not None and held.size_sd is None else 0.0
        drift = drift + np.where(after, fixed + float(shift[number]), 0.0)
    variance = np.einsum("qn,qr,rn->n", terms, fit.solution.border, terms)
    rate, rate_sd = _mean_rate(fit, run)
    return DriftLine(run=run, time=time, drift=drift, sd=np.sqrt(np.maximum(variance, 0.0)), rate=rate, rate_sd=rate_sd)


def _mean_rate(fit: Adjustment, run: int) -> tuple[float, float]:
    """Mean rate of a run's polynomial over the run, and its sd: the powers add, for scaled time ends at 1."""
    length = float(fit.basis.length[run])
    members = [n for n, what in enumerate(fit.design.unknowns) if what.kind == "drift" and what.run == run]
    if not members:
        return float(fit.basis.rate[run]), float("nan")
    rate = float(np.sum(fit.solution.unknown[members, 0])) / length
    return rate, float(np.sqrt(np.sum(fit.solution.border[np.ix_(members, members)]))) / length


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TareInForce:
    """A tare that was taken out: run code, the tare as listed, its size and sd (None where it is held), m/s2."""

    run: int
    tare: Tare
    size: float
    sd: float | None


def tares_in_force(results: Results) -> tuple[TareInForce, ...]:
    """The tares that were taken out, in time order."""
    fit, shift = results.network.adjustment, results.network.gravity.tare_shift
    basis = fit.basis
    found = []
    for number in sorted(range(len(basis.tares)), key=lambda one: (basis.tares[one].time, one)):
        tare, run = basis.tares[number], int(basis.tare_run[number])
        unknown = DriftUnknown(kind="tare", run=run, tare=number)
        if tare.size is not None and tare.size_sd is None:
            found.append(TareInForce(run=run, tare=tare, size=tare.size, sd=None))
            continue
        size, sd = fit.unknown(unknown)
        known = unknown in fit.design.unknowns
        found.append(TareInForce(run=run, tare=tare, size=size + float(shift[number]), sd=sd if known else None))
    return tuple(found)


def correlations(results: Results, chosen: int, reach: int) -> tuple[tuple[int, ...], Array]:
    """Intervals about a chosen one, and the correlations of their densities' independent errors.

    Parameters
    ----------
    results : Results
    chosen : int
        Row of the interval.
    reach : int
        Neighbours to each side.

    Returns
    -------
    tuple of int, (m, m) array
        Rows of the intervals from the top down; 0 where a density has no sd.
    """
    errors = results.intervals.errors.independent
    rows = list(range(max(chosen - reach, 0), min(chosen + reach + 1, len(results.intervals))))
    at = np.array(rows, dtype=np.intp)
    columns = errors.columns[at]
    matrix = (columns * errors.signs) @ columns.T + np.diag(errors.diagonal[at])
    for first, row in enumerate(rows):
        follower = int(errors.follower[row])
        if follower in rows:
            second = rows.index(follower)
            matrix[first, second] += errors.neighbour[row]
            matrix[second, first] += errors.neighbour[row]
    sd = np.sqrt(np.maximum(np.diag(matrix), 0.0))
    scale = np.outer(sd, sd)
    return tuple(rows), np.where(scale > 0.0, matrix / np.where(scale > 0.0, scale, 1.0), 0.0)
