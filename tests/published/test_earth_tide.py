"""The tide of the rigid Earth against a route that shares nothing with it but physics.

Moon and Sun of the ephemeris DE421 (Folkner, Williams & Boggs 2009, IPN Progress Report 42-178), turned to
the Earth-fixed frame by a general astronomy library with its own sidereal time, UT1 and nutation; the
difference of third-body pulls is worked out here along the ellipsoid normal.
The table of nine values was computed with ERFA (moon98, epv00, IAU 2006/2000A), not published.
"""

from importlib.util import find_spec
from pathlib import Path

import numpy as np
import pytest

from plumbwell.earth.constants import MICROGAL
from plumbwell.earth.tide import permanent_part, rigid_tide, tide_correction

GM = {"moon": 4.902800118e12, "sun": 1.32712440041279e20}
PLACES = {"equator": (0.0, 0.0, 0.0), "west": (40.0, -105.0, 1600.0), "south": (-30.75, 121.5, -400.0)}
TIMES = ["2000-01-01T12:00", "2015-09-28T03:00", "2024-06-15T00:00"]


def seconds(times):
    """Seconds since 2000 without leap seconds."""
    return (np.array(times, dtype="datetime64[s]") - np.datetime64("2000-01-01", "s")).astype(float)


def at(place):
    """Arguments of the tide functions."""
    latitude, longitude, height = PLACES[place]
    return {"latitude": np.radians(latitude), "longitude": np.radians(longitude), "height": height}


@pytest.fixture(scope="module")
def de421_up():
    """Upward tidal acceleration, m s-2, at a place and times, from DE421."""
    from skyfield.api import load, load_file
    from skyfield.framelib import itrs

    kernel = load_file(str(Path(find_spec("skyfield_data").origin).parent / "data" / "de421.bsp"))
    scale = load.timescale(builtin=True)

    def up(times, place):
        moments = np.array(times, dtype="datetime64[s]").astype(object)
        t = scale.utc(
            np.array([m.year for m in moments]),
            np.array([m.month for m in moments]),
            np.array([m.day for m in moments]),
            np.array([m.hour for m in moments]),
            np.array([m.minute for m in moments]),
        )
        latitude, longitude, height = PLACES[place]
        phi, lam = np.radians([latitude, longitude])
        normal = np.array([np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi)])
        f = 1 / 298.257223563
        e2 = f * (2 - f)
        across = 6378137.0 / np.sqrt(1 - e2 * np.sin(phi) ** 2)
        station = (across + height) * normal - np.array([0.0, 0.0, e2 * across * np.sin(phi)])
        total = 0.0
        for name, gm in GM.items():
            body = (kernel[name] - kernel["earth"]).at(t).frame_xyz(itrs).m.T
            apart = body - station
            pull = apart / np.linalg.norm(apart, axis=1)[:, None] ** 3
            centre = body / np.linalg.norm(body, axis=1)[:, None] ** 3
            total = total + gm * (pull - centre) @ normal
        return total

    yield up
    kernel.close()


@pytest.mark.parametrize("place", PLACES)
def test_three_places_at_three_epochs_within_0_02_microgal_of_de421(place, de421_up):
    value = rigid_tide(seconds(TIMES), **at(place))
    assert np.abs(value - de421_up(TIMES, place)).max() < 0.02 * MICROGAL


@pytest.mark.parametrize("place", PLACES)
def test_twenty_years_within_0_02_microgal_of_de421(place, de421_up):
    times = np.datetime64("2003-01-05T07:30", "s") + np.arange(150) * np.timedelta64(47 * 86400 + 17220, "s")
    value = rigid_tide(seconds(times), **at(place))
    assert np.abs(value - de421_up(times, place)).max() < 0.02 * MICROGAL


def test_correction_of_readings_within_0_02_microgal_of_de421(de421_up):
    times = np.datetime64("2021-03-20T06:00", "s") + np.arange(40) * np.timedelta64(13 * 60, "s")
    value = tide_correction(seconds(times), factor=1.0, **at("west"))
    assert np.abs(value - de421_up(times, "west")).max() < 0.02 * MICROGAL


COMPUTED = {
    "equator": [30.953, 35.554, -7.397],
    "west": [-37.662, -44.347, 10.785],
    "south": [9.469, 112.138, 20.925],
}


@pytest.mark.parametrize("place", PLACES)
def test_computed_values_of_the_full_rotation_and_long_theory(place):
    full = rigid_tide(seconds(TIMES), full=True, **at(place)) / MICROGAL
    fast = rigid_tide(seconds(TIMES), **at(place)) / MICROGAL
    np.testing.assert_allclose(full, COMPUTED[place], rtol=0, atol=6e-4)
    np.testing.assert_allclose(fast, COMPUTED[place], rtol=0, atol=4e-3)


def test_sign_a_new_moon_overhead_lifts():
    """Syzygy near the equator: at noon and midnight the tide is up, six hours between them it is down."""
    noon = seconds(["2015-03-20T12:00", "2015-03-20T18:00", "2015-03-21T00:00"])
    up = rigid_tide(noon, latitude=0.0, longitude=0.0, height=0.0) / MICROGAL
    assert up[0] > 100 and up[2] > 100 and up[1] < -40


def test_permanent_part_after_the_iag_formula_of_1983():
    """-30.49 + 90.95 sin2 phi + 0.31 sin4 phi uGal on gravity (Rapp 1983, from memory), recomputed."""
    latitudes = np.radians(np.linspace(-90, 90, 13))
    s = np.sin(latitudes) ** 2
    on_gravity = -permanent_part(latitudes) / MICROGAL
    np.testing.assert_allclose(on_gravity, -30.49 + 90.95 * s + 0.31 * s**2, rtol=0, atol=0.02)


@pytest.mark.parametrize("degrees", [0.0, 45.0, 90.0])
def test_permanent_part_is_the_mean_over_a_turn_of_the_node(degrees):
    """18.6 years at steps of 5 h 17 min; the mean obliquity and orbits leave 0.2 uGal."""
    times = np.arange(0.0, 18.6 * 365.25 * 86400.0, 19020.0)
    place = {"latitude": np.radians(degrees), "longitude": 0.3, "height": 0.0}
    mean = rigid_tide(times, **place).mean()
    assert abs(mean - permanent_part(place["latitude"])) < 0.2 * MICROGAL
