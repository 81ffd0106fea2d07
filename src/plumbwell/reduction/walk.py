"""The strength of the drift's random walk: by restricted likelihood, kept only when it explains enough.

With the noise of the solution without a walk as the measure, all noise scaled together, the likelihood of every
strength follows from one small matrix: what the other unknowns leave of the walk's modes. The strength of its greatest
is then tried in the network itself, with re-seating noise of its own.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.drift_basis import DriftBasis
from plumbwell.reduction.network import Solution
from plumbwell.reduction.run_terms import RunTerms
from plumbwell.reduction.visits import Visits
from plumbwell.reduction.walk_modes import mode_sds, walk_modes
from plumbwell.survey.column import Array, Index

LEAST_FREEDOM = 10
"""Degrees of freedom under which a walk is not tried."""

MODES, LEAST_MODES = 16, 4
MOST_TOGETHER = 320
"""Modes of all runs that are weighed together; of more runs each is weighed alone."""

FURTHER = (1.0, 2.0, 4.0)
"""What the first step from no walk is tried at in the network, where runs were weighed alone."""

STRENGTHS = 81
FINER = 41


@dataclass(frozen=True, slots=True, kw_only=True)
class WalkFit:
    """A walk of one strength, m/s2/s^1.5: number of modes, and the log of the restricted likelihood."""

    strength: float
    modes: int
    likelihood: float


def enough_gain(freedom: int) -> float:
    """Gain of the logarithm of the likelihood for which a walk is kept."""
    return 0.5 * float(np.log(freedom)) if freedom > 1 else np.inf


def likeliest_strength(
    solution: Solution,
    basis: DriftBasis,
    visits: Visits,
    weight: Array,
    *,
    freedom: int,
    typical: float,
    estimate: bool,
) -> tuple[tuple[float, ...], float]:
    """Strengths at which the restricted likelihood may be greatest, m/s2/s^1.5, and its gain of the logarithm.

    None where it falls from no walk on. One where all runs could be weighed together.

    Parameters
    ----------
    solution : Solution
        Of the visits alone, without a walk, weights in units of one over `typical`.
    basis, visits
    weight : (u,) array
        Share of each reading in its visit's mean.
    freedom : int
    typical : float
        m2/s4.
    estimate : bool
        True: all noise is scaled to fit at each strength; False: it is held.

    Notes
    -----
    With Z the modes times their sds at strength 1, N = Z^T P Z and z = Z^T P y, P what the other unknowns leave of the
    weights, the squares left at strength s are S0 - s2 z^T (1 + s2 N)^-1 z, and log det(1 + s2 N) is added (Harville
    1977, by the identity of Woodbury).
    """
    one, terms = solution.design, RunTerms(solution)
    drifting = np.flatnonzero(np.array(one.orders)[terms.layout.runs] > 0)
    if not drifting.size or freedom < 1:
        return (), 0.0
    together = one.layout.count == 1 and not one.layout.corner and LEAST_MODES * len(drifting) <= MOST_TOGETHER
    count = int(np.clip(MOST_TOGETHER // len(drifting), LEAST_MODES, MODES))
    modes = walk_modes(basis.time(visits.rows), count) * mode_sds(count)
    modes *= basis.length[basis.run[visits.rows]][:, None] ** 1.5
    columns = visit_means(weight, modes, visits.start)
    if not together:
        return _first_step(terms, drifting, columns, typical)
    wide = np.zeros((len(columns), len(drifting) * count))
    for number, run in enumerate(drifting.tolist()):
        members = terms.layout.run_of == run
        wide[members, number * count : (number + 1) * count] = columns[members]
    gradient, left_of = _whole_normal(solution, wide)
    values, vectors = np.linalg.eigh(0.5 * (left_of + left_of.T))
    squares = (vectors.T @ gradient) ** 2
    known = values > 1e-12 * max(float(values.max(initial=0.0)), 1e-300)
    values, squares = values[known], squares[known]
    whole = solution.sum_of_squares()
    if not values.size or not whole > 0.0:
        return (), 0.0

    def gain(strength2: Array) -> Array:
        grown = 1.0 + strength2[:, None] * values
        left = whole - np.sum(strength2[:, None] * squares / grown, axis=1)
        left = np.maximum(left, 1e-12 * whole)
        fall = freedom * np.log(whole / left) if estimate else (whole - left) / typical
        return 0.5 * (fall - np.sum(np.log(grown), axis=1))

    unit = 1.0 / float(values.max())
    tried = unit * np.logspace(-3.0, 9.0, STRENGTHS)
    best = int(np.argmax(gain(tried)))
    step = np.log(tried[1] / tried[0])
    tried = tried[best] * np.exp(np.linspace(-step, step, FINER))
    gains = gain(tried)
    best = int(np.argmax(gains))
    if not gains[best] > 0.0:
        return (), 0.0
    strength2 = float(tried[best])
    noise = typical
    if estimate:
        noise = max(whole - float(np.sum(strength2 * squares / (1.0 + strength2 * values))), 0.0) / freedom
    strength = float(np.sqrt(strength2 * noise))
    return ((strength,), float(gains[best])) if strength > 0.0 else ((), 0.0)


def _first_step(
    terms: RunTerms, drifting: Index, columns: Array, typical: float
) -> tuple[tuple[float, ...], float]:
    """Strengths by one step of scoring from no walk, runs taken as independent (Rao 1948), and what it gains."""
    gradient, left, _ = terms.normal(columns)
    gradient, left = gradient[drifting], left[drifting]
    trace = float(np.sum(np.diagonal(left, axis1=1, axis2=2)))
    slope = 0.5 * (float(np.sum(gradient**2)) / typical - trace) / typical
    information = 0.5 * float(np.sum(left**2)) / typical**2
    if not slope > 0.0:
        return (), 0.0
    strength = float(np.sqrt(slope / information))
    return tuple(strength * one for one in FURTHER), slope**2 / (2.0 * information)


def _whole_normal(solution: Solution, columns: Array) -> tuple[Array, Array]:
    """Gradient and what the other unknowns leave, of columns that may be of several runs; one block of border."""
    one, weight = solution.design, solution.weight
    weighted = weight[:, None] * columns
    at_station = np.zeros((one.n_stations + 1, columns.shape[1]))
    np.add.at(at_station, one.local, weighted)
    total = np.append(solution.border.total, np.inf)
    on_border = np.zeros((one.size, columns.shape[1]))
    np.add.at(on_border, one.entry_unknown, one.entry_value[:, None] * weighted[one.entry_visit])
    np.add.at(
        on_border, one.touched_unknown, -solution.border.mean[:-1, None] * at_station[one.touched_station]
    )
    left = weighted.T @ columns - (at_station / total[:, None]).T @ at_station
    return weighted.T @ solution.residual[:, 0], left - on_border.T @ solution.factor.solve(on_border)
