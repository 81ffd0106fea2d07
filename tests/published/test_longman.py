"""The short tide formulas against the direct pull of Moon and Sun.

Longman 1959, Formulas for computing the tidal accelerations due to the Moon and the Sun, J. Geophys. Res.
64(12), 2351-2355. No printed sample was at hand; the series are low in order, and the direct route of `tide`,
itself held to DE421, shows how far they reach.
"""

import erfa
import numpy as np
import pytest

from plumbwell.earth.constants import MICROGAL
from plumbwell.earth.longman import longman_tide, mean_longitudes
from plumbwell.earth.tide import rigid_tide


@pytest.mark.parametrize("year", [1900, 1930, 1960, 1990])
def test_mean_longitudes_are_those_of_newcomb_and_brown(year):
    """Against the arguments of the IERS Conventions 2003; the Moon has since run ahead by up to 50 arcsec."""
    seconds = float((np.datetime64(f"{year}-01-01", "s") - np.datetime64("2000-01-01", "s")).astype(float))
    t = (seconds / 86400.0 - 0.5) / 36525.0
    moon = erfa.faf03(t) + erfa.faom03(t)
    sun = moon - erfa.fad03(t)
    expected = [moon, moon - erfa.fal03(t), sun, erfa.faom03(t), sun - erfa.falp03(t)]
    off = np.degrees(np.array(mean_longitudes(seconds)) - expected) * 3600.0
    off = (off + 648000.0) % 1296000.0 - 648000.0
    assert (np.abs(off) < [52.0, 12.0, 2.5, 8.0, 12.0]).all()


def test_within_4_microgal_and_0_8_rms_of_the_direct_route_anywhere_from_1980_to_2029():
    chance = np.random.default_rng(1959)
    times = chance.uniform(-20 * 365.25 * 86400, 30 * 365.25 * 86400, 3000)
    place = {
        "latitude": np.arcsin(chance.uniform(-1, 1, 3000)),
        "longitude": chance.uniform(-np.pi, np.pi, 3000),
        "height": chance.uniform(-3000.0, 3000.0, 3000),
    }
    off = (longman_tide(times, **place) - rigid_tide(times, **place)) / MICROGAL
    assert np.abs(off).max() < 4.0
    assert np.sqrt(np.mean(off**2)) < 0.8
    assert abs(off.mean()) < 0.15


def test_east_is_positive_and_the_day_turns_west():
    """A place 15 degrees further west has, an hour later, nearly the same tide."""
    times = np.arange(0.0, 3 * 86400.0, 1800.0)
    here = longman_tide(times, latitude=0.5, longitude=0.0, height=0.0)
    west = longman_tide(times + 3600.0, latitude=0.5, longitude=-np.radians(15.0), height=0.0)
    east = longman_tide(times + 3600.0, latitude=0.5, longitude=np.radians(15.0), height=0.0)
    assert np.abs(west - here).max() < 6 * MICROGAL
    assert np.abs(east - here).max() > 30 * MICROGAL
