"""Which station a reading belongs to, and what brings it there: the rules one by one."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import Row, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run
from plumbwell.survey.site import Site

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
METER = Instrument(name="A")


def reduced(rows, **more):
    """Results of some rows with instrument A."""
    return reduce(made_case(rows, instruments=(METER,), **more))


def at(depth, time, station=None, **more):
    """A reading at a depth: gravity grows by 0.09 mGal/m, no noise."""
    return Row(time=time, reading=0.09 * MGAL * depth, depth=depth, station=station, **more)


def belonging(results):
    """Label of each row's station, None for rows that belong to none."""
    station = results.stations.located.placement.station
    return [results.stations.label[n] if n >= 0 else None for n in station]


def test_rows_of_one_label_are_one_place():
    results = reduced([at(0.0, 0.0, "top"), at(50.0, 900.0, "deep"), at(0.0, 1800.0, "top")])
    assert results.stations.label == ("top", "deep")
    assert belonging(results) == ["top", "deep", "top"]


def test_labelled_rows_found_their_stations_first():
    # The bare row comes first in time and lies within reach: it joins the labelled station all the same.
    results = reduced([at(10.1, 0.0), at(10.0, 900.0, "first"), at(60.0, 1800.0)])
    assert results.stations.label == ("first", "60.00")
    assert belonging(results) == ["first", "first", "60.00"]
    assert results.stations.located.mark_depth.values[0] == 10.0


def test_bare_rows_of_all_runs_found_in_time_order():
    # The second run was read first: its row founds the station, and the mark is its depth.
    first, second = ("2", 0.0), ("1", 9e4)
    rows = [at(30.2, second[1], run=second[0]), at(30.0, first[1], run=first[0])]
    results = reduced([*rows, *(at(80.0, start + 600.0, run=run) for run, start in (first, second))])
    assert results.stations.label == ("30.00", "80.00")


def test_a_bare_row_joins_the_nearest_station_and_the_upper_of_two_equal_ones():
    stations = [at(10.0, 0.0, "up"), at(10.4, 600.0, "low")]
    results = reduced([*stations, at(10.25, 1200.0), at(10.15, 1800.0), at(10.2, 2400.0)], min_thickness=0.1)
    assert belonging(results)[2:] == ["low", "up", "up"]


@pytest.mark.parametrize(("depth", "joins"), [(10.25, True), (10.2500001, False), (9.75, True), (9.74, False)])
def test_the_reach_is_same_place_and_no_more(depth, joins):
    results = reduced([at(10.0, 0.0, "A"), at(60.0, 600.0, "B"), at(depth, 1200.0)])
    assert (belonging(results)[2] == "A") == joins


def test_decimal_depths_are_compared_without_their_rounding():
    # 0.3 less 0.1 is a little less than 0.2, 0.7 less 0.5 a little more.
    for first, second in ((0.1, 0.3), (0.5, 0.7)):
        results = reduced([at(first, 0.0), at(second, 600.0), at(90.0, 1200.0)], same_place=0.2)
        assert len(results.stations) == 2


def test_a_founded_station_is_named_by_its_mark_with_two_decimals():
    results = reduced([at(10.0, 0.0, sensor_offset=0.5), at(55.126, 600.0, sensor_offset=0.5)])
    assert results.stations.label == ("10.00", "55.13")
    assert results.stations.located.mark_depth.values.tolist() == [10.0, 55.126]
    np.testing.assert_allclose(results.stations.located.sensor_depth.values, [9.5, 54.626], rtol=0, atol=1e-12)


def test_a_second_station_at_one_mark_gets_a_letter():
    # One mark, two sensor heights 1 m apart: two stations whose names would be the same.
    results = reduced(
        [at(40.0, 0.0), at(40.0, 600.0, sensor_offset=1.0), at(40.0, 1200.0, sensor_offset=2.0), at(80.0, 1800.0)]
    )
    assert sorted(results.stations.label) == ["40.00", "40.00b", "40.00c", "80.00"]


def test_the_name_of_a_station_is_never_that_of_a_label():
    results = reduced([at(10.004, 0.0), at(50.0, 600.0, "10.00")])
    assert belonging(results) == ["10.00b", "10.00"]


