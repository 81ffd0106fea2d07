"""Covariances of quantities along a chain of stations: of intervals, which share the station between them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.spread import Spread
from plumbwell.reduction.wide_spread import Sums
from plumbwell.survey.column import Array, Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ChainSpread:
    """A covariance of k quantities, each of two stations.

    Parameters
    ----------
    terms : tuple of (Spread, Sums)
        Independent origins: a covariance of the stations, and what each quantity takes of its two.
    follower : (k,) int array
        The quantity that starts where this one ends, -1 for none.
    """

    terms: tuple[tuple[Spread, Sums], ...]
    follower: Index

    def __len__(self) -> int:
        return len(self.follower)

    def between(self, first: Index, second: Index) -> Array:
        """Covariances of chosen pairs, (m,)."""
        found = np.zeros(len(first))
        for spread, pairs in self.terms:
            one = pairs[first]
            other = one if second is first else pairs[second]
            found += np.einsum("kr,kr,r->k", _columns(spread, one), _columns(spread, other), spread.signs)
            if spread.diagonal.any():
                for station, by in _ends(one):
                    for its, its_by in _ends(other):
                        found += np.where(station == its, by * its_by * spread.diagonal[station], 0.0)
            for wide in spread.wide:
                found += wide.between(one, other)
        return found

    def variance(self) -> Array:
        """The k variances; rounding below 0 is taken as 0."""
        every = np.arange(len(self))
        return np.maximum(self.between(every, every), 0.0)

    def matrix(self, rows: Index | None = None) -> Array:
        """The whole covariance of all quantities or of some, (m, m)."""
        rows = np.arange(len(self)) if rows is None else rows
        whole = np.zeros((len(rows), len(rows)))
        for spread, pairs in self.terms:
            one = pairs[rows]
            columns = _columns(spread, one)
            whole += (columns * spread.signs) @ columns.T
            if spread.diagonal.any():
                for station, by in _ends(one):
                    for its, its_by in _ends(one):
                        own = by[:, None] * its_by * spread.diagonal[station][:, None]
                        whole += np.where(station[:, None] == its, own, 0.0)
            for wide in spread.wide:
                whole += wide.matrix(one)
        return whole

    def with_follower(self) -> Array:
        """Covariance of each quantity with its follower, (k,); 0 where there is none."""
        rows = np.flatnonzero(self.follower >= 0)
        found = np.zeros(len(self))
        found[rows] = self.between(rows, self.follower[rows])
        return found

    def __add__(self, other: ChainSpread) -> ChainSpread:
        return ChainSpread(terms=self.terms + other.terms, follower=self.follower)


def _ends(one: Sums) -> tuple[tuple[Index, Array], tuple[Index, Array]]:
    return (one.first, one.by_first), (one.second, one.by_second)


def _columns(spread: Spread, one: Sums) -> Array:
    return one.by_first[:, None] * spread.columns[one.first] + one.by_second[:, None] * spread.columns[one.second]
