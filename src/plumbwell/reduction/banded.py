"""Symmetric positive definite matrices of the network: blocks along the diagonal, their neighbours, and a dense corner.

Runs in time order touch only runs near them, so that the border of the network is banded; what touches every run
(stations of many runs) stands in the corner. A small border is one block. Factor, solve, determinant and those elements
of the inverse that lie on the pattern cost a constant per unknown (Takahashi, Fagan & Chen 1973).
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from plumbwell.survey.column import Array, Index

ONE_BLOCK = 160
"""Unknowns up to which one dense block is quicker than blocks."""

LEAST_BLOCK = 48
SMALLEST_PIVOT = 1e-14
"""Of a matrix with unit diagonal: its rounding."""

SOLVED_AT_ONCE = 256


def summed(where: Index, values: Array, count: int) -> Array:
    """Sums of values by the place each belongs to, (count,)."""
    return np.bincount(where, values, minlength=count).astype(np.float64, copy=False)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Layout:
    """Where the elements of such a matrix stand in one flat array.

    Parameters
    ----------
    size : int
        Unknowns: first those in the band, then those in the corner.
    banded : int
    block : int
        Unknowns a block; any two that are less than half a block apart, and all between them, lie in two
        neighbouring blocks.
    count : int
        Blocks.
    """

    size: int
    banded: int
    block: int
    count: int

    @property
    def corner(self) -> int:
        """Unknowns in the corner."""
        return self.size - self.banded

    @property
    def starts(self) -> tuple[int, int, int, int]:
        """Where the neighbouring blocks, the arrow and the corner start in the flat array, and its length."""
        square = self.block * self.block
        beside = self.count * square
        arrow = beside + max(self.count - 1, 0) * square
        corner = arrow + self.count * self.block * self.corner
        return beside, arrow, corner, corner + self.corner * self.corner

    def place(self, first: Index, second: Index) -> Index:
        """Place of each element in the flat array; -1 where it lies off the pattern."""
        if self.count == 1 and not self.corner:
            return first * self.block + second
        beside, arrow, corner, _ = self.starts
        p, c = self.block, self.corner
        low, high = np.minimum(first, second), np.maximum(first, second)
        of_low, of_high = low // p, high // p
        same = of_low * p * p + (first % p) * p + second % p
        near = beside + of_low * p * p + (high % p) * p + low % p
        place = np.where(of_low == of_high, same, np.where(of_high == of_low + 1, near, -1))
        if c:
            out, both = high >= self.banded, low >= self.banded
            place = np.where(out, arrow + low * c + (high - self.banded), place)
            place = np.where(both, corner + (first - self.banded) * c + (second - self.banded), place)
        return place

    def once(self, first: Index, second: Index) -> NDArray[np.bool_]:
        """True for the ordered pairs that are to be added, so that nothing is added twice: see `mirrored`."""
        return first >= second

    def mirrored(self, flat: Array) -> Array:
        """The flat matrix of which only elements at and below the diagonal have been filled, with those above."""
        p, c, (beside, _, corner, _) = self.block, self.corner, self.starts
        for part, size in ((flat[:beside], p), (flat[corner:], c)):
            if size:
                blocks = part.reshape(-1, size, size)
                whole = blocks + blocks.transpose(0, 2, 1)
                at = np.arange(size)
                whole[:, at, at] -= blocks[:, at, at]
                blocks[:] = whole
        return flat

    def diagonal(self) -> Index:
        """Places of the diagonal elements, (size,)."""
        every = np.arange(self.size)
        return self.place(every, every)


def layout(size: int, corner: int, bandwidth: int) -> Layout:
    """The layout for so many unknowns, of which the last `corner` stand apart, and a bandwidth of the others."""
    banded = size - corner
    block = max(2 * bandwidth + 1, LEAST_BLOCK)
    if banded <= ONE_BLOCK or 2 * block >= banded:
        return Layout(size=size, banded=banded, block=max(banded, 1), count=1)
    return Layout(size=size, banded=banded, block=block, count=-(-banded // block))


@dataclass(frozen=True, eq=False, kw_only=True)
class Factor:
    """A factored matrix.

    Parameters
    ----------
    layout : Layout
    scale : (size,) array
        Makes the diagonal 1.
    spread : (count, p, p) array
        Inverse of each reduced diagonal block.
    carry : (count - 1, p, p) array
        Next block's neighbour times `spread`.
    arrow : (count * p, c) array
        Band inverse times the arrow.
    corner : (c, c) array
        Inverse of the reduced corner.
    log_determinant : float
    pins : (m,) int array
        Unknowns that had no pivot left and were held.
    """

    layout: Layout
    scale: Array
    spread: Array
    carry: Array
    arrow: Array
    corner: Array
    log_determinant: float
    pins: Index = field(default_factory=lambda: np.zeros(0, dtype=np.intp))

    def solve(self, side: Array) -> Array:
        """The solution for right-hand sides (size,) or (size, r)."""
        one = self.layout
        sides = side[:, None] if side.ndim == 1 else side
        scaled = sides * self.scale[:, None]
        if one.count == 1 and not one.corner:
            answer = self.spread[0] @ scaled if one.size else scaled
        else:
            band = self._band(scaled[: one.banded])
            if one.corner:
                low = self.corner @ (scaled[one.banded :] - self.arrow.T @ scaled[: one.banded])
                band = band - self.arrow @ low
                answer = np.concatenate([band, low])
            else:
                answer = band
        answer = answer * self.scale[:, None]
        return answer[:, 0] if side.ndim == 1 else answer

    def _band(self, side: Array) -> Array:
        return _band_solution(self.layout, self.spread, self.carry, side)

    @cached_property
    def inverse(self) -> Array:
        """Elements of the inverse on the pattern, flat as `Layout` says."""
        one = self.layout
        p, c, count = one.block, one.corner, one.count
        beside, arrow, corner, length = one.starts
        flat = np.empty(length)
        blocks = flat[:beside].reshape(count, p, p)
        neighbours = flat[beside:arrow].reshape(max(count - 1, 0), p, p)
        blocks[count - 1] = self.spread[count - 1]
        for k in range(count - 2, -1, -1):
            neighbours[k] = -blocks[k + 1] @ self.carry[k]
            blocks[k] = self.spread[k] - self.carry[k].T @ neighbours[k]
        padded = np.ones(count * p)
        padded[: one.banded] = self.scale[: one.banded]
        if c:
            full = np.zeros((count * p, c))
            full[: one.banded] = self.arrow
            turned = full @ self.corner
            grouped, carried = full.reshape(count, p, c), turned.reshape(count, p, c)
            blocks += carried @ grouped.transpose(0, 2, 1)
            if count > 1:
                neighbours += carried[1:] @ grouped[:-1].transpose(0, 2, 1)
            flat[arrow:corner] = (-turned * padded[:, None] * self.scale[one.banded :]).ravel()
            low = self.scale[one.banded :]
            flat[corner:] = (self.corner * low[:, None] * low).ravel()
        by_block = padded.reshape(count, p)
        blocks *= by_block[:, :, None] * by_block[:, None, :]
        if count > 1:
            neighbours *= by_block[1:, :, None] * by_block[:-1, None, :]
        return flat

    def whole(self) -> Array:
        """The whole inverse, (size, size); for small matrices."""
        return self.solve(np.eye(self.layout.size))


def _band_solution(one: Layout, spread: Array, carry: Array, side: Array) -> Array:
    p, count = one.block, one.count
    if count == 1:
        return spread[0][: one.banded, : one.banded] @ side
    work = np.zeros((count * p, side.shape[1]))
    work[: one.banded] = side
    blocks = work.reshape(count, p, -1)
    for k in range(count - 1):
        blocks[k + 1] -= carry[k] @ blocks[k]
    blocks[count - 1] = spread[count - 1] @ blocks[count - 1]
    for k in range(count - 2, -1, -1):
        blocks[k] = spread[k] @ blocks[k] - carry[k].T @ blocks[k + 1]
    return work[: one.banded]


def factored(one: Layout, flat: Array, *, pin: float = 0.0, scale: Array | None = None) -> Factor:
    """The factor of a matrix given flat.

    Parameters
    ----------
    one : Layout
    flat : array
        The elements; neighbouring blocks and arrow once only.
    pin : float
        Over 0: unknowns whose pivot, the diagonal scaled to 1, is no larger are held (their pivot gets 1 more), and
        the factor is that of the matrix so held.
    scale : (size,) array or None
        What makes the diagonal 1, or what a diagonal element would have been before anything was taken from it.

    Raises
    ------
    numpy.linalg.LinAlgError
        When `pin` is 0 and the matrix is not positive definite.
    """
    p, c, count = one.block, one.corner, one.count
    beside, arrow, corner, _ = one.starts
    diagonal = flat[one.diagonal()] if one.size else np.zeros(0)
    if pin <= 0.0 and not (diagonal > 0.0).all():
        raise np.linalg.LinAlgError("the border of the network is not positive definite")
    if scale is None:
        scale = 1.0 / np.sqrt(np.where(diagonal > 0.0, diagonal, 1.0))
    padded = np.zeros(count * p)
    padded[: one.banded] = scale[: one.banded]
    by_block = padded.reshape(count, p)
    blocks = flat[:beside].reshape(count, p, p) * (by_block[:, :, None] * by_block[:, None, :])
    if one.banded < count * p:
        last = np.arange(one.banded - (count - 1) * p, p)
        blocks[count - 1, last, last] = 1.0
    neighbours = np.zeros((0, p, p))
    if count > 1:
        neighbours = flat[beside:arrow].reshape(count - 1, p, p) * (by_block[1:, :, None] * by_block[:-1, None, :])
    spread, carry = np.empty_like(blocks), np.empty_like(neighbours)
    logarithm, pins = 0.0, []
    for k in range(count):
        reduced = blocks[k]
        if k:
            reduced = reduced - carry[k - 1] @ neighbours[k - 1].T
        inverse, log_det, held = _inverse_root(reduced, pin)
        logarithm += log_det
        pins += [k * p + n for n in held]
        spread[k] = inverse.T @ inverse
        if k < count - 1:
            carry[k] = neighbours[k] @ spread[k]
    turned, low = np.zeros((one.banded, c)), np.zeros((c, c))
    if c:
        side = flat[arrow:corner].reshape(count * p, c)[: one.banded] * scale[: one.banded, None] * scale[one.banded :]
        turned = _band_solution(one, spread, carry, side)
        low_scale = scale[one.banded :]
        reduced = flat[corner:].reshape(c, c) * low_scale[:, None] * low_scale - side.T @ turned
        inverse, log_det, held = _inverse_root(reduced, pin)
        logarithm += log_det
        pins += [one.banded + n for n in held]
        low = inverse.T @ inverse
    return Factor(
        layout=one,
        scale=scale,
        spread=spread,
        carry=carry,
        arrow=turned,
        corner=low,
        log_determinant=logarithm - 2.0 * float(np.sum(np.log(scale))),
        pins=np.array(pins, dtype=np.intp),
    )


def _inverse_root(matrix: Array, pin: float) -> tuple[Array, float, list[int]]:
    """Inverse of the Cholesky factor, log determinant, and the unknowns that were held."""
    if not len(matrix):
        return matrix, 0.0, []
    held: list[int] = []
    try:
        root = np.linalg.cholesky(matrix)
        pivots = np.diagonal(root)
        if pin > 0.0 and float(np.min(pivots)) ** 2 <= pin:
            raise np.linalg.LinAlgError
    except np.linalg.LinAlgError:
        if pin <= 0.0:
            raise
        root, held = _pinned_root(matrix, pin)
        pivots = np.diagonal(root)
    if pin <= 0.0 and float(np.min(pivots)) ** 2 <= SMALLEST_PIVOT:
        raise np.linalg.LinAlgError("the border of the network is not positive definite")
    return np.linalg.inv(root), 2.0 * float(np.sum(np.log(pivots))), held


def _pinned_root(matrix: Array, pin: float) -> tuple[Array, list[int]]:
    """Cholesky factor of a semidefinite matrix whose unknowns without a pivot get one of 1."""
    left = matrix.copy()
    size = len(left)
    root = np.zeros_like(left)
    held = []
    for n in range(size):
        pivot = left[n, n]
        if pivot <= pin:
            held.append(n)
            pivot = 1.0
            left[n + 1 :, n] = 0.0
        root[n, n] = np.sqrt(pivot)
        root[n + 1 :, n] = left[n + 1 :, n] / root[n, n]
        left[n + 1 :, n + 1 :] -= np.outer(root[n + 1 :, n], root[n + 1 :, n])
    return root, held


Rows = tuple[Index, Index, Array]
"""Vectors in coordinate form, vector by vector: number of the vector, unknown, value."""


def products(factor: Factor, one: Rows, other: Rows, count: int) -> Array:
    """a M^-1 b of pairs of vectors with few elements, (count,).

    What lies on the pattern is looked up, for the rest the inverse is applied to a.
    """
    (row, unknown, value), (their_row, their_unknown, their_value) = one, other
    own, theirs = np.bincount(row, minlength=count), np.bincount(their_row, minlength=count)
    begin_own, begin = np.cumsum(own) - own, np.cumsum(theirs) - theirs
    many = theirs[row]
    first = np.repeat(np.arange(len(row)), many)
    second = begin[row][first] + np.arange(len(first)) - np.repeat(np.cumsum(many) - many, many)
    place = factor.layout.place(unknown[first], their_unknown[second])
    known = place >= 0
    product = value[first] * their_value[second] * np.where(known, factor.inverse[place], 0.0)
    found = summed(row[first], product, count)
    apart = np.unique(row[first[~known]])
    for start in range(0, len(apart), SOLVED_AT_ONCE):
        part = apart[start : start + SOLVED_AT_ONCE]
        sides = np.zeros((factor.layout.size, len(part)))
        for column, at in enumerate(part.tolist()):
            inside = slice(int(begin_own[at]), int(begin_own[at] + own[at]))
            sides[unknown[inside], column] = value[inside]
        answers = factor.solve(sides)
        for column, at in enumerate(part.tolist()):
            inside = slice(int(begin[at]), int(begin[at] + theirs[at]))
            found[at] = float(answers[their_unknown[inside], column] @ their_value[inside])
    return found


def columns_of(one: Layout, flat: Array, numbers: Index) -> Array:
    """Columns of a flat matrix, (size, m)."""
    every = np.arange(one.size)
    place = one.place(every[:, None], numbers[None, :])
    return np.where(place >= 0, flat[place], 0.0)


def held(one: Layout, flat: Array, numbers: Index, *, pin: float = 0.0) -> Factor:
    """The factor of a matrix without some of its unknowns: their rows and columns of the inverse are 0."""
    p, c = one.block, one.corner
    beside, arrow, corner, _ = one.starts
    keep = np.ones(one.count * p)
    keep[numbers[numbers < one.banded]] = 0.0
    low = np.ones(c)
    low[numbers[numbers >= one.banded] - one.banded] = 0.0
    left, by_block = flat.copy(), keep.reshape(one.count, p)
    left[:beside].reshape(-1, p, p)[:] *= by_block[:, :, None] * by_block[:, None, :]
    left[beside:arrow].reshape(-1, p, p)[:] *= by_block[1:, :, None] * by_block[:-1, None, :]
    left[arrow:corner].reshape(one.count * p, c)[:] *= keep[:, None] * low
    left[corner:].reshape(c, c)[:] *= low[:, None] * low
    left[one.place(numbers, numbers)] = 1.0
    factor = factored(one, left, pin=pin)
    scale = factor.scale.copy()
    scale[numbers] = 0.0
    return replace(factor, scale=scale)