def test_rows_out_of_use_join_and_never_found():
    rows = [
        at(10.0, 0.0, "A"), at(10.1, 300.0, use=False), at(30.0, 600.0, use=False), at(60.0, 900.0),
        at(60.1, 1200.0, use=False), at(70.0, 1500.0, "C", use=False), at(10.0, 1800.0, "A", use=False),
    ]  # fmt: skip
    results = reduced(rows)
    assert results.stations.label == ("A", "60.00")
    assert belonging(results) == ["A", "A", None, "60.00", "60.00", None, "A"]


def test_the_earliest_used_row_founds():
    rows = [at(10.2, 0.0, "A", use=False), at(10.1, 600.0, "A"), at(10.0, 300.0, "A"), at(60.0, 900.0, "B")]
    results = reduced(rows)
    assert results.stations.located.mark_depth.values[0] == 10.0
    assert results.stations.located.placement.founder[0] == 2


def test_one_label_at_two_depths_is_two_stations():
    rows = [at(10.0, 0.0, "A"), at(10.3, 600.0, "A"), at(10.2, 1200.0, "A"), at(60.0, 1800.0, "B")]
    results = reduced(rows, min_thickness=0.1)
    assert belonging(results) == ["A", "Ab", "A", "B"]
    (second,) = results.stations.located.placement.second_places
    assert (second.label, second.second, second.depth, second.second_depth, second.row) == ("A", "Ab", 10.0, 10.3, 1)


def test_depth_shift_and_offset_make_the_sensor_depth():
    rows = [at(10.0, 0.0), at(50.0, 600.0, sensor_offset=0.4), at(10.0, 9e4, run="2"), at(50.0, 9.1e4, run="2")]
    results = reduced(rows, runs=(Run(name="2", depth_shift=1.5),))
    assert results.stations.label == ("10.00", "11.50", "50.00", "51.50")
    np.testing.assert_allclose(results.stations.located.sensor_depth.values, [10.0, 11.5, 49.6, 51.5], atol=1e-12)


def test_a_row_without_depth_stands_at_its_place():
    places = {"adit": {"depth": 33.0}, "portal": {"east": 4.0, "north": 3.0, "elevation": 95.0, "role": "base"}}
    rows = [
        replace(at(33.0, 0.0, "adit"), depth=np.nan), replace(at(5.0, 600.0, "portal"), depth=np.nan),
        at(80.0, 1200.0, "deep"),
    ]  # fmt: skip
    results = reduced(rows, places=places)
    where = results.stations.located
    by_name = dict(zip(results.stations.label, range(3), strict=True))
    assert where.mark_depth.values[by_name["adit"]] == 33.0
    assert np.isnan(where.mark_depth.values[by_name["portal"]])
    np.testing.assert_allclose(
        where.positions.elevation.values[[by_name[name] for name in ("portal", "adit", "deep")]], [95.0, 67.0, 20.0]
    )
    assert results.stations.role[by_name["portal"]] == "base"
    assert "portal" not in results.intervals.from_station + results.intervals.to_station
    assert results.stations.label == ("portal", "adit", "deep")


def test_a_tie_at_a_place_that_was_not_read_is_a_station_without_visits():
    places = {"pillar": {"elevation": 99.0, "east": 0.0, "north": 0.0, "role": "base"}}
    rows = [at(10.0, 0.0, "A"), at(60.0, 900.0, "B"), at(10.0, 1800.0, "A")]
    results = reduced(rows, places=places, ties={"pillar": (9.81, 5 * UGAL), "A": (9.81, 5 * UGAL)})
    assert results.stations.label == ("pillar", "A", "B")
    assert results.stations.visits.tolist() == [0, 2, 1]
    assert results.stations.gravity.values[0] == pytest.approx(9.81, abs=1e-13)
    assert results.stations.gravity_sd.values[0] == pytest.approx(5 * UGAL, rel=1e-9)


def test_rows_out_of_use_join_a_station_that_only_a_tie_names():
    places = {"pillar": {"elevation": 99.0, "east": 0.0, "north": 0.0, "role": "base"}, "adit": {"depth": 30.0}}
    rows = [
        at(10.0, 0.0, "A"), at(60.0, 900.0, "B"), at(10.0, 1800.0, "A"), at(30.1, 2400.0, "adit", use=False),
        at(np.nan, 3000.0, "pillar", use=False), at(35.0, 3600.0, "adit", use=False),
    ]  # fmt: skip
    results = reduced(rows, places=places, ties={"pillar": (9.81, 5 * UGAL), "adit": (9.81, 5 * UGAL)})
    assert belonging(results)[3:] == ["adit", "pillar", None]
    assert results.stations.visits.sum() == 3


