"""Reading noise where few readings tell it: the scatter within visits and that of the visits weighed together.

One or two degrees of freedom within visits say little, and one bad reading among them would be taken for the noise of
all. The visits bound it: the mean of n readings scatters by e^2/n + u^2, which is no less than e^2/n. So e and u are
estimated together by the restricted likelihood of both. Inputs are plain arrays.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.banded import summed
from plumbwell.survey.column import Array, Index

ALIKE = 0.05
"""Share by which shares of reading noise may differ that are taken for one."""

CHANCE = 0.001
"""Chance of so large a scatter within visits under which it is none of their noise."""

PLACES, ZOOMS = 25, 9
WIDE = 1e6
"""Ratio of the largest to the least variance that is looked at."""


def reading_variance_of_few(
    within: float,
    freedom: int,
    *,
    residual: Array,
    station: Index,
    share: Array,
    lost: int,
) -> float:
    """Variance of a reading where its own degrees of freedom are few.

    Parameters
    ----------
    within : float
        Sum of squares within visits over their degrees of freedom, m2/s4.
    freedom : int
        Those degrees of freedom, at least 1.
    residual : (v,) array
        Visit means freed of drift, m/s2; any level.
    station : (v,) int array
    share : (v,) array
        Variance of each visit mean by reading noise over that of a reading: 1/n for n alike.
    lost : int
        Degrees of freedom that bias and drift take from the visits.

    Returns
    -------
    float
        `within` where the visits have no degree of freedom; 0 where the scatter within visits is no noise (see Notes).

    Notes
    -----
    With f degrees of freedom within visits and v_i = e^2 c_i + u^2 the variance of visit i, what is maximised is
    -1/2 [f log e^2 + f s^2/e^2 + sum_i k_i (log v_i) + r_i^2/v_i]: r_i is the visit less the mean of its station and
    k_i = (1 - 1/n_i) (1 - lost/free) its share of the degrees of freedom, n_i the visits of the station and free the
    visits less the stations. That is the restricted likelihood (Patterson & Thompson 1971) where the visits of a
    station are equally good and drift touches all alike. Where u is above 0 and all visits hold equally many readings,
    e^2 = s^2; where u is 0, e^2 is the pooled mean square of both.

    A scatter within visits that exceeds what the visits allow by more than chance (F, `CHANCE`) is a bad reading, an
    unsettled one or two stops taken for one: the noise of a visit is then told by the visits alone.
    """
    seen = _seen(residual, station, share, lost)
    if seen is None:
        return within
    k, squares, c = seen
    if scatter_chance(within, freedom, float(squares.sum() / np.sum(k * c)), float(k.sum())) < CHANCE:
        return 0.0
    return _likeliest(within, freedom, k, squares, c)


def scatter_chance(within: float, freedom: int, among: float, freedom_among: float) -> float:
    """Chance that the scatter within visits is so much larger than what the visits themselves scatter.

    Parameters
    ----------
    within, among : float
        Mean squares: of readings within visits, and of visits as that of a reading, which counts re-seating as well.
    freedom, freedom_among : float
        Their degrees of freedom.
    """
    from scipy.special import fdtrc

    if not among > 0.0 or not within > among:
        return 1.0
    return float(fdtrc(freedom, freedom_among, within / among))


def _seen(residual: Array, station: Index, share: Array, lost: int) -> tuple[Array, Array, Array] | None:
    """Degrees of freedom, squares and share of reading noise of the visits, those of like share together."""
    _, at, count = np.unique(station, return_inverse=True, return_counts=True)
    free = len(station) - len(count)
    if free - lost < 1:
        return None
    off = residual - (np.bincount(at, residual) / count)[at]
    kept = (1.0 - 1.0 / count[at]) * (1.0 - lost / free)
    told = count[at] > 1
    _, group = np.unique(np.round(np.log(share[told]) / ALIKE), return_inverse=True)
    many = int(group.max(initial=-1)) + 1
    k, squares = summed(group, kept[told], many), summed(group, off[told] ** 2, many)
    return k, squares, summed(group, share[told], many) / np.bincount(group)


def _likeliest(within: float, freedom: int, k: Array, squares: Array, c: Array) -> float:
    """The variance of a reading at the highest place of the likelihood, found on a grid that closes in on it."""
    most = max(within, float(squares.sum() / np.sum(k * c)))
    if not most > 0.0:
        return within
    low, high = np.full(2, np.log(most / WIDE)), np.full(2, np.log(4.0 * most))
    best = most
    for _ in range(ZOOMS):
        x, y = (np.linspace(one, other, PLACES) for one, other in zip(low, high, strict=True))
        e2 = np.exp(x)
        u2 = np.concatenate([[0.0], np.exp(y)])
        v = e2[:, None, None] * c + u2[:, None]
        cost = freedom * (x + within / e2)[:, None] + np.sum(k * np.log(v) + squares / v, axis=2)
        i, j = np.unravel_index(int(np.argmin(cost)), cost.shape)
        best = float(e2[i])
        step = 2.0 * np.array([x[1] - x[0], y[1] - y[0]])
        # At u = 0 the way back to small values of it stays open.
        middle = np.array([x[i], y[max(int(j) - 1, 0)]])
        low, high = np.maximum(middle - step, low), np.minimum(middle + step, high)
    return best
