"""Covariances of station gravity in networks too wide for a factor of every station: found pair by pair.

Any covariance is a sum of few products with elements of the border's inverse on its pattern. Where a pair needs others,
as two stations that runs of quite other times have read, its answer is solved for.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from plumbwell.reduction.banded import Factor, Rows, products, summed
from plumbwell.reduction.design import Design
from plumbwell.reduction.network import Border, answer_of_stations, on_border
from plumbwell.survey.column import Array, Index

AT_ONCE = 1 << 21
"""Products formed at a time."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Sums:
    """Quantities that are each `by_first` times gravity of one station plus `by_second` times that of another."""

    first: Index
    second: Index
    by_first: Array
    by_second: Array

    def __len__(self) -> int:
        return len(self.first)

    def __getitem__(self, rows: Index) -> Sums:
        return Sums(
            first=self.first[rows],
            second=self.second[rows],
            by_first=self.by_first[rows],
            by_second=self.by_second[rows],
        )


def single(stations: Index) -> Sums:
    """Gravity of the stations themselves."""
    return Sums(
        first=stations, second=stations, by_first=np.ones(len(stations)), by_second=np.zeros(len(stations))
    )


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class WideSpread:
    """s T P M^-1 P^T T^T of a network, with T = 1 - shares times what picks the anchors.

    Parameters
    ----------
    design, border, factor
    anchors : (a,) int array
        Stations whose gravity is taken from others.
    shares : (s, a) array
    answers : (q, a) array
        M^-1 P^T at the anchors.
    sign : float
        1, or -1 where it is taken off another.
    """

    design: Design
    border: Border
    factor: Factor
    anchors: Index
    shares: Array
    answers: Array
    sign: float = 1.0

    def anchored(self, anchors: Index, shares: Array) -> WideSpread:
        """The spread when gravity of further anchors is taken, by these shares (s, a), from every station."""
        picked = np.zeros((self.design.n_stations, len(anchors)))
        picked[anchors, np.arange(len(anchors))] = 1.0
        sides = np.column_stack([on_border(self.design, self.border, one) for one in picked.T])
        return replace(
            self,
            anchors=np.concatenate([self.anchors, anchors]),
            shares=np.hstack([self.shares, shares]),
            answers=np.hstack([self.answers, self.factor.solve(sides)]),
        )

    def between(self, one: Sums, other: Sums) -> Array:
        """Covariances of quantities, pair by pair, (m,)."""
        found = np.empty(len(one))
        widest = int(np.max(np.bincount(self.design.touched_station, minlength=1), initial=1))
        step = max(AT_ONCE // (4 * widest * widest), 1)
        for start in range(0, len(one), step):
            part = np.arange(start, min(start + step, len(one)))
            mine = one[part]
            found[part] = self._between(mine, mine if other is one else other[part])
        return self.sign * found

    def _between(self, one: Sums, other: Sums) -> Array:
        rows = self._rows(one)
        their_rows = rows if other is one else self._rows(other)
        found = products(self.factor, rows, their_rows, len(one))
        if len(self.anchors):
            share, their_share = self._shares(one), self._shares(other)
            at_anchors = self._at_anchors()
            found -= np.einsum("ma,ma->m", share, self._answer(their_rows, len(one)))
            found -= np.einsum("ma,ma->m", their_share, self._answer(rows, len(one)))
            found += np.einsum("ma,ab,mb->m", share, at_anchors, their_share)
            found[np.logical_or(self._nothing(one), self._nothing(other))] = 0.0
        return found

    def _at_anchors(self) -> Array:
        answers = answer_of_stations(self.design, self.border, self.answers)[self.anchors]
        return 0.5 * (answers + answers.T)

    def _nothing(self, one: Sums) -> Array:
        """True where an anchor's gravity is taken from itself."""
        at = np.full(self.design.n_stations, -1)
        whole = self.shares[self.anchors, np.arange(len(self.anchors))] == 1.0
        at[self.anchors[whole]] = 1
        return (at[one.first] > 0) & (one.by_second == 0.0)

    def _shares(self, one: Sums) -> Array:
        return one.by_first[:, None] * self.shares[one.first] + one.by_second[:, None] * self.shares[one.second]

    def _answer(self, rows: Rows, count: int) -> Array:
        row, unknown, value = rows
        found = np.zeros((count, len(self.anchors)))
        np.add.at(found, row, value[:, None] * self.answers[unknown])
        return found

    def _rows(self, one: Sums) -> Rows:
        """Border rows of the quantities in coordinate form: row, unknown, value; by row."""
        design = self.design
        count = np.bincount(design.touched_station, minlength=design.n_stations)
        begin = np.concatenate([[0], np.cumsum(count)[:-1]])
        rows, unknowns, values = [], [], []
        for stations, by in ((one.first, one.by_first), (one.second, one.by_second)):
            many = np.where(by != 0.0, count[stations], 0)
            row = np.repeat(np.arange(len(stations)), many)
            inside = np.arange(len(row)) - np.repeat(np.cumsum(many) - many, many)
            at = begin[stations][row] + inside
            based = np.flatnonzero((design.in_border[stations] >= 0) & (by != 0.0))
            rows += [row, based]
            unknowns += [design.touched_unknown[at], design.in_border[stations[based]]]
            values += [-by[row] * self.border.mean[at], by[based]]
        row, unknown, value = (np.concatenate(part) for part in (rows, unknowns, values))
        key, where = np.unique(row * design.size + unknown, return_inverse=True)
        row, unknown = np.divmod(key, design.size)
        return row, unknown, summed(where, value, len(key))

    def matrix(self, one: Sums) -> Array:
        """The whole covariance of quantities, (m, m)."""
        rows = self._rows(one)
        dense = np.zeros((len(one), self.design.size))
        dense[rows[0], rows[1]] = rows[2]
        whole = dense @ self.factor.solve(dense.T)
        if len(self.anchors):
            share, answer = self._shares(one), self._answer(rows, len(one))
            both = share @ answer.T
            whole += share @ self._at_anchors() @ share.T - both - both.T
            nothing = self._nothing(one)
            whole[nothing] = 0.0
            whole[:, nothing] = 0.0
        return self.sign * whole
