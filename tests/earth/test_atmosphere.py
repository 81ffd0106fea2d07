"""What air pressure promises."""

import numpy as np
import pytest

from plumbwell.earth.atmosphere import ADMITTANCE, pressure_effect, standard_pressure
from plumbwell.earth.constants import MICROGAL


def test_pressure_falls_with_height_also_below_sea_level():
    assert (np.diff(standard_pressure(np.linspace(-4000.0, 9000.0, 27))) < 0).all()


def test_high_pressure_lowers_gravity_and_standard_pressure_does_nothing():
    heights = np.array([0.0, 300.0])
    effect = pressure_effect(standard_pressure(heights) + [0.0, 2000.0], barometer_height=heights)
    np.testing.assert_allclose(effect, [0.0, ADMITTANCE * 2000.0], rtol=0, atol=1e-14 * MICROGAL)
    assert effect[1] < 0


def test_own_admittance_is_used():
    effect = pressure_effect(102_325.0, barometer_height=0.0, admittance=-3.5e-11)
    assert effect == pytest.approx(-3.5e-8)


def test_the_height_of_a_station_a_kilometre_down_would_be_wrong_by_37_microgal():
    ground = pressure_effect(101_325.0, barometer_height=0.0)
    below = pressure_effect(101_325.0, barometer_height=-1000.0)
    assert (below - ground) / MICROGAL == pytest.approx(37.8, abs=1.0)
