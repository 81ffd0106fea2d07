"""Settle-down of visits: creep by plain least squares, the promised chance of a false word, and what is no creep."""

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from scipy import stats

from made_surveys import HOUR, MICROGAL, MILLIGAL, Row, loop, made_case
from plumbwell.reduction.chance import student_limit
from plumbwell.reduction.settling import CANNOT_TELL, settling
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

SD = 3.0 * MICROGAL
DEPTH = {name: 20.0 + 50.0 * place for place, name in enumerate("ABCDEFGHIJKLMNOPQRST")}
GRAVITY = {name: 0.06 * MILLIGAL * depth for name, depth in DEPTH.items()}


def settled(values, counts, *, sd=SD, every=60.0, rate_sd=0.0, estimate=True, floor=0.1 * MICROGAL):
    """Settling of visits with readings at even times."""
    start = np.concatenate([[0], np.cumsum(counts)])
    place = np.concatenate([np.arange(n) for n in counts])
    return settling(
        np.asarray(values, dtype=float), start=start, time=place * every, sd=np.full(len(place), sd),
        floor=np.full(len(place), floor), rate_sd=np.full(len(counts), rate_sd), estimate=estimate,
    )  # fmt: skip


def noise(chance, counts, creep=None):
    """Readings of visits with a level each; `creep` is what place adds, in microgal."""
    place = np.concatenate([np.arange(n) for n in counts])
    level = np.repeat(chance.normal(0.0, MILLIGAL, len(counts)), counts)
    return level + chance.normal(0.0, SD, len(place)) + (0.0 if creep is None else creep(place) * MICROGAL)


