"""Covariances in diagonal-plus-low-rank form against whole matrices."""

import numpy as np
import pytest

from plumbwell.reduction.spread import Spread, low_rank

CHANCE = np.random.default_rng(5)


def some(n=7, r=3):
    """A spread of n quantities."""
    return Spread(
        diagonal=CHANCE.uniform(0.5, 2.0, n), columns=CHANCE.standard_normal((n, r)), signs=np.ones(r)
    )


def test_matrix_variance_and_pairs_agree():
    one = some()
    whole = np.diag(one.diagonal) + one.columns @ one.columns.T
    np.testing.assert_allclose(one.matrix(), whole, rtol=1e-14)
    np.testing.assert_allclose(one.variance(), np.diag(whole), rtol=1e-14)
    first, second = np.array([0, 3, 4]), np.array([1, 3, 6])
    np.testing.assert_allclose(one.between(first, second), whole[first, second], rtol=1e-12)


def test_a_sum_is_the_sum_of_the_matrices():
    one, other = some(), some(r=2)
    np.testing.assert_allclose((one + other).matrix(), one.matrix() + other.matrix(), rtol=1e-13)
    bare = Spread(diagonal=one.diagonal, columns=np.zeros((7, 0)), signs=np.zeros(0))
    parts = bare + low_rank(one.columns)
    np.testing.assert_allclose(parts.matrix(), one.matrix(), rtol=1e-14)


@pytest.mark.parametrize("datum", [[0] * 7, [2, 2, 2, 2, 5, 5, 5], [-1, -1, 3, 3, 3, -1, -1], [-1] * 7])
def test_referred_is_the_covariance_of_differences(datum):
    one = some()
    take = np.eye(7)
    for row, at in enumerate(datum):
        if at >= 0:
            take[row, at] -= 1.0
    np.testing.assert_allclose(
        one.referred(np.array(datum)).matrix(), take @ one.matrix() @ take.T, rtol=1e-12, atol=1e-13
    )
    own = [at for at in set(datum) if at >= 0]
    np.testing.assert_array_equal(one.referred(np.array(datum)).variance()[own], 0.0)
