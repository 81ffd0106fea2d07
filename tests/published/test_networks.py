"""Small networks with known answers.

* A complete graph of four points and a loop with drift, both exactly solvable: derived by hand from the normal
  equations, not printed anywhere; exact fractions, so 1e-9.
* Baarda 1968, A testing procedure for use in geodetic networks, Netherlands Geodetic Commission 2(5): the critical
  value of a single observation at a chance of 0.001 and the test on standardised residuals (w). The digits are
  recomputed from the normal distribution; Baarda's own print, 3.29, is cited from memory.
* Ghilani & Wolf, Adjustment Computations, chapter 12, levelling net with two fixed marks, ft: the figures 105.150,
  104.489, 106.197 and 0.107 are the book's as remembered; the further digits were recomputed from its observations.

A levelled or measured difference enters as a run of two readings, each with half of its variance, without drift and
without the prior on drift.
"""

from math import inf, sqrt

import numpy as np
import pytest
from scipy.special import ndtri

from made_surveys import Row, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run

MGAL, UGAL, HOUR = 1e-5, 1e-8, 3600.0
METER = Instrument(name="A", reading_floor=1e-20, reseating_sd=0.0, station_floor=0.0, drift_rate_sd=inf)


def differences(ties, depth, **changed):
    """Results of measured differences (from, to, value, sd), one run each, m/s2; `changed` are keys of the recipe."""
    rows, runs = [], []
    for number, (start, end, value, sd) in enumerate(ties):
        run = str(number + 1)
        runs.append(Run(name=run, drift_order=0))
        for at, (station, reading) in enumerate(((start, 0.0), (end, value))):
            rows.append(
                Row(
                    time=number * 86400.0 + at * HOUR, reading=reading, depth=depth[station], station=station, run=run,
                    reading_sd=sd / sqrt(2.0),
                )
            )  # fmt: skip
    return reduce(made_case(rows, instruments=(METER,), runs=tuple(runs), noise="as_given", **changed))


def of_differences(results):
    """Corrections v = fitted less observed, w = v over its own sd, and redundancy of each difference."""
    columns = results.readings.estimates
    correction = -np.diff(columns.residual.values.reshape(-1, 2), axis=1).ravel()
    w = -columns.standardised.values[1::2]
    redundancy = columns.redundancy.values.reshape(-1, 2).sum(axis=1)
    return correction, w, redundancy


POINTS = {name: 50.0 * number for number, name in enumerate("ABCD")}
GRAPH = [
    ("A", "B", 10.010), ("B", "C", 5.004), ("A", "C", 15.002), ("C", "D", 3.000), ("A", "D", 18.020), ("B", "D", 8.000),
]  # fmt: skip


def graph(blunder=0.0, **changed):
    """The complete graph on four points; tie 3 may be wrong."""
    ties = [(a, b, (value + blunder * (n == 2)) * MGAL, 5 * UGAL) for n, (a, b, value) in enumerate(GRAPH)]
    return differences(ties, POINTS, **changed)


def test_complete_graph_on_four_points():
    results = graph()
    np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 10.0095, 15.0095, 18.0130], atol=1e-9)
    np.testing.assert_allclose(results.stations.gravity_sd.values / UGAL, [0.0, *[5 / sqrt(2.0)] * 3], rtol=1e-9)
    correction, w, redundancy = of_differences(results)
    np.testing.assert_allclose(correction / UGAL, [-0.5, -4.0, 7.5, 3.5, -7.0, 3.5], atol=1e-6)
    np.testing.assert_allclose(redundancy, 0.5, rtol=1e-9)
    np.testing.assert_allclose(
        w, [-0.14142136, -1.13137085, 2.12132034, 0.98994949, -1.97989899, 0.98994949], atol=6e-9
    )
    adjustment = results.network.adjustment
    assert adjustment.solution.sum_of_squares() == pytest.approx(5.84, rel=1e-9)
    assert adjustment.reseating.freedom == 3
    assert sqrt(adjustment.solution.sum_of_squares() / 3) == pytest.approx(1.395229970, abs=1e-9)


def test_a_blunder_in_the_complete_graph():
    results = graph(blunder=0.050)
    np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 10.0220, 15.0345, 18.0255], atol=1e-9)
    correction, w, redundancy = of_differences(results)
    np.testing.assert_allclose(correction / UGAL, [12.0, 8.5, -17.5, -9.0, 5.5, 3.5], atol=1e-6)
    np.testing.assert_allclose(w, [3.394112, 2.404163, -4.949747, -2.545584, 1.555635, 0.989949], atol=6e-7)
    assert results.network.adjustment.solution.sum_of_squares() == pytest.approx(25.84, rel=1e-9)
    assert -correction[2] / redundancy[2] / UGAL == pytest.approx(35.0, abs=1e-6)
    critical = ndtri(1.0 - 0.001 / 2.0)
    assert critical == pytest.approx(3.290526731, abs=5e-10)
    # Two differences are over the critical value; the largest is the wrong one.
    assert np.flatnonzero(np.abs(w) > critical).tolist() == [0, 2]
    assert int(np.argmax(np.abs(w))) == 2


