"""Jumps of the instrument that nobody listed, found in invented surveys whose truth is known."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import f as f_law
from scipy.stats import norm

from made_surveys import HOUR, MICROGAL, MILLIGAL, STILL, loop, made_case
from plumbwell.files.summary import variance_components
from plumbwell.reduction.candidates import jumps
from plumbwell.reduction.run_terms import RunTerms
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Tare
from simulated_surveys import EVERY_FIFTH, EXACT_DEPTHS, FEW_RETURNS, QUIET, Scheme, base_returns, simulated

ONE_TARE = replace(QUIET, tares=1)
APPLIED = replace(EXACT_DEPTHS, tares="proposed")
METER = Instrument(
    name="A", reading_floor=2 * MICROGAL, reseating_sd=3 * MICROGAL, drift_rate_sd=0.05 * MILLIGAL / HOUR
)
LABELS = "ABCDEFGH"
MAKE = {
    "depth": {name: 40.0 * n for n, name in enumerate(LABELS)},
    "gravity": {name: 3.6 * MILLIGAL * n for n, name in enumerate(LABELS)},
    "reading_noise": 2 * MICROGAL,
    "reseating": 2 * MICROGAL,
}


def four_loops(seed, changes):
    """Readings of four loops past eight stations, one a visit, changed by so many uGal: row -> change."""
    rows = loop(np.random.default_rng(seed), LABELS * 4, counts=(1,), **MAKE)
    return [replace(row, reading=row.reading + changes.get(n, 0.0) * MICROGAL) for n, row in enumerate(rows)]


def network_of(rows, **changed):
    """The network of the rows; keys of the recipe as given."""
    return reduce(made_case(rows, instruments=(METER,), recipe=replace(STILL, **changed))).network


def neighbours(one, time):
    """Last reading before a time and first after it."""
    return one.time[one.time < time].max(), one.time[one.time > time].min()


@pytest.mark.parametrize("seed", [0, 1, 2, 4, 5, 8, 10])
def test_a_jump_is_found_with_its_gap_its_size_and_its_sd(seed):
    one = simulated(ONE_TARE, seed, drift_order=1, drift_walk="off")
    (true,), network = one.tares, reduce(one.case).network
    (found,) = network.proposed
    assert (found.run, found.visits_between, found.one_visit) == (0, 0, False)
    assert (found.gap_from, found.gap_to) == neighbours(one, true.time)
    assert found.time == 0.5 * (found.gap_from + found.gap_to)
    # Student's t of 21 degrees of freedom or so: beyond 3.8 once in a thousand.
    assert abs(found.size - true.size) < 3.8 * found.sd and 1.0 * MICROGAL < found.sd < 4.0 * MICROGAL
    # Size and sd are those of the same survey with the jump listed.
    listed = replace(one.case, survey=replace(one.case.survey, tares=(Tare(run="0", time=found.time),)))
    again = reduce(listed).network
    (unknown,) = (each for each in again.adjustment.design.unknowns if each.kind == "tare")
    assert again.adjustment.unknown(unknown) == pytest.approx((found.size, found.sd), rel=1e-4)
    assert again.proposed == ()
    freedom = again.adjustment.reseating.freedom
    gaps = sum(len(each.gain) for each in jumps(RunTerms(again.adjustment.solution), again.visits))
    assert found.p == pytest.approx(min(gaps * f_law.sf((found.size / found.sd) ** 2, 1, freedom), 1.0), rel=1e-2)
    assert found.p < 0.01 * gaps / (gaps - 1) and found.gain > 5.0


def test_a_found_jump_is_taken_out_when_the_recipe_says_so():
    one = simulated(ONE_TARE, 0)
    flagged, taken = reduce(one.case), reduce(simulated(ONE_TARE, 0, recipe=APPLIED).case)
    assert not flagged.network.proposed_applied and taken.network.proposed_applied
    (found,) = taken.network.proposed
    listed = replace(one.case, survey=replace(one.case.survey, tares=(Tare(run="0", time=found.time),)))
    known = reduce(listed)
    np.testing.assert_allclose(taken.intervals.density.values, known.intervals.density.values, rtol=1e-9)
    np.testing.assert_allclose(taken.intervals.density_sd.values, known.intervals.density_sd.values, rtol=1e-9)
    assert np.mean(taken.intervals.density_sd.values) < 0.5 * np.mean(flagged.intervals.density_sd.values)
    assert [what.kind for what in flagged.network.adjustment.design.unknowns].count("tare") == 0
    # In front of the jump nothing is moved, behind it all.
    drift = taken.readings.estimates.drift.values
    step = drift[one.time == found.gap_to] - drift[one.time == found.gap_from]
    assert step[0] == pytest.approx(one.tares[0].size, abs=12 * MICROGAL)


@pytest.mark.parametrize("seed", [0, 2, 5, 8])
def test_among_stations_read_once_a_jump_lies_between_two_returns_to_the_base(seed):
    # 24 stations, eight returns: 7 degrees of freedom; three stations in each round.
    scheme = Scheme(stops=base_returns(24, 8), tares=1, tare_size=80 * MICROGAL)
    one = simulated(scheme, seed, drift_order=1, drift_walk="off")
    (true,) = one.tares
    (found,) = reduce(one.case).network.proposed
    at_base = one.time[one.station == 0]
    assert found.gap_from == at_base[at_base < true.time].max() and found.gap_to == at_base[at_base > true.time].min()
    between = (one.time > found.gap_from) & (one.time < found.gap_to)
    assert found.visits_between == np.count_nonzero(between) > 1
    assert abs(found.size - true.size) < 5.4 * found.sd  # t of 6 degrees of freedom: once in 600


@pytest.mark.parametrize(("row", "sign"), [(31, 1.0), (0, -1.0)], ids=["last", "first"])
def test_a_bad_visit_at_an_end_is_a_jump_as_well(row, sign):
    network = network_of(four_loops(1, {row: 60.0}))
    assert network.outlier_rows.tolist() == [row] and not network.judgement.alike.any()
    (found,) = network.proposed
    assert found.one_visit and found.visits_between == 0
    error = float(network.judgement.error[0])
    assert found.size == pytest.approx(sign * error, rel=1e-9) and error == pytest.approx(60 * MICROGAL, abs=1e-7)
    rows = four_loops(1, {})
    ends = (rows[30].time, rows[31].time) if row else (rows[0].time, rows[1].time)
    assert (found.gap_from, found.gap_to) == ends
    assert found.size / found.sd == pytest.approx(sign * float(network.judgement.ratio[0]), rel=1e-9)
    # Left out as a reading it needs no jump beside it.
    both = network_of(four_loops(1, {row: 60.0}), tares="proposed", outliers="exclude")
    assert not both.proposed_applied and len(both.visits) == 31
    assert network_of(four_loops(1, {row: 60.0}), tares="proposed").proposed_applied


def test_a_jump_before_the_last_two_visits_is_no_outlier():
    network = network_of(four_loops(1, {30: 60.0, 31: 60.0}))
    (found,) = network.proposed
    assert not found.one_visit and network.outlier_rows.size == 0
    assert found.size == pytest.approx(60 * MICROGAL, abs=4 * found.sd)


def test_two_jumps_in_one_run():
    found_both = 0
    for seed in range(16):
        one = simulated(replace(QUIET, tares=2), seed, drift_order=1, drift_walk="off")
        network = reduce(one.case).network
        if not network.proposed:
            continue  # each hides the other
        assert len(network.proposed) == 2
        for found, true in zip(network.proposed, one.tares, strict=True):
            if (found.gap_from, found.gap_to) != neighbours(one, true.time):
                break
            assert abs(found.size - true.size) < 4.0 * found.sd
        else:
            found_both += 1
    assert found_both >= 8


def test_a_jump_and_a_bad_visit_together():
    network = network_of(four_loops(1, {**{n: 50.0 for n in range(18, 32)}, 7: -70.0}))
    (found,) = network.proposed
    rows = four_loops(1, {})
    assert (found.gap_from, found.gap_to) == (rows[17].time, rows[18].time) and not found.one_visit
    assert found.size == pytest.approx(50 * MICROGAL, abs=4 * found.sd)
    assert network.outlier_rows.tolist() == [7]
    assert network.judgement.error[0] == pytest.approx(-70 * MICROGAL, abs=14 * MICROGAL)


def test_the_jumps_of_two_runs_are_found_in_their_runs():
    rows = four_loops(1, {n: 45.0 for n in range(9, 32)})
    more = four_loops(2, {n: -45.0 for n in range(20, 32)})
    later = [replace(row, run="2", time=row.time + 2 * 86400.0) for row in more]
    network = network_of([*rows, *later])
    assert [(one.run, np.sign(one.size)) for one in network.proposed] == [(0, 1.0), (1, -1.0)]
    assert network.proposed[0].gap_to == rows[9].time and network.proposed[1].gap_to == later[20].time


@pytest.mark.parametrize("seed", range(6))
def test_bent_drift_is_no_jump(seed):
    one = simulated(replace(EVERY_FIFTH, bend=10.0 * EVERY_FIFTH.visit_sd), seed)
    network = reduce(one.case).network
    assert network.proposed == () and network.outlier_rows.size == 0 and network.adjustment.orders == (2,)


def test_few_degrees_of_freedom_show_no_jump():
    one = simulated(replace(FEW_RETURNS, tares=1, tare_size=200 * MICROGAL), 5)
    network = reduce(one.case).network
    assert network.adjustment.reseating.freedom < 5
    assert [one for one in network.proposed if not one.one_visit] == []


@pytest.mark.parametrize("seed", [0, 4, 6, 7, 18])
def test_a_jump_is_not_swallowed_by_a_walk(seed):
    results = reduce(simulated(ONE_TARE, seed, drift_walk="auto").case)
    network = results.network
    assert len(network.proposed) == 1 and network.adjustment.walk is None
    # All but one of these surveys tempt to a walk; with the jump taken out it explains nothing more.
    assert network.walk_not_needed == (seed != 18)
    taken = reduce(simulated(ONE_TARE, seed, drift_walk="auto", recipe=APPLIED).case).network
    assert taken.adjustment.walk is None and taken.proposed_applied
    codes = {one.code for one in results.findings}
    assert ("drift_walk_left_out" in codes) == network.walk_not_needed
    # It was tried: nobody may be told that the degrees of freedom, 21 or more, are too few for it.
    assert "drift_walk_untested" not in codes
    assert variance_components(results)["walk"] == 0.0


def test_noise_as_given_is_the_measure_where_the_recipe_says_so():
    rows = four_loops(3, {n: 25.0 for n in range(16, 32)})
    (found,) = network_of(rows, noise="as_given", drift_order=1).proposed
    # By the normal equations of 32 visits of 2 and 3 uGal: what stations, bias and drift leave of a step.
    station, time = np.arange(32) % 8, np.array([row.time for row in rows])
    whole = np.column_stack([station[:, None] == np.arange(8), time / time[-1], np.arange(32) >= 16]).astype(float)
    cofactor = np.linalg.inv(whole.T @ whole)
    assert found.sd == pytest.approx(np.hypot(2, 3) * MICROGAL * np.sqrt(cofactor[-1, -1]), rel=1e-3)
    # The chance is that of a normal ratio in any of 31 gaps, the gain half of its square: nothing is estimated.
    assert found.p == pytest.approx(31 * 2.0 * norm.sf(abs(found.size / found.sd)), rel=1e-6)
    assert found.p < 0.01 and found.gain == pytest.approx(0.5 * (found.size / found.sd) ** 2, rel=1e-9)
    loose = replace(METER, reseating_sd=12 * MICROGAL)
    recipe = replace(STILL, noise="as_given", drift_order=1)
    assert reduce(made_case(rows, instruments=(loose,), recipe=recipe)).network.proposed == ()
