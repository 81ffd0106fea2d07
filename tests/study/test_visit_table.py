"""Visits, drift lines and tares of the Drift stage against dense algebra written here, on plain rows.

Noise is as the instrument states it, so that every weight can be written down; all unknowns stand in one matrix, and
whatever the datum leaves open falls out of its pseudo-inverse.
"""

from dataclasses import dataclass

import numpy as np
import pytest

from made_surveys import Row, loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.study.visit_table import correlations, drift_lines, tares_in_force, visit_table
from plumbwell.survey.instrument import Instrument, Run, Tare
from reduced_surveys import MINE, SHAFT, WELL, reduced

UGAL, MGAL, HOUR, DAY = 1e-8, 1e-5, 3600.0, 86400.0
LABELS = "ABCDEFGHI"
DEPTH = {name: 80.0 * number for number, name in enumerate(LABELS)}
GRAVITY = {name: 0.09 * MGAL * depth + 3 * UGAL * (depth % 7) for name, depth in DEPTH.items()}
RATE, RATE_SD = 0.01 * MGAL / HOUR, 0.05 * MGAL / HOUR
METER = Instrument(
    name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL, drift_rate=RATE, drift_rate_sd=RATE_SD
)


@dataclass(kw_only=True)
class Dense:
    """The whole network: visits with their rows, design, values, variances, and what its pseudo-inverse gives."""

    visits: list
    names: list
    design: np.ndarray
    variance: np.ndarray
    values: np.ndarray
    estimate: np.ndarray
    covariance: np.ndarray
    known: np.ndarray

    @property
    def residual(self):
        """Values less their estimates, visits only."""
        return (self.values - self.design @ self.estimate)[: len(self.visits)]

    @property
    def residual_sd(self):
        """Sd of the residuals; NaN where the fit leaves nothing."""
        fitted = self.design @ self.covariance @ self.design.T
        n = len(self.visits)
        left = (np.diag(self.variance) - fitted).diagonal()[:n] / self.variance[:n]
        return np.where(left > 1e-8, np.sqrt(np.where(left > 1e-8, left, 0.0) * self.variance[:n]), np.nan)

    def functional(self, terms):
        """Row over all unknowns from {name: factor}."""
        return np.array([terms.get(name, 0.0) for name in self.names])


def drift_terms(run, past, order):
    """Unknowns that a time (h since the run's first reading) touches."""
    return {("bias", run): 1.0, **{("drift", run, power): past**power for power in range(1, order + 1)}}


def dense_of(rows, orders, tares=(), ties=None):
    """The network of some rows by one pseudo-inverse."""
    visits = []
    for row in rows:
        if visits and visits[-1][-1].run == row.run and visits[-1][-1].station == row.station:
            visits[-1].append(row)
        else:
            visits.append([row])
    first = {run: min(row.time for row in rows if row.run == run) for run in orders}
    last = {run: max(row.time for row in rows if row.run == run) for run in orders}
    names = [("station", one) for one in sorted({row.station for row in rows})]
    for run, order in orders.items():
        names += [("bias", run), *(("drift", run, power) for power in range(1, order + 1))]
    free = [n for n, tare in enumerate(tares) if tare.size is None or tare.size_sd is not None]
    names += [("tare", n) for n in free]
    lines, variance, values, known = [], [], [], []
    for visit in visits:
        terms = {("station", visit[0].station): 1.0, ("bias", visit[0].run): 1.0}
        held = 0.0
        for row in visit:
            past = (row.time - first[row.run]) / HOUR
            for power in range(1, orders[row.run] + 1):
                key = ("drift", row.run, power)
                terms[key] = terms.get(key, 0.0) + past**power / len(visit)
            if orders[row.run] == 0:
                held += RATE * HOUR * past / len(visit)
            for n, tare in enumerate(tares):
                if tare.run == row.run and row.time >= tare.time:
                    if n in free:
                        terms["tare", n] = terms.get(("tare", n), 0.0) + 1.0 / len(visit)
                    else:
                        held += tare.size / len(visit)
        lines.append([terms.get(name, 0.0) for name in names])
        variance.append(METER.reading_floor**2 / len(visit) + METER.reseating_sd**2)
        values.append(np.mean([row.reading for row in visit]) - held)
        known.append(held)
    for name, (gravity, sd) in (ties or {}).items():
        lines.append([float(one == ("station", name)) for one in names])
        variance.append(sd**2)
        values.append(gravity)
    for run, order in orders.items():
        if order:
            length = (last[run] - first[run]) / HOUR
            lines.append(
                [length ** (one[2] - 1) if one[:2] == ("drift", run) else 0.0 for one in names]
            )
            variance.append((RATE_SD * HOUR) ** 2)
            values.append(RATE * HOUR)
    for n in free:
        if tares[n].size is not None:
            lines.append([float(one == ("tare", n)) for one in names])
            variance.append(tares[n].size_sd ** 2)
            values.append(tares[n].size)
    design, variance, values = np.array(lines), np.array(variance), np.array(values)
    white = design / np.sqrt(variance)[:, None]
    scale = 1.0 / np.linalg.norm(white, axis=0)
    gain = scale[:, None] * np.linalg.pinv(white * scale, rcond=1e-11)
    return Dense(
        visits=visits, names=names, design=design, variance=variance, values=values,
        estimate=gain @ (values / np.sqrt(variance)), covariance=gain @ gain.T, known=np.array(known),
    )


