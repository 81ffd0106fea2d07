"""The thread in the real window: one selection, one depth window, one crosshair, everywhere."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QGuiApplication, QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication
from scipy import stats

from plumbwell.desk.stages import states
from reduced_surveys import MINE, WELL
from shown_texts import shown_words


@pytest.fixture
def well(driven):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    return window


def test_a_chosen_row_is_lit_in_strip_fan_and_tracks(well):
    well.work.ledger.go_to_cell(4, "density")
    well.key(well.work.ledger, Qt.Key.Key_Down)
    interval = well.work.shown.plate.intervals[5]
    span = (interval.top, interval.base)
    assert well.work.selection.rows == (5,)
    assert list(well.work.strip._selected) == [span]
    tracks = well.work.tracks
    assert list(tracks._scene.spans) == [span] and set(tracks._scene.lit) == set(span)
    assert "interval 6" in tracks.accessibleDescription()
    assert 5 in well.work.fan._selected


def test_arrow_keys_walk_and_the_view_follows(well):
    well.work.ledger.go_to_cell(0, "density")
    for _ in range(40):
        well.key(well.work.ledger, Qt.Key.Key_Down)
    assert well.work.selection.rows == (40,)
    top, base = well.work.selection.window
    interval = well.work.shown.plate.intervals[40]
    assert top <= interval.top and interval.base <= base
    assert 40 in [row for row, _, _ in well.work.ledger.rows_in_view()]


def test_brushing_a_range_in_the_tracks_chooses_the_rows(well):
    frame = well.work.tracks._places().tracks[-1]
    x = (frame.left + frame.right) / 2
    start, end = frame.y(200.0), frame.y(300.0)
    track = well.work.tracks
    QTest.mousePress(track, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, QPoint(int(x), int(start)))
    QTest.mouseMove(track, QPoint(int(x), int((start + end) / 2)))
    QTest.mouseMove(track, QPoint(int(x), int(end)))
    QTest.mouseRelease(track, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, QPoint(int(x), int(end)))
    well.settle()
    intervals = well.work.shown.plate.intervals
    wanted = [n for n, one in enumerate(intervals) if one.base > 202.0 and one.top < 298.0]
    assert list(well.work.selection.rows) == wanted
    assert sorted(well.work.ledger.chosen_rows()) == wanted


def test_the_selection_is_carried_from_stage_to_stage(well):
    well.work.selection.choose("interval", (5,))
    well.stage(states.REDUCTION)
    stations = well.work.shown.stations_of("interval", (5,))
    assert set(well.work.selection.rows) == set(stations)
    well.stage(states.READINGS)
    labels = {well.work.shown.results.stations.label[one] for one in stations}
    readings = well.work.shown.results.survey.readings
    assert {readings.station[row] for row in well.work.selection.rows} == labels


def test_the_wheel_on_the_tracks_moves_strip_grip_and_ledger(well):
    before = well.work.selection.window
    frame = well.work.tracks._places().tracks[0]
    at = QPointF((frame.left + frame.right) / 2, (frame.top + frame.base) / 2)
    event = QWheelEvent(
        at, well.work.tracks.mapToGlobal(at), QPoint(), QPoint(0, 240), Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier, Qt.ScrollPhase.NoScrollPhase, False,
    )  # fmt: skip
    QApplication.sendEvent(well.work.tracks, event)
    well.settle()
    after = well.work.selection.window
    assert after[1] - after[0] < before[1] - before[0]
    assert well.work.strip._window == after and well.work.tracks.depth_window == after
    in_view = {row for row, _, _ in well.work.ledger.rows_in_view()}
    intervals = well.work.shown.plate.intervals
    inside = {n for n, one in enumerate(intervals) if one.base > after[0] and one.top < after[1]}
    assert inside <= in_view or in_view <= inside


def test_scrolling_the_ledger_moves_the_depth_window(well):
    before = well.work.selection.window
    view = well.work.ledger.rows
    view.verticalScrollBar().setValue(view.verticalScrollBar().maximum())
    well.settle()
    after = well.work.selection.window
    assert after[0] > before[0] and after[1] > before[1]
    rows = [row for row, _, _ in well.work.ledger.rows_in_view()]
    intervals = well.work.shown.plate.intervals
    assert abs(after[0] - intervals[rows[0]].top) < 40.0 and after[1] >= intervals[rows[-1]].base - 1e-6


def test_the_crosshair_tells_the_values_in_the_status_line(well):
    frame = well.work.tracks._places().tracks[2]
    depth = 144.0
    QTest.mouseMove(well.work.tracks, QPoint(int(frame.left + 30), int(frame.y(depth))))
    well.settle()
    words = " ".join(f"{label} {value}" for label, value in well.desk.status._pairs)
    assert "MD" in words and "TVD" in words and "elevation" in words and "g/cm³" in words
    at = well.work.selection.depth
    interval = next(one for one in well.work.shown.plate.intervals if one.top <= at <= one.base)
    assert f"{interval.density:.4f}" in words
    assert well.work.ledger.table.level == "interval" and well.work.selection.row == interval.number - 1


def test_copied_rows_hold_headings_units_and_full_precision(well):
    well.work.selection.choose("interval", (3, 4))
    well.desk.do("copy")
    text = QGuiApplication.clipboard().text()
    heads, *rows = [line.split("\t") for line in text.splitlines()]
    assert "density [g/cm3]" in heads and "density_sd [g/cm3]" in heads and len(rows) == 2
    column = heads.index("density [g/cm3]")
    exact = well.work.shown.results.intervals.density.values[3] / 1000.0
    assert float(rows[0][column]) == exact


def test_units_and_depth_kinds_are_one_switch_each(well):
    top = well.work.shown.plate.intervals[5].top
    well.desk.do("unit ft")
    well.settle()
    assert well.work.shown.plate.intervals[5].top == pytest.approx(top / 0.3048, rel=1e-12)
    table = well.work.ledger.table
    column = next(one for one in table.columns if one.key == "top")
    assert column.unit == "ft MD" and column.heading == "top [ft]"
    well.desk.do("unit m")
    well.desk.do("depth elevation")
    well.settle()
    column = next(one for one in well.work.ledger.table.columns if one.key == "top")
    located = well.work.shown.results.stations.located
    pairs = well.work.shown.results.intervals.densities.pairs
    assert np.allclose(column.values, located.positions.elevation.values[pairs.top], rtol=0, atol=1e-9)
    assert well.work.shown.plate.intervals[5].base > well.work.shown.plate.intervals[5].top


def gravity_scale(well):
    """Length of the value scale of what is left of gravity."""
    track = well.work.tracks._scene.tracks[1]
    return track.high - track.low


def test_bars_are_one_or_two_standard_deviations_or_95_per_cent_at_one_click(well):
    assert well.look.theme.bars == 2
    well.desk.status.bars_clicked.emit()
    assert well.look.theme.bars == 1 and well.settings["bars"] == 1
    shorter = gravity_scale(well)
    well.desk.status.bars_clicked.emit()
    dof = well.work.shown.results.intervals.dof
    assert well.look.theme.bars == 95 and well.settings["bars"] == 95
    assert well.look.theme.reach == pytest.approx(stats.t.ppf(0.975, dof), rel=1e-9)
    assert f"bars and bands 95 % (t, {dof} dof)" in shown_words(well.desk.status)
    assert gravity_scale(well) > shorter, "the scale holds the longer bars"
    well.desk.status.bars_clicked.emit()
    assert well.look.theme.bars == 2


def test_bars_of_95_per_cent_follow_the_degrees_of_freedom_of_the_numbers_shown(well):
    well.desk.do("bars 95")
    assert well.look.theme.freedom == well.work.shown.results.intervals.dof
    changes = []
    well.look.changed.connect(lambda: changes.append(well.look.theme.freedom))
    well.look.take_freedom(3)
    well.look.take_freedom(3)
    assert changes == [3] and "95 % (t, 3 dof)" in " ".join(shown_words(well.desk.status))
    well.desk.do("bars 2")
    changes.clear()
    well.look.take_freedom(9)
    assert not changes, "bars in sd do not care"


def test_places_without_measured_depth_are_shown_by_vertical_depth(driven):
    window = driven()
    window.open(MINE)
    window.stage(states.DENSITY)
    assert window.work.shown.scale.kind in ("MD", "TVD")
    assert np.isfinite(window.work.ledger.table.top).all()


def test_going_to_a_finding_chooses_its_rows_or_opens_the_setting_it_is_about(well):
    findings = {one.code: one for one in well.work.shown.results.findings}
    single = findings["single_visit"]
    well.work.go_to_finding(single)
    well.settle()
    assert well.work.stage == states.DRIFT
    assert set(well.work.shown.stations_of("visit", well.work.selection.rows)) == set(single.stations)
    about_recipe = replace(single, place="recipe, depth_sd", stations=(), rows=())
    well.work.go_to_finding(about_recipe)
    assert "recipe" in well.work.tray.open_pages


def test_the_find_field_goes_to_a_station_and_does_actions(well):
    entries = {entry.words: entry for entry in well.desk._entries()}
    entries["Station TB-20"].run()
    well.settle()
    label = well.work.shown.results.stations.label[well.work.selection.rows[0]]
    assert well.work.stage == states.REDUCTION and label == "TB-20"
    entries["Two standard deviations"].run()
    entries["Drift"].run()
    assert well.work.stage == states.DRIFT
    entries["Drift order"].run()
    assert "recipe" in well.work.tray.open_pages


def test_tray_of_readings_shows_how_the_chosen_visit_settled(well):
    well.stage(states.READINGS)
    well.work.selection.choose("reading", (10,))
    well.work.open_page("settle")
    well.settle()
    visit = well.work.settle._visit
    assert visit is not None and 10 in list(visit.rows)
    used = [value for value, out in zip(visit.values, visit.excluded, strict=True) if not out]
    assert abs(float(np.mean(used))) < 5.0


def test_neighbours_tell_the_correlation_about_the_chosen_interval(well):
    well.work.selection.choose("interval", (10,))
    well.work.open_page("neighbours")
    well.settle()
    matrix = well.work.shown.results.intervals.errors.independent.matrix()
    sd = np.sqrt(np.diag(matrix))
    shown = np.array(well.work.neighbours._picture.matrix)
    wanted = matrix[10, 11] / sd[10] / sd[11]
    place = list(well.work.following._neighbours).index(10)
    assert shown[place][place + 1] == pytest.approx(wanted, rel=1e-9)