def test_creep_and_its_sd_are_those_of_a_plain_least_squares_fit():
    chance = np.random.default_rng(3)
    counts = np.array([3, 4, 7, 12])
    start = np.concatenate([[0], np.cumsum(counts)])
    values, sd = noise(chance, counts), chance.uniform(2.0, 5.0, counts.sum()) * MICROGAL
    time = np.sort(chance.uniform(0.0, 600.0, (counts.size, 12)), axis=1)
    time = np.concatenate([row[:n] for row, n in zip(time, counts, strict=True)])
    found = settling(
        values, start=start, time=time, sd=sd, floor=np.full(len(sd), 0.1 * MICROGAL),
        rate_sd=np.full(4, 5e-11), estimate=False,
    )  # fmt: skip
    for visit, (begin, end) in enumerate(pairwise(start.tolist())):
        # First reading and later half: a level, and a step at the first.
        rows = np.concatenate([[begin], np.arange(begin + counts[visit] // 2, end)])
        matrix = np.column_stack([np.ones(len(rows)), np.arange(len(rows)) == 0]) / sd[rows, None]
        solved = np.linalg.pinv(matrix) / sd[rows]
        step, variance = solved[1] @ values[rows], solved[1] ** 2 @ sd[rows] ** 2
        # A rate that errs by its sd bends the step by what a straight line of that slope would.
        variance += (5e-11 * (solved[1] @ time[rows])) ** 2
        assert found.creep[visit] == pytest.approx(step, rel=1e-9)
        assert found.sd[visit] == pytest.approx(np.sqrt(variance), rel=1e-9)
    assert found.freedom == np.inf and found.reading_factor == 1.0
    # Four visits share a chance of 1 %, to both sides.
    assert found.limit == pytest.approx(stats.norm.isf(0.01 / 8), rel=1e-12)


def test_noise_and_limit_come_from_the_plateaus():
    chance = np.random.default_rng(4)
    counts = np.array([1, 2, 3, 5, 6, 9])
    values = noise(chance, counts)
    found = settled(values, counts)
    rows, visit, time = [], [], []
    for n, begin in enumerate((np.cumsum(counts) - counts).tolist()):
        if counts[n] >= 3:
            late = np.arange(counts[n] // 2, counts[n])
            rows, visit, time = [*rows, *(begin + late)], [*visit, *np.full(late.size, n)], [*time, *late]
    # A level a plateau and one slope for all.
    matrix = np.column_stack([*(np.array(visit) == n for n in set(visit)), time]).astype(float)
    left = np.linalg.lstsq(matrix, values[rows], rcond=None)[1][0]
    freedom = len(rows) - matrix.shape[1]
    assert found.freedom == freedom == 2 + 3 + 3 + 5 - 5
    assert found.reading_factor * SD == pytest.approx(np.sqrt(left / freedom), rel=1e-9)
    assert found.limit == pytest.approx(stats.t.isf(0.01 / 4 / 2, freedom), rel=1e-9)
    np.testing.assert_array_equal(found.leave_out, [CANNOT_TELL] * 2 + [0] * 4)
    assert np.isnan(found.creep[:2]).all() and np.isfinite(found.creep[2:]).all()


@pytest.mark.parametrize("counts", [np.full(11, 3), np.full(40, 5), np.tile([1, 2, 3, 4, 5, 8], 10)])
def test_one_clean_survey_in_a_hundred_has_a_visit_named(counts):
    chance = np.random.default_rng(5)
    named = sum(bool(np.any(settled(noise(chance, counts), counts).leave_out > 0)) for _ in range(600))
    # As many as a binomial of 600 with 1 % exceeds once in a thousand; nor may the test be asleep.
    assert 0 < named <= stats.binom.isf(0.001, 600, 0.01)


def test_a_creep_that_visits_share_is_found_though_none_is_named():
    chance, counts = np.random.default_rng(11), np.full(60, 6)
    found = settled(noise(chance, counts, lambda place: 6.0 * (place == 0)), counts)
    shared = found.leave_out == 0
    assert np.count_nonzero(shared) > 55
    assert found.common == pytest.approx(np.mean(found.creep[shared]), rel=1e-9)
    sd = found.reading_factor * SD * np.sqrt((1.0 + 1.0 / 3.0) / np.count_nonzero(shared))
    assert found.common_sd == pytest.approx(sd, rel=1e-9)
    assert found.common == pytest.approx(6.0 * MICROGAL, abs=4.0 * sd)
    # Drift rates that err by 0.1 microgal a minute, all alike: four minutes from the first reading to the later half.
    doubtful = settled(noise(chance, counts), counts, rate_sd=0.1 * MICROGAL / 60.0)
    noisy = doubtful.reading_factor * SD * np.sqrt((1.0 + 1.0 / 3.0) / 60)
    assert doubtful.common_sd == pytest.approx(np.hypot(noisy, 0.4 * MICROGAL), rel=1e-6)


def test_settled_visits_share_a_creep_no_more_often_than_chance_has_it():
    chance, counts = np.random.default_rng(12), np.full(20, 5)
    beyond = 0
    for _ in range(1000):
        one = settled(noise(chance, counts), counts)
        beyond += abs(one.common) > one.common_sd * student_limit(0.05, freedom=one.freedom)
    low, high = stats.binom.ppf([0.0005, 0.9995], 1000, 0.05)
    assert low <= beyond <= high


def test_where_every_visit_creeps_the_noise_stays_that_of_the_readings_and_every_visit_is_named():
    chance, counts = np.random.default_rng(6), np.full(40, 6)
    found = settled(noise(chance, counts, lambda place: 60.0 * np.exp(-place / 1.0)), counts)
    # 40 plateaus of three readings less one slope: chi-square bounds of one in a thousand; the last tenth of the
    # creep, 60 exp(-3), bends the plateau by 1.1 of 3 microgal about its slope.
    low, high = np.sqrt(stats.chi2.ppf([0.0005, 0.9995], 79) / 79)
    bend = np.var(60.0 * np.exp(-np.arange(3, 6)) - np.polyval(np.polyfit(np.arange(3), 60.0 * np.exp(
        -np.arange(3.0, 6.0)), 1), np.arange(3)), ddof=0) * 3 / 2 / 9.0  # fmt: skip
    assert low < found.reading_factor / np.sqrt(1.0 + bend) < high
    assert np.all(found.leave_out >= 1)
    # 60, 22 and 8 microgal: two lie far off the plateau of 1.7, the third by twice its sd.
    assert np.all(found.leave_out >= 2) and np.mean(found.leave_out == 3) > 0.2
    assert np.mean(found.creep) == pytest.approx(58.2 * MICROGAL, abs=4 * 3.46 * MICROGAL / np.sqrt(40))
    assert np.mean(found.creep < 0) == 0.0


def test_as_many_first_readings_are_left_out_as_lie_off_the_plateau():
    chance, counts = np.random.default_rng(10), np.full(30, 8)
    values = noise(chance, counts)
    values[5 * 8 : 5 * 8 + 3] -= 60 * MICROGAL
    values[9 * 8] += 60 * MICROGAL
    found = settled(values, counts)
    assert np.flatnonzero(found.leave_out > 0).tolist() == [5, 9]
    assert found.leave_out[5] == 3 and found.leave_out[9] == 1
    assert found.creep[5] < 0.0 < found.creep[9]
    assert found.plateau[5] == pytest.approx(np.mean(values[43:48]), abs=1e-15)
    assert found.moved[5] == pytest.approx(np.mean(values[40:48]) - np.mean(values[43:48]), abs=1e-15)


@pytest.mark.parametrize("place", [1, 2, 3, 4, 5])
def test_one_bad_reading_after_the_first_is_no_creep(place):
    counts = np.full(30, 6)
    for seed in range(20):
        values = noise(np.random.default_rng(seed), counts)
        clean = settled(values, counts)
        values[4 * 6 + place] += 300 * MICROGAL
        found = settled(values, counts)
        # In the visit itself nothing is named; elsewhere nothing that was not before.
        assert found.leave_out[4] == 0 and np.all(found.leave_out <= clean.leave_out)
        # And one bad reading does not swell the noise by which the others are judged.
        assert found.reading_factor < 1.1 * clean.reading_factor


def test_few_visits_of_three_readings_can_hardly_tell():
    one = np.array([20.0, 0.0, 1.0]) * MICROGAL
    alone = settled(one, [3])
    assert alone.leave_out.tolist() == [CANNOT_TELL] and alone.limit == np.inf and alone.freedom == 0.0
    assert np.isnan(alone.creep[0]) and alone.plateau[0] == pytest.approx(7.0 * MICROGAL)
    two = settled(np.concatenate([one, [20 * MICROGAL, MICROGAL, -0.5 * MICROGAL]]), [3, 3])
    # Two plateaus of two readings less a slope: Student's t of 1 degree of freedom, which is a Cauchy deviate.
    assert np.all(two.leave_out == 0) and two.limit == pytest.approx(1.0 / np.tan(np.pi * 0.01 / 4))


def test_a_drift_rate_that_is_not_known_is_no_creep():
    chance, counts = np.random.default_rng(8), np.full(30, 6)
    sloped = noise(chance, counts, lambda place: -4.0 * place)
    assert np.count_nonzero(settled(sloped, counts).leave_out > 0) > 15
    assert np.all(settled(sloped, counts, rate_sd=4.0 * MICROGAL / 60.0).leave_out == 0)


def drifting(stops, rate):
    """A run of five readings a stop that drifts by so much, mGal/h, a minute between readings."""
    chance = np.random.default_rng(9)
    return loop(chance, stops, depth=DEPTH, gravity=GRAVITY, drift=(rate * MILLIGAL / HOUR,), counts=(5,))


@pytest.mark.parametrize(("stops", "rate"), [("ABCABCABCABCABC", 2.0), ("".join(DEPTH), 0.3)])
def test_drift_of_the_run_is_no_creep(stops, rate):
    # 2 mGal/h are 33 microgal a minute; a run without returns knows of its rate only what is stated, 0 +- 0.3 here.
    meter = Instrument(name="A", drift_rate_sd=0.3 * MILLIGAL / HOUR)
    settle = reduce(made_case(drifting(stops, rate), instruments=(meter,))).network.settling
    assert np.all(settle.leave_out == 0)
    if stops == "".join(DEPTH):
        # From the first reading to the middle of the last three there are three minutes.
        sd = np.hypot(3.0 * np.sqrt(4.0 / 3.0), 0.3 * 1000.0 * 3.0 / 60.0) * MICROGAL
        assert settle.sd == pytest.approx(sd, rel=0.05)


def test_creep_is_found_through_drift_tares_and_rows_out_of_use():
    rows = drifting("ABCABCABCABCABC", 2.0)
    rows[36] = replace(rows[36], use=False)
    rows[35] = replace(rows[35], reading=rows[35].reading + 60 * MICROGAL)
    rows.append(Row(time=rows[-1].time + 9e4, reading=rows[-1].reading, depth=DEPTH["C"], station="C", run="2"))
    results = reduce(made_case(rows))
    settle, visits = results.network.settling, results.network.visits
    (named,) = np.flatnonzero(settle.leave_out > 0).tolist()
    assert visits.rows[visits.start[named] : visits.start[named + 1]].tolist() == [35, 37, 38, 39]
    assert settle.leave_out[named] == 1 and settle.leave_out[-1] == CANNOT_TELL
    assert settle.creep[named] == pytest.approx(60 * MICROGAL, abs=4 * settle.sd[named])


def test_stated_noise_holds_where_the_recipe_says_so():
    rows = [replace(row, reading_sd=50 * MICROGAL) for row in drifting("ABCABCABCABC", 0.02)]
    rows[20] = replace(rows[20], reading=rows[20].reading + 100 * MICROGAL)
    assert np.count_nonzero(reduce(made_case(rows)).network.settling.leave_out > 0) == 1
    given = reduce(made_case(rows, noise="as_given")).network.settling
    assert given.freedom == np.inf and not np.any(given.leave_out)
    # First reading and the mean of the last three.
    assert given.sd[:-1] == pytest.approx(50 * MICROGAL * np.sqrt(4.0 / 3.0), rel=1e-3)