def next_stop(rows, n):
    """Time of the first reading of the stop after row n."""
    return next(row.time for row in rows[n:] if row.station != rows[n].station)


def scenario(name):
    """Rows, drift orders by run, tares, ties."""
    chance = np.random.default_rng(sum(map(ord, name)))
    make = {"depth": DEPTH, "gravity": GRAVITY, "counts": (2, 3)}
    one = loop(chance, "ABCDCBA", **make)
    two = loop(chance, "ADEFEDA", run="2", start=DAY, bias=3 * MGAL, **make)
    both, orders, tares, ties = [*one, *two], {"1": 1, "2": 1}, (), {}
    match name:
        case "one run":
            both, orders = one, {"1": 1}
        case "nothing repeated":
            both, orders = loop(chance, "ABCD", **make), {"1": 1}
        case "order 0 at the expected rate":
            orders = {"1": 0, "2": 2}
        case "order 3":
            orders = {"1": 3, "2": 1}
        case "tied":
            ties = {"C": (9.81, 5 * UGAL)}
        case "tied at two":
            ties = {"A": (9.81, 5 * UGAL), "F": (9.81 + GRAVITY["F"], 4 * UGAL)}
        case "free tare":
            tares = (Tare(run="1", time=next_stop(one, 8)),)
        case "stated tare":
            tares = (
                Tare(run="2", time=next_stop(two, 9)),
                Tare(run="1", time=next_stop(one, 8), size=20 * UGAL, size_sd=5 * UGAL),
            )
        case "held tare":
            tares = (Tare(run="2", time=next_stop(two, 9), size=-30 * UGAL),)
        case "parts apart":
            third = loop(chance, "GHIHG", run="3", start=2 * DAY, **make)
            both, orders = [*both, *third], {**orders, "3": 1}
            ties = {"C": (9.81, 5 * UGAL)}
    return both, orders, tares, ties


NAMES = (
    "one run", "two runs", "nothing repeated", "order 0 at the expected rate", "order 3", "tied", "tied at two",
    "free tare", "stated tare", "held tare", "parts apart",
)  # fmt: skip


@pytest.fixture(params=NAMES, scope="module")
def solved(request):
    """One network by the chain and by dense algebra."""
    rows, orders, tares, ties = scenario(request.param)
    runs = tuple(Run(name=run, drift_order=order) for run, order in orders.items())
    results = reduce(
        made_case(rows, instruments=(METER,), runs=runs, tares=tares, ties=ties, noise="as_given")
    )
    return results, dense_of(rows, orders, tares, ties), rows, orders, tares, ties


def assert_close(got, wanted, scale=UGAL, *, tied=False):
    """Agreement to a millionth of a microgal; with gravity near 10 m/s2 rounding takes a little more."""
    np.testing.assert_allclose(got, wanted, rtol=0, atol=1e-6 * scale + (3e-14 if tied else 0.0))


