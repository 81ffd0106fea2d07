"""Which free-air gradient belongs at depth: 2 g/r with the gravity that is there.

Poisson's equation on a layered sphere, dg/dz = 2 g/r - 4 pi G rho, worked out by hand for a uniform crust of
2670 kg m-3 on R = 6371 km; and Weihrauch 1886: gravity has no gradient where the density is two thirds of the
mean density of all that lies below.
"""

import numpy as np
import pytest

from plumbwell.earth.constants import FOUR_PI_G, MILLIGAL
from plumbwell.earth.earth_model import LayeredEarth
from plumbwell.earth.ellipsoid import WGS84, mean_curvature
from plumbwell.earth.free_air import bruns_gradient
from plumbwell.earth.normal_gravity import gravity_at_height
from plumbwell.earth.shells import shell_term, slab_density

RADIUS = 6_371_000.0
GM = 3.986004418e14
ROCK = 2670.0


def gravity(depth):
    """Gravity below a uniform crust."""
    crust = shell_term(-depth, ground_height=0.0, radius=RADIUS, tops=[0.0], densities=[ROCK])
    return GM / (RADIUS - depth) ** 2 + crust


@pytest.mark.parametrize(
    ("depth", "gradient", "with_surface", "with_continued"),
    [
        (0.0, 0.084342582, 2669.99554, 2670.00419),
        (1000.0, 0.084417471, 2669.10264, 2670.84263),
        (3000.0, 0.084567389, 2667.31517, 2672.52109),
        (5000.0, 0.084717496, 2665.52545, 2674.20166),
    ],
)
def test_only_the_actual_gravity_gives_the_density(depth, gradient, with_surface, with_continued):
    top, base = depth, depth + 10.0
    slope = (gravity(base) - gravity(top)) / 10.0
    assert slope / MILLIGAL == pytest.approx(gradient, abs=1e-9)
    middle = RADIUS - 0.5 * (top + base)
    surface = slab_density(gradient=slope, free_air_gradient=2 * GM / RADIUS**3)
    continued = slab_density(gradient=slope, free_air_gradient=2 * GM / middle**3)
    actual = slab_density(gradient=slope, free_air_gradient=2 * gravity(depth + 5.0) / middle)
    assert surface == pytest.approx(with_surface, abs=1e-2)
    assert continued == pytest.approx(with_continued, abs=2e-2)
    assert actual == pytest.approx(ROCK, abs=1e-4)


def test_bruns_with_actual_gravity_and_height_gives_the_density_at_depth():
    """A crust of 2670 kg m-3 under the normal field at 45 degrees: shell term and closed formula together."""
    latitude = np.radians(45.0)
    radius = 1 / mean_curvature(latitude, WGS84)
    for depth in (0.0, 1000.0, 3000.0, 5000.0):
        heights = -np.array([depth, depth + 5.0, depth + 10.0])
        crust = shell_term(heights, ground_height=0.0, radius=radius, tops=[0.0], densities=[ROCK])
        actual = gravity_at_height("WGS84", latitude=latitude, height=heights) + crust
        free_air = bruns_gradient("WGS84", latitude=latitude, gravity=actual[1], height=heights[1])
        found = slab_density(gradient=(actual[2] - actual[0]) / 10.0, free_air_gradient=free_air)
        assert found == pytest.approx(ROCK, abs=0.05)
        at_surface = bruns_gradient("WGS84", latitude=latitude, gravity=actual[1])
        low = slab_density(gradient=(actual[2] - actual[0]) / 10.0, free_air_gradient=at_surface)
        assert low - found == pytest.approx(-0.577e-3 * (depth + 5.0), abs=0.02)


def test_gradient_vanishes_at_two_thirds_of_the_mean_density_below():
    core = LayeredEarth(name="core", tops=[5e6], coefficients=[[6000.0]])
    mean = core.mass / (4 / 3 * np.pi * 5e6**3)
    for factor, sign in ((0.9, 1.0), (1.1, -1.0)):
        density = 2 / 3 * mean * factor
        earth = LayeredEarth(name="two", tops=[5e6, 5.0001e6], coefficients=[[6000.0], [density]])
        slope = (earth.gravity(5e6) - earth.gravity(5.0001e6)) / 100.0
        assert np.sign(slope) == sign
    neutral = LayeredEarth(name="two", tops=[5e6, 5.0001e6], coefficients=[[6000.0], [2 / 3 * mean]])
    heights = np.array([5e6, 5.00005e6])
    assert abs(np.diff(neutral.gravity(heights))[0] / 50.0) < 1e-4 * FOUR_PI_G * mean


def test_gravity_just_below_a_level_follows_the_gradient_of_the_model():
    earth = LayeredEarth(name="two", tops=[5e6, 6e6], coefficients=[[9000.0, 0.0], [4000.0, -1500.0]])
    for radius in (3e6, 5.5e6):
        slope = (earth.gravity(radius - 50.0) - earth.gravity(radius + 50.0)) / 100.0
        assert earth.gradient(radius) == pytest.approx(slope, rel=1e-7)
