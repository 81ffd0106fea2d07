"""Likelihoods and F of different drifts of the same visits, against dense matrices that know of no network."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.linalg import null_space
from scipy.stats import f as f_distribution

from made_surveys import HOUR, MICROGAL, loop, made_case
from plumbwell.reduction.model_comparison import (
    change_test,
    comparable_likelihood,
    drift_terms,
    information_criterion,
    same_levels,
    squares,
)
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run, Tare
from simulated_surveys import QUIET, SEVENTEEN, simulated, walk_covariance

UGAL = MICROGAL
DEPTH = {name: 60.0 * number for number, name in enumerate("ABCDEF")}
GRAVITY = {name: 8e-7 * depth for name, depth in DEPTH.items()}
# Hardly a prior of the drift's rate: what the visits say is what the solution says.
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL, drift_rate_sd=1e-6)


def two_runs(**more):
    """Two runs of two readings a stop, the first with a jump of 30 uGal midway."""
    rows = loop(np.random.default_rng(5), "ABCADEAFCAEBA", depth=DEPTH, gravity=GRAVITY, counts=(2,))
    jump = rows[14].time
    rows = [replace(row, reading=row.reading + 30 * UGAL * (row.time >= jump)) for row in rows]
    rows += loop(
        np.random.default_rng(6), "ACEBDFABCA", depth=DEPTH, gravity=GRAVITY, run="2", start=86400.0, counts=(2,)
    )
    return made_case(rows, instruments=(METER,), **more), jump


def dense(fit, reference, *, orders, tares=(), strength=0.0):
    """Log likelihood of the visits freed of stations and biases, integrated over drift and tares; y^T P y; the rank.

    By an orthonormal basis of everything that is orthogonal to stations and biases; the density of drift and tares is
    that of `comparable_likelihood`.
    """
    visits = fit.visits
    time = 0.5 * (visits.first + visits.last)
    runs, stations = np.unique(visits.run), np.unique(visits.station)
    levels = [visits.station == one for one in stations] + [visits.run == one for one in runs]
    start = np.array([visits.first[visits.run == one].min() for one in runs])
    past = (time - start[visits.run]) / HOUR
    # The mean over a stop of a power of time is not that of its mean time.
    apart = 0.5 * (visits.last - visits.first) / HOUR
    drift = []
    for run, order in zip(runs, orders, strict=True):
        for power in range(1, order + 1):
            drift.append((visits.run == run) * 0.5 * ((past - apart) ** power + (past + apart) ** power))
    drift += [((visits.run == run) & (visits.first >= at)).astype(float) for run, at in tares]
    columns = np.column_stack(drift)
    columns = columns / np.linalg.norm(columns, axis=0)
    covariance = np.diag(fit.noise.variance + fit.reseating.variance)
    for run in runs:
        mine = np.flatnonzero(visits.run == run)
        covariance[np.ix_(mine, mine)] += strength**2 * walk_covariance(past[mine] * HOUR)
    basis = null_space(np.column_stack(levels).astype(float).T)
    values, columns = basis.T @ fit.visit_mean, basis.T @ columns
    covariance, known = basis.T @ covariance @ basis, basis.T @ np.diag(reference) @ basis
    own = columns.T @ np.linalg.solve(covariance, columns)
    rest = values - columns @ np.linalg.solve(own, columns.T @ np.linalg.solve(covariance, values))
    left = float(rest @ np.linalg.solve(covariance, rest))
    prior = columns.T @ np.linalg.solve(known, columns)
    terms = np.linalg.slogdet(covariance)[1] + np.linalg.slogdet(own)[1] - np.linalg.slogdet(prior)[1]
    return -0.5 * (float(terms) + left), left, basis.shape[1]


def test_likelihoods_of_other_orders_and_tares_are_those_of_the_same_data():
    case, jump = two_runs(drift_walk="off")
    tare = Tare(run="1", time=jump)
    models = [((1, 1), ()), ((2, 1), ()), ((3, 2), ()), ((1, 1), ((0, jump),)), ((2, 3), ((0, jump),))]
    ours, theirs = [], []
    base = reduce(case).network.adjustment
    reference = base.noise.variance + base.reseating.variance
    for orders, tares in models:
        runs = tuple(Run(name=str(number + 1), drift_order=order) for number, order in enumerate(orders))
        survey = replace(case.survey, runs=runs, tares=(tare,) if tares else ())
        fit = reduce(survey).network.adjustment
        value, left, free = dense(fit, reference, orders=orders, tares=tares)
        ours.append(comparable_likelihood(fit, reference))
        theirs.append(value)
        assert drift_terms(fit) == sum(orders) + len(tares)
        assert fit.reseating.freedom + drift_terms(fit) == free
        assert squares(fit) == pytest.approx(left, rel=1e-6)
        expected = -2.0 * ours[-1] + (sum(orders) + len(tares) + 1) * np.log(free)
        assert information_criterion(fit, ours[-1], variances=1) == pytest.approx(expected, rel=1e-12)
    assert np.subtract(ours, ours[0]) == pytest.approx(np.subtract(theirs, theirs[0]), abs=1e-6)
    assert ours[3] - ours[0] > 5.0


def test_the_likelihood_of_a_walk_is_that_of_its_whole_covariance():
    one = wandering()
    off, on = (
        reduce(one.case, recipe=replace(one.case.chosen, drift_walk=walk, drift_order=1)).network.adjustment
        for walk in ("off", "on")
    )
    assert on.walk is not None
    reference = off.noise.variance + off.reseating.variance
    without = dense(off, reference, orders=(1,))
    with_walk = dense(on, reference, orders=(1,), strength=on.walk.strength)
    gain = comparable_likelihood(on, reference) - comparable_likelihood(off, reference)
    # Of the same fixed unknowns: no prior of the drift enters.
    assert gain == pytest.approx(on.likelihood - off.likelihood, abs=1e-9)
    share = left_out(on)
    assert gain == pytest.approx(with_walk[0] - without[0], abs=0.5 * share * (1.0 + with_walk[1]))
    assert gain > 20.0
    assert squares(on) == pytest.approx(with_walk[1], rel=share)


def left_out(fit):
    """Largest share of a visit's variance, in any mix of visits, that the modes which stand for a walk leave out.

    They leave less than a fiftieth of its sd at any visit: the trace bounds the largest eigenvalue.
    """
    return len(fit.visits) / 50.0**2


def wandering():
    """Three loops past nine stations with a wander of 25 uGal."""
    return simulated(replace(SEVENTEEN, wander=25e-8), 3, instrument=METER)


def restricted(fit, strength):
    """Log of the restricted likelihood of a single run of order 1, one reading a stop, by the whole covariance."""
    visits = fit.visits
    past = visits.first - visits.first.min()
    levels = [visits.station == one for one in np.unique(visits.station)] + [past / past.max()]
    basis = null_space(np.column_stack(levels).T)
    covariance = np.diag(fit.noise.variance + fit.reseating.variance) + strength**2 * walk_covariance(past)
    covariance, values = basis.T @ covariance @ basis, basis.T @ fit.visit_mean
    return -0.5 * float(np.linalg.slogdet(covariance)[1] + values @ np.linalg.solve(covariance, values))


def test_the_restricted_likelihood_compares_a_walk_on_and_off():
    one = wandering()
    off, on = (
        reduce(one.case, recipe=replace(one.case.chosen, drift_walk=walk, drift_order=1)).network.adjustment
        for walk in ("off", "on")
    )
    expected = restricted(on, on.walk.strength) - restricted(off, 0.0)
    assert on.likelihood - off.likelihood == pytest.approx(expected, abs=0.5 * left_out(on) * (1.0 + squares(on)))


def test_what_the_visits_leave_open_counts_on_neither_side():
    """A second run past stations of its own, each read once: its drift is the prior's, whatever the first run does."""
    rows = loop(np.random.default_rng(5), "ABCADEAFCAEBA", depth=DEPTH, gravity=GRAVITY, counts=(2,))
    below = {name: 400.0 + 60.0 * number for number, name in enumerate("GHIJ")}
    gravity = {name: 8e-7 * depth for name, depth in below.items()}
    rows += loop(np.random.default_rng(6), "GHIJ", depth=below, gravity=gravity, run="2", start=86400.0, counts=(2,))
    ours, theirs = [], []
    for order in (1, 2, 3):
        runs = (Run(name="1", drift_order=order), Run(name="2", drift_order=1))
        fit = reduce(made_case(rows, instruments=(METER,), drift_walk="off", runs=runs)).network.adjustment
        assert fit.rank.lacking == 1 and drift_terms(fit) == order
        reference = np.full(len(fit.visits), UGAL**2)
        ours.append(comparable_likelihood(fit, reference))
        theirs.append(dense(fit, reference, orders=(order, 0))[0])
    assert np.subtract(ours, ours[0]) == pytest.approx(np.subtract(theirs, theirs[0]), abs=1e-6)


