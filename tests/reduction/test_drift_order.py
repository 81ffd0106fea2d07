"""The order of the drift polynomial: the F test itself, what it finds, and how seldom it errs."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import f as f_distribution

from made_surveys import loop, made_case
from plumbwell.reduction.candidates import more_drift
from plumbwell.reduction.design import design
from plumbwell.reduction.drift_order import EVERY_RUN, Comparison, chosen_orders
from plumbwell.reduction.network import NO_TIES, solve
from plumbwell.reduction.run_terms import RunTerms
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run
from simulated_surveys import Scheme, mixed_trips
from survey_errors import all_missed, orders_too_high, scaled_rms

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
DEPTH = {name: 60.0 * number for number, name in enumerate("ABCDEF")}
GRAVITY = {name: 0.08 * MGAL * depth for name, depth in DEPTH.items()}
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL)
MAKE = {"depth": DEPTH, "gravity": GRAVITY, "counts": (3,)}
RATE = 0.02 * MGAL / HOUR


def curved(size, hours):
    """Coefficients of a parabola that leaves its chord by `size` at half time."""
    length = hours * HOUR
    return (RATE - 4.0 * size / length, 4.0 * size / length**2)


def adjusted(rows, **more):
    """The adjustment of some rows."""
    return reduce(made_case(rows, instruments=(METER,), **more)).network.adjustment


def test_a_quadratic_of_ten_sd_is_found():
    stops = "ABCADEAFCAEBA"
    rows = loop(np.random.default_rng(1), stops, drift=curved(40 * UGAL, 6.5), **MAKE)
    adjustment = adjusted(rows)
    assert adjustment.orders == (2,)
    assert [(one.lower, one.higher, one.taken) for one in adjustment.tests] == [(1, 2, True), (2, 3, False)]


def test_a_cubic_that_hides_from_the_parabola_is_found_by_the_double_step():
    stops = "ABACADAEAFABACADA"
    length = 17 * 1920.0
    # The odd part about half time only: s (s - 1/2)(s - 1) of the scaled time.
    cubic = (RATE + 0.5 * 900 * UGAL / length, -1.5 * 900 * UGAL / length**2, 900 * UGAL / length**3)
    adjustment = adjusted(loop(np.random.default_rng(2), stops, drift=cubic, **MAKE))
    steps = [(one.lower, one.higher, one.taken) for one in adjustment.tests]
    assert adjustment.orders == (3,)
    assert steps in ([(1, 2, False), (1, 3, True)], [(1, 2, True), (2, 3, True)])


def test_a_straight_drift_is_seldom_called_curved():
    raised = 0
    for seed in range(100):
        rows = loop(np.random.default_rng(1000 + seed), "ABCADCABDA", **(MAKE | {"counts": (1,)}))
        raised += adjusted(rows).orders != (1,)
    assert raised < 5


def test_runs_are_tested_one_by_one():
    stops = "ABCADEAFCAEBA"
    rows = loop(np.random.default_rng(3), stops, **MAKE)
    rows += loop(np.random.default_rng(4), stops, run="2", start=86400.0, drift=curved(60 * UGAL, 6.5), **MAKE)
    rows += loop(np.random.default_rng(5), stops, run="3", start=2 * 86400.0, **MAKE)
    adjustment = adjusted(rows)
    assert adjustment.orders == (1, 2, 1)
    assert [one.run for one in adjustment.tests] == sorted(one.run for one in adjustment.tests)


def test_a_run_with_a_given_order_keeps_it():
    stops = "ABCADEAFCAEBA"
    rows = loop(np.random.default_rng(6), stops, drift=curved(60 * UGAL, 6.5), **MAKE)
    rows += loop(np.random.default_rng(7), stops, run="2", start=86400.0, **MAKE)
    adjustment = adjusted(rows, runs=(Run(name="1", drift_order=1), Run(name="2", drift_order="auto")))
    assert adjustment.orders == (1, 1)
    assert {one.run for one in adjustment.tests} == {1}
    assert adjusted(rows, drift_order=3).orders == (3, 3)


@pytest.mark.parametrize(("stops", "tested"), [("ABCABCABC", True), ("ABCABCAB", True), ("ABCABCA", False)])
def test_no_order_is_tried_with_under_three_degrees_of_freedom(stops, tested):
    # Nine visits: 9 - 3 stations - 2 powers leave 4 for the parabola, 8 leave 3, 7 leave 2.
    rows = loop(np.random.default_rng(8), stops, drift=curved(500 * UGAL, 4.0), **MAKE)
    adjustment = adjusted(rows)
    assert bool(adjustment.tests) == tested


def plain_squares(adjustment, rows, order, weight):
    """Weighted sum of squares of visit means around stations and a polynomial, the rate prior counted."""
    visits = adjustment.visits
    names = sorted({row.station for row in rows})
    start, end = rows[0].time, rows[-1].time
    lines, values = [], []
    for v in range(len(visits)):
        members = visits.rows[visits.start[v] : visits.start[v + 1]]
        share = adjustment.noise.weight[visits.start[v] : visits.start[v + 1]]
        line = np.zeros(len(names) + order)
        for m, part in zip(members, share, strict=True):
            past = (rows[m].time - start) / (end - start)
            line[names.index(rows[m].station)] += part
            line[len(names) :] += part * past ** np.arange(1, order + 1)
        lines.append(line * np.sqrt(weight[v]))
        values.append(adjustment.visit_mean[v] * np.sqrt(weight[v]))
    sd = METER.drift_rate_sd * (end - start)
    prior = np.concatenate([np.zeros(len(names)), np.ones(order)]) / sd
    design = np.vstack([*lines, prior])
    values = np.array([*values, 0.0])
    scale = np.linalg.norm(design, axis=0)
    solution = np.linalg.lstsq(design / scale, values, rcond=None)[0]
    rest = values - design / scale @ solution
    return float(np.sum(rest[:-1] ** 2))


def test_the_test_statistic_is_the_ratio_it_says():
    stops = "ABCADEAFCAEBA"
    rows = loop(np.random.default_rng(9), stops, drift=curved(16 * UGAL, 6.5), **MAKE)
    automatic, given = adjusted(rows), adjusted(rows, drift_order=2)
    test = automatic.tests[0]
    # Weights of the higher order, for both.
    weight = given.solution.weight
    low, high = (plain_squares(given, rows, order, weight) for order in (1, 2))
    freedom = len(stops) - 6 - 2
    ratio = (low - high) / (high / freedom)
    assert (test.lower, test.higher, test.freedom) == (1, 2, (1, freedom))
    assert test.f == pytest.approx(ratio, rel=1e-6)
    assert test.p == pytest.approx(f_distribution.sf(ratio, 1, freedom), rel=1e-6)
    assert test.taken == (test.p < 0.01)


def everything(solution):
    """Weighted sum of squares of visits and priors."""
    priors = solution.design.priors
    off = (priors.of(solution.unknown[:, 0]) - priors.value) / priors.sd
    return solution.sum_of_squares() + float(off @ off)


@pytest.mark.parametrize("higher", [2, 3])
def test_columns_added_to_a_solution_leave_what_solving_anew_leaves(higher):
    """The quick comparison that surveys of many degrees of freedom take, at the same weights, prior included."""
    rows = loop(np.random.default_rng(3), "ABCADEAFCAEBA", drift=curved(40 * UGAL, 6.5), **MAKE)
    results = reduce(made_case(rows, instruments=(METER,), drift_order=1))
    fit, parts = results.network.adjustment, results.network.parts
    visits, weight = fit.visits, fit.noise.weight
    whole = design(fit.basis, visits, weight, n_stations=len(results.stations), orders=(higher,), dropped=parts.dropped)
    anew = solve(whole, fit.solution.weight, fit.visit_mean[:, None], NO_TIES)
    before, after = (everything(one) for one in (fit.solution, anew))
    gain = more_drift(RunTerms(fit.solution), fit.basis, visits, weight)[0][higher - 2]
    assert gain == pytest.approx(before - after, rel=1e-9)
    assert gain > 0.5 * before


def test_many_runs_are_tested_one_by_one_against_one_solution():
    """Forty runs of which one is curved, over three hundred degrees of freedom: that one is raised."""
    rows = []
    for run in range(40):
        drift = curved(60 * UGAL, 6.5) if run == 7 else (RATE, 0.0)
        rows += loop(np.random.default_rng(100 + run), "ABCADEAFCAEBA", run=f"r{run}", drift=drift, **MAKE)
    adjustment = adjusted(rows)
    assert adjustment.reseating.freedom > 300
    assert adjustment.orders[7] == 2 and sum(order > 1 for order in adjustment.orders) <= 4


def test_bends_that_no_run_shows_alone_are_found_together():
    """Four trips, two of them down and up past every station, all bent by ten sd: one run's cubic may pass for them."""
    scheme = Scheme(stops=mixed_trips(10, 4))
    found = all_missed(replace(scheme, bend=10.0 * scheme.visit_sd), range(1, 11))
    assert all(min(one.results.network.adjustment.orders) >= 2 for one in found)
    assert scaled_rms(found) < 1.25
    joint = found[0].results.network.adjustment.tests[0]
    assert (joint.run, joint.lower, joint.higher, joint.taken) == (EVERY_RUN, 1, 2, True)
    assert joint.freedom == (4, 60 - 10 - 3 - 4 * 2)
    (note, *_) = [one for one in found[0].results.findings if one.code == "drift_order_chosen"]
    assert note.place == "4 runs together" and "The drifts of 4 runs, raised together to order 2, are bent" in note.text


