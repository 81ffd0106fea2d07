"""The strength of the drift's random walk against a dense maximisation with the walk's own covariance.

Invented surveys of two runs; whether a walk is kept follows from the gain that the dense likelihood shows.
"""

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize, minimize_scalar

from made_surveys import HOUR, MICROGAL, MILLIGAL, loop, made_case
from plumbwell.reduction.restricted_likelihood import visits_alone
from plumbwell.reduction.walk import FURTHER, LEAST_FREEDOM, enough_gain, likeliest_strength
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
UNIT = MICROGAL / (8 * HOUR) ** 1.5
STOPS = "ABCDEFGABCDEFGA"


def rows_of(seed, wander, *, stops=STOPS, runs=2):
    """Runs with a walk of their own whose strength is so many uGal over 8 h."""
    chance = np.random.default_rng(seed)
    rows = []
    for number in range(runs):
        one = loop(chance, stops, run=str(number + 1), start=86400.0 * number, counts=(2,), **MAKE)
        walk = walk_of(np.array([row.time for row in one]) - one[0].time, wander * UNIT, chance)
        rows += [replace(row, reading=row.reading + by) for row, by in zip(one, walk.tolist(), strict=True)]
    return rows


def network_of(rows, **changed):
    """The network; noise as given and lines of drift unless changed."""
    recipe = {"noise": "as_given", "drift_order": 1, "drift_walk": "off", **changed}
    return reduce(made_case(rows, instruments=(METER,), **recipe)).network


def adjusted(rows, **changed):
    """The adjusted network."""
    return network_of(rows, **changed).adjustment


def dense_gain(rows, fit, *, estimate):
    """Function of strength, UNIT: gain of the dense likelihood over no walk; all noise scaled to fit where asked."""
    algebra = visit_algebra(rows, fit, orders=dict.fromkeys({row.run for row in rows}, 1))
    kernel, noise = algebra.kernel() * UNIT**2, fit.noise.variance + fit.reseating.variance

    def height(covariance):
        if not estimate:
            return algebra.log_likelihood(covariance)
        # With a factor on everything at its best value: the height at that factor.
        freedom = fit.reseating.freedom
        one, other = algebra.log_likelihood(covariance), algebra.log_likelihood(4.0 * covariance)
        # Of a factor f: -1/2 (freedom log f + squares / f) + const.
        squares = (other - one + 0.5 * freedom * np.log(4.0)) * 2.0 / (1.0 - 0.25)
        return one + 0.5 * squares - 0.5 * (freedom * np.log(squares / freedom) + freedom)

    def gain(relative2):
        return height(np.diag(noise) + relative2 * kernel) - height(np.diag(noise))

    return gain


def highest(gain):
    """Square of the strength at which a gain is greatest, and the gain; 0 where it falls from no walk on."""
    grid = np.linspace(-8.0, 16.0, 60)
    best = grid[int(np.argmax([gain(np.exp(x)) for x in grid]))]
    found = minimize_scalar(
        lambda x: -gain(np.exp(x)), bounds=(best - 0.5, best + 0.5), method="bounded", options={"xatol": 1e-6}
    )
    return (float(np.exp(found.x)), -found.fun) if -found.fun > 1e-6 else (0.0, 0.0)


@pytest.mark.parametrize("estimate", [True, False], ids=["scaled", "held"])
@pytest.mark.parametrize(("seed", "wander"), [(1, 30.0), (2, 60.0), (3, 200.0), (4, 30.0), (5, 0.0), (8, 10.0)])
def test_the_likeliest_strength_is_where_the_dense_likelihood_is_greatest(seed, wander, estimate):
    rows = rows_of(seed, wander)
    fit = adjusted(rows)
    variance = fit.noise.variance + fit.reseating.variance
    typical = float(np.median(variance))
    alone = visits_alone(fit.design, typical / variance, fit.visit_mean, fit.rank, None)
    strengths, gain = likeliest_strength(
        alone, fit.basis, fit.visits, fit.noise.weight, freedom=fit.reseating.freedom, typical=typical,
        estimate=estimate,
    )  # fmt: skip
    wanted, wanted_gain = highest(dense_gain(rows, fit, estimate=estimate))
    if not wanted:
        assert (strengths, gain) == ((), 0.0)
        return
    # Sixteen modes leave out 4/(3 pi^4) 15.5^-3 of the walk; the grid of strengths is 1.8 % of its square fine.
    assert gain == pytest.approx(wanted_gain, abs=2e-3 + 1e-3 * wanted_gain)
    (strength,) = strengths
    by = 1.0
    if estimate:
        # In units of noise scaled to fit: the strength found is that beside the noise as it then is.
        algebra = visit_algebra(rows, fit, orders={"1": 1, "2": 1})
        whole = np.diag(variance) + wanted * UNIT**2 * algebra.kernel()
        one, other = algebra.log_likelihood(whole), algebra.log_likelihood(4.0 * whole)
        by = (other - one + fit.reseating.freedom * np.log(2.0)) * 2.0 / 0.75 / fit.reseating.freedom
    assert strength == pytest.approx(np.sqrt(wanted * by) * UNIT, rel=0.02)


