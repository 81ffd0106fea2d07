"""The free-air gradient: by Bruns' formula from gravity itself, and a measured one in place of the normal.

The gradient F is the decrease of gravity with height, s-2, positive (about 3.086e-6).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from plumbwell.earth.ellipsoid import mean_curvature
from plumbwell.earth.normal_gravity import normal_system


def bruns_gradient(
    system: str, *, latitude: ArrayLike, gravity: ArrayLike, height: ArrayLike = 0.0
) -> NDArray[np.float64]:
    """Free-air gradient F = 2 g J + 2 omega^2, s-2.

    Parameters
    ----------
    system : {"WGS84", "GRS80", "GRS67", "1930"}
        Gives the ellipsoid and the angular velocity.
    latitude : (n,) array_like
        Geodetic latitude, rad.
    gravity : (n,) array_like
        Gravity where the gradient is wanted, m s-2. Normal gravity on the ellipsoid gives the normal
        gradient there; the actual gravity at depth gives the gradient from which densities follow there.
    height : (n,) array_like
        Height above the ellipsoid of the place, m: level surfaces are more curved at depth. Left at zero for
        a station at depth, densities would come out low by 0.0006 g/cm3 a km.

    Returns
    -------
    (n,), s-2

    Raises
    ------
    ValueError
        Unknown system.

    Notes
    -----
    Bruns 1878; Heiskanen & Moritz 1967, eq. 2-20, with J the mean curvature at that
    height above the ellipsoid; off the ellipsoid it departs by less than 2e-6 of itself a km.
    """
    ellipsoid = normal_system(system).ellipsoid
    curvature = mean_curvature(latitude, ellipsoid, height=height)
    return 2.0 * np.asarray(gravity, dtype=float) * curvature + 2.0 * ellipsoid.omega**2


def measured_gradient_excess(
    height: ArrayLike, *, collar_height: float, measured: float, normal: float
) -> NDArray[np.float64]:
    """What a measured free-air gradient adds to normal gravity, -(measured - normal)(h - h_collar), m s-2.

    Parameters
    ----------
    height : (n,) array_like
        Height of the stations, m.
    collar_height : float
        Height of the collar, m, where nothing is added.
    measured, normal : float
        The two gradients at the collar, s-2, the measured one freed of terrain, openings and bodies.

    Returns
    -------
    (n,), m s-2
        Positive below the collar for a measured gradient larger than the normal one. The excess is held
        constant with depth.
    """
    return (measured - normal) * (collar_height - np.asarray(height, dtype=float))
