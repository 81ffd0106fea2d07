"""Readings -> station gravity, drift and noise, by one adjustment of all runs.

`adjusted` fits the network: reading noise from within visits, drift orders by F test, re-seating noise by
restricted likelihood, then the solution and what it leaves at every reading. Nothing here knows of depth;
the datum is set by `datums.referred_gravity`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.added_columns import sum_of_squares_with
from plumbwell.reduction.broken_visits import contrasts, unbroken_stretches
from plumbwell.reduction.design import (
    HIGHEST_ORDER,
    Design,
    DriftBasis,
    DriftUnknown,
    design,
    visit_regressors,
    with_priors,
)
from plumbwell.reduction.drift_order import Comparison, OrderTest, chosen_orders
from plumbwell.reduction.network import Rank, Solution, TieRows, rank_of_visits, solve
from plumbwell.reduction.network_parts import Parts, undetermined
from plumbwell.reduction.variances import ReadingNoise, Reseating, reading_noise, reseating, stated_reseating
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index
from plumbwell.survey.errors import NumericalError

DESIGNS_HELD = 100
MANY_FREEDOM = 300
"""Beyond so many degrees of freedom one column more moves the noise by less than a third of a percent, and the weights
of the lower order serve the F test."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class NoiseTerms:
    """What the instruments state about noise, one a row of the readings, m/s2.

    Parameters
    ----------
    reading_sd : (n,) array
        NaN where none is stated.
    reading_floor, reseating_sd, station_floor : (n,) arrays
    estimate : bool
        False: as given.
    """

    reading_sd: Array
    reading_floor: Array
    reseating_sd: Array
    station_floor: Array
    estimate: bool


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Adjustment:
    """The adjusted network before its datum is set.

    Parameters
    ----------
    basis, visits, design, solution, noise, reseating
        What the fit rests on.
    tests : tuple of OrderTest
    held : (n,) array
        Known drift of each row, m/s2.
    visit_mean : (v,) array
        Visit means of the observations less known drift.
    station_floor : (s,) array
        m/s2.
    border_drift : (n,) array
        Drift and tares of each row from the border unknowns, run bias left out, m/s2.
    visit_effect, residual, standardised, redundancy : (n,) arrays
        NaN where they have no meaning (unused rows; standardised where nothing checks the reading).
        `residual` of unused rows is the observation less its prediction.
    """

    basis: DriftBasis
    visits: Visits
    design: Design
    solution: Solution
    noise: ReadingNoise
    reseating: Reseating
    tests: tuple[OrderTest, ...]
    held: Array
    visit_mean: Array
    station_floor: Array
    border_drift: Array
    visit_effect: Array
    residual: Array
    standardised: Array
    redundancy: Array

    @property
    def orders(self) -> tuple[int, ...]:
        """Drift order by run code."""
        return self.design.orders

    def unknown(self, wanted: DriftUnknown) -> tuple[float, float]:
        """Estimate and sd of a border unknown (drift per power of scaled time); 0, 0 when it is held at 0."""
        if wanted not in self.design.unknowns:
            return 0.0, 0.0
        number = self.design.unknowns.index(wanted)
        return float(self.solution.unknown[number, 0]), float(np.sqrt(self.solution.border[number, number]))


def visit_means(weight: Array, values: Array, start: Index) -> Array:
    """Weighted means over visits of used rows' values, (u,) or (u, m).

    `weight` (u,) sums to 1 within a visit; `start` (v + 1,) marks where each visit starts.
    """
    shaped = weight if values.ndim == 1 else weight[:, None]
    return np.add.reduceat(shaped * values, start[:-1], axis=0)


