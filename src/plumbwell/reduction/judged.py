"""What does not fit: readings and visits in error, and jumps of the instrument, searched for together.

One bad visit looks like two jumps, one jump like a bent drift and many bad visits. So all of them compete: at each step
the term that explains most is taken, in each run and at each station the best alone, and the network is solved anew,
until nothing explains more than chance would. What was found is then tried against all the rest, and what does not
stand is given back.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.candidates import jumps, more_drift
from plumbwell.reduction.drift_basis import HIGHEST_ORDER
from plumbwell.reduction.drift_order import CHANCE as ORDER_CHANCE
from plumbwell.reduction.drift_order import LEAST_FREEDOM as LEAST_LEFT
from plumbwell.reduction.found_errors import (
    CHANCE,
    CHECKED,
    LEAST_RATIO,
    OUT,
    ProposedTare,
    chance_of,
    critical_ratio,
    doubts,
    errors_of,
    gaps_of,
    is_told,
    jumps_at_ends,
    last_of_station,
    proposed_tare,
    size_of,
)
from plumbwell.reduction.run_terms import RunTerms
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index, frozen_index
from plumbwell.survey.errors import NumericalError
from plumbwell.survey.instrument import Tare

LEAST_FREEDOM = 5
"""Degrees of freedom under which no jump is looked for."""

MEDIAN_SQUARE = 0.4549
"""Median of the square of a normal ratio (chi-square of one degree of freedom)."""

FEW = 20
"""Residuals from which on their median tells their scale."""

SWOLLEN = 0.25
"""Share of the variance under which the median says that a few large residuals make most of it."""

ALIKE = 0.98
"""Share of the largest ratio at a station from which on nothing tells which of its visits is off."""

MANY_READINGS, MANY_SHARE = 50, 0.002
"""Readings in error at one step, and their share, from which on drift and jumps wait."""

MIRRORED = 0.5
"""Share of the strongest term's worth under which others wait: a gross error lends its neighbours a quarter of it."""

SHADED = 0.01
"""The same of single readings: a gross error bends the drift within the visits of the others."""

FEW_RUNS = 30
"""Runs up to which all may mirror one another."""

OF_ONE_VISIT = 3.0
"""What a jump must explain more than one bad visit does: before the last visit of a run both are the same."""

ROUNDS = 30
@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Judgement:
    """What was found.

    Parameters
    ----------
    proposed : tuple of ProposedTare
        In time order.
    rows : (m,) int array
        Rows of the readings that are in error, whole visits among them.
    error, ratio : (m,) arrays
        What each is off by, m/s2, and in sds of its own.
    alike : (m,) bool array
        True where nothing tells which of several at the station is off: leaving all of them out would leave none.
    doubt : (m,) array
        Variance that each has for it, in units of its reading noise; 0 for the others.
    """

    proposed: tuple[ProposedTare, ...]
    rows: Index
    error: Array
    ratio: Array
    alike: NDArray[np.bool_]
    doubt: Array


@dataclass(frozen=True, slots=True, kw_only=True)
class _Candidate:
    """One term: worth (fall of the weighted squares in units of noise, less what trying costs) and what it is.

    `more` is True for a reading or visit that reads too much.
    """

    worth: float
    run: int
    station: int
    kind: str
    at: int
    visit: int = -1
    more: bool = False
    twin: bool = False


Refit = Callable[[tuple[Tare, ...], Array, tuple[int, ...], Adjustment], Adjustment]


