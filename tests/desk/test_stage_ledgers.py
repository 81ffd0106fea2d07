"""Ledgers as they are read: decimals, signs, amber, notes, depths; settle-down, status line and neighbours."""

from __future__ import annotations

from dataclasses import replace
from math import floor, log10

import numpy as np
import pytest

from driven_desk import Driven
from made_surveys import loop, made_case
from plumbwell.desk.ledger.ledger_words import ColumnWords
from plumbwell.desk.selection import Selection
from plumbwell.desk.shown import shown
from plumbwell.desk.stages import states
from plumbwell.desk.stages.columns import along_hole
from plumbwell.desk.stages.density import density_table
from plumbwell.desk.stages.drift import drift_table
from plumbwell.desk.stages.readings import readings_table
from plumbwell.desk.stages.reduction import reduction_table
from plumbwell.desk.stages.time_series import drift_plots
from plumbwell.desk.stages.tray_views import rows_of_visit, settle_view, settled_visit
from plumbwell.plates.depth_scale import DepthScale
from plumbwell.plates.hole_depths import hole_depths
from plumbwell.study.case import Case
from plumbwell.study.overlay import Overlay, RowNote, RowUse
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Tare
from reduced_surveys import MINE, WELL, column, reduced

MINUS, NO_BREAK = "\u2212", "\u00a0"
UGAL = 1e-8
DEPTH = {name: 80.0 * number for number, name in enumerate("ABCDEFGHI")}
GRAVITY = {name: 0.09e-5 * depth for name, depth in DEPTH.items()}


def words(table, key: str) -> ColumnWords:
    return ColumnWords(next(one for one in table.columns if one.key == key))


def as_shown(results, scale: DepthScale | None = None, overlay: Overlay | None = None):
    case = Case(survey=results.survey, overlay=overlay or Overlay())
    return shown(case, results, scale or DepthScale())


@pytest.fixture(scope="module")
def mine():
    return reduced(MINE)


def asked_decimals(sd: float) -> int:
    """Two figures when the first is 1 or 2, else one; by hand."""
    first = floor(log10(sd))
    figures = 2 if sd / 10.0**first < 2.95 else 1
    return figures - 1 - first


@pytest.mark.parametrize("name", ["well", "mine", "shaft"])
def test_densities_have_the_decimals_that_their_sd_bears(name, request):
    results = request.getfixturevalue(name)
    table = density_table(as_shown(results))
    density, sds = words(table, "density"), column(results, "intervals", "density_sd")
    assert density.decimals == min(asked_decimals(sds.min()), asked_decimals(sds.max()) + 1)
    for row in range(len(table)):
        assert float(density.value(row)) == round(column(results, "intervals", "density")[row], density.decimals)
        shown_sd = float(density.sd(row).split(NO_BREAK)[-1].lstrip("\u2007"))
        assert shown_sd == pytest.approx(sds[row], abs=0.5001 * 10.0**-density.decimals)


def test_differences_have_a_sign_and_ratios_one_decimal_and_amber_from_three(well):
    table = density_table(as_shown(well))
    difference, ratio = words(table, "density_less_log"), words(table, "ratio")
    values = column(well, "intervals", "density_less_log")
    assert np.isfinite(values).sum() > 20
    for row, value in enumerate(values.tolist()):
        told = difference.value(row)
        if np.isnan(value):
            assert told == ratio.value(row) == "\u2014" and difference.sd(row) == ""
        elif float(told.replace(MINUS, "-")):
            assert told[0] == ("+" if value > 0 else MINUS) and "-" not in told
        if np.isfinite(value):
            exact = value / column(well, "intervals", "density_sd")[row]
            assert float(ratio.value(row).replace(MINUS, "-")) == pytest.approx(exact, abs=0.0501)
            assert ratio.wants_look(row) == (abs(exact) >= 3.0)
            assert not difference.wants_look(row)
    made = replace(table.columns[-1], values=np.array([2.99, 3.0, -3.0, np.nan, -2.99]), sds=None)
    assert [ColumnWords(made).wants_look(row) for row in range(5)] == [False, True, True, False, False]


def test_microgal_columns_have_one_decimal_and_ratios_of_visits_too(well):
    table = drift_table(as_shown(well))
    for key in ("less_tide", "residual", "ratio"):
        assert words(table, key).decimals == 1
    ratio = words(table, "ratio")
    exact = well.network.adjustment.solution.residual[:, 0]
    for row in np.flatnonzero(np.isfinite(ratio.values)).tolist():
        told = ratio.value(row)
        assert told.lstrip("+" + MINUS) == f"{abs(ratio.values[row]):.1f}"
        assert np.sign(ratio.values[row]) == np.sign(exact[row])