def test_visits_are_the_stops_with_their_mean_time_and_count(solved):
    results, dense, *_ = solved
    table = visit_table(results)
    assert table.count.tolist() == [len(visit) for visit in dense.visits]
    np.testing.assert_allclose(
        table.time, [np.mean([row.time for row in visit]) for visit in dense.visits], rtol=0, atol=1e-6
    )
    stops = [visit[0].station for visit in dense.visits]
    assert table.repeated.tolist() == [stops.count(one) > 1 for one in stops]
    assert_close(table.level_sd, np.sqrt(dense.variance[: len(dense.visits)]))


def test_residuals_and_their_sd_are_those_of_the_dense_network(solved):
    results, dense, _, _, _, ties = solved
    table = visit_table(results)
    assert_close(table.residual, dense.residual, tied=bool(ties))
    unchecked = np.isnan(dense.residual_sd)
    assert np.isnan(table.residual_sd).tolist() == unchecked.tolist()
    assert_close(table.residual_sd[~unchecked], dense.residual_sd[~unchecked])
    assert_close(table.residual[unchecked], 0.0, tied=bool(ties))


def test_a_level_is_the_visit_less_bias_and_gravity_of_its_station(solved):
    results, dense, _, _, _, ties = solved
    table = visit_table(results)
    level = []
    for n, visit in enumerate(dense.visits):
        fixed = dense.functional({("station", visit[0].station): 1.0, ("bias", visit[0].run): 1.0})
        level.append(dense.values[n] + dense.known[n] - fixed @ dense.estimate)
    assert_close(table.level, level, tied=bool(ties))


def spans_of(run, tares):
    """The stretches of a run between its tares."""
    edges = [-np.inf, *sorted(tare.time for tare in tares if tare.run == run), np.inf]
    return list(zip(edges[:-1], edges[1:], strict=True))


def test_drift_lines_with_tares_are_those_of_the_dense_network(solved):
    results, dense, rows, orders, tares, ties = solved
    names = results.survey.readings.run.names
    lines = {names[one.run]: one for one in drift_lines(results)}
    assert list(lines) == list(orders)
    for run, line in lines.items():
        times = [row.time for row in rows if row.run == run]
        assert line.time[0] == times[0] and line.time[-1] == times[-1] and (np.diff(line.time) > 0).all()
        assert line.drift[0] == 0.0
        wanted = []
        for time in line.time:
            past = (time - times[0]) / HOUR
            terms = drift_terms(run, past, orders[run])
            del terms["bias", run]
            held = 0.0 if orders[run] else RATE * HOUR * past
            for n, tare in enumerate(tares):
                if tare.run == run and time >= tare.time:
                    terms["tare", n] = 1.0
                    held += tare.size if tare.size is not None and tare.size_sd is None else 0.0
            wanted.append(dense.functional(terms) @ dense.estimate + held)
        assert_close(line.drift, wanted, tied=bool(ties))


def test_the_band_is_the_sd_of_the_line_among_the_visits_that_tell_of_it(solved):
    results, dense, _, orders, tares, _ = solved
    names = results.survey.readings.run.names
    stops = [visit[0].station for visit in dense.visits]
    again = [stops.count(one) > 1 for one in stops]
    for line in drift_lines(results):
        run, start = names[line.run], line.time[0]
        for first, last in spans_of(run, tares):
            own = [
                n for n, visit in enumerate(dense.visits)
                if visit[0].run == run and any(first <= row.time < last for row in visit)
            ]  # fmt: skip
            own = [n for n in own if again[n] or np.isfinite(dense.residual_sd[n])] or own
            weight = 1.0 / dense.variance[own]
            mean = sum(
                share * dense.functional({("station", dense.visits[n][0].station): 1.0})
                for n, share in zip(own, weight / weight.sum(), strict=True)
            )
            inside = np.flatnonzero((line.time >= first) & (line.time < last))
            for at in inside.tolist():
                terms = drift_terms(run, (line.time[at] - start) / HOUR, orders[run])
                for n, tare in enumerate(tares):
                    if tare.run == run and line.time[at] >= tare.time:
                        terms["tare", n] = 1.0
                row = mean + dense.functional(terms)
                assert_close(line.sd[at], np.sqrt(row @ dense.covariance @ row))


