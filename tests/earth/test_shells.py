"""What the shell term, the interval forms and the cap promise."""

import numpy as np
import pytest

from plumbwell.earth.constants import FOUR_PI_G, MICROGAL, TWO_PI_G
from plumbwell.earth.shells import (
    bullard_b,
    interval_density,
    interval_density_derivatives,
    shell_term,
    slab_density,
    spherical_cap,
)

RADIUS = 6_372_000.0


def term(height, *, ground=250.0, tops=(250.0,), densities=(2500.0,)):
    """Shell term on the sphere of these tests."""
    return shell_term(height, ground_height=ground, radius=RADIUS, tops=tops, densities=densities)


def by_quadrature(height, ground, tops, densities):
    """The integral of the definition by many midpoints within each layer."""
    edges = [ground, *[t for t in tops[1:] if height < t < ground], height]
    total = 0.0
    for upper, lower in zip(edges[:-1], edges[1:], strict=True):
        middle = (upper + lower) / 2
        layer = max(i for i, t in enumerate(tops) if i == 0 or t >= middle)
        n = 200
        h = lower + (upper - lower) * (np.arange(n) + 0.5) / n
        total += densities[layer] * np.mean((RADIUS + h) ** 2) * (upper - lower)
    return -FOUR_PI_G / (RADIUS + height) ** 2 * total


def test_shell_is_zero_at_and_above_the_ground_and_negative_below():
    values = term(np.array([1000.0, 250.0, 249.0, -2000.0]))
    assert values[0] == 0 and values[1] == 0
    assert values[2] < 0 and values[3] < values[2]


def test_layers_of_one_density_are_one_layer():
    heights = np.linspace(400.0, -3000.0, 50)
    one = term(heights)
    many = term(heights, tops=(250.0, 100.0, -400.0, -1234.5), densities=(2500.0,) * 4)
    np.testing.assert_allclose(many, one, rtol=1e-13)


@pytest.mark.parametrize("height", [200.0, 100.0, 99.0, -400.0, -2500.0])
def test_layers_against_quadrature(height):
    tops, densities = (250.0, 100.0, -400.0), (1900.0, 2300.0, 2700.0)
    value = term(height, tops=tops, densities=densities)
    assert value == pytest.approx(by_quadrature(height, 250.0, tops, densities), rel=1e-10)


@pytest.mark.parametrize("first_top", [400.0, 250.0, 180.0])
def test_first_layer_reaches_up_to_the_ground_whatever_its_top_says(first_top):
    value = term(0.0, tops=(first_top, 100.0), densities=(2000.0, 2600.0))
    expected = by_quadrature(0.0, 250.0, (250.0, 100.0), (2000.0, 2600.0))
    assert value == pytest.approx(expected, rel=1e-10)


def test_layers_wholly_above_the_ground_count_for_nothing():
    value = term(np.array([100.0, -100.0]), tops=(900.0, 600.0, 0.0), densities=(9999.0, 2500.0, 2700.0))
    expected = term(np.array([100.0, -100.0]), tops=(250.0, 0.0), densities=(2500.0, 2700.0))
    np.testing.assert_allclose(value, expected, rtol=1e-14)


def test_shell_is_continuous_through_a_boundary_and_order_of_stations_is_immaterial():
    heights = np.array([-400.0 + 1e-6, -400.0, -400.0 - 1e-6])
    layers = {"tops": (250.0, -400.0), "densities": (2000.0, 3000.0)}
    values = term(heights, **layers)
    assert np.ptp(values) < 1e-3 * MICROGAL
    np.testing.assert_array_equal(term(heights[::-1], **layers), values[::-1])


def test_a_negative_layer_density_is_a_contrast():
    assert term(0.0, densities=(-500.0,)) == pytest.approx(-float(term(0.0, densities=(500.0,))), rel=1e-15)


@pytest.mark.parametrize(
    ("tops", "densities", "message"),
    [
        ([], [], "layers need a density for each top, not (0,) for (0,)"),
        ([0.0], [1.0, 2.0], "layers need a density for each top, not (2,) for (1,)"),
        ([0.0, 0.0], [1.0, 2.0], "tops of layers must descend"),
        ([0.0, 10.0], [1.0, 2.0], "tops of layers must descend"),
    ],
)
def test_layers_that_cannot_be_are_refused(tops, densities, message):
    with pytest.raises(ValueError) as refused:
        term(0.0, tops=tops, densities=densities)
    assert str(refused.value) == message


def test_interval_density_gives_back_every_layer_of_a_column():
    tops, densities = np.array([250.0, 200.0, -300.0, -310.0]), np.array([1800.0, 2300.0, 2950.0, 2400.0])
    heights = np.array([250.0, 200.0, -300.0, -310.0, -3000.0])
    anomaly = term(heights, tops=tops, densities=densities)
    radii = RADIUS + heights
    found = interval_density(
        top_anomaly=anomaly[:-1], base_anomaly=anomaly[1:], top_radius=radii[:-1], base_radius=radii[1:]
    )
    np.testing.assert_allclose(found, densities, rtol=1e-9)


def test_interval_density_over_two_layers_is_their_mean_by_volume():
    anomaly = term(np.array([250.0, -250.0]), tops=(250.0, 0.0), densities=(2000.0, 2600.0))
    outer, middle, inner = RADIUS + 250.0, RADIUS, RADIUS - 250.0
    mean = (2000.0 * (outer**3 - middle**3) + 2600.0 * (middle**3 - inner**3)) / (outer**3 - inner**3)
    found = interval_density(
        top_anomaly=anomaly[0], base_anomaly=anomaly[1], top_radius=outer, base_radius=inner
    )
    assert found == pytest.approx(mean, rel=1e-9)