def judged(
    start: Adjustment, refit: Refit, *, automatic: tuple[int, ...], estimate: bool, n_rows: int
) -> Judgement:
    """Jumps and readings in error.

    Parameters
    ----------
    start : Adjustment
        Without a walk, at the orders from which automatic runs are raised.
    refit : callable
        (further tares, robust weight of every row, orders, the network before) -> the network adjusted anew.
    automatic : tuple of int
        Runs whose drift order is chosen.
    estimate : bool
        False: noise as given, nothing about it is estimated from residuals.
    n_rows : int
    """
    tares: list[Tare] = []
    trust = np.ones(n_rows)
    fit, orders = start, start.orders
    twins: list[int] = []
    for _ in range(ROUNDS):
        taken = _best(fit, trust, orders, automatic, estimate)
        if not taken:
            break
        before = (tuple(tares), trust, orders, tuple(twins))
        trust = trust.copy()
        raised = list(orders)
        for one in taken:
            if one.kind == "tare":
                tares.append(_tare(fit, one))
            elif one.kind == "order":
                raised[one.run] = one.at
            else:
                rows = _rows(fit.visits, one)
                trust[rows] = OUT
                if one.twin:
                    twins += rows.tolist()
                if one.twin and one.kind == "reading":
                    # Without a majority in the visit those that went before are no surer.
                    mates = _rows(fit.visits, replace(one, kind="visit", at=one.visit))
                    twins += mates[trust[mates] < 0.5].tolist()
        orders = tuple(raised)
        try:
            fit = refit(tuple(tares), trust, orders, fit)
        except (NumericalError, np.linalg.LinAlgError):
            # Without them nothing would join some part of the network to the rest: there is nothing to judge them by.
            tares, trust, orders, twins = list(before[0]), before[1], before[2], list(before[3])
            break
    fit, tares, trust = _given_back(fit, refit, tares, trust, orders, estimate, twins)
    rows = np.flatnonzero(trust < 0.5)
    alike = np.isin(rows, twins) | last_of_station(start.visits, trust, rows)
    error, ratio = errors_of(fit, rows, rows[alike])
    found = [proposed_tare(fit, one, number, len(tares), estimate=estimate) for number, one in enumerate(tares)]
    off = {row: (float(error[n]), float(ratio[n])) for n, row in enumerate(rows.tolist())}
    found += jumps_at_ends(fit, rows[~alike], off, estimate=estimate)
    return Judgement(
        proposed=tuple(sorted(found, key=lambda one: one.time)),
        rows=frozen_index(rows),
        error=error,
        ratio=ratio,
        alike=alike,
        doubt=np.where(alike, doubts(fit, rows, error, ratio), 0.0),
    )


def _scale(ratio: Array, estimate: bool) -> float:
    """Variance of residual ratios by their median where a few large ones have swollen it; at most 1."""
    if not estimate or len(ratio) < FEW:
        return 1.0
    scale = float(np.median(ratio**2)) / MEDIAN_SQUARE
    return scale if scale < SWOLLEN else 1.0


def _best(
    fit: Adjustment, trust: Array, orders: tuple[int, ...], automatic: tuple[int, ...], estimate: bool
) -> list[_Candidate]:
    """The terms that explain more than chance would, no two in one run or at one station."""
    solution, visits = fit.solution, fit.visits
    freedom = fit.reseating.freedom
    kept = trust[visits.rows] > 0.5
    whole = np.maximum.reduceat(trust[visits.rows], visits.start[:-1]) > 0.5
    redundancy = 1.0 - solution.weight * solution.variance_of_fit()
    tested = np.flatnonzero((redundancy > CHECKED) & whole)
    found = _readings(fit, kept, estimate)
    # While many single readings are wrong they hide what the drift does: they go first.
    many = len(found) > max(MANY_READINGS, MANY_SHARE * len(visits.rows))
    squares = solution.sum_of_squares()
    if tested.size and freedom > 1:
        square = solution.residual[tested, 0] ** 2 * solution.weight[tested] / redundancy[tested]
        scale = _scale(np.sqrt(square), estimate)
        least = (fit.noise.variance * solution.weight)[tested]
        told = square / _left(square, squares, freedom, scale, estimate, least)
        for n in _over(told, freedom - 1 if estimate else np.inf, tested.size):
            visit = int(tested[n])
            found.append(
                _Candidate(
                    worth=float(told[n]) - 2.0 * np.log(tested.size), run=int(visits.run[visit]),
                    station=int(visits.station[visit]), kind="visit", at=visit, visit=visit,
                    more=bool(solution.residual[visit, 0] > 0.0),
                )
            )
        if freedom >= LEAST_FREEDOM and not many:
            share = float(np.median(fit.noise.variance * solution.weight))
            found += _drift_terms(fit, squares, freedom, scale, orders, automatic, estimate, share)
    near: dict[tuple[str, int], list[_Candidate]] = {}
    for one in found:
        if one.kind in ("visit", "reading"):
            near.setdefault(_place(one), []).append(one)
    taken: list[_Candidate] = []
    runs: set[int] = set()
    stations: set[int] = set()
    looked_at: set[int] = set()
    gravest = max((one.worth for one in found), default=0.0)
    strongest = max((one.worth for one in found if one.kind != "reading"), default=0.0)
    for one in sorted(found, key=lambda each: -each.worth):
        # A reading stands against its own visit, whatever else is wrong; only its visit and its run have to wait.
        if one.kind == "reading":
            if one.visit in looked_at or one.worth < SHADED * gravest:
                continue
        elif one.run in runs or (one.station >= 0 and one.station in stations):
            # What is weaker in its run or at its station may be its mirror image alone: it waits for another round.
            runs.add(one.run)
            stations.add(one.station)
            continue
        elif len(visits.run_order) <= FEW_RUNS and one.worth < MIRRORED * strongest:
            continue
        looked_at.add(one.visit)
        taken.append(one)
        runs.add(one.run)
        if one.kind != "reading":
            stations.add(one.station)
        others = _twins(one, near)
        if others:
            taken[-1] = replace(one, twin=True)
            taken += [replace(other, twin=True) for other in others]
    return taken