def test_mean_rate_and_its_sd(solved):
    results, dense, rows, orders, _, _ = solved
    names = results.survey.readings.run.names
    for line in drift_lines(results):
        run = names[line.run]
        times = [row.time for row in rows if row.run == run]
        length = (max(times) - min(times)) / HOUR
        if orders[run] == 0:
            assert line.rate == RATE and np.isnan(line.rate_sd)
            continue
        row = dense.functional({("drift", run, p): length ** (p - 1) for p in range(1, orders[run] + 1)})
        assert_close(line.rate * HOUR, row @ dense.estimate, tied=True)
        assert_close(line.rate_sd * HOUR, np.sqrt(row @ dense.covariance @ row))


def test_sizes_of_tares_and_their_sd(solved):
    results, dense, _, _, tares, _ = solved
    found = tares_in_force(results)
    assert [one.tare for one in found] == sorted(tares, key=lambda one: one.time)
    for one in found:
        n = tares.index(one.tare)
        assert results.survey.readings.run.names[one.run] == one.tare.run
        if one.tare.size is not None and one.tare.size_sd is None:
            assert one.size == one.tare.size and one.sd is None
            continue
        row = dense.functional({("tare", n): 1.0})
        assert_close(one.size, row @ dense.estimate)
        assert_close(one.sd, np.sqrt(row @ dense.covariance @ row))


def one_station(times, *, chance, per_stop=1):
    """Rows of a meter that stands at A again and again, and goes away between."""
    return [
        Row(time=t, reading=0.02 * MGAL * t / HOUR + 4 * UGAL * chance.standard_normal(), depth=0.0, station="A")
        for t in times
    ]


def test_at_one_station_the_band_is_that_of_a_line_fitted_through_points():
    times = np.array([0.0, 2.0, 3.5, 7.0, 8.0]) * HOUR
    meter = Instrument(name="A", reading_floor=3 * UGAL, reseating_sd=4 * UGAL, drift_rate_sd=1e3 * MGAL / HOUR)
    rows = one_station(times, chance=np.random.default_rng(5))
    results = reduce(made_case(rows, instruments=(meter,), noise="as_given", drift_order=1))
    (line,) = drift_lines(results)
    off = times - times.mean()
    textbook = 5 * UGAL * np.sqrt(1 / len(times) + (line.time - times.mean()) ** 2 / (off @ off))
    np.testing.assert_allclose(line.sd, textbook, rtol=1e-6)
    slope = off @ [row.reading for row in rows] / (off @ off)
    assert line.rate == pytest.approx(slope, rel=1e-6)
    assert line.rate_sd == pytest.approx(5 * UGAL / np.sqrt(off @ off), rel=1e-6)


