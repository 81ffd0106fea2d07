"""Air pressure: the standard atmosphere and the effect of its changes on gravity."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

ADMITTANCE = -3e-11
"""Effect on gravity of higher pressure, m s-2 per Pa (-0.3 uGal/hPa): IAG 1983, resolution 9."""


def standard_pressure(height: ArrayLike) -> NDArray[np.float64]:
    """Pressure of the standard atmosphere at a height, Pa.

    Parameters
    ----------
    height : (n,) array_like
        Height above sea level, m, below 11 000; negative in deep land or drifts.

    Returns
    -------
    (n,), Pa

    Notes
    -----
    p0(H) = 1013.25 (1 - 0.0065 H/288.15)^5.2559 hPa (DIN 5450; ISO 2533).
    """
    return 101_325.0 * (1.0 - 0.0065 / 288.15 * np.asarray(height, dtype=float)) ** 5.2559


def pressure_effect(
    pressure: ArrayLike, *, barometer_height: ArrayLike, admittance: float = ADMITTANCE
) -> NDArray[np.float64]:
    """Effect of air pressure on gravity, m s-2, positive downward: to be subtracted from readings.

    Parameters
    ----------
    pressure : (n,) array_like
        Pressure at the barometer, Pa.
    barometer_height : (n,) array_like
        Height of the barometer above sea level, m: that of the ground at the collar unless it stood
        elsewhere. The height of a station below ground would be wrong by 37 uGal a km.
    admittance : float
        m s-2 per Pa, negative.

    Returns
    -------
    (n,), m s-2
        admittance (p - p0(H)): negative for pressure above the standard.
    """
    return admittance * (np.asarray(pressure, dtype=float) - standard_pressure(barometer_height))
