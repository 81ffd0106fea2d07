"""The network against dense algebra written here: every unknown in one matrix, inverted as a whole.

The noise components are taken from the result under test; all else is built anew from the plain rows.
"""

from dataclasses import replace

import numpy as np
import pytest

from dense_networks import dense_network
from made_surveys import loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run, Tare

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
AGREEMENT = 1e-9
LABELS = "ABCDEFGHIJ"
DEPTH = {name: 80.0 * number for number, name in enumerate(LABELS)}
GRAVITY = {name: 0.09 * MGAL * depth + 3 * UGAL * (depth % 7) for name, depth in DEPTH.items()}


def datum_matrix(stations, parts, tied):
    """The S-transformation: every station less its part's highest; tied parts stay."""
    matrix = np.eye(len(stations))
    for part, fixed in zip(parts, tied, strict=True):
        if not fixed:
            datum = min(part, key=lambda name: DEPTH[name])
            for name in part:
                matrix[stations.index(name), stations.index(datum)] -= 1.0
    return matrix


A = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL, drift_rate_sd=0.05 * MGAL / HOUR)
B = Instrument(
    name="B", reading_floor=6 * UGAL, reseating_sd=9 * UGAL, station_floor=7 * UGAL,
    drift_rate=0.01 * MGAL / HOUR, drift_rate_sd=0.02 * MGAL / HOUR,
)


def next_stop(rows, n):
    """Time of the first reading of the stop after row n: a jump there breaks no visit."""
    return next(row.time for row in rows[n:] if row.station != rows[n].station)


def scenario(name):
    """Rows and statements of one small network: (rows, keywords, orders, parts, tied)."""
    chance = np.random.default_rng(sum(map(ord, name)))
    make = {"depth": DEPTH, "gravity": GRAVITY}
    day = 86400.0
    plain = loop(chance, "ABCDCBA", counts=(1, 2, 5), **make)
    second = loop(chance, "ADEFEDA", run="2", start=day, bias=3 * MGAL, counts=(1, 4), **make)
    both = [*plain, *second]
    all_six = ["ABCDEF"]
    high = 9.81
    match name:
        case "one run":
            return plain, {}, {"1": 1}, ["ABCD"], [False]
        case "two runs":
            return both, {}, {"1": 1, "2": 1}, all_six, [False]
        case "order 0":
            return both, {"orders": (0, 2)}, {"1": 0, "2": 2}, all_six, [False]
        case "order 3":
            return both, {"orders": (3, 1)}, {"1": 3, "2": 1}, all_six, [False]
        case "one tie":
            ties = {"C": (high, 5 * UGAL)}
            return both, {"ties": ties}, {"1": 1, "2": 1}, all_six, [True]
        case "two ties":
            ties = {"A": (high, 5 * UGAL), "F": (high + GRAVITY["F"], 4 * UGAL)}
            return both, {"ties": ties}, {"1": 1, "2": 1}, all_six, [True]
        case "three ties":
            ties = {"A": (high, 5 * UGAL), "C": (high + GRAVITY["C"], 1 * UGAL), "F": (high + GRAVITY["F"], 20 * UGAL)}
            return both, {"ties": ties, "orders": (2, 1)}, {"1": 2, "2": 1}, all_six, [True]
        case "free tare":
            tares = (Tare(run="1", time=plain[8].time + 900.0),)
            return both, {"tares": tares}, {"1": 1, "2": 1}, all_six, [False]
        case "stated tare":
            tares = (
                Tare(run="1", time=next_stop(plain, 8), size=20 * UGAL, size_sd=5 * UGAL),
                Tare(run="2", time=next_stop(second, 9)),
            )
            return both, {"tares": tares}, {"1": 1, "2": 1}, all_six, [False]
        case "held tare":
            tares = (Tare(run="2", time=second[9].time, size=-30 * UGAL),)
            ties = {"B": (high + GRAVITY["B"], 5 * UGAL)}
            return both, {"tares": tares, "ties": ties}, {"1": 1, "2": 1}, all_six, [True]
        case "two meters":
            other = loop(
                chance, "ACFCA", run="3", start=2 * day, instrument="B", reading_noise=8 * UGAL, counts=(1, 3), **make
            )
            return [*both, *other], {}, {"1": 1, "2": 1, "3": 1}, all_six, [False]
        case "stated sds":
            stated = loop(chance, "ABCDEFEDCBA", reading_sd=(2 * UGAL, 5 * UGAL, 9 * UGAL), **make)
            return stated, {}, {"1": 1}, all_six, [False]
        case "parts apart":
            apart = loop(chance, "GHIHG", run="3", start=2 * day, **make)
            ties = {"C": (high, 5 * UGAL)}
            return [*both, *apart], {"ties": ties}, {"1": 1, "2": 1, "3": 1}, ["ABCDEF", "GHI"], [True, False]
        case "split by a tare":
            first, then = "ABCBA", "GHIHG"
            one = loop(chance, first + then, counts=(2,), **make)
            tares = (Tare(run="1", time=one[2 * len(first)].time),)
            return one, {"tares": tares}, {"1": 1}, ["ABC", "GHI"], [False, False]
        case "unused rows":
            some = [replace(row, use=n % 5 != 3) for n, row in enumerate(both)]
            return some, {}, {"1": 1, "2": 1}, all_six, [False]
    raise AssertionError(name)


