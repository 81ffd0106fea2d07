"""Visits that a tare falls into: what their readings before and after the jump say of its size.

The sensor stood still, so the difference of the two stretches knows no re-seating; it is independent of the visit's
mean, which is the observation of the network, and enters beside it as an observation of the border alone.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.design import Design, of_rows
from plumbwell.reduction.drift_basis import DriftBasis
from plumbwell.reduction.priors import NO_PRIORS, Priors
from plumbwell.reduction.visits import Visits
from plumbwell.survey.column import Array, Index


def unbroken_stretches(basis: DriftBasis, visits: Visits) -> Index:
    """Where each stretch of a visit that no tare of unknown size breaks starts in `visits.rows`, and the end."""
    utc = basis.utc[visits.rows]
    breaks = []
    for number, tare in enumerate(basis.tares):
        if tare.size is None or tare.size_sd is not None:
            own = np.flatnonzero((visits.run == basis.tare_run[number]) & (visits.first < tare.time))
            own = own[visits.last[own] >= tare.time]
            for visit in own.tolist():
                rows = slice(int(visits.start[visit]), int(visits.start[visit + 1]))
                breaks.append(rows.start + int(np.searchsorted(utc[rows], tare.time)))
    return np.union1d(visits.start, breaks).astype(np.intp) if breaks else visits.start


def contrasts(
    one: Design, basis: DriftBasis, visits: Visits, unbroken: Index, values: Array, weight: Array
) -> Priors:
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
    found = NO_PRIORS
    is_tare = np.array([what.kind == "tare" for what in one.unknowns] + [False])
    for middle in np.setdiff1d(unbroken, visits.start).tolist():
        at = int(np.searchsorted(unbroken, middle))
        before, after = (slice(int(unbroken[n]), int(unbroken[n + 1])) for n in (at - 1, at))

        def mean(of: Array, part: slice) -> Array:
            return np.average(of, axis=0, weights=weight[part])

        numbers = one.of_run[basis.run[visits.rows[middle]]]
        factors = mean(of_rows(basis, one, visits.rows[after]), after) - mean(
            of_rows(basis, one, visits.rows[before]), before
        )
        moved = np.flatnonzero((factors != 0.0) & (numbers >= 0))
        if not is_tare[numbers[moved]].any():
            continue  # held at 0
        variance = 1.0 / float(np.sum(weight[before])) + 1.0 / float(np.sum(weight[after]))
        found = found.joined(
            Priors(
                name=(f"jump within visit {int(np.searchsorted(visits.start, middle, side='right'))}",),
                value=np.array([float(mean(values[after], after) - mean(values[before], before))]),
                sd=np.array([float(np.sqrt(variance))]),
                row=np.zeros(len(moved), dtype=np.intp),
                unknown=numbers[moved],
                factor=factors[moved],
                run=np.full(1, -1),
            )
        )
    return found