def _twins(one: _Candidate, near: dict[tuple[str, int], list[_Candidate]]) -> list[_Candidate]:
    """What is as far off, so that nothing tells which is wrong: visits of one station, two readings of a visit."""
    # What is off to the same side stands with it, not against it.
    others = (other for other in near.get(_place(one), []) if other.more != one.more)
    return [other for other in others if other.worth > ALIKE**2 * one.worth]


def _place(one: _Candidate) -> tuple[str, int]:
    """Where twins would stand: at the station of a visit, in the visit of a reading."""
    return one.kind, one.station if one.kind == "visit" else one.visit


def _left(
    square: Array, squares: float, freedom: int, scale: float, estimate: bool, least: Array | float
) -> Array:
    """Variance of the rest when a term is taken that explains so much, in units of the variance in force.

    `least` is the share of it that no estimate can lower.
    """
    if not estimate:
        return np.ones_like(square)
    without = np.maximum(squares - square, 0.0) / max(freedom - 1, 1)
    return np.minimum(np.maximum(np.minimum(without, scale), least), 1.0)


def _over(square: Array, freedom: float, tests: int) -> list[int]:
    """Places where the square of a ratio exceeds what the largest of so many would by chance."""
    from scipy.special import ndtri, stdtrit

    tail = -np.expm1(np.log1p(-CHANCE) / tests) / 2.0
    critical = -ndtri(tail) if freedom == np.inf else -stdtrit(freedom, tail)
    return np.flatnonzero(square > max(float(critical), LEAST_RATIO) ** 2).tolist()


def _drift_terms(
    fit: Adjustment,
    squares: float,
    freedom: int,
    scale: float,
    orders: tuple[int, ...],
    automatic: tuple[int, ...],
    estimate: bool,
    least: float,
) -> list[_Candidate]:
    from scipy.special import fdtrc

    found = []
    terms = RunTerms(fit.solution)
    every = jumps(terms, fit.visits)
    gaps = sum(int(np.count_nonzero(one.gain > 0.0)) for one in every)

    def told(gain: Array, steps: int) -> tuple[Array, Array]:
        """Gains in units of the variance of the rest, and the chance of each."""
        grown = gain / _left(gain, squares, freedom, scale, estimate, least)
        return grown, fdtrc(steps, max(freedom - steps, 1), grown / steps)

    best = [int(np.argmax(one.gain)) for one in every]
    gain, chance = told(np.array([float(one.gain[at]) for one, at in zip(every, best, strict=True)]), 1)
    for n in np.flatnonzero((gain > 0.0) & (chance < CHANCE / max(gaps, 1))).tolist():
        found.append(
            _Candidate(
                worth=float(gain[n]) - 2.0 * np.log(gaps) - OF_ONE_VISIT, run=every[n].run, station=-1, kind="tare",
                at=int(every[n].visit[best[n]]),
            )
        )
    runs = [run for run in automatic if 1 <= orders[run] < HIGHEST_ORDER]
    if not runs or freedom - 2 < LEAST_LEFT:
        return found
    more = more_drift(terms, fit.basis, fit.visits, fit.noise.weight)
    next_one, its_chance = told(np.array([more.get(run, (0.0, 0.0))[0] for run in runs]), 1)
    third, third_chance = told(np.array([more.get(run, (0.0, 0.0))[1] for run in runs]), 2)
    for n, run in enumerate(runs):
        if next_one[n] > 0.0 and its_chance[n] < ORDER_CHANCE:
            found.append(
                _Candidate(worth=float(next_one[n]), run=run, station=-1, kind="order", at=orders[run] + 1)
            )
        elif orders[run] == 1 and third[n] > 0.0 and third_chance[n] < ORDER_CHANCE:
            found.append(
                _Candidate(worth=float(third[n]) - 2.0, run=run, station=-1, kind="order", at=HIGHEST_ORDER)
            )
    return found


