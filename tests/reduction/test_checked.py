"""What checks a reading, against deletion: the network solved without it, and what it then says; invented surveys."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import HOUR, MICROGAL, MILLIGAL, STILL, loop, made_case
from many_runs import METER as METER_OF_MANY
from many_runs import in_bands, many_runs
from plumbwell.reduction.checked import visit_means
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

METER = Instrument(
    name="A", reading_floor=2 * MICROGAL, reseating_sd=4 * MICROGAL, drift_rate=0.01 * MILLIGAL / HOUR,
    drift_rate_sd=0.02 * MILLIGAL / HOUR,
)  # fmt: skip
LABELS = "ABCDEFG"
MAKE = {
    "depth": {name: 40.0 * n for n, name in enumerate(LABELS)},
    "gravity": {name: 3.6 * MILLIGAL * n for n, name in enumerate(LABELS)},
}
FIXED = replace(STILL, noise="as_given", drift_order=1, drift_walk="off")


def two_runs(seed=1, sds=(2 * MICROGAL, 6 * MICROGAL), quick=True):
    """Two runs with visits of one to three readings of unlike sds; `quick` within a moment.

    Drift within a visit is taken as known when its readings are weighed against one another: that is exact where the
    visit takes no time.
    """
    chance = np.random.default_rng(seed)
    rows = [
        *loop(chance, "ABCDCBA", counts=(1, 2, 3), reading_sd=sds, **MAKE),
        *loop(chance, "ADEFDA", run="2", start=86400.0, counts=(1, 2), reading_sd=sds, bias=MILLIGAL, **MAKE),
    ]
    if quick:
        for n in range(1, len(rows)):
            if (rows[n].run, rows[n].station) == (rows[n - 1].run, rows[n - 1].station):
                rows[n] = replace(rows[n], time=rows[n - 1].time + 1e-3)
    return rows


def adjusted(rows, meter=METER, *, wide=False, recipe=FIXED):
    """The adjusted network; `wide` in many blocks."""
    with pytest.MonkeyPatch.context() as patch:
        if wide:
            in_bands(patch)
        return reduce(made_case(rows, instruments=(meter,), recipe=recipe)).network.adjustment


def without(rows, row, meter=METER):
    """The network in which one reading has a hundred thousand times its sd: it says nothing."""
    return adjusted([replace(one, reading_sd=1e6 * MICROGAL) if n == row else one for n, one in enumerate(rows)], meter)


@pytest.mark.parametrize("seed", [1, 2])
def test_the_error_of_a_reading_is_what_all_others_say_it_is(seed):
    rows = two_runs(seed)
    fit = adjusted(rows)
    tried = 0
    for row in range(len(rows)):
        error = fit.checked.error[row]
        if np.isnan(error):
            assert fit.checked.redundancy[row] < 1e-8 and np.isnan(fit.checked.predicted[row])
            continue
        # Its residual, visit effect out, is then how far it is off what all others say of it.
        assert error == pytest.approx(without(rows, row).residual[row], abs=1e-5 * MICROGAL)
        # The same rise by a change of the reading: of the error all of it.
        step = 20 * MICROGAL
        moved = [replace(one, reading=one.reading + step * (n == row)) for n, one in enumerate(rows)]
        assert adjusted(moved).checked.error[row] - error == pytest.approx(step, rel=1e-6)
        tried += 1
    assert tried > len(rows) // 2


@pytest.mark.parametrize("seed", [1, 2])
def test_its_variance_is_that_of_what_all_others_say(seed):
    """The sum over all other readings of the squares of the error's answers times their noise.

    The answer to each reading is found by changing it; noise within visits is each reading's own, re-seating is shared
    within a visit, that of the reading's own visit too. Nothing is known of the drift rate beforehand.
    """
    rows, free = two_runs(seed), replace(METER, drift_rate_sd=np.inf)
    fit = adjusted(rows, free)
    step, count = 100 * MICROGAL, len(rows)
    answer = np.zeros((count, count))
    for row in range(count):
        moved = [replace(one, reading=one.reading + step * (n == row)) for n, one in enumerate(rows)]
        answer[:, row] = (adjusted(moved, free).checked.error - fit.checked.error) / step
    noise, seat = np.empty(count), fit.reseating.variance
    noise[fit.visits.rows] = fit.noise.sd**2
    told = np.flatnonzero(~np.isnan(fit.checked.error)).tolist()
    assert len(told) > count // 2
    for row in told:
        assert answer[row, row] == pytest.approx(1.0, rel=1e-6)
        variance = np.delete(answer[row], row) ** 2 @ np.delete(noise, row)
        for visit in range(len(seat)):
            at = fit.visits.rows[fit.visits.start[visit] : fit.visits.start[visit + 1]]
            variance += seat[visit] * answer[row, at].sum() ** 2
        assert fit.checked.predicted[row] == pytest.approx(variance, rel=1e-5)


def test_in_visits_of_minutes_it_is_so_within_a_percent():
    rows = two_runs(quick=False)
    fit = adjusted(rows)
    told = np.flatnonzero(~np.isnan(fit.checked.error)).tolist()
    wanted = np.array([without(rows, row).residual[row] for row in told])
    np.testing.assert_allclose(fit.checked.error[told], wanted, rtol=0.01, atol=0.01 * MICROGAL)


@pytest.mark.parametrize("way", ["chain", "base"])
def test_bands_check_as_one_block_does(way):
    rows = many_runs(way, runs=34 if way == "base" else 14).rows
    wide, small = (adjusted(rows, METER_OF_MANY, wide=one) for one in (True, False))
    assert wide.design.layout.count > 1 and small.design.layout.count == 1
    for name in ("visit_effect", "residual", "error", "predicted", "redundancy", "standardised"):
        first, second = getattr(wide.checked, name), getattr(small.checked, name)
        np.testing.assert_array_equal(np.isnan(first), np.isnan(second))
        scale = {"redundancy": 1.0, "standardised": 1.0, "predicted": MICROGAL**2}.get(name, MICROGAL)
        np.testing.assert_allclose(first / scale, second / scale, rtol=1e-6, atol=1e-6)


def test_a_row_out_of_use_is_told_its_residual_and_nothing_else():
    rows = [replace(row, use=n != 4) for n, row in enumerate(two_runs())]
    checked = adjusted(rows).checked
    assert np.isfinite(checked.residual[4])
    for name in ("visit_effect", "standardised", "redundancy", "error", "predicted"):
        assert np.isnan(getattr(checked, name)[4])


def test_weighted_means_over_visits():
    start, weight = np.array([0, 2, 3]), np.array([0.25, 0.75, 1.0])
    np.testing.assert_allclose(visit_means(weight, np.array([4.0, 8.0, 5.0]), start), [7.0, 5.0])
    both = visit_means(weight, np.array([[4.0, 0.0], [8.0, 4.0], [5.0, 1.0]]), start)
    np.testing.assert_allclose(both, [[7.0, 3.0], [5.0, 1.0]])
