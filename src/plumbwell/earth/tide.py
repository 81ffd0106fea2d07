"""The tide of a rigid Earth in the vertical, and the correction that frees readings of it.

Direct difference of the pull of Moon and Sun on the station and on the Earth's centre, along the normal of
the WGS84 ellipsoid. `up` is positive away from the Earth: it lowers gravity, so the correction is added.
"""

from __future__ import annotations

from math import pi, sqrt

import numpy as np
from numpy.typing import ArrayLike, NDArray

from plumbwell.earth.ellipsoid import WGS84
from plumbwell.earth.moon_sun import GM_MOON, GM_SUN, moon_and_sun

GRAVIMETRIC_FACTOR = 1.16
"""Tide on the yielding Earth over that on a rigid one (common practice)."""

KNOT_SPACING = 1200.0
"""Seconds between the times at which the tide is computed; between them it is interpolated."""

# Six knots about a reading, and for each the product of its distances to the other five (Lagrange).
_OFFSETS = np.arange(-2.0, 4.0)
_DENOMINATORS = np.array([120.0, -24.0, 12.0, -12.0, 24.0, -120.0])


def station_vectors(
    *, latitude: ArrayLike, longitude: ArrayLike, height: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Geocentric position of a station and the upward normal of the ellipsoid there.

    Parameters
    ----------
    latitude, longitude : array_like
        Geodetic, rad, longitude positive east.
    height : array_like
        Above the ellipsoid, m.

    Returns
    -------
    position : (..., 3), m
    normal : (..., 3), no unit
    """
    latitude, longitude, height = np.broadcast_arrays(latitude, longitude, height)
    sine, cosine = np.sin(latitude), np.cos(latitude)
    normal = np.stack((cosine * np.cos(longitude), cosine * np.sin(longitude), sine), axis=-1)
    across = WGS84.semi_major / np.sqrt(1.0 - WGS84.e2 * sine * sine)
    position = (across + height)[..., None] * normal
    position[..., 2] -= WGS84.e2 * across * sine
    return position, normal


def rigid_tide(
    utc_seconds: ArrayLike,
    *,
    latitude: ArrayLike,
    longitude: ArrayLike,
    height: ArrayLike,
    full: bool = False,
) -> NDArray[np.float64]:
    """Upward tidal acceleration on a rigid Earth, m s-2: positive lowers gravity.

    Parameters
    ----------
    utc_seconds : (n,) array_like
        Seconds since 2000-01-01T00:00:00Z without leap seconds.
    latitude, longitude : float or (n,) array_like
        Geodetic, rad, longitude positive east.
    height : float or (n,) array_like
        Above the ellipsoid, m.
    full : bool
        The slow ephemeris, see `moon_sun.moon_and_sun`.

    Returns
    -------
    (n,), m s-2

    Raises
    ------
    ValueError
        A time the ephemeris does not reach.

    Notes
    -----
    up = n . sum of GM [ (d - r)/|d - r|^3 - d/|d|^3 ] over Moon and Sun, d the body and r the station, both
    from the Earth's centre; all degrees of the tide are in it.
    """
    position, normal = station_vectors(latitude=latitude, longitude=longitude, height=height)
    moon, sun = moon_and_sun(utc_seconds, full=full)
    return GM_MOON * _difference(moon, position, normal) + GM_SUN * _difference(sun, position, normal)


def _difference(
    body: NDArray[np.float64], position: NDArray[np.float64], normal: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Pull of a unit body on the station less that on the Earth's centre, along `normal`, m-2."""
    return _along(body - position, normal) - _along(body, normal)


def _along(vector: NDArray[np.float64], normal: NDArray[np.float64]) -> NDArray[np.float64]:
    """Part along `normal` of the vector over the cube of its length."""
    square = np.einsum("...i,...i->...", vector, vector)
    return np.einsum("...i,...i->...", vector, normal) / (square * np.sqrt(square))


def tide_correction(
    utc_seconds: ArrayLike,
    *,
    latitude: float,
    longitude: float,
    height: float,
    factor: float = GRAVIMETRIC_FACTOR,
) -> NDArray[np.float64]:
    """Tide correction of readings at one place, m s-2: to be added to them.

    Parameters
    ----------
    utc_seconds : (n,) array_like
        Seconds since 2000-01-01T00:00:00Z without leap seconds, in any order, with any gaps.
    latitude, longitude : float
        Geodetic, rad, longitude positive east.
    height : float
        Above the ellipsoid, m.
    factor : float
        Gravimetric factor: the yielding of the Earth.

    Returns
    -------
    (n,), m s-2
        factor times `rigid_tide`.

    Raises
    ------
    ValueError
        A time that is no number or that the ephemeris does not reach.

    Notes
    -----
    The rigid tide is computed on a fixed raster of `KNOT_SPACING` around the readings only, and interpolated
    through six knots (Lagrange), within 0.0001 uGal of the direct value. The raster is tied to the epoch, so
    a reading's tide does not depend on the other readings.
    """
    steps = np.asarray(utc_seconds, dtype=float) / KNOT_SPACING
    if steps.size == 0:
        return np.zeros(steps.shape)
    if not np.isfinite(steps).all():
        raise ValueError("times of readings must be numbers")
    cell = np.floor(steps)
    knots = np.unique(np.unique(cell)[:, None] + _OFFSETS)
    up = rigid_tide(knots * KNOT_SPACING, latitude=latitude, longitude=longitude, height=height)
    first = np.searchsorted(knots, cell + _OFFSETS[0])
    return factor * np.sum(_weights(steps - cell) * up[np.add.outer(np.arange(_OFFSETS.size), first)], axis=0)


def _weights(share: NDArray[np.float64]) -> NDArray[np.float64]:
    """Lagrange's weights (6, ...) at a share of the way from the third knot to the fourth."""
    apart = np.subtract.outer(_OFFSETS, share)
    before = np.ones_like(apart)
    after = np.ones_like(apart)
    np.cumprod(apart[:-1], axis=0, out=before[1:])
    np.cumprod(apart[:0:-1], axis=0, out=after[-2::-1])
    return before * after / _DENOMINATORS.reshape((-1,) + (1,) * share.ndim)


def permanent_part(latitude: ArrayLike) -> NDArray[np.float64]:
    """Long-term mean of the rigid tide on the ellipsoid, m s-2 upward: the correction takes it out too.

    Parameters
    ----------
    latitude : (n,) array_like
        Geodetic, rad.

    Returns
    -------
    (n,), m s-2
        About 30.5 uGal at the equator, -60.8 at the poles.

    Notes
    -----
    Gradient along the normal of the permanent tidal potential (GM/a^2) sqrt(5/(4 pi)) H0 P2 (r/a)^2 with
    H0 = -0.31460 m (IERS Conventions 2010, sec. 6.2.2; Cartwright & Tayler 1971).
    """
    sin2 = np.sin(latitude) ** 2
    a = WGS84.semi_major
    scale = WGS84.gm / a**2 * sqrt(5.0 / (4.0 * pi)) * -0.31460 / a
    # In the meridian plane the gradient is (-p, 2 z) scale/a, with p and z of the ellipsoid.
    return scale * (2.0 * (1.0 - WGS84.e2) * sin2 - (1.0 - sin2)) / np.sqrt(1.0 - WGS84.e2 * sin2)
