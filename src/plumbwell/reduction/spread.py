"""Covariances of station gravity in the form in which the network gives them: diagonal plus low rank.

A spread stands for C = diag(d) + sum of s_k c_k c_k^T with signs s_k of +1 or -1, so that ten thousand stations
cost no more than their number times the border's.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.survey.column import Array, Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Spread:
    """A covariance of n quantities: `diagonal` (n,), `columns` (n, r), `signs` (r,)."""

    diagonal: Array
    columns: Array
    signs: Array

    def variance(self) -> Array:
        """The n variances; rounding below 0 is taken as 0."""
        return np.maximum(self.diagonal + self.columns**2 @ self.signs, 0.0)

    def matrix(self) -> Array:
        """The whole covariance, (n, n)."""
        return np.diag(self.diagonal) + (self.columns * self.signs) @ self.columns.T

    def between(self, first: Index, second: Index) -> Array:
        """Covariances of chosen pairs, (m,)."""
        low = np.einsum("mr,mr,r->m", self.columns[first], self.columns[second], self.signs)
        return low + np.where(first == second, self.diagonal[first], 0.0)

    def referred(self, datum: Index) -> Spread:
        """The spread of each quantity less its datum's; `datum` (n,) names the quantity, -1 where nothing is taken."""
        taken = datum >= 0
        if not taken.any():
            return self
        columns = self.columns - np.where(taken[:, None], self.columns[datum], 0.0)
        if not self.diagonal.any():
            return Spread(diagonal=self.diagonal, columns=columns, signs=self.signs)
        diagonal = self.diagonal.copy()
        own = np.unique(datum[taken])
        shared = np.zeros((len(diagonal), own.size))
        for number, one in enumerate(own.tolist()):
            members = datum == one
            shared[members, number] = np.sqrt(self.diagonal[one])
            shared[one, number] = 0.0
        diagonal[own] = 0.0
        return Spread(
            diagonal=diagonal,
            columns=np.hstack([columns, shared]),
            signs=np.concatenate([self.signs, np.ones(own.size)]),
        )

    def __add__(self, other: Spread) -> Spread:
        return Spread(
            diagonal=self.diagonal + other.diagonal,
            columns=np.hstack([self.columns, other.columns]),
            signs=np.concatenate([self.signs, other.signs]),
        )


def low_rank(columns: Array, signs: Array | None = None) -> Spread:
    """A spread without a diagonal part; signs are +1 unless given."""
    return Spread(
        diagonal=np.zeros(len(columns)),
        columns=columns,
        signs=np.ones(columns.shape[1]) if signs is None else signs,
    )
