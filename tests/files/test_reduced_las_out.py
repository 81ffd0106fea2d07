"""reduced.las as another reader finds it (lasio), against the interval table."""

from dataclasses import replace

import lasio
import numpy as np
import pytest

from plumbwell.files.reduced_las import reduced_las
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from reduced_surveys import CHECKOUT, MINE, column, reduced


def test_header_says_step_null_and_place(well):
    las = lasio.read(reduced_las(well))
    assert las.version["VERS"].value == 2.0 and las.version["WRAP"].value == "NO"
    assert las.well["STEP"].value == 0.5 and las.well["NULL"].value == -999.25
    assert las.well["WELL"].value == "Tolly Bank well (invented)"
    assert las.well["DATE"].value == "2026-05-12"
    assert [(one.mnemonic, one.unit) for one in las.curves] == [
        ("DEPT", "M"), ("GDEN", "G/CM3"), ("GDSD", "G/CM3"), ("LDEN", "G/CM3"), ("ANOM", "MGAL")
    ]  # fmt: skip
    assert las.params["EDAT"].value == pytest.approx(231.6)
    assert "qualified person must judge" in " ".join(las.other.split())


def test_depths_are_multiples_of_half_a_metre_within_the_stations(well):
    text = reduced_las(well)
    las = lasio.read(text)
    depth = las["DEPT"]
    located = well.stations.located.mark_depth.values
    role = np.array(well.stations.role)
    first, last = np.nanmin(located[role == "column"]), np.nanmax(located[role == "column"])
    assert np.all(depth * 2 == np.round(depth * 2)) and np.all(np.diff(depth) == 0.5)
    assert first <= depth[0] < first + 0.5 and last - 0.5 < depth[-1] <= last
    data = text.split("~ASCII LOG DATA\n")[1]
    assert "e" not in data.lower() and "nan" not in data.lower()
    assert max(map(len, text.splitlines())) <= 256 and text.isascii()


def test_density_is_that_of_the_interval_that_holds_the_depth(well):
    las = lasio.read(reduced_las(well))
    located = dict(zip(well.stations.label, well.stations.located.mark_depth.values.tolist(), strict=True))
    density, sd = column(well, "intervals", "density"), column(well, "intervals", "density_sd")
    seen = 0
    for number, (top, base) in enumerate(zip(well.intervals.from_station, well.intervals.to_station, strict=True)):
        inside = (las["DEPT"] >= located[top]) & (las["DEPT"] < located[base] - 1e-9)
        seen += np.count_nonzero(inside)
        assert las["GDEN"][inside] == pytest.approx(density[number], abs=6e-6)
        assert las["GDSD"][inside] == pytest.approx(sd[number], abs=6e-6)
    assert len(las["DEPT"]) - 1 <= seen <= len(las["DEPT"])


def test_anomaly_is_straight_between_stations(well):
    las = lasio.read(reduced_las(well))
    rows = [row for row, role in enumerate(well.stations.role) if role == "column"]
    depth = well.stations.located.mark_depth.values[rows]
    anomaly = column(well, "stations", "anomaly")[rows]
    assert las["ANOM"] == pytest.approx(np.interp(las["DEPT"], depth, anomaly), abs=6e-6)


def test_log_density_follows_its_interval_and_is_null_without_a_log(well):
    las = lasio.read(reduced_las(well))
    assert set(np.round(column(well, "intervals", "log_density"), 5)) >= set(np.round(las["LDEN"], 5))
    text = reduced_las(reduced(CHECKOUT / "tests" / "data" / "reiche_zeche_shaft"))
    assert text.split("~ASCII")[1].count("-999.25") == len(lasio.read(text)["DEPT"])
    assert np.isnan(lasio.read(text)["LDEN"]).all()


def test_surveyed_levels_have_vertical_depth_and_the_file_says_so(tmp_path):
    results = reduced(MINE)
    assert np.isnan(results.stations.located.mark_depth.values).all()
    text = reduced_las(results)
    las = lasio.read(text)
    assert las.curves["DEPT"].descr == "VERTICAL DEPTH OF THE SENSOR BELOW THE DATUM"
    assert "DEPT is vertical depth below the depth datum" in text
    tvd = column(results, "stations", "tvd")[[role == "column" for role in results.stations.role]]
    assert tvd.min() <= las["DEPT"][0] and las["DEPT"][-1] <= tvd.max()


def test_no_interval_no_file():
    shaft = reduced(CHECKOUT / "tests" / "data" / "reiche_zeche_shaft")
    none = reduce(Case(survey=shaft.survey), recipe=replace(shaft.recipe, min_thickness=1000.0))
    assert len(none.intervals) == 0 and reduced_las(none) is None
