"""What normal gravity and the ellipsoids promise: shapes, limits, errors."""

import numpy as np
import pytest

from plumbwell.earth.constants import MICROGAL
from plumbwell.earth.ellipsoid import GRS80, WGS84, Ellipsoid, mean_curvature, principal_radii
from plumbwell.earth.normal_gravity import (
    FORMS,
    SYSTEMS,
    gradient_at_height,
    gravity_at_height,
    gravity_on_ellipsoid,
    height_change,
    normal_system,
)

LATITUDES = np.radians([-90.0, -30.0, 0.0, 45.0, 90.0])


@pytest.mark.parametrize("system", SYSTEMS)
@pytest.mark.parametrize("form", FORMS)
def test_height_zero_is_the_ellipsoid(system, form):
    at_zero = gravity_at_height(system, latitude=LATITUDES, height=np.zeros(5), form=form)
    on_ellipsoid = gravity_on_ellipsoid(system, latitude=LATITUDES)
    np.testing.assert_allclose(at_zero, on_ellipsoid, rtol=0, atol=1e-3 * MICROGAL)


@pytest.mark.parametrize("system", SYSTEMS)
@pytest.mark.parametrize("form", FORMS)
def test_height_change_is_what_is_missing_to_the_ellipsoid(system, form):
    heights = np.array([-3000.0, -10.0, 0.0, 10.0, 4000.0])
    change = height_change(system, latitude=LATITUDES, height=heights, form=form)
    whole = gravity_at_height(system, latitude=LATITUDES, height=heights, form=form)
    np.testing.assert_array_equal(change, whole - gravity_on_ellipsoid(system, latitude=LATITUDES))
    assert change[0] > 0 > change[-1]


@pytest.mark.parametrize("system", SYSTEMS)
@pytest.mark.parametrize("form", FORMS)
def test_gradient_is_the_slope_of_gravity_at_height(system, form):
    heights = np.array([-4000.0, -100.0, 0.0, 100.0, 4000.0])
    above = gravity_at_height(system, latitude=LATITUDES, height=heights + 50.0, form=form)
    below = gravity_at_height(system, latitude=LATITUDES, height=heights - 50.0, form=form)
    gradient = gradient_at_height(system, latitude=LATITUDES, height=heights, form=form)
    np.testing.assert_allclose(gradient, (below - above) / 100.0, rtol=1e-9)


def test_both_hemispheres_are_alike_and_poles_are_finite():
    north = gravity_at_height("WGS84", latitude=LATITUDES, height=-500.0)
    south = gravity_at_height("WGS84", latitude=-LATITUDES, height=-500.0)
    np.testing.assert_array_equal(north, south)
    assert np.isfinite(gradient_at_height("WGS84", latitude=LATITUDES, height=-500.0)).all()


def test_scalars_and_arrays_give_the_same_numbers():
    heights = np.array([-100.0, 0.0, 250.0])
    together = gravity_at_height("GRS67", latitude=0.8, height=heights)
    assert together.shape == (3,)
    one_by_one = [float(gravity_at_height("GRS67", latitude=0.8, height=float(h))) for h in heights]
    np.testing.assert_allclose(together, one_by_one, rtol=1e-15)


def test_gravity_falls_northward_gradient_rises_with_latitude():
    latitudes = np.radians(np.linspace(0, 90, 10))
    assert (np.diff(gravity_on_ellipsoid("WGS84", latitude=latitudes)) > 0).all()
    assert (np.diff(gradient_at_height("WGS84", latitude=latitudes, height=0.0)) < 0).all()


def test_northward_gradient_at_45_degrees_is_0_8145_milligal_a_kilometre():
    along, _ = principal_radii(np.radians(45.0), WGS84)
    step = 500.0 / along
    north, south = (gravity_on_ellipsoid("WGS84", latitude=np.radians(45.0) + s) for s in (step, -step))
    assert (north - south) / 1e-5 == pytest.approx(0.81445233, abs=1e-7)


def test_unknown_system_is_named_with_the_known_ones():
    with pytest.raises(ValueError) as refused:
        gravity_on_ellipsoid("WGS72", latitude=0.0)
    assert str(refused.value) == (
        "unknown normal gravity system 'WGS72'; known are WGS84, GRS80, GRS67, 1930"
    )


@pytest.mark.parametrize("function", [gravity_at_height, gradient_at_height, height_change])
def test_unknown_form_is_named_with_the_known_ones(function):
    with pytest.raises(ValueError) as refused:
        function("WGS84", latitude=0.0, height=0.0, form="cubic")
    assert str(refused.value) == "unknown height form 'cubic'; known are closed, series"


def test_every_system_names_its_source():
    for name in SYSTEMS:
        assert normal_system(name).name == name
        assert normal_system(name).source


def test_radii_of_curvature_meet_at_the_poles_and_differ_at_the_equator():
    along, across = principal_radii(LATITUDES, GRS80)
    a, b = GRS80.semi_major, GRS80.semi_minor
    assert along[0] == pytest.approx(a * a / b, rel=1e-13)
    assert across[0] == pytest.approx(a * a / b, rel=1e-13)
    assert along[2] == pytest.approx(b * b / a, rel=1e-13)
    assert across[2] == a
    np.testing.assert_allclose(mean_curvature(LATITUDES, GRS80), (1 / along + 1 / across) / 2, rtol=1e-15)


def test_a_figure_that_is_no_earth_is_refused():
    with pytest.raises(ValueError) as refused:
        Ellipsoid("ball", 6371000.0, 0.0, 3.986e14, 7.29e-5)
    assert str(refused.value) == "not the figure of the Earth: a = 6371000.0, f = 0.0, GM = 398600000000000.0"
