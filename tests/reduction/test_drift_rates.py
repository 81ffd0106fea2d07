"""The sd of the drift rate at each visit, against dense least squares with the walk's own covariance."""

import numpy as np
import pytest

from made_surveys import HOUR, MILLIGAL
from plumbwell.reduction.drift_rates import mode_rates, rate_sd
from plumbwell.reduction.walk_modes import walk_modes
from plumbwell.study.reduce import reduce
from simulated_surveys import Scheme, loops, mixed_trips, simulated, walk_covariance

GIVEN = {"noise": "as_given"}


def dense_rate_sd(fit, strength):
    """Kriging of the rate (Matheron 1971): stations, biases and drift unknown, the walk by its covariance."""
    visits, basis = fit.visits, fit.basis
    at = visits.first  # one reading a visit
    past = at - visits.run_start[visits.run]
    same = visits.run[:, None] == visits.run
    visit = np.diag(fit.noise.variance + fit.reseating.variance)
    whole = visit + np.where(same, strength**2 * walk_covariance(past), 0.0)
    columns = [visits.station == one for one in range(1, int(visits.station.max()) + 1)]
    slopes = [np.zeros(len(at)) for _ in columns]
    priors = []
    for run in visits.run_order.tolist():
        mine, length = visits.run == run, visits.run_length[run]
        columns.append(mine)
        slopes.append(np.zeros(len(at)))
        own = []
        for power in range(1, fit.orders[run] + 1):
            own.append(len(columns))
            columns.append(np.where(mine, (past / length) ** power, 0.0))
            slopes.append(np.where(mine, power * (past / length) ** (power - 1) / length, 0.0))
        # The stated rate holds for the polynomial; the walk is beside it.
        priors.append((own, 1.0 / (basis.rate_sd[run] * length)))
    design, slope = np.column_stack(columns).astype(float), np.column_stack(slopes)
    weighed = np.linalg.solve(whole / 1e-16, design) / 1e-16
    normal = design.T @ weighed
    for own, factor in priors:
        row = np.zeros(design.shape[1])
        row[own] = factor
        normal += np.outer(row, row)
    # Covariance of a walk with its rate at t: s2/2 before, s t - t2/2 after; of the rate with itself, t.
    s, t = past[:, None], past[None, :]
    cross = np.where(same, strength**2 * np.where(s <= t, s**2 / 2.0, s * t - t**2 / 2.0), 0.0)
    through = np.linalg.solve(whole / 1e-16, cross) / 1e-16
    lack = slope.T - design.T @ through
    known = strength**2 * past - np.sum(cross * through, axis=0)
    return np.sqrt(known + np.sum(lack * np.linalg.solve(normal, lack), axis=0))


@pytest.mark.parametrize("order", [1, 2, 3])
@pytest.mark.parametrize("stops", [loops(6, 4), mixed_trips(6, 4)])
def test_the_rate_of_polynomials(stops, order):
    fit = reduce(simulated(Scheme(stops=stops), 3, drift_order=order, **GIVEN).case).network.adjustment
    np.testing.assert_allclose(rate_sd(fit), dense_rate_sd(fit, 0.0), rtol=1e-6)


@pytest.mark.parametrize("stops", [loops(6, 6), mixed_trips(6, 4)])
def test_a_walk_adds_what_its_rate_wanders_by(stops):
    strength = 0.02 * MILLIGAL / HOUR**1.5
    plain = reduce(simulated(Scheme(stops=stops), 3, drift_order=1, **GIVEN).case).network.adjustment
    case = simulated(Scheme(stops=stops), 3, drift_order=1, drift_walk=strength, **GIVEN).case
    fit = reduce(case).network.adjustment
    assert fit.walk is not None and fit.walk.strength == strength
    found = rate_sd(fit)
    # The modes that are left out are taken to be untold; that they are told a little makes a hundredth at the most.
    np.testing.assert_allclose(found, dense_rate_sd(fit, strength), rtol=0.01)
    assert np.median(found / rate_sd(plain)) > 1.5


def test_slopes_of_the_modes():
    time, h = np.linspace(0.01, 0.99, 41), 1e-5
    slope = (walk_modes(time + h, 30) - walk_modes(time - h, 30)) / (2.0 * h)
    # A central difference errs by h2/6 times the third derivative, the cube of the wave number, 95 at the most.
    np.testing.assert_allclose(mode_rates(time, 30), slope, atol=2.0 * 95.0**3 * h**2 / 3.0)


def test_a_run_whose_drift_is_held_has_no_doubt_of_its_rate():
    fit = reduce(simulated(Scheme(stops=loops(6, 4)), 3, drift_order=0).case).network.adjustment
    np.testing.assert_array_equal(rate_sd(fit), 0.0)