def _readings(fit: Adjustment, kept: NDArray[np.bool_], estimate: bool) -> list[_Candidate]:
    """Single readings off the others of their visit."""
    visits, noise = fit.visits, fit.noise
    count = np.add.reduceat(kept.astype(float), visits.start[:-1])
    visit = np.repeat(np.arange(len(visits)), np.diff(visits.start))
    alike = np.flatnonzero((count[visit] > 1.0) & kept)
    alike = alike[fit.redundancy[visits.rows[alike]] > CHECKED]
    freedom = noise.freedom
    if not alike.size or freedom < 2:
        return []
    square = np.nan_to_num(fit.standardised[visits.rows[alike]]) ** 2
    scale = _scale(np.sqrt(square), estimate)
    least = (noise.floor**2 / noise.sd**2)[alike]
    told = square / _left(square, float(freedom), freedom, scale, estimate, least)
    found = []
    for n in _over(told, freedom - 1 if estimate else np.inf, alike.size):
        at = int(alike[n])
        found.append(
            _Candidate(
                worth=float(told[n]) - 2.0 * np.log(alike.size), run=int(visits.run[visit[at]]),
                station=int(visits.station[visit[at]]), kind="reading", at=at, visit=int(visit[at]),
                more=bool(fit.standardised[visits.rows[at]] > 0.0),
            )
        )
    return found


def _rows(visits: Visits, one: _Candidate) -> Index:
    if one.kind == "reading":
        return visits.rows[one.at : one.at + 1]
    return visits.rows[visits.start[one.at] : visits.start[one.at + 1]]


def _tare(fit: Adjustment, one: _Candidate) -> Tare:
    """The jump as an unknown: it counts from the first reading of the visit after its gap."""
    return Tare(run=str(one.run), time=float(fit.visits.first[one.at]))


def _given_back(
    fit: Adjustment,
    refit: Refit,
    tares: list[Tare],
    trust: Array,
    orders: tuple[int, ...],
    estimate: bool,
    twins: list[int],
) -> tuple[Adjustment, list[Tare], Array]:
    """What stands against all the rest; the weakest goes first.

    Twins stay: without either there is nothing to weigh the other against.
    """
    for _ in range(ROUNDS):
        freedom = fit.reseating.freedom
        gaps = gaps_of(fit.visits)
        weak: list[tuple[float, int]] = []
        for number, tare in enumerate(tares):
            size, sd = size_of(fit, tare, len(tares), number)
            if not is_told(size, sd, freedom, estimate, gaps=gaps):
                weak.append((chance_of(size, sd, freedom, estimate), number))
        if weak:
            # Runs hardly know of one another: in each the weakest goes.
            worst: dict[str, tuple[float, int]] = {}
            for chance, number in weak:
                worst[tares[number].run] = max(worst.get(tares[number].run, (chance, number)), (chance, number))
            gone = {number for _, number in worst.values()}
            tares = [one for number, one in enumerate(tares) if number not in gone]
            fit = refit(tuple(tares), trust, orders, fit)
            continue
        rows = np.setdiff1d(np.flatnonzero(trust < 0.5), twins)
        if rows.size:
            used = fit.visits.rows
            least = critical_ratio(freedom if estimate else np.inf, len(used))
            back = rows[~(np.abs(errors_of(fit, rows)[1]) > least)]
            if back.size:
                trust = trust.copy()
                trust[back] = 1.0
                fit = refit(tuple(tares), trust, orders, fit)
                continue
        break
    return fit, tares, trust


