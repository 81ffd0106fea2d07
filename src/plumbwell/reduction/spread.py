"""Covariances of station gravity in the form in which the network gives them: diagonal plus low rank.

A spread stands for C = diag(d) + sum of s_k c_k c_k^T with signs s_k of +1 or -1, so that ten thousand stations
cost no more than their number times the border's. What a border of many hundreds of runs adds is kept as it is and
worked out pair by pair.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.wide_spread import WideSpread, single
from plumbwell.survey.column import Array, Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Spread:
    """A covariance of n quantities: `diagonal` (n,), `columns` (n, r), `signs` (r,), and what wide networks add."""

    diagonal: Array
    columns: Array
    signs: Array
    wide: tuple[WideSpread, ...] = ()

    def variance(self) -> Array:
        """The n variances; rounding below 0 is taken as 0."""
        every = np.arange(len(self.diagonal))
        return np.maximum(self.diagonal + self.columns**2 @ self.signs + self._wide_between(every, every), 0.0)

    def matrix(self) -> Array:
        """The whole covariance, (n, n)."""
        whole = np.diag(self.diagonal) + (self.columns * self.signs) @ self.columns.T
        for one in self.wide:
            whole += one.matrix(single(np.arange(len(self.diagonal))))
        return whole

    def between(self, first: Index, second: Index) -> Array:
        """Covariances of chosen pairs, (m,)."""
        low = np.einsum("mr,mr,r->m", self.columns[first], self.columns[second], self.signs)
        own = np.where(first == second, self.diagonal[first], 0.0)
        return low + own + self._wide_between(first, second)

    def _wide_between(self, first: Index, second: Index) -> Array:
        return sum((one.between(single(first), single(second)) for one in self.wide), np.zeros(len(first)))

    def referred(self, datum: Index) -> Spread:
        """The spread of each quantity less its datum's; `datum` (n,) names the quantity, -1 where nothing is taken."""
        taken = datum >= 0
        if not taken.any():
            return self
        own = np.unique(datum[taken])
        return self.anchored(own, np.where(datum[:, None] == own, 1.0, 0.0))

    def anchored(self, anchors: Index, shares: Array) -> Spread:
        """The spread of each quantity less shares (n, a) of those of the anchors (a,)."""
        if not len(anchors):
            return self
        columns, signs, diagonal = self.columns - shares @ self.columns[anchors], self.signs, self.diagonal
        if self.diagonal.any():
            diagonal = self.diagonal.copy()
            root = np.sqrt(np.abs(self.diagonal[anchors]))
            own = -shares * root
            own[anchors, np.arange(len(anchors))] += root
            diagonal[anchors] = 0.0
            columns = np.hstack([columns, own])
            signs = np.concatenate([signs, np.where(self.diagonal[anchors] < 0.0, -1.0, 1.0)])
        wide = tuple(one.anchored(anchors, shares) for one in self.wide)
        return Spread(diagonal=diagonal, columns=columns, signs=signs, wide=wide)

    def __add__(self, other: Spread) -> Spread:
        return Spread(
            diagonal=self.diagonal + other.diagonal,
            columns=np.hstack([self.columns, other.columns]),
            signs=np.concatenate([self.signs, other.signs]),
            wide=self.wide + other.wide,
        )


def low_rank(columns: Array, signs: Array | None = None) -> Spread:
    """A spread without a diagonal part; signs are +1 unless given."""
    return Spread(
        diagonal=np.zeros(len(columns)),
        columns=columns,
        signs=np.ones(columns.shape[1]) if signs is None else signs,
    )
