"""The weighted least-squares network: stations eliminated, biases, drift and tares in a banded border.

With D the summed weights of a station's visits, B what its visits put on the border and N the border's own
normal matrix, M = N - B^T D^-1 B is factored; gravity follows station by station. The covariance of gravity is
C = D^-1 + P M^-1 P^T with P = -D^-1 B, of which any element is found from those of M^-1 on its pattern.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.banded import Factor, factored, summed
from plumbwell.reduction.design import Design
from plumbwell.survey.column import Array, Index

RANK_TOLERANCE = 1e-10  # of the scaled border matrix; its rounding is near 1e-15 times the number of visits


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TieRows:
    """Observations of gravity itself: station, value m/s2, weight s4/m2."""

    station: Index
    value: Array
    weight: Array


NO_TIES = TieRows(station=np.zeros(0, dtype=np.intp), value=np.zeros(0), weight=np.zeros(0))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Border:
    """The normal equations with the stations eliminated.

    Parameters
    ----------
    matrix : array
        M, flat as the design's layout says.
    total : (s,) array
        D: summed weights of each station, ties included; 1 where there are none or its gravity stands in the border.
    mean : (t + 1,) array
        D^-1 B in the order of `Design.touched_station`: weighted means of the border rows at each station; a last 0.
    """

    matrix: Array
    total: Array
    mean: Array


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Solution:
    """One solution of the network.

    Parameters
    ----------
    design : Design
    ties : TieRows
    weight : (v,) array
        Weight of each visit mean, s4/m2.
    border : Border
    factor : Factor
        Of M.
    gravity : (s, r) array
        One column a right-hand side.
    unknown : (q, r) array
    residual : (v, r) array
        Visit mean less its estimate.
    """

    design: Design
    ties: TieRows
    weight: Array
    border: Border
    factor: Factor
    gravity: Array
    unknown: Array
    residual: Array

    def at_stations(self, unknown: Array) -> Array:
        """How gravity answers to border unknowns (q,) or (q, r): P times them."""
        return answer_of_stations(self.design, self.border, unknown)

    def fitted(self, unknown: Array) -> Array:
        """What border unknowns (q,) put on each visit, (v,), when the stations follow them."""
        one = self.design
        level = np.append(self.at_stations(unknown), 0.0)
        return one.on_visits(unknown) + level[one.local]

    def carried(self) -> Array:
        """D^-1 B M^-1 at what each station touches, (t + 1,), a last 0: less it is the covariance of both."""
        one, inverse = self.design, self.factor.inverse
        pairs, mean = one.touched_pairs, self.border.mean
        on = inverse[pairs.place]
        count = len(mean)
        found = summed(pairs.first, on * mean[pairs.second], count)
        twice = pairs.times > 1.0
        return found + summed(pairs.second[twice], on[twice] * mean[pairs.first[twice]], count)

    def station_variance(self, carried: Array) -> Array:
        """Variance of each station's gravity, (s + 1,), from `carried`; 0 for the last."""
        one = self.design
        own = summed(one.touched_station, carried[:-1] * self.border.mean[:-1], one.n_stations + 1)
        own[: one.n_stations] += 1.0 / self.border.total
        based = np.flatnonzero(one.in_border >= 0)
        own[based] = self.unknown_variance(one.in_border[based])
        return own

    def unknown_variance(self, numbers: Index) -> Array:
        """Variance of border unknowns."""
        return self.factor.inverse[self.design.layout.place(numbers, numbers)]

    def variance_of_fit(self) -> Array:
        """a C a^T of each visit: the variance of its estimate, (v,)."""
        one = self.design
        count = len(self.weight)
        carried = self.carried()
        inverse = self.factor.inverse
        own = summed(one.pair_visit, one.pairs.times * one.pair_value * inverse[one.pairs.place], count)
        cross = summed(one.entry_visit, one.entry_value * carried[one.entry_at], count)
        at_station = self.station_variance(carried)
        at_station[np.flatnonzero(one.in_border >= 0)] = 0.0  # there the pairs of entries hold it
        return own - 2.0 * cross + at_station[one.local]

    def sum_of_squares(self) -> float:
        """Weighted sum of squares of the first right-hand side's visit residuals."""
        return float(self.weight @ self.residual[:, 0] ** 2)