def test_f_of_a_change_is_that_of_the_sums_of_squares():
    case, jump = two_runs(drift_walk="off", drift_order=1)
    low = reduce(case).network.adjustment
    high = reduce(replace(case.survey, tares=(Tare(run="1", time=jump),))).network.adjustment
    test = change_test(low, high)
    assert test == change_test(high, low)
    noise = high.noise.variance
    above = dense(high, noise, orders=(1, 1), tares=((0, jump),))[1]
    below = dense(high, noise, orders=(1, 1))[1]
    freedom = high.reseating.freedom
    assert (test.steps, test.freedom) == (1, freedom)
    assert test.f == pytest.approx((below - above) / (above / freedom), rel=1e-6)
    assert test.p == pytest.approx(f_distribution.sf(test.f, 1, freedom), rel=1e-9)


def test_models_that_do_not_lie_within_one_another_have_no_f():
    case, jump = two_runs(drift_walk="off")
    bent = reduce(replace(case.survey, runs=(Run(name="1", drift_order=3), Run(name="2", drift_order=1))))
    other = reduce(replace(case.survey, runs=(Run(name="1", drift_order=1), Run(name="2", drift_order=2))))
    assert change_test(bent.network.adjustment, other.network.adjustment) is None
    assert change_test(bent.network.adjustment, bent.network.adjustment) is None


def test_other_visits_are_other_data():
    one = simulated(QUIET, 1).case
    use = one.survey.readings.use.copy()
    use[4] = False
    fewer = replace(one.survey, readings=replace(one.survey.readings, use=use))
    first, second = (reduce(survey).network.adjustment for survey in (one.survey, fewer))
    assert same_levels(first, first) and not same_levels(first, second)
    assert change_test(first, second) is None
