"""The reference Earth model and falls through it against print.

Dziewonski & Anderson 1981, Preliminary reference Earth model, Phys. Earth Planet. Inter. 25, 297-356: gravity
of their table, which was made with G = 6.670e-11 (it is low by a constant 1.00065 against CODATA 2018).
Klotz 2015, The gravity tunnel in a non-uniform Earth, Am. J. Phys. 83, 231-237: 38 minutes, against 42 for a
uniform Earth.
"""

import numpy as np
import pytest

from plumbwell.earth.constants import STANDARD_GRAVITY, G
from plumbwell.earth.earth_model import PREM, uniform_earth, uniform_fall_time


@pytest.mark.parametrize(
    ("radius_km", "printed"),
    [
        (6371.0, 9.816),
        (6368.0, 9.822),
        (6356.0, 9.833),
        (6346.6, 9.839),
        (6151.0, 9.905),
        (5971.0, 9.969),
        (5701.0, 10.014),
        (3480.0, 10.682),
        (3000.0, 9.557),
        (2000.0, 6.772),
        (1221.5, 4.400),
        (600.0, 2.186),
    ],
)
def test_gravity_of_the_printed_table(radius_km, printed):
    """Three printed decimals; G = 6.670e-11 is itself known to half a unit, 7.5e-5 of gravity."""
    value = PREM.gravity(radius_km * 1e3) * 6.670e-11 / G
    assert abs(value - printed) <= 5e-4 + 7.5e-5 * printed


def test_mass_and_moment_of_inertia_are_those_the_model_was_made_for():
    """Constraints of the model: 5.974e24 kg, 0.3308 M a2 (Dziewonski & Anderson 1981, from memory)."""
    assert PREM.mass == pytest.approx(5.974e24, abs=1e21)
    assert PREM.moment_of_inertia / (PREM.mass * PREM.radius**2) == pytest.approx(0.3308, abs=5e-5)


def test_gravity_is_largest_at_the_core_and_has_a_minimum_within_the_lower_mantle():
    radii = np.linspace(1e5, 6.371e6, 6272)
    assert radii[np.argmax(PREM.gravity(radii))] == pytest.approx(3.48e6, abs=1500.0)
    mantle = radii[(radii > 3.6e6) & (radii < 5.6e6)]
    assert mantle[np.argmin(PREM.gravity(mantle))] == pytest.approx(4.881e6, abs=5e3)


def test_falls_through_the_earth_after_klotz_2015():
    assert round(PREM.fall_time() / 60) == 38
    assert round(uniform_fall_time(6_371_000.0, STANDARD_GRAVITY) / 60) == 42


def test_fall_time_recomputed_by_steps():
    """Fourth-order steps of the motion itself, from the surface to the centre."""
    radii = np.linspace(0.0, PREM.radius, 20001)
    table = PREM.gravity(radii)

    def pull(r):
        return -np.interp(r, radii, table)

    r, v, t, h = PREM.radius, 0.0, 0.0, 0.5
    while True:
        k1, l1 = v, pull(r)
        k2, l2 = v + h / 2 * l1, pull(r + h / 2 * k1)
        k3, l3 = v + h / 2 * l2, pull(r + h / 2 * k2)
        k4, l4 = v + h * l3, pull(r + h * k3)
        after = r + h / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
        if after <= 0.0:
            break
        r, v, t = after, v + h / 6 * (l1 + 2 * l2 + 2 * l3 + l4), t + h
    assert PREM.fall_time() == pytest.approx(2 * (t - r / v), rel=1e-6)
    assert np.sqrt(2 * PREM.potential_drop(0.0)) == pytest.approx(-v, rel=1e-6)


def test_uniform_earth_falls_in_its_closed_time():
    earth = uniform_earth(6.371e6, 5514.0)
    surface = float(earth.gravity(earth.radius))
    assert earth.fall_time() == pytest.approx(uniform_fall_time(earth.radius, surface), rel=1e-12)
