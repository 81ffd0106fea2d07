"""Places, rows and cells at their limits: odd intervals, unsorted rows, missing cells, poles, thousands of stations."""

import random
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from invented_surveys import SLOPE
from made_surveys import MICROGAL, MILLIGAL, Row, loop, made_case
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument

DEPTH = {name: 50.0 * number for number, name in enumerate("ABCDE")}
GRAVITY = {name: 0.107 * MILLIGAL * depth for name, depth in DEPTH.items()}


def test_an_interval_through_the_ground_is_kept_and_flagged(invented, command):
    rows = [{**row, "depth [m]": "-5.0" if row["station"] == "A" else row["depth [m]"]} for row in invented.visits()]
    done = command(invented.written(rows))
    first, second = done.intervals[:2]
    assert first["from_station"] == "A" and first["density [g/cm3]"] and "crosses_ground" in first["flags"]
    assert "crosses_ground" not in second["flags"]


def test_an_interval_that_stands_out_by_its_thickness_is_kept_and_flagged(invented, command):
    depths = {"A": 20.0, "B": 24.0, "C": 28.0, "E": 32.0, "D": 170.0}
    rows = invented.visits("ABCEDBADCEAB")
    for row in rows:
        label = row["station"]
        off = SLOPE * (depths[label] - float(row["depth [m]"]))
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + off:.4f}"
        row["depth [m]"] = f"{depths[label]}"
    done = command(invented.written(rows))
    assert done.intervals[-1]["density [g/cm3]"] and "interval_thick" in done.intervals[-1]["flags"]


@pytest.mark.parametrize(("size", "side"), [(30.0, -1), (-30.0, 1)])
def test_densities_that_no_rock_has_are_shown_and_flagged_and_not_clipped(invented, command, size, side):
    """30 mGal at B are 30/(50 x 0.0838717) = 7.15 g/cm3 less above it and as much more below, or the other way."""
    rows = invented.visits()
    for row in rows:
        if row["station"] == "B":
            row["reading [mGal]"] = f"{float(row['reading [mGal]']) + size:.4f}"
    done = command(invented.written(rows))
    off = 30.0 / 50.0 / 0.0838717
    above, below = done.intervals[:2]
    assert float(above["density [g/cm3]"]) == pytest.approx(2.4 + side * off, abs=0.02)
    assert float(below["density [g/cm3]"]) == pytest.approx(2.4 - side * off, abs=0.02)
    for row in (above, below):
        assert "density_outside" in row["flags"] and float(row["density_sd [g/cm3]"]) < 0.1
    assert "density_outside" not in done.intervals[2]["flags"] and done.status == 0


def test_the_order_of_rows_is_immaterial(invented, command):
    rows = invented.visits("ABCDEDCBA") + invented.visits("CABDE", run="2", start=5.0)
    first = command(invented.written(rows))
    for seed in (1, 2):
        shuffled = list(rows)
        random.Random(seed).shuffle(shuffled)
        done = command(invented.written(shuffled))
        assert done.gravity() == first.gravity() and done.densities() == first.densities()
        by_time = {(row["run"], row["time"]): row["residual [mGal]"] for row in done.readings}
        for row in first.readings:
            assert float(by_time[row["run"], row["time"]]) == pytest.approx(float(row["residual [mGal]"]), abs=1e-9)
    assert [float(row["tvd [m]"]) for row in done.stations] == sorted(float(row["tvd [m]"]) for row in done.stations)


def test_a_log_from_below_upward_is_the_same_log(invented, command):
    rows = invented.visits()
    samples = [f"{depth},{2.3 + 0.001 * depth:.4f}" for depth in range(15, 180)]
    done = []
    for lines in (samples, samples[::-1]):
        log = "depth [m],density [g/cm3]\n" + "\n".join(lines) + "\n"
        done.append(command(invented.written(rows, data='logs = ["log.csv"]', files={"log.csv": log})))
    one, other = ([row["log_density [g/cm3]"] for row in each.intervals] for each in done)
    assert one == other
    # The mean of a straight line is its value in the middle: 2.3 + 0.001 x 45, 95, 145.
    assert [float(cell) for cell in one] == pytest.approx([2.345, 2.395, 2.445], abs=1e-9)