def test_stations_read_once_do_not_narrow_the_band():
    """The base is read first and last: at both ends the band is as wide as the base's own bars."""
    stops = "ABCDEFGHA"
    rows = [
        Row(time=n * HOUR, reading=GRAVITY[stop] + n * UGAL, depth=DEPTH[stop], station=stop)
        for n, stop in enumerate(stops)
    ]
    meter = Instrument(name="A", reading_floor=3 * UGAL, reseating_sd=4 * UGAL, drift_rate_sd=1e3 * MGAL / HOUR)
    results = reduce(made_case(rows, instruments=(meter,), noise="as_given", drift_order=1))
    (line,) = drift_lines(results)
    assert line.sd[[0, -1]] == pytest.approx([5 * UGAL] * 2, rel=1e-6)
    assert line.sd[len(line.sd) // 2] == pytest.approx(5 * UGAL / np.sqrt(2), rel=1e-6)


def test_no_choice_of_the_datum_changes_line_and_band():
    rows, orders, *_ = scenario("two runs")
    runs = tuple(Run(name=run, drift_order=order) for run, order in orders.items())
    bands = []
    for changed in ({}, {"datum_station": "E"}, {"ties": {"B": (9.81, 900 * UGAL)}}):
        results = reduce(made_case(rows, instruments=(METER,), runs=runs, noise="as_given", **changed))
        bands.append([np.concatenate([one.drift, one.sd]) for one in drift_lines(results)])
    for other in bands[1:]:
        for got, wanted in zip(other, bands[0], strict=True):
            assert_close(got, wanted, tied=True)
    assert min(one[97:].min() for one in bands[0]) > 1 * UGAL


def test_a_tare_that_parts_the_network_has_no_size():
    first, then = "ABCBA", "GHIHG"
    rows = loop(np.random.default_rng(3), first + then, depth=DEPTH, gravity=GRAVITY, counts=(2,))
    tare = Tare(run="1", time=rows[2 * len(first)].time)
    results = reduce(made_case(rows, instruments=(METER,), tares=(tare,), noise="as_given", drift_order=1))
    (one,) = tares_in_force(results)
    assert np.isnan(one.size) and one.sd is None
    (line,) = drift_lines(results)
    assert np.isfinite(line.sd).all() and line.sd.max() < 10 * UGAL
    at = results.readings.utc.values
    np.testing.assert_allclose(
        np.interp(at, line.time, line.drift), results.readings.estimates.drift.values, rtol=0, atol=1e-6 * UGAL
    )


def test_two_tares_that_no_reading_tells_apart_have_no_size():
    rows = loop(np.random.default_rng(3), "ABAB", depth=DEPTH, gravity=GRAVITY, counts=(2,))
    at = next_stop(rows, 2)
    tares = (Tare(run="1", time=at), Tare(run="1", time=at - 60.0))
    results = reduce(made_case(rows, instruments=(METER,), tares=tares, noise="as_given", drift_order=1))
    found = tares_in_force(results)
    assert [one.sd for one in found] == [None, None] and all(np.isnan(one.size) for one in found)
    (line,) = drift_lines(results)
    assert np.isfinite(line.sd).all() and np.nanmax(np.abs(line.drift)) < 500 * UGAL
    # No reading stands between them, and nothing is drawn there.
    between = (line.time >= at - 60.0) & (line.time < at)
    assert between.any() and np.isnan(line.drift).tolist() == between.tolist()


def test_a_run_with_one_instant_has_a_line_of_one_place():
    rows = loop(np.random.default_rng(4), "ABA", depth=DEPTH, gravity=GRAVITY)
    rows.append(Row(time=DAY, reading=GRAVITY["B"] + 5 * MGAL, depth=DEPTH["B"], station="B", run="2"))
    results = reduce(made_case(rows, instruments=(METER,), noise="as_given"))
    first, second = drift_lines(results)
    assert second.time.tolist() == [DAY] and second.drift.tolist() == [0.0]
    assert np.isnan(second.rate_sd) and second.sd[0] == pytest.approx(np.hypot(2 * UGAL, 4 * UGAL))
    assert len(first.time) > 50


@pytest.mark.parametrize("folder", [SHAFT, WELL, MINE], ids=lambda folder: folder.name)
def test_lines_pass_through_the_drift_column_and_bands_are_wider_at_the_ends(folder):
    results = reduced(folder)
    readings, used = results.readings, results.network.visits.of_row >= 0
    for line in drift_lines(results):
        own = used & (results.survey.readings.run.code == line.run)
        at = np.interp(readings.utc.values[own], line.time, line.drift)
        bend = 0.0 if results.network.adjustment.orders[line.run] < 2 else 0.05 * UGAL
        np.testing.assert_allclose(at, readings.estimates.drift.values[own], rtol=0, atol=1e-3 * UGAL + bend)
        assert (line.sd > 0.3 * UGAL).all() and line.sd.max() < 30 * UGAL


@pytest.mark.parametrize("folder", [SHAFT, WELL, MINE], ids=lambda folder: folder.name)
def test_correlations_of_neighbours_are_those_of_the_whole_covariance(folder):
    results = reduced(folder)
    matrix = results.intervals.errors.independent.matrix()
    sd = np.sqrt(np.diag(matrix))
    np.testing.assert_allclose(sd, results.intervals.density_sd.values, rtol=1e-9)
    n = len(results.intervals)
    for chosen in {0, n // 2, n - 1}:
        rows, found = correlations(results, chosen, 4)
        assert rows == tuple(range(max(chosen - 4, 0), min(chosen + 5, n)))
        at = np.array(rows)
        np.testing.assert_allclose(found, matrix[np.ix_(at, at)] / np.outer(sd[at], sd[at]), rtol=0, atol=1e-9)
        np.testing.assert_allclose(np.diag(found), 1.0, rtol=0, atol=1e-12)
