"""Reading and re-seating noise against the analysis of variance and against a general-purpose statistics library.

* Searle, Casella & McCulloch 1992, Variance Components, sections 3.6 and 4.7 (cited from memory): in a balanced one-way
  layout restricted maximum likelihood gives the mean square within, and the difference of the mean squares over the
  number within, as long as that is not negative.
* statsmodels, `MixedLM` with `reml=True`: joint restricted likelihood of both components, stations as fixed effects,
  visits as random ones.
* Patterson & Thompson 1971, Biometrika 58, 545-554: the restricted likelihood, written out here with full matrices.

No drift (order 0). With readings y of visit v at station j, y = g_j + u_v + e, the restricted likelihood is a product
of one factor within visits, which knows e alone, and one of the visit means, which knows u^2 + e^2/n_v. The program
takes e from the first and then u from the second. Where all visits have equally many readings both factors are at
their maximum there, so that it must equal the joint estimate. Where they have not, the means tell of e too, a little:
then u must be that which maximises the joint likelihood at the program's e, to the program's own stopping rule, and
the joint maximum must lie no farther away than its own standard error.
"""

import numpy as np
import pytest
from scipy import optimize
from statsmodels.regression.mixed_linear_model import MixedLM

from made_surveys import MICROGAL, Row, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

METER = Instrument(name="A", reading_floor=1e-14, reseating_sd=1e-9)
DEPTH = {name: 50.0 * (place + 1) for place, name in enumerate("ABCDE")}
ROUNDS = 6
SETTLED = 1e-6
"""The program's stopping rule, relative to the variance of a visit mean: a millionth of it moves no density."""
OPTIMISER = 1e7 * np.finfo(float).eps
"""The library's optimiser (L-BFGS-B as scipy sets it) stops when the log likelihood gains less than this share."""


def one_way(*, balanced, seed):
    """Readings of five stations in six rounds, microgal: value, station, visit, and the rows of the survey."""
    chance = np.random.default_rng(seed)
    value, station, visit, rows, time = [], [], [], [], 0.0
    for number, name in enumerate("ABCDE" * ROUNDS):
        seat = 5.0 * chance.standard_normal()
        for _ in range(4 if balanced else int(chance.choice([1, 2, 3, 8]))):
            value.append(30.0 * DEPTH[name] + seat + 3.0 * chance.standard_normal())
            station.append("ABCDE".index(name))
            visit.append(number)
            rows.append(Row(time=time, reading=value[-1] * MICROGAL, depth=DEPTH[name], station=name))
            time += 60.0
        time += 1800.0
    return np.array(value), np.array(station), np.array(visit), rows


def ours(rows):
    """Variances of reading and re-seating as the program estimates them, microgal squared."""
    fit = reduce(made_case(rows, instruments=(METER,), drift_order=0)).network.adjustment
    assert len(fit.visits) == 5 * ROUNDS and fit.reseating.freedom == 5 * (ROUNDS - 1) and not fit.reseating.few
    assert np.ptp(fit.noise.sd) == 0.0 and np.ptp(fit.reseating.variance) == 0.0
    return float(fit.noise.sd[0] ** 2) / MICROGAL**2, float(fit.reseating.variance[0]) / MICROGAL**2


def of_the_library(value, station, visit):
    """The same by the joint restricted likelihood of the library, and its log there."""
    fit = MixedLM(value, np.eye(5)[station], groups=visit).fit(reml=True, method="lbfgs")
    assert fit.converged
    return np.array([float(fit.scale), float(np.asarray(fit.cov_re)[0, 0])]), float(fit.llf)