NAMES = [
    "one run", "two runs", "order 0", "order 3", "one tie", "two ties", "three ties", "free tare", "stated tare",
    "held tare", "two meters", "stated sds", "parts apart", "split by a tare", "unused rows",
]  # fmt: skip


@pytest.fixture(params=[(name, noise) for name in NAMES for noise in ("estimate", "as_given")], scope="module")
def solved(request):
    """One network by the chain and by dense algebra."""
    name, noise = request.param
    rows, said, orders, parts, tied = scenario(name)
    meters = (A, B)
    runs = tuple(Run(name=run, drift_order=order) for run, order in orders.items())
    case = made_case(
        rows, instruments=meters, runs=runs, tares=said.get("tares", ()), ties=said.get("ties"), noise=noise
    )
    results = reduce(case)
    dense, known = dense_network(
        rows, results, orders=orders, instruments=meters, tares=said.get("tares", ()), ties=said.get("ties")
    )
    shift = datum_matrix(dense.stations, parts, tied)
    return rows, case, results, dense, known, shift, said, orders


def close(got, wanted, scale, ties=None):
    """Agreement to 1e-9 of the scale; where ties make gravity absolute, near 10 m/s2, rounding needs more."""
    absolute = 2e-13 if scale == MGAL and ties else 0.0
    np.testing.assert_allclose(got, wanted, rtol=0, atol=AGREEMENT * scale + absolute)


def floor_of(results, dense, rows):
    """What the station floor adds to each station's variance, before any datum."""
    adjustment = results.network.adjustment
    extra = []
    for name in dense.stations:
        at = [adjustment.visits.of_row[n] for n, row in enumerate(rows) if row.station == name and row.use]
        meters = {row.instrument for row in rows if row.station == name and row.use}
        floor = max({"A": A, "B": B}[one].station_floor for one in meters)
        weight = sum(
            1.0 / (adjustment.noise.variance[v] + adjustment.reseating.variance[v]) for v in sorted({*at})
        )
        extra.append(max(floor**2 - 1.0 / weight, 0.0))
    return np.diag(extra)


def test_gravity_is_that_of_dense_least_squares(solved):
    _, _, results, dense, _, shift, said, _ = solved
    estimate = dense.gain @ dense.values
    wanted = shift @ estimate[: len(dense.stations)]
    assert len(wanted) == len(results.stations)
    close(results.stations.gravity.values, wanted, MGAL, said.get("ties"))


def test_bias_and_drift_are_those_of_dense_least_squares(solved):
    rows, _, results, dense, known, shift, said, _ = solved
    estimate = dense.gain @ dense.values
    count = len(dense.stations)
    # What bias and drift put on a row together depends on the datum of its station only.
    border = dense.at_rows[:, count:] @ estimate[count:] + known
    station = dense.at_rows[:, :count] @ (estimate[:count] - shift @ estimate[:count])
    at = [next(n for n, other in enumerate(rows) if other is row) for row in dense.used]
    columns = results.readings.estimates
    close((columns.run_bias.values + columns.drift.values)[at], border + station, MGAL, said.get("ties"))
    for run in {row.run for row in dense.used}:
        first = min((row for row in dense.used if row.run == run), key=lambda row: row.time)
        n = next(n for n, row in enumerate(rows) if row is first)
        assert columns.drift.values[n] == pytest.approx(0.0, abs=1e-18)


