"""Adjustments of the same visits held against one another: what may be compared, likelihoods that can be, and F.

The restricted likelihood is that of what is left when the fixed unknowns are taken out. Models with different fixed
unknowns leave different things, in different numbers, and their restricted likelihoods are densities in different
spaces: a change of the unit of gravity alone would change their difference. What all models here share are the
gravity of stations and the biases of runs. Freed of these alone, the visits are the same data to every model, and drift
and tares are parameters of their mean, to be integrated over a prior that is the same whatever noise or walk goes with
them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjusted_network import held_at_nought
from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.chance import f_chance
from plumbwell.reduction.design import design, walk_priors
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.reduction.network import Solution, rank_of_visits
from plumbwell.reduction.restricted_likelihood import visits_alone
from plumbwell.survey.column import Array

Name = tuple[str, int, float]
"""What an unknown is in any model: its kind, its run, and its power or time."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ChangeTest:
    """The F test of a model within a larger one: F, its degrees of freedom, and the chance of it."""

    f: float
    steps: int
    freedom: int
    p: float


def _name(fit: Adjustment, what: DriftUnknown) -> Name:
    if what.kind == "tare":
        return "tare", what.run, fit.basis.tares[what.tare].time
    return what.kind, what.run, float(what.power if what.kind == "drift" else what.station)


def _numbers(fit: Adjustment) -> dict[Name, int]:
    """The powers of drift and the tares that the visits determine, with their numbers in the border."""
    held = set(fit.rank.held.tolist())
    return {
        _name(fit, what): number
        for number, what in enumerate(fit.design.unknowns)
        if what.kind in ("drift", "tare") and number not in held
    }


def drift_terms(fit: Adjustment) -> int:
    """How many powers of drift and tares the visits determine."""
    return len(_numbers(fit))


def _levels(fit: Adjustment) -> tuple[int, frozenset[Name]]:
    """Rank of the stations and biases, and which constants are not estimated from the visits."""
    one = fit.design
    away = [*(one.unknowns[number] for number in fit.rank.held.tolist()), *one.dropped, *one.lost]
    constant = frozenset(_name(fit, what) for what in away if what.kind not in ("drift", "tare"))
    return fit.rank.rank - drift_terms(fit), constant


def same_levels(one: Adjustment, other: Adjustment) -> bool:
    """True where both rest on the same visits, and free them of the same stations and biases."""
    return (
        np.array_equal(one.visits.rows, other.visits.rows)
        and np.array_equal(one.visits.start, other.visits.start)
        and _levels(one) == _levels(other)
    )


def comparable_likelihood(fit: Adjustment, reference: Array) -> float:
    """Logarithm of the likelihood of the visits freed of stations and biases alone; NaN without degrees of freedom.

    Up to a constant that all models with the same stations and biases share (see `same_levels`): their differences are
    logarithms of likelihood ratios, whatever their drift orders, tares and walks. Where orders and tares are the same
    they are those of the restricted likelihoods.

    Parameters
    ----------
    fit : Adjustment
    reference : (v,) array
        Variances of the visits by which the prior of drift and tares is scaled, the same for all that is compared.

    Notes
    -----
    With X0 the columns of stations and biases, X1 those of drift and tares, b, and X = (X0, X1), the restricted
    likelihood of X is that of X0 integrated over b with a density of 1 a unit of b (Harville 1974). Units of one model
    are not those of another. A density of |2 pi C|^-1/2, C the covariance of b by the reference variances without a
    walk, has no units and asks nothing of the model's own noise:

        -1/2 (log|V| + log|X^T V^-1 X| + y^T P y) - 1/2 log|C| .

    A model whose noise is the reference thus has its likelihood at the best b. A prior that knows as much of b as one
    of n readings does has the covariance n C, whose root of the determinant is n^(q/2) times as large: that is BIC
    (Kass & Wasserman 1995). Unknowns that the visits leave open are pinned in both terms, and their pins fall out.
    """
    if not np.isfinite(fit.likelihood):
        return np.nan
    one, rank = fit.design, fit.rank
    if fit.walk is not None:
        one = design(
            fit.basis, fit.visits, fit.noise.weight, n_stations=one.n_stations, orders=fit.orders, dropped=one.dropped,
            lost=one.lost,
        )
        rank = rank_of_visits(one)
    held = rank.held.tolist()
    own = [
        number
        for number, what in enumerate(one.unknowns)
        if what.kind in ("drift", "tare") and number not in held
    ]
    both = np.array([*own, *held], dtype=np.intp)
    if not both.size:
        return fit.likelihood
    typical = float(np.median(reference))
    solution = visits_alone(one, typical / reference, fit.visit_mean, rank, None)
    picked = np.zeros((one.size, len(both)))
    picked[both, np.arange(len(both))] = 1.0
    covariance = solution.factor.solve(picked)[both]
    return fit.likelihood - 0.5 * (float(np.linalg.slogdet(covariance)[1]) + len(own) * float(np.log(typical)))