def adjusted(
    observed: Array,
    basis: DriftBasis,
    visits: Visits,
    ties: TieRows,
    parts: Parts,
    terms: NoiseTerms,
    *,
    n_stations: int,
    start_orders: tuple[int, ...],
    automatic: tuple[int, ...],
    station: Index,
    responses: tuple[Array, ...] = (),
) -> Adjustment:
    """The adjusted network.

    Parameters
    ----------
    observed : (n,) array
        Readings with all corrections made, m/s2.
    basis, visits, ties, parts, terms
    n_stations : int
    start_orders : tuple of int by run code
        Given orders; 1 for automatic runs.
    automatic : tuple of int
        Codes of the runs whose order is chosen.
    station : (n,) int array
        Station of each row, -1 for none.
    responses : tuple of (n,) arrays
        Further right-hand sides, e.g. the calibrated readings of one instrument, whose answers in gravity
        stand in the further columns of `solution.gravity`.
    """
    rows = visits.rows
    orders = tuple(
        0 if not basis.length[run] > 0.0 or _instant(visits, run) else order for run, order in enumerate(start_orders)
    )
    automatic = tuple(run for run in automatic if orders[run] > 0)
    lost: list[DriftUnknown] = []
    unbroken = unbroken_stretches(basis, visits)
    sd = terms.reading_floor[rows]

    def designed(chosen: tuple[int, ...], weight: Array) -> tuple[Design, Rank]:
        one, rank = _designed(
            basis, visits, weight, n_stations=n_stations, orders=chosen, dropped=parts.dropped, lost=tuple(lost)
        )
        if len(unbroken) > len(visits.start):
            one = with_priors(one, contrasts(one, basis, visits, unbroken, values, 1.0 / sd**2))
        return one, rank

    counts = np.diff(visits.start)
    held = basis.held(rows, orders)
    values = observed[rows] - held
    even = np.repeat(1.0 / counts, counts)
    first, rank = designed(orders, even)
    while (missing := undetermined(first, ties, rank)) is not None:
        lost.append(missing)
        first, rank = designed(orders, even)
    means = np.add.reduceat(values, visits.start[:-1]) / counts
    stated = terms.reading_sd[rows]
    typical = float(np.mean(terms.reseating_sd[rows] ** 2 + terms.reading_floor[rows] ** 2))
    rough = _solved(first, np.full(len(visits), 1.0 / typical), means, ties)
    drift = border_drift(basis, first, rough.unknown[:, 0], rows)
    noise = reading_noise(
        visits,
        values - drift,
        unbroken=unbroken,
        stated=stated,
        floor=terms.reading_floor[rows],
        estimate=terms.estimate,
    )
    sd = noise.sd
    # Rounding apart the weights within visits are even where all readings are equally good.
    weighted = even if np.abs(noise.weight - even).max() < 1e-15 else noise.weight
    u0 = stated_reseating(
        noise,
        reseating_sd=terms.reseating_sd[rows][visits.start[:-1]],
        stated=stated,
        estimate=terms.estimate,
    )

    mean = visit_means(noise.weight, values, visits.start)

    solved: dict[tuple[int, ...], tuple[int, Solution]] = {}

    def fit(chosen: tuple[int, ...]) -> tuple[int, Solution] | None:
        """Degrees of freedom and solution with the noise of the chosen orders; None where they are not determined."""
        one, rank = designed(chosen, weighted)
        if undetermined(one, ties, rank) is not None:
            return None
        if chosen not in solved:
            found = reseating(one, mean, noise, rank=rank, stated_variance=u0, estimate=terms.estimate)
            weight = 1.0 / (noise.variance + found.variance)
            solved[chosen] = (found.freedom, _solved(one, weight, mean, ties))
        return solved[chosen]

    def compare(chosen: tuple[int, ...], run: int, higher: int) -> Comparison | None:
        below = fit(chosen) if len(visits) > MANY_FREEDOM else None
        if below is not None and below[0] > MANY_FREEDOM:
            return _by_columns(*below, basis, visits, weighted, run=run, lower=chosen[run], higher=higher)
        above = fit((*chosen[:run], higher, *chosen[run + 1 :]))
        if above is None:
            return None
        freedom, solution = above
        added = [one.kind == "drift" and one.power > chosen[one.run] for one in solution.design.unknowns]
        return Comparison(low=_without(solution, added), high=solution.sum_of_squares(), freedom=freedom)

    tests: tuple[OrderTest, ...] = ()
    if automatic:
        orders, tests = chosen_orders(orders, automatic, compare)
    final, rank = designed(orders, weighted)
    seat = reseating(final, mean, noise, rank=rank, stated_variance=u0, estimate=terms.estimate)
    weight = 1.0 / (noise.variance + seat.variance)
    answers = [visit_means(noise.weight, one[rows], visits.start) for one in responses]
    solution = _solved(final, weight, np.column_stack([mean, *answers]), ties)
    everywhere = np.arange(len(observed))
    whole_held = basis.held(everywhere, orders)
    drift_all = border_drift(basis, final, solution.unknown[:, 0], everywhere)
    checked = _checked(observed - whole_held - drift_all, visits, solution, noise, seat, basis, station)
    floor = np.zeros(n_stations)
    np.maximum.at(floor, station[rows], terms.station_floor[rows])
    bias = run_bias(basis, final, solution.unknown[:, 0])
    return Adjustment(
        basis=basis,
        visits=visits,
        design=final,
        solution=solution,
        noise=noise,
        reseating=seat,
        tests=tests,
        held=whole_held,
        visit_mean=mean,
        station_floor=floor,
        border_drift=drift_all - bias[basis.run],
        visit_effect=checked[0],
        residual=checked[1],
        standardised=checked[2],
        redundancy=checked[3],
    )


