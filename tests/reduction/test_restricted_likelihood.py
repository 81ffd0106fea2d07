"""The restricted likelihood, with and without a random walk, and its maximum, against dense algebra.

Invented surveys; the dense likelihood holds the walk's own covariance, no modes.
"""

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from made_surveys import HOUR, MICROGAL, MILLIGAL, loop, made_case
from many_runs import in_bands, many_runs
from plumbwell.reduction.restricted_likelihood import log_likelihood, restricted_variance
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument
from visit_algebra import visit_algebra, walk_of

METER = Instrument(
    name="A", reading_floor=2 * MICROGAL, reseating_sd=4 * MICROGAL, drift_rate_sd=0.05 * MILLIGAL / HOUR
)
LABELS = "ABCDEFG"
MAKE = {
    "depth": {name: 40.0 * n for n, name in enumerate(LABELS)},
    "gravity": {name: 3.6 * MILLIGAL * n for n, name in enumerate(LABELS)},
}
STRENGTH = 12 * MICROGAL / (8 * HOUR) ** 1.5


def rows_of(seed, strength=STRENGTH, stops="ABCDEFGABCDEFGA", **more):
    """Two runs, each with a walk of its own."""
    chance = np.random.default_rng(seed)
    rows = []
    for run in ("1", "2"):
        one = loop(chance, stops, run=run, start=86400.0 * int(run), counts=(1, 2), **MAKE, **more)
        walk = walk_of(np.array([row.time for row in one]) - one[0].time, strength, chance)
        rows += [replace(row, reading=row.reading + by) for row, by in zip(one, walk.tolist(), strict=True)]
    return rows


def adjusted(rows, **changed):
    """The adjusted network; noise as given and lines of drift unless changed."""
    recipe = {"noise": "as_given", "drift_order": 1, "drift_walk": "off", **changed}
    return reduce(made_case(rows, instruments=(METER,), **recipe)).network.adjustment


def likelihoods(rows, fit, *, seats, orders=1):
    """Restricted likelihoods by the network and by dense algebra for some re-seating variances, walk in force."""
    algebra = visit_algebra(rows, fit, orders=dict.fromkeys({row.run for row in rows}, orders))
    strength, walk = (0.0, None) if fit.walk is None else (fit.walk.strength, walk_matrix(fit))
    ours, dense = [], []
    for seat in seats:
        variance = fit.noise.variance + seat
        ours.append(log_likelihood(fit.design, fit.visit_mean, variance, rank=fit.rank, walk=walk))
        dense.append(algebra.log_likelihood(np.diag(variance) + strength**2 * algebra.kernel()))
    return np.array(ours), np.array(dense)


def walk_matrix(fit):
    """What the modes add to the flat border matrix: one over the variance of each."""
    priors, flat = fit.design.priors, np.zeros(fit.design.layout.starts[3])
    of_walk = [n for n, name in enumerate(priors.name) if name.startswith("walk")]
    assert len(of_walk) == fit.walk.modes * len(fit.orders)
    unknown = priors.unknown[np.isin(priors.row, of_walk)]
    flat[fit.design.layout.place(unknown, unknown)] = 1.0 / priors.sd[of_walk] ** 2
    return flat


SEATS = [(one * MICROGAL) ** 2 for one in (0.0, 1.0, 3.0, 10.0, 40.0)]


@pytest.mark.parametrize("orders", [1, 3])
@pytest.mark.parametrize("bands", [False, True], ids=["one block", "bands"])
def test_without_a_walk_it_is_the_dense_likelihood_up_to_a_constant(orders, bands):
    rows = many_runs("base" if bands else "chain", runs=34 if bands else 6).rows
    with pytest.MonkeyPatch.context() as patch:
        if bands:
            in_bands(patch)
        fit = adjusted(rows, drift_order=orders)
    assert (fit.design.layout.count > 1) == bands
    ours, dense = likelihoods(rows, fit, seats=SEATS, orders=orders)
    np.testing.assert_allclose(ours - ours[0], dense - dense[0], rtol=1e-8, atol=1e-7)


