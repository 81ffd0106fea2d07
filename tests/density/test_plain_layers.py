"""Layers by generalised least squares: shares by quadrature, normal equations, what cannot be told apart."""

import numpy as np
import pytest

import plumbwell.density.layers as layers_module
from plumbwell.density.layers import layer_density, plain_layers, volume_shares
from plumbwell.survey.column import constant_column
from plumbwell.survey.errors import NumericalError

RADIUS = 6.371e6


def chained(number: int, sd: float = 20.0) -> np.ndarray:
    """Covariance of intervals between stations of equal noise: neighbours are correlated by -1/2."""
    return sd**2 * (np.eye(number) - 0.5 * (np.eye(number, k=1) + np.eye(number, k=-1)))


def stations(*elevations):
    levels = np.array(elevations, dtype=float)
    return levels[:-1], levels[1:]


def layered(tops, bases, density, covariance, boundaries):
    return plain_layers(
        tops=tops,
        bases=bases,
        density=np.array(density, dtype=float),
        variance=np.diagonal(covariance),
        covariance=lambda: np.asarray(covariance),
        boundaries=np.array(boundaries, dtype=float),
        radius=RADIUS,
    )


def test_shares_are_those_of_the_volume_of_shells():
    tops, bases = stations(0.0, -2000.0, -6000.0)
    found = volume_shares(
        tops=tops, bases=bases, boundaries=np.array([0.0, -500.0, -3000.0, -6000.0]), radius=RADIUS
    )
    node, weight = np.polynomial.legendre.leggauss(8)

    def volume(upper, lower):
        r = RADIUS + lower + (upper - lower) * (node + 1.0) / 2.0
        return (upper - lower) * np.sum(weight * r * r) / 2.0

    expected = [
        [volume(0, -500) / volume(0, -2000), volume(-500, -2000) / volume(0, -2000), 0.0],
        [0.0, volume(-2000, -3000) / volume(-2000, -6000), volume(-3000, -6000) / volume(-2000, -6000)],
    ]
    assert found == pytest.approx(np.array(expected), rel=1e-12)
    # Flat thickness would be wrong in the fourth digit.
    assert abs(found[1, 0] - 0.25) > 1e-4


def test_layers_between_stations_are_the_intervals():
    tops, bases = stations(100.0, 60.0, 10.0, -30.0)
    covariance = chained(3)
    found = layered(tops, bases, [2400.0, 2500.0, 2600.0], covariance, [100.0, 60.0, 10.0, -30.0])
    assert found.density.tolist() == [2400.0, 2500.0, 2600.0]
    assert found.covariance().tolist() == covariance.tolist()
    assert found.sd.tolist() == [20.0] * 3 and found.resolution.tolist() == [1.0] * 3
    assert not found.conditional.any() and found.misfit == 0.0 and found.dof == 0
    assert found.weights(1).tolist() == [0.0, 1.0, 0.0]


def test_a_gap_and_an_interval_without_density_leave_their_layers_empty():
    tops, bases = np.array([100.0, 60.0, 0.0]), np.array([60.0, 10.0, -30.0])
    found = layered(tops, bases, [2400.0, np.nan, 2600.0], chained(3), [100.0, 60.0, 10.0, 0.0, -30.0])
    assert np.isnan(found.density).tolist() == np.isnan(found.sd).tolist() == [False, True, True, False]
    assert found.resolution.tolist() == [1.0, 0.0, 0.0, 1.0]
    assert np.isnan(found.residual).tolist() == [False, True, False]


