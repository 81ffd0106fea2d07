"""Stated errors against the truth of invented surveys, and against an estimate that shares no code with the reduction.

Few surveys with fixed seeds; `tests/benchmarks/honest_errors.py` asks the same of hundreds. All limits follow from
the number of surveys: each is passed by chance by an honest program in 99.7 of 100 drawings or more.
"""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import HOUR, MICROGAL
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument
from simulated_surveys import (
    EVERY_FIFTH,
    FEW_RETURNS,
    NO_RETURN,
    QUIET,
    SEVENTEEN,
    VARIED,
    Scheme,
    best_estimate,
    honest_instrument,
    loops,
    simulated,
    trips,
    walk_covariance,
    walk_strength,
)
from survey_errors import all_missed, covered, orders_too_high, over_best, scaled_rms, whole_chi_square

SURVEYS = 60


@pytest.fixture(scope="module")
def every_fifth():
    """Surveys with a second pass and 25 degrees of freedom, reduced."""
    return all_missed(EVERY_FIFTH, range(SURVEYS))


@pytest.fixture(scope="module")
def few_returns():
    """Surveys with five returns to the base and nothing else twice, reduced."""
    return all_missed(FEW_RETURNS, range(SURVEYS))


def test_a_survey_without_noise_gives_the_true_densities():
    silent = replace(EVERY_FIFTH, reading_noise=0.0, reseating=0.0)
    # Nothing is known of the drift rate beforehand, or it would be drawn towards that.
    one = simulated(silent, 1, instrument=Instrument(name="A", drift_rate_sd=1.0))
    density = reduce(one.case).intervals.density.values
    # Readings near 1e-2 m/s2 are rounded to 2e-18, over 20 m that is 1e-10 kg/m3; gravity itself, near 10, to 1e-15.
    np.testing.assert_allclose(density, one.density, rtol=0, atol=1e-15 * 4.0 / (4.0 * np.pi * 6.6743e-11 * 20.0))


@pytest.mark.parametrize("stops", [EVERY_FIFTH.stops, trips(8, 3), loops(8, 4)], ids=["second pass", "trips", "loops"])
def test_with_given_noise_the_reduction_is_the_best_estimate(stops):
    scheme = Scheme(stops=stops, tares=1)
    given = replace(honest_instrument(scheme), station_floor=0.0)
    one = simulated(scheme, 3, instrument=given, list_tares=True, noise="as_given", drift_order=1, drift_walk="off")
    intervals, best = reduce(one.case).intervals, best_estimate(one)
    off = intervals.density.values - best.density
    assert np.abs(off).max() < 1e-6 * np.sqrt(np.diag(best.covariance)).max()
    np.testing.assert_allclose(
        intervals.errors.independent.matrix(), best.covariance, rtol=0, atol=1e-8 * best.covariance.max()
    )


@pytest.mark.parametrize(
    "scheme",
    [
        replace(EVERY_FIFTH, bend=50 * MICROGAL, readings=2), replace(SEVENTEEN, wander=12 * MICROGAL),
        replace(QUIET, tares=2), Scheme(stops=trips(10, 4), readings=3, gross_share=0.03), NO_RETURN,
    ],
    ids=["bend", "wander", "tares", "gross errors", "no return"],
)  # fmt: skip
def test_the_best_estimate_is_as_good_as_it_says(scheme):
    # Chi-square of the whole covariance: the mean of n values with k degrees of freedom each is 1 +- sqrt(2/(k n)).
    n, squares = 200, []
    for seed in range(n):
        one = simulated(scheme, seed)
        best = best_estimate(one)
        off = best.density - one.density
        squares.append(off @ np.linalg.solve(best.covariance, off) / len(off))
    assert abs(np.mean(squares) - 1.0) < 3.0 * np.sqrt(2.0 / (n * (scheme.stations - 1)))


def test_a_walk_wanders_as_much_as_its_strength_says():
    # Mean square about the best line of a dense walk over ten hours, by the covariance of all its points.
    past = np.linspace(0.0, 10.0 * HOUR, 801)
    line = np.linalg.qr(np.column_stack([np.ones(801), past]))[0]
    left = np.eye(801) - line @ line.T
    strength = walk_strength(12 * MICROGAL, 10.0 * HOUR)
    square = np.trace(left @ walk_covariance(past)) / 801 * strength**2
    assert np.sqrt(square) == pytest.approx(12 * MICROGAL, rel=2.0 / 801)