@pytest.mark.parametrize("bands", [False, True], ids=["one block", "bands"])
def test_with_a_walk_it_is_the_dense_likelihood_with_the_walks_covariance(bands):
    rows = many_runs("chain", runs=12).rows if bands else rows_of(3)
    plain = adjusted(rows)
    (here,), without = likelihoods(rows, plain, seats=[(4 * MICROGAL) ** 2])
    assert here == pytest.approx(plain.likelihood, abs=1e-9)
    for strength in (STRENGTH / 10.0, STRENGTH, 5.0 * STRENGTH):
        with pytest.MonkeyPatch.context() as patch:
            if bands:
                in_bands(patch)
            fit = adjusted(rows, drift_walk=strength)
        assert (fit.design.layout.count > 1) == bands
        ours, dense = likelihoods(rows, fit, seats=[(4 * MICROGAL) ** 2, (6 * MICROGAL) ** 2])
        assert fit.likelihood == pytest.approx(ours[0], abs=1e-9)
        # The modes left out have under 1/2500 of a visit's variance: each visit's share of the logarithm moves by
        # half of that times its own squared ratio, less one. Among visits of mean square 1 that is 1/2500 of sqrt(n/2),
        # and 4 times that is never met.
        bound = 4.0 / 2500.0 * np.sqrt(len(fit.visits) / 2.0) + len(fit.visits) / 5000.0
        assert ours[0] - plain.likelihood == pytest.approx(float(dense[0] - without[0]), abs=bound)
        assert ours[1] - ours[0] == pytest.approx(dense[1] - dense[0], abs=bound)


def test_ties_do_not_count_and_what_they_hold_is_held_otherwise():
    """Where ties hold the level the visits alone leave it open, beside the modes of a walk too."""
    rows = rows_of(4)
    ties = {"A": (0.1, 5 * MICROGAL), "D": (0.1 + 3 * 3.6 * MILLIGAL + 50 * MICROGAL, 5 * MICROGAL)}
    recipe = {"noise": "as_given", "drift_order": 1}
    tied = [
        reduce(made_case(rows, instruments=(METER,), ties=ties, **recipe, drift_walk=walk)).network.adjustment
        for walk in ("off", STRENGTH)
    ]
    free = [adjusted(rows, drift_walk=walk) for walk in ("off", STRENGTH)]
    assert tied[0].rank.lacking == 1 and free[0].rank.lacking == 0 and tied[0].rank.rank == free[0].rank.rank
    gains = [both[1].likelihood - both[0].likelihood for both in (tied, free)]
    assert gains[0] == pytest.approx(gains[1], abs=1e-6) and abs(gains[1]) > 0.05


@pytest.mark.parametrize(("seed", "seat"), [(1, 4.0), (2, 4.0), (3, 15.0), (4, 15.0), (5, 0.0), (9, 0.0), (10, 0.0)])
def test_the_variance_beside_a_walk_is_where_the_dense_likelihood_is_greatest(seed, seat):
    rows = rows_of(seed, reseating=seat * MICROGAL)
    fit = adjusted(rows, drift_walk=STRENGTH, noise="estimate")
    algebra = visit_algebra(rows, fit, orders={"1": 1, "2": 1})
    walk = STRENGTH**2 * algebra.kernel()

    def falls(variance):
        return -algebra.log_likelihood(np.diag(fit.noise.variance + variance * MICROGAL**2) + walk)

    found = fit.reseating.estimate / MICROGAL**2
    best = minimize_scalar(lambda x: falls(np.exp(x)), bounds=(-8.0, 8.0), method="bounded", options={"xatol": 1e-8})
    highest = min(best.fun, falls(0.0))
    # By modes that leave out a 1/2500 of a visit's variance: the maximum lies as near, in units of that variance.
    assert falls(found) - highest < 1e-4
    if falls(0.0) > best.fun + 1e-3:
        assert found == pytest.approx(np.exp(best.x), rel=1e-2)
    again = restricted_variance(
        fit.design, fit.visit_mean, fit.noise.variance, rank=fit.rank, walk=walk_matrix(fit)
    )
    assert again / MICROGAL**2 == pytest.approx(found, rel=1e-5, abs=1e-9)
    near = restricted_variance(
        fit.design, fit.visit_mean, fit.noise.variance, rank=fit.rank, walk=walk_matrix(fit), start=100 * MICROGAL**2
    )
    assert near / MICROGAL**2 == pytest.approx(found, rel=1e-5, abs=1e-9)


def test_both_kinds_of_answer_occur():
    found = [
        adjusted(rows_of(seed, reseating=seat * MICROGAL), drift_walk=STRENGTH, noise="estimate").reseating.estimate
        for seed, seat in ((3, 15.0), (5, 0.0), (9, 0.0))
    ]
    assert min(found) == 0.0 and max(found) > (9 * MICROGAL) ** 2


def test_a_walk_of_no_strength_changes_nothing():
    rows = rows_of(9)
    plain, weak = adjusted(rows), adjusted(rows, drift_walk=1e-6 * STRENGTH)
    assert weak.walk is not None and weak.likelihood == pytest.approx(plain.likelihood, abs=1e-6)
    np.testing.assert_allclose(
        weak.solution.gravity[:, 0], plain.solution.gravity[:, 0], rtol=0, atol=1e-6 * MICROGAL
    )
    np.testing.assert_allclose(weak.reseating.freedom, plain.reseating.freedom)
