"""What the layered Earth promises."""

import numpy as np
import pytest

from plumbwell.earth.constants import FOUR_PI_G, G
from plumbwell.earth.earth_model import PREM, LayeredEarth, uniform_earth
from plumbwell.earth.shells import interval_density


def test_uniform_earth_has_the_textbook_values():
    earth = uniform_earth(6e6, 5000.0)
    mass = 4 / 3 * np.pi * 6e6**3 * 5000.0
    assert earth.mass == pytest.approx(mass, rel=1e-14)
    assert earth.moment_of_inertia == pytest.approx(0.4 * mass * 6e6**2, rel=1e-14)
    np.testing.assert_allclose(
        earth.gravity([0.0, 3e6, 6e6, 12e6]), G * mass / 6e6**2 * np.array([0, 0.5, 1, 0.25]), rtol=1e-14
    )
    assert earth.potential_drop(0.0) == pytest.approx(0.5 * G * mass / 6e6, rel=1e-13)
    assert earth.potential_drop(6e6) == pytest.approx(0.0, abs=1e-7)


def test_density_on_a_boundary_is_that_below_and_outside_there_is_none():
    earth = LayeredEarth(name="two", tops=[1e6, 2e6], coefficients=[[9000.0, 0.0], [4000.0, -1000.0]])
    np.testing.assert_allclose(earth.density([0.0, 1e6, 1.5e6, 2e6, 3e6]), [9000, 9000, 3250, 3000, 0])


def test_layers_of_one_density_are_a_uniform_earth():
    tops = [2e6, 3.5e6, 6e6]
    layered = LayeredEarth(name="three", tops=tops, coefficients=[[5000.0]] * 3)
    radii = np.linspace(0, 7e6, 15)
    np.testing.assert_allclose(layered.gravity(radii), uniform_earth(6e6, 5000.0).gravity(radii), rtol=1e-13)
    assert layered.fall_time() == pytest.approx(uniform_earth(6e6, 5000.0).fall_time(), rel=1e-12)


def test_mass_outside_is_the_whole_mass():
    assert PREM.mass_inside(1e8) == PREM.mass


def test_gravity_of_the_model_gives_back_its_density_by_the_interval_form():
    edges = PREM.radius - np.array([0.0, 3000.0, 15000.0, 24400.0])
    gravity = PREM.gravity(edges)
    found = interval_density(
        top_anomaly=gravity[:-1], base_anomaly=gravity[1:], top_radius=edges[:-1], base_radius=edges[1:]
    )
    np.testing.assert_allclose(found, [1020.0, 2600.0, 2900.0], rtol=1e-8)


def test_gradient_is_that_of_poisson():
    radius = 5.8e6
    expected = 2 * PREM.gravity(radius) / radius - FOUR_PI_G * PREM.density(radius)
    assert PREM.gradient(radius) == pytest.approx(float(expected), rel=1e-15)


def test_the_model_cannot_be_changed():
    with pytest.raises(ValueError):
        PREM.coefficients[0, 0] = 1.0


@pytest.mark.parametrize(
    ("tops", "coefficients", "message"),
    [
        ([], [[1.0]], "outer radii of layers must rise from above zero"),
        ([2.0, 1.0], [[1.0], [1.0]], "outer radii of layers must rise from above zero"),
        ([0.0, 1.0], [[1.0], [1.0]], "outer radii of layers must rise from above zero"),
        ([1.0, 2.0], [[1.0]], "2 layers need as many rows of coefficients: (1, 1)"),
    ],
)
def test_layers_that_cannot_be_an_earth_are_refused(tops, coefficients, message):
    with pytest.raises(ValueError) as refused:
        LayeredEarth(name="wrong", tops=tops, coefficients=coefficients)
    assert str(refused.value) == message