def test_one_label_at_two_depths_is_two_stations_and_an_error(invented, command):
    rows = invented.visits("ABCBABCBA")
    for row in rows[12:15]:
        row["depth [m]"] = "35.0"
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + SLOPE * 15.0:.4f}"
    done = command(invented.written(rows))
    assert done.status == 3 and done.errors() == {"label_twice"}
    assert list(done.gravity()) == ["A", "Ab", "B", "C"] and list(done.densities()) == ["A~Ab", "Ab~B", "B~C"]
    assert all("label_twice" in row["flags"] for row in done.stations[:2])
    for density in done.densities().values():
        assert float(density) == pytest.approx(2.4, abs=0.02)


def test_depths_within_same_place_are_one_station(invented, command):
    rows = invented.visits("ABCBABCBA")
    for row in rows[12:15]:
        row["depth [m]"] = "20.2"
    done = command(invented.written(rows))
    assert done.status == 0 and list(done.gravity()) == ["A", "B", "C"]
    assert {row["to_station [mGal]"] for row in done.readings[12:15]} != {"0"}


@pytest.mark.parametrize("latitude", [0.0, 90.0, -90.0, -0.0])
@pytest.mark.parametrize("system", ["WGS84", "GRS80", "GRS67", "1930"])
@pytest.mark.parametrize("form", ["closed", "series"])
def test_equator_and_poles_give_numbers(latitude, system, form):
    chance = np.random.default_rng(3)
    rows = loop(chance, "ABCDEDCBA", depth=DEPTH, gravity=GRAVITY)
    case = made_case(rows, tide="ephemeris", normal_gravity=system, height_form=form)
    site = replace(case.survey.site, latitude=float(np.radians(latitude)))
    results = reduce(replace(case, survey=replace(case.survey, site=site)))
    for column in (
        results.stations.gravity, results.stations.anomalies.anomaly, results.intervals.density,
        results.intervals.density_sd, results.intervals.density_common_sd, results.intervals.density_slab,
        results.readings.tide,
    ):  # fmt: skip
        assert np.isfinite(column.values).all(), column.key
    # 0.107 mGal/m is (F - 0.107)/(4 pi G); F from 0.3088 at the equator to 0.3083 at the poles.
    expected = ({0.0: 0.30878, 90.0: 0.30834}[abs(latitude)] - 0.107) / 0.0838717
    assert results.intervals.density.values / 1000.0 == pytest.approx(expected, abs=0.01)


@pytest.mark.parametrize("latitude", ["0", "90", "-90"])
def test_equator_and_poles_are_written(invented, drawn, latitude):
    folder = invented.written()
    text = (folder / "survey.toml").read_text("utf-8")
    (folder / "survey.toml").write_text(text.replace("latitude = 47.0", f"latitude = {latitude}.0"), "utf-8")
    done = drawn(folder)
    assert done.status == 0 and all(done.densities().values())


@pytest.mark.parametrize("latitude", ["90.0001", "-91", "nan", "inf"])
def test_beyond_the_poles_is_wrong_input(invented, command, latitude):
    folder = invented.written()
    text = (folder / "survey.toml").read_text("utf-8")
    (folder / "survey.toml").write_text(text.replace("latitude = 47.0", f"latitude = {latitude}"), "utf-8")
    assert "latitude" in command.refused(folder)


