"""How large what was found in error is, and how sure: readings, visits and jumps, as all that is left tells them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index
from plumbwell.survey.instrument import Tare

CHANCE = 0.01
"""Chance that a clean survey shows any jump, and any outlier."""

LEAST_RATIO = 3.29
"""Two-sided 0.1 % of the normal distribution: the level of a single test (Baarda 1968)."""

CHECKED = 0.05
"""Redundancy under which nothing checks a reading."""

TRUSTED = 1e3
"""Times the typical sd of a reading up to which one in a visit is trusted."""

OUT = 1e-14
"""Robust weight of what was found to be in error: as good as none even of an error of Gals, and the network keeps its
shape."""

SAME_GAIN = 1e-6
"""Relative difference of two gains that are one and the same: readings between them check nothing."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ProposedTare:
    """A jump of the instrument that the readings show and nobody has listed.

    Parameters
    ----------
    run : int
        Code of its run.
    time : float
        UTC, s since 2000-01-01: amid the gap.
    gap_from, gap_to : float
        Last reading that is surely before it and first that is surely after it.
    visits_between : int
        Visits in the gap that nothing puts on either side.
    size, sd : float, m/s2
    gain : float
        Of the logarithm of the likelihood.
    p : float
        Chance of a jump as large in any gap that was tried.
    one_visit : bool
        True where only the first or the last visit of the run lies beyond the jump: it is named as an outlier too, for
        nothing tells a jump there from a bad visit.
    """

    run: int
    time: float
    gap_from: float
    gap_to: float
    visits_between: int
    size: float
    sd: float
    gain: float
    p: float
    one_visit: bool = False


def gaps_of(visits: Visits) -> int:
    """Gaps between neighbouring visits of a run, at least 1."""
    return max(len(visits) - len(visits.run_order), 1)


def is_told(size: float, sd: float, freedom: int, estimate: bool, *, gaps: int) -> bool:
    """True where a jump is larger than chance would make it in any of so many gaps."""
    return chance_of(size, sd, freedom, estimate) < CHANCE / max(gaps, 1)


def critical_ratio(freedom: float, tests: int) -> float:
    """Ratio to its sd that the largest of so many clean ones exceeds with a chance of 1 %, at least 3.29."""
    from scipy.special import ndtri, stdtrit

    tail = -np.expm1(np.log1p(-CHANCE) / tests) / 2.0
    return max(float(-ndtri(tail) if freedom == np.inf else -stdtrit(max(freedom, 1), tail)), LEAST_RATIO)


def chance_of(size: float, sd: float, freedom: int, estimate: bool) -> float:
    """Chance of a jump so large where there is none: of F with 1 and `freedom`, or normal where noise is given."""
    from scipy.special import fdtrc, ndtr

    if not sd > 0.0:
        return 1.0
    ratio = size / sd
    return float(fdtrc(1, max(freedom, 1), ratio**2)) if estimate else float(2.0 * ndtr(-abs(ratio)))


def size_of(fit: Adjustment, tare: Tare, count: int, number: int) -> tuple[float, float]:
    """Size and sd of a tare that the search has added: the last ones of the basis, in their order."""
    at = len(fit.basis.tares) - count + number
    return fit.unknown(DriftUnknown(kind="tare", run=int(fit.basis.tare_run[at]), tare=at))


def last_of_station(visits: Visits, trust: Array, rows: Index) -> NDArray[np.bool_]:
    """True for rows of stations that no other used row is left of."""
    station = np.repeat(visits.station, np.diff(visits.start))
    left = np.zeros(int(station.max(initial=-1)) + 1)
    np.maximum.at(left, station, trust[visits.rows])
    gone = left[station] < 0.5
    return np.isin(rows, visits.rows[gone])


def errors_of(fit: Adjustment, rows: Index, alike: Index | None = None) -> tuple[Array, Array]:
    """What rows out of trust are off by, m/s2, and in sds, by all that is left, (m,) each.

    Those that stand `alike` against one another are weighed so.
    """
    visits = fit.visits
    visit = visits.of_row[rows]
    # Its own noise has been swollen by the square root of its weight.
    swollen = np.full(len(fit.residual), np.nan)
    swollen[visits.rows] = fit.noise.sd
    quiet = np.minimum.reduceat(fit.noise.sd, visits.start[:-1]) < TRUSTED * float(np.median(fit.noise.sd))
    own = np.maximum(fit.checked.predicted[rows], 0.0) + swollen[rows] ** 2 * OUT
    of_visit, in_sds = _visit_errors(fit)
    error = np.where(quiet[visit], fit.checked.error[rows], of_visit[visit])
    ratio = np.where(quiet[visit], error / np.sqrt(np.where(own > 0.0, own, 1.0)), in_sds[visit])
    apart = np.flatnonzero(np.isin(rows, alike)) if alike is not None else np.zeros(0, dtype=np.intp)
    twice = 2.0 * float(np.median(fit.noise.variance) + np.median(fit.reseating.variance))
    for n in apart.tolist():
        if np.isfinite(of_visit[visit[n]]):
            error[n], ratio[n] = of_visit[visit[n]], of_visit[visit[n]] / np.sqrt(twice)
            continue
        # Readings of one visit that nothing else checks: off their median, and no nearer than it is told.
        members = visits.rows[visits.start[visit[n]] : visits.start[visit[n] + 1]]
        level = fit.residual[members] + fit.checked.visit_effect[members]
        off = level - np.median(level)
        far = float(np.hypot(off, np.median(np.abs(off)))[members == rows[n]][0])
        error[n] = off[members == rows[n]][0]
        ratio[n] = far / (swollen[rows[n]] * np.sqrt(OUT))
    return error, ratio