def test_derivatives_against_finite_differences_of_the_whole_formula():
    """Each station is moved with its gravity held, so that its anomaly follows with the normal gradient."""
    top = np.array([250.0, 10.0, -2000.0])
    base = top - np.array([5.0, 100.0, 900.0])
    slope = np.array([3.085e-6, 3.086e-6, 3.09e-6])
    delta_top = np.array([1e-3, -3e-4, -4.5e-3])
    delta_base = delta_top - 2.24e-6 * (top - base)

    def density(move_top=0.0, move_base=0.0, add_top=0.0, add_base=0.0):
        return interval_density(
            top_anomaly=delta_top + add_top + slope * move_top,
            base_anomaly=delta_base + add_base + slope * move_base,
            top_radius=RADIUS + top + move_top,
            base_radius=RADIUS + base + move_base,
        )

    found = interval_density_derivatives(
        top_anomaly=delta_top,
        base_anomaly=delta_base,
        top_radius=RADIUS + top,
        base_radius=RADIUS + base,
        top_gradient=slope,
        base_gradient=slope,
    )
    steps = (("add_top", 1e-7), ("add_base", 1e-7), ("move_top", 0.01), ("move_base", 0.01))
    for derivative, (name, step) in zip(found, steps, strict=True):
        difference = (density(**{name: step}) - density(**{name: -step})) / (2 * step)
        np.testing.assert_allclose(derivative, difference, rtol=2e-5)


def test_an_error_of_depth_works_with_the_gradient_in_rock_and_not_with_the_free_air_one():
    """The station sinks by e: density above rises by (gradient in rock) e/(4 pi G thickness)."""
    found = interval_density_derivatives(
        top_anomaly=0.0,
        base_anomaly=-2.24e-4,
        top_radius=RADIUS,
        base_radius=RADIUS - 100.0,
        top_gradient=3.086e-6,
        base_gradient=3.086e-6,
    )
    in_rock = 3.086e-6 - 2.24e-6
    assert -found[3] == pytest.approx(in_rock / (FOUR_PI_G * 100.0), rel=1e-3)
    assert -found[2] == pytest.approx(-in_rock / (FOUR_PI_G * 100.0), rel=1e-3)


def test_slab_density_takes_lists_and_gives_the_plain_quotient():
    np.testing.assert_allclose(
        slab_density(gradient=[1e-6, 0.9e-6], free_air_gradient=3.086e-6),
        [2.086e-6 / FOUR_PI_G, 2.186e-6 / FOUR_PI_G],
        rtol=1e-15,
    )


def cap(station, *, rock=800.0, density=2670.0, **size):
    """Cap of these tests."""
    return spherical_cap(height_of_rock=rock, station_height=station, density=density, **size)


def test_cap_is_continuous_through_both_faces():
    for face in (0.0, 800.0):
        values = cap(np.array([face - 1e-6, face, face + 1e-6]))
        assert np.ptp(values) < 1e-3 * MICROGAL


def test_slope_of_the_cap_jumps_by_four_pi_g_rho_at_its_faces():
    step = 0.01
    for face in (0.0, 800.0):
        below, at, above = cap(np.array([face - step, face, face + step]))
        jump = abs((above - at) / step - (at - below) / step)
        assert jump == pytest.approx(FOUR_PI_G * 2670.0, rel=1e-3)


def test_cap_pulls_up_from_above_and_fades_upward():
    assert cap(-100.0) < 0
    values = cap(np.array([800.0, 10e3, 100e3, 1000e3]))
    assert (np.diff(values) < 0).all() and values[-1] > 0


def test_two_caps_one_on_the_other_are_one():
    radius = 6_371_000.0
    whole = cap(1500.0, rock=1000.0, arc=50e3)
    lower = cap(1500.0, rock=400.0, arc=50e3)
    share = (radius + 400.0) / radius
    upper = cap(1100.0, rock=600.0, arc=50e3 * share, radius=radius + 400.0)
    assert lower + upper == pytest.approx(float(whole), rel=1e-10)


def test_missing_rock_is_a_negative_mass():
    hole = cap(0.0, rock=-300.0)
    filled = cap(300.0, rock=300.0, radius=6_371_000.0 - 300.0, arc=166_735.0 * (1 - 300.0 / 6_371_000.0))
    assert hole == pytest.approx(-float(filled), rel=1e-9)


def test_no_rock_no_pull():
    np.testing.assert_array_equal(cap(np.array([-5.0, 0.0, 5.0]), rock=0.0), 0.0)


def test_bullard_b_is_cap_less_slab():
    heights = np.array([10.0, 900.0, 5000.0])
    expected = cap(heights, rock=heights) - TWO_PI_G * 2670.0 * heights
    np.testing.assert_allclose(bullard_b(height=heights, density=2670.0), expected, rtol=1e-12)


@pytest.mark.parametrize("arc", [0.0, -1.0, 2.1e7])
def test_an_arc_that_is_no_cap_is_refused(arc):
    with pytest.raises(ValueError) as refused:
        cap(0.0, arc=arc)
    assert str(refused.value) == (
        f"a cap has an arc between 0 and pi times its radius, not {arc} m on 6371000.0 m"
    )
