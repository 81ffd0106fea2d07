"""Networks of many runs: solved in bands, in one block, and by dense algebra, on invented surveys of 36 runs."""

import numpy as np
import pytest

from dense_networks import dense_network
from made_surveys import MICROGAL, MILLIGAL, made_case
from many_runs import METER, RUNS, WAYS, in_bands, many_runs
from plumbwell.reduction import datums
from plumbwell.reduction.design import MOST_RUNS
from plumbwell.reduction.restricted_likelihood import log_likelihood
from plumbwell.study.reduce import reduce

AGREEMENT = 1e-9
FIXED = {"noise": "as_given", "drift_order": 1, "drift_walk": "off"}


def reduced(one, *, wide, **changed):
    """The survey reduced, its border in many blocks or in one."""
    case = made_case(one.rows, instruments=(METER,), tares=one.tares, ties=one.ties, **{**FIXED, **changed})
    with pytest.MonkeyPatch.context() as patch:
        if wide:
            in_bands(patch)
        return reduce(case)


def datum(stations, one):
    """Every station less the highest of its part; tied parts stay."""
    matrix = np.eye(len(stations))
    for part, tied in zip(one.parts, one.tied, strict=True):
        for name in part if not tied else ():
            matrix[stations.index(name), stations.index(min(part))] -= 1.0
    return matrix


@pytest.fixture(params=WAYS, scope="module")
def three(request):
    """One survey, its results in bands and in one block, and by dense algebra; and the datum's matrix."""
    one = many_runs(request.param)
    wide, small = reduced(one, wide=True), reduced(one, wide=False)
    runs = sorted({row.run for row in one.rows})
    dense, _ = dense_network(
        one.rows, wide, orders=dict.fromkeys(runs, 1), instruments=(METER,), tares=one.tares, ties=one.ties
    )
    return request.param, one, wide, small, dense, datum(dense.stations, one)


def whole_covariance(results, dense, shift):
    """Covariance of gravity referred to its datum, station floors within."""
    adjustment, count = results.network.adjustment, len(dense.stations)
    total = dense.gain @ dense.variance @ dense.gain.T
    weight = np.bincount(
        adjustment.visits.station, 1.0 / (adjustment.noise.variance + adjustment.reseating.variance), minlength=count
    )
    floor = np.maximum(METER.station_floor**2 - 1.0 / weight, 0.0)
    assert floor.any()
    return shift @ (total[:count, :count] + np.diag(floor)) @ shift.T


def test_the_border_is_what_the_name_says(three):
    name, one, wide, small, _, _ = three
    shape = wide.network.adjustment.design.layout
    assert shape.count > 2 and (shape.corner == 1) == name.startswith("base")
    narrow = small.network.adjustment.design.layout
    assert (narrow.count, narrow.corner) == (1, 0)
    order = [what.run for what in wide.network.adjustment.design.unknowns if what.kind == "bias"]
    # The band follows time; where runs of far times share stations, or parts take turns, it does not.
    assert (order != sorted(order)) == (name in ("shuffled", "two parts"))
    if name.startswith("base"):
        assert RUNS > MOST_RUNS and sum(row.station == "S000" for row in one.rows) > RUNS


def test_gravity_and_what_is_left_are_those_of_dense_algebra(three):
    _, one, wide, small, dense, shift = three
    count = len(dense.stations)
    wanted = shift @ (dense.gain @ dense.values)[:count]
    hat = dense.at_rows @ dense.gain
    off = dense.values[: len(one.rows)] - hat @ dense.values
    for results in (wide, small):
        np.testing.assert_allclose(results.stations.gravity.values, wanted, rtol=0, atol=AGREEMENT * MILLIGAL)
        left = results.readings.estimates.residual.values + results.readings.estimates.visit_effect.values
        np.testing.assert_allclose(left, off, rtol=0, atol=AGREEMENT * MILLIGAL)
        redundancy = 1.0 - np.diag(hat[:, : len(one.rows)])
        np.testing.assert_allclose(results.readings.estimates.redundancy.values, redundancy, rtol=0, atol=1e-8)
    first, second = (one.readings.estimates for one in (wide, small))
    for name in ("run_bias", "drift", "residual"):
        np.testing.assert_allclose(
            getattr(first, name).values, getattr(second, name).values, rtol=0, atol=AGREEMENT * MILLIGAL
        )
    np.testing.assert_allclose(first.standardised.values, second.standardised.values, rtol=1e-6, atol=1e-6)


