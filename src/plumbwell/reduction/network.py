"""The weighted least-squares network: stations eliminated, biases, drift and tares in a small border.

With D the summed weights of a station's visits, B what its visits put on the border and N the border's own
normal matrix, M = N - B^T D^-1 B is solved by Cholesky; gravity follows station by station. The covariance of
gravity is diagonal plus low rank, C = D^-1 + P M^-1 P^T with P = -D^-1 B, and is kept in that form.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.design import Design
from plumbwell.survey.column import Array, Index

RANK_TOLERANCE = 1e-10  # of the scaled border matrix; its rounding is near 1e-15 times the number of visits


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TieRows:
    """Observations of gravity itself: station, value m/s2, weight s4/m2."""

    station: Index
    value: Array
    weight: Array


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Solution:
    """One solution of the network.

    Parameters
    ----------
    design : Design
    ties : TieRows
    weight : (v,) array
        Weight of each visit mean, s4/m2.
    total : (s,) array
        D: summed weights of each station, ties included.
    mean : (s, q) array
        D^-1 B: weighted mean of the border rows at each station.
    border : (q, q) array
        M^-1, the covariance of the border unknowns.
    border_matrix : (q, q) array
        M.
    gravity : (s, r) array
        One column a right-hand side.
    unknown : (q, r) array
    residual : (v, r) array
        Visit mean less its estimate.
    """

    design: Design
    ties: TieRows
    weight: Array
    total: Array
    mean: Array
    border: Array
    border_matrix: Array
    gravity: Array
    unknown: Array
    residual: Array

    def fitted(self, unknown: Array) -> Array:
        """What border unknowns (q,) put on each visit, (v,), when the stations follow them."""
        one = self.design
        on_visit = np.bincount(
            one.entry_visit, one.entry_value * unknown[one.entry_unknown], minlength=len(self.weight)
        )
        return on_visit - (self.mean @ unknown)[one.station]

    def variance_of_fit(self) -> Array:
        """a C a^T of each visit: the variance of its estimate, (v,)."""
        one = self.design
        spread = self.mean @ self.border
        own = np.bincount(
            one.pair_visit, one.pair_value * self.border.ravel()[one.pair_flat], minlength=len(self.weight)
        )
        cross = np.bincount(
            one.entry_visit, one.entry_value * spread.ravel()[one.entry_flat], minlength=len(self.weight)
        )
        at_station = np.einsum("sq,sq->s", spread, self.mean)
        station = one.station
        return 1.0 / self.total[station] + own - 2.0 * cross + at_station[station]

    def sum_of_squares(self) -> float:
        """Weighted sum of squares of the first right-hand side's visit residuals."""
        return float(self.weight @ self.residual[:, 0] ** 2)


def border_matrix(
    design: Design, weight: Array, ties: TieRows, *, priors: bool = True
) -> tuple[Array, Array, Array]:
    """M, D and D^-1 B for given visit weights, with or without the priors."""
    size, n_stations = design.size, design.n_stations
    total = np.bincount(design.station, weight, minlength=n_stations)
    if len(ties.station):
        total = total + np.bincount(ties.station, ties.weight, minlength=n_stations)
    on_border = np.bincount(
        design.entry_flat, weight[design.entry_visit] * design.entry_value, minlength=n_stations * size
    ).reshape(n_stations, size)
    own = np.bincount(design.pair_flat, weight[design.pair_visit] * design.pair_value, minlength=size * size)
    safe = np.where(total > 0.0, total, 1.0)
    mean = on_border / safe[:, None]
    matrix = own.reshape(size, size) - on_border.T @ mean
    return (matrix + design.prior_matrix if priors else matrix), safe, mean


NO_TIES = TieRows(station=np.zeros(0, dtype=np.intp), value=np.zeros(0), weight=np.zeros(0))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Rank:
    """What the visits alone determine, priors and ties not counted.

    Parameters
    ----------
    rank : int
        Rank of the visits' design, stations and border together.
    lacking : int
        How many directions of the border the visits leave open.
    pins : (q, q) array
        Holds those directions when it is added to the border matrix at weights near 1; moves nothing else.
    """

    rank: int
    lacking: int
    pins: Array


