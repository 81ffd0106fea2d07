"""Spherical shells: the term between ground and station, densities of intervals, and the spherical cap.

Inside a spherical shell its attraction is zero and outside it acts as if at the centre (Newton 1687, book I,
props. 70, 71). Radii are r = R0 + h with one R0 for a whole survey: never each station's own, for the
radius of curvature changes by metres over a kilometre northward and that would be taken for thickness.
"""

from __future__ import annotations

from math import cos, sin
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from plumbwell.earth.constants import FOUR_PI_G, TWO_PI_G

CAP_ARC = 166_735.0
"""Arc of the spherical cap of land surveys, m (Hayford-Bowie zone O; LaFehr 1991)."""

CAP_RADIUS = 6_371_000.0
"""Radius of the sphere that cap lies on, m (LaFehr 1991)."""


def difference_of_cubes(upper: Any, lower: Any) -> Any:
    """upper^3 - lower^3 without the loss of digits of the plain difference; m3 for radii in m."""
    return (upper - lower) * (upper * upper + upper * lower + lower * lower)


def shell_term(
    height: ArrayLike, *, ground_height: float, radius: float, tops: ArrayLike, densities: ArrayLike
) -> NDArray[np.float64]:
    """What reference rock between the ground and a station adds to normal gravity continued inward, m s-2.

    Parameters
    ----------
    height : (n,) array_like
        Height of the stations, m.
    ground_height : float
        Height of the ground at the collar, m: the top of the reference rock.
    radius : float
        R0, the radius at height 0, m.
    tops : (m,) array_like
        Heights of the tops of the layers, m, descending. The first layer reaches up to the ground whatever
        its top says; what lies above the ground counts for nothing; the last goes down without limit.
    densities : (m,) array_like
        kg m-3.

    Returns
    -------
    (n,), m s-2
        Zero at and above the ground, negative below.

    Raises
    ------
    ValueError
        No layers, lengths that differ, or tops that do not descend.

    Notes
    -----
    shell(r) = -(4 pi G/r^2) * integral from r to R of rho(r') r'^2 dr'. It is not what the shells pull
    (below them they pull nothing) but what must be added to a normal gravity that still holds their pull.
    """
    tops = np.asarray(tops, dtype=float)
    densities = np.asarray(densities, dtype=float)
    if tops.ndim != 1 or tops.size == 0 or tops.shape != densities.shape:
        raise ValueError(f"layers need a density for each top, not {densities.shape} for {tops.shape}")
    if (tops[1:] >= tops[:-1]).any():
        raise ValueError("tops of layers must descend")
    upper = np.minimum(tops, ground_height)
    upper[0] = ground_height
    within = np.minimum(height, ground_height)
    outer = radius + upper
    inner = radius + within
    # Mass over 4 pi/3 from the ground down to each top, then the rest within the station's own layer.
    whole = np.concatenate(((0.0,), np.cumsum(densities[:-1] * difference_of_cubes(outer[:-1], outer[1:]))))
    layer = np.searchsorted(-upper[1:], -within)
    above = whole[layer] + densities[layer] * difference_of_cubes(outer[layer], inner)
    return above * (-FOUR_PI_G / 3.0) / (inner * inner)


def interval_density(
    *, top_anomaly: ArrayLike, base_anomaly: ArrayLike, top_radius: ArrayLike, base_radius: ArrayLike
) -> NDArray[np.float64]:
    """Density of the rock between two levels, in the exact spherical form, kg m-3.

    Parameters
    ----------
    top_anomaly, base_anomaly : (n,) array_like
        delta = g - gamma(phi, h), less the effect of known masses, at top and base, m s-2.
    top_radius, base_radius : (n,) array_like
        R0 + h of both, m, with one R0 for the survey.

    Returns
    -------
    (n,), kg m-3

    Notes
    -----
    rho = 3 (delta_t r_t^2 - delta_b r_b^2)/[4 pi G (r_t^3 - r_b^3)], exact for a density that is constant
    over the interval: d(delta r^2)/dr = 4 pi G rho r^2 by the shell theorem.
    """
    top_radius = np.asarray(top_radius, dtype=float)
    base_radius = np.asarray(base_radius, dtype=float)
    # delta_t r_t^2 - delta_b r_b^2, from the small differences.
    by_anomaly = np.subtract(top_anomaly, base_anomaly) * top_radius**2
    by_radius = np.multiply(base_anomaly, top_radius - base_radius) * (top_radius + base_radius)
    return (3.0 / FOUR_PI_G) * (by_anomaly + by_radius) / difference_of_cubes(top_radius, base_radius)


