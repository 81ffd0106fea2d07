"""Positions of Moon and Sun against worked examples.

Meeus 1998, Astronomical Algorithms, 2nd edition: example 47.a (Moon, 1992 April 12, 0h TD: longitude
133.162655, latitude -3.229126 degrees, 368 409.7 km) and examples 25.a and 25.b (Sun, 1992 October 13, 0h TD:
apparent longitude 199.906060 degrees, distance 0.99766 AU; declination -7.783871 degrees).
The printed places are of the mean or apparent equinox of date; the positions here are turned back to it.
"""

import erfa
import numpy as np
import pytest

from plumbwell.earth.moon_sun import ASTRONOMICAL_UNIT, moon_and_sun, terrestrial_less_utc


def seconds(time):
    """Seconds since 2000 without leap seconds."""
    return float((np.datetime64(time, "s") - np.datetime64("2000-01-01", "s")).astype(float))


def utc_of_terrestrial(time):
    """UTC seconds of a moment given in terrestrial time (dynamical time of the examples)."""
    guess = seconds(time) - 60.0
    return seconds(time) - float(terrestrial_less_utc(guess))


def true_equator(vector, utc, terrestrial_days):
    """From the Earth-fixed frame to true equator and equinox of date, by sidereal time."""
    sidereal = erfa.gst06a(2451544.5, utc / 86400.0, 2451544.5, terrestrial_days)
    return erfa.rxp(erfa.rz(-sidereal, np.eye(3)), vector)


def spherical(vector):
    """Longitude and latitude in degrees, and length."""
    longitude, latitude, length = erfa.p2s(vector)
    return np.degrees(longitude) % 360.0, np.degrees(latitude), length


@pytest.mark.parametrize("full", [False, True])
def test_meeus_example_47a_moon(full):
    utc = utc_of_terrestrial("1992-04-12T00:00:00")
    days = seconds("1992-04-12T00:00:00") / 86400.0
    moon, _ = moon_and_sun(utc, full=full)
    nutation, oblique = erfa.nut06a(2451544.5, days)
    obliquity = erfa.obl06(2451544.5, days)
    ecliptic = erfa.rxp(erfa.rx(obliquity + oblique, np.eye(3)), true_equator(moon, utc, days))
    longitude, latitude, distance = spherical(ecliptic)
    # 133.162655 is of the mean equinox; the apparent longitude of the example is 133.167265.
    assert longitude == pytest.approx(133.167265, abs=0.003)
    assert longitude - np.degrees(nutation) == pytest.approx(133.162655, abs=0.003)
    assert latitude == pytest.approx(-3.229126, abs=0.003)
    assert distance / 1000.0 == pytest.approx(368409.7, abs=20.0)


@pytest.mark.parametrize(("full", "within"), [(False, 0.003), (True, 0.0003)])
def test_meeus_examples_25a_and_25b_sun(full, within):
    """Apparent places hold 20.5 arcsec of aberration, which geometric positions do not."""
    utc = utc_of_terrestrial("1992-10-13T00:00:00")
    days = seconds("1992-10-13T00:00:00") / 86400.0
    _, sun = moon_and_sun(utc, full=full)
    _, oblique = erfa.nut06a(2451544.5, days)
    obliquity = erfa.obl06(2451544.5, days)
    ecliptic = erfa.rxp(erfa.rx(obliquity + oblique, np.eye(3)), true_equator(sun, utc, days))
    longitude, _, distance = spherical(ecliptic)
    aberration = 20.4898 / 3600.0 / (distance / ASTRONOMICAL_UNIT)
    assert longitude - aberration == pytest.approx(199.906060, abs=within)
    # Three digits more than the low precision 0.99766 of example 25.a are those of example 25.b.
    assert distance / ASTRONOMICAL_UNIT == pytest.approx(0.99766, abs=6e-5)
    assert distance / ASTRONOMICAL_UNIT == pytest.approx(0.99760775, abs=1e-5)
    declination = spherical(true_equator(sun, utc, days))[1]
    assert declination == pytest.approx(-7.783871, abs=0.0025 + within)


def test_leap_seconds_of_the_iers_bulletins():
    """TAI - UTC of Bulletin C: 32 s from 1999, 33 s from 2006, 35 s from July 2012, 37 s from 2017."""
    times = [
        "2005-12-31T23:59:59",
        "2006-01-01T00:00:00",
        "2012-07-01T00:00:00",
        "2016-12-31T23:59:59",
        "2017-01-01T00:00:00",
    ]
    values = terrestrial_less_utc(np.array([seconds(t) for t in times])) - 32.184
    np.testing.assert_allclose(values, [32, 33, 35, 36, 37], rtol=0, atol=1e-9)


def test_moon_and_sun_stand_together_in_a_total_eclipse():
    """Greatest eclipse of 2017 August 21, 18:25:31 UT, near 36.97 N 87.67 W (from memory of the
    almanacs)."""
    moon, sun = moon_and_sun(seconds("2017-08-21T18:25:31"))
    latitude, longitude = np.radians([36.97, -87.67])
    place = 6.37e6 * np.array(
        [np.cos(latitude) * np.cos(longitude), np.cos(latitude) * np.sin(longitude), np.sin(latitude)]
    )
    apart = np.degrees(erfa.sepp(moon - place, sun - place))
    assert apart < 0.02
