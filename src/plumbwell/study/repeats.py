"""Repeats: how well consecutive visits of a station agree, after all corrections and drift.

A repeat is a pair of used visits of one station that follow one another in time. The time of a visit is that
of its first used reading, so that the hours between can be checked against the row.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.banded import products, summed
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
    one = solution.design
    order = np.lexsort((one.entry_unknown, one.entry_visit))
    visit, unknown, value = one.entry_visit[order], one.entry_unknown[order], one.entry_value[order]
    count = np.bincount(visit, minlength=len(variance))
    begin = np.cumsum(count) - count
    drift = np.zeros(len(earlier))
    for start in range(0, len(earlier), PAIRS_AT_ONCE):
        pairs = slice(start, start + PAIRS_AT_ONCE)
        both = np.stack([earlier[pairs], later[pairs]], axis=1).ravel()
        sign = np.tile([-1.0, 1.0], len(both) // 2)
        many = count[both]
        at = np.repeat(begin[both] - (np.cumsum(many) - many), many) + np.arange(int(many.sum()))
        pair = np.repeat(np.arange(len(both)) // 2, many)
        key, where = np.unique(pair * one.size + unknown[at], return_inverse=True)
        row, touched = np.divmod(key, one.size)
        rows = (row, touched, summed(where, value[at] * np.repeat(sign, many), len(key)))
        drift[pairs] = products(solution.factor, rows, rows, len(both) // 2)
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
