"""Visits that a tare falls into: what their readings before and after the jump say of its size.

The sensor stood still, so the difference of the two stretches knows no re-seating; it is independent of the visit's
mean, which is the observation of the network, and enters beside it as an observation of the border alone.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.design import Design, DriftBasis, Prior, regressor
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index, frozen, frozen_index


def unbroken_stretches(basis: DriftBasis, visits: Visits) -> Index:
    """Where each stretch of a visit that no tare of unknown size breaks starts in `visits.rows`, and the end."""
    unknown = [n for n, tare in enumerate(basis.tares) if tare.size is None or tare.size_sd is not None]
    if not unknown:
        return visits.start
    jumps = np.sum([basis.jumps(visits.rows, one) for one in unknown], axis=0)
    return np.union1d(visits.start, np.flatnonzero(np.diff(jumps) != 0.0) + 1)


def contrasts(
    one: Design, basis: DriftBasis, visits: Visits, unbroken: Index, values: Array, weight: Array
) -> tuple[Prior, ...]:
    """Differences between the stretches of broken visits, as observations of the border.

    Parameters
    ----------
    one : Design
    basis, visits
    unbroken : (g + 1,) int array
        From `unbroken_stretches`.
    values : (u,) array
        Used readings with all corrections, less known drift, m/s2, in the order of `visits.rows`.
    weight : (u,) array
        One over the variance of each reading by reading noise, s4/m2.

    Notes
    -----
    Of a visit with three stretches or more each is compared with the one before it.
    """
    found = []
    inner = np.setdiff1d(unbroken, visits.start)
    for middle in inner.tolist():
        at = int(np.searchsorted(unbroken, middle))
        before, after = (slice(int(unbroken[n]), int(unbroken[n + 1])) for n in (at - 1, at))
        numbers = [n for n, what in enumerate(one.unknowns) if what.run == basis.run[visits.rows[middle]]]

        def mean(of: Array, part: slice) -> float:
            return float(np.average(of[part], weights=weight[part]))

        factors = []
        for number in numbers:
            shape = regressor(basis, one.unknowns[number], visits.rows)
            factors.append(mean(shape, after) - mean(shape, before))
        moved = np.flatnonzero(factors)
        if not any(one.unknowns[numbers[n]].kind == "tare" for n in moved.tolist()):
            continue  # held at 0
        variance = 1.0 / float(np.sum(weight[before])) + 1.0 / float(np.sum(weight[after]))
        found.append(
            Prior(
                name=f"jump within visit {int(np.searchsorted(visits.start, middle, side='right'))}",
                unknowns=frozen_index([numbers[n] for n in moved.tolist()]),
                factors=frozen([factors[n] for n in moved.tolist()]),
                value=mean(values, after) - mean(values, before),
                sd=float(np.sqrt(variance)),
            )
        )
    return tuple(found)
