"""The tables: their headings are the contract's, and their numbers are what a person would check by hand."""

import csv
import shutil
from dataclasses import replace

import numpy as np
import pytest

from plumbwell.study.case import Case
from plumbwell.study.finding import Finding
from plumbwell.study.reduce import reduce
from plumbwell.study.tables import TABLES, TEXT, TIME
from reduced_surveys import MINE, SHAFT, column, reduced, residual_covariance

HEADINGS = {
    "stations": [
        "station", "role", "depth [m]", "tvd [m]", "elevation [m]", "east [m]", "north [m]", "gravity [mGal]",
        "gravity_sd [mGal]", "visits", "normal_gravity [mGal]", "free_air [mGal]", "shell [mGal]",
        "terrain [mGal]", "water [mGal]", "openings [mGal]", "bodies [mGal]", "anomaly [mGal]", "flags",
    ],
    "intervals": [
        "from_station", "to_station", "top [m]", "base [m]", "top_tvd [m]", "base_tvd [m]",
        "thickness [m]", "gradient [mGal/m]", "density [g/cm3]", "density_sd [g/cm3]", "density_common_sd [g/cm3]",
        "density_slab [g/cm3]", "log_density [g/cm3]", "log_coverage", "density_less_log [g/cm3]", "dof", "flags",
    ],
    "layers": [
        "top [m]", "base [m]", "top_tvd [m]", "base_tvd [m]", "density [g/cm3]", "density_sd [g/cm3]",
        "resolution", "flags",
    ],
    "readings_reduced": [
        "calibrated [mGal]", "tide [mGal]", "tilt [mGal]", "pressure_effect [mGal]", "to_station [mGal]",
        "run_bias [mGal]", "drift [mGal]", "visit_effect [mGal]", "residual [mGal]", "standardised_residual",
        "redundancy", "used",
    ],
    "repeats": [
        "station", "run_1", "time_1", "run_2", "time_2", "difference [mGal]", "difference_sd [mGal]",
        "standardised", "hours_between",
    ],
    "visits": [
        "run", "station", "time", "readings", "level [mGal]", "level_sd [mGal]", "residual [mGal]",
        "residual_sd [mGal]", "standardised", "redundancy", "creep [mGal]", "creep_sd [mGal]", "leave_out",
    ],
}  # fmt: skip


@pytest.fixture(scope="module")
def mine():
    """The mine sample, reduced."""
    return reduced(MINE)


def test_headings_are_those_of_the_contract_in_its_order():
    assert {name: [one.heading for one in table.columns] for name, table in TABLES.items()} == HEADINGS
    assert all(table.file == f"{name}.csv" for name, table in TABLES.items())


def test_every_column_says_in_one_line_what_it_is():
    for table in TABLES.values():
        for one in table.columns:
            assert one.what and "\n" not in one.what and len(one.what) < 90, one.heading


@pytest.mark.parametrize("name", TABLES)
def test_every_column_has_a_value_a_row_and_the_kind_it_states(well, name):
    table = TABLES[name]
    for one in table.columns:
        values = one.values(well)
        assert len(values) == table.rows(well), one.heading
        if one.kind == TEXT:
            assert all(isinstance(text, str) for text in values)
        else:
            assert np.asarray(values).dtype == np.float64, one.heading
    assert {one.name for one in TABLES["repeats"].columns if one.kind == TIME} == {"time_1", "time_2"}


def test_a_column_that_does_not_exist_is_a_key_error():
    with pytest.raises(KeyError, match="porosity"):
        TABLES["intervals"].column("porosity")


def test_without_a_tie_gravity_is_0_at_the_datum_station_and_its_sd_is_not_known(shaft):
    gravity, sd = column(shaft, "stations", "gravity"), column(shaft, "stations", "gravity_sd")
    assert shaft.stations.label[0] == "P3"
    assert gravity[0] == 0.0 and np.isnan(sd[0])
    assert np.all(sd[1:] > 0.001) and np.all(sd[1:] < 0.02)


def test_with_a_tie_every_gravity_is_known_with_its_sd(well):
    assert np.isfinite(column(well, "stations", "gravity_sd")).all()
    assert np.all(column(well, "stations", "gravity") > 981_000.0)


def test_anomaly_is_gravity_less_the_written_known_parts(well):
    parts = sum(column(well, "stations", name) for name in ("normal_gravity", "free_air", "shell"))
    left = column(well, "stations", "gravity") - parts
    assert column(well, "stations", "anomaly") == pytest.approx(left, abs=1e-8)


def test_effects_that_are_not_taken_out_are_not_known_rather_than_0(shaft):
    for name in ("terrain", "water", "openings", "bodies"):
        assert np.isnan(column(shaft, "stations", name)).all()


def test_slab_density_can_be_checked_by_hand(well):
    gradient = column(well, "intervals", "gradient")  # mGal/m
    by_hand = (well.choice.gradient / 1e-5 - gradient) / (4.0 * np.pi * 6.67430e-11) * 1e-5 / 1000.0
    assert column(well, "intervals", "density_slab") == pytest.approx(by_hand, abs=1e-9)


def test_depths_of_an_interval_are_those_of_its_marks_and_sensors(well):
    stations = dict(zip(well.stations.label, column(well, "stations", "depth"), strict=True))
    tvd = dict(zip(well.stations.label, column(well, "stations", "tvd"), strict=True))
    top = [stations[label] for label in well.intervals.from_station]
    assert column(well, "intervals", "top") == pytest.approx(top)
    thickness = [
        tvd[base] - tvd[top] for top, base in zip(well.intervals.from_station, well.intervals.to_station, strict=True)
    ]
    assert column(well, "intervals", "thickness") == pytest.approx(thickness, abs=1e-9)