def test_a_row_with_neither_depth_nor_place_belongs_nowhere():
    rows = [at(10.0, 0.0, "A"), at(60.0, 900.0, "B"), at(10.0, 1800.0, "A")]
    lost = [Row(time=2400.0, reading=0.0), Row(time=3000.0, reading=0.0, station="A")]
    assert belonging(reduced([*rows, *lost]))[3:] == [None, None]


def test_a_tie_at_an_unknown_place_counts_for_nothing():
    rows = [at(10.0, 0.0, "A"), at(60.0, 900.0, "B"), at(10.0, 1800.0, "A")]
    results = reduced(rows, ties={"nowhere": (9.81, 5 * UGAL)})
    assert results.stations.located.placement.unplaced_ties == ("nowhere",)
    assert not results.absolute


GRADIENTS = {"A": 0.0, "B": 0.09 * MGAL * 50, "C": 0.09 * MGAL * 50 + 0.07 * MGAL * 40}


def off_depth(extra):
    """Three stations without noise and some rows that lie a little off them, read at the station's gravity."""
    depth = {"A": 10.0, "B": 60.0, "C": 100.0}
    rows, time = [], 0.0
    for name in "ABCBA":
        rows.append(Row(time=time, reading=GRADIENTS[name], depth=depth[name], station=name))
        time += 1800.0
    for name, off in extra:
        rows.append(Row(time=time, reading=GRADIENTS[name], depth=depth[name] + off, station=name))
        time += 1800.0
    return rows


def test_rows_off_their_station_are_brought_to_it_once():
    extra = [("A", -0.2), ("A", 0.2), ("B", -0.2), ("B", 0.2), ("C", 0.2), ("C", -0.1)]
    rows = off_depth(extra)
    results = reduced(rows, drift_order=1)
    plain = reduced(off_depth([(name, 0.0) for name, _ in extra]), drift_order=1)
    np.testing.assert_array_equal(plain.readings.to_station.values, 0.0)
    # First-pass slopes: those of the network with no row moved.
    gravity = plain.stations.gravity.values
    upper, lower = (gravity[1] - gravity[0]) / 50.0, (gravity[2] - gravity[1]) / 40.0
    wanted = [0, 0, 0, 0, 0, 0.2 * upper, -0.2 * upper, 0.2 * upper, -0.2 * lower, -0.2 * lower, 0.1 * lower]
    np.testing.assert_allclose(results.readings.to_station.values, wanted, rtol=0, atol=1e-15)
    assert results.readings.to_station.values[8] != 0.0
    # The rows were read as if they stood at the station, so what is added stays as residual and visit effect.
    observed = results.readings.observed.values
    np.testing.assert_allclose(observed - [row.reading for row in rows], wanted, rtol=0, atol=1e-15)


def test_with_one_station_the_slope_is_free_air_less_rock():
    rows = [at(10.0, 0.0, "A"), at(10.2, 900.0, "A"), at(10.0, 1800.0, "A")]
    results = reduced(rows)
    slope = results.choice.gradient - 4 * np.pi * 6.6743e-11 * 2600.0
    assert results.readings.to_station.values[1] == pytest.approx(-0.2 * slope, rel=1e-9)
    above = Site(name="tower", latitude=0.9, longitude=0.0, ground_elevation=0.0, collar_elevation=100.0)
    results = reduced(rows, site=above)
    assert results.readings.to_station.values[1] == pytest.approx(-0.2 * results.choice.gradient, rel=1e-9)


def test_the_nearest_interval_gives_the_slope_where_parts_lie_apart_in_depth():
    # Two runs that share no station, their depths laced: A 10, C 100 in one, B 40, D 60 in the other.
    gravity = {"A": 0.0, "C": 9.0 * MGAL, "B": 0.0, "D": 1.2 * MGAL}
    depth = {"A": 10.0, "C": 100.0, "B": 40.0, "D": 60.0}
    rows, time = [], 0.0
    for run, stops in (("1", "ACAC"), ("2", "BDBD")):
        for n, name in enumerate(stops):
            off = 0.2 if n == 2 else 0.0
            rows.append(
                Row(time=time, reading=gravity[name], depth=depth[name] + off, station=name, run=run)
            )
            time += 1800.0
    results = reduced(rows, drift_order=1)
    moved = results.readings.to_station.values
    assert moved[2] == pytest.approx(-0.2 * 0.1 * MGAL, rel=1e-6)
    assert moved[6] == pytest.approx(-0.2 * 0.06 * MGAL, rel=1e-6)