@pytest.mark.parametrize("outliers", ["flag", "exclude"])
def test_the_search_names_the_blunder_of_the_complete_graph_and_nothing_else(outliers):
    # Tie 1 is over the critical value too: the largest alone is removed, and then nothing is left over it.
    results = graph(blunder=0.050, outliers=outliers)
    found = results.network.judgement
    (row,) = results.network.outlier_rows.tolist()
    assert row in (4, 5), "one end of tie 3; which of its two readings is wrong nothing tells"
    sign = 1.0 if row == 5 else -1.0
    assert found.error[0] / UGAL == pytest.approx(sign * 35.0, abs=1e-6)
    assert found.ratio[0] == pytest.approx(sign * 4.949747, abs=6e-7)
    (jump,) = results.network.proposed
    assert jump.one_visit and jump.run == 2 and jump.size / UGAL == pytest.approx(35.0, abs=1e-6)
    if outliers == "flag":
        np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 10.0220, 15.0345, 18.0255], atol=1e-9)
        return
    # Without tie 3 the normal equations of B, C, D by hand; their determinant is 8.
    rest = [(a, b, value) for n, (a, b, value) in enumerate(GRAPH) if n != 2]
    design = np.array([[(b == name) - (a == name) for name in "BCD"] for a, b, _ in rest], dtype=float)
    assert (design.T @ design).tolist() == [[3.0, -1.0, -1.0], [-1.0, 2.0, -1.0], [-1.0, -1.0, 3.0]]
    inverse = np.array([[5.0, 4.0, 3.0], [4.0, 8.0, 4.0], [3.0, 4.0, 5.0]]) / 8.0
    wanted = inverse @ design.T @ [value for _, _, value in rest]
    np.testing.assert_allclose(results.stations.gravity.values[1:] / MGAL, wanted, atol=1e-9)
    np.testing.assert_allclose(
        results.stations.gravity_sd.values[1:] / UGAL, 5.0 * np.sqrt(np.diag(inverse)), rtol=1e-9
    )
    left = np.abs(results.readings.estimates.standardised.values)
    assert np.nanmax(left) < ndtri(1.0 - 0.001 / 2.0)
    # The other end of tie 3 stands alone: nothing checks it.
    other = 9 - row
    assert results.network.adjustment.redundancy[other] == pytest.approx(0.0, abs=1e-12) and np.isnan(left[other])


@pytest.mark.parametrize("blunder", [0.1, -0.2, 5.0])
def test_what_the_blunder_alone_has_made_suspicious_is_given_back(blunder):
    # With larger blunders ties 3 and 4, which share no station at one end, are both over the critical value.
    found = graph(blunder=blunder).network.judgement
    (row,) = found.rows.tolist()
    assert row in (4, 5)
    # -v of tie 3 is +7.5 uGal less half of the blunder; divided by its redundancy of a half.
    assert abs(found.error[0]) / UGAL == pytest.approx(abs(blunder * 1000.0 - 15.0), rel=1e-9)


def test_the_search_names_nothing_in_the_sound_graph():
    # The largest w is 2.12.
    network = graph().network
    assert network.outlier_rows.size == 0 and network.proposed == ()


@pytest.mark.parametrize("blunder", [0.0, 1.0, -100.0])
def test_no_search_can_name_what_nothing_checks(blunder):
    readings = [1000.000, 1010.010, 1025.024 + blunder, 1010.032, 1000.040]
    rows = [
        Row(time=n * HOUR, reading=value * MGAL, depth=POINTS[name], station=name, reading_sd=5 * UGAL)
        for n, (name, value) in enumerate(zip("ABCBA", readings, strict=True))
    ]
    results = reduce(made_case(rows, instruments=(METER,), noise="as_given", drift_order=1, drift_walk="off"))
    # All of the blunder goes into gravity of C; sums and tests know nothing of it.
    np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 10.0010, 25.0040 + blunder], atol=1e-9)
    assert results.network.adjustment.solution.sum_of_squares() == pytest.approx(0.064, rel=1e-5)
    assert results.network.outlier_rows.size == 0 and results.network.proposed == ()
    checked = results.network.adjustment.checked
    assert np.isnan([checked.error[2], checked.predicted[2], checked.standardised[2]]).all()
    # Error of the others: v over r with the sign turned, -0.4/0.1, 0.8/0.4 and so on.
    np.testing.assert_allclose(checked.error[[0, 1, 3, 4]] / UGAL, [4.0, -2.0, 2.0, -4.0], atol=1e-4)
    (unchecked,) = (one for one in results.findings if one.code == "unchecked_readings")
    assert unchecked.rows == (2,)


