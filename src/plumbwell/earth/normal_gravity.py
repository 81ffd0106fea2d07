"""Normal gravity on and off the ellipsoid, for the four systems surveys are reduced with.

On the ellipsoid it is the closed formula of Somigliana; above and below it the closed formula in
ellipsoidal coordinates, continued inward, or the second-order series older surveys used.
Gravity is positive downward, height is above the ellipsoid, latitude is geodetic and in radians.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from plumbwell.earth import ellipsoid as figures
from plumbwell.earth.ellipsoid import Ellipsoid, q_over_cube, q_prime_over_square

FORMS = ("closed", "series")
"""How normal gravity is carried to a height: closed formula, or second-order series."""

_COMPLEX_STEP = 1e-30


@dataclass(frozen=True, slots=True)
class NormalSystem:
    """A normal gravity formula with the ellipsoid that carries it to other heights.

    Parameters
    ----------
    name : str
    ellipsoid : Ellipsoid
    gamma_e : float
        Gravity at the equator, m s-2.
    k, e2 : float
        Somigliana's constants; not used where `sine_terms` is given.
    sine_terms : (float, float) or None
        b1 and b2 of gamma_e (1 + b1 sin2 phi + b2 sin2 2phi), for a formula printed in that form.
    source : str
        Where the constants are printed.
    """

    name: str
    ellipsoid: Ellipsoid
    gamma_e: float
    k: float
    e2: float
    source: str
    sine_terms: tuple[float, float] | None = None


def _derived(name: str, ellipsoid: Ellipsoid, source: str) -> NormalSystem:
    return NormalSystem(name, ellipsoid, ellipsoid.gamma_e, ellipsoid.k, ellipsoid.e2, source)


SYSTEMS: dict[str, NormalSystem] = {
    "WGS84": NormalSystem(
        "WGS84",
        figures.WGS84,
        9.7803253359,
        0.00193185265241,
        0.00669437999014,
        "NIMA TR8350.2 (2000), ch. 4",
    ),
    "GRS80": _derived("GRS80", figures.GRS80, "Moritz 2000, J. Geodesy 74, 128-133"),
    "GRS67": _derived("GRS67", figures.GRS67, "IAG 1971, Publication speciale 3"),
    "1930": NormalSystem(
        "1930",
        figures.INTERNATIONAL_1924,
        9.78049,
        figures.INTERNATIONAL_1924.k,
        figures.INTERNATIONAL_1924.e2,
        "Cassinis 1930, Bull. Geod. 26, 40-49",
        (0.0052884, -0.0000059),
    ),
}
"""The systems by name. The closed values of "1930" hold the Potsdam datum error of about 14 mGal."""


def normal_system(system: str) -> NormalSystem:
    """The normal gravity system of that name.

    Raises
    ------
    ValueError
        When there is none.
    """
    try:
        return SYSTEMS[system]
    except KeyError:
        known = ", ".join(SYSTEMS)
        raise ValueError(f"unknown normal gravity system {system!r}; known are {known}") from None


def _is_closed(form: str) -> bool:
    if form not in FORMS:
        raise ValueError(f"unknown height form {form!r}; known are {', '.join(FORMS)}")
    return form == "closed"


def gravity_on_ellipsoid(system: str, *, latitude: ArrayLike) -> NDArray[np.float64]:
    """Normal gravity on the ellipsoid, m s-2, positive downward.

    Parameters
    ----------
    system : {"WGS84", "GRS80", "GRS67", "1930"}
    latitude : (n,) array_like
        Geodetic latitude, rad.

    Returns
    -------
    (n,), m s-2

    Raises
    ------
    ValueError
        Unknown system.

    Notes
    -----
    gamma = gamma_e (1 + k sin2)/sqrt(1 - e2 sin2) (Somigliana 1929), and for "1930" the printed
    978049 (1 + 0.0052884 sin2 phi - 0.0000059 sin2 2phi) mGal.
    """
    chosen = normal_system(system)
    sin2 = np.sin(latitude) ** 2
    if chosen.sine_terms is not None:
        first, second = chosen.sine_terms
        return chosen.gamma_e * (1.0 + sin2 * (first + 4.0 * second * (1.0 - sin2)))
    return chosen.gamma_e * (1.0 + chosen.k * sin2) / np.sqrt(1.0 - chosen.e2 * sin2)


def gravity_at_height(
    system: str, *, latitude: ArrayLike, height: ArrayLike, form: str = "closed"
) -> NDArray[np.float64]:
    """Normal gravity at a height above (or, negative, below) the ellipsoid, m s-2, positive downward.

    Parameters
    ----------
    system : {"WGS84", "GRS80", "GRS67", "1930"}
    latitude : (n,) array_like
        Geodetic latitude, rad.
    height : (n,) array_like
        Height above the ellipsoid, m; negative below.
    form : {"closed", "series"}

    Returns
    -------
    (n,), m s-2

    Raises
    ------
    ValueError
        Unknown system or form.

    Notes
    -----
    "closed" is the size of the normal gravity vector in ellipsoidal coordinates (Heiskanen & Moritz 1967,
    ch. 2 and 6; Li & Goetze 2001, Geophysics 66, 1660-1668), continued inward as if the ellipsoid were
    empty. "series" is gamma [1 - 2/a (1 + f + m - 2 f sin2) h + 3 h^2/a^2] (Heiskanen & Moritz 1967,
    eq. 2-123), which departs by some 10 uGal a km. The closed value of "1930" is its printed formula plus
    the closed change with height of the International ellipsoid.
    """
    chosen = normal_system(system)
    if _is_closed(form):
        if chosen.sine_terms is None:
            return _closed(chosen.ellipsoid, latitude, height)
        change = _closed(chosen.ellipsoid, latitude, height) - _closed(chosen.ellipsoid, latitude, 0.0)
        return gravity_on_ellipsoid(system, latitude=latitude) + change
    on_ellipsoid = gravity_on_ellipsoid(system, latitude=latitude)
    ratio = np.asarray(height, dtype=float) / chosen.ellipsoid.semi_major
    return on_ellipsoid * (1.0 - 2.0 * _series_slope(chosen.ellipsoid, latitude) * ratio + 3.0 * ratio**2)


def gradient_at_height(
    system: str, *, latitude: ArrayLike, height: ArrayLike, form: str = "closed"
) -> NDArray[np.float64]:
    """Decrease of normal gravity with height, -d gamma/dh, s-2 (about 3.086e-6).

    Parameters
    ----------
    system : {"WGS84", "GRS80", "GRS67", "1930"}
    latitude : (n,) array_like
        Geodetic latitude, rad.
    height : (n,) array_like
        Height above the ellipsoid, m.
    form : {"closed", "series"}

    Returns
    -------
    (n,), s-2

    Raises
    ------
    ValueError
        Unknown system or form.

    Notes
    -----
    The derivative of `gravity_at_height` itself, to the last digits: the closed formula is analytic in h, so
    its imaginary part for h + i t is t d gamma/dh without a difference (Squire & Trapp 1998, SIAM Rev. 40,
    110-112). On the ellipsoid it equals Bruns' formula, see `free_air.bruns_gradient`.
    """
    chosen = normal_system(system)
    if _is_closed(form):
        step = _closed(chosen.ellipsoid, latitude, np.asarray(height, dtype=float) + _COMPLEX_STEP * 1j)
        return step.imag / -_COMPLEX_STEP
    a = chosen.ellipsoid.semi_major
    slope = _series_slope(chosen.ellipsoid, latitude) - 3.0 * np.asarray(height, dtype=float) / a
    return gravity_on_ellipsoid(system, latitude=latitude) * (2.0 / a) * slope


def height_change(
    system: str, *, latitude: ArrayLike, height: ArrayLike, form: str = "closed"
) -> NDArray[np.float64]:
    """Normal gravity at a height less that on the ellipsoid, m s-2: negative above, positive below.

    Parameters
    ----------
    system : {"WGS84", "GRS80", "GRS67", "1930"}
    latitude : (n,) array_like
        Geodetic latitude, rad.
    height : (n,) array_like
        Height above the ellipsoid, m.
    form : {"closed", "series"}

    Returns
    -------
    (n,), m s-2

    Raises
    ------
    ValueError
        Unknown system or form.
    """
    at_height = gravity_at_height(system, latitude=latitude, height=height, form=form)
    return at_height - gravity_on_ellipsoid(system, latitude=latitude)


def _series_slope(ellipsoid: Ellipsoid, latitude: ArrayLike) -> NDArray[np.float64]:
    f = ellipsoid.flattening
    return 1.0 + f + ellipsoid.m - 2.0 * f * np.sin(latitude) ** 2


def _closed(ellipsoid: Ellipsoid, latitude: ArrayLike, height: Any) -> Any:
    """Size of normal gravity; `height` may be complex, so all of it is analytic in the height."""
    sin2 = np.sin(latitude) ** 2
    across = ellipsoid.semi_major / np.sqrt(1.0 - ellipsoid.e2 * sin2)
    linear2 = ellipsoid.linear_eccentricity**2
    spin = ellipsoid.omega**2
    z2 = sin2 * (across * (1.0 - ellipsoid.e2) + height) ** 2
    d = (1.0 - sin2) * (across + height) ** 2 + z2 - linear2
    # u is the small half-axis of the confocal ellipsoid through the point, beta the reduced latitude on it.
    u2 = 0.5 * d * (1.0 + np.sqrt(1.0 + (4.0 * linear2) * z2 / (d * d)))
    sin2_beta = z2 / u2
    cos2_beta = 1.0 - sin2_beta
    v2 = u2 + linear2
    u = np.sqrt(u2)
    t2 = linear2 / u2
    swell = spin * ellipsoid.semi_major**2 / ellipsoid.q0
    bulge = swell * ellipsoid.linear_eccentricity * t2 * q_prime_over_square(t2)
    outward = (ellipsoid.gm + bulge * (0.5 * sin2_beta - 1.0 / 6.0)) / v2 - spin * u * cos2_beta
    # Only the square of the component along the meridian is needed, so no root is taken at the poles.
    q = ellipsoid.linear_eccentricity / u * t2 * q_over_cube(t2)
    northward = (swell * q - spin * v2) ** 2 / v2 * (sin2_beta * cos2_beta)
    return np.sqrt((outward * outward + northward) * v2 / (u2 + linear2 * sin2_beta))