def information_criterion(fit: Adjustment, likelihood: float, *, variances: int) -> float:
    """BIC: -2 `comparable_likelihood` + q ln(n), lower is better; it compares what that compares.

    Parameters
    ----------
    fit : Adjustment
    likelihood : float
        Logarithm of its comparable likelihood.
    variances : int
        How many parameters of the noise, walk included, are estimated. q counts the drift and the tares besides.

    Notes
    -----
    n are the degrees of freedom of the visits less stations and biases: the same for every model.
    """
    terms = drift_terms(fit)
    freedom = fit.reseating.freedom + terms
    return -2.0 * likelihood + (terms + variances) * float(np.log(max(freedom, 1)))


def _walk_squares(fit: Adjustment, unknown: Array) -> float:
    if fit.walk is None:
        return 0.0
    prior = walk_priors(fit.basis, fit.design, fit.walk.strength)
    return float(np.sum((unknown[prior.unknown] / prior.sd) ** 2))


def squares(fit: Adjustment) -> float:
    """Weighted sum of squares of what the model leaves, with as many degrees of freedom as it has: those of the visits,
    and those of the modes of a walk, which is left as well."""
    return fit.solution.sum_of_squares() + _walk_squares(fit, fit.solution.unknown[:, 0])


def _squares_without(fit: Adjustment, left_out: NDArray[np.bool_]) -> float:
    solution: Solution = fit.solution
    residual, unknown = held_at_nought(solution, left_out)
    return float(solution.weight @ residual**2) + _walk_squares(fit, unknown)


def change_test(one: Adjustment, other: Adjustment) -> ChangeTest | None:
    """The F test of the smaller of two models within the larger; None where neither lies within the other.

    Both with the noise of the larger, and its walk: the sum of squares rises by so much when the terms that only the
    larger has are held at 0. They lie within one another when the visits, stations, biases, parts of the drift that
    are known and a walk or none are the same, and the one has all the drift and tares of the other and more.
    """
    if not same_levels(one, other) or (one.walk is None) != (other.walk is None):
        return None
    if not np.array_equal(one.held, other.held):
        return None
    low, high = (one, other) if drift_terms(one) < drift_terms(other) else (other, one)
    lower, higher = _numbers(low), _numbers(high)
    more = sorted(number for name, number in higher.items() if name not in lower)
    freedom = high.reseating.freedom
    if not more or not lower.keys() <= higher.keys() or freedom < 1:
        return None
    left_out = np.zeros(high.design.size, dtype=bool)
    left_out[more] = True
    left = squares(high)
    if not left > 0.0:
        return None
    f = max(_squares_without(high, left_out) - left, 0.0) / len(more) / (left / freedom)
    return ChangeTest(f=f, steps=len(more), freedom=freedom, p=f_chance(f, steps=len(more), freedom=freedom))
