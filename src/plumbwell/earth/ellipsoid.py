"""Level ellipsoids of revolution: what defines them, what follows from it, and how they curve.

The derived figures come from the closed formulas of Heiskanen & Moritz (1967, ch. 2) and Moritz (2000),
with the two functions that cancel in them (q and q') taken as series.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from math import atan, sqrt
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

# q(t) = t^3 (c1 - c2 t^2 + ...) and q'(t) = t^2 (d1 - d2 t^2 + ...) with t = E/u: the closed forms lose
# seven digits to cancellation, the series none. Highest power first; t^2 is about 0.0067.
_TERMS = range(7, 0, -1)
_Q = tuple((-1) ** (n + 1) * 2.0 * n / ((2 * n + 1) * (2 * n + 3)) for n in _TERMS)
_Q_PRIME = tuple((-1) ** (n + 1) * 6.0 / ((2 * n + 1) * (2 * n + 3)) for n in _TERMS)


def _polynomial(coefficients: tuple[float, ...], x: Any) -> Any:
    total: Any = coefficients[0]
    for coefficient in coefficients[1:]:
        total = total * x + coefficient
    return total


def q_over_cube(t_squared: Any) -> Any:
    """q / t^3 of the normal potential, t = E/u the second eccentricity of the confocal ellipsoid.

    Parameters
    ----------
    t_squared : float or array_like
        (E/u)^2, no unit; smaller than 0.01 for full accuracy (down to 1000 km). It may be
        complex.

    Returns
    -------
    Same kind as `t_squared`, no unit.

    Notes
    -----
    2 q = (1 + 3/t^2) atan t - 3/t (Heiskanen & Moritz 1967, ch. 2), as a power series.
    """
    return _polynomial(_Q, t_squared)


def q_prime_over_square(t_squared: Any) -> Any:
    """q' / t^2 of the normal potential, with the argument of `q_over_cube`.

    Notes
    -----
    q' = 3 (1 + 1/t^2)(1 - atan(t)/t) - 1 (Heiskanen & Moritz 1967, ch. 2), as a power series.
    """
    return _polynomial(_Q_PRIME, t_squared)


@dataclass(frozen=True, slots=True)
class Ellipsoid:
    """A level ellipsoid with its normal gravity field.

    Parameters
    ----------
    name : str
    semi_major : float
        Equatorial radius a, m.
    flattening : float
        f = (a - b)/a, no unit.
    gm : float
        Geocentric gravitational constant, m3 s-2.
    omega : float
        Angular velocity, rad s-1.

    Attributes
    ----------
    semi_minor, e2, linear_eccentricity : float
        b (m), first eccentricity squared, E = sqrt(a^2 - b^2) (m).
    m : float
        omega^2 a^2 b / GM.
    gamma_e, gamma_p, k : float
        Normal gravity at equator and pole (m s-2), and b gamma_p/(a gamma_e) - 1.
    j2, u0 : float
        Dynamical form factor, and the potential of the ellipsoid (m2 s-2).
    q0 : float
        The function q at the ellipsoid.

    Notes
    -----
    Heiskanen & Moritz 1967, ch. 2; Moritz 2000, J. Geodesy 74, 128-133.
    """

    name: str
    semi_major: float
    flattening: float
    gm: float
    omega: float
    semi_minor: float = field(init=False)
    e2: float = field(init=False)
    linear_eccentricity: float = field(init=False)
    m: float = field(init=False)
    gamma_e: float = field(init=False)
    gamma_p: float = field(init=False)
    k: float = field(init=False)
    j2: float = field(init=False)
    u0: float = field(init=False)
    q0: float = field(init=False)

    def __post_init__(self) -> None:
        if not (self.semi_major > 0.0 and 0.0 < self.flattening < 0.01 and self.gm > 0.0):
            figure = f"a = {self.semi_major}, f = {self.flattening}, GM = {self.gm}"
            raise ValueError(f"not the figure of the Earth: {figure}")
        a, f, gm, omega = self.semi_major, self.flattening, self.gm, self.omega
        b = a * (1.0 - f)
        e2 = f * (2.0 - f)
        linear = a * sqrt(e2)
        second = linear / b
        m = omega**2 * a**2 * b / gm
        q0 = second**3 * q_over_cube(second**2)
        bulge = m * second * second**2 * q_prime_over_square(second**2) / q0
        gamma_e = gm / (a * b) * (1.0 - m - bulge / 6.0)
        gamma_p = gm / a**2 * (1.0 + bulge / 3.0)
        derived = {
            "semi_minor": b,
            "e2": e2,
            "linear_eccentricity": linear,
            "m": m,
            "gamma_e": gamma_e,
            "gamma_p": gamma_p,
            "k": b * gamma_p / (a * gamma_e) - 1.0,
            "j2": e2 / 3.0 * (1.0 - 2.0 / 15.0 * m * second / q0),
            "u0": gm / linear * atan(second) + omega**2 * a**2 / 3.0,
            "q0": q0,
        }
        for name, value in derived.items():
            object.__setattr__(self, name, value)


def flattening_from_j2(*, semi_major: float, j2: float, gm: float, omega: float) -> float:
    """Flattening of the level ellipsoid that has the dynamical form factor `j2`.

    Parameters
    ----------
    semi_major : float
        Equatorial radius, m.
    j2 : float
        Dynamical form factor, no unit.
    gm : float
        m3 s-2.
    omega : float
        rad s-1.

    Returns
    -------
    float
        f, no unit, to the last digit of double precision or the one before it.

    Notes
    -----
    e^2 = 3 J2 + (2/15)(omega^2 a^3/GM) e^3/q0 by iteration (Moritz 2000, J. Geodesy 74, 128-133).
    """
    e2 = 3.0 * j2
    for _ in range(30):
        second = sqrt(e2 / (1.0 - e2))
        q0 = second**3 * q_over_cube(second**2)
        e2 = 3.0 * j2 + 2.0 / 15.0 * omega**2 * semi_major**3 / gm * e2 * sqrt(e2) / q0
    return e2 / (1.0 + sqrt(1.0 - e2))


WGS84 = Ellipsoid("WGS84", 6378137.0, 1.0 / 298.257223563, 3.986004418e14, 7.292115e-5)
"""World Geodetic System 1984: a, 1/f, GM, omega define it (NIMA TR8350.2, 3rd edition)."""

GRS80 = Ellipsoid(
    "GRS80",
    6378137.0,
    flattening_from_j2(semi_major=6378137.0, j2=1.08263e-3, gm=3.986005e14, omega=7.292115e-5),
    3.986005e14,
    7.292115e-5,
)
"""Geodetic Reference System 1980: a, J2, GM, omega define it (Moritz 2000)."""

GRS67 = Ellipsoid(
    "GRS67",
    6378160.0,
    flattening_from_j2(semi_major=6378160.0, j2=1.0827e-3, gm=3.98603e14, omega=7.2921151467e-5),
    3.98603e14,
    7.2921151467e-5,
)
"""Geodetic Reference System 1967: a, J2, GM, omega define it (IAG 1971, Publ. spec. 3)."""

INTERNATIONAL_1924 = Ellipsoid("International 1924", 6378388.0, 1.0 / 297.0, 3.98632904e14, 7.2921151e-5)
"""International ellipsoid (Hayford): a and 1/f of 1924; GM computed so that gravity at the equator is the
9.78049 m s-2 of the 1930 formula."""


def principal_radii(
    latitude: ArrayLike, ellipsoid: Ellipsoid
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Radii of curvature (M, N) of the ellipsoid, along the meridian and across it.

    Parameters
    ----------
    latitude : (n,) array_like
        Geodetic latitude, rad.
    ellipsoid : Ellipsoid

    Returns
    -------
    M, N : (n,), m

    Notes
    -----
    M = a (1 - e2)/(1 - e2 sin2)^(3/2), N = a/(1 - e2 sin2)^(1/2).
    """
    w2 = 1.0 - ellipsoid.e2 * np.sin(latitude) ** 2
    across = ellipsoid.semi_major / np.sqrt(w2)
    return across * (1.0 - ellipsoid.e2) / w2, across


def mean_curvature(
    latitude: ArrayLike, ellipsoid: Ellipsoid, *, height: ArrayLike = 0.0
) -> NDArray[np.float64]:
    """Mean curvature J = (1/M + 1/N)/2 of the ellipsoid; 1/J is the radius used for shells.

    Parameters
    ----------
    latitude : (n,) array_like
        Geodetic latitude, rad.
    ellipsoid : Ellipsoid
    height : (n,) array_like
        Height above the ellipsoid, m, of the parallel surface that is meant.

    Returns
    -------
    (n,), m-1
    """
    along, across = principal_radii(latitude, ellipsoid)
    return 0.5 / np.add(along, height) + 0.5 / np.add(across, height)
