"""Positions of sensors: ends of the path, surveyed places, latitude and longitude, descent of each cell."""

import numpy as np
import pytest

from plumbwell.reduction.positions import positions, well_path
from plumbwell.survey.column import constant_column
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.places import Path
from plumbwell.survey.site import Site

SITE = Site(
    name="Made up",
    latitude=np.radians(54.0),
    longitude=np.radians(-3.0),
    ground_elevation=180.0,
    collar_elevation=150.0,
    depth_datum_height=5.0,
    geoid_height=50.0,
)


def path_of(*points, correction=0.0):
    depth, inclination, azimuth = np.array(points, dtype=float).T
    return well_path(
        Path(
            depth=constant_column("depth", "m", depth),
            inclination=constant_column("inclination", "rad", np.radians(inclination)),
            azimuth=constant_column("azimuth", "rad", np.radians(azimuth)),
        ),
        north_correction=correction,
    )


def placed(path, depth, *, east=None, north=None, elevation=None, site=SITE):
    def column(key, values):
        return constant_column(key, "m", np.full(len(depth), np.nan) if values is None else values)

    return positions(
        sensor_depth=constant_column("sensor_depth", "m", depth),
        east=column("east", east),
        north=column("north", north),
        elevation=column("elevation", elevation),
        path=path,
        site=site,
    )


def test_without_a_path_the_hole_is_vertical_and_never_extrapolated():
    found = placed(well_path(None, north_correction=0.0), [0.0, 1000.0, -3.0])
    assert found.tvd.values.tolist() == [0.0, 1000.0, -3.0]
    assert found.elevation.values.tolist() == [155.0, -845.0, 158.0]
    assert found.east.values.tolist() == found.north.values.tolist() == [0.0, 0.0, 0.0]
    assert found.cos_inclination.values.tolist() == [1.0, 1.0, 1.0]
    assert not found.extrapolated.any()


def test_vertical_above_the_first_point_and_straight_on_below_the_last():
    found = placed(path_of((100, 60, 90), (200, 60, 90)), [40.0, 100.0, 200.0, 200.05, 200.06, 300.0])
    assert found.tvd.values == pytest.approx([40.0, 100.0, 150.0, 150.025, 150.03, 200.0], abs=1e-9)
    assert found.east.values == pytest.approx(
        np.array([0, 0, 100, 100.05, 100.06, 200]) * np.sqrt(0.75), abs=1e-9
    )
    assert found.extrapolated.tolist() == [False, False, False, False, True, True]
    assert found.cos_inclination.values == pytest.approx([1.0, 0.5, 0.5, 0.5, 0.5, 0.5])


def test_a_path_of_one_point_is_straight_and_says_where_it_ends():
    found = placed(path_of((10, 90, 0)), [10.0, 110.0])
    assert found.north.values == pytest.approx([0.0, 100.0])
    assert found.extrapolated.tolist() == [False, True]


def test_azimuths_are_brought_to_true_north():
    path = path_of((0, 90, 80), (100, 90, 80), correction=np.radians(10.0))
    assert path.at(100.0)[1:3] == pytest.approx((100.0, 0.0), abs=1e-12)


def test_surveyed_places_keep_their_survey():
    found = placed(
        path_of((0, 30, 0), (100, 30, 0)),
        [np.nan, 100.0],
        east=[12.0, np.nan],
        north=[-7.0, np.nan],
        elevation=[55.0, np.nan],
    )
    assert found.tvd.values == pytest.approx([100.0, 100.0 * np.cos(np.radians(30.0))])
    assert found.elevation.values == pytest.approx([55.0, 155.0 - found.tvd.values[1]])
    assert (found.east.values[0], found.north.values[0]) == (12.0, -7.0)
    assert found.cos_inclination.values[0] == 1.0
    assert not found.extrapolated.any()


def test_a_place_on_the_path_without_depth_is_nowhere():
    found = placed(path_of((0, 30, 0), (100, 30, 0)), [np.nan])
    assert np.isnan([found.tvd.values[0], found.elevation.values[0], found.latitude.values[0]]).all()


def test_latitude_and_longitude_reach_the_geocentric_position_of_the_offset():
    # Independent route: rectangular coordinates of the collar, moved east and north in its tangent plane.
    east, north = 300.0, 400.0
    found = placed(
        well_path(None, north_correction=0.0),
        [np.nan],
        east=[east],
        north=[north],
        elevation=[SITE.collar_elevation],
    )
    height = SITE.collar_elevation + SITE.geoid_height

    def rectangular(latitude, longitude):
        across = 6378137.0 / np.sqrt(1.0 - 0.00669437999014 * np.sin(latitude) ** 2)
        level = (across + height) * np.cos(latitude)
        polar = (across * (1.0 - 0.00669437999014) + height) * np.sin(latitude)
        return np.array([level * np.cos(longitude), level * np.sin(longitude), polar])

    p, q = SITE.latitude, SITE.longitude
    to_east = np.array([-np.sin(q), np.cos(q), 0.0])
    to_north = np.array([-np.sin(p) * np.cos(q), -np.sin(p) * np.sin(q), np.cos(p)])
    moved = rectangular(p, q) + east * to_east + north * to_north
    apart = rectangular(found.latitude.values[0], found.longitude.values[0]) - moved
    # The sphere falls away under the plane by d2/2R = 2 cm; sideways nothing but its third order is left.
    assert abs(apart @ to_east) < 0.03 and abs(apart @ to_north) < 0.03


def test_a_path_that_turns_back_on_itself_is_refused_with_its_place():
    with pytest.raises(SurveyError, match="turns back on itself between 100 and 130 m of depth"):
        path_of((0, 0, 0), (100, 0, 0), (130, 180, 0))


def test_each_cell_is_worked_out_anew_from_its_inputs():
    found = placed(
        path_of((0, 1, 350), (500, 20, 10), (900, 70, 40)),
        [3.0, 250.0, np.nan, 850.0, 1000.0],
        east=[np.nan, np.nan, 5.0, np.nan, np.nan],
        north=[np.nan, np.nan, 6.0, np.nan, np.nan],
        elevation=[np.nan, np.nan, 7.0, np.nan, np.nan],
    )
    for name in ("tvd", "elevation", "east", "north", "latitude", "longitude", "cos_inclination"):
        column = getattr(found, name)
        worked = [column.worked(row) for row in range(5)]
        assert worked == pytest.approx(column.values.tolist(), rel=1e-12), name