def rank_of_visits(design: Design) -> Rank:
    """What the visits alone determine."""
    visited = int(np.count_nonzero(np.bincount(design.station)))
    values, vectors, scale = spectrum(design, NO_TIES, priors=False)
    known = values > RANK_TOLERANCE
    pinned = vectors[:, ~known] / scale[:, None]
    count = int(np.count_nonzero(known))
    return Rank(rank=visited + count, lacking=design.size - count, pins=pinned @ pinned.T)


def spectrum(design: Design, ties: TieRows, *, priors: bool) -> tuple[Array, Array, Array]:
    """Eigenvalues and vectors of the border matrix at unit weights, its unknowns scaled to their own size; the scale.

    Priors, when they count, count as much as one visit: rank is asked for, not strength.
    """
    size = design.size
    if size == 0:
        return np.zeros(0), np.zeros((0, 0)), np.zeros(0)
    ones = TieRows(station=ties.station, value=ties.value, weight=np.ones(len(ties.station)))
    matrix, _, _ = border_matrix(design, np.ones(len(design.station)), ones, priors=False)
    own = np.bincount(design.pair_flat, design.pair_value, minlength=size * size)[:: size + 1]
    scale = 1.0 / np.sqrt(np.where(own > 0.0, own, 1.0))
    matrix = matrix * scale[:, None] * scale[None, :]
    for prior in design.priors if priors else ():
        factors = prior.factors * scale[prior.unknowns]
        factors = factors / np.linalg.norm(factors)
        matrix[np.ix_(prior.unknowns, prior.unknowns)] += factors[:, None] * factors[None, :]
    values, vectors = np.linalg.eigh(0.5 * (matrix + matrix.T))
    return values, vectors, scale


def solve(design: Design, weight: Array, observed: Array, ties: TieRows) -> Solution:
    """The least-squares solution for given weights.

    Parameters
    ----------
    design : Design
        Its border must be determined (see `rank_of_visits`).
    weight : (v,) array
    observed : (v, r) array
        Visit means, m/s2; the first column is the survey itself. Ties and priors enter the first column
        only, the others ask how the solution answers a change of the readings.
    ties : TieRows

    Raises
    ------
    numpy.linalg.LinAlgError
        When the border is not positive definite.
    """
    matrix, total, mean = border_matrix(design, weight, ties)
    border = _inverse(matrix)
    gravity, unknown, residual = [], [], []
    for column, values in enumerate(observed.T):
        weighted = weight * values
        at_station = np.bincount(design.station, weighted, minlength=design.n_stations)
        at_border = 1.0 * np.bincount(
            design.entry_unknown, weighted[design.entry_visit] * design.entry_value, minlength=design.size
        )
        if column == 0:
            at_border += design.prior_side
            np.add.at(at_station, ties.station, ties.weight * ties.value)
        answer = border @ (at_border - at_station @ mean)
        level = at_station / total - mean @ answer
        on_visit = np.bincount(
            design.entry_visit, design.entry_value * answer[design.entry_unknown], minlength=len(weight)
        )
        gravity.append(level)
        unknown.append(answer)
        residual.append(values - level[design.station] - on_visit)
    return Solution(
        design=design,
        ties=ties,
        weight=weight,
        total=total,
        mean=mean,
        border=border,
        border_matrix=matrix,
        gravity=np.column_stack(gravity),
        unknown=np.column_stack(unknown),
        residual=np.column_stack(residual),
    )


def _inverse(matrix: Array) -> Array:
    """Inverse of a symmetric positive definite matrix, its unknowns scaled to a unit diagonal first."""
    if len(matrix) == 0:
        return matrix
    diagonal = matrix.diagonal()
    if not (diagonal > 0.0).all():
        raise np.linalg.LinAlgError("the border of the network is not positive definite")
    scale = 1.0 / np.sqrt(diagonal)
    root = np.linalg.cholesky(matrix * scale[:, None] * scale[None, :])
    inverse = np.linalg.inv(root) * scale[None, :]
    return inverse.T @ inverse