def _designed(
    basis: DriftBasis,
    visits: Visits,
    weight: Array,
    *,
    n_stations: int,
    orders: tuple[int, ...],
    dropped: tuple[DriftUnknown, ...],
    lost: tuple[DriftUnknown, ...],
) -> tuple[Design, Rank]:
    """The design of some orders with its rank, found again where the weights within visits are what they were."""
    made, bytes_of_weight = basis.made, weight.tobytes()
    if len(made) > DESIGNS_HELD:
        made.clear()
    key = (visits, bytes_of_weight, n_stations, orders, dropped, lost)
    if key not in made:
        if (visits, bytes_of_weight) not in made:
            made[visits, bytes_of_weight] = visit_regressors(basis, visits, weight)
        regressors = made[visits, bytes_of_weight]
        one = design(basis, visits, regressors, n_stations=n_stations, orders=orders, dropped=dropped, lost=lost)
        made[key] = (one, rank_of_visits(one))
    return made[key]  # type: ignore[no-any-return]


def _by_columns(
    freedom: int,
    below: Solution,
    basis: DriftBasis,
    visits: Visits,
    weight: Array,
    *,
    run: int,
    lower: int,
    higher: int,
) -> Comparison | None:
    """The higher order of one run compared by adding its columns to the solution of the lower, weights kept."""
    members = np.flatnonzero(visits.run == run)
    first, last = int(members[0]), int(members[-1]) + 1
    rows = slice(int(visits.start[first]), int(visits.start[last]))
    time = basis.time(visits.rows[rows])
    powers = np.column_stack([time**power for power in range(lower + 1, higher + 1)])
    columns = visit_means(weight[rows], powers, visits.start[first : last + 1] - visits.start[first])
    name = f"drift rate of run {run}"
    prior = next((one for one in below.design.priors if one.name == name), None)
    factors = np.full(higher - lower, 1.0 / basis.length[run])
    high = sum_of_squares_with(below, members, columns, prior=prior, factors=factors)
    if high is None:
        return None
    return Comparison(low=below.sum_of_squares(), high=high, freedom=freedom - (higher - lower))


def _without(above: Solution, left_out: list[bool]) -> float:
    """Weighted sum of squares of visit residuals when some border unknowns are held at 0, weights kept.

    The solution moves by C e (e^T C e)^-1 x_e, e the unknowns left out, C the covariance, x their estimates.
    """
    gone = np.flatnonzero(left_out)
    moved = above.border[:, gone] @ np.linalg.solve(above.border[gone[:, None], gone], above.unknown[gone, 0])
    residual = above.residual[:, 0] + above.fitted(moved)
    return float(above.weight @ residual**2)


def _instant(visits: Visits, run: int) -> bool:
    """True for a run whose used readings all share one time: it has no drift."""
    length = visits.run_length[run]
    return not length > 0.0


def _solved(one: Design, weight: Array, observed: Array, ties: TieRows) -> Solution:
    try:
        return solve(one, weight, observed if observed.ndim == 2 else observed[:, None], ties)
    except np.linalg.LinAlgError as error:
        raise NumericalError(
            "the network of readings could not be solved: its drift terms cannot be told apart; "
            "lower drift_order or list fewer tares"
        ) from error


