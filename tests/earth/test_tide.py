"""What the tide, its correction and the positions behind it promise."""

import os
import subprocess
import sys

import numpy as np
import pytest

from plumbwell.earth import tide
from plumbwell.earth.constants import MICROGAL
from plumbwell.earth.ellipsoid import WGS84
from plumbwell.earth.longman import longman_tide
from plumbwell.earth.moon_sun import moon_and_sun, terrestrial_less_utc
from plumbwell.earth.tide import permanent_part, rigid_tide, station_vectors, tide_correction

PLACE = {"latitude": 0.85, "longitude": 0.2, "height": 300.0}
START = 7.6e8


@pytest.mark.parametrize("latitude", [-np.pi / 2, -0.9, 0.0, 0.4, np.pi / 2])
def test_interpolated_tide_is_the_direct_one(latitude):
    times = START + np.random.default_rng(5).uniform(0, 400 * 86400.0, 500)
    place = {**PLACE, "latitude": latitude}
    off = tide_correction(times, factor=1.0, **place) - rigid_tide(times, **place)
    assert np.abs(off).max() < 1e-3 * MICROGAL


def test_correction_is_the_factor_times_the_upward_tide():
    times = START + np.arange(0.0, 7200.0, 77.0)
    one = tide_correction(times, factor=1.0, **PLACE)
    np.testing.assert_allclose(tide_correction(times, factor=1.2, **PLACE), 1.2 * one, rtol=1e-14)
    np.testing.assert_allclose(tide_correction(times, **PLACE), 1.16 * one, rtol=1e-14)


def test_a_readings_tide_does_not_depend_on_the_others_nor_on_their_order():
    times = START + np.array([50000.0, 0.0, 3e6, 600.0, 50000.0])
    together = tide_correction(times, **PLACE)
    alone = [tide_correction(np.array([t]), **PLACE)[0] for t in times]
    np.testing.assert_array_equal(together, alone)
    np.testing.assert_array_equal(tide_correction(times[::-1], **PLACE), together[::-1])


def test_on_a_knot_the_direct_value_stands():
    times = (np.floor(START / tide.KNOT_SPACING) + np.arange(3)) * tide.KNOT_SPACING
    np.testing.assert_allclose(
        tide_correction(times, factor=1.0, **PLACE), rigid_tide(times, **PLACE), rtol=1e-12
    )


def test_gaps_cost_no_knots(monkeypatch):
    asked = []

    def counted(utc_seconds, **place):
        asked.append(np.size(utc_seconds))
        return rigid_tide(utc_seconds, **place)

    monkeypatch.setattr(tide, "rigid_tide", counted)
    tide_correction(START + np.array([0.0, 1.0, 40 * 86400.0]), **PLACE)
    assert asked == [12]


def test_no_readings_no_tide():
    assert tide_correction(np.array([]), **PLACE).shape == (0,)


@pytest.mark.parametrize("wrong", [np.nan, np.inf])
def test_a_time_that_is_no_number_is_refused(wrong):
    times = np.array([START, wrong])
    with pytest.raises(ValueError) as refused:
        tide_correction(times, **PLACE)
    assert str(refused.value) == "times of readings must be numbers"
    with pytest.raises(ValueError) as refused:
        moon_and_sun(times)
    assert str(refused.value) == ("times must be numbers within the years 1000 to 2999 to place Moon and Sun")


@pytest.mark.parametrize("full", [False, True])
def test_no_year_within_the_span_warns_and_none_outside_it_is_taken(full):
    """A year that the library calls dubious, before 1960 or far ahead, is no stray warning."""
    first, last = (1900, 2099) if full else (1000, 2999)
    inside = (
        np.array([f"{first}-01-01", "1931-06-01", "2060-01-01", f"{last}-12-31"], "datetime64[s]")
    ).astype(float)
    inside -= np.datetime64("2000-01-01", "s").astype(float)
    moon, sun = moon_and_sun(inside, full=full)
    assert moon.shape == sun.shape == (4, 3)
    for outside in (inside[0] - 400 * 86400.0, inside[-1] + 400 * 86400.0):
        with pytest.raises(ValueError, match=f"within the years {first} to {last}"):
            moon_and_sun(outside, full=full)