def test_variances_of_the_visits_estimates(three):
    _, _, wide, small, dense, _ = three
    rows = dense.mean @ dense.at_rows @ dense.gain
    wanted = np.diag(rows @ dense.variance @ rows.T)
    for results in (wide, small):
        found = results.network.adjustment.solution.variance_of_fit()
        np.testing.assert_allclose(found, wanted, rtol=1e-8)
    for one in (wide, small):
        solution = one.network.adjustment.solution
        inverse = solution.factor.whole()
        variance = solution.unknown_variance(np.arange(solution.design.size))
        np.testing.assert_allclose(np.sqrt(variance), np.sqrt(np.diag(inverse)), rtol=1e-9)


def test_drift_of_every_run_and_its_sd(three):
    _, _, wide, small, dense, _ = three
    total, values = dense.gain @ dense.variance @ dense.gain.T, dense.gain @ dense.values
    runs = sorted({row.run for row in dense.used})
    lengths = wide.network.adjustment.basis.length
    for results in (wide, small):
        adjustment = results.network.adjustment
        tried = 0
        for unknown in adjustment.design.unknowns:
            if unknown.kind != "drift":
                continue
            at = dense.kinds.index(("drift", runs[unknown.run], 1))
            value, sd = adjustment.unknown(unknown)
            hours = lengths[unknown.run] / 3600.0
            assert value == pytest.approx(values[at] * hours, abs=AGREEMENT * MILLIGAL)
            assert sd == pytest.approx(np.sqrt(total[at, at]) * hours, rel=1e-7)
            tried += 1
        assert tried == RUNS


def test_covariances_of_gravity(three):
    _, one, wide, small, dense, shift = three
    wanted = whole_covariance(wide, dense, shift)
    count = len(dense.stations)
    scale = 1e2 * AGREEMENT * MICROGAL**2
    neighbours = np.arange(count - 1)
    far = np.arange(count - 9)
    for results in (wide, small):
        parts = results.network.gravity
        independent, ties = parts.independent(), parts.ties @ parts.ties.T
        np.testing.assert_allclose(independent.matrix() + ties, wanted, rtol=0, atol=scale)
        np.testing.assert_allclose(independent.variance() + np.diag(ties), np.diag(wanted), rtol=0, atol=scale)
        for first, second in ((neighbours, neighbours + 1), (far, far + 9), (far + 9, far), (far, far)):
            got = independent.between(first, second) + ties[first, second]
            np.testing.assert_allclose(got, wanted[first, second], rtol=0, atol=scale)
        np.testing.assert_allclose(
            results.stations.gravity_sd.values, np.sqrt(np.maximum(np.diag(wanted), 0.0)), rtol=0,
            atol=1e3 * AGREEMENT * MICROGAL,
        )
    for origin in ("reading", "drift", "tare"):
        first, second = (getattr(results.network.gravity, origin).matrix() for results in (wide, small))
        np.testing.assert_allclose(first, second, rtol=0, atol=scale)
        assert bool(first.any()) or (origin == "tare" and not one.tares)
    at = [dense.stations.index(min(part)) for part, tied in zip(one.parts, one.tied, strict=True) if not tied]
    independent = wide.network.gravity.independent()
    assert (independent.variance()[at] == 0.0).all() and (independent.matrix()[at] == 0.0).all()
    for datum_station in at:
        here = np.full(count, datum_station)
        assert (independent.between(here, np.arange(count)) == 0.0).all()


@pytest.mark.parametrize("way", ["tares", "base, ties and tares"])
def test_what_tares_add_is_the_same_by_a_column_each_and_by_a_difference(way, monkeypatch):
    one = many_runs(way)
    by_columns = reduced(one, wide=True)
    monkeypatch.setattr(datums, "MANY_TARES", 0)
    by_difference = reduced(one, wide=True)
    for name in ("tare", "drift", "reading"):
        first, second = (getattr(each.network.gravity, name).matrix() for each in (by_columns, by_difference))
        np.testing.assert_allclose(second, first, atol=1e-9 * np.abs(first).max() + 1e-10 * METER.reading_floor**2)
    assert by_columns.network.gravity.tare.matrix().any()