def answer_of_stations(one: Design, border: Border, unknown: Array) -> Array:
    """P times border unknowns (q,) or (q, r): -D^-1 B, and 1 where a station's gravity is one of them."""
    if unknown.ndim == 1:
        answer = -summed(one.touched_station, border.mean[:-1] * unknown[one.touched_unknown], one.n_stations)
    else:
        answer = np.column_stack(
            [answer_of_stations(one, border, column) for column in unknown.T]
            or [np.zeros((one.n_stations, 0))]
        )
        return answer
    based = np.flatnonzero(one.in_border >= 0)
    answer[based] = unknown[one.in_border[based]]
    return answer


def on_border(one: Design, border: Border, stations: Array) -> Array:
    """P^T times station quantities (s,): what they put on the border, (q,)."""
    found = -summed(one.touched_unknown, border.mean[:-1] * stations[one.touched_station], one.size)
    based = np.flatnonzero(one.in_border >= 0)
    found[one.in_border[based]] += stations[based]
    return found


def normal_equations(design: Design, weight: Array, ties: TieRows, *, priors: bool = True) -> Border:
    """The border for given visit weights, with or without the priors."""
    total = summed(design.local, weight, design.n_stations + 1)[: design.n_stations]
    if len(ties.station):
        total = total + summed(ties.station, ties.weight, design.n_stations)
    based = design.in_border >= 0
    safe = np.where((total > 0.0) & ~based, total, 1.0)
    count = len(design.touched_station)
    put = summed(design.entry_at, weight[design.entry_visit] * design.entry_value, count + 1)
    put[count] = 0.0
    mean = put.copy()
    mean[:count] /= safe[design.touched_station]
    length = design.layout.starts[3]
    matrix = summed(design.pairs.place, weight[design.pair_visit] * design.pair_value, length)
    near = design.touched_pairs
    matrix = matrix - summed(near.place, put[near.first] * mean[near.second], length)
    if based.any() and len(ties.station):
        number = design.in_border[ties.station]
        held = number >= 0
        np.add.at(matrix, design.layout.place(number[held], number[held]), ties.weight[held])
    matrix = design.layout.mirrored(matrix)
    return Border(matrix=matrix + design.prior_matrix if priors else matrix, total=safe, mean=mean)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Rank:
    """What the visits alone determine, priors and ties not counted.

    Parameters
    ----------
    rank : int
        Rank of the visits' design, stations and border together.
    held : (m,) int array
        Border unknowns that have to be held for the rest to be determined.
    open : (q, m) array
        Directions of the border that the visits leave open.
    pins : array
        Holds those directions when it is added to the flat border matrix at weights near 1; moves nothing else.
    """

    rank: int
    held: Index
    open: Array
    pins: Array

    @property
    def lacking(self) -> int:
        """How many directions of the border the visits leave open."""
        return len(self.held)


NO_RANK = Rank(rank=0, held=np.zeros(0, dtype=np.intp), open=np.zeros((0, 0)), pins=np.zeros(0))


def rank_of_visits(design: Design) -> Rank:
    """What the visits alone determine."""
    visited = int(np.count_nonzero(np.bincount(design.local, minlength=design.n_stations)[: design.n_stations]))
    held, directions = held_and_open(design, NO_TIES, priors=False)
    rank = visited + design.size - len(held)
    return Rank(rank=rank, held=held, open=directions, pins=_pins(design, held))


def _pins(design: Design, held: Index) -> Array:
    flat = np.zeros(design.layout.starts[3])
    flat[design.layout.place(held, held)] = own_size(design)[held]
    return flat


