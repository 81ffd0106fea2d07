"""Reading and re-seating noise: the restricted likelihood maximised directly, and the rules for few repeats."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from made_surveys import Row, loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
DEPTH = {name: 60.0 * number for number, name in enumerate("ABCDEF")}
GRAVITY = {name: 0.08 * MGAL * depth for name, depth in DEPTH.items()}
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=5 * UGAL, drift_rate_sd=0.05 * MGAL / HOUR)
MAKE = {"depth": DEPTH, "gravity": GRAVITY}


def whole_design(rows, adjustment):
    """Design, variances without re-seating, and values of the visit means, mGal and hours."""
    visits = adjustment.visits
    lines, variances, values = [], [], []
    runs = sorted({row.run for row in rows})
    names = sorted({row.station for row in rows})
    start = {run: min(row.time for row in rows if row.run == run) for run in runs}
    width = len(names) + 2 * len(runs)
    for v in range(len(visits)):
        members = visits.rows[visits.start[v] : visits.start[v + 1]]
        sd = adjustment.noise.sd[visits.start[v] : visits.start[v + 1]] / MGAL
        share = sd**-2 / np.sum(sd**-2)
        line = np.zeros(width)
        for row, part in zip((rows[m] for m in members), share, strict=True):
            line[names.index(row.station)] += part
            line[len(names) + 2 * runs.index(row.run)] += part
            line[len(names) + 2 * runs.index(row.run) + 1] += part * (row.time - start[row.run]) / HOUR
        lines.append(line)
        variances.append(1.0 / np.sum(sd**-2))
        values.append(sum(rows[m].reading / MGAL * part for m, part in zip(members, share, strict=True)))
    design = np.array(lines)
    # A basis of what the visits determine: the level at least is open.
    _, sizes, right = np.linalg.svd(design)
    design = design @ right[sizes > 1e-9 * sizes[0]].T
    return design, np.array(variances), np.array(values)


def minus_log_likelihood(u2, design, variances, values):
    """Minus twice the restricted log likelihood, up to a constant (Patterson & Thompson 1971)."""
    v = variances + u2
    weighted = design / v[:, None]
    normal = design.T @ weighted
    solution = np.linalg.solve(normal, weighted.T @ values)
    rest = values - design @ solution
    return np.sum(np.log(v)) + np.linalg.slogdet(normal)[1] + np.sum(rest**2 / v)


@pytest.mark.parametrize("seed", range(24))
def test_reseating_maximises_the_restricted_likelihood(seed):
    chance = np.random.default_rng(seed)
    seat = chance.choice([0.0, 0.5, 4.0, 20.0]) * UGAL
    stops = ["ABCDCBA", "ABACADAEAFA", "ABCDEFEDCBA"][seed % 3]
    rows = loop(chance, stops, counts=(1, 2, 8), reseating=seat, reading_noise=4 * UGAL, **MAKE)
    rows += loop(
        chance, "ADEFEDA", run="2", start=86400.0, counts=(1, 3), reseating=seat, reading_noise=4 * UGAL, **MAKE
    )
    ties = {"A": (9.81 / 1e3, 5 * UGAL), "D": (9.81 / 1e3 + GRAVITY["D"], 3 * UGAL)} if seed % 2 else {}
    adjustment = reduce(made_case(rows, instruments=(METER,), ties=ties, drift_order=1)).network.adjustment
    found = adjustment.reseating.estimate / MGAL**2
    parts = whole_design(rows, adjustment)
    grid = np.concatenate([[0.0], np.geomspace(1e-10, 1e-2, 200)])
    heights = [minus_log_likelihood(one, *parts) for one in grid]
    best = int(np.argmin(heights))
    if best == 0:
        wanted = 0.0
    else:
        near = (np.log(grid[best]) - 0.2, np.log(grid[best]) + 0.2)
        fine = minimize_scalar(
            lambda x: minus_log_likelihood(np.exp(x), *parts), bounds=near, method="bounded", options={"xatol": 1e-9}
        )
        wanted = np.exp(fine.x)
    assert minus_log_likelihood(found, *parts) <= min(heights[best], minus_log_likelihood(wanted, *parts)) + 1e-9
    if best == 0:
        assert found == 0.0
    else:
        assert found == pytest.approx(wanted, rel=1e-4)


def test_both_answers_occur_in_those_surveys():
    kinds = set()
    for seed in range(8):
        chance = np.random.default_rng(seed)
        rows = loop(chance, "ABCDCBA", counts=(3,), reseating=0.0, reading_noise=4 * UGAL, **MAKE)
        rows += loop(chance, "ADCBA", counts=(3,), reseating=0.0, run="2", start=86400.0, **MAKE)
        seat = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment.reseating
        kinds.add(seat.estimate == 0.0)
        assert seat.freedom == 12 - 4 - 3 and not seat.few and seat.t_freedom == 5
    assert kinds == {True, False}


def test_few_degrees_of_freedom_blend_the_estimate_with_the_stated_noise():
    rows = loop(np.random.default_rng(3), "ABCBA", counts=(4,), **MAKE)
    seat = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment.reseating
    # Five visits; three stations, one drift: one bias is the datum's.
    assert (seat.freedom, seat.few, seat.t_freedom) == (1, True, 5)
    blend = (1 * seat.estimate + 4 * (5 * UGAL) ** 2) / 5
    np.testing.assert_allclose(seat.variance, blend, rtol=1e-12)


@pytest.mark.parametrize(("stops", "freedom", "few"), [("ABCABCABC", 5, False), ("ABCABCAB", 4, True)])
def test_the_rule_for_few_ends_at_five(stops, freedom, few):
    rows = loop(np.random.default_rng(4), stops, counts=(2,), **MAKE)
    results = reduce(made_case(rows, instruments=(METER,), drift_order=1))
    seat = results.network.adjustment.reseating
    assert (seat.freedom, seat.few) == (freedom, few)
    assert results.intervals.dof == (freedom + 4 if few else freedom)


def test_no_degree_of_freedom_leaves_the_stated_noise():
    rows = loop(np.random.default_rng(5), "ABCA", counts=(3,), **MAKE)
    results = reduce(made_case(rows, instruments=(METER,), drift_order=1))
    seat = results.network.adjustment.reseating
    assert (seat.freedom, results.intervals.dof) == (0, 4)
    np.testing.assert_allclose(seat.variance, (5 * UGAL) ** 2, rtol=1e-14)
    assert np.isnan(seat.estimate)


def test_ties_and_priors_add_no_degree_of_freedom():
    rows = loop(np.random.default_rng(6), "ABCDCBA", counts=(2,), **MAKE)
    free = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment.reseating
    ties = {name: (9.81 + GRAVITY[name], 5 * UGAL) for name in "ABD"}
    tied = reduce(made_case(rows, instruments=(METER,), drift_order=1, ties=ties)).network.adjustment.reseating
    assert free.freedom == tied.freedom == 7 - 4 - 1


@pytest.mark.parametrize("stops", ["ABCDEFEDCBA", "ABCDCBA"])
def test_a_wrong_expectation_of_drift_is_no_noise(stops):
    # The meter drifts forty times faster than it was expected to: repeats overrule that at once.
    fast = (2.0 * MGAL / HOUR,)
    rows = loop(np.random.default_rng(21), stops, counts=(3,), drift=fast, **MAKE)
    open_meter = replace(METER, drift_rate_sd=100.0 * MGAL / HOUR)
    expected, free = (
        reduce(made_case(rows, instruments=(one,), drift_order=1)).network.adjustment for one in (METER, open_meter)
    )
    np.testing.assert_allclose(expected.reseating.variance, free.reseating.variance, rtol=1e-3)
    (slope,) = (one for one in expected.design.unknowns if one.kind == "drift")
    value, _ = expected.unknown(slope)
    assert value / expected.basis.length[0] == pytest.approx(fast[0], rel=2e-3)


def test_wrong_ties_are_no_noise():
    rows = loop(np.random.default_rng(22), "ABCDEFEDCBA", counts=(3,), **MAKE)
    ties = {"A": (9.81, 5 * UGAL), "F": (9.81 + GRAVITY["F"] + 0.3 * MGAL, 5 * UGAL)}
    free, tied = (
        reduce(made_case(rows, instruments=(METER,), drift_order=1, ties=one)).network.adjustment for one in ({}, ties)
    )
    np.testing.assert_allclose(tied.reseating.variance, free.reseating.variance, rtol=1e-5)


def test_single_readings_leave_all_noise_to_the_visits():
    rows = loop(np.random.default_rng(7), "ABCBA", counts=(1,), reading_sd=(6 * UGAL, 9 * UGAL, 7 * UGAL), **MAKE)
    adjustment = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment
    np.testing.assert_array_equal(adjustment.noise.sd, 2 * UGAL)
    assert not adjustment.noise.repeated
    stated = (5 * UGAL) ** 2 + np.median([row.reading_sd for row in rows]) ** 2
    blend = (adjustment.reseating.estimate + 4 * stated) / 5
    np.testing.assert_allclose(adjustment.reseating.variance, blend, rtol=1e-12)
    bare = [replace(row, reading_sd=np.nan) for row in rows]
    adjustment = reduce(made_case(bare, instruments=(METER,), drift_order=1)).network.adjustment
    blend = (adjustment.reseating.estimate + 4 * (5 * UGAL) ** 2) / 5
    np.testing.assert_allclose(adjustment.reseating.variance, blend, rtol=1e-12)


def scatter(rows, sds):
    """Weighted scatter within visits, over their degrees of freedom; drift taken out by the truth of the maker."""
    total, freedom = 0.0, 0
    times = [row.time for row in rows]
    edges = [0, *(n for n in range(1, len(rows)) if times[n] - times[n - 1] > 900.0), len(rows)]
    for a, b in zip(edges[:-1], edges[1:], strict=True):
        values = np.array([row.reading - 0.02 * MGAL / HOUR * row.time for row in rows[a:b]])
        weight = np.array(sds[a:b]) ** -2.0
        mean = np.sum(weight * values) / np.sum(weight)
        total += np.sum(weight * (values - mean) ** 2)
        freedom += b - a - 1
    return np.sqrt(total / freedom)


def test_reading_noise_is_the_scatter_within_visits():
    rows = loop(np.random.default_rng(8), "ABCDCBA", counts=(4, 6), reading_noise=7 * UGAL, **MAKE)
    noise = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment.noise
    assert np.ptp(noise.sd) == 0.0 and np.isnan(noise.scale)
    assert noise.sd[0] == pytest.approx(scatter(rows, [1.0] * len(rows)), rel=2e-3)
    assert noise.freedom == len(rows) - 7


def test_stated_sds_are_relative_weights():
    rows = loop(np.random.default_rng(9), "ABCDCBA", counts=(4, 6), reading_sd=(3 * UGAL, 8 * UGAL), **MAKE)
    scaled = [replace(row, reading_sd=10.0 * row.reading_sd) for row in rows]
    plain, tenfold = (
        reduce(made_case(one, instruments=(METER,), drift_order=1)).network.adjustment.noise for one in (rows, scaled)
    )
    assert plain.scale == pytest.approx(scatter(rows, [row.reading_sd for row in rows]), rel=2e-3)
    np.testing.assert_allclose(tenfold.sd, plain.sd, rtol=1e-12)
    assert tenfold.scale == pytest.approx(plain.scale / 10.0, rel=1e-12)
    np.testing.assert_allclose(plain.sd, plain.scale * np.array([row.reading_sd for row in rows]), rtol=1e-12)


def test_rows_without_a_stated_sd_take_the_median():
    rows = loop(np.random.default_rng(10), "ABCDCBA", counts=(4,), reading_sd=(3 * UGAL, 8 * UGAL, 9 * UGAL), **MAKE)
    rows = [replace(row, reading_sd=np.nan if n % 5 == 0 else row.reading_sd) for n, row in enumerate(rows)]
    noise = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment.noise
    stated = np.array([row.reading_sd for row in rows])
    filled = np.where(np.isnan(stated), np.nanmedian(stated), stated)
    np.testing.assert_allclose(noise.sd, noise.scale * filled, rtol=1e-12)


def test_no_reading_is_believed_better_than_its_floor():
    still = loop(np.random.default_rng(11), "ABCDCBA", counts=(4,), reading_noise=0.0, drift=(), **MAKE)
    noise = reduce(made_case(still, instruments=(METER,), drift_order=1)).network.adjustment.noise
    np.testing.assert_array_equal(noise.sd, 2 * UGAL)
    mixed = loop(np.random.default_rng(12), "ABCDCBA", counts=(4,), reading_sd=(0.1 * UGAL, 8 * UGAL), **MAKE)
    noise = reduce(made_case(mixed, instruments=(METER,), drift_order=1)).network.adjustment.noise
    stated = np.array([row.reading_sd for row in mixed])
    np.testing.assert_allclose(noise.sd, np.maximum(2 * UGAL, noise.scale * stated), rtol=1e-12)


def test_noise_as_given():
    rough = Instrument(name="B", reading_floor=6 * UGAL, reseating_sd=9 * UGAL)
    rows = loop(np.random.default_rng(13), "ABCDCBA", reading_sd=(1 * UGAL, 8 * UGAL), **MAKE)
    rows += loop(
        np.random.default_rng(14), "ADCA", run="2", start=86400.0, instrument="B", reading_sd=(3 * UGAL, 11 * UGAL),
        **MAKE,
    )
    adjustment = reduce(
        made_case(rows, instruments=(METER, rough), drift_order=1, noise="as_given")
    ).network.adjustment
    floor = [6 * UGAL if row.instrument == "B" else 2 * UGAL for row in rows]
    np.testing.assert_allclose(adjustment.noise.sd, np.maximum(floor, [row.reading_sd for row in rows]), rtol=1e-14)
    seats = [(9 * UGAL) ** 2 if run == 1 else (5 * UGAL) ** 2 for run in adjustment.visits.run]
    np.testing.assert_allclose(adjustment.reseating.variance, seats, rtol=1e-14)


def test_each_visit_has_the_stated_noise_of_its_own_instrument():
    rough = Instrument(name="B", reading_floor=6 * UGAL, reseating_sd=9 * UGAL)
    rows = loop(np.random.default_rng(15), "ABA", **MAKE)
    rows += loop(np.random.default_rng(16), "ABA", run="2", start=86400.0, instrument="B", **MAKE)
    adjustment = reduce(made_case(rows, instruments=(METER, rough), drift_order=1)).network.adjustment
    assert adjustment.reseating.freedom == 6 - 2 - 3
    for variance, run in zip(adjustment.reseating.variance, adjustment.visits.run, strict=True):
        stated = 9 * UGAL if run == 1 else 5 * UGAL
        assert variance == pytest.approx((adjustment.reseating.estimate + 4 * stated**2) / 5, rel=1e-12)


def test_a_run_of_one_instant_has_no_drift():
    rows = loop(np.random.default_rng(17), "ABCBA", **MAKE)
    lone = [Row(time=86400.0, reading=0.0, depth=0.0, station="A", run="2")] * 1
    adjustment = reduce(made_case([*rows, *lone], instruments=(METER,), runs=(Run(name="2", drift_order=2),)))
    assert adjustment.network.adjustment.orders == (1, 0)


def of_few(rows, doubles, off):
    """The rows, single readings a visit, with a second reading in some visits, off the first by so much each."""
    more = [
        replace(rows[n], time=rows[n].time + 30.0, reading=rows[n].reading + by)
        for n, by in zip(doubles, off, strict=True)
    ]
    return sorted([*rows, *more], key=lambda row: row.time)


def test_one_bad_second_reading_is_not_the_noise_of_all():
    """190 single readings of 5 microgal, one of them read again 60 microgal off: true sds are known."""
    chance = np.random.default_rng(31)
    singles = loop(chance, "ABCDE" * 38, counts=(1,), reading_noise=5 * UGAL, reseating=0.0, pause=600.0, **MAKE)
    meter = replace(METER, station_floor=0.1 * UGAL)
    results = reduce(made_case(of_few(singles, [77], [60 * UGAL]), instruments=(meter,), drift_order=1))
    fit = results.network.adjustment
    assert (fit.noise.freedom, fit.reseating.freedom) == (1, 190 - 5 - 1)
    np.testing.assert_array_equal(fit.noise.sd, 2 * UGAL)
    whole = np.sqrt(fit.noise.variance + fit.reseating.variance)
    # 184 degrees of freedom tell 5 microgal to a twentieth; the bad visit, 30 off, adds 900/184 to 25.
    assert np.median(whole) == pytest.approx(np.sqrt(25 + 900 / 184) * UGAL, rel=3.0 / np.sqrt(2 * 184))
    # A station less the datum: 38 visits each.
    sd = results.stations.gravity_sd.values[1:]
    np.testing.assert_allclose(sd, np.median(whole) * np.sqrt(2 / 38), rtol=0.02)


def test_the_same_scatter_of_many_readings_is_their_noise():
    chance = np.random.default_rng(31)
    singles = loop(chance, "ABCDE" * 38, counts=(1,), reading_noise=5 * UGAL, reseating=0.0, pause=600.0, **MAKE)
    off = [60 * UGAL, -50 * UGAL, 3 * UGAL, 40 * UGAL, 5 * UGAL]
    rows = of_few(singles, [20, 50, 77, 120, 160], off)
    noise = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment.noise
    drift = 0.02 * MGAL / HOUR * 30.0
    wanted = np.sqrt(sum((one - drift) ** 2 / 2.0 for one in off) / 5)
    assert noise.freedom == 5 and noise.sd[0] == pytest.approx(wanted, rel=2e-3)


@pytest.mark.parametrize("seed", range(12))
def test_few_readings_and_the_visits_tell_both_noises_together(seed):
    """The joint restricted likelihood by the whole design: at the noise found, as high as anywhere.

    Within 0.05 of twice its logarithm, a hundredth of what one sd of e would cost.
    """
    chance = np.random.default_rng(40 + seed)
    seat, noise = ((0.0, 6 * UGAL), (4 * UGAL, 3 * UGAL), (8 * UGAL, 2.5 * UGAL))[seed % 3]
    singles = loop(chance, "ABCDEF" * 6, counts=(1,), reading_noise=noise, reseating=seat, pause=900.0, **MAKE)
    doubles = chance.choice(36, 1 + seed % 4, replace=False).tolist()
    rows = of_few(singles, doubles, (np.sqrt(2.0) * noise * chance.standard_normal(len(doubles))).tolist())
    fit = reduce(made_case(rows, instruments=(METER,), drift_order=1)).network.adjustment
    assert fit.noise.freedom == len(doubles) < 5
    design, variances, values = whole_design(rows, fit)
    share = variances / (fit.noise.sd[0] / MGAL) ** 2
    squares = scatter(rows, [1.0] * len(rows)) ** 2 * len(doubles) / MGAL**2

    def height(e):
        fine = [minus_log_likelihood(u2, design, e**2 * share, values) for u2 in (0.0, *np.geomspace(1e-7, 1e-3, 80))]
        return len(doubles) * np.log(e**2) + squares / e**2 + min(fine)

    grid = np.geomspace(2e-4, 0.1, 80)  # from well under the floor of 2 microgal
    best = max(grid[int(np.argmin([height(one) for one in grid]))], 2e-3)
    assert height(fit.noise.sd[0] / MGAL) <= height(best) + 0.05


def test_without_a_visit_more_the_readings_alone_tell_their_noise():
    rows = loop(np.random.default_rng(32), "ABCA", counts=(1,), **MAKE)
    noise = reduce(made_case(of_few(rows, [1], [30 * UGAL]), instruments=(METER,), drift_order=1)).network
    drift = 0.02 * MGAL / HOUR * 30.0
    assert noise.adjustment.reseating.freedom == 0
    assert noise.adjustment.noise.sd[0] == pytest.approx((30 * UGAL - drift) / np.sqrt(2.0), rel=2e-3)
