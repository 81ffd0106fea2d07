"""What the readings leave open, against the null space of the whole design written out by hand."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.linalg import null_space

from made_surveys import loop, made_case
from plumbwell.reduction.rank_lost import open_directions
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Tare

UGAL, MGAL = 1e-8, 1e-5
DEPTH = {name: 50.0 * number for number, name in enumerate("ABCDEFG")}
GRAVITY = {name: 0.09 * MGAL * depth for name, depth in DEPTH.items()}
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL)


def rows_of(stops, seed=0, **more):
    """One run of single readings, half an hour apart."""
    return loop(np.random.default_rng(seed), stops, depth=DEPTH, gravity=GRAVITY, counts=(1,), pause=1740.0, **more)


def reduced(rows, **more):
    """Results with one meter."""
    return reduce(made_case(rows, instruments=(METER,), **more))


def opened(results):
    """The open directions of a reduction."""
    fit, network = results.network.adjustment, results.network
    return open_directions(
        fit.basis, network.visits, network.ties, unknowns=fit.design.unknowns, lost=fit.design.lost,
        n_stations=len(results.stations),
    )  # fmt: skip


def by_hand(results, orders):
    """Stations whose gravity against the datum the whole design leaves open, by its null space."""
    utc, run = results.readings.utc.values, results.survey.readings.run.code
    station, n_stations = results.stations.located.placement.station, len(results.stations)
    n_runs = len(results.survey.readings.run.names)
    columns = [(station == one).astype(float) for one in range(n_stations)]
    columns += [(run == one).astype(float) for one in range(n_runs)]
    priors, past = [], np.zeros(len(utc))
    for one in range(n_runs):
        mine = run == one
        past[mine] = (utc[mine] - utc[mine].min()) / np.ptp(utc[mine])
        own = range(len(columns), len(columns) + orders[one])
        columns += [np.where(mine, past**power, 0.0) for power in range(1, orders[one] + 1)]
        priors.append(own)
    for tare in results.survey.tares:
        columns.append(((utc >= tare.time) & (run == results.survey.readings.run.names.index(tare.run))).astype(float))
    matrix = np.column_stack(columns)
    extra = [[1.0 if number in own else 0.0 for number in range(matrix.shape[1])] for own in priors if len(own)]
    size, tied = matrix.shape[1], results.network.ties.station.tolist()
    extra += [[1.0 if number == one else 0.0 for number in range(size)] for one in tied]
    null = null_space(np.vstack([matrix, *(np.array([row]) for row in extra)]), rcond=1e-9)
    moved = null[:n_stations]
    datum = results.network.gravity.datum
    moved = moved - np.where((datum >= 0)[:, None], moved[np.maximum(datum, 0)], 0.0)
    return (np.abs(moved) > 1e-7).any(axis=1).tolist()


def test_a_network_that_lacks_nothing_has_no_open_direction():
    results = reduced(rows_of("ABCDCBA"))
    found = opened(results)
    assert found.border.shape[1] == 0 and not found.undetermined(results.network.gravity.datum).any()
    assert not any(found.moves(one) for one in results.network.adjustment.design.unknowns)


CASES = {
    "a bend in a single pass": (["ABCD"], {}, 2),
    "two bends in a single pass": (["ABCDE"], {}, 3),
    "a bend in a pass with one return": (["ABCDA"], {}, 2),
    "two bends with one return": (["ABCDA"], {}, 3),
    "a bent pass beside a good loop": (["ABCABCABC", "CDE"], {}, 2),
    "a bent pass that the loop bounds": (["ABCABCABCA", "ADBC"], {}, 2),
    "two passes over the same stations": (["ABCD", "ABCD"], {}, 2),
    "a single pass between two ties": (["ABCD"], {"A": 0.0, "D": 150.0}, 3),
    "two bends between three ties": (["ABCDE"], {"A": 0.0, "C": 100.0, "E": 200.0}, 3),
}


@pytest.mark.parametrize("name", CASES)
def test_stations_without_gravity_are_those_that_the_whole_design_leaves_open(name):
    passes, ties, order = CASES[name]
    rows = [
        row
        for number, stops in enumerate(passes)
        for row in rows_of(stops, seed=number, run=str(number + 1), start=number * 36000.0)
    ]
    tied = {label: (0.09 * MGAL * depth, 5 * UGAL) for label, depth in ties.items()}
    results = reduced(rows, ties=tied, drift_order=order)
    found = opened(results).undetermined(results.network.gravity.datum)
    expected = by_hand(results, [order] * len(passes))
    assert found.tolist() == expected
    assert np.isnan(results.stations.gravity.values).tolist() == expected
    assert np.isnan(results.stations.gravity_sd.values).tolist() == expected
    assert any(expected) == (name != "a bent pass that the loop bounds")


def test_two_tares_in_one_gap_move_one_another_and_no_station():
    rows = rows_of("ABCBABCBA")
    gap = 0.5 * (rows[3].time + rows[4].time)
    results = reduced(rows, tares=(Tare(run="1", time=gap), Tare(run="1", time=gap + 60.0)))
    found = opened(results)
    (held,) = results.network.adjustment.design.lost
    (other,) = found.partners(held)
    assert {held.kind, other.kind} == {"tare"} and {held.tare, other.tare} == {0, 1}
    assert not found.undetermined(results.network.gravity.datum).any()
    assert by_hand(results, [1]) == [False, False, False]
    assert np.isfinite(results.stations.gravity.values).all()
    # The rows after both know the sum; no row stands between, so that every drift is told.
    assert np.isfinite(results.readings.estimates.drift.values).all()


def test_a_row_between_two_tares_that_is_out_of_use_has_no_drift():
    rows = rows_of("ABCBABCBA")
    rows[4] = replace(rows[4], use=False)
    times = [0.5 * (rows[n].time + rows[n + 1].time) for n in (3, 4)]
    results = reduced(rows, tares=tuple(Tare(run="1", time=time) for time in times))
    assert np.isnan(results.readings.estimates.drift.values).tolist() == [number == 4 for number in range(9)]
    assert np.isfinite(results.stations.gravity.values).all()


def test_what_is_left_open_is_empty_whatever_the_held_value_is():
    """Readings bent as the open direction bends them are the same survey: what stands must be the same."""
    rows = rows_of("ABCABCABC") + rows_of("CDEF", seed=1, run="2", start=36000.0)
    results = reduced(rows, drift_order=2)
    utc = results.readings.utc.values
    last = results.survey.readings.run.code == 1
    past = np.where(last, (utc - utc[last].min()) / np.ptp(utc[last]), 0.0)
    bend = 40 * MGAL * (past - past**2)
    bent = [replace(row, reading=row.reading + bend[number]) for number, row in enumerate(rows)]
    again = reduced(bent, drift_order=2)
    told = np.isfinite(results.stations.gravity.values)
    assert told.tolist() == [True, True, True, False, False, True]
    for one, other in zip(
        (results.stations.gravity, results.stations.gravity_sd, results.readings.estimates.run_bias),
        (again.stations.gravity, again.stations.gravity_sd, again.readings.estimates.run_bias),
        strict=True,
    ):
        # 40 mGal and double precision: a few 1e-19 m/s2.
        np.testing.assert_allclose(one.values, other.values, rtol=0, atol=1e-16)


def test_cells_that_are_left_empty_are_worked_out_as_empty_and_the_others_as_they_stand():
    rows = rows_of("ABCABCABC") + rows_of("CDEF", seed=1, run="2", start=36000.0)
    columns = reduced(rows, drift_order=2).readings.estimates
    for column in (columns.gravity, columns.gravity_sd, columns.run_bias, columns.drift):
        anew = [column.worked(row) for row in range(len(column))]
        # Both runs begin at stations that the first run tells, which fixes their bias.
        assert np.isnan(column.values).any() == (column.key != "run_bias") and np.isfinite(column.values).any()
        # Readings of 0.0002 m/s2 in sums of a few terms.
        np.testing.assert_allclose(anew, column.values, rtol=1e-12, atol=1e-18)