def test_covariances_of_intervals(three):
    _, one, wide, small, dense, shift = three
    gravity = whole_covariance(wide, dense, shift)
    for results in (wide, small):
        parts = results.intervals.errors.parts
        answers = parts["reading"].terms[0][1]
        by = np.zeros((len(answers), len(gravity)))
        by[np.arange(len(by)), answers.first] = answers.by_first
        by[np.arange(len(by)), answers.second] += answers.by_second
        shared = np.column_stack([np.zeros(len(by)), *(
            factor for name, factor in results.intervals.errors.factors.items() if name.startswith("tie")
        )])  # fmt: skip
        wanted = by @ gravity @ by.T - shared @ shared.T
        scale = 1e-8 * np.abs(wanted).max()
        independent = parts["reading"] + parts["drift"] + parts["tare"]
        np.testing.assert_allclose(independent.matrix(), wanted, rtol=0, atol=scale)
        np.testing.assert_allclose(independent.variance(), np.diag(wanted), rtol=0, atol=scale)
        follower = parts["reading"].follower
        followed = np.flatnonzero(follower >= 0)
        assert len(followed) == len(by) - len(one.parts)
        want = np.zeros(len(by))
        want[followed] = wanted[followed, follower[followed]]
        np.testing.assert_allclose(independent.with_follower(), want, rtol=0, atol=scale)
        some = np.array([0, 5, 6, 11, len(by) - 1])
        np.testing.assert_allclose(independent.matrix(some), wanted[np.ix_(some, some)], rtol=0, atol=scale)
        np.testing.assert_allclose(
            independent.between(some, some[::-1]), wanted[some, some[::-1]], rtol=0, atol=scale
        )


def test_rank_and_determinant_do_not_depend_on_the_blocks(three):
    _, _, wide, small, dense, _ = three
    first, second = (one.network.adjustment for one in (wide, small))
    assert first.rank.rank == second.rank.rank and first.reseating.freedom == second.reseating.freedom
    # Rank of the visits alone, by singular values: ties and priors not counted.
    whole = dense.mean @ dense.at_rows
    whole = whole / np.linalg.norm(whole, axis=0)
    assert first.rank.rank == np.linalg.matrix_rank(whole, tol=1e-9)
    # Where ties hold the level it is another unknown that is held for the visits alone: a constant apart.
    gained = [
        log_likelihood(one.design, one.visit_mean, one.noise.variance + seat, rank=one.rank) - one.likelihood
        for one in (first, second)
        for seat in (0.0, (9 * MICROGAL) ** 2)
    ]
    np.testing.assert_allclose(gained[:2], gained[2:], rtol=0, atol=1e-7)
    assert gained[0] != pytest.approx(gained[1], abs=1.0)


@pytest.mark.parametrize(("way", "runs", "walk"), [("chain", 14, 2e-13), ("base", RUNS, "off")])
def test_estimated_noise_orders_and_walk_do_not_depend_on_the_blocks(way, runs, walk):
    one = many_runs(way, runs=runs)
    chosen = {"noise": "estimate", "drift_order": "auto", "drift_walk": walk}
    wide, small = (reduced(one, wide=flag, **chosen) for flag in (True, False))
    first, second = wide.network.adjustment, small.network.adjustment
    assert first.orders == second.orders and first.design.layout.count > 2
    assert (first.walk is not None) == (walk != "off")
    # A re-seating variance is settled to a millionth.
    np.testing.assert_allclose(first.reseating.variance, second.reseating.variance, rtol=1e-5)
    np.testing.assert_allclose(
        wide.stations.gravity.values, small.stations.gravity.values, rtol=0, atol=1e-5 * MICROGAL * 10
    )
    np.testing.assert_allclose(wide.stations.gravity_sd.values, small.stations.gravity_sd.values, rtol=2e-5)
    assert first.likelihood == pytest.approx(second.likelihood, abs=1e-5)
