"""Visits: what ends one and what does not."""

from dataclasses import replace

import numpy as np

from made_surveys import Row, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

MINUTE = 60.0
METER = Instrument(name="A")


def row(station, minute, **more):
    """A reading of nothing at a minute."""
    depth = {"A": 0.0, "B": 50.0, "C": 90.0}[station]
    return Row(time=minute * MINUTE, reading=0.0, depth=depth, station=station, **more)


def stays(rows, **more):
    """Visit of each row."""
    results = reduce(made_case(rows, instruments=(METER,), **more))
    return results.network.visits.of_row.tolist(), results


def test_another_station_ends_a_visit():
    visit, results = stays([row("A", 0), row("A", 1), row("B", 2), row("B", 3), row("A", 4)])
    assert visit == [0, 0, 1, 1, 2]
    assert results.stations.visits.tolist() == [2, 1]


def test_a_pause_over_the_gap_ends_a_visit_and_one_of_the_gap_does_not():
    assert stays([row("A", 0), row("A", 15), row("A", 30.02), row("B", 40)])[0] == [0, 0, 1, 2]
    assert stays([row("A", 0), row("A", 15), row("B", 40)], visit_gap=10 * MINUTE)[0] == [0, 1, 2]


def test_a_row_out_of_use_ends_no_visit():
    used_no = replace(row("B", 2), use=False)
    assert stays([row("A", 0), used_no, row("A", 4), row("B", 9)])[0] == [0, -1, 0, 1]
    bridge = replace(row("A", 12), use=False)
    assert stays([row("A", 0), bridge, row("A", 24), row("B", 40)])[0] == [0, -1, 0, 1]
    assert stays([row("A", 0), row("A", 24), row("B", 40)])[0] == [0, 1, 2]


def test_rows_of_one_visit_label_are_one_visit_whatever_lies_between():
    rows = [row("A", 0, visit="x"), row("B", 10), row("A", 50, visit="x"), row("A", 52, visit="y"), row("A", 53)]
    visit, results = stays(rows)
    assert visit == [0, 1, 0, 2, 3]
    assert len(results.network.visits) == 4


def test_a_visit_label_counts_within_run_and_station():
    rows = [row("A", 0, visit="1"), row("B", 5, visit="1"), row("A", 10, visit="1", run="2"), row("B", 15, run="2")]
    assert stays(rows)[0] == [0, 1, 2, 3]


def test_runs_are_ordered_by_their_first_reading_and_rows_by_time():
    rows = [row("A", 100), row("B", 5, run="2"), row("A", 0, run="2"), row("B", 110), row("A", 1, run="2")]
    visit, results = stays(rows)
    assert visit == [2, 1, 0, 3, 0]
    visits = results.network.visits
    assert [results.survey.readings.run.names[code] for code in visits.run_order] == ["2", "1"]
    np.testing.assert_array_equal(visits.first, np.array([0.0, 5.0, 100.0, 110.0]) * MINUTE)
    np.testing.assert_array_equal(visits.last, np.array([1.0, 5.0, 100.0, 110.0]) * MINUTE)
    assert visits.rows.tolist() == [2, 4, 1, 0, 3]


def test_two_runs_at_once_do_not_end_each_others_visits():
    rows = [row("A", 0), row("B", 1, run="2"), row("A", 2), row("B", 3, run="2")]
    assert stays(rows)[0] == [0, 1, 0, 1]


def test_equal_times_in_one_run_are_named():
    rows = [row("A", 0), row("A", 0), row("B", 5), row("B", 5, run="2")]
    assert stays(rows)[1].network.visits.equal_times.tolist() == [1]
    rows[1] = replace(rows[1], use=False)
    assert stays(rows)[1].network.visits.equal_times.tolist() == []


def test_first_row_out_of_use_does_not_start_the_run():
    rows = [replace(row("A", 0), use=False), row("A", 10), row("B", 30), replace(row("A", 60), use=False)]
    visits = stays(rows)[1].network.visits
    assert visits.run_start.tolist() == [10 * MINUTE] and visits.run_length.tolist() == [20 * MINUTE]
