"""Visits and drift lines as the Drift stage shows them: what each visit reads with its station's gravity taken out.

Nothing is estimated here: levels, residuals and lines are read off the adjusted network.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.design import at_times
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.reduction.network import on_border
from plumbwell.reduction.rank_lost import UNTOUCHED
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


def visit_redundancy(results: Results) -> Array:
    """Share of each visit's mean that other visits check, (v,), 0 to 1: the variance of its residual over its own."""
    table = visit_table(results)
    return np.where(np.isnan(table.residual_sd), 0.0, (table.residual_sd / table.level_sd) ** 2)


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
        Drift and tares, run bias left out, NaN where the readings do not tell it; and the sd of the line among its own
        visits (see Notes).
    rate, rate_sd : float
        Mean drift rate over the run, m/s3, and its sd; the sd NaN where the rate is held.

    Notes
    -----
    The sd is that of bias + drift + tares at each time plus the mean gravity of the stations that are read again or
    tied, weighted as the run's visits there are. It is the band that a line fitted through points has: narrowest amid
    those visits, where it is one over the root of their summed weights, and wider towards the ends. The sd of drift
    alone would be 0 at the run's first reading, for drift counts from there, and the sd of bias + drift alone would
    be that of the datum, which no visit of the run shows. Visits of stations that are read once tell nothing of drift
    and do not narrow the band. Between tares each stretch is taken among its own visits: how far the stretches are
    apart is told by the sd of the tare.
    """

    run: int
    time: Array
    drift: Array
    sd: Array
    rate: float
    rate_sd: float


def drift_lines(results: Results, table: VisitTable | None = None) -> tuple[DriftLine, ...]:
    """The drift lines of the runs with used readings, in time order.

    Parameters
    ----------
    results : Results
    table : VisitTable or None
        The visits of the very same results; None: they are worked out.
    """
    visits = visit_table(results) if table is None else table
    telling = visits.repeated | np.isfinite(visits.residual_sd)
    return tuple(_line(results, telling, int(run)) for run in results.network.visits.run_order.tolist())


def _line(results: Results, telling: NDArray[np.bool_], run: int) -> DriftLine:
    fit, shift = results.network.adjustment, results.network.gravity.tare_shift
    basis = fit.basis
    start = float(basis.start[run])
    length = float(results.network.visits.run_length[run])
    jumps = [number for number in range(len(basis.tares)) if int(basis.tare_run[number]) == run]
    breaks = [at for number in jumps for at in (basis.tares[number].time - 1e-3, basis.tares[number].time)]
    time = np.unique(np.concatenate([np.linspace(start, start + length, LINE_PLACES), breaks]))
    unknowns = fit.design.unknowns
    past = (time - start) / float(basis.length[run])
    terms = np.zeros((len(unknowns), len(time)))
    own = fit.design.of_run[run]
    own_terms = at_times(basis, fit.design, np.full(len(time), run), time)
    terms[own[own >= 0]] = own_terms[:, own >= 0].T
    is_drift = np.array([what.kind != "bias" for what in unknowns], dtype=float)
    drift = (fit.solution.unknown[:, 0] * is_drift) @ terms
    if fit.orders[run] == 0:
        drift = drift + float(basis.rate[run]) * (time - start)
    for number in jumps:
        after = time >= basis.tares[number].time
        held = basis.tares[number]
        fixed = held.size if held.size is not None and held.size_sd is None else 0.0
        drift = drift + np.where(after, fixed + float(shift[number]), 0.0)
    drift = np.where(_left_open(results, run, time, past), np.nan, drift)
    variance = np.zeros(len(time))
    edges = [-np.inf, *sorted(basis.tares[number].time for number in jumps), np.inf]
    for first, last in zip(edges[:-1], edges[1:], strict=True):
        inside = (time >= first) & (time < last)
        variance[inside] = _variance_among(fit, _visits_between(fit, telling, run, first, last), terms[:, inside])
    rate, rate_sd = _mean_rate(fit, run)
    return DriftLine(run=run, time=time, drift=drift, sd=np.sqrt(np.maximum(variance, 0.0)), rate=rate, rate_sd=rate_sd)


def _left_open(results: Results, run: int, time: Array, past: Array) -> NDArray[np.bool_]:
    """True for the times at which the readings do not tell a run's drift, (n,)."""
    found, tares = results.network.open, results.network.adjustment.basis.tares
    moved = np.zeros((len(time), found.border.shape[1]))
    for number, what in enumerate(found.unknowns):
        if what.run == run and what.kind != "bias":
            shape = time >= tares[what.tare].time if what.kind == "tare" else past**what.power
            moved += shape[:, None] * found.border[number]
    return np.any(np.abs(moved) > UNTOUCHED, axis=1)