def test_densities_are_as_good_as_with_the_true_noise():
    # The criterion itself: 1.10. Were all orders right, both would be one to a thousandth.
    found = [one for scheme in VARIED.values() for one in all_missed(scheme, range(8), list_tares=True)]
    assert over_best(found) < 1.10


def test_errors_over_their_sds_are_near_one(every_fifth):
    # Each survey's chi-square is F with k = 29 and nu = 25, and that times (nu - 2)/nu has mean 1 and variance
    # 2 (k + nu - 2)/(k (nu - 4)).
    k, nu = 29, 25
    assert {one.results.intervals.dof for one in every_fifth} <= {nu, nu - 1, nu - 2}
    variance = 2.0 * (k + nu - 2.0) / (k * (nu - 4.0))
    assert abs(whole_chi_square(every_fifth) - 1.0) < 3.0 * np.sqrt(variance / SURVEYS)
    # The mean square of Student's t is nu/(nu - 2). Errors of neighbours go together and all share one noise estimate:
    # a survey's mean square counts as at least k/3 independent ones, and varies by the noise estimate besides.
    mean, sd = nu / (nu - 2.0), np.sqrt((2.0 * 3.0 / k + 2.0 / nu) / SURVEYS)
    assert abs(scaled_rms(every_fifth) ** 2 - mean) < 3.0 * mean * sd


def test_limits_hold_where_few_degrees_of_freedom_tell_the_noise(few_returns):
    # Were a survey's intervals all in or all out together, the share of surveys would be within 3 sd of 95 %.
    assert covered(few_returns) > 0.95 - 3.0 * np.sqrt(0.95 * 0.05 / SURVEYS)
    assert {one.results.network.adjustment.reseating.freedom for one in few_returns} <= {4, 3, 2}
    # The variance is the mean of an estimate with four degrees of freedom and the true one, sigma2 (c + 4)/8 with c a
    # chi-square of four. Mean and spread of 8/(c + 4) by its density c exp(-c/2)/4; a survey's mean square counts as
    # k/3 independent ones.
    c = np.linspace(0.0, 80.0, 100_001)
    chance = c * np.exp(-c / 2.0) / 4.0
    mean = np.trapezoid(chance * 8.0 / (c + 4.0), c)
    spread = np.trapezoid(chance * (8.0 / (c + 4.0)) ** 2, c) * (1.0 + 2.0 * 3.0 / 15) - mean**2
    assert abs(scaled_rms(few_returns) ** 2 - mean) < 3.0 * np.sqrt(spread / SURVEYS)


def test_a_pass_without_return_says_so_and_its_limits_hold():
    found = all_missed(NO_RETURN, range(SURVEYS))
    for one in found:
        assert {"no_repeat", "noise_untold"} <= {finding.code for finding in one.results.findings}
        assert one.results.intervals.dof == 4
    assert covered(found) > 0.95 - 3.0 * np.sqrt(0.95 * 0.05 / SURVEYS)
    # One drawn drift rate rules all errors of a survey: at worst a mean square of so many normal numbers.
    assert abs(scaled_rms(found) ** 2 - 1.0) < 3.0 * np.sqrt(2.0 / SURVEYS)


def test_linear_drift_is_found_linear(every_fifth, few_returns):
    from scipy.special import bdtr

    # At most 5 % are taken too high: so many of the surveys that more would come by chance once in a thousand.
    runs = 2 * SURVEYS
    most = next(count for count in range(runs) if bdtr(count, runs, 0.05) > 0.999)
    assert orders_too_high([*every_fifth, *few_returns], 1) * runs <= most


@pytest.mark.parametrize("scheme", [EVERY_FIFTH, SEVENTEEN, FEW_RETURNS], ids=["second pass", "loops", "few returns"])
def test_a_bend_of_ten_sd_is_found(scheme):
    from scipy.special import bdtr

    found = all_missed(replace(scheme, bend=10.0 * scheme.visit_sd), range(20))
    # At least 95 % are found: so many of twenty that fewer would come by chance once in a thousand.
    least = next(count for count in range(20) if bdtr(count, 20, 0.95) > 0.001)
    assert orders_too_high(found, 1) * 20 >= least
