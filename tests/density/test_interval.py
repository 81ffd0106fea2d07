"""Which stations make intervals, and how their densities answer to what is done to the readings."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

UGAL, MGAL = 1e-8, 1e-5
FOUR_PI_G = 4.0 * np.pi * 6.67430e-11
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL)
DEPTH = {"A": 0.0, "B": 40.0, "C": 95.0, "D": 180.0}
GRAVITY = {name: 0.088 * MGAL * depth for name, depth in DEPTH.items()}


def rows_of(stops="ABCDCBA", depth=DEPTH, gravity=GRAVITY, **more):
    """One run without chance in its depths."""
    return loop(np.random.default_rng(1), stops, depth=depth, gravity=gravity, counts=(2,), **more)


def reduced(rows, **more):
    """Results with held noise and order, so that every change shows alone."""
    held = {"noise": "as_given", "drift_order": 1} | more
    return reduce(made_case(rows, instruments=(METER,), **held))


def test_intervals_join_neighbours_from_the_top_down():
    results = reduced(rows_of("DBACABD"))
    intervals = results.intervals
    assert [intervals.label(n) for n in range(len(intervals))] == ["A~B", "B~C", "C~D"]
    np.testing.assert_allclose(intervals.densities.thickness.values, [40.0, 55.0, 85.0], rtol=1e-14)


def test_the_density_is_that_of_the_shell_between_two_spheres():
    results = reduced(rows_of())
    stations, parts = results.stations, results.stations.parts
    delta = stations.gravity.values - parts.normal_gravity.values - parts.free_air.values
    level = delta[0] - parts.shell.values[0]
    delta = delta - level
    r = results.choice.radius + stations.located.positions.elevation.values + results.survey.site.geoid_height
    wanted = 3.0 * (delta[:-1] * r[:-1] ** 2 - delta[1:] * r[1:] ** 2) / (FOUR_PI_G * (r[:-1] ** 3 - r[1:] ** 3))
    np.testing.assert_allclose(results.intervals.density.values, wanted, rtol=1e-6)
    slab = (results.choice.gradient - results.intervals.densities.gradient.values) / FOUR_PI_G
    np.testing.assert_allclose(results.intervals.density_slab.values, slab, rtol=1e-12)


@pytest.mark.parametrize("constant", [1.0 * MGAL, -3000.0 * MGAL, 9.8])
def test_a_constant_added_to_all_readings_changes_no_density(constant):
    rows = rows_of()
    plain = reduced(rows)
    moved = reduced([replace(row, reading=row.reading + constant) for row in rows])
    # Rounding of the sum over the thickness, times four.
    room = 4.0 * 64.0 * np.finfo(float).eps * (abs(constant) + 1e-3) / (FOUR_PI_G * 40.0)
    np.testing.assert_allclose(moved.intervals.density.values, plain.intervals.density.values, rtol=0, atol=room)
    np.testing.assert_allclose(moved.intervals.density_sd.values, plain.intervals.density_sd.values, rtol=1e-9)


def test_a_linear_field_moves_each_density_by_its_slope_over_four_pi_g():
    rows, slope = rows_of(), 0.01 * MGAL
    plain = reduced(rows)
    moved = reduced([replace(row, reading=row.reading + slope * row.depth) for row in rows])
    change = moved.intervals.density.values - plain.intervals.density.values
    np.testing.assert_allclose(change, -slope / FOUR_PI_G, rtol=1e-4)
    flat = moved.intervals.density_slab.values - plain.intervals.density_slab.values
    np.testing.assert_allclose(flat, -slope / FOUR_PI_G, rtol=1e-9)


def test_the_thickness_weighted_mean_is_the_density_between_the_ends():
    results = reduced(rows_of())
    alone = reduced([row for row in rows_of() if row.station in "AD"])
    gravity = results.stations.gravity.values
    thickness = results.intervals.densities.thickness.values
    mean = np.average(results.intervals.density_slab.values, weights=thickness)
    ends = (results.choice.gradient - (gravity[-1] - gravity[0]) / thickness.sum()) / FOUR_PI_G
    assert mean == pytest.approx(ends, rel=1e-10)
    assert [alone.intervals.label(0)] == ["A~D"]


def test_a_measured_gradient_moves_every_density_alike():
    rows = rows_of()
    plain = reduced(rows)
    excess = 0.001 * MGAL
    stated = (plain.choice.normal + excess, 0.0003 * MGAL)
    moved = reduced(rows, free_air=stated)
    assert moved.choice.gradient == stated[0]
    change = moved.intervals.density.values - plain.intervals.density.values
    np.testing.assert_allclose(change, excess / FOUR_PI_G, rtol=1e-4)
    flat = moved.intervals.density_slab.values - plain.intervals.density_slab.values
    np.testing.assert_allclose(flat, excess / FOUR_PI_G, rtol=1e-9)
    # Its sd stands in the place of gradient_sd: 0.0001 mGal/m is 0.0012 g/cm3.
    np.testing.assert_allclose(moved.intervals.errors.factors["gradient"], stated[1] / FOUR_PI_G, rtol=1e-4)
    assert np.all(np.abs(moved.intervals.errors.factors["gradient"] - 3 * 1.19230) < 0.001)


def near_stations(visits):
    """A, then two stations 0.4 m apart with the visits asked for, then D."""
    depth = {"A": 0.0, "B": 50.0, "C": 50.4, "D": 100.0}
    return rows_of(visits, depth=depth, gravity={name: 0.09 * MGAL * one for name, one in depth.items()})


@pytest.mark.parametrize(("stops", "kept"), [("ABCDBA", "B"), ("ABCDCA", "C"), ("ABCDA", "B")])
def test_of_stations_too_near_the_one_with_more_visits_stands_for_both(stops, kept):
    results = reduced(near_stations(stops))
    other = {"B": "C", "C": "B"}[kept]
    assert results.intervals.from_station == ("A", kept) and results.intervals.to_station == (kept, "D")
    ((one, left),) = results.intervals.densities.pairs.close
    assert (results.stations.label[one], results.stations.label[left]) == (kept, other)


def test_the_least_thickness_itself_is_enough():
    depth = {"A": 0.1, "B": 0.6, "C": 50.0}
    rows = rows_of("ABCA", depth=depth, gravity=dict.fromkeys("ABC", 0.0))
    assert len(reduced(rows).intervals) == 2
    assert len(reduced(rows, min_thickness=0.5001).intervals) == 1


def test_a_chain_of_near_stations_is_thinned_from_the_last_one_kept():
    depth = dict(zip("ABCDE", [0.0, 0.3, 0.6, 0.9, 50.0], strict=True))
    results = reduced(rows_of("ABCDEA", depth=depth, gravity=dict.fromkeys("ABCDE", 0.0)))
    assert results.intervals.from_station == ("A", "C") and results.intervals.to_station == ("C", "E")


def test_stations_far_apart_sideways_have_an_empty_density():
    places = {
        "A": {"elevation": 90.0, "east": 0.0, "north": 0.0}, "B": {"elevation": 80.0, "east": 30.0, "north": 40.0},
        "C": {"elevation": 70.0, "east": 30.0, "north": 91.0},
    }  # fmt: skip
    rows = [replace(row, depth=np.nan) for row in rows_of("ABCBA")]
    intervals = reduced(rows, places=places).intervals
    assert np.isfinite(intervals.density.values).tolist() == [True, False]
    for column in (intervals.density_slab, intervals.density_sd, intervals.density_common_sd):
        assert np.isfinite(column.values).tolist() == [True, False]
