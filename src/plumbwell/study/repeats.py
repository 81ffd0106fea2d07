"""Repeats: how well consecutive visits of a station agree, after all corrections and drift.

A repeat is a pair of used visits of one station that follow one another in time. The time of a visit is that
of its first used reading, so that the hours between can be checked against the row.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.design import Design
from plumbwell.reduction.visits import Visits
from plumbwell.study.results import NetworkResults
from plumbwell.survey.column import Array, Index

CHECKED = 1e-9  # of the visits' variances; below that the pair has no difference left that could be tested
PAIRS_AT_ONCE = 4096


def repeat_pairs(visits: Visits) -> tuple[Index, Index]:
    """Numbers of the earlier and the later visit of each repeat, (p,) each; stations from the top down."""
    order = np.lexsort((visits.first, visits.station))
    earlier, later = order[:-1], order[1:]
    same = visits.station[earlier] == visits.station[later]
    return earlier[same], later[same]


def repeat_difference(network: NetworkResults) -> Array:
    """Later less earlier visit, (p,), m/s2, after all corrections and drift."""
    earlier, later = repeat_pairs(network.visits)
    left = network.adjustment.solution.residual[:, 0]
    return left[later] - left[earlier]


def repeat_difference_sd(network: NetworkResults) -> Array:
    """Standard deviation of each repeat's difference, (p,), m/s2; NaN where the fit leaves it no freedom.

    Notes
    -----
    Both visits share the station, so that Var(r2 - r1) = v1 + v2 - dz M^-1 dz^T: v the variances of the
    visit means, dz the difference of their border rows (bias, drift, tares), M^-1 the border's covariance.
    """
    solution = network.adjustment.solution
    earlier, later = repeat_pairs(network.visits)
    variance = 1.0 / solution.weight
    whole = variance[earlier] + variance[later]
    unknown, value = _border_rows(solution.design, len(solution.weight))
    drift = np.zeros(len(earlier))
    for start in range(0, len(earlier), PAIRS_AT_ONCE):
        part = slice(start, start + PAIRS_AT_ONCE)
        which = np.hstack([unknown[earlier[part]], unknown[later[part]]])
        apart = np.hstack([-value[earlier[part]], value[later[part]]])
        spread = solution.border[which[:, :, None], which[:, None, :]]
        drift[part] = np.einsum("pi,pij,pj->p", apart, spread, apart)
    left = whole - drift
    checked = left > CHECKED * whole
    return np.where(checked, np.sqrt(np.where(checked, left, 0.0)), np.nan)


def repeat_standardised(network: NetworkResults) -> Array:
    """Difference of each repeat over its sd, (p,)."""
    return repeat_difference(network) / repeat_difference_sd(network)


def repeat_hours(visits: Visits) -> Array:
    """Time from the earlier to the later visit of each repeat, (p,), h."""
    earlier, later = repeat_pairs(visits)
    return (visits.first[later] - visits.first[earlier]) / 3600.0


def _border_rows(design: Design, n_visits: int) -> tuple[NDArray[np.intp], Array]:
    """Border unknowns that each visit touches and what it puts on them, (v, m); spare places have value 0."""
    order = np.argsort(design.entry_visit, kind="stable")
    visit = design.entry_visit[order]
    start = np.searchsorted(visit, np.arange(n_visits))
    place = np.arange(len(visit)) - start[visit]
    most = int(place.max(initial=-1)) + 1
    unknown, value = np.zeros((n_visits, most), dtype=np.intp), np.zeros((n_visits, most))
    unknown[visit, place] = design.entry_unknown[order]
    value[visit, place] = design.entry_value[order]
    return unknown, value