def test_a_loop_with_linear_drift():
    readings = [1000.000, 1010.010, 1025.024, 1010.032, 1000.040]
    rows = [
        Row(time=n * HOUR, reading=value * MGAL, depth=POINTS[name], station=name, reading_sd=5 * UGAL)
        for n, (name, value) in enumerate(zip("ABCBA", readings, strict=True))
    ]
    results = reduce(made_case(rows, instruments=(METER,), noise="as_given", drift_order=1))
    columns, adjustment = results.readings.estimates, results.network.adjustment
    np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 10.0010, 25.0040], atol=1e-9)
    assert columns.run_bias.values[0] / MGAL == pytest.approx(999.9996, abs=1e-8)
    np.testing.assert_allclose(columns.drift.values / MGAL, 0.0102 * np.arange(5), atol=1e-9)
    np.testing.assert_allclose(-columns.residual.values / UGAL, [-0.4, 0.8, 0.0, -0.8, 0.4], atol=1e-5)
    np.testing.assert_allclose(columns.redundancy.values, [0.1, 0.4, 0.0, 0.4, 0.1], atol=1e-9)
    # Nothing checks the single reading at C: no standardised residual, no number instead of one.
    assert np.isnan(columns.standardised.values[2]) and np.isfinite(columns.standardised.values[[0, 1, 3, 4]]).all()
    np.testing.assert_allclose(results.stations.gravity_sd.values[1:] / UGAL, [5.0, 6.123724357], rtol=1e-8)
    (slope,) = (one for one in adjustment.design.unknowns if one.kind == "drift")
    value, sd = adjustment.unknown(slope)
    assert (value / MGAL / 4.0, sd / UGAL / 4.0) == pytest.approx((0.0102, 1.581138830), rel=1e-8)
    assert adjustment.solution.sum_of_squares() == pytest.approx(0.064, rel=1e-6)
    assert adjustment.reseating.freedom == 1


LEVELLED = [("M", "A", 105.10), ("M", "A", 105.16), ("M", "C", 106.25), ("M", "C", 106.13), ("B", "A", 0.68),
            ("M", "B", 104.50), ("B", "C", 1.70)]  # fmt: skip
MARKS = {"M": 0.0, "A": 50.0, "B": 100.0, "C": 150.0}


def levelled(weights):
    """The levelling net with the fixed marks as one datum; a foot stands for a mGal."""
    ties = [
        (a, b, value * MGAL, MGAL / sqrt(weight)) for (a, b, value), weight in zip(LEVELLED, weights, strict=True)
    ]
    return differences(ties, MARKS)


def test_levelling_net_with_equal_weights():
    results = levelled([1.0] * 7)
    np.testing.assert_allclose(
        results.stations.gravity.values / MGAL, [0.0, 105.140952, 104.482857, 106.187619], atol=5e-7
    )
    squares = results.network.adjustment.solution.sum_of_squares()
    assert squares == pytest.approx(0.010047619, abs=5e-10)
    assert results.network.adjustment.reseating.freedom == 4
    assert sqrt(squares / 4) == pytest.approx(0.050118906, abs=5e-10)
    _, _, redundancy = of_differences(results)
    np.testing.assert_allclose(redundancy, [*[0.619048] * 4, 0.476190, 0.571429, 0.476190], atol=5e-7)


def test_levelling_net_with_weights_by_length():
    results = levelled([3.0, 4.0, 6.0, 4.0, 6.0, 6.0, 6.0])
    np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 105.150, 104.489, 106.197], atol=5e-4)
    np.testing.assert_allclose(results.stations.gravity.values / MGAL, [0.0, 105.1504, 104.4892, 106.1972], atol=5e-5)
    correction, _, _ = of_differences(results)
    np.testing.assert_allclose(
        correction / MGAL, [0.0504, -0.0096, -0.0528, 0.0672, -0.0188, -0.0108, 0.0080], atol=5e-5
    )
    squares = results.network.adjustment.solution.sum_of_squares()
    assert squares == pytest.approx(0.045984, abs=5e-7)
    reference = sqrt(squares / 4)
    assert reference == pytest.approx(0.107, abs=5e-4) and reference == pytest.approx(0.107219, abs=5e-7)
    sd = results.stations.gravity_sd.values[1:] / MGAL * reference
    np.testing.assert_allclose(sd, [0.032756, 0.029759, 0.029035], atol=5e-7)
