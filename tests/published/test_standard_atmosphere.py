"""The standard atmosphere and the effect of air pressure on gravity against print.

ISO 2533:1975, Standard Atmosphere: pressures at geopotential heights (from memory; recomputed here with its
exponent g M/(R L) = 9.80665 * 0.02896442/(8.31432 * 0.0065)).
IAG 1983, resolution 9: reference pressure by DIN 5450, 1013.25 (1 - 0.0065 H/288.15)^5.2559 hPa, and
0.30 uGal/hPa.
"""

import numpy as np
import pytest

from plumbwell.earth.atmosphere import pressure_effect, standard_pressure
from plumbwell.earth.constants import MICROGAL


@pytest.mark.parametrize(
    ("height", "hectopascal"),
    [(0.0, 1013.250), (1000.0, 898.746), (2000.0, 794.952), (3000.0, 701.085), (5000.0, 540.199)],
)
def test_pressures_of_iso_2533(height, hectopascal):
    """The rounded exponent of DIN 5450 costs up to 3e-6 of the pressure."""
    recomputed = 1013.25 * (1 - 0.0065 * height / 288.15) ** (9.80665 * 0.02896442 / (8.31432 * 0.0065))
    assert abs(recomputed - hectopascal) <= 5e-4
    assert standard_pressure(height) / 100.0 == pytest.approx(hectopascal, abs=5e-4 + 3e-6 * hectopascal)


def test_formula_of_din_5450_as_printed():
    heights = np.array([-1000.0, -500.0, 0.0, 500.0, 8848.0])
    printed = 1013.25 * (1 - 0.0065 * heights / 288.15) ** 5.2559
    np.testing.assert_allclose(standard_pressure(heights) / 100.0, printed, rtol=1e-14)


def test_admittance_of_iag_1983():
    normal = standard_pressure(500.0)
    effect = pressure_effect(normal + np.array([0.0, 100.0, -1000.0]), barometer_height=500.0)
    np.testing.assert_allclose(effect / MICROGAL, [0.0, -0.3, 3.0], rtol=0, atol=1e-9)


def test_worked_example_of_1000_hectopascal_at_500_metres():
    """By hand: p0 = 954.6081 hPa, so 45.3919 hPa too much, -13.6176 uGal on gravity."""
    assert pressure_effect(1e5, barometer_height=500.0) / MICROGAL == pytest.approx(-13.6176, abs=1e-4)
