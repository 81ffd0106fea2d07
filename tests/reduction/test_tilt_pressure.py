"""Tilt and air pressure corrections: sizes worked out by hand, what is refused and why."""

import numpy as np
import pytest

from plumbwell.reduction.tilt_pressure import pressure_effect, tilt
from plumbwell.survey.column import constant_column, frozen_index
from plumbwell.survey.instrument import Instrument

ARCSECOND = np.pi / 648000.0
MICROGAL = 1e-8
A = (Instrument(name="A"),)


def test_tilt_is_added_in_proportion_to_the_whole_gravity_at_the_station(made_readings):
    angle = np.array([10.0, 30.0, 60.0]) * ARCSECOND
    readings = made_readings(np.full(3, 0.02), tilt_x=angle, tilt_y=[0.0, np.nan, 0.0])
    gravity = constant_column("normal_gravity", "m/s2", [9.7, 9.81])
    found = tilt(readings, A, gravity=gravity, station_rows=frozen_index([1, 1, 0]))
    # gamma x^2/2, whose next term is a thousand millionth of it.
    assert found.values == pytest.approx(np.array([9.81, 9.81, 9.7]) * angle**2 / 2, rel=1e-7)
    assert (found.values / MICROGAL).round(2).tolist() == [1.15, 10.38, 41.04]


def test_sizes_at_ten_thirty_and_sixty_seconds_of_arc(made_readings):
    readings = made_readings(np.zeros(3), tilt_x=np.zeros(3), tilt_y=np.array([10.0, 30.0, 60.0]) * ARCSECOND)
    found = tilt(readings, A, gravity=constant_column("normal_gravity", "m/s2", [9.8] * 3), station_rows=None)
    assert [f"{value:.3g}" for value in found.values / MICROGAL] == ["1.15", "10.4", "41.5"]


def test_both_tilts_work_together_without_loss_of_digits(made_readings):
    x, y = 3e-7, 4e-7
    readings = made_readings([0.0], tilt_x=[x], tilt_y=[y])
    found = tilt(readings, A, gravity=constant_column("normal_gravity", "m/s2", [9.8]), station_rows=None)
    assert found.values[0] == pytest.approx(9.8 * (x * x + y * y) / 2, rel=1e-12)


def test_no_tilt_correction_where_the_instrument_made_it_or_gives_none(made_readings):
    gravity = constant_column("normal_gravity", "m/s2", [9.8] * 3)
    readings = made_readings(
        np.zeros(3), instrument=["A", "B", "B"], tilt_x=[1e-4, 1e-4, np.nan], tilt_y=[1e-4, 1e-4, np.nan]
    )
    found = tilt(
        readings,
        (Instrument(name="A", applied=("tilt",)), Instrument(name="B")),
        gravity=gravity,
        station_rows=None,
    )
    assert found.values == pytest.approx([0.0, 9.8e-8, 0.0], rel=1e-6)
    assert [found.worked(row) for row in range(3)] == pytest.approx(found.values.tolist(), rel=1e-12)
    assert not tilt(made_readings(np.zeros(3)), A, gravity=gravity, station_rows=None).values.any()


def effects(readings, instruments=A, *, barometer=0.0, rows=None, depth=None):
    depth = np.zeros(len(readings)) if depth is None else np.asarray(depth, dtype=float)
    return pressure_effect(
        readings,
        instruments,
        admittance=-0.3 * MICROGAL / 100.0,
        barometer_elevation=barometer,
        rows=rows,
        depth_below_ground=depth,
    )


def test_higher_pressure_lowers_gravity_by_its_admittance(made_readings):
    readings = made_readings(np.zeros(3), pressure=[101325.0, 102325.0, np.nan])
    found = effects(readings)
    assert found.column.values == pytest.approx([0.0, -3.0 * MICROGAL, 0.0], abs=1e-20)
    assert [found.column.worked(row) for row in range(3)] == found.column.values.tolist()
    (fact,) = found.facts
    assert (fact.instrument, fact.run, fact.rows, fact.reason) == ("A", "1", 2, "")
    assert fact.largest == pytest.approx(1000.0) and fact.largest_row == 1 and np.isnan(fact.rise)


def test_the_barometer_may_go_with_the_instrument(made_readings):
    # 954.6081348 and 1013.25 hPa are standard at 500 m and at sea level.
    readings = made_readings(np.zeros(2), pressure=[101325.0, 95460.81348])
    height = constant_column("elevation", "m", [500.0, 0.0])
    found = effects(readings, barometer=height, rows=frozen_index([1, 0]))
    assert found.column.values == pytest.approx([0.0, 0.0], abs=1e-14)


def test_a_pressure_far_from_the_standard_is_refused_for_its_whole_run_only(made_readings):
    readings = made_readings(
        np.zeros(5),
        run=["1", "1", "2", "2", "3"],
        pressure=[101425.0, 109400.0, 101425.0, np.nan, 150000.0],
        use=[True, True, True, True, False],
    )
    found = effects(readings)
    assert found.column.values / MICROGAL == pytest.approx([0.0, 0.0, -0.3, 0.0, 0.0])
    assert [(fact.run, fact.reason, fact.rows) for fact in found.facts] == [("1", "far", 2), ("2", "", 1)]
    assert found.facts[0].largest == pytest.approx(8075.0) and found.facts[0].largest_row == 1


def test_a_wild_pressure_in_a_row_out_of_use_refuses_nothing(made_readings):
    readings = made_readings(np.zeros(2), pressure=[101425.0, 5e6], use=[True, False])
    found = effects(readings)
    assert found.facts[0].reason == ""
    assert found.column.values / MICROGAL == pytest.approx([-0.3, 0.0])


@pytest.mark.parametrize(("rise", "reason"), [(1.9, ""), (2.1, "rises"), (12.0, "rises"), (-12.0, "")])
def test_a_pressure_that_rises_with_depth_is_not_the_free_airs(made_readings, rise, reason):
    depth = np.array([0.0, 100.0, 200.0, 300.0])
    readings = made_readings(np.zeros(4), pressure=101325.0 + rise * depth)
    found = effects(readings, depth=depth)
    assert found.facts[0].reason == reason
    assert found.facts[0].rise == pytest.approx(rise)
    assert found.column.values.any() == (reason == "")


def test_less_than_ten_metres_of_depth_say_nothing_about_a_rise(made_readings):
    readings = made_readings(np.zeros(2), pressure=[101325.0, 101425.0])
    assert effects(readings, depth=[0.0, 9.9]).facts[0].reason == ""
    assert effects(readings, depth=[0.0, 10.0]).facts[0].reason == "rises"


def test_what_the_instrument_has_taken_out_stays_out(made_readings):
    readings = made_readings(np.zeros(2), pressure=[102325.0, 102325.0], instrument=["A", "B"])
    found = effects(readings, (Instrument(name="A", applied=("pressure",)), Instrument(name="B")))
    assert found.column.values / MICROGAL == pytest.approx([0.0, -3.0])
    assert [fact.reason for fact in found.facts] == ["in reading", ""]


def test_without_pressures_there_is_no_effect_and_no_fact(made_readings):
    found = effects(made_readings(np.zeros(2)))
    assert not found.column.values.any() and found.facts == ()
