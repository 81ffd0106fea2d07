"""The strength of the drift's random walk: by restricted likelihood, kept only when it explains enough.

With the noise of the solution without a walk as the measure, all noise scaled together, the likelihood of every
strength follows from one small matrix: what the other unknowns leave of the walk's modes. The strength of its greatest
is then tried in the network itself, with re-seating noise of its own.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.candidates import RunTerms, normal
from plumbwell.reduction.checked import visit_means
from plumbwell.reduction.drift_basis import DriftBasis
from plumbwell.reduction.network import Solution
from plumbwell.reduction.visits import Visits
from plumbwell.reduction.walk_modes import mode_sds, walk_modes
from plumbwell.survey.column import Array

LEAST_FREEDOM = 10
"""Degrees of freedom under which a walk is not tried."""

MODES = 16
JOINT_RUNS = 6
"""Runs up to which what two of them share is counted; more are taken one by one."""

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
) -> tuple[float, float]:
    """The strength of greatest restricted likelihood, m/s2/s^1.5, and its gain of the logarithm; 0, 0 for none.

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
    modes = walk_modes(basis.time(visits.rows), MODES) * mode_sds(MODES)
    modes *= basis.length[basis.run[visits.rows]][:, None] ** 1.5
    columns = visit_means(weight, modes, visits.start)
    values, squares = _spectrum(solution, columns)
    known = values > 1e-12 * max(float(values.max(initial=0.0)), 1e-300)
    values, squares = values[known], squares[known]
    if not values.size or freedom < 1:
        return 0.0, 0.0
    whole = solution.sum_of_squares()

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
        return 0.0, 0.0
    strength2 = float(tried[best])
    noise = typical
    if estimate:
        noise = max(whole - float(np.sum(strength2 * squares / (1.0 + strength2 * values))), 0.0) / freedom
    return float(np.sqrt(strength2 * noise)), float(gains[best])


def _spectrum(solution: Solution, columns: Array) -> tuple[Array, Array]:
    """Eigenvalues of N, and the squares of z along its eigenvectors."""
    one, terms = solution.design, RunTerms(solution)
    runs = [(run, members) for run, members in terms.runs() if one.orders[run] > 0 and len(members) > 2]
    blocks = []
    if 1 < len(runs) <= JOINT_RUNS and one.layout.count == 1 and not one.layout.corner:
        wide = np.zeros((len(columns), len(runs) * MODES))
        for number, (_, members) in enumerate(runs):
            wide[members, number * MODES : (number + 1) * MODES] = columns[members]
        blocks.append(_whole_normal(solution, wide))
    else:
        blocks += [normal(solution, terms, members, columns[members])[:2] for _, members in runs]
    values, squares = [np.zeros(0)], [np.zeros(0)]
    for gradient, left in blocks:
        own, vectors = np.linalg.eigh(0.5 * (left + left.T))
        values.append(np.maximum(own, 0.0))
        squares.append((vectors.T @ gradient) ** 2)
    return np.concatenate(values), np.concatenate(squares)


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
