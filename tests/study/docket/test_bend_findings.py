"""Stops that cannot tell a bend of the drift: named with what it would do, against dense algebra and bent drifts."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import MICROGAL, Row
from plumbwell.reduction import bend
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Tare
from reduced_surveys import MINE, reduced
from simulated_surveys import (
    EVERY_FIFTH,
    Scheme,
    base_returns,
    loops,
    mixed_trips,
    one_pass,
    simulated,
    there_and_back,
    trips,
)

BACK = Scheme(stops=there_and_back(12))
TRIPS = Scheme(stops=trips(10, 4))
GIVEN = {"noise": "as_given"}


def bent_sds(results):
    """Sds of the bends of all runs, m/s2, by dense least squares with every quadratic term free, and of one visit."""
    fit, visits = results.network.adjustment, results.network.visits
    rows = results.survey.readings
    time, weight = rows.time.values, fit.noise.weight
    runs = visits.run_order.tolist()
    columns = [visits.station == one for one in range(1, len(results.stations))]
    for run in runs:
        mine = visits.run == run
        past = (time[visits.rows] - visits.run_start[run]) / visits.run_length[run]
        for power in range(3):
            columns.append(np.where(mine, np.add.reduceat(weight * past**power, visits.start[:-1]), 0.0))
    variance = fit.noise.variance + fit.reseating.variance
    design = np.column_stack(columns).astype(float)
    normal = design.T @ (design / (variance / MICROGAL**2)[:, None])
    for number, run in enumerate(runs):
        row = np.zeros(design.shape[1])
        first = len(results.stations) - 1 + 3 * number
        row[first + 1 : first + 3] = 1.0
        sd = fit.basis.rate_sd[run] * visits.run_length[run] / MICROGAL
        normal += np.outer(row, row) / sd**2
    quadratic = len(results.stations) - 1 + 3 * np.arange(len(runs)) + 2
    return np.sqrt(np.diag(np.linalg.inv(normal))[quadratic]) / 6.0 * MICROGAL, float(np.sqrt(np.median(variance)))


def with_return(one, station, run):
    """The survey with one more visit of a station in the middle of a run."""
    readings = one.case.survey.readings
    time = one.time[one.run == run]
    rows = [
        Row(time=t, reading=value, depth=deep, station=readings.station.names[at], run=readings.run.names[of])
        for t, value, deep, at, of in zip(
            readings.time.values.tolist(), readings.reading.values.tolist(), readings.depth.values.tolist(),
            readings.station.code.tolist(), readings.run.code.tolist(), strict=True,
        )
    ]
    like = next(row for row in rows if row.station == station and row.run == str(run))
    middle = 0.5 * (time[0] + time[-1])
    return sorted([*rows, replace(like, time=middle)], key=lambda row: (row.run, row.time))


@pytest.mark.parametrize(("scheme", "runs"), [(BACK, 1), (TRIPS, 4)])
def test_what_cannot_tell_a_bend_is_named_with_how_little_it_is_known(scheme, runs, found):
    results = reduce(simulated(scheme, 5).case)
    (one,) = found(results, "bend_untold")
    sds, visit_sd = bent_sds(results)
    assert one.severity == "look" and len(sds) == runs and (sds > 2.0 * visit_sd).all()
    assert f"known only to ± {sds.max() / MICROGAL:.1f} µGal, {sds.max() / visit_sd:.1f} times the noise" in one.text
    assert one.place == ("run 0" if runs == 1 else "runs 0, 1, 2 and 3")
    assert one.stations == tuple(range(scheme.stations))


@pytest.mark.parametrize("scheme", [BACK, TRIPS])
def test_a_bend_of_that_size_does_move_the_densities_so_far_and_is_not_seen(scheme, found):
    """The word of the finding, by the same noise with all drifts bent and with none."""
    straight = reduce(simulated(scheme, 5, **GIVEN).case)
    sds, _ = bent_sds(straight)
    bent = reduce(simulated(replace(scheme, bend=float(sds.max())), 5, **GIVEN).case)
    assert set(bent.network.adjustment.orders) == {1}
    moved = np.abs(bent.intervals.density.values - straight.intervals.density.values) / 1000.0
    (one,) = found(straight, "bend_untold")
    most = int(np.argmax(moved))
    pair = f"{straight.intervals.from_station[most]} to {straight.intervals.to_station[most]}"
    assert f"would move densities by up to {moved[most]:.3f} g/cm³ ({pair}, sd " in one.text
    np.testing.assert_array_equal(bent.intervals.density_sd.values, straight.intervals.density_sd.values)


@pytest.mark.parametrize(("scheme", "run"), [(BACK, 0), (TRIPS, 3)])
def test_the_return_that_it_asks_for_tells_the_bend_as_well_as_it_says(scheme, run, found):
    from made_surveys import made_case
    from simulated_surveys import EXACT_DEPTHS, honest_instrument

    survey = simulated(scheme, 5, **GIVEN)
    (one,) = found(reduce(survey.case), "bend_untold")
    assert one.mend.startswith("Read S000 once more near ") and f"the middle of run {run}: that would tell" in one.mend
    rows = with_return(survey, "S000", run)
    mended = reduce(made_case(rows, instruments=(honest_instrument(scheme),), recipe=EXACT_DEPTHS, **GIVEN))
    assert not found(mended, "bend_untold")
    sds, visit_sd = bent_sds(mended)
    assert f"tell the bend to ± {sds.max() / MICROGAL:.1f} µGal." in one.mend
    assert sds.max() < 2.0 * visit_sd


@pytest.mark.parametrize(
    "stops", [EVERY_FIFTH.stops, loops(9, 2), base_returns(16, 5), base_returns(16, 2), mixed_trips(10, 4)]
)
def test_patterns_that_tell_a_bend_stay_silent(stops, found):
    results = reduce(simulated(Scheme(stops=stops), 5).case)
    sds, visit_sd = bent_sds(results)
    assert (sds < visit_sd).all() and not found(results, "bend_untold")


def test_where_nothing_at_all_tells_it_a_bend_of_ten_sds_is_spoken_of(found):
    results = reduce(simulated(Scheme(stops=trips(10, 1)), 5).case)
    (one,) = found(results, "bend_untold")
    visit_sd = bent_sds(results)[1]
    assert "would not be known at all" in one.text
    assert f"one of {10.0 * visit_sd / MICROGAL:.1f} µGal, 10 times the noise of a visit, would move" in one.text


def test_what_a_person_decided_or_another_finding_tells_needs_no_word(found):
    assert not found(reduce(simulated(BACK, 5, drift_order=1).case), "bend_untold")
    assert not found(reduce(simulated(BACK, 5, drift_walk=1e-10).case), "bend_untold")
    alone = reduce(simulated(Scheme(stops=one_pass(10)), 5).case)
    assert found(alone, "no_repeat") and not found(alone, "bend_untold")


def test_a_tare_within_a_visit_hides_no_bend(found):
    three = replace(BACK, readings=3)
    survey = simulated(three, 5)
    time = float(survey.time[survey.visit == 4][1])
    case = Case(survey=replace(survey.case.survey, tares=(Tare(run="0", time=time),)))
    assert found(reduce(case), "bend_untold")
    steady = simulated(replace(three, stops=loops(6, 3)), 5)
    time = float(steady.time[steady.visit == 4][1])
    case = Case(survey=replace(steady.case.survey, tares=(Tare(run="0", time=time),)))
    assert not found(reduce(case), "bend_untold")


def test_very_many_runs_are_not_asked(found, monkeypatch):
    case = simulated(TRIPS, 5).case
    monkeypatch.setattr(bend, "MOST_UNKNOWNS", 10)
    assert not found(reduce(case), "bend_untold")
    monkeypatch.setattr(bend, "MOST_UNKNOWNS", 11)
    assert found(reduce(case), "bend_untold")


def test_a_bend_known_to_a_little_under_two_sds_is_a_near_miss(found):
    results = reduced(MINE)
    fit = results.network.adjustment
    asked = bend.bends(fit, tuple(fit.visits.run_order.tolist()))
    assert asked is not None and 1.5 < asked.sd.max() / asked.visit_sd < 2.0
    assert not found(results, "bend_untold")