def interval_density_derivatives(
    *,
    top_anomaly: ArrayLike,
    base_anomaly: ArrayLike,
    top_radius: ArrayLike,
    base_radius: ArrayLike,
    top_gradient: ArrayLike,
    base_gradient: ArrayLike,
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Derivatives of `interval_density` by both anomalies and by both heights.

    Parameters
    ----------
    top_anomaly, base_anomaly : (n,) array_like
        As for `interval_density`, m s-2.
    top_radius, base_radius : (n,) array_like
        m.
    top_gradient, base_gradient : (n,) array_like
        d delta/dh of both stations while their gravity stays what it is, s-2: the normal gradient F at the
        station, less what known masses change with height.

    Returns
    -------
    by_top_anomaly, by_base_anomaly : (n,), kg m-3 per m s-2
    by_top_height, by_base_height : (n,), kg m-4
        Whole derivatives: a station is moved and its anomaly follows.

    Notes
    -----
    In rock the two parts of the height derivatives nearly cancel: what stays is the gradient in rock
    (0.08 to 0.12 mGal/m) over 4 pi G and the thickness, not F.
    """
    top_radius = np.asarray(top_radius, dtype=float)
    base_radius = np.asarray(base_radius, dtype=float)
    volume = difference_of_cubes(top_radius, base_radius)
    density = interval_density(
        top_anomaly=top_anomaly, base_anomaly=base_anomaly, top_radius=top_radius, base_radius=base_radius
    )
    top = 3.0 * top_radius**2 / volume
    base = 3.0 * base_radius**2 / volume
    top_flux = (top_gradient + 2.0 * np.divide(top_anomaly, top_radius)) / FOUR_PI_G
    base_flux = (base_gradient + 2.0 * np.divide(base_anomaly, base_radius)) / FOUR_PI_G
    by_top_height = top * (top_flux - density)
    by_base_height = base * (density - base_flux)
    return top / FOUR_PI_G, base / -FOUR_PI_G, by_top_height, by_base_height


def slab_density(*, gradient: ArrayLike, free_air_gradient: ArrayLike) -> NDArray[np.float64]:
    """Density of the rock between two levels in the flat form (F - gradient)/(4 pi G), kg m-3.

    Parameters
    ----------
    gradient : (n,) array_like
        Increase of gravity with depth over the interval, s-2.
    free_air_gradient : (n,) array_like
        F, s-2.

    Returns
    -------
    (n,), kg m-3

    Notes
    -----
    Smith 1950, Geophysics 15, 605-636; Hammer 1950, Geophysics 15, 637-652.
    """
    return np.subtract(free_air_gradient, gradient) / FOUR_PI_G


def spherical_cap(
    *,
    height_of_rock: ArrayLike,
    station_height: ArrayLike,
    density: ArrayLike,
    arc: float = CAP_ARC,
    radius: float = CAP_RADIUS,
) -> NDArray[np.float64]:
    """Downward attraction of a spherical cap of rock on a station on its axis, m s-2.

    Parameters
    ----------
    height_of_rock : (n,) array_like
        Height of the top of the rock above the sphere, m. Negative: rock missing down to there, which
        counts as a negative mass.
    station_height : (n,) array_like
        Height of the station above the sphere, m: above, on, inside or under the rock.
    density : (n,) array_like
        kg m-3.
    arc : float
        Half-width of the cap along the sphere, m, up to pi times the radius (a whole shell).
    radius : float
        Radius of the sphere the cap lies on, m.

    Returns
    -------
    (n,), m s-2
        Continuous through the faces of the rock; positive on top of it.

    Raises
    ------
    ValueError
        An arc that is not between 0 and half a turn.

    Notes
    -----
    Own integration of the potential (2 pi G rho/r) * integral of s (l - |r - s|) ds over the rock, with
    l^2 = r^2 + s^2 - 2 r s cos(arc/radius); on top of the rock it equals the closed form of LaFehr (1991,
    Geophysics 56, 1179-1184). The cap ends at its edge: it is no model of rock that goes on.
    """
    if not 0.0 < arc <= np.pi * radius:
        raise ValueError(f"a cap has an arc between 0 and pi times its radius, not {arc} m on {radius} m")
    angle = arc / radius
    c, s2 = cos(angle), sin(angle) ** 2
    height_of_rock = np.asarray(height_of_rock, dtype=float)
    lower = radius + np.minimum(height_of_rock, 0.0)
    upper = radius + np.maximum(height_of_rock, 0.0)
    r = radius + np.asarray(station_height, dtype=float)
    thickness = upper - lower
    # Differences of the antiderivative between the faces, each formed from the thickness.
    near, far = lower - r * c, upper - r * c
    edge_near, edge_far = np.hypot(near, r * sin(angle)), np.hypot(far, r * sin(angle))
    edge = thickness * (far + near) / (edge_near + edge_far)
    product = thickness * edge_far + near * edge
    logarithm = np.log1p((thickness + edge) / (near + edge_near))
    cube = edge * (edge_near**2 + edge_near * edge_far + edge_far**2) / 3.0
    ring = cube / r**2 + c * product / r + (2.0 * c * c - 1.0) * edge - r * c * s2 * logarithm
    middle = np.clip(r, lower, upper)
    full = (difference_of_cubes(middle, lower) - difference_of_cubes(upper, middle)) / (3.0 * r**2)
    return TWO_PI_G * np.asarray(density, dtype=float) * np.sign(height_of_rock) * (ring + full)


def bullard_b(
    *, height: ArrayLike, density: ArrayLike, arc: float = CAP_ARC, radius: float = CAP_RADIUS
) -> NDArray[np.float64]:
    """Curvature correction of a land station: spherical cap less endless slab of the same height, m s-2.

    Parameters
    ----------
    height : (n,) array_like
        Height of the station and of the rock under it, m.
    density : (n,) array_like
        kg m-3.
    arc, radius : float
        As for `spherical_cap`, m.

    Returns
    -------
    (n,), m s-2
        Positive up to about 4150 m, negative above.

    Notes
    -----
    LaFehr 1991, Geophysics 56, 1179-1184; the quantity is Bullard's B of land surveys. It is for the ground
    at the collar; for stations below ground the shell term stands in its place.
    """
    slab = TWO_PI_G * np.multiply(density, height)
    cap = spherical_cap(height_of_rock=height, station_height=height, density=density, arc=arc, radius=radius)
    return cap - slab