def test_absolute_gravity_is_parted_in_thousands(well):
    gravity = words(reduction_table(as_shown(well)), "gravity")
    row = 3
    told = gravity.value(row)
    assert told[:3] == "981" and told[3] == NO_BREAK
    exact = column(well, "stations", "gravity")[row]
    assert float(told.replace(NO_BREAK, "")) == pytest.approx(exact, abs=0.5001 * 10.0**-gravity.decimals)


def test_a_visit_that_nothing_checks_has_no_residual_in_ledger_and_plot():
    rows = loop(np.random.default_rng(1), "ABCDCBA", depth=DEPTH, gravity=GRAVITY)
    one = as_shown(reduce(made_case(rows)))
    residual = words(drift_table(one), "residual")
    stops = [one.results.stations.label[at] for at in one.results.network.visits.station.tolist()]
    alone = stops.index("D")
    assert residual.value(alone) == "\u2014" and residual.sd(alone) == ""
    (panel,) = drift_plots(one)[1].panels
    assert alone not in panel.points.rows and len(panel.points) == 6


def test_notes_and_reasons_are_told_as_the_copied_folder_tells_them(well):
    noted = well.survey.readings.note.index(next(one for one in well.survey.readings.note if one))
    overlay = Overlay(
        rows=(RowUse(1, False, "bump"), RowUse(noted, False, "pump"), RowUse(8, True, "")),
        notes=(RowNote(5, "windy"),),
    )
    case = Case(survey=well.survey, overlay=overlay)
    results = reduce(case)
    table = readings_table(case, shown(case, results, DepthScale()), DepthScale())
    note = next(one for one in table.columns if one.key == "note")
    assert note.values[1] == "bump" and note.values[5] == "windy" and note.values[8] == ""
    assert note.values[noted] == f"{well.survey.readings.note[noted]}; pump"
    assert table.marks[1] == table.marks[noted] == "excluded" and table.marks[5] == table.marks[8] == "changed"
    assert table.hints[noted] == "pump"
    before = readings_table(case, None, DepthScale())
    assert next(one for one in before.columns if one.key == "note").values == note.values
    assert before.excluded.tolist() == table.excluded.tolist()


def test_latitude_is_normal_gravity_less_that_of_the_first_station_of_the_column(mine):
    normal, along = column(mine, "stations", "normal_gravity"), along_hole(mine)
    # The base at the bank stands above all.
    assert mine.stations.role[:2] == ("base", "column")
    assert along[1] == 0.0 and along[0] != 0.0
    np.testing.assert_array_equal(along, normal - normal[1])


@pytest.mark.parametrize("kind", ["MD", "TVD", "elevation"])
def test_base_stations_stand_in_the_ledgers_and_in_no_track(well, kind):
    one = as_shown(well, DepthScale(kind=kind))
    base = [row for row, role in enumerate(well.stations.role) if role == "base"]
    assert base
    table = reduction_table(one)
    assert np.isnan(table.top[base]).all() and np.isnan(table.density[base]).all()
    inside = [row for row in range(len(table)) if row not in base]
    assert np.isfinite(table.top[inside]).all()
    assert len(one.plate.stations) == len(inside)
    depth = next(column for column in table.columns if column.key == "depth")
    # The hut has a surveyed place: no measured depth, but an elevation.
    assert np.isnan(depth.values[base]).all() == (kind == "MD")
    visits = drift_table(one)
    at_base = np.isin(well.network.visits.station, base)
    assert np.isnan(visits.top[at_base]).all() and np.isfinite(visits.top[~at_base]).all()
    assert one.lit("station", base) == [] and one.rows_between("station", -1e9, 1e9) == tuple(inside)


def test_a_column_station_without_measured_depth_turns_all_to_vertical_depth(mine, well):
    depths = hole_depths(mine, DepthScale(kind="MD", unit="ft"))
    assert not depths.measured and depths.scale == DepthScale(kind="TVD", unit="ft")
    tvd = column(mine, "stations", "tvd")
    np.testing.assert_allclose(depths.stations, tvd / 0.3048, rtol=1e-12)
    assert hole_depths(well).measured and hole_depths(well).scale.kind == "MD"
    # The hut has none either, but it is a base and in no way of the column.
    assert np.isnan(column(well, "stations", "depth")).any()
    table = density_table(as_shown(mine))
    assert {one.heading for one in table.columns if one.key in ("top", "base")} == {"top_tvd [m]", "base_tvd [m]"}
    assert next(one for one in table.columns if one.key == "top").unit == "m TVD"