def test_straight_drifts_of_many_runs_are_seldom_called_curved():
    found = all_missed(Scheme(stops=mixed_trips(10, 4)), range(201, 251))
    # One survey in a hundred by the joint test, four runs each of one in a hundred by their own.
    assert np.mean([max(one.results.network.adjustment.orders) > 1 for one in found]) <= 0.12
    assert orders_too_high(found, 1) < 0.05


def squares_of(truth, freedom):
    """Sums of squares that each run's missing bend adds to, by the noise of all."""

    def compare(lower, higher):
        low = sum(bend for order, bend in zip(lower, truth, strict=True) if order < 2)
        high = sum(bend for order, bend in zip(higher, truth, strict=True) if order < 2)
        left = freedom - sum(higher)
        return Comparison(low=left + low, high=left + high, freedom=left)

    return compare


def test_runs_whose_own_bend_is_chance_are_lowered_again():
    # Alone, 12/(59.5/35) = 7.1 with 1 and 35 degrees of freedom has p = 0.012; the rest is noise to it.
    squares = squares_of((12.0, 0.5, 12.0, 12.0), 40)
    assert not squares((1, 1, 1, 1), (2, 1, 1, 1)).test(0, 1, 2, 1).taken
    orders, tests = chosen_orders((1, 1, 1, 1), (0, 1, 2, 3), squares)
    assert orders == (2, 1, 2, 2)
    assert tests[0].run == EVERY_RUN and tests[0].freedom == (4, 32)
    assert tests[0].f == pytest.approx(36.5 / 4.0, rel=1e-12)


