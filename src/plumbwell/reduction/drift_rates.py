"""How well the drift rate is known at each visit: what drift may still do while the instrument stands.

The rate is the slope of the run's polynomial and of its random walk at the visit's first reading.
"""

from __future__ import annotations

import numpy as np

from plumbwell.reduction.adjustment import Adjustment
from plumbwell.reduction.walk_modes import mode_sds, wave_numbers
from plumbwell.survey.column import Array


def rate_sd(fit: Adjustment) -> Array:
    """Sd of the drift rate at each visit, (v,), m/s3.

    Parameters
    ----------
    fit : Adjustment

    Notes
    -----
    The variance is z^T C z, z the slopes of the regressors of the visit's run and C the covariance of its unknowns. The
    modes of a walk of strength q that are left out add the rest of its rate's variance, q^2 t after a time t: readings
    tell next to nothing of them.
    """
    visits, basis, one = fit.visits, fit.basis, fit.design
    length = basis.length[visits.run]
    time = (visits.first - basis.start[visits.run]) / length
    numbers = one.of_run[visits.run]
    is_drift = np.array([what.kind == "drift" for what in one.unknowns] + [False])
    is_walk = np.array([what.kind == "walk" for what in one.unknowns] + [False])
    power = np.array([what.power for what in one.unknowns] + [0])[numbers]
    grown = np.where(power > 1, power * time[:, None] ** np.maximum(power - 1, 0), 1.0)
    slope = np.where(is_drift[numbers], grown / length[:, None], 0.0)
    rest = np.zeros(len(visits))
    if fit.walk is not None and one.modes:
        waves = mode_rates(time, one.modes)
        own = waves[np.arange(len(visits))[:, None], np.clip(power - 1, 0, one.modes - 1)] * np.sqrt(length)[:, None]
        slope = np.where(is_walk[numbers], own, slope)
        left = np.maximum(time - np.sum((waves * mode_sds(one.modes)) ** 2, axis=1), 0.0)
        rest = np.where(is_walk[numbers].any(axis=1), fit.walk.strength**2 * length * left, 0.0)
    used = np.flatnonzero((slope != 0.0).any(axis=0))
    numbers, slope = np.where(numbers < 0, 0, numbers)[:, used], slope[:, used]
    if not used.size:
        return np.sqrt(rest)
    place = one.layout.place(numbers[:, :, None], numbers[:, None, :])
    variance = np.einsum("vk,vkl,vl->v", slope, fit.solution.factor.inverse[place], slope)
    found: Array = np.sqrt(np.maximum(variance, 0.0) + rest)
    return found


def mode_rates(time: Array, count: int) -> Array:
    """Slopes of `walk_modes` at times from 0 to 1, (n, count).

    Notes
    -----
    b [sinh bx + sin bx - e (cosh bx - cos bx)], in falling exponentials as there.
    """
    b = wave_numbers(count)
    x = np.clip(time, 0.0, 1.0)[:, None]
    small = np.exp(-b)
    rising = (np.sin(b) - np.cos(b) - small) / (1.0 - small**2 + 2.0 * small * np.sin(b))
    e = 1.0 - 2.0 * rising * small
    slopes: Array = b * (
        rising * np.exp(b * (x - 1.0)) - 0.5 * (1.0 + e) * np.exp(-b * x) + np.sin(b * x) + e * np.cos(b * x)
    )
    return slopes