def run_bias(basis: DriftBasis, one: Design, unknown: Array) -> Array:
    """Bias by run code, m/s2; 0 where it is held."""
    bias = np.zeros(len(basis.start))
    for number, what in enumerate(one.unknowns):
        if what.kind == "bias":
            bias[what.run] = unknown[number]
    return bias


def border_drift(basis: DriftBasis, one: Design, unknown: Array, rows: Index) -> Array:
    """What the border unknowns (bias, drift, tares) put on the given rows, m/s2."""
    run, time = basis.run[rows], basis.time(rows)
    coefficient = np.zeros((HIGHEST_ORDER + 1, len(basis.start)))
    jumps = np.zeros(len(rows))
    for number, what in enumerate(one.unknowns):
        if what.kind == "tare":
            jumps += unknown[number] * basis.jumps(rows, what.tare)
        else:
            coefficient[what.power, what.run] = unknown[number]
    total = coefficient[HIGHEST_ORDER][run]
    for power in range(HIGHEST_ORDER - 1, -1, -1):
        total = total * time + coefficient[power][run]
    return total + jumps


def _checked(
    level: Array,
    visits: Visits,
    solution: Solution,
    noise: ReadingNoise,
    seat: Reseating,
    basis: DriftBasis,
    station: Index,
) -> tuple[Array, Array, Array, Array]:
    """Visit effect, residual, standardised residual and redundancy of every row; `level` is free of bias and drift."""
    n = len(level)
    effect, standardised, redundancy = (np.full(n, np.nan) for _ in range(3))
    one = solution.design
    gravity, border = solution.gravity[:, 0], solution.border
    predicted = np.where(station >= 0, gravity[np.maximum(station, 0)], np.nan)
    rank_of_run = np.full(len(basis.start), -1)
    rank_of_run[visits.run_order] = np.arange(len(visits.run_order))
    residual = np.where(rank_of_run[basis.run] >= 0, level - predicted, np.nan)
    rows = visits.rows
    visit = np.repeat(np.arange(len(visits)), np.diff(visits.start))
    share, where, run = noise.weight, station[rows], basis.run[rows]
    # Regressors of the unknowns of each row's own run, z; their means over its visit; and what the border's
    # covariance makes of both.
    unknown = one.of_run[run]
    z = basis.table(rows)[one.table_row[unknown], np.arange(len(rows))[:, None]] * (unknown >= 0)
    z_mean = visit_means(share, z, visits.start)[visit]
    turned, turned_mean = np.empty_like(z), np.empty_like(z)
    edges = np.searchsorted(rank_of_run[run], np.arange(len(visits.run_order) + 1)).tolist()
    for code, start, end in zip(visits.run_order.tolist(), edges[:-1], edges[1:], strict=True):
        own_rows = slice(start, end)
        numbers = one.of_run[code]
        block = border[numbers[:, None], numbers] * ((numbers >= 0)[:, None] & (numbers >= 0))
        turned[own_rows], turned_mean[own_rows] = z[own_rows] @ block, z_mean[own_rows] @ block
    spread = solution.mean @ border
    at_station = 1.0 / solution.total + np.einsum("sq,sq->s", spread, solution.mean)
    cross = spread[where[:, None], unknown]
    base, of_mean = at_station[where], np.einsum("rm,rm->r", z_mean, cross)
    own = np.einsum("rm,rm->r", turned_mean, z) - np.einsum("rm,rm->r", z, cross) - of_mean + base
    fit = np.einsum("rm,rm->r", turned_mean, z_mean) - 2.0 * of_mean + base
    tilt = np.einsum("rm,rm->r", turned - turned_mean, z - z_mean)
    variance = (noise.variance + seat.variance)[visit]
    kept = seat.variance[visit] / variance
    effect[rows] = kept * visit_means(share, residual[rows], visits.start)[visit]
    residual[rows] -= effect[rows]
    checked = np.maximum(1.0 - fit / variance, 0.0)
    sd2 = noise.sd**2 - noise.variance[visit] + (1.0 - kept) ** 2 * variance * checked + tilt
    enough = sd2 > 1e-9 * noise.sd**2
    standardised[rows] = np.where(enough, residual[rows] / np.sqrt(np.where(enough, sd2, 1.0)), np.nan)
    redundancy[rows] = 1.0 - own * share / variance
    return effect, residual, standardised, redundancy
