"""The restricted likelihood of the visits: of their re-seating variance, and of a random walk beside it.

Ties and priors of drift and tares do not count: where they contradict the visits, that is not noise. The modes of a
random walk do count, for they are what the likelihood is asked about.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.design import Design
from plumbwell.reduction.network import NO_TIES, Rank, Solution, solve
from plumbwell.survey.column import Array

PASSES = 60
SETTLED = 1e-6  # of the re-seating variance: a millionth of it moves no density
NEARLY = 1e-3  # where the estimate serves a search alone


def visits_alone(design: Design, weight: Array, values: Array, rank: Rank, walk: Array | None) -> Solution:
    """The solution by the visits alone; `walk` is what the modes of a random walk add to the flat border matrix."""
    pins = rank.pins if walk is None else rank.pins + walk
    return solve(design, weight, values if values.ndim == 2 else values[:, None], NO_TIES, pins=pins)


def restricted_variance(
    design: Design,
    observed: Array,
    reading_variance: Array,
    *,
    rank: Rank,
    start: float | None = None,
    walk: Array | None = None,
    nearly: bool = False,
) -> float:
    """The re-seating variance that maximises the restricted likelihood of the visits; 0 where it grows towards 0.

    The maximum lies where sum (r_v / v_v)^2 = sum (1 - h_v / v_v) / v_v, r the residual of a visit, v its
    variance, h the variance of its estimate (Patterson & Thompson 1971). The logarithm of the ratio of the two sides
    falls by nearly 1 for each unit of log(v), exactly so when all visits have one reading noise; a secant in that
    variable, kept within its bracket, closes in on the root.

    Parameters
    ----------
    design : Design
    observed, reading_variance : (v,) arrays
        Visit means m/s2, and their variance by reading noise.
    rank : Rank
        Of the visits' design; at least one degree of freedom is left.
    start : float or None
        A variance near which to begin; None: that of even weights.
    walk : array or None
        What a random walk adds to the flat border matrix, s4/m2.
    nearly : bool
        True: to a thousandth is enough.
    """
    values = observed[:, None]
    typical = float(np.median(reading_variance))
    modes = None if walk is None else walk * typical

    def excess(variance: float) -> float:
        weight = typical / (reading_variance + variance)
        solution = visits_alone(design, weight, values, rank, modes)
        left = float(np.sum((weight * solution.residual[:, 0]) ** 2)) / typical
        right = float(np.sum(weight * (1.0 - weight * solution.variance_of_fit())))
        return float(np.log(left / right)) if left > 0.0 and right > 0.0 else -np.inf

    if start is None:
        weight = typical / np.maximum(reading_variance, typical)
        even = visits_alone(design, weight, values, rank, modes)
        start = even.sum_of_squares() / max(len(observed) - rank.rank, 1)
    else:
        start = start + typical
    x = float(np.log(max(start, typical)))
    least = float(np.log(typical))
    low, high = least, np.inf
    before: tuple[float, float] | None = None
    at_least: float | None = None
    for _ in range(PASSES):
        x = max(x, least)
        at = excess(float(np.exp(x)) - typical if x > least else 0.0)
        if x == least:
            at_least = at
            if at <= 0.0:
                return 0.0
        if abs(at) < (NEARLY if nearly else SETTLED):
            break
        low, high = (x, high) if at > 0.0 else (low, x)
        slope = -1.0 if before is None or before[0] == x else (at - before[1]) / (x - before[0])
        before = (x, at)
        step = at if not slope < -0.05 else -at / slope
        x = x + step
        if not low < x < high:
            x = least if low == least and at_least is None else 0.5 * (low + min(high, low + 4.0))
    return max(float(np.exp(x)) - typical, 0.0)


def log_likelihood(
    design: Design, observed: Array, variance: Array, *, rank: Rank, walk: Array | None = None
) -> float:
    """Logarithm of the restricted likelihood of the visits, less a constant of the design's fixed unknowns.

    Parameters
    ----------
    design : Design
    observed, variance : (v,) arrays
        Visit means, m/s2, and their whole variances.
    rank : Rank
    walk : array or None
        What the modes of a random walk add to the flat border matrix: one over the variance of each on the diagonal.

    Notes
    -----
    -1/2 (sum log v + sum log D + log det M + sum log of the modes' variances + r^T W r + a^T G^-1 a), all in units of
    a typical variance; equal to that of the visits' whole covariance (Harville 1977).
    """
    typical = float(np.median(variance))
    modes = None if walk is None else walk * typical
    solution = visits_alone(design, typical / variance, observed, rank, modes)
    border, total = solution.border, 0.0
    visited = np.bincount(design.local, minlength=design.n_stations + 1)[: design.n_stations] > 0
    total += float(np.sum(np.log(variance / typical))) + float(np.sum(np.log(border.total[visited])))
    total += solution.factor.log_determinant + solution.sum_of_squares() / typical
    if walk is not None and modes is not None:
        diagonal = design.layout.diagonal()
        own = modes[diagonal]
        at = own > 0.0
        total += float(-np.sum(np.log(own[at])) + np.sum(own[at] * solution.unknown[at, 0] ** 2) / typical)
    return -0.5 * (total + (len(observed) - rank.rank) * np.log(typical))