def unlikelihood(reading, seat, value, station, visit):
    """Minus twice the log of the restricted likelihood, but for a constant, with full matrices."""
    spread = reading * np.eye(len(value)) + seat * (visit[:, None] == visit)
    design = np.eye(5)[station]
    weighted = np.linalg.solve(spread, np.column_stack([design, value]))
    normal = design.T @ weighted[:, :5]
    left = weighted[:, 5] - weighted[:, :5] @ np.linalg.solve(normal, design.T @ weighted[:, 5])
    return float(np.linalg.slogdet(spread)[1] + np.linalg.slogdet(normal)[1] + value @ left)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_balanced_visits_give_the_analysis_of_variance_and_the_joint_estimate(seed):
    value, station, visit, rows = one_way(balanced=True, seed=seed)
    reading, seat = ours(rows)
    table = value.reshape(ROUNDS, 5, 4)
    means = table.mean(axis=2)
    within = np.sum((table - means[:, :, None]) ** 2) / (5 * ROUNDS * 3)
    between = 4.0 * np.sum((means - means.mean(axis=0)) ** 2) / (5 * (ROUNDS - 1))
    assert between > within
    assert reading == pytest.approx(within, rel=1e-9)
    # What the program settles is the variance of a visit mean, u^2 + e^2/4.
    assert seat == pytest.approx((between - within) / 4.0, abs=SETTLED * between / 4.0)
    theirs, likelihood = of_the_library(value, station, visit)
    # One standard error from its maximum a log likelihood has lost a half: what the optimiser leaves, in such errors.
    left = np.sqrt(2.0 * OPTIMISER * abs(likelihood))
    error = np.array([within * np.sqrt(2.0 / (5 * ROUNDS * 3)), between / 4.0 * np.sqrt(2.0 / (5 * (ROUNDS - 1)))])
    assert left < 2e-3
    assert np.all(np.abs([reading, seat] - theirs) < left * error)


@pytest.mark.parametrize("seed", [4, 5, 6])
def test_unbalanced_visits_give_the_seat_that_is_likeliest_for_their_reading_noise(seed):
    value, station, visit, rows = one_way(balanced=False, seed=seed)
    reading, seat = ours(rows)
    means = np.bincount(visit, value) / np.bincount(visit)
    freedom = len(value) - 5 * ROUNDS
    assert reading == pytest.approx(np.sum((value - means[visit]) ** 2) / freedom, rel=1e-9)
    best = optimize.minimize_scalar(
        lambda u: unlikelihood(reading, u, value, station, visit), bounds=(0.0, 400.0), method="bounded",
        options={"xatol": 1e-9},
    )  # fmt: skip
    # Near its minimum the likelihood is flat to rounding: the root of its derivative is found instead.
    step = 1e-3

    def slope(u):
        up, down = (unlikelihood(reading, u + by, value, station, visit) for by in (step, -step))
        return (up - down) / (2.0 * step)

    root = optimize.brentq(slope, 0.8 * best.x, 1.25 * best.x, xtol=1e-10)
    # The stopping rule is of a log ratio that falls by at least 0.05 for each unit of log(u^2 + e^2/n); the central
    # difference errs by (1e-3/u^2)^2, far less.
    assert seat == pytest.approx(root, abs=20.0 * SETTLED * (root + reading))


@pytest.mark.parametrize("seed", [4, 5, 6])
def test_the_joint_estimate_of_unbalanced_visits_lies_within_its_own_standard_error(seed):
    value, station, visit, rows = one_way(balanced=False, seed=seed)
    mine, (theirs, likelihood) = np.array(ours(rows)), of_the_library(value, station, visit)

    def at(place):
        return unlikelihood(*place, value, station, visit)

    # The library stands at the maximum of the likelihood that is written out here.
    step = 1e-2 * theirs
    slope = np.array([at(theirs + by) - at(theirs - by) for by in np.diag(step)]) / (2.0 * step)
    curve = np.array([[at(theirs + a + b) - at(theirs + a - b) - at(theirs - a + b) + at(theirs - a - b)
                       for b in np.diag(step)] for a in np.diag(step)]) / (4.0 * np.outer(step, step))  # fmt: skip
    covariance = np.linalg.inv(curve / 2.0)
    error = np.sqrt(np.diagonal(covariance))
    assert np.all(np.abs(covariance @ slope / 2.0) < np.sqrt(2.0 * OPTIMISER * abs(likelihood)) * error)
    assert np.all(np.abs(mine - theirs) < error)