def test_a_run_that_can_hold_no_parabola_does_not_keep_the_others_from_it():
    plain = squares_of((30.0, 25.0, 0.0), 40)

    def compare(lower, higher):
        return None if higher[2] > 1 else plain(lower, higher)

    orders, tests = chosen_orders((1, 1, 1), (0, 1, 2), compare)
    assert orders == (2, 2, 1)
    assert (tests[0].run, tests[0].freedom[0]) == (EVERY_RUN, 2)


def test_of_both_outcomes_the_one_stays_that_leaves_the_smaller_mean_square():
    """Run by run a cubic of the first run takes up nearly all; all parabolas together take up a little more or less."""
    for left, kept in ((20.0, (2, 2)), (60.0, (3, 1))):
        squares = {(1, 1): 200.0, (2, 1): 195.0, (3, 1): 40.0, (1, 2): 195.0, (2, 2): left, (3, 2): left, (3, 3): left,
                   (1, 3): 195.0, (2, 3): left}  # fmt: skip

        def compare(lower, higher, squares=squares):
            high = min(squares[lower], squares[higher])
            return Comparison(low=squares[lower], high=high, freedom=32 - sum(higher))

        orders, tests = chosen_orders((1, 1), (0, 1), compare)
        assert orders == kept
        assert tests[0].run == EVERY_RUN and tests[0].taken == (kept == (2, 2))