@given(data=st.data())
def test_no_missing_cell_makes_gravity_not_a_number(data):
    """Optional cells missing anywhere: a station with a used reading has gravity, and an sd but for the datum."""
    stops = data.draw(st.text("ABCDE", min_size=1, max_size=12), label="stops")
    counts = (data.draw(st.integers(1, 3), label="readings a visit"),)
    rows = []
    for run, part in enumerate((stops[: len(stops) // 2], stops[len(stops) // 2 :])):
        chance = np.random.default_rng(len(part))
        rows += loop(
            chance, part, depth=DEPTH, gravity=GRAVITY, run=str(run), start=run * 1e5, counts=counts, reading_sd=(3e-8,)
        )
    told = {label: [n for n, row in enumerate(rows) if row.station == label] for label in set(stops)}
    changed = []
    for number, row in enumerate(rows):
        missing = data.draw(st.sets(st.sampled_from(["reading_sd", "sensor_offset", "depth", "use", "visit"])))
        changed.append(
            replace(
                row,
                reading_sd=np.nan if "reading_sd" in missing else row.reading_sd,
                sensor_offset=np.nan if "sensor_offset" in missing else 0.0,
                # One row of each station says where it is.
                depth=np.nan if "depth" in missing and number != told[row.station][0] else row.depth,
                use="use" not in missing or number == told[row.station][0],
                visit=None if "visit" in missing else f"visit {number // counts[0]}",
            )
        )
    noise = data.draw(st.sampled_from(["estimate", "as_given"]), label="noise")
    results = reduce(made_case(changed, instruments=(Instrument(name="A"),), noise=noise))
    stations, fit = results.stations, results.network.adjustment
    lost = results.network.open.undetermined(results.network.gravity.datum)
    assert np.isfinite(stations.gravity.values[(stations.visits > 0) & ~lost]).all()
    datum = results.network.gravity.datum == np.arange(len(stations))
    assert (stations.gravity_sd.values[(stations.visits > 0) & ~lost & ~datum] > 0.0).all()
    rows_used = results.network.visits.rows
    for one in (fit.residual[rows_used], fit.redundancy[rows_used], fit.noise.sd, fit.reseating.variance):
        assert np.isfinite(one).all()
    assert (fit.noise.sd > 0.0).all()
    density = results.intervals.density.values
    assert (np.isfinite(density) == np.isfinite(results.intervals.density_sd.values)).all()
    assert (results.intervals.density_sd.values[np.isfinite(density)] > 0.0).all()


def test_optional_columns_with_gaps_give_numbers_all_the_way(invented, command):
    rows = invented.visits()
    for number, row in enumerate(rows):
        row["reading_sd [mGal]"] = "" if number % 3 else "0.004"
        row["pressure [hPa]"] = "" if number % 4 else "955"
        row["tilt_x [arcsec]"] = "" if number % 5 else "12"
        row["tilt_y [arcsec]"] = "" if number % 2 else "-8"
        row["temperature [degC]"] = ""
        row["sensor_offset [m]"] = "" if number % 7 else "0"
    done = command(invented.written(rows))
    assert done.status == 0 and all(done.gravity().values()) and all(done.densities().values())
    for row in done.readings:
        assert all(row[f"{name} [mGal]"] for name in ("calibrated", "tide", "tilt", "pressure_effect", "residual"))


@pytest.mark.parametrize("runs", [1, 4])
def test_five_thousand_stations_go_through_the_chain(runs):
    """A metre apart in rock of one density, with a return to the run's top every twentieth stop."""
    chance, rows, time, number = np.random.default_rng(1), [], 0.0, 5000
    for run in range(runs):
        own = list(range(max(run * number // runs - 1, 0), (run + 1) * number // runs))
        stops = [stop for place, one in enumerate(own) for stop in ([one, own[0]] if place % 20 == 19 else [one])]
        for stop in stops if stops[-1] == own[0] else [*stops, own[0]]:
            reading = 0.107 * MILLIGAL * stop + 4 * MICROGAL * chance.standard_normal()
            rows.append(
                Row(time=time, reading=reading, depth=float(stop), station=f"{stop:05}", run=str(run))
            )
            time += 300.0
    meter = Instrument(name="A", reading_floor=2 * MICROGAL, reseating_sd=4 * MICROGAL)
    results = reduce(made_case(rows, instruments=(meter,)))
    assert len(results.stations) == number and len(results.intervals) == number - 1
    gravity, sd = results.stations.gravity.values, results.stations.gravity_sd.values
    off = (gravity - 0.107 * MILLIGAL * np.arange(number)) / np.where(sd > 0.0, sd, 1.0)
    # Of five thousand normal ratios the largest is near 3.8; they share the errors of a few drifts.
    assert np.abs(off).max() < 6.0 and (sd[1:] > 0.0).all()
    assert (results.intervals.density_sd.values > 0.0).all()
    # Visits less stations, biases and drifts; one constant is the datum's.
    assert results.network.adjustment.reseating.freedom == len(rows) - number - 2 * runs + 1
    # Noise of 4 microgal in single readings, known to a twentieth by 250 degrees of freedom; three of these.
    noise = np.hypot(results.network.adjustment.noise.sd[0], results.network.adjustment.reseating.variance[0] ** 0.5)
    assert noise == pytest.approx(4 * MICROGAL, rel=0.15)
