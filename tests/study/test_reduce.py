"""The whole chain on small surveys: what a person would see go wrong first."""

from dataclasses import replace

import numpy as np
import pytest

from made_surveys import loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.instrument import Instrument

UGAL, MGAL = 1e-8, 1e-5
DEPTH = {name: 50.0 * number for number, name in enumerate("ABCDE")}
GRAVITY = {name: 0.09 * MGAL * depth for name, depth in DEPTH.items()}
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL)


def rows_of(stops="ABCDEDCBA", seed=0, **more):
    """One run with a little noise."""
    return loop(np.random.default_rng(seed), stops, depth=DEPTH, gravity=GRAVITY, **more)


def reduced(rows, **more):
    """Results with instrument A."""
    return reduce(made_case(rows, instruments=(METER,), **more))


def test_gravity_of_a_station_is_the_reading_less_all_that_is_shown_beside_it():
    results = reduced(rows_of(), tide="ephemeris")
    one, columns = results.readings, results.readings.estimates
    station = results.stations.located.placement.station
    gravity = (
        one.calibrated.values + one.tide.values + one.tilt.values - one.pressure_effect.values + one.to_station.values
        - columns.run_bias.values - columns.drift.values - columns.visit_effect.values - columns.residual.values
    )  # fmt: skip
    np.testing.assert_allclose(gravity, results.stations.gravity.values[station], rtol=0, atol=1e-16)


def test_the_truth_lies_within_its_errors():
    # A column of known density, read 40 times over: the errors say how far off the estimates are.
    model = {"1": 2300.0, "2": 2650.0}
    plain = reduced(rows_of("ABC"))
    parts, radius = plain.stations.parts, plain.stations.parts.radius.values
    delta = [0.0]
    for n, rho in enumerate(model.values()):
        flux = delta[-1] * radius[n] ** 2 - 4 * np.pi * 6.6743e-11 * rho * (radius[n] ** 3 - radius[n + 1] ** 3) / 3.0
        delta.append(flux / radius[n + 1] ** 2)
    truth = dict(zip("ABC", parts.normal_gravity.values + parts.free_air.values + np.array(delta), strict=True))
    inside = []
    for seed in range(40):
        chance = np.random.default_rng(seed)
        rows = loop(chance, "ABCBACBABC", depth=DEPTH, gravity=truth, counts=(2,))
        intervals = reduced(rows, depth_sd=0.0, datum_sd=0.0, tide="none").intervals
        off = (intervals.density.values - list(model.values())) / intervals.density_sd.values
        inside += (np.abs(off) < 1.0).tolist()
    # 80 chances at 68 %, within three of their standard deviations, and Student's t a little wider.
    assert 0.68 - 0.17 < np.mean(inside) < 0.68 + 0.17


def test_a_survey_without_a_usable_reading_says_so():
    rows = [replace(row, use=False) for row in rows_of("AB")]
    with pytest.raises(SurveyError) as told:
        reduced(rows)
    assert str(told.value) == "no reading in use belongs to a station: nothing can be reduced"


def test_one_station_has_gravity_and_no_interval():
    results = reduced(rows_of("A"))
    assert results.stations.label == ("A",) and len(results.intervals) == 0 and results.layers is None
    assert results.stations.gravity.values.tolist() == [0.0]


def test_two_readings_at_two_stations_still_give_a_density():
    results = reduced(rows_of("AB", counts=(1,)))
    assert len(results.intervals) == 1 and results.intervals.dof == 4
    # Nothing but the prior holds the drift: 0.05 mGal/h over half an hour and a minute.
    drift = results.intervals.errors.parts["drift"].variance()[0] ** 0.5
    apart = 0.05 * MGAL / 3600.0 * 1860.0 / (4 * np.pi * 6.6743e-11 * 50.0)
    assert drift == pytest.approx(apart, rel=1e-3)


def test_a_run_without_a_repeat_keeps_the_prior_of_its_drift():
    results = reduced(rows_of("ABCDE"))
    fit = results.network.adjustment
    (slope,) = (one for one in fit.design.unknowns if one.kind == "drift")
    value, sd = fit.unknown(slope)
    assert value == pytest.approx(0.0, abs=1e-15)
    assert sd / fit.basis.length[0] == pytest.approx(METER.drift_rate_sd, rel=1e-9)


def test_repeats_overrule_the_prior_at_once():
    fast = rows_of("ABCDEDCBA", drift=(2.0 * MGAL / 3600.0,))
    fit = reduced(fast).network.adjustment
    (slope,) = (one for one in fit.design.unknowns if one.kind == "drift")
    value, sd = fit.unknown(slope)
    assert value / fit.basis.length[0] == pytest.approx(2.0 * MGAL / 3600.0, rel=0.002)


def test_order_0_holds_the_rate_without_error():
    meter = replace(METER, drift_rate=0.03 * MGAL / 3600.0)
    results = reduce(made_case(rows_of(), instruments=(meter,), drift_order=0))
    rows = results.readings.utc.values
    np.testing.assert_allclose(
        results.readings.estimates.drift.values, meter.drift_rate * (rows - rows[0]), rtol=1e-12, atol=1e-20
    )
    assert results.network.adjustment.orders == (0,)
    # Only the bias is left to be free, and the datum takes it.
    np.testing.assert_allclose(results.network.gravity.drift.matrix(), 0.0, atol=1e-25)


def test_a_station_of_tower_height_has_no_reference_rock():
    depth = {"A": -20.0, "B": 0.0, "C": 60.0}
    rows = loop(
        np.random.default_rng(1), "ABCBA", depth=depth, gravity={name: 0.1 * MGAL * z for name, z in depth.items()}
    )
    results = reduced(rows)
    assert results.stations.located.positions.elevation.values.tolist() == [120.0, 100.0, 40.0]
    assert results.stations.parts.shell.values[:2].tolist() == [0.0, 0.0]
    assert results.stations.parts.shell.values[2] < 0.0


def test_progress_ends_at_one_and_names_its_parts():
    told = []
    reduce(made_case(rows_of(), instruments=(METER,)), progress=lambda share, what: told.append((share, what)))
    assert told[-1][0] == 1.0 and [share for share, _ in told] == sorted(share for share, _ in told)
    assert "network" in [what for _, what in told]


def test_many_tares_that_cannot_be_told_apart_are_held_and_named():
    from plumbwell.survey.instrument import Tare

    rows = rows_of("ABCBA", counts=(1,))
    tares = tuple(Tare(run="1", time=row.time) for row in rows[1:])
    results = reduced(rows, tares=tares)
    assert np.all(np.isfinite(results.stations.gravity.values))
    assert results.network.adjustment.design.lost or results.network.parts.count > 1
