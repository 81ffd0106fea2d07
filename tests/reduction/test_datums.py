"""Datum stations, ties as datum, and parts of the network that nothing joins."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import loop, made_case
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Tare

UGAL, MGAL = 1e-8, 1e-5
LABELS = "ABCDEFGH"
DEPTH = {name: 70.0 * number for number, name in enumerate(LABELS)}
GRAVITY = {name: 0.085 * MGAL * depth for name, depth in DEPTH.items()}
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL)


def rows_of(stops, seed=0, **more):
    """One run over the stations of `stops`."""
    return loop(np.random.default_rng(seed), stops, depth=DEPTH, gravity=GRAVITY, **more)


def reduced(rows, **more):
    """Results with instrument A."""
    return reduce(made_case(rows, instruments=(METER,), **more))


def test_the_highest_column_station_is_the_datum():
    places = {"A": {"depth": 0.0, "role": "base"}}
    results = reduced(rows_of("ABCBA"), places=places)
    assert [results.stations.label[n] for n in results.network.gravity.datum] == ["B", "B", "B"]
    at = results.stations.label.index("B")
    assert results.stations.gravity.values[at] == 0.0 and results.stations.gravity_sd.values[at] == 0.0
    np.testing.assert_array_equal(results.network.gravity.independent().matrix()[at], 0.0)


def test_a_base_is_the_datum_only_where_there_is_no_column():
    places = {name: {"depth": DEPTH[name], "role": "base"} for name in "ABC"}
    results = reduced(rows_of("ABCBA"), places=places)
    assert set(results.network.gravity.datum) == {results.stations.label.index("A")}


def test_the_wanted_station_is_the_datum_and_changes_no_density():
    rows = rows_of("ABCDCBA")
    plain, wanted = reduced(rows), reduced(rows, datum_station="C")
    assert wanted.stations.gravity.values[2] == 0.0
    np.testing.assert_allclose(
        wanted.stations.gravity.values, plain.stations.gravity.values - plain.stations.gravity.values[2], atol=1e-18
    )
    # The level of the anomaly moves densities by 0.0004 g/cm3 for 100 mGal; here it moves by nearly nothing.
    np.testing.assert_allclose(wanted.intervals.density.values, plain.intervals.density.values, atol=0.05)
    np.testing.assert_allclose(
        wanted.intervals.errors.independent.matrix(), plain.intervals.errors.independent.matrix(), rtol=1e-4, atol=2e-5
    )


def test_each_part_without_a_tie_has_its_own_datum():
    rows = rows_of("ABCBA") + rows_of("EFGFE", 1, run="2", start=86400.0)
    results = reduced(rows)
    names = [results.stations.label[n] for n in results.network.gravity.datum]
    assert names == ["A"] * 3 + ["E"] * 3
    assert results.network.parts.count == 2 and not results.absolute
    assert results.intervals.from_station == ("A", "B", "E", "F")
    between = results.network.gravity.independent().matrix()[:3, 3:]
    np.testing.assert_allclose(between, 0.0, atol=1e-25)


def test_ties_join_parts():
    rows = rows_of("ABCBA") + rows_of("EFGFE", 1, run="2", start=86400.0)
    ties = {"B": (9.81 + GRAVITY["B"], 5 * UGAL), "F": (9.81 + GRAVITY["F"], 5 * UGAL)}
    results = reduced(rows, ties=ties)
    assert results.absolute and results.network.parts.count == 1
    assert results.intervals.from_station == ("A", "B", "C", "E", "F")
    errors = results.stations.gravity.values - 9.81 - [GRAVITY[name] for name in "ABCEFG"]
    assert np.all(np.abs(errors) < 4.0 * results.stations.gravity_sd.values)


def test_one_tie_leaves_differences_as_they_were():
    rows = rows_of("ABCDCBA")
    free, tied = reduced(rows), reduced(rows, ties={"C": (9.81, 20 * UGAL)})
    assert tied.stations.gravity.values[2] == pytest.approx(9.81, abs=1e-12)
    assert tied.stations.gravity_sd.values[2] == pytest.approx(20 * UGAL, rel=1e-9)
    np.testing.assert_allclose(
        np.diff(tied.stations.gravity.values), np.diff(free.stations.gravity.values), rtol=0, atol=1e-13
    )
    # Its own error is the same everywhere: it is a common one.
    np.testing.assert_allclose(tied.network.gravity.ties, 20 * UGAL, rtol=1e-9)
    np.testing.assert_allclose(
        tied.intervals.errors.independent.matrix(), free.intervals.errors.independent.matrix(), rtol=1e-4, atol=2e-5
    )


def test_a_tight_second_tie_takes_error_out_of_the_stations_between():
    rows = rows_of("ABCDCBA")
    one = reduced(rows, ties={"A": (9.81, 5 * UGAL)}, noise="as_given", drift_order=1)
    two = reduced(
        rows, ties={"A": (9.81, 5 * UGAL), "D": (9.81 + GRAVITY["D"], 0.5 * UGAL)}, noise="as_given", drift_order=1
    )
    assert np.all(two.stations.gravity_sd.values <= one.stations.gravity_sd.values)
    assert two.stations.gravity_sd.values[3] <= 0.5 * UGAL


def test_the_sd_of_gravity_and_of_density_are_the_roots_of_their_covariances():
    rows = rows_of("ABCDEDCBA")
    tares = (Tare(run="1", time=rows[14].time),)
    for ties in ({}, {"B": (9.81, 5 * UGAL)}, {"A": (9.81, 2 * UGAL), "E": (9.81 + GRAVITY["E"], 9 * UGAL)}):
        results = reduced(rows, ties=ties, tares=tares)
        gravity = results.network.gravity
        total = gravity.independent().matrix() + gravity.ties @ gravity.ties.T
        np.testing.assert_allclose(results.stations.gravity_sd.values**2, np.diag(total), rtol=1e-9, atol=1e-25)
        covariance = results.intervals.errors.independent.matrix()
        np.testing.assert_allclose(results.intervals.density_sd.values**2, np.diag(covariance), rtol=1e-9)
        common = results.intervals.errors.common_covariance()
        np.testing.assert_allclose(results.intervals.density_common_sd.values**2, np.diag(common), rtol=1e-9)


def test_a_tare_that_only_ties_bound_splits_its_errors_without_a_negative_part():
    stops = "ABCBAEFGFE"
    rows = rows_of(stops, counts=(3,))
    tares = (Tare(run="1", time=rows[15].time),)
    ties = {"A": (9.81, 5 * UGAL), "F": (9.81 + GRAVITY["F"], 3 * UGAL)}
    results = reduced(rows, tares=tares, ties=ties)
    at = [results.stations.label.index(name) for name in "AF"]
    np.testing.assert_allclose(results.stations.gravity_sd.values[at], [5 * UGAL, 3 * UGAL], rtol=1e-6)
    for part in (results.network.gravity.reading, results.network.gravity.drift, results.network.gravity.tare):
        assert np.linalg.eigvalsh(part.matrix()).min() > -1e-8 * UGAL**2


def test_a_tare_that_parts_a_run_gives_each_stretch_its_datum():
    stops = "ABCBAEFGFE"
    rows = rows_of(stops, counts=(2,))
    tares = (Tare(run="1", time=rows[10].time),)
    results = reduced(rows, tares=tares)
    names = [results.stations.label[n] for n in results.network.gravity.datum]
    assert names == ["A"] * 3 + ["E"] * 3
    columns = results.readings.estimates
    station = results.stations.located.placement.station
    whole = (
        columns.run_bias.values + columns.drift.values + columns.visit_effect.values + columns.residual.values
        + results.stations.gravity.values[station]
    )
    np.testing.assert_allclose(whole, [row.reading for row in rows], rtol=0, atol=1e-17)
    assert np.ptp(columns.run_bias.values) == 0.0


def test_a_tare_in_the_middle_of_a_visit_does_not_part_the_run():
    # No station is read on both sides but in that visit: its readings before and after tell the jump.
    rows = rows_of("ABCDEF", counts=(4,), drift=())
    rows = [replace(row, reading=row.reading + 0.1 * MGAL * (row.time >= rows[10].time)) for row in rows]
    results = reduced(rows, tares=(Tare(run="1", time=rows[10].time),), drift_order=0)
    fit = results.network.adjustment
    assert results.network.parts.count == 1 and fit.design.lost == ()
    size, sd = fit.unknown(DriftUnknown(kind="tare", run=0, tare=0))
    assert abs(size - 0.1 * MGAL) < 4 * sd
    # Two readings before it and two after, no re-seating between: e of one reading, and nothing of u.
    assert sd == pytest.approx(fit.noise.sd[0], rel=1e-9)
    assert fit.noise.sd[0] < 6 * UGAL  # the jump is no reading noise
    # With a return to either side it is told apart from everything else.
    jumped = rows_of("ABCDEFBDF", counts=(4,), drift=(), reading_noise=0.0, reseating=0.0)
    jumped = [replace(row, reading=row.reading + 0.1 * MGAL * (row.time >= jumped[10].time)) for row in jumped]
    results = reduced(jumped, tares=(Tare(run="1", time=jumped[10].time),), drift_order=0)
    np.testing.assert_allclose(results.stations.gravity.values, [GRAVITY[name] for name in "ABCDEF"], atol=1e-15)


def test_unvisited_stations_are_no_datum():
    rows = rows_of("BCB")
    places = {"A": {"depth": 0.0}}
    results = reduced(rows, places=places, ties={})
    assert results.stations.label == ("B", "C")
    assert results.stations.gravity.values[0] == 0.0


def test_the_station_floor_is_added_before_the_datum():
    meter = replace(METER, station_floor=30 * UGAL)
    rows = rows_of("ABCBA")
    plain = reduced(rows, noise="as_given", drift_order=1)
    floored = reduce(made_case(rows, instruments=(meter,), noise="as_given", drift_order=1))
    before = plain.network.gravity
    after = floored.network.gravity.reading.matrix()
    # Two visits at A and B, one at C, each of reading 2 uGal over three and re-seating 4 uGal.
    visit = (2 * UGAL) ** 2 / 3 + (4 * UGAL) ** 2
    more = np.array([30.0**2 * UGAL**2 - visit / n for n in (2, 2, 1)])
    extra = np.diag(more)
    extra[1:, 1:] += more[0]
    extra[0] = 0.0
    np.testing.assert_allclose(after, before.reading.matrix() + extra, rtol=1e-9, atol=1e-26)
    np.testing.assert_allclose(floored.network.gravity.drift.matrix(), before.drift.matrix(), rtol=1e-9, atol=1e-26)
