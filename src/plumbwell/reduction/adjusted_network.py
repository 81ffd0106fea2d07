"""Readings -> station gravity, drift and noise, by one adjustment of all runs.

`adjusted` fits the network: reading noise from within visits, drift orders by F test, re-seating noise and a random
walk of the drift by restricted likelihood, then the solution and what it leaves at every reading. Nothing here knows of
depth; the datum is set by `datums.referred_gravity`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import wraps
from typing import ParamSpec, TypeVar

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment, NoiseTerms
from plumbwell.reduction.broken_visits import contrasts, unbroken_stretches
from plumbwell.reduction.candidates import more_drift
from plumbwell.reduction.chance import f_chance
from plumbwell.reduction.checked import checked, visit_means
from plumbwell.reduction.design import (
    Design,
    crossings,
    design,
    drift_of,
    matrix_of,
    reweighted,
    walk_priors,
    with_priors,
)
from plumbwell.reduction.drift_basis import DriftBasis, DriftUnknown
from plumbwell.reduction.drift_order import LEAST_FREEDOM as LEAST_LEFT
from plumbwell.reduction.drift_order import Comparison, OrderTest, chosen_orders, raised_together
from plumbwell.reduction.network import NO_RANK, Rank, Solution, TieRows, rank_beside_walk, rank_of_visits, solve
from plumbwell.reduction.network_parts import Parts, undetermined
from plumbwell.reduction.restricted_likelihood import log_likelihood, visits_alone
from plumbwell.reduction.run_terms import RunTerms
from plumbwell.reduction.variances import (
    Reseating,
    reading_noise,
    reseating,
    stated_reseating,
    trusted_noise,
)
from plumbwell.reduction.visits import Visits
from plumbwell.reduction.walk import LEAST_FREEDOM, WalkFit, enough_gain, likeliest_strength
from plumbwell.reduction.walk_modes import modes_for
from plumbwell.survey.column import Array, Index
from plumbwell.survey.errors import NumericalError

UNSOLVED = (
    "the network of readings could not be solved: its drift terms cannot be told apart; "
    "lower drift_order or list fewer tares"
)
DESIGNS_HELD = 60
MANY_FREEDOM = 300
"""Beyond so many degrees of freedom one column more moves the noise by less than a third of a percent, and the weights
of the lower order serve the F test."""

BESIDE = (0.8, 1.0, 1.25)
"""What the strength of a walk is tried at in the network, where re-seating noise alone is scaled, not all noise."""

HOPELESS = 0.7
"""Share of the gain that is asked of a walk under which it is not tried in the network itself."""

PLAINLY = 0.1
"""Chance by the weights of the lower order over which those of the higher cannot make it 1 %."""

DOUBTED = 0.5
"""Robust weight under which a reading counts as taken out in degrees of freedom."""

Asked = ParamSpec("Asked")
Given = TypeVar("Given")


def told_when_unsolved(step: Callable[Asked, Given]) -> Callable[Asked, Given]:
    """The step, whose failing algebra is told as the failing network that it is."""

    @wraps(step)
    def told(*inputs: Asked.args, **settings: Asked.kwargs) -> Given:
        try:
            return step(*inputs, **settings)
        except np.linalg.LinAlgError as error:
            raise NumericalError(UNSOLVED) from error

    return told


@told_when_unsolved
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
    walk: str | float = "off",
    responses: tuple[Array, ...] = (),
    trust: Array | None = None,
    near: Adjustment | None = None,
    known: Adjustment | None = None,
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
    walk : "auto", "off", "on" or float
        The random walk of the drift: kept when it explains enough, none, estimated, or its strength, m/s2/s^1.5.
    responses : tuple of (n,) arrays
        Further right-hand sides, e.g. the calibrated readings of one instrument, whose answers in gravity
        stand in the further columns of `solution.gravity`.
    trust : (n,) array or None
        Robust weight of each row, 0 to 1. None: 1 for all.
    near : Adjustment or None
        One of the same visits, from whose re-seating noise that of this one is looked for, nearly enough for a search;
        the likelihood is left out then.
    known : Adjustment or None
        One of the same visits whose noise is held: weights that fall with the residuals would make it look smaller.

    Raises
    ------
    NumericalError
        The visits, ties and priors determine the unknowns in name alone.
    """
    rows = visits.rows
    orders = tuple(
        0 if not basis.length[run] > 0.0 or _instant(visits, run) else order for run, order in enumerate(start_orders)
    )
    automatic = tuple(run for run in automatic if orders[run] > 0)
    lost: list[DriftUnknown] = []
    unbroken = unbroken_stretches(basis, visits)
    sd = terms.reading_floor[rows]
    counts = np.diff(visits.start)
    held = basis.held(rows, orders)
    values = observed[rows] - held

    def designed(chosen: tuple[int, ...], weight: Array, modes: int = 0) -> tuple[Design, Rank]:
        one, rank = _designed(
            basis, visits, weight, n_stations=n_stations, orders=chosen, dropped=parts.dropped, lost=tuple(lost),
            modes=modes,
        )
        if len(unbroken) > len(visits.start):
            one = with_priors(one, contrasts(one, basis, visits, unbroken, values, 1.0 / sd**2))
        return one, rank

    even = np.repeat(1.0 / counts, counts)
    first, rank = designed(orders, even)
    while (missing := undetermined(first, ties, rank)) is not None:
        lost.append(missing)
        first, rank = designed(orders, even)
    # What is not trusted must not bend the drift that is taken out before reading noise is looked for.
    kept = np.ones(len(rows)) if trust is None else trust[rows]
    means = np.add.reduceat(kept * values, visits.start[:-1]) / np.add.reduceat(kept, visits.start[:-1])
    typical = float(np.mean(terms.reseating_sd[rows] ** 2 + terms.reading_floor[rows] ** 2))
    rough = _solved(first, np.maximum.reduceat(kept, visits.start[:-1]) / typical, means, ties)
    drift = drift_of(basis, first, rough.unknown[:, 0], None, bias=True)
    if known is not None:
        noise = trusted_noise(known.noise, visits, np.ones(len(rows)) if trust is None else trust[rows])
    else:
        noise = reading_noise(
            visits,
            values - drift,
            unbroken=unbroken,
            stated=terms.reading_sd[rows],
            floor=terms.reading_floor[rows],
            estimate=terms.estimate,
            trust=None if trust is None else trust[rows],
        )
    sd = noise.sd
    # Rounding apart the weights within visits are even where all readings are equally good.
    weighted = even if np.abs(noise.weight - even).max() < 1e-15 else noise.weight
    u0 = stated_reseating(
        noise,
        reseating_sd=terms.reseating_sd[rows][visits.start[:-1]],
        stated=terms.reading_sd[rows],
        estimate=terms.estimate,
    )
    doubtful = 0
    if trust is not None:
        doubtful = int(np.count_nonzero(np.maximum.reduceat(trust[rows], visits.start[:-1]) < DOUBTED))
    mean = visit_means(noise.weight, values, visits.start)
    latest: list[float] = [] if near is None or not near.reseating.estimate > 0.0 else [near.reseating.estimate]

    def seated(one: Design, rank: Rank, modes: Array | None = None) -> Reseating:
        if known is not None:
            return known.reseating
        found = reseating(
            one, mean, noise, rank=rank, stated_variance=u0, estimate=terms.estimate, doubtful=doubtful,
            start=latest[-1] if latest else None, walk=modes, nearly=near is not None,
        )
        if np.isfinite(found.estimate):
            latest.append(found.estimate)
        return found

    solved: dict[tuple[int, ...], tuple[Reseating, Solution]] = {}

    def fit(chosen: tuple[int, ...]) -> tuple[Reseating, Solution] | None:
        """Noise and solution of the chosen orders; None where they are not determined."""
        one, rank = designed(chosen, weighted)
        if undetermined(one, ties, rank) is not None:
            return None
        if chosen not in solved:
            try:
                seat = seated(one, rank)
                solved[chosen] = (seat, _solved(one, 1.0 / (noise.variance + seat.variance), mean, ties))
            except np.linalg.LinAlgError:  # determined in name alone
                return None
        return solved[chosen]

    more: dict[tuple[int, ...], dict[int, tuple[float, float]]] = {}

    def plainly_less(lower: tuple[int, ...], higher: tuple[int, ...]) -> Comparison | None:
        """The comparison with the weights of the lower orders, where it leaves no doubt that they are enough."""
        runs = [run for run, (one, other) in enumerate(zip(lower, higher, strict=True)) if one != other]
        below = fit(lower) if len(runs) == 1 else None
        if below is None:
            return None
        (run,), (seat, solution) = runs, below
        if lower not in more:
            more[lower] = more_drift(RunTerms(solution), basis, visits, weighted)
        steps = higher[run] - lower[run]
        gain, left = more[lower][run][0 if steps == 1 else 1], solution.sum_of_squares()
        freedom = seat.freedom - steps
        if not 0.0 < gain < left or freedom < LEAST_LEFT:
            return None
        doubt = f_chance(gain / steps / ((left - gain) / freedom), steps=steps, freedom=freedom)
        return Comparison(low=left, high=left - gain, freedom=freedom) if doubt > PLAINLY else None

    def compare(lower: tuple[int, ...], higher: tuple[int, ...]) -> Comparison | None:
        if (found := plainly_less(lower, higher)) is not None:
            return found
        above = fit(higher)
        if above is None:
            return None
        seat, solution = above
        added = np.array([one.kind == "drift" and one.power > lower[one.run] for one in solution.design.unknowns])
        return Comparison(
            low=squares_without(solution, added), high=solution.sum_of_squares(), freedom=seat.freedom
        )

    tests: tuple[OrderTest, ...] = ()
    if automatic and len(visits) - rank.rank > MANY_FREEDOM:

        def compare_all(chosen: tuple[int, ...]) -> tuple[int, float, dict[int, tuple[float, float]]]:
            seat, solution = fit(chosen) or _nothing()
            return seat.freedom, solution.sum_of_squares(), more_drift(RunTerms(solution), basis, visits, weighted)

        orders, tests = raised_together(orders, automatic, compare_all)
    elif automatic:
        orders, tests = chosen_orders(orders, automatic, compare)
    final, rank = designed(orders, weighted)
    seat = solved[orders][0] if orders in solved else seated(final, rank)
    likelihood = np.nan
    if seat.freedom > 0 and near is None:
        likelihood = log_likelihood(final, mean, noise.variance + seat.variance, rank=rank)
    walking, walk_tried = None, False
    drifting = [run for run in visits.run_order.tolist() if orders[run] > 0]
    if walk != "off" and drifting:
        plain, plain_rank = final, rank

        def walked(strength: float, modes: int) -> tuple[Design, Rank, Reseating, float]:
            one, _ = designed(orders, weighted, modes)
            along = rank_beside_walk(plain_rank, plain, one)
            prior = walk_priors(basis, one, strength)
            extra = matrix_of(one, prior)
            found = seated(one, along, extra)
            gained = np.nan
            if found.freedom > 0:
                gained = log_likelihood(one, mean, noise.variance + found.variance, rank=along, walk=extra)
            return with_priors(one, prior), along, found, gained

        longest = float(max(basis.length[run] for run in drifting))
        visit_sd = float(np.sqrt(np.median(noise.variance + seat.variance)))

        crossed = crossings(visits)

        def modes_of(strength: float) -> int:
            return modes_for(strength * np.sqrt(longest**3 / 3.0) / visit_sd, crossed)

        walk_tried = not isinstance(walk, str) or walk == "on" or seat.freedom >= LEAST_FREEDOM
        if isinstance(walk, float):
            walking = WalkFit(strength=walk, modes=modes_of(walk), likelihood=np.nan)
        elif walk_tried and seat.freedom > 0:
            variance = noise.variance + seat.variance
            unit = float(np.median(variance))
            strengths, gain = likeliest_strength(
                visits_alone(final, unit / variance, mean, rank, None), basis, visits, weighted,
                freedom=seat.freedom, typical=unit, estimate=terms.estimate,
            )
            wanted = enough_gain(seat.freedom)
            # What all noise scaled together says and what the network says differ little: far below is none.
            if strengths and (walk == "on" or gain > HOPELESS * wanted):
                tried = [
                    WalkFit(strength=one, modes=modes_of(one), likelihood=walked(one, modes_of(one))[3])
                    for one in (strengths if len(strengths) > 1 else (strengths[0] * share for share in BESIDE))
                ]
                best = max(tried, key=lambda one: one.likelihood)
                if walk == "on" or best.likelihood - likelihood > wanted:
                    walking = best
        if walking is not None:
            final, rank, seat, likelihood = walked(walking.strength, walking.modes)
            walking = replace(walking, likelihood=likelihood)
    weight = 1.0 / (noise.variance + seat.variance)
    answers = [visit_means(noise.weight, one[rows], visits.start) for one in responses]
    solution = _solved(final, weight, np.column_stack([mean, *answers]), ties)
    everywhere = np.arange(len(observed))
    whole_held = basis.held(everywhere, orders)
    unknown = solution.unknown[:, 0]
    level = observed - whole_held - drift_of(basis, final, unknown, everywhere, bias=True)
    floor = np.zeros(n_stations)
    np.maximum.at(floor, station[rows], terms.station_floor[rows])
    return Adjustment(
        basis=basis,
        visits=visits,
        design=final,
        solution=solution,
        noise=noise,
        reseating=seat,
        rank=rank,
        tests=tests,
        walk=walking,
        walk_tried=walk_tried,
        likelihood=likelihood,
        held=whole_held,
        visit_mean=mean,
        station_floor=floor,
        border_drift=drift_of(basis, final, unknown, everywhere, bias=False),
        checked=checked(level, visits, solution, noise, seat, basis, station),
    )


