"""The Earth as a whole: density as polynomials of radius, and gravity, mass and falls that follow.

It checks the shell code and gives the background for very deep holes. Spherical, no rotation.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import pi, sqrt

import numpy as np
from numpy.typing import ArrayLike, NDArray

from plumbwell.earth.constants import FOUR_PI_G, G


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LayeredEarth:
    """A spherical Earth of concentric layers, each with a polynomial density.

    Parameters
    ----------
    name : str
    tops : (m,) array_like
        Outer radii of the layers, m, from the innermost outward; the last is the radius of the Earth.
    coefficients : (m, p) array_like
        kg m-3: rho = sum of coefficients[i, j] x^j with x = r over the last radius.

    Raises
    ------
    ValueError
        Radii that do not rise from above zero, or coefficients that do not fit them.
    """

    name: str
    tops: NDArray[np.float64]
    coefficients: NDArray[np.float64]

    def __post_init__(self) -> None:
        tops = np.array(self.tops, dtype=float)
        coefficients = np.array(self.coefficients, dtype=float)
        if tops.ndim != 1 or tops.size == 0 or tops[0] <= 0.0 or (np.diff(tops) <= 0.0).any():
            raise ValueError("outer radii of layers must rise from above zero")
        if coefficients.ndim != 2 or coefficients.shape[0] != tops.size:
            raise ValueError(f"{tops.size} layers need as many rows of coefficients: {coefficients.shape}")
        tops.flags.writeable = coefficients.flags.writeable = False
        object.__setattr__(self, "tops", tops)
        object.__setattr__(self, "coefficients", coefficients)

    @property
    def radius(self) -> float:
        """Radius of the Earth, m."""
        return float(self.tops[-1])

    @property
    def mass(self) -> float:
        """Whole mass, kg."""
        return float(self.mass_inside(self.radius))

    @property
    def moment_of_inertia(self) -> float:
        """Moment of inertia about a diameter, kg m2: (8 pi/3) * integral of rho r^4 dr."""
        return float(8.0 / 3.0 * pi * self._moment_inside(np.asarray(self.radius), 4))

    def density(self, radius: ArrayLike) -> NDArray[np.float64]:
        """Density at a radius, kg m-3; on a boundary that of the layer below it, zero outside.

        Parameters
        ----------
        radius : (n,) array_like
            Distance from the centre, m.
        """
        radius = np.asarray(radius, dtype=float)
        layer = np.minimum(np.searchsorted(self.tops, radius), self.tops.size - 1)
        x = radius / self.radius
        value = np.zeros_like(x)
        for column in self.coefficients.T[::-1]:
            value = value * x + column[layer]
        return np.where(radius > self.radius, 0.0, value)

    def _moment_inside(self, radius: NDArray[np.float64], power: int) -> NDArray[np.float64]:
        """Integral of rho r^power dr from the centre to `radius`."""
        bottoms = np.concatenate(((0.0,), self.tops[:-1]))
        upper = np.clip(radius[..., None], bottoms, self.tops) / self.radius
        lower = bottoms / self.radius
        total = np.zeros(radius.shape)
        for j in range(self.coefficients.shape[1]):
            order = power + j + 1
            total += ((upper**order - lower**order) * (self.coefficients[:, j] / order)).sum(axis=-1)
        return total * self.radius ** (power + 1)

    def mass_inside(self, radius: ArrayLike) -> NDArray[np.float64]:
        """Mass closer to the centre than `radius`, kg.

        Parameters
        ----------
        radius : (n,) array_like
            Distance from the centre, m; outside the Earth it is the whole mass.
        """
        return 4.0 * pi * self._moment_inside(np.asarray(radius, dtype=float), 2)

    def gravity(self, radius: ArrayLike) -> NDArray[np.float64]:
        """Gravity at a radius, m s-2, positive toward the centre: G m(r)/r^2, zero at the centre.

        Parameters
        ----------
        radius : (n,) array_like
            Distance from the centre, m.
        """
        radius = np.asarray(radius, dtype=float)
        inside = self.mass_inside(radius)
        return G * np.divide(inside, radius**2, out=np.zeros_like(radius), where=radius > 0.0)

    def gradient(self, radius: ArrayLike) -> NDArray[np.float64]:
        """Increase of gravity with depth, 2 g/r - 4 pi G rho, s-2, on a boundary that below it.

        Parameters
        ----------
        radius : (n,) array_like
            Distance from the centre, m, above zero.

        Notes
        -----
        Zero where the local density is two thirds of the mean density inside (Weihrauch 1886).
        """
        radius = np.asarray(radius, dtype=float)
        return 2.0 * self.gravity(radius) / radius - FOUR_PI_G * self.density(radius)

    def potential_drop(self, radius: ArrayLike) -> NDArray[np.float64]:
        """Integral of gravity from `radius` up to the surface, m2 s-2: half the speed squared of a fall.

        Parameters
        ----------
        radius : (n,) array_like
            Distance from the centre, m, within the Earth.

        Notes
        -----
        By parts, integral of G m/r^2 = [-G m/r] + 4 pi G * integral of rho r dr: polynomials throughout.
        """
        radius = np.asarray(radius, dtype=float)
        whole = np.asarray(self.radius)
        above = FOUR_PI_G * (self._moment_inside(whole, 1) - self._moment_inside(radius, 1))
        return radius * self.gravity(radius) - G * self.mass / self.radius + above

    def fall_time(self) -> float:
        """Time to fall from rest at the surface through the centre to the other side, s.

        Notes
        -----
        T = 2 * integral of dr/v. With r = R sin(angle) the integrand stays finite where the fall begins; it
        is smooth within each layer, where 24 points of Gauss and Legendre are taken.
        """
        nodes, weights = np.polynomial.legendre.leggauss(24)
        edges = np.arcsin(np.concatenate(((0.0,), self.tops)) / self.radius)
        half = 0.5 * np.diff(edges)[:, None]
        angle = 0.5 * (edges[1:] + edges[:-1])[:, None] + half * nodes
        speed = np.sqrt(2.0 * self.potential_drop(self.radius * np.sin(angle)))
        return float(2.0 * self.radius * np.sum(half * weights * np.cos(angle) / speed))


def uniform_earth(radius: float, density: float) -> LayeredEarth:
    """An Earth of one density throughout.

    Parameters
    ----------
    radius : float
        m.
    density : float
        kg m-3.
    """
    return LayeredEarth(name="uniform", tops=np.array([radius]), coefficients=np.array([[density]]))


def uniform_fall_time(radius: float, gravity: float) -> float:
    """Time to fall without friction along any straight tunnel through a uniform Earth, pi sqrt(R/g), s.

    Parameters
    ----------
    radius : float
        m.
    gravity : float
        At the surface, m s-2.
    """
    return pi * sqrt(radius / gravity)


PREM = LayeredEarth(
    name="PREM",
    tops=1e3 * np.array([1221.5, 3480.0, 5701.0, 5771.0, 5971.0, 6151.0, 6346.6, 6356.0, 6368.0, 6371.0]),
    coefficients=1e3
    * np.array(
        [
            [13.0885, 0.0, -8.8381, 0.0],
            [12.5815, -1.2638, -3.6426, -5.5281],
            [7.9565, -6.4761, 5.5283, -3.0807],
            [5.3197, -1.4836, 0.0, 0.0],
            [11.2494, -8.0298, 0.0, 0.0],
            [7.1089, -3.8045, 0.0, 0.0],
            [2.6910, 0.6924, 0.0, 0.0],
            [2.900, 0.0, 0.0, 0.0],
            [2.600, 0.0, 0.0, 0.0],
            [1.020, 0.0, 0.0, 0.0],
        ]
    ),
)
"""Preliminary reference Earth model: densities of Dziewonski & Anderson 1981, Phys. Earth Planet. Inter. 25,
297-356, table 1."""
