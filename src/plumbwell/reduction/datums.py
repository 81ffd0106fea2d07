"""The datum of each network part, and station gravity with its errors by origin.

Where a tie fixes a part its gravity is absolute; else gravity is 0 at the part's datum station and every
error is that of the difference from there.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.adjustment import Adjustment, run_bias
from plumbwell.reduction.banded import columns_of, factored, held
from plumbwell.reduction.design import Design
from plumbwell.reduction.network import NO_TIES, Border, Solution, TieRows, answer_of_stations, normal_equations
from plumbwell.reduction.network import on_border as border_of
from plumbwell.reduction.network_parts import Parts
from plumbwell.reduction.spread import Spread, low_rank
from plumbwell.reduction.wide_spread import WideSpread
from plumbwell.survey.column import Array, Index

MANY_TARES = 64
"""Tares up to which what freeing them adds is held as a column for each."""

UNDETERMINED = 1e-13  # of a border matrix with unit diagonal: its rounding


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class StationGravity:
    """Gravity of every station and its errors.

    Parameters
    ----------
    gravity : (s,) array
        m/s2; 0 at the datum station of a part without a tie.
    datum : (s,) int array
        Datum station of each station, -1 where a tie fixes its part.
    reading, drift, tare : Spread
        Independent errors by origin: with biases, drift and tares held; what freeing biases and drift adds;
        what freeing tares adds. Where there are ties they are the datum of all three.
    ties : (s, t) array
        Answer of gravity to one sd of each tie: an error that all stations share.
    responses : (s, k) array
        Answers of gravity to the further right-hand sides.
    bias : (k,) array by run code
        Run bias, referred to the datum.
    tare_shift : (m,) array
        To be added to each tare of the basis, where its run's parts have datums of their own.
    """

    gravity: Array
    datum: Index
    reading: Spread
    drift: Spread
    tare: Spread
    ties: Array
    responses: Array
    bias: Array
    tare_shift: Array

    def independent(self) -> Spread:
        """The independent errors together."""
        return self.reading + self.drift + self.tare


def datum_stations(
    parts: Parts, role: tuple[str, ...], elevation: Array, visited: NDArray[np.bool_], *, wanted: int | None
) -> Index:
    """The datum station of each part; -1 where a tie fixes it.

    Parameters
    ----------
    parts : Parts
    role : tuple of str
    elevation : (s,) array
    visited : (s,) bool array
    wanted : int or None
        The station that the recipe names; it serves its own part.
    """
    column = np.array([one == "column" for one in role])
    # The highest column station; a base only when there is no other; unvisited stations never.
    order = np.lexsort((np.arange(len(role)), -elevation, ~column, ~visited))
    datum = np.full(parts.count, -1)
    for station in order[::-1].tolist():
        datum[parts.of_station[station]] = station
    if wanted is not None:
        datum[parts.of_station[wanted]] = wanted
    datum[parts.tied] = -1
    return datum


def referred_gravity(adjustment: Adjustment, parts: Parts, ties: TieRows, datum_of_part: Index) -> StationGravity:
    """Station gravity referred to its datums, with errors by origin."""
    solution, design = adjustment.solution, adjustment.design
    datum = datum_of_part[parts.of_station]
    raw = solution.gravity
    taken = datum >= 0
    gravity = raw.copy()
    gravity[taken] -= raw[datum[taken]]
    tie_columns = _tie_columns(solution, ties)
    border = normal_equations(design, solution.weight, NO_TIES) if len(ties.station) else solution.border
    of_visits = np.bincount(design.station, solution.weight, minlength=len(raw))
    visited = of_visits > 0.0
    own = np.where(visited, 1.0 / np.where(visited, of_visits, 1.0), 0.0)
    floor = np.where(visited, np.maximum(adjustment.station_floor**2 - own, 0.0), 0.0)
    # Ties are a datum spread over the tied stations: the errors of the visits alone, less what the ties take over
    # of the errors at the tied stations. What visits alone leave open (the level at least) falls out of that.
    tied = np.unique(ties.station) if len(ties.station) else ties.station
    taken_over = np.zeros((len(own), len(tied)))
    np.add.at(taken_over.T, np.searchsorted(tied, ties.station), (tie_columns * np.sqrt(ties.weight)).T)
    # The floor is an error of each station's own, before any datum.
    reading = Spread(diagonal=own, columns=np.zeros((len(own), 0)), signs=np.zeros(0)).anchored(tied, taken_over)
    reading = Spread(diagonal=reading.diagonal + floor, columns=reading.columns, signs=reading.signs)
    tares = np.array([n for n, one in enumerate(design.unknowns) if one.kind == "tare"], dtype=np.intp)
    if design.layout.count == 1 and not design.layout.corner:
        drift, tare = _by_roots(design, border, tares, least=UNDETERMINED if len(tied) else 0.0)
    else:
        drift, tare = _by_pairs(design, border, tares, own, tied=bool(len(tied)))
    drift, tare = drift.anchored(tied, taken_over), tare.anchored(tied, taken_over)
    bias = run_bias(adjustment.basis, design, solution.unknown[:, 0])
    for run, part in enumerate(parts.of_run.tolist()):
        if part >= 0 and datum_of_part[part] >= 0:
            bias[run] += raw[datum_of_part[part], 0]
    return StationGravity(
        gravity=gravity[:, 0],
        datum=datum,
        reading=reading.referred(datum),
        drift=drift.referred(datum),
        tare=tare.referred(datum),
        ties=tie_columns,
        responses=gravity[:, 1:],
        bias=bias,
        tare_shift=_tare_shifts(adjustment, parts, datum_of_part),
    )


def _by_roots(design: Design, border: Border, tares: Index, *, least: float) -> tuple[Spread, Spread]:
    """What freeing biases and drift adds, and then tares, by a factor of the whole border.

    Without a tie the solution itself has shown that nothing is left open, however weak a prior may be: `least` is 0.
    """
    size = design.size
    matrix = border.matrix[: size * size].reshape(size, size)
    dense = np.zeros((design.n_stations, size))
    dense[design.touched_station, design.touched_unknown] = -border.mean[:-1]
    others = np.setdiff1d(np.arange(size), tares)
    root = _inverse_root(matrix[np.ix_(others, others)] if len(tares) else matrix, least)
    drift = low_rank(dense[:, others] @ root)
    if not len(tares):
        return drift, low_rank(np.zeros((len(dense), 0)))
    carry = np.zeros((size, len(tares)))
    across = matrix[np.ix_(others, tares)]
    carry[others] = -root @ (root.T @ across)
    carry[tares] = np.eye(len(tares))
    left = matrix[np.ix_(tares, tares)] + across.T @ carry[others]
    return drift, low_rank(dense @ carry @ _inverse_root(left, least))


def _by_pairs(
    design: Design, border: Border, tares: Index, own: Array, *, tied: bool
) -> tuple[Spread, Spread]:
    """The same where the border is too wide for it: what drift adds is worked out pair by pair."""
    shape = design.layout
    pin = UNDETERMINED if tied else 0.0
    factor = held(shape, border.matrix, tares, pin=pin) if len(tares) else factored(shape, border.matrix, pin=pin)
    nothing = np.zeros((design.n_stations, 0))
    wide = WideSpread(
        design=design, border=border, factor=factor, anchors=np.zeros(0, dtype=np.intp), shares=nothing,
        answers=np.zeros((design.size, 0)),
    )
    # Gravity that stands in the border has its error by readings there too.
    inside = np.where(design.in_border >= 0, -own, 0.0)
    drift = Spread(diagonal=inside, columns=nothing, signs=np.zeros(0), wide=(wide,))
    if not len(tares):
        return drift, low_rank(nothing)
    if len(tares) > MANY_TARES:
        # A column for each would take stations times tares: what freeing them adds is taken as a difference.
        freed = replace(wide, factor=factored(shape, border.matrix, pin=pin))
        return drift, replace(low_rank(nothing), wide=(freed, replace(wide, sign=-1.0)))
    carry = columns_of(shape, border.matrix, tares)
    among = carry[tares].copy()
    carry[tares] = 0.0
    across = carry
    carry = -factor.solve(across)
    left = among + across.T @ carry
    carry[tares] = np.eye(len(tares))
    root = _inverse_root(left, pin)
    return drift, low_rank(answer_of_stations(design, border, carry @ root))


def _inverse_root(matrix: Array, least: float) -> Array:
    """A factor L with L L^T the inverse of a symmetric matrix, its unknowns scaled first; directions whose
    eigenvalue is not over `least` are left out."""
    if len(matrix) == 0:
        return matrix
    diagonal = np.diagonal(matrix)
    scale = 1.0 / np.sqrt(np.where(diagonal > 0.0, diagonal, 1.0))
    values, vectors = np.linalg.eigh(matrix * scale[:, None] * scale[None, :])
    known = values > least
    return scale[:, None] * vectors[:, known] / np.sqrt(values[known])


def _tie_columns(solution: Solution, ties: TieRows) -> Array:
    """Answer of every station to one sd of each tie, (s, t)."""
    one, border = solution.design, solution.border
    picked = np.zeros((one.n_stations, len(ties.station)))
    picked[ties.station, np.arange(len(ties.station))] = 1.0
    sides = np.column_stack([border_of(one, border, column) for column in picked.T] or [np.zeros((one.size, 0))])
    columns = answer_of_stations(one, border, solution.factor.solve(sides))
    columns += picked * np.where(one.in_border >= 0, 0.0, 1.0 / border.total)[:, None]
    return columns * np.sqrt(ties.weight)


def _tare_shifts(adjustment: Adjustment, parts: Parts, datum_of_part: Index) -> Array:
    """What each free tare takes over when the readings after it hang on another datum than those before."""
    basis, raw = adjustment.basis, adjustment.solution.gravity[:, 0]

    def level(part: int) -> float:
        return float(raw[datum_of_part[part]]) if part >= 0 and datum_of_part[part] >= 0 else 0.0

    shift = np.zeros(len(basis.tares))
    before = [level(part) for part in parts.of_run.tolist()]
    for number in sorted(range(len(basis.tares)), key=lambda one: basis.tares[one].time):
        if basis.tares[number].size is not None or parts.of_tare[number] < 0:
            continue  # of a stated size; or nothing is read before the next tare, so that there is no level to refer to
        run, after = int(basis.tare_run[number]), level(int(parts.of_tare[number]))
        shift[number] = after - before[run]
        before[run] = after
    return shift