def test_short_and_full_route_agree_within_0_005_microgal():
    times = START + np.random.default_rng(7).uniform(-20 * 3e7, 3e7, 300)
    off = rigid_tide(times, **PLACE) - rigid_tide(times, full=True, **PLACE)
    assert np.abs(off).max() < 0.005 * MICROGAL


def test_distances_of_moon_and_sun_are_right():
    times = START + np.arange(400) * 86400.0
    moon, sun = (np.linalg.norm(body, axis=1) for body in moon_and_sun(times))
    assert 3.55e8 < moon.min() < 3.71e8 and 4.03e8 < moon.max() < 4.08e8
    assert 1.470e11 < sun.min() < 1.473e11 and 1.519e11 < sun.max() < 1.523e11


def test_sun_stands_over_greenwich_at_noon():
    noon = (np.datetime64("2024-04-15T12:00:00", "s") - np.datetime64("2000-01-01", "s")).astype(float)
    _, sun = moon_and_sun(noon)
    assert sun.shape == (3,)
    assert abs(np.degrees(np.arctan2(sun[1], sun[0]))) < 0.2
    assert np.degrees(np.arcsin(sun[2] / np.linalg.norm(sun))) == pytest.approx(9.8, abs=0.3)


def test_terrestrial_time_steps_up_and_stays_outside_the_table():
    values = terrestrial_less_utc(np.array([-1e10, 0.0, START, 5e9]))
    assert (np.diff(values) >= 0).all()
    assert values[1] == pytest.approx(64.184)
    assert values[3] == values[2] == pytest.approx(69.184)


def test_positions_of_stations_on_the_axes():
    position, normal = station_vectors(
        latitude=np.array([0.0, 0.0, np.pi / 2]),
        longitude=np.array([0.0, np.pi / 2, 0.0]),
        height=np.array([0.0, 100.0, -50.0]),
    )
    a, b = WGS84.semi_major, WGS84.semi_minor
    np.testing.assert_allclose(position, [[a, 0, 0], [0, a + 100, 0], [0, 0, b - 50]], rtol=0, atol=1e-8)
    np.testing.assert_allclose(normal, np.eye(3)[[0, 1, 2]], rtol=0, atol=1e-15)


def test_many_places_at_once_are_each_place_alone():
    times = START + np.array([0.0, 9000.0, 20000.0])
    latitudes, longitudes, heights = (
        np.array([0.1, -0.5, 1.2]),
        np.array([0, 2, -2.0]),
        np.array([0, 9e2, -4e2]),
    )
    for function in (rigid_tide, longman_tide):
        together = function(times, latitude=latitudes, longitude=longitudes, height=heights)
        alone = [
            function(times[i : i + 1], latitude=latitudes[i], longitude=longitudes[i], height=heights[i])[0]
            for i in range(3)
        ]
        np.testing.assert_allclose(together, alone, rtol=1e-12, atol=1e-16)


def test_tide_grows_with_distance_from_the_centre():
    times = START + np.arange(0.0, 86400.0, 3600.0)
    low = rigid_tide(times, latitude=0.3, longitude=0.0, height=0.0)
    high = rigid_tide(times, latitude=0.3, longitude=0.0, height=6378.0)
    np.testing.assert_allclose(high, low * 1.001, rtol=0, atol=0.02 * MICROGAL)


def test_permanent_part_lifts_at_the_equator_and_presses_at_the_poles():
    part = permanent_part(np.radians([0.0, 90.0, -90.0])) / MICROGAL
    assert part[0] == pytest.approx(30.49, abs=0.01)
    assert part[1] == part[2] == pytest.approx(-60.77, abs=0.01)


def test_loading_the_room_loads_neither_astronomy_nor_scipy():
    code = (
        "import sys; from plumbwell.earth import (atmosphere, constants, earth_model, ellipsoid, free_air,"
        " longman, moon_sun, normal_gravity, shells, tide);"
        " print([name for name in ('erfa', 'scipy') if name in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
    )
    assert done.stdout.strip() == "[]"
