"""The tide of a rigid Earth by the formulas of Longman (1959), a second opinion on `tide`.

A short series for the Moon to degree three and the Sun to degree two, written out from I. M. Longman,
Formulas for computing the tidal accelerations due to the Moon and the Sun, J. Geophys. Res. 64, 2351-2355.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

# Constants as printed in 1959, cgs turned to SI.
_G = 6.670e-11
_MOON_MASS = 7.3537e22
_SUN_MASS = 1.993e30
_MOON_DISTANCE = 3.84402e8
_SUN_DISTANCE = 1.495e11
_EQUATORIAL_RADIUS = 6.378270e6
_MOON_ECCENTRICITY = 0.05490
_MOTION_RATIO = 0.074804
_MOON_INCLINATION = np.radians(5.145)
_OBLIQUITY = np.radians(23.452)

_SECONDS_FROM_1899 = 36524.5 * 86400.0
_CENTURY = 36525.0 * 86400.0
_TURN = 1_296_000.0


def _angle(
    centuries: NDArray[np.float64], degrees: float, minutes: float, seconds: float, *rates: float
) -> NDArray[np.float64]:
    """Radians of a mean longitude given in sexagesimal and in seconds of arc per power of centuries."""
    total = np.zeros_like(centuries)
    for rate in reversed(rates):
        total = (total + rate) * centuries
    return np.radians((3600.0 * degrees + 60.0 * minutes + seconds + total) / 3600.0)


def mean_longitudes(utc_seconds: ArrayLike) -> tuple[NDArray[np.float64], ...]:
    """Mean longitudes of Moon, its perigee, Sun, the Moon's node, and the Sun's perigee, rad.

    Parameters
    ----------
    utc_seconds : (n,) array_like
        Seconds since 2000-01-01T00:00:00Z without leap seconds.

    Returns
    -------
    moon, perigee, sun, node, sun_perigee : (n,), rad
        Of the mean equinox of date, not reduced to one turn.
    """
    t = (np.asarray(utc_seconds, dtype=float) + _SECONDS_FROM_1899) / _CENTURY
    return (
        _angle(t, 270, 26, 14.72, 1336 * _TURN + 1_108_411.20, 9.09, 0.0068),
        _angle(t, 334, 19, 40.87, 11 * _TURN + 392_515.94, -37.24, -0.045),
        _angle(t, 279, 41, 48.04, 129_602_768.13, 1.089),
        _angle(t, 259, 10, 57.12, -(5 * _TURN + 482_912.63), 7.58, 0.008),
        _angle(t, 281, 13, 15.0, 6189.03, 1.63, 0.012),
    )


def longman_tide(
    utc_seconds: ArrayLike, *, latitude: ArrayLike, longitude: ArrayLike, height: ArrayLike
) -> NDArray[np.float64]:
    """Upward tidal acceleration on a rigid Earth by Longman's formulas, m s-2: positive lowers gravity.

    Parameters
    ----------
    utc_seconds : (n,) array_like
        Seconds since 2000-01-01T00:00:00Z without leap seconds.
    latitude, longitude : float or (n,) array_like
        Geodetic, rad, longitude positive east.
    height : float or (n,) array_like
        Above sea level, m.

    Returns
    -------
    (n,), m s-2
        Within 4 uGal of `tide.rigid_tide`, 0.8 uGal rms.
    """
    utc_seconds = np.asarray(utc_seconds, dtype=float)
    moon, perigee, sun, node, sun_perigee = mean_longitudes(utc_seconds)
    t = (utc_seconds + _SECONDS_FROM_1899) / _CENTURY
    sun_eccentricity = 0.01675104 - 0.00004180 * t - 0.000000126 * t * t

    cos_i = np.cos(_OBLIQUITY) * np.cos(_MOON_INCLINATION) - np.sin(_OBLIQUITY) * np.sin(
        _MOON_INCLINATION
    ) * np.cos(node)
    sin_i = np.sqrt(1.0 - cos_i * cos_i)
    nu = np.arcsin(np.sin(_MOON_INCLINATION) * np.sin(node) / sin_i)
    sin_alpha = np.sin(_OBLIQUITY) * np.sin(node) / sin_i
    cos_alpha = np.cos(node) * np.cos(nu) + np.sin(node) * np.sin(nu) * np.cos(_OBLIQUITY)
    xi = node - 2.0 * np.arctan(sin_alpha / (1.0 + cos_alpha))

    e, m = _MOON_ECCENTRICITY, _MOTION_RATIO
    anomaly = moon - perigee
    evection = moon - 2.0 * sun + perigee
    variation = 2.0 * (moon - sun)
    moon_longitude = (
        moon
        - xi
        + 2.0 * e * np.sin(anomaly)
        + 1.25 * e * e * np.sin(2.0 * anomaly)
        + 3.75 * m * e * np.sin(evection)
        + 1.375 * m * m * np.sin(variation)
    )
    sun_longitude = sun + 2.0 * sun_eccentricity * np.sin(sun - sun_perigee)
    hour_angle = 2.0 * np.pi * (utc_seconds / 86400.0 % 1.0) - np.pi + np.asarray(longitude, dtype=float)
    sine, cosine = np.sin(latitude), np.cos(latitude)
    moon_cosine = _zenith_cosine(sine, cosine, cos_i, sin_i, moon_longitude, hour_angle + sun - nu)
    sun_cosine = _zenith_cosine(
        sine, cosine, np.cos(_OBLIQUITY), np.sin(_OBLIQUITY), sun_longitude, hour_angle + sun
    )

    r = _EQUATORIAL_RADIUS / np.sqrt(1.0 + 0.006738 * sine * sine) + np.asarray(height, dtype=float)
    moon_scale = 1.0 / (_MOON_DISTANCE * (1.0 - e * e))
    moon_parallax = 1.0 / _MOON_DISTANCE + moon_scale * (
        e * np.cos(anomaly)
        + e * e * np.cos(2.0 * anomaly)
        + 1.875 * m * e * np.cos(evection)
        + m * m * np.cos(variation)
    )
    sun_scale = 1.0 / (_SUN_DISTANCE * (1.0 - sun_eccentricity**2))
    sun_parallax = 1.0 / _SUN_DISTANCE + sun_scale * sun_eccentricity * np.cos(sun - sun_perigee)
    second = r * moon_parallax**3 * (3.0 * moon_cosine**2 - 1.0)
    third = 1.5 * r * r * moon_parallax**4 * (5.0 * moon_cosine**3 - 3.0 * moon_cosine)
    solar = r * sun_parallax**3 * (3.0 * sun_cosine**2 - 1.0)
    return _G * (_MOON_MASS * (second + third) + _SUN_MASS * solar)


def _zenith_cosine(
    sine: NDArray[np.float64],
    cosine: NDArray[np.float64],
    cos_tilt: NDArray[np.float64] | float,
    sin_tilt: NDArray[np.float64] | float,
    longitude: NDArray[np.float64],
    meridian: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Cosine of the zenith angle of a body from its longitude in its orbit."""
    near = 0.5 * (1.0 + cos_tilt) * np.cos(longitude - meridian)
    far = 0.5 * (1.0 - cos_tilt) * np.cos(longitude + meridian)
    return sine * sin_tilt * np.sin(longitude) + cosine * (near + far)
