"""Pseudo-observations of border unknowns: what is stated or known beside the visits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.reduction.banded import summed
from plumbwell.survey.column import Array, Index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Priors:
    """Pseudo-observations of border unknowns: sum of factor times unknown = value +- sd, (m,) of them.

    Parameters
    ----------
    name : tuple of str
    value, sd : (m,) arrays
    row, unknown, factor : (e,) arrays
        The factors in coordinate form.
    run : (m,) int array
        Run whose mean drift rate a prior holds; -1 for other priors.
    """

    name: tuple[str, ...]
    value: Array
    sd: Array
    row: Index
    unknown: Index
    factor: Array
    run: Index

    def __len__(self) -> int:
        return len(self.name)

    def joined(self, other: Priors) -> Priors:
        """These and others."""
        if not len(other):
            return self
        return Priors(
            name=self.name + other.name,
            value=np.concatenate([self.value, other.value]),
            sd=np.concatenate([self.sd, other.sd]),
            row=np.concatenate([self.row, other.row + len(self)]),
            unknown=np.concatenate([self.unknown, other.unknown]),
            factor=np.concatenate([self.factor, other.factor]),
            run=np.concatenate([self.run, other.run]),
        )

    def of(self, unknown: Array) -> Array:
        """What each prior observes when the unknowns have these values, (m,)."""
        return summed(self.row, self.factor * unknown[self.unknown], len(self))


NO_PRIORS = Priors(
    name=(),
    value=np.zeros(0),
    sd=np.zeros(0),
    row=np.zeros(0, dtype=np.intp),
    unknown=np.zeros(0, dtype=np.intp),
    factor=np.zeros(0),
    run=np.zeros(0, dtype=np.intp),
)