@pytest.mark.parametrize("kind", ["MD", "TVD", "elevation"])
def test_a_depth_between_stations_follows_the_path(well, kind):
    depths = hole_depths(well, DepthScale(kind=kind))
    md, tvd = column(well, "stations", "depth"), column(well, "stations", "tvd")
    order = np.flatnonzero(depths.column)
    order = order[np.argsort(md[order])]
    for upper, lower in zip(order[:-1].tolist(), order[1:].tolist(), strict=True):
        for share in (0.0, 0.31, 0.5, 0.83):
            mark = md[upper] + share * (md[lower] - md[upper])
            off = (1 - share) * (tvd[upper] - depths.path.at(md[upper])[0])
            off += share * (tvd[lower] - depths.path.at(md[lower])[0])
            vertical = float(depths.path.at(mark)[0]) + off
            at = {"MD": mark, "TVD": vertical, "elevation": vertical - well.survey.site.datum_elevation}[kind]
            place = depths.place_at(well, at)
            assert place is not None
            assert place == pytest.approx((mark, vertical), abs=2e-3)
    top, base = depths.stations[order[[0, -1]]]
    assert depths.place_at(well, top - 0.1) is None and depths.place_at(well, base + 0.1) is None
    assert depths.place_at(well, base) == pytest.approx((md[order[-1]], tvd[order[-1]]), abs=1e-6)


def test_the_settle_down_of_a_visit_is_its_readings_about_their_mean_with_its_sd(well):
    one = as_shown(well)
    network = well.network.visits
    visit = int(np.argmax(np.diff(network.start)))
    rows = rows_of_visit(one, visit)
    plot = settle_view(one, visit)
    assert plot is not None and list(plot.rows) == list(rows) == np.flatnonzero(network.of_row == visit).tolist()
    names = ("calibrated", "tide", "tilt", "to_station")
    freed = sum(column(well, "readings_reduced", name)[list(rows)] for name in names)
    for name in ("pressure_effect", "drift"):
        freed = freed - column(well, "readings_reduced", name)[list(rows)]
    np.testing.assert_allclose(plot.values, (freed - freed.mean()) * 1000.0, rtol=0, atol=1e-6)
    sd = well.network.adjustment.noise.sd[0] / UGAL
    np.testing.assert_allclose(plot.sds, sd, rtol=1e-12)
    assert plot.mean_sd == pytest.approx(sd / np.sqrt(len(rows)), rel=1e-12)
    utc = well.readings.utc.values[list(rows)]
    np.testing.assert_allclose(plot.minutes, (utc - utc[0]) / 60.0)


def test_of_a_visit_that_creeps_the_cut_and_the_plateau_are_shown():
    rows = loop(
        np.random.default_rng(9), "ABCABCABC", depth={"A": 20.0, "B": 70.0, "C": 120.0},
        gravity={"A": 0.0, "B": 3e-5, "C": 6e-5}, counts=(6,),
    )  # fmt: skip
    for row, size in ((18, 9e-7), (19, 5e-7)):
        rows[row] = replace(rows[row], reading=rows[row].reading + size)
    case = made_case(rows)
    one = shown(case, reduce(case), DepthScale())
    plot, still = settle_view(one, 3), settle_view(one, 4)
    assert plot is not None and still is not None
    # Readings are a minute apart: the cut lies between the second and the third.
    assert plot.leave_out == 2 and plot.cut == pytest.approx(1.5)
    assert plot.plateau == pytest.approx(np.mean(plot.values[2:]), abs=1e-6)
    assert plot.cut_words() == "leave out 2"
    assert still.leave_out == 0 and still.cut is None and still.cut_words() == ""


def test_a_reading_left_out_is_shown_with_its_visit_and_moves_no_mean(well):
    visit = int(np.argmax(np.diff(well.network.visits.start)))
    rows = np.flatnonzero(well.network.visits.of_row == visit).tolist()
    gone = rows[1]
    case = Case(survey=well.survey, overlay=Overlay(rows=(RowUse(gone, False, "bump"),)))
    results = reduce(case)
    one = shown(case, results, DepthScale())
    again = int(results.network.visits.of_row[rows[0]])
    plot = settle_view(one, again)
    assert plot is not None and list(plot.rows) == rows
    assert list(plot.excluded) == [row == gone for row in rows]
    used = [value for value, out in zip(plot.values, plot.excluded, strict=True) if not out]
    assert np.mean(used) == pytest.approx(0.0, abs=1e-6)
    assert np.isnan(plot.sds[rows.index(gone)])
    sd = results.network.adjustment.noise.sd[0] / UGAL
    assert plot.mean_sd == pytest.approx(sd / np.sqrt(len(rows) - 1), rel=1e-12)
    selection = Selection()
    selection.choose("visit", (again,))
    assert settled_visit(one, selection) == again