def _visits_between(fit: Adjustment, telling: NDArray[np.bool_], run: int, first: float, last: float) -> Index:
    """Visits of a run with a used reading from one time to another: those that tell of drift, or else all."""
    visits = fit.visits
    members = np.flatnonzero(visits.run == run)
    pieces = [visits.rows[visits.start[one] : visits.start[one + 1]] for one in members.tolist()]
    utc = fit.basis.utc[np.concatenate(pieces)]
    visit = np.repeat(members, [len(piece) for piece in pieces])
    own = np.unique(visit[(utc >= first) & (utc < last)])
    if not own.size:
        own = members
    return own[telling[own]] if telling[own].any() else own


def _variance_among(fit: Adjustment, members: Index, terms: Array) -> Array:
    """Variance of border terms (q, n) and the mean gravity of the stations of some visits together, (n,)."""
    solution = fit.solution
    weight = solution.weight[members]
    at, where = np.unique(fit.visits.station[members], return_inverse=True)
    share = np.bincount(where, weight) / weight.sum()
    level = np.zeros(fit.design.n_stations)
    level[at] = share
    # Gravity of a station is that of its visits less what the border puts on them, or stands in the border itself.
    off = terms + on_border(fit.design, solution.border, level)[:, None]
    eliminated = fit.design.in_border[at] < 0
    own = np.where(eliminated, share**2 / solution.border.total[at], 0.0)
    return float(np.sum(own)) + np.sum(off * solution.factor.solve(off), axis=0)


def _mean_rate(fit: Adjustment, run: int) -> tuple[float, float]:
    """Mean rate of a run's polynomial over the run, and its sd: the powers add, for scaled time ends at 1."""
    if fit.orders[run] == 0:
        return float(fit.basis.rate[run]), float("nan")
    length = float(fit.basis.length[run])
    members = np.array(
        [n for n in fit.design.of_run[run].tolist() if n >= 0 and fit.design.unknowns[n].kind == "drift"],
        dtype=np.intp,
    )
    if not members.size:  # nothing determines it: it was held at 0
        return 0.0, float("nan")
    rate = float(np.sum(fit.solution.unknown[members, 0])) / length
    place = fit.design.layout.place(members[:, None], members[None, :])
    return rate, float(np.sqrt(np.sum(fit.solution.factor.inverse[place]))) / length


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TareInForce:
    """A tare that was taken out.

    Parameters
    ----------
    run : int
        Code of the run.
    tare : Tare
        As it is listed.
    size, sd : float, float or None
        m/s2. The sd is None where the size is held as stated. A tare of unknown size has none at all (NaN) where it
        parts the network, for the levels before and after it cannot be compared, and where the readings do not tell it
        from another.
    """

    run: int
    tare: Tare
    size: float
    sd: float | None


def tares_in_force(results: Results) -> tuple[TareInForce, ...]:
    """The tares that were taken out, in time order."""
    fit, parts = results.network.adjustment, results.network.parts
    shift, basis = results.network.gravity.tare_shift, fit.basis
    part_of_run = parts.of_run.tolist()
    found = []
    for number in sorted(range(len(basis.tares)), key=lambda one: (basis.tares[one].time, one)):
        tare, run = basis.tares[number], int(basis.tare_run[number])
        size, sd = 0.0, None
        unknown = DriftUnknown(kind="tare", run=run, tare=number)
        if tare.size is not None and tare.size_sd is None:
            size = tare.size
        elif results.network.open.moves(unknown):
            size = float("nan")
        elif unknown in fit.design.position:
            size, sd = fit.unknown(unknown)
        if tare.size is None:
            after = int(parts.of_tare[number])
            if after not in (part_of_run[run], -1):  # -1: nothing is read before the next tare
                size, sd, part_of_run[run] = float("nan"), None, after
            else:
                size += float(shift[number])
        found.append(TareInForce(run=run, tare=tare, size=size, sd=sd))
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
    matrix = errors.matrix(np.array(rows, dtype=np.intp))
    sd = np.sqrt(np.maximum(np.diag(matrix), 0.0))
    scale = np.outer(sd, sd)
    return tuple(rows), np.where(scale > 0.0, matrix / np.where(scale > 0.0, scale, 1.0), 0.0)