def test_answers_of_both_kinds_are_among_those_surveys():
    both = rows_of(3, 200.0), rows_of(5, 0.0)
    found = [highest(dense_gain(rows, adjusted(rows), estimate=False))[0] for rows in both]
    assert found[0] > 0.0 and found[1] == 0.0


def test_a_walk_is_kept_when_it_gains_more_than_half_the_logarithm_of_the_freedom():
    kept, left_out = 0, 0
    for seed in range(24):
        rows = rows_of(seed, [0.0, 30.0, 80.0, 200.0][seed % 4])
        plain, network = adjusted(rows), network_of(rows, drift_walk="auto")
        fit = network.adjustment
        _, gain = highest(dense_gain(rows, plain, estimate=False))
        wanted = 0.5 * np.log(plain.reseating.freedom)
        assert plain.reseating.freedom == 30 - 7 - 3
        if network.walk_not_needed:
            assert gain > wanted and fit.walk is None and network.proposed
            continue  # jumps are found that explain what the walk would
        assert fit.walk_tried
        if abs(gain - wanted) < 0.05 or network.outlier_rows.size:
            continue  # too near for modes and a grid to say; or asked of the other readings alone
        assert (fit.walk is not None) == (gain > wanted), seed
        kept, left_out = kept + (gain > wanted), left_out + (gain < wanted)
        if fit.walk is not None:
            assert fit.walk.likelihood - plain.likelihood == pytest.approx(gain, abs=0.05)
            assert fit.likelihood == fit.walk.likelihood
    assert kept >= 3 and left_out >= 5


def test_asked_for_it_is_kept_however_little_it_gains():
    rows = rows_of(1, 60.0)
    gain = highest(dense_gain(rows, adjusted(rows), estimate=False))[1]
    assert 0.0 < gain < 0.5 * np.log(20)
    assert adjusted(rows, drift_walk="auto").walk is None
    fit = adjusted(rows, drift_walk="on")
    assert fit.walk is not None and fit.walk.strength > 0.0
    assert fit.likelihood - adjusted(rows).likelihood == pytest.approx(gain, abs=0.02)


def test_the_walk_takes_up_its_part_of_the_noise_when_that_is_estimated():
    rows = rows_of(8, 80.0)
    plain, fit = (adjusted(rows, noise="estimate", drift_walk=one) for one in ("off", "auto"))
    assert fit.walk is not None and fit.reseating.estimate < 0.25 * plain.reseating.estimate
    algebra = visit_algebra(rows, fit, orders={"1": 1, "2": 1})
    noise = np.diag(fit.noise.variance)

    def falls(both):
        seat, walk = np.exp(both)
        seated = noise + np.eye(len(noise)) * seat * MICROGAL**2
        return -algebra.log_likelihood(seated + walk * UNIT**2 * algebra.kernel())

    best = minimize(falls, [2.0, 8.0], method="Nelder-Mead", options={"xatol": 1e-5, "fatol": 1e-9})
    found = np.log([fit.reseating.estimate / MICROGAL**2, (fit.walk.strength / UNIT) ** 2])
    # The strength is found beside noise that is scaled as a whole: near the summit, by a tenth of what matters.
    assert falls(found) - best.fun < 0.1


