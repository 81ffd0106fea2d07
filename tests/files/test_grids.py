"""Map coordinates against positions that follow from the definition of the projection."""

import math

import pytest

from plumbwell.files.grids import apart, geodetic_position


def test_the_central_meridian_of_a_zone_is_at_its_false_easting():
    """UTM: the central meridian (3 deg W in zone 30) has the easting 500 000 m, the equator the northing 0."""
    latitude, longitude = geodetic_position("EPSG:32630", easting=500_000.0, northing=0.0)
    assert math.degrees(latitude) == pytest.approx(0.0, abs=1e-9)
    assert math.degrees(longitude) == pytest.approx(-3.0, abs=1e-9)


def test_a_minute_of_latitude_is_a_nautical_mile_at_middle_latitudes():
    """1 852 m by definition of the mile is near the mean minute of arc; at 45 deg the ellipsoid's is 1 852.2 m."""
    here = {"latitude": math.radians(45.0 - 1 / 120), "longitude": 0.2}
    distance = apart(**here, other_latitude=here["latitude"] + math.radians(1 / 60), other_longitude=0.2)
    assert distance == pytest.approx(1852.2, abs=0.1)


@pytest.mark.parametrize(
    ("system", "easting"), [("EPSG:1", 5e5), ("somewhere", 5e5), ("EPSG:32630", 1e12)]
)
def test_an_unknown_system_and_a_place_outside_it_are_refused(system, easting):
    with pytest.raises(ValueError):
        geodetic_position(system, easting=easting, northing=6e6)