def test_log_coverage_is_not_known_where_there_is_no_log(shaft, well):
    assert np.isnan(column(shaft, "intervals", "log_coverage")).all()
    assert np.nanmax(column(well, "intervals", "log_coverage")) == pytest.approx(1.0)


def test_layers_run_on_from_the_first_to_the_last_station(well):
    top, base = column(well, "layers", "top"), column(well, "layers", "base")
    assert top[1:] == pytest.approx(base[:-1])
    assert top[0] == pytest.approx(column(well, "intervals", "top")[0])
    assert base[-1] == pytest.approx(column(well, "intervals", "base")[-1])
    markers = {depth for depth in well.survey.markers.depth.values.tolist() if top[0] < depth < base[-1]}
    assert markers == set(top[1:].tolist())
    assert "conditional" in column(well, "layers", "flags")


def test_no_layers_when_the_recipe_wants_none(shaft):
    bare = reduce(Case(survey=shaft.survey), recipe=replace(shaft.recipe, layers="none"))
    assert TABLES["layers"].rows(bare) is None


def test_flags_are_the_codes_of_the_findings_at_a_row_each_once(shaft):
    def finding(code, **where):
        return Finding(code=code, severity="note", place="here", text="t", mend="m", **where)

    told = replace(
        shaft,
        findings=(
            finding("deep", stations=(1, 3)),
            finding("wet", stations=(3,), intervals=(2,)),
            finding("deep", stations=(3,)),
        ),
    )
    assert column(told, "stations", "flags") == ("", "deep", "", "deep;wet")
    assert column(told, "intervals", "flags") == ("", "", "wet")


def test_a_raw_column_named_like_one_of_ours_is_written_as_raw(tmp_path):
    folder = tmp_path / "survey"
    shutil.copytree(SHAFT, folder)
    rows = list(csv.reader((SHAFT / "readings.csv").read_text("utf-8").splitlines()))
    head = next(number for number, row in enumerate(rows) if row[0] == "time")
    extra = {"tide [uGal]": "1.50", "Residual": "x", "raw tide": "y"}
    lines = [
        ",".join(rows[head] + list(extra)),
        *(",".join(row + list(extra.values())) for row in rows[head + 1 :]),
    ]
    (folder / "readings.csv").write_text("\n".join(lines) + "\n", "utf-8")
    leading = TABLES["readings_reduced"].leading(reduced(folder))
    assert [heading for heading, _ in leading][-3:] == ["raw tide [uGal]", "raw Residual", "raw raw tide"]
    assert leading[-3][1][0] == "1.50"
    assert dict(leading)["reading [mGal]"][0] == "4859.511"


def test_repeats_are_consecutive_visits_of_a_station_in_time(shaft):
    station = column(shaft, "repeats", "station")
    first, second = column(shaft, "repeats", "time_1"), column(shaft, "repeats", "time_2")
    visits = dict(zip(shaft.stations.label, shaft.stations.visits.tolist(), strict=True))
    assert {label: station.count(label) + 1 for label in visits} == visits
    assert np.all(second > first)
    for label in visits:
        rows = [row for row, one in enumerate(station) if one == label]
        assert first[rows[1:]] == pytest.approx(second[rows[:-1]])
    assert column(shaft, "repeats", "hours_between") == pytest.approx((second - first) / 3600.0)
    assert column(shaft, "repeats", "run_1")[0] == "2" and column(shaft, "repeats", "run_2")[1] == "1"


def test_repeat_difference_is_that_of_the_readings_freed_of_everything_known(shaft):
    freed = sum(column(shaft, "readings_reduced", name) for name in ("calibrated", "tide", "tilt", "to_station"))
    for name in ("pressure_effect", "run_bias", "drift"):
        freed = freed - column(shaft, "readings_reduced", name)
    at = dict(zip(shaft.readings.utc.values.tolist(), freed.tolist(), strict=True))
    by_hand = [
        at[second] - at[first]
        for first, second in zip(column(shaft, "repeats", "time_1"), column(shaft, "repeats", "time_2"), strict=True)
    ]
    assert column(shaft, "repeats", "difference") == pytest.approx(by_hand, abs=1e-9)


@pytest.mark.parametrize("name", ["shaft", "well", "mine"])
def test_repeat_sd_agrees_with_the_whole_covariance_of_the_residuals(name, request):
    results = request.getfixturevalue(name)
    spread = residual_covariance(results)
    starts = results.network.visits.first.tolist()
    run = [results.survey.readings.run.names[code] for code in results.network.visits.run.tolist()]
    visit = {pair: number for number, pair in enumerate(zip(run, starts, strict=True))}
    earlier, later = (
        [
            visit[key]
            for key in zip(
                column(results, "repeats", f"run_{which}"),
                column(results, "repeats", f"time_{which}"),
                strict=True,
            )
        ]
        for which in (1, 2)
    )
    variance = spread[earlier, earlier] + spread[later, later] - 2.0 * spread[earlier, later]
    sd = column(results, "repeats", "difference_sd")
    assert sd == pytest.approx(np.sqrt(variance) / 1e-5, rel=1e-6)
    standardised = column(results, "repeats", "standardised")
    assert standardised == pytest.approx(column(results, "repeats", "difference") / sd)
    assert 0.6 < np.sqrt(np.mean(standardised**2)) < 1.6