@pytest.mark.parametrize("wander", [20.0, 200.0])
def test_gravity_beside_a_walk_is_that_of_the_walks_own_covariance(wander):
    rows = rows_of(6, wander)
    free = replace(METER, drift_rate_sd=np.inf, station_floor=0.0)
    recipe = {"noise": "as_given", "drift_order": 1, "drift_walk": wander * UNIT}
    results = reduce(made_case(rows, instruments=(free,), **recipe))
    fit = results.network.adjustment
    algebra = visit_algebra(rows, fit, orders={"1": 1, "2": 1})
    variance = fit.noise.variance + fit.reseating.variance
    root = np.linalg.cholesky((np.diag(variance) + (wander * UNIT) ** 2 * algebra.kernel()) / MICROGAL**2)
    white = np.linalg.solve(root, algebra.design)
    take = np.eye(len(LABELS), algebra.design.shape[1])
    take[:, 0] -= 1.0
    gain = take @ np.linalg.pinv(white, rcond=1e-10)
    assert results.stations.label == tuple(LABELS)
    # Modes leave out a drift whose sd is under a fiftieth of a visit's.
    off = results.stations.gravity.values / MICROGAL - gain @ np.linalg.solve(root, algebra.values / MICROGAL)
    sd = results.stations.gravity_sd.values / MICROGAL
    assert np.abs(off).max() < np.sqrt(np.median(variance)) / MICROGAL / 50.0
    np.testing.assert_allclose(sd, np.sqrt(np.sum(gain**2, axis=1)), rtol=4e-4, atol=1e-6)


def test_few_degrees_of_freedom_leave_it_untried():
    rows = rows_of(1, 200.0, stops="ABCDEFGABCDEFG", runs=1)
    fit = adjusted(rows, drift_walk="auto")
    assert fit.reseating.freedom == 14 - 7 - 1 < LEAST_FREEDOM and not fit.walk_tried and fit.walk is None
    assert adjusted(rows, drift_walk="on").walk_tried
    given = adjusted(rows, drift_walk=50.0 * UNIT)
    assert given.walk_tried and given.walk.strength == 50.0 * UNIT
    assert enough_gain(20) == pytest.approx(0.5 * np.log(20)) and enough_gain(1) == np.inf
    held = adjusted(rows_of(1, 200.0), drift_walk="auto", drift_order=0)
    assert held.walk is None, "a run without drift has no walk"


def test_runs_weighed_one_by_one_find_a_strength_of_the_same_order():
    rows = rows_of(12, 60.0, runs=6)
    plain = adjusted(rows)
    variance = plain.noise.variance + plain.reseating.variance
    typical = float(np.median(variance))

    def strengths_of(fit):
        alone = visits_alone(fit.design, typical / variance, fit.visit_mean, fit.rank, None)
        return likeliest_strength(
            alone, fit.basis, fit.visits, fit.noise.weight, freedom=fit.reseating.freedom, typical=typical,
            estimate=False,
        )

    (together,), gain = strengths_of(plain)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("plumbwell.reduction.walk.MOST_TOGETHER", 8)
        alone, alone_gain = strengths_of(plain)
    assert len(alone) == len(FURTHER) and alone[0] < 2.0 * together and alone[-1] > 0.5 * together
    assert gain > 0.0 and alone_gain > 0.0
    # By scoring from no walk, slope and information by dense algebra, each run alone in its stations' presence.
    algebra = visit_algebra(rows, plain, orders={str(n + 1): 1 for n in range(6)})
    columns = algebra.design / np.linalg.norm(algebra.design, axis=0)
    vectors, size, _ = np.linalg.svd(columns / np.sqrt(variance)[:, None], full_matrices=False)
    basis = vectors[:, size > 1e-9 * size[0]]
    left = (np.eye(len(basis)) - basis @ basis.T) / np.sqrt(variance)[:, None] / np.sqrt(variance)
    kernel, of_run = algebra.kernel(), algebra.mean @ algebra.run
    slope, information = 0.0, 0.0
    for run in range(6):
        mine = np.round(of_run) == run
        part = np.where(mine[:, None] & mine, kernel, 0.0)
        slope += 0.5 * (algebra.values @ left @ part @ left @ algebra.values - np.trace(left @ part))
        information += 0.5 * np.trace(left @ part @ left @ part)
    assert alone[0] == pytest.approx(np.sqrt(slope / information), rel=0.01)
    assert alone_gain == pytest.approx(slope**2 / (2.0 * information), rel=0.02)
