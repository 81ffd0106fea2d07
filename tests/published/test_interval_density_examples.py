"""Interval density in the flat form, by the equation of the first papers on gravity in boreholes.

Smith 1950, Geophysics 15, 605-636, and Hammer 1950, Geophysics 15, 637-652: density is
(F - gradient)/(4 pi G). G is that of CODATA 2018; each number is worked out by hand from the equation.
Hinze et al. 2005, Geophysics 70(4), J25-J32, print 2 pi G as 0.04193 mGal/m per g/cm3, with G = 6.673e-11.
"""

import numpy as np
import pytest

from plumbwell.earth.constants import FOUR_PI_G, MILLIGAL, TWO_PI_G, G
from plumbwell.earth.shells import interval_density, slab_density

FOOT = 0.3048


def test_codata_2018_constant():
    assert G == 6.67430e-11


def test_four_pi_g_in_field_units():
    assert FOUR_PI_G * 1000 / MILLIGAL == pytest.approx(0.08387172739, abs=5e-12)
    assert MILLIGAL / (FOUR_PI_G * 1000) == pytest.approx(11.9229689, abs=5e-8)
    assert MILLIGAL / FOOT / (FOUR_PI_G * 1000) == pytest.approx(39.1173521, abs=5e-8)


def test_two_pi_g_as_hinze_2005_print_it():
    with_their_g = TWO_PI_G / G * 6.673e-11 * 1000 / MILLIGAL
    assert abs(with_their_g - 0.04193) <= 5e-6


@pytest.mark.parametrize(
    ("difference", "thickness", "density"),
    [
        (1.000, 10.0, 2487.131319),
        (0.9886, 9.97, 2497.176750),
        (8.0, 100.0, 2725.590698),
        (5.0, 100.0, 3083.279766),
        (-0.5, 5.0, 4871.725106),
    ],
)
def test_flat_interval_density_by_hand(difference, thickness, density):
    value = slab_density(gradient=difference / thickness * MILLIGAL, free_air_gradient=0.3086 * MILLIGAL)
    assert value == pytest.approx((0.3086 - difference / thickness) / 0.08387172739 * 1000, abs=1e-6)
    assert value == pytest.approx(density, abs=1e-6)


def test_no_change_of_gravity_means_the_free_air_gradient_over_four_pi_g():
    value = slab_density(gradient=0.0, free_air_gradient=0.3085598219 * MILLIGAL)
    assert value == pytest.approx(3678.949, abs=5e-4)


def test_one_microgal_over_ten_metres_is_0_0012_in_density():
    value = slab_density(gradient=np.array([0.0, 1e-9]), free_air_gradient=3.086e-6)
    assert value[0] - value[1] == pytest.approx(1.1923, abs=5e-5)


def test_shell_form_becomes_the_flat_form_for_thin_intervals_and_a_huge_radius():
    """With all of r2 in it, delta r2 changes by 2 delta/r as well: none of it is left at this radius."""
    radius = 1e12
    value = interval_density(
        top_anomaly=0.0, base_anomaly=-22.4e-5, top_radius=radius, base_radius=radius - 100.0
    )
    assert value == pytest.approx(22.4e-7 / FOUR_PI_G, rel=1e-6)