def test_several_intervals_in_a_layer_against_the_normal_equations():
    levels = [0.0, -40.0, -90.0, -150.0, -170.0, -260.0, -300.0]
    tops, bases = stations(*levels)
    density = np.array([2310.0, 2290.0, 2420.0, 2555.0, 2570.0, 2602.0])
    covariance = chained(6) * np.outer(np.arange(1, 7), np.arange(1, 7))
    boundaries = np.array([0.0, -100.0, -155.0, -300.0])
    found = layered(tops, bases, density, covariance, boundaries)
    shares = volume_shares(tops=tops, bases=bases, boundaries=boundaries, radius=RADIUS)
    inverse = np.linalg.inv(covariance)
    spread = np.linalg.inv(shares.T @ inverse @ shares)
    expected = spread @ shares.T @ inverse @ density
    assert found.density == pytest.approx(expected, rel=1e-11)
    assert found.covariance() == pytest.approx(spread, rel=1e-8)
    assert found.sd == pytest.approx(np.sqrt(np.diagonal(spread)), rel=1e-9)
    left = density - shares @ expected
    assert found.residual == pytest.approx(left, abs=1e-8)
    assert found.misfit == pytest.approx(left @ inverse @ left, rel=1e-9)
    assert found.dof == 3 and found.resolution.tolist() == [1.0] * 3
    assert found.conditional.tolist() == [True, True, True]


def test_only_boundaries_off_the_stations_make_a_layer_conditional():
    tops, bases = stations(0.0, -50.0, -100.0, -150.0, -200.0, -250.0)
    found = layered(tops, bases, [2500.0] * 5, chained(5), [0.0, -100.0, -180.0, -250.0])
    assert found.conditional.tolist() == [False, True, True]


def test_true_layers_come_back_from_the_densities_they_make():
    levels = np.linspace(0.0, -3000.0, 41)
    boundaries = np.array([0.0, -313.0, -777.0, -1500.0, -2210.5, -3000.0])
    truth = np.array([2100.0, 2450.0, 2300.0, 2710.0, 2550.0])
    shares = volume_shares(tops=levels[:-1], bases=levels[1:], boundaries=boundaries, radius=RADIUS)
    found = layered(levels[:-1], levels[1:], shares @ truth, chained(40), boundaries)
    assert found.density == pytest.approx(truth, rel=1e-11)
    assert found.misfit < 1e-12 and found.dof == 35


def test_two_boundaries_within_one_interval_cannot_be_told_apart_and_spoil_no_other_layer():
    tops, bases = stations(0.0, -100.0, -200.0, -300.0)
    found = layered(
        tops, bases, [2400.0, 2500.0, 2650.0], chained(3), [0.0, -100.0, -130.0, -170.0, -200.0, -300.0]
    )
    assert np.isnan(found.density).tolist() == [False, True, True, True, False]
    # By hand: the three shares are about 0.3, 0.4, 0.3, and each resolution its square over their sum.
    assert found.resolution == pytest.approx([1.0, 0.09 / 0.34, 0.16 / 0.34, 0.09 / 0.34, 1.0], rel=1e-4)
    assert found.density[[0, 4]] == pytest.approx([2400.0, 2650.0])
    assert found.sd[[0, 4]] == pytest.approx([20.0, 20.0])
    assert np.isnan(found.covariance()[1]).all() and np.isnan(found.covariance()[:, 2]).all()
    assert found.dof == 0 and np.isnan(found.weights(2)).all()


def test_a_thin_layer_between_known_ones_is_found_by_difference_with_its_large_error():
    tops, bases = stations(0.0, -100.0, -200.0, -300.0)
    noise = np.eye(3) * 10.0**2
    found = layered(tops, bases, [2400.0, 2440.0, 2600.0], noise, [0.0, -150.0, -160.0, -300.0])
    # The middle interval is half layer 1, a tenth layer 2, 0.4 layer 3 (flat, to a part in a thousand).
    assert found.density[1] == pytest.approx((2440.0 - 0.5 * 2400.0 - 0.4 * 2600.0) / 0.1, rel=1e-3)
    assert found.sd[1] == pytest.approx(10.0 * np.sqrt(1 + 0.25 + 0.16) / 0.1, rel=1e-3)
    assert found.resolution.tolist() == [1.0, 1.0, 1.0]