def test_covariance_of_gravity_and_its_origins(solved):
    rows, case, results, dense, _, shift, said, orders = solved
    count, parts = len(dense.stations), results.network.gravity
    total = dense.gain @ dense.variance @ dense.gain.T
    total = shift @ (total[:count, :count] + floor_of(results, dense, rows)) @ shift.T
    tie_at = slice(len(dense.used), len(dense.used) + dense.n_ties)
    answers = shift @ dense.gain[:count, tie_at] @ np.sqrt(dense.variance[tie_at, tie_at])
    close(parts.ties, answers, UGAL)
    independent = parts.independent().matrix()
    close(independent + parts.ties @ parts.ties.T, total, UGAL**2 * 1e2)
    close(results.stations.gravity_sd.values, np.sqrt(np.maximum(np.diag(total), 0.0)), UGAL * 1e3)
    # With biases, drift and tares held, the error of a station is that of its own visits. Ties are the datum:
    # they take over from it what they take over of the errors of the tied stations.
    adjustment, weight = results.network.adjustment, np.zeros(count)
    for v in range(len(adjustment.visits)):
        name = next(row.station for n, row in enumerate(rows) if adjustment.visits.of_row[n] == v)
        weight[dense.stations.index(name)] += 1.0 / (
            adjustment.noise.variance[v] + adjustment.reseating.variance[v]
        )
    spread = np.eye(count)
    for number, name in enumerate(said.get("ties") or {}):
        spread[:, dense.stations.index(name)] -= dense.gain[:count, len(dense.used) + number]
    reading = shift @ (spread @ np.diag(1.0 / weight) @ spread.T + floor_of(results, dense, rows)) @ shift.T
    close(parts.reading.matrix(), reading, UGAL**2 * 1e2)
    for one in (parts.reading, parts.drift, parts.tare):
        assert np.linalg.eigvalsh(one.matrix()).min() > -1e-7 * UGAL**2
    if not said.get("ties") and len(set(np.diag(shift))) <= 2:
        held, _ = dense_network(
            rows, results, orders=orders, instruments=(A, B), tares=said.get("tares", ()), drop=("tare",)
        )
        without = held.gain @ held.variance @ held.gain.T
        without = shift @ (without[:count, :count] + floor_of(results, dense, rows)) @ shift.T
        close(parts.tare.matrix(), total - without, UGAL**2 * 1e2)
        close(parts.drift.matrix(), without - reading, UGAL**2 * 1e2)


def test_what_is_left_at_each_reading(solved):
    rows, _, results, dense, _, _, said, _ = solved
    columns, adjustment = results.readings.estimates, results.network.adjustment
    n = len(dense.used)
    at = np.array([next(k for k, row in enumerate(rows) if row is one) for one in dense.used])
    hat = dense.at_rows @ dense.gain
    left = np.eye(n, hat.shape[1]) - hat
    off = left @ dense.values
    visits = dense.visit[:, None] == dense.visit
    seat = adjustment.reseating.variance[adjustment.visits.of_row[at]]
    # The best linear prediction of a visit's effect: its covariance with the readings through their inverse.
    noise = dense.variance[:n, :n]
    blup = (seat[:, None] * visits) @ np.linalg.inv(noise)
    close(columns.visit_effect.values[at], blup @ off, MGAL, said.get("ties"))
    rest = left - blup @ left
    close(columns.residual.values[at], rest @ dense.values, MGAL, said.get("ties"))
    variance = np.diag(rest @ dense.variance @ rest.T)
    checked = variance > 1e-7 * np.diag(noise - seat[:, None] * visits)
    standardised = columns.standardised.values[at]
    np.testing.assert_allclose(
        standardised[checked], (rest @ dense.values)[checked] / np.sqrt(variance[checked]), rtol=1e-6,
        atol=3e-5 if said.get("ties") else 1e-6,  # rounding of absolute gravity over an sd of some uGal
    )
    assert np.isnan(standardised[variance < 1e-11 * np.diag(noise)]).all()
    np.testing.assert_allclose(columns.redundancy.values[at], 1.0 - np.diag(hat[:, :n]), rtol=0, atol=1e-8)


def test_rows_out_of_use_are_predicted_but_do_not_count():
    rows, said, orders, _, _ = scenario("unused rows")
    results = reduce(made_case(rows, instruments=(A, B)))
    columns, use = results.readings.estimates, np.array([row.use for row in rows])
    gravity = dict(zip(results.stations.label, results.stations.gravity.values, strict=True))
    for n in np.flatnonzero(~use):
        row = rows[n]
        predicted = gravity[row.station] + columns.run_bias.values[n] + columns.drift.values[n]
        assert columns.residual.values[n] == pytest.approx(row.reading - predicted, abs=1e-15)
        assert np.isnan(columns.visit_effect.values[n]) and np.isnan(columns.redundancy.values[n])
    moved = [row if row.use else replace(row, reading=row.reading + 1.0) for row in rows]
    again = reduce(made_case(moved, instruments=(A, B)))
    np.testing.assert_array_equal(again.stations.gravity.values, results.stations.gravity.values)


def test_redundancy_is_the_answer_to_a_change_of_one_reading():
    rows, _, _, _, _ = scenario("two runs")
    case = made_case(rows, instruments=(A,), noise="as_given", drift_order=1)
    results = reduce(case)
    columns = results.readings.estimates
    gravity = dict(zip(results.stations.label, results.stations.gravity.values, strict=True))
    for n in (0, 3, 7, len(rows) - 1):
        step = 1 * MGAL
        changed = [replace(row, reading=row.reading + step * (m == n)) for m, row in enumerate(rows)]
        again = reduce(made_case(changed, instruments=(A,), noise="as_given", drift_order=1))
        other = dict(zip(again.stations.label, again.stations.gravity.values, strict=True))
        rise = (
            other[rows[n].station] - gravity[rows[n].station]
            + again.readings.estimates.run_bias.values[n] - columns.run_bias.values[n]
            + again.readings.estimates.drift.values[n] - columns.drift.values[n]
        )
        assert columns.redundancy.values[n] == pytest.approx(1.0 - rise / step, abs=1e-8)
