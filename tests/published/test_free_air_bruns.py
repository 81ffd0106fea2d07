"""The change of normal gravity with height against its printed forms.

Hinze et al. 2005, Geophysics 70(4), J25-J32: second-order height correction with the constants of GRS80,
-(0.3087691 - 0.0004398 sin2) h + 7.2125e-8 h2 mGal.
Bruns' formula F = 2 g J + 2 omega2 (Heiskanen & Moritz 1967, eq. 2-20) against the slope of the closed
formula.
"""

import numpy as np
import pytest

from plumbwell.earth.constants import MICROGAL, MILLIGAL
from plumbwell.earth.ellipsoid import GRS80
from plumbwell.earth.free_air import bruns_gradient
from plumbwell.earth.normal_gravity import (
    SYSTEMS,
    gradient_at_height,
    gravity_at_height,
    gravity_on_ellipsoid,
    height_change,
)

LATITUDES = np.radians([-90.0, -45.0, 0.0, 15.0, 45.0, 60.0, 90.0])


def test_printed_coefficients_of_hinze_2005_follow_from_grs80():
    a, f, m = GRS80.semi_major, GRS80.flattening, GRS80.m
    scale = 2 * GRS80.gamma_e / a / MILLIGAL
    assert abs(scale * (1 + f + m) - 0.3087691) <= 5e-8
    assert abs(scale * (3 * f - 2.5 * m) - 0.0004398) <= 5e-8
    assert abs(3 * GRS80.gamma_e / a**2 / MILLIGAL - 7.2125e-8) <= 5e-13


@pytest.mark.parametrize("height", [-3000.0, -500.0, 1000.0, 5000.0])
def test_series_at_the_equator_is_hinze_2005(height):
    printed = -0.3087691 * height + 7.2125e-8 * height**2
    value = height_change("GRS80", latitude=0.0, height=height, form="series") / MILLIGAL
    assert abs(value - printed) <= 5e-8 * abs(height) + 5e-13 * height**2


def test_series_away_from_the_equator_keeps_to_hinze_2005_within_its_neglected_terms():
    """Hinze's form takes gravity at the equator in the second order: 1.1e-5 mGal/m at most."""
    sin2 = np.sin(LATITUDES) ** 2
    printed = -(0.3087691 - 0.0004398 * sin2) * 1000.0 + 7.2125e-8 * 1e6
    value = height_change("GRS80", latitude=LATITUDES, height=1000.0, form="series") / MILLIGAL
    assert np.abs(value - printed).max() < 1.1e-2


def test_series_departs_from_the_closed_form_by_11_microgal_a_kilometre_at_the_equator():
    off = gravity_at_height("GRS80", latitude=0.0, height=-1000.0, form="series") - gravity_at_height(
        "GRS80", latitude=0.0, height=-1000.0
    )
    assert off / MICROGAL == pytest.approx(-11.24, abs=0.01)


@pytest.mark.parametrize("system", ["WGS84", "GRS80", "GRS67"])
def test_bruns_equals_the_slope_of_the_closed_form_on_the_ellipsoid(system):
    gravity = gravity_on_ellipsoid(system, latitude=LATITUDES)
    bruns = bruns_gradient(system, latitude=LATITUDES, gravity=gravity)
    slope = gradient_at_height(system, latitude=LATITUDES, height=0.0)
    np.testing.assert_allclose(bruns, slope, rtol=1e-11)


@pytest.mark.parametrize("height", [-5000.0, -1000.0, 3000.0])
def test_bruns_off_the_ellipsoid_keeps_to_the_slope_of_the_closed_form(height):
    gravity = gravity_at_height("WGS84", latitude=LATITUDES, height=height)
    bruns = bruns_gradient("WGS84", latitude=LATITUDES, gravity=gravity, height=height)
    slope = gradient_at_height("WGS84", latitude=LATITUDES, height=height)
    np.testing.assert_allclose(bruns, slope, rtol=1.2e-5)


def test_bruns_with_the_1930_formula_keeps_to_its_rounded_constants():
    gravity = gravity_on_ellipsoid("1930", latitude=LATITUDES)
    bruns = bruns_gradient("1930", latitude=LATITUDES, gravity=gravity)
    np.testing.assert_allclose(bruns, gradient_at_height("1930", latitude=LATITUDES, height=0.0), rtol=2e-8)


@pytest.mark.parametrize(
    ("degrees", "milligal_per_metre"), [(0.0, 0.3087798), (45.0, 0.3085598), (90.0, 0.3083388)]
)
def test_wgs84_free_air_gradient_by_hand(degrees, milligal_per_metre):
    """2 gamma J + 2 omega2 worked out by hand with the printed constants of WGS84."""
    sin2 = np.sin(np.radians(degrees)) ** 2
    w2 = 1 - 0.00669437999014 * sin2
    gamma = 9.7803253359 * (1 + 0.00193185265241 * sin2) / w2**0.5
    curvature = 0.5 * (w2**1.5 / (1 - 0.00669437999014) + w2**0.5) / 6378137.0
    by_hand = (2 * gamma * curvature + 2 * 7.292115e-5**2) / MILLIGAL
    assert abs(by_hand - milligal_per_metre) <= 5e-8
    value = gradient_at_height("WGS84", latitude=np.radians(degrees), height=0.0) / MILLIGAL
    assert value == pytest.approx(by_hand, rel=1e-11)


def test_every_system_has_both_forms():
    for system in SYSTEMS:
        for form in ("closed", "series"):
            change = height_change(system, latitude=0.9, height=-100.0, form=form)
            assert 0.03085 * 1e-2 < change < 0.0309 * 1e-2