@pytest.mark.parametrize("exact", ["all", "one", "common"])
def test_a_singular_covariance_is_solved_all_the_same(exact):
    tops, bases = stations(*np.linspace(0.0, -400.0, 9))
    covariance = {
        "all": np.zeros((8, 8)),
        "one": np.diag([0.0] + [100.0] * 7),
        "common": np.full((8, 8), 25.0),
    }[exact]
    density = np.array([2400.0, 2420.0, 2400.0, 2420.0, 2600.0, 2600.0, 2600.0, 2600.0])
    found = layered(tops, bases, density, covariance, [0.0, -200.0, -400.0])
    expected = {"all": (2410.0, 0.0), "one": (2400.0, 0.0), "common": (2410.0, 5.0)}[exact]
    assert found.density == pytest.approx([expected[0], 2600.0], abs=1e-3)
    assert found.sd[0] == pytest.approx(expected[1], abs=1e-3)


def test_beyond_the_largest_number_solved_together_variances_weight_and_the_sd_stays_honest(monkeypatch):
    monkeypatch.setattr(layers_module, "MOST_TOGETHER", 5)
    tops, bases = stations(*np.linspace(0.0, -600.0, 7))
    covariance = chained(6)
    found = layered(
        tops, bases, [2400.0, 2410.0, 2420.0, 2500.0, 2510.0, 2520.0], covariance, [0.0, -300.0, -600.0]
    )
    third = np.array([1, 1, 1, 0, 0, 0]) / 3.0
    assert found.density == pytest.approx([2410.0, 2510.0], abs=0.01)
    assert found.weights(0) == pytest.approx(third, abs=1e-4)
    assert found.sd[0] == pytest.approx(np.sqrt(third @ covariance @ third), rel=1e-3)


def test_what_is_no_covariance_is_refused():
    tops, bases = stations(0.0, -100.0, -200.0, -300.0)
    with pytest.raises(NumericalError, match="the covariance of the interval densities is none"):
        layered(tops, bases, [2400.0] * 3, np.eye(3) - 2.0 * np.eye(3)[::-1], [0.0, -150.0, -300.0])


def test_intervals_that_reach_beyond_the_boundaries_are_passed_over():
    tops, bases = stations(50.0, -50.0, -100.0, -200.0)
    found = layered(tops, bases, [9999.0, 2400.0, 2500.0], np.eye(3), [0.0, -100.0, -200.0])
    assert found.density.tolist() == [2400.0, 2500.0]
    assert np.isnan(found.residual[0])


def test_overlapping_intervals_of_two_chains_are_solved_together():
    tops, bases = np.array([0.0, -100.0, -50.0]), np.array([-100.0, -200.0, -150.0])
    found = layered(tops, bases, [2400.0, 2600.0, 2550.0], np.eye(3), [0.0, -50.0, -100.0, -150.0, -200.0])
    # Three equations for four layers: only nothing is told apart here.
    assert np.isnan(found.density).all() and (found.resolution < 1.0).all()
    found = layered(tops, bases, [2400.0, 2600.0, 2510.0], np.eye(3), [0.0, -100.0, -200.0])
    assert found.dof == 1 and found.density == pytest.approx([2400.0 + 10 / 3, 2600.0 + 10 / 3], abs=0.01)


def test_boundaries_that_do_not_descend_are_refused():
    tops, bases = stations(0.0, -100.0)
    for boundaries in ([0.0], [0.0, 0.0], [-100.0, 0.0]):
        with pytest.raises(ValueError, match="two or more boundaries, descending"):
            layered(tops, bases, [2400.0], np.eye(1), boundaries)


def test_each_density_is_weighed_from_the_interval_densities():
    levels = np.linspace(0.0, -300.0, 13)
    density = 2500.0 + np.arange(12.0) ** 2
    density[4] = np.nan
    found = layered(
        levels[:-1], levels[1:], density, chained(12), [0.0, -60.0, -190.0, -195.0, -198.0, -300.0]
    )
    column = layer_density(found, constant_column("density", "kg/m3", density))
    worked = [column.worked(row) for row in range(5)]
    assert worked == pytest.approx(found.density.tolist(), rel=1e-9, nan_ok=True)
    assert np.isnan(found.density).tolist() == [False, False, True, True, False]
    plain = layered(levels[:-1], levels[1:], density, chained(12), levels)
    column = layer_density(plain, constant_column("density", "kg/m3", density))
    assert [column.worked(row) for row in range(12)] == pytest.approx(
        density.tolist(), rel=1e-15, nan_ok=True
    )