def doubts(fit: Adjustment, rows: Index, error: Array, ratio: Array) -> Array:
    """What the variance of rows that stand alike grows by, in units of their reading noise.

    Of two visits as a whole by half the square of their difference; readings of one visit by their ratio to the rest.
    """
    visits, noise = fit.visits, fit.noise
    own = np.full(len(visits.of_row), np.nan)
    own[visits.rows] = noise.sd**2 * OUT
    visit = visits.of_row[rows]
    whole = np.isfinite(_visit_errors(fit)[0][visit])
    return np.where(whole, 0.5 * error**2 * np.diff(visits.start)[visit] / own[rows], ratio**2)


def _visit_errors(fit: Adjustment) -> tuple[Array, Array]:
    """What each visit is off by as the others predict it, and in sds."""
    solution = fit.solution
    fitted = solution.variance_of_fit()
    free = 1.0 - solution.weight * fitted
    safe = np.where(free > CHECKED, free, np.nan)
    error, predicted = solution.residual[:, 0] / safe, fitted / safe
    own = np.median(fit.noise.variance) + fit.reseating.variance
    return error, error / np.sqrt(np.maximum(predicted, 0.0) + own)


def proposed_tare(fit: Adjustment, tare: Tare, number: int, count: int, *, estimate: bool) -> ProposedTare:
    """A jump that the search has added to the basis, the `number`th of `count`, as it is proposed."""
    visits, basis = fit.visits, fit.basis
    run = int(basis.tare_run[len(basis.tares) - count + number])
    size, sd = size_of(fit, tare, count, number)
    members = np.flatnonzero(visits.run == run)
    at = int(np.searchsorted(visits.first[members], tare.time))
    low, high = _gap(fit, members, at)
    freedom = fit.reseating.freedom
    ratio = (size / sd) ** 2
    gaps = gaps_of(visits)
    gap_from, gap_to = float(visits.last[members[low]]), float(visits.first[members[high]])
    return ProposedTare(
        run=run,
        time=0.5 * (gap_from + gap_to),
        gap_from=gap_from,
        gap_to=gap_to,
        visits_between=high - low - 1,
        size=size,
        sd=sd,
        gain=_gain(ratio, freedom, estimate),
        p=min(chance_of(size, sd, freedom, estimate) * gaps, 1.0),
    )


def _gain(square: float, freedom: int, estimate: bool) -> float:
    """Gain of the log likelihood by a term of so large a squared ratio to its sd."""
    return 0.5 * (freedom + 1) * float(np.log1p(square / max(freedom, 1))) if estimate else 0.5 * square


def jumps_at_ends(
    fit: Adjustment, rows: Index, off: dict[int, tuple[float, float]], *, estimate: bool
) -> list[ProposedTare]:
    """Bad visits at the ends of their runs as jumps, which they may be as well."""
    visits, freedom = fit.visits, fit.reseating.freedom
    named, found = np.isin(visits.rows, rows), []
    tells = 1.0 - fit.solution.weight * fit.solution.variance_of_fit() > SAME_GAIN
    gaps = gaps_of(visits)
    for run in visits.run_order.tolist():
        members = np.flatnonzero(visits.run == run)
        for visit, other, sign in ((members[0], members[1:2], -1.0), (members[-1], members[-2:-1], 1.0)):
            own = slice(int(visits.start[visit]), int(visits.start[visit + 1]))
            if not other.size or not named[own].all():
                continue
            error, ratio = off[int(visits.rows[own.start])]
            # Visits next to it that nothing checks may lie on either side.
            inner = members[1:] if sign < 0.0 else members[-2::-1]
            checks = np.flatnonzero(tells[inner])
            between = int(checks[0]) if checks.size else len(inner) - 1
            far = int(inner[between])
            gap = (
                float(visits.last[min(int(visit), far)]), float(visits.first[max(int(visit), far)])
            )
            found.append(
                ProposedTare(
                    run=run, time=0.5 * (gap[0] + gap[1]), gap_from=gap[0], gap_to=gap[1], visits_between=between,
                    size=sign * error, sd=abs(error / ratio),
                    gain=_gain(ratio**2, freedom, estimate),
                    p=min(chance_of(ratio, 1.0, freedom, estimate) * gaps, 1.0), one_visit=True,
                )
            )
    return found


def _gap(fit: Adjustment, members: Index, at: int) -> tuple[int, int]:
    """Visits of the run, by number in it, surely before and surely after a jump found before visit `at`.

    A visit that nothing checks (its station is read once, or never across the jump) may lie on either side.
    """
    solution, visits = fit.solution, fit.visits
    free = 1.0 - solution.weight * solution.variance_of_fit()
    tells = free[members] > SAME_GAIN
    low, high = at - 1, at
    while low > 0 and not tells[low]:
        low -= 1
    while high < len(members) - 1 and not tells[high]:
        high += 1
    del visits
    return low, high
