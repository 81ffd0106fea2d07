"""The instrument's scale factor from ties: against the truth of invented surveys and against dense least squares."""

import json
from dataclasses import replace

import numpy as np
import pytest

from made_surveys import HOUR, MICROGAL, MILLIGAL, STILL, loop, made_case
from plumbwell.files.summary import summary_text
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

LABELS = "ABCDEFGH"
DEPTH = {name: 300.0 * n for n, name in enumerate(LABELS)}
GRAVITY = {name: 27.0 * MILLIGAL * n for n, name in enumerate(LABELS)}
LEVEL = 9.8
A = Instrument(name="A", reading_floor=2 * MICROGAL, reseating_sd=3 * MICROGAL, station_floor=0.0,
               drift_rate_sd=1.0 * MILLIGAL / HOUR)  # fmt: skip
B = replace(A, name="B")
TRUE = {"A": 1.0005, "B": 0.9993}
NAMES = {"scale_factor": "estimate", "drift_order": 1, "drift_walk": "off"}


def rows_of(seed, stops="ABCDEFGHGFEDCBA", instrument="A", run="1", start=0.0):
    """Rows of an instrument whose readings have to be multiplied by its true scale."""
    rows = loop(
        np.random.default_rng(seed), stops, depth=DEPTH, gravity=GRAVITY, run=run, start=start, counts=(2,),
        instrument=instrument, reading_noise=2 * MICROGAL, reseating=3 * MICROGAL, bias=40.0 * MILLIGAL,
    )  # fmt: skip
    return [replace(row, reading=row.reading / TRUE[instrument]) for row in rows]


def ties_of(seed, names, sd=4.0):
    """Ties with errors of their own."""
    chance = np.random.default_rng(1000 + seed)
    return {
        one: (LEVEL + GRAVITY[one] + sd * MICROGAL * chance.standard_normal(), sd * MICROGAL) for one in names
    }


def reduced(rows, ties, meters=(A,), **changed):
    """Results with the scale estimated, unless asked otherwise."""
    return reduce(made_case(rows, instruments=meters, ties=ties, recipe=replace(STILL, **{**NAMES, **changed})))


def by_least_squares(results, ties, factor):
    """Scale and its sd: the tied stations' gravity times the scale and a level against the ties, by GLS.

    Gravity and its covariance are those of the readings alone; `factor` is what their errors are multiplied by.
    """
    at = [results.stations.label.index(name) for name in ties]
    gravity = results.stations.gravity.values[at]
    covariance = results.network.gravity.independent().matrix()[np.ix_(at, at)] * factor**2
    whole = covariance + np.diag([sd**2 for _, sd in ties.values()])
    design = np.column_stack([gravity, np.ones(len(at))])
    solved = np.linalg.solve(whole, design)
    normal = design.T @ solved
    values = solved.T @ (np.array([value for value, _ in ties.values()]) - LEVEL)
    return np.linalg.solve(normal, values)[0], np.sqrt(np.linalg.inv(normal)[0, 0])


@pytest.mark.parametrize("noise", ["estimate", "as_given"])
@pytest.mark.parametrize("names", ["AH", "AEH", "BCFG"])
@pytest.mark.parametrize("seed", [1, 2])
def test_the_scale_of_one_instrument_is_that_of_least_squares(seed, names, noise):
    rows, ties = rows_of(seed), ties_of(seed, names)
    results = reduced(rows, ties, noise=noise)
    (found,) = results.network.scales
    assert found.instrument == "A" and found.told
    assert abs(found.scale - 1.0005) < 3.0 * found.sd and found.sd < 6e-5
    if noise == "as_given":
        alone = reduced(rows, None, noise=noise)
        wanted, sd = by_least_squares(alone, ties, factor=1.0)
        # Gravity of the tied stations as all say stands for that of the readings alone: apart by some uGal in 100 mGal.
        assert found.scale == pytest.approx(wanted, abs=0.01 * sd)
        # The errors of the readings are multiplied by 1.0005 or not.
        assert found.sd == pytest.approx(sd, rel=2e-3)


def test_densities_are_those_of_a_meter_without_error_of_scale():
    rows, ties = rows_of(3), ties_of(3, "AH", sd=0.5)
    right = [replace(row, reading=row.reading * TRUE["A"]) for row in rows]
    estimated, given = reduced(rows, ties), reduced(rows, ties, scale_factor="given")
    # One tie gives the level and leaves the differences to the readings.
    known = reduced(right, {"A": ties["A"]}, scale_factor="given")
    one_sd = known.intervals.density_sd.values
    off = (estimated.intervals.density.values - known.intervals.density.values) / one_sd
    # The scale's own error, 2e-5 of 27 mGal per 300 m, is 0.02 kg/m3: a tenth of an sd. One 5e-4 off is 0.5 kg/m3.
    assert np.abs(off).max() < 0.3
    unscaled = given.intervals.density.values - known.intervals.density.values
    assert np.median(np.abs(unscaled)) > 5.0 * np.median(np.abs(off * one_sd))
    # Its doubt is an error that all densities share: sd of the scale times 90 nGal per m over 4 pi G.
    (scale,) = estimated.network.scales
    share = estimated.intervals.errors.factors["scale A"]
    gradient = np.diff(estimated.stations.gravity.values)[0] / 300.0
    assert np.median(np.abs(share)) == pytest.approx(scale.sd * gradient / (4.0 * np.pi * 6.6743e-11), rel=0.02)
    assert known.intervals.errors.factors.get("scale A") is None