def _nothing() -> tuple[Reseating, Solution]:
    raise NumericalError(UNSOLVED)


def _designed(
    basis: DriftBasis,
    visits: Visits,
    weight: Array,
    *,
    n_stations: int,
    orders: tuple[int, ...],
    dropped: tuple[DriftUnknown, ...],
    lost: tuple[DriftUnknown, ...],
    modes: int,
) -> tuple[Design, Rank]:
    """The design of some orders with its rank, found again where the weights within visits are what they were."""
    made = basis.made
    if len(made) > DESIGNS_HELD:
        made.clear()
    shape = (visits, n_stations, orders, dropped, lost, modes)
    key = (*shape, weight.tobytes())
    if key in made:
        return made[key]  # type: ignore[no-any-return]
    if shape in made:
        one, rank = made[shape]
        made[key] = (reweighted(one, visits, weight), rank)
    else:
        one = design(
            basis, visits, weight, n_stations=n_stations, orders=orders, dropped=dropped, lost=lost, modes=modes
        )
        # The modes of a walk are no fixed unknowns: the rank beside them is that of the design without.
        made[key] = made[shape] = (one, rank_of_visits(one) if not modes else NO_RANK)
    return made[key]  # type: ignore[no-any-return]


def squares_without(above: Solution, left_out: NDArray[np.bool_]) -> float:
    """Weighted sum of squares of visit residuals when some border unknowns (q,) are held at 0, weights kept."""
    residual, _ = held_at_nought(above, left_out)
    return float(above.weight @ residual**2)


def held_at_nought(above: Solution, left_out: NDArray[np.bool_]) -> tuple[Array, Array]:
    """Visit residuals (v,) and border unknowns (q,) when some unknowns (q,) are held at 0, weights kept.

    Notes
    -----
    The solution moves by C e (e^T C e)^-1 x_e, e the unknowns left out, C the covariance, x their estimates.
    """
    gone = np.flatnonzero(left_out)
    if not gone.size:
        return above.residual[:, 0], above.unknown[:, 0]
    picked = np.zeros((above.design.size, len(gone)))
    picked[gone, np.arange(len(gone))] = 1.0
    columns = above.factor.solve(picked)
    moved = columns @ np.linalg.solve(columns[gone], above.unknown[gone, 0])
    return above.residual[:, 0] + above.fitted(moved), above.unknown[:, 0] - moved


def _instant(visits: Visits, run: int) -> bool:
    """True for a run whose used readings all share one time: it has no drift."""
    length = visits.run_length[run]
    return not length > 0.0


def _solved(one: Design, weight: Array, observed: Array, ties: TieRows) -> Solution:
    return solve(one, weight, observed if observed.ndim == 2 else observed[:, None], ties)