def rank_beside_walk(rank: Rank, plain: Design, walking: Design) -> Rank:
    """The rank of the fixed unknowns, in the layout of a design that holds the modes of a random walk as well."""
    held = np.array([walking.position[plain.unknowns[one]] for one in rank.held.tolist()], dtype=np.intp)
    moved = np.array([walking.position[one] for one in plain.unknowns], dtype=np.intp)
    directions = np.zeros((walking.size, rank.lacking))
    directions[moved] = rank.open
    return Rank(rank=rank.rank, held=held, open=directions, pins=_pins(walking, held))


def own_size(design: Design) -> Array:
    """Sum of squares of each border unknown's regressor over the visits, (q,); 1 where no visit has any."""
    own = summed(design.entry_unknown, design.entry_value**2, design.size)
    return np.where(own > 0.0, own, 1.0)


def held_and_open(design: Design, ties: TieRows, *, priors: bool) -> tuple[Index, Array]:
    """Border unknowns that have to be held for the rest to be determined, (m,), and the open directions, (q, m).

    Priors, when they count, count as much as one visit: rank is asked for, not strength.
    """
    size = design.size
    if size == 0:
        return np.zeros(0, dtype=np.intp), np.zeros((0, 0))
    ones = TieRows(station=ties.station, value=ties.value, weight=np.ones(len(ties.station)))
    border = normal_equations(design, np.ones(len(design.station)), ones, priors=False)
    flat, scale = border.matrix, 1.0 / np.sqrt(own_size(design))
    if priors and len(design.priors):
        flat = flat + design.prior_at_unit_weight(scale)
    factor = factored(design.layout, flat, pin=RANK_TOLERANCE, scale=scale)
    pins = factor.pins
    if not len(pins):
        return pins, np.zeros((size, 0))
    sides = np.zeros((size, len(pins)))
    sides[pins, np.arange(len(pins))] = 1.0 / scale[pins]
    # With M + e e^T in place of M the answer to e is the open direction through it.
    directions = factor.solve(sides)
    return pins, directions


def solve(design: Design, weight: Array, observed: Array, ties: TieRows, *, pins: Array | None = None) -> Solution:
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
    pins : array or None
        Takes the place of the priors: added to the flat border matrix.

    Raises
    ------
    numpy.linalg.LinAlgError
        When the border is not positive definite.
    """
    border = normal_equations(design, weight, ties, priors=pins is None)
    factor = factored(design.layout, border.matrix if pins is None else border.matrix + pins)
    n_stations = design.n_stations
    based = np.flatnonzero(design.in_border >= 0)
    gravity, unknown, residual = [], [], []
    for column, values in enumerate(observed.T):
        weighted = weight * values
        at_station = summed(design.local, weighted, n_stations + 1)[:n_stations]
        at_border = summed(design.entry_unknown, weighted[design.entry_visit] * design.entry_value, design.size)
        if column == 0:
            if pins is None:
                at_border = at_border + design.prior_side
            pull = summed(ties.station, ties.weight * ties.value, n_stations)
            at_border[design.in_border[based]] += pull[based]
            pull = np.where(design.in_border >= 0, 0.0, pull)
            at_station = at_station + pull
        on_stations = border.mean[:-1] * at_station[design.touched_station]
        at_border = at_border - summed(design.touched_unknown, on_stations, design.size)
        answer = factor.solve(at_border)
        level = at_station / border.total + answer_of_stations(design, border, answer)
        gravity.append(level)
        unknown.append(answer)
        residual.append(values - np.append(level, 0.0)[design.local] - design.on_visits(answer))
    return Solution(
        design=design,
        ties=ties,
        weight=weight,
        border=border,
        factor=factor,
        gravity=np.column_stack(gravity),
        unknown=np.column_stack(unknown),
        residual=np.column_stack(residual),
    )