def test_the_sd_of_the_scale_is_honest():
    """Chi-square of twenty surveys: mean 1 +- sqrt(2/20)."""
    ratio = []
    for seed in range(20):
        (found,) = reduced(rows_of(seed), ties_of(seed, "ADH"), noise="as_given").network.scales
        ratio.append((found.scale - TRUE["A"]) / found.sd)
    assert abs(np.mean(np.square(ratio)) - 1.0) < 3.0 * np.sqrt(2.0 / 20.0)
    assert abs(np.mean(ratio)) < 3.0 / np.sqrt(20.0)


def test_two_instruments_that_share_stations_are_both_told_where_ties_bound_one():
    # Meter B reads four stations between the ties and none of the tied ones.
    rows = rows_of(5) + rows_of(6, "CDEFEDC", instrument="B", run="2", start=2 * 86400.0)
    ties = ties_of(5, "AH")
    results = reduced(rows, ties, (A, B), noise="as_given")
    first, second = results.network.scales
    assert (first.instrument, second.instrument) == ("A", "B") and first.told and second.told
    for one in (first, second):
        assert abs(one.scale - TRUE[one.instrument]) < 3.0 * one.sd
    (alone,) = reduced(rows_of(5), ties, (A,), noise="as_given").network.scales
    # Nothing that B reads helps A; B is told through A: by 81 mGal of four stations, not by 189.
    assert first.sd == pytest.approx(alone.sd, rel=2e-3)
    assert first.scale == pytest.approx(alone.scale, abs=0.02 * alone.sd)
    by_a = [reduced(some, None, (A, B), noise="as_given") for some in (rows[:30], rows[30:])]
    wanted, sd = by_stations(*by_a, scale=first)
    assert second.scale == pytest.approx(wanted, abs=0.02 * sd) and second.sd == pytest.approx(sd, rel=5e-3)


def by_stations(of_a, of_b, *, scale):
    """Scale of B and its sd by the stations that A has read too, and A's scale with its doubt."""
    labels = of_b.stations.label
    at = [of_a.stations.label.index(name) for name in labels]
    a, b = of_a.stations.gravity.values[at] * scale.scale, of_b.stations.gravity.values
    whole = of_a.network.gravity.independent().matrix()[np.ix_(at, at)] + of_b.network.gravity.independent().matrix()
    design = np.column_stack([b - b.mean(), np.ones(len(b))])
    # Both datums without error: a constant is free, so that rounding aside an error common to all changes nothing.
    whole = whole + (10 * MICROGAL) ** 2
    solved = np.linalg.solve(whole, design)
    inverse = np.linalg.inv(design.T @ solved)
    answer = inverse @ solved.T @ a
    return answer[0], np.hypot(np.sqrt(inverse[0, 0]), scale.sd / scale.scale * answer[0])


@pytest.mark.parametrize("ties", ["", "D"])
def test_one_tie_or_none_tells_no_scale(ties):
    rows = rows_of(7)
    results = reduced(rows, ties_of(7, ties))
    given = reduced(rows, ties_of(7, ties), scale_factor="given")
    np.testing.assert_array_equal(results.intervals.density.values, given.intervals.density.values)
    assert [(one.scale, one.sd, one.told) for one in results.network.scales] == [(1.0, 0.0, False)] * bool(ties)
    assert "scale_untold" in {one.code for one in results.findings}
    told = json.loads(summary_text(results, outputs=[]))["scale_factors"]
    assert told == [{"instrument": "A", "scale": 1.0, "sd": None}] * bool(ties)


def test_two_ties_at_one_station_or_at_like_gravity_tell_no_scale():
    level = {**GRAVITY, "H": GRAVITY["A"]}
    rows = [
        replace(row, reading=row.reading - (GRAVITY["H"] if row.station == "H" else 0.0)) for row in rows_of(8)
    ]
    ties = {name: (LEVEL + level[name], 4 * MICROGAL) for name in ("A", "H")}
    results = reduced(rows, ties)
    (found,) = results.network.scales
    assert not found.told and found.scale == 1.0


def test_an_instrument_that_nothing_bounds_stays_as_given_beside_one_that_is_told():
    rows = rows_of(9) + rows_of(10, "DD", instrument="B", run="2", start=2 * 86400.0)
    results = reduced(rows, ties_of(9, "AH"), (A, B))
    first, second = results.network.scales
    assert first.told and not second.told and (second.scale, second.sd) == (1.0, 0.0)


def test_the_summary_tells_the_scale():
    results = reduced(rows_of(1), ties_of(1, "AH"))
    (found,) = results.network.scales
    (told,) = json.loads(summary_text(results, outputs=[]))["scale_factors"]
    assert told["instrument"] == "A"
    assert told["scale"] == pytest.approx(found.scale, rel=1e-11) and told["sd"] == pytest.approx(found.sd, rel=1e-6)
    given = json.loads(summary_text(reduced(rows_of(1), ties_of(1, "AH"), scale_factor="given"), outputs=[]))
    assert given["scale_factors"] == []


def test_a_stated_scale_is_where_the_estimate_starts_and_does_not_hold_it():
    rows, ties = rows_of(2), ties_of(2, "AEH")
    (plain,) = reduced(rows, ties).network.scales
    (from_far,) = reduced(rows, ties, (replace(A, scale=1.002, scale_sd=1e-6),)).network.scales
    assert from_far.scale == pytest.approx(plain.scale, abs=0.01 * plain.sd)
    assert from_far.sd == pytest.approx(plain.sd, rel=0.01)
