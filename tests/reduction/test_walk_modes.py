"""The modes of an integrated random walk.

The wave numbers of a beam clamped at one end and free at the other are printed in Blevins, Formulas for Natural
Frequency and Mode Shape (1979), table 8-1, to eight decimals; here as remembered, to six, beside a root finder.
Covariance of the walk and orthogonality are checked against the walk's own law and by Gauss-Legendre quadrature.
"""

import numpy as np
import pytest
from scipy.optimize import brentq

from plumbwell.reduction.walk_modes import (
    LEAST_MODES,
    MOST_MODES,
    MOST_PRODUCTS,
    mode_sds,
    modes_for,
    walk_modes,
    wave_numbers,
)

COUNT = 60


def kernel(first, second):
    """Covariance of the walk of strength 1: int (s - u)(t - u) du from 0 to the earlier time, by hand."""
    least, most = np.minimum.outer(first, second), np.maximum.outer(first, second)
    return least**2 * (3.0 * most - least) / 6.0


def test_the_first_wave_numbers_are_those_of_the_clamped_free_beam():
    np.testing.assert_allclose(wave_numbers(4), [1.875104, 4.694091, 7.854757, 10.995541], rtol=0, atol=5e-7)


def test_all_wave_numbers_are_the_roots_one_by_one():
    for number, root in enumerate(wave_numbers(MOST_MODES).tolist()):
        # cos b = -1/cosh b has one root between each two neighbouring multiples of pi.
        wanted = brentq(lambda b: np.cos(b) + 1.0 / np.cosh(b), number * np.pi, (number + 1) * np.pi, xtol=1e-13)
        assert root == pytest.approx(wanted, rel=1e-13)


def test_the_modes_are_orthonormal():
    node, weight = np.polynomial.legendre.leggauss(400)
    modes = walk_modes(0.5 * (node + 1.0), COUNT)
    np.testing.assert_allclose(modes.T @ (0.5 * weight[:, None] * modes), np.eye(COUNT), rtol=0, atol=1e-11)


def test_the_modes_start_at_rest_and_bend_not_at_the_end():
    step = 1e-4
    at = np.array([0.0, step, 1.0 - 2 * step, 1.0 - step, 1.0])
    start, near, *end = walk_modes(at, 6)
    b = wave_numbers(6)
    assert np.abs(start).max() < 1e-12
    # Value and slope 0 at the start: what is left is half the second derivative, 2 b2, times the step squared.
    np.testing.assert_allclose(near, b**2 * step**2, rtol=2.0 * b.max() * step)
    curvature = (end[0] - 2.0 * end[1] + end[2]) / step**2
    # Second and third derivative are 0 at the end: the fourth, b^4 times the end value 2, is left over two steps.
    assert np.abs(curvature / (2.0 * b**4 * step**2)).max() < 2.0
    np.testing.assert_allclose(np.abs(end[2]), 2.0, rtol=1e-12)


@pytest.mark.parametrize("count", [8, 24, 96])
def test_the_covariance_of_the_modes_is_that_of_the_walk(count):
    time = np.linspace(0.0, 1.0, 41)
    modes = walk_modes(time, count)
    off = kernel(time, time) - (modes * mode_sds(count) ** 2) @ modes.T
    # What is left out: the squares of the further modes are at most 4, their sds' sum is an integral.
    bound = 4.0 / (3.0 * np.pi**4) * (count - 0.5) ** -3.0
    assert np.abs(off).max() < bound
    assert off[-1, -1] > 0.5 * bound, "the bound is not idle: the end of the walk all but reaches it"


def test_before_the_start_there_is_no_walk_and_after_the_end_it_goes_straight_on():
    step = 1e-5
    before, at, after, later = walk_modes(np.array([-0.4, 1.0 - step, 1.0, 1.3]), 12)
    assert np.abs(before).max() < 1e-12
    slope = (later - after) / 0.3
    np.testing.assert_allclose(slope, (after - at) / step, rtol=1e-4)
    on = walk_modes(np.array([1.0, 1.1, 1.2, 5.0]), 12)
    np.testing.assert_allclose(on - on[0], np.outer([0.0, 0.1, 0.2, 4.0], slope), rtol=1e-9, atol=1e-9)
    # The law of a walk that is seen no longer: its end and its last rate, with covariance t2/2 and variance t.
    many = 96
    ends = walk_modes(np.array([1.0, 2.0]), many)
    rate = ends[1] - ends[0]
    sd2 = mode_sds(many) ** 2
    assert (ends[0] * sd2) @ rate == pytest.approx(0.5, rel=2e-4)
    assert (rate * sd2) @ rate == pytest.approx(1.0, rel=1e-2)


def test_how_many_modes_a_walk_is_given():
    assert modes_for(0.0, 100) == LEAST_MODES and modes_for(1e9, 100) == MOST_MODES
    counts = [modes_for(wander, 50) for wander in (1.0, 3.0, 10.0, 30.0, 100.0)]
    assert counts == sorted(counts) and counts[-1] > counts[0]
    for wander, count in zip((3.0, 10.0, 30.0), counts[1:4], strict=True):
        # Strength 1 over a time of 1 ends with variance 1/3; what is left out there is under a fiftieth of a visit.
        visit_sd = 1.0 / (np.sqrt(3.0) * wander)
        if count < MOST_MODES:
            modes = walk_modes(np.array([1.0]), count)
            left = 1.0 / 3.0 - float(modes[0] ** 2 @ mode_sds(count) ** 2)
            assert 0.0 < left < (visit_sd / 50.0) ** 2
    crowd = 100_000
    assert LEAST_MODES <= modes_for(1e9, crowd) < 10 and (modes_for(1e9, 2000) + 4) ** 2 * 2000 <= MOST_PRODUCTS
