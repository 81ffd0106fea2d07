"""What must not matter, and what must matter just so: laws that hold for any survey."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from made_surveys import loop, made_case
from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
METER = Instrument(name="A", reading_floor=0.001 * UGAL, reseating_sd=4 * UGAL, station_floor=0.0)
FEW = settings(max_examples=15)
# Rounding in a density: 64 eps of the largest reading over 4 pi G and the least thickness.
FOUR_PI_G = 4.0 * np.pi * 6.67430e-11


@st.composite
def surveys(draw):
    """Rows of two runs over a few stations; every run comes back to its first one."""
    count = draw(st.integers(3, 6))
    names = "ABCDEF"[:count]
    steps = draw(st.lists(st.integers(10, 200), min_size=count, max_size=count))
    depth = dict(zip(names, np.cumsum(steps).astype(float).tolist(), strict=True))
    gravity = {name: 0.09 * MGAL * z for name, z in depth.items()}
    chance = np.random.default_rng(draw(st.integers(0, 10**6)))
    middle = "".join(draw(st.permutations(names[1:])))
    first = names[0] + names[1:] + names[0] + middle + names[0]
    rows = loop(chance, first, depth=depth, gravity=gravity, counts=(1, 2, 4))
    second = names[0] + middle + names[0]
    return rows + loop(chance, second, depth=depth, gravity=gravity, counts=(2,), run="2", start=86400.0)


def reduced(rows, meter=METER, **more):
    """Results with one instrument."""
    return reduce(made_case(rows, instruments=(meter,), **more))


def densities_agree(one, other, room=0.0):
    """Equal densities and errors up to rounding of readings of a thousandth of gravity."""
    least = one.intervals.densities.thickness.values.min()
    atol = room + 64 * np.finfo(float).eps * 1e-2 / (FOUR_PI_G * least)
    np.testing.assert_allclose(other.intervals.density.values, one.intervals.density.values, rtol=0, atol=atol)
    np.testing.assert_allclose(other.intervals.density_sd.values, one.intervals.density_sd.values, rtol=1e-5)


@FEW
@given(rows=surveys(), constant=st.floats(-5000.0, 5000.0))
def test_a_constant_in_all_readings_is_a_bias_and_nothing_else(rows, constant):
    plain = reduced(rows)
    moved = reduced([replace(row, reading=row.reading + constant * MGAL) for row in rows])
    least = plain.intervals.densities.thickness.values.min()
    # The settled noise follows the rounding of the readings within a millionth.
    densities_agree(plain, moved, room=64 * np.finfo(float).eps * abs(constant) * MGAL / (FOUR_PI_G * least) + 1e-4)
    np.testing.assert_allclose(
        moved.readings.estimates.run_bias.values - plain.readings.estimates.run_bias.values, constant * MGAL, atol=1e-11
    )


@FEW
@given(rows=surveys(), rate=st.floats(-1.0, 1.0))
def test_a_linear_drift_is_a_drift_and_nothing_else(rows, rate):
    free = replace(METER, drift_rate_sd=np.inf)
    plain = reduced(rows, free, drift_order=1)
    slope = rate * MGAL / HOUR
    moved = reduced([replace(row, reading=row.reading + slope * row.time) for row in rows], free, drift_order=1)
    densities_agree(plain, moved, room=1e-4)
    run = np.array([row.run for row in rows])
    for name in ("1", "2"):
        mine = np.flatnonzero(run == name)
        gained = (moved.readings.estimates.drift.values - plain.readings.estimates.drift.values)[mine]
        times = np.array([rows[n].time for n in mine])
        np.testing.assert_allclose(gained, slope * (times - times.min()), atol=1e-12)


@FEW
@given(rows=surveys(), seed=st.integers(0, 1000))
def test_the_order_of_rows_is_immaterial(rows, seed):
    order = np.random.default_rng(seed).permutation(len(rows))
    plain, mixed = reduced(rows), reduced([rows[n] for n in order])
    assert mixed.stations.label == plain.stations.label
    densities_agree(plain, mixed)
    for key in ("drift", "residual", "visit_effect", "redundancy"):
        one, other = (getattr(part.readings.estimates, key).values for part in (plain, mixed))
        np.testing.assert_allclose(other, one[order], atol=1e-9 if key == "redundancy" else 1e-15)


@FEW
@given(rows=surveys(), days=st.integers(-400, 400))
def test_a_day_more_changes_nothing_without_tide(rows, days):
    plain = reduced(rows)
    later = reduced([replace(row, time=row.time + days * 86400.0) for row in rows])
    densities_agree(plain, later)
    np.testing.assert_allclose(
        later.readings.estimates.drift.values, plain.readings.estimates.drift.values, atol=1e-16
    )


@FEW
@given(rows=surveys())
def test_time_mirrored_turns_the_drift_and_keeps_the_densities(rows):
    plain = reduced(rows, drift_order=1)
    mirrored = reduced([replace(row, time=-row.time) for row in rows], drift_order=1)
    densities_agree(plain, mirrored, room=1e-4)
    # The same drift at each reading is the opposite rate, for time runs the other way.
    there, back = (one.readings.estimates.drift.values for one in (plain, mirrored))
    assert len(there) == len(rows)
    for run in {row.run for row in rows}:
        mine = np.array([row.run == run for row in rows])
        np.testing.assert_allclose(np.ptp(back[mine] - there[mine]), 0.0, atol=1e-12)


@FEW
@given(rows=surveys(), factor=st.floats(0.1, 20.0))
def test_stated_sds_are_weights_where_noise_is_estimated_and_errors_where_it_is_given(rows, factor):
    sds = np.random.default_rng(0).choice([2.0, 3.0, 5.0], len(rows)) * UGAL
    rows = [replace(row, reading_sd=sd) for row, sd in zip(rows, sds, strict=True)]
    scaled = [replace(row, reading_sd=row.reading_sd * factor) for row in rows]
    densities_agree(reduced(rows), reduced(scaled), room=1e-6)
    still = replace(METER, reseating_sd=0.0, drift_rate_sd=np.inf)
    held = {"noise": "as_given", "drift_order": 1, "drift_walk": "off", "depth_sd": 0.0}
    one, other = (reduced(part, still, **held) for part in (rows, scaled))
    np.testing.assert_allclose(other.intervals.density.values, one.intervals.density.values, rtol=1e-9)
    np.testing.assert_allclose(
        other.intervals.density_sd.values, factor * one.intervals.density_sd.values, rtol=1e-6
    )


@FEW
@given(rows=surveys())
def test_more_readings_never_make_a_density_worse_where_noise_is_given(rows):
    held = {"noise": "as_given", "drift_order": 1, "drift_walk": "off", "depth_sd": 0.0}
    extra = replace(rows[2], time=rows[-1].time + 1800.0, run="2")
    for fewer, more in ((rows, [*rows, extra]),):
        before, after = reduced(fewer, **held), reduced(more, **held)
        grown = np.linalg.eigvalsh(
            before.network.gravity.independent().matrix() - after.network.gravity.independent().matrix()
        )
        assert grown.min() > -1e-6 * np.abs(grown).max() - 1e-22


@FEW
@given(rows=surveys(), number=st.integers(0, 10**6))
def test_a_row_out_of_use_is_a_row_that_is_not_there(rows, number):
    at = number % len(rows)
    without = [row for n, row in enumerate(rows) if n != at]
    unused = [replace(row, use=False) if n == at else row for n, row in enumerate(rows)]
    one, other = reduced(without, visit_gap=1e4), reduced(unused, visit_gap=1e4)
    np.testing.assert_array_equal(one.stations.gravity.values, other.stations.gravity.values)
    np.testing.assert_array_equal(one.intervals.density_sd.values, other.intervals.density_sd.values)


def written(folder, rows, *, foot, unit, gravity_unit, factor):
    """A survey folder with depths and readings in the given units."""
    folder.mkdir()
    (folder / "survey.toml").write_text(
        'format = "plumbwell-survey/1"\n[site]\nname = "units"\nlatitude = 50.0\nlongitude = 5.0\n'
        'ground_elevation = 100.0\n[instrument.A]\n[data]\nreadings = "readings.csv"\n[recipe]\ntide = "none"\n',
        "utf-8",
    )
    lines = [f"time,depth [{unit}],reading [{gravity_unit}]"]
    for row in rows:
        minutes, seconds = divmod(int(row.time), 60)
        hours, minutes = divmod(minutes, 60)
        days, hours = divmod(hours, 24)
        lines.append(
            f"2026-05-{4 + days:02d}T{hours:02d}:{minutes:02d}:{seconds:02d}Z,"
            f"{row.depth / foot!r},{float(row.reading / MGAL * factor)!r}"
        )
    (folder / "readings.csv").write_text("\n".join(lines) + "\n", "utf-8")
    return reduce(Case(survey=read_survey(folder)))


@pytest.mark.parametrize("seed", range(3))
def test_feet_and_metres_and_micro_and_milligal_agree(tmp_path, seed):
    depth = {"A": 30.48, "B": 60.96, "C": 121.92, "D": 152.40}
    gravity = {name: 0.09 * MGAL * z for name, z in depth.items()}
    rows = loop(np.random.default_rng(seed), "ABCDCBA", depth=depth, gravity=gravity)
    metres = written(tmp_path / "m", rows, foot=1.0, unit="m", gravity_unit="mGal", factor=1.0)
    feet = written(tmp_path / "ft", rows, foot=0.3048, unit="ft", gravity_unit="uGal", factor=1e3)
    densities_agree(metres, feet, room=1e-6)
    assert feet.stations.label == metres.stations.label