def test_tares_say_what_is_known_of_their_size():
    rows = loop(np.random.default_rng(1), "ABCBAGHIHG", depth=DEPTH, gravity=GRAVITY)
    parting = Tare(run="1", time=next(row.time for row in rows if row.station == "G"))
    stated = Tare(run="1", time=next(row.time for row in rows if row.station == "C"), size=-20 * UGAL)
    one = as_shown(reduce(made_case(rows, tares=(parting, stated), drift_order=1)))
    (panel,) = drift_plots(one)[0].panels
    assert [tare.words for tare in panel.tares] == [f"tare {MINUS}20.0 µGal, as stated", "tare of unknown size"]
    assert [tare.time for tare in panel.tares] == [stated.time, parting.time]
    assert len(panel.lines) == 3
    assert panel.rate_words.endswith("µGal/h")


def test_the_clock_of_the_instrument_is_told_alike_by_ledger_and_status(driven, tmp_path):
    window = driven()
    window.open(WELL)
    window.stage(states.READINGS)
    window.work.selection.choose("reading", (7,))
    window.settle()
    time = next(one for one in window.work.ledger.table.columns if one.key == "time")
    told = " ".join(value for _, value in window.desk.status._pairs)
    assert ColumnWords(time).time_words(float(time.values[7]))[-5:] in told


def test_the_status_line_tells_depths_and_density_at_the_pointer(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    results, depths = window.work.shown.results, window.work.shown.depths
    order = np.flatnonzero(depths.column)
    for share in (0.35, 0.62, 0.9):
        depth = float(depths.stations[order[0]] * (1 - share) + depths.stations[order[-1]] * share)
        window.work.selection.point(depth=depth, row=window.work.shown.row_at("interval", depth))
        window.settle()
        told = [value for _, value in window.desk.status._pairs]
        md, tvd = depths.place_at(results, depth)
        elevation = results.survey.site.datum_elevation - tvd
        expected = [f"{md:.1f} m MD", f"{tvd:.1f} m TVD", f"{elevation:.1f} m elevation".replace("-", MINUS)]
        assert [one.replace(NO_BREAK, "") for one in told[:3]] == expected
        row = window.work.shown.row_at("interval", depth)
        density = words(window.work.ledger.table, "density")
        assert told[3].split(NO_BREAK)[0] == density.value(row)


def chosen_values(window: Driven) -> list[str]:
    window.settle()
    return [value for _, value in window.desk.status._pairs]


def test_the_status_line_tells_the_residual_of_a_visit_and_of_a_reading(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DRIFT)
    residual = words(window.work.ledger.table, "residual")
    checked = int(np.flatnonzero(np.isfinite(residual.values))[2])
    window.work.selection.choose("visit", (checked,))
    told = chosen_values(window)
    assert any(one.startswith(residual.value(checked)) and one.endswith("µGal") for one in told)
    alone = int(np.flatnonzero(~np.isfinite(residual.values))[0])
    window.work.selection.choose("visit", (alone,))
    assert "nothing checks this visit" in chosen_values(window)
    window.stage(states.READINGS)
    residual = words(window.work.ledger.table, "residual")
    window.work.selection.choose("reading", (12,))
    assert f"{residual.value(12)} µGal" in chosen_values(window)


def test_neighbours_show_the_correlations_and_sds_of_the_ledger(driven):
    window = driven()
    window.open(MINE)
    window.stage(states.DENSITY)
    window.work.selection.choose("interval", (3,))
    window.settle()
    picture = window.work.neighbours._picture
    results = window.work.shown.results
    matrix = results.intervals.errors.independent.matrix()
    sd = np.sqrt(np.diag(matrix))
    rows = [int(label) - 1 for label in picture.labels]
    assert rows == list(range(len(rows))) and picture.chosen == 3
    np.testing.assert_allclose(
        picture.matrix, matrix[np.ix_(rows, rows)] / np.outer(sd[rows], sd[rows]), rtol=0, atol=1e-9
    )
    np.testing.assert_allclose(picture.sds, column(results, "intervals", "density_sd")[rows], rtol=1e-12)
    # About -1/2; the station between, which a noisier visit stands for, makes it more.
    assert -0.8 < picture.matrix[3][4] < -0.3


def test_a_run_without_repeat_has_its_stated_rate():
    meter = Instrument(name="A", drift_rate=30 * UGAL / 3600.0, drift_rate_sd=10 * UGAL / 3600.0)
    rows = loop(np.random.default_rng(1), "ABCD", depth=DEPTH, gravity=GRAVITY)
    one = as_shown(reduce(made_case(rows, instruments=(meter,))))
    (panel,) = drift_plots(one)[0].panels
    assert panel.rate_words == "+30 ± 10 µGal/h"
    held = as_shown(reduce(made_case(rows, instruments=(meter,), drift_order=0)))
    (panel,) = drift_plots(held)[0].panels
    assert panel.rate_words == "+30.0 µGal/h, held"
