"""The real window under hard use: surveys that hardly are any, folders that fail, disks that refuse, work cut short."""

from __future__ import annotations

import os
import shutil
import sqlite3
import threading
from pathlib import Path

import numpy as np
import pytest
from PySide6.QtCore import Qt

import small_folder
from driven_desk import wait_until
from plumbwell.desk import document as document_module
from plumbwell.desk.stages import states
from plumbwell.study.acts import DropTare, Exclude, Note, SetRecipe
from plumbwell.study.reduce import reduce
from reduced_surveys import MINE, SHAFT, WELL

ODD_NAMES = ("Ærø <b>&amp;</b>", "محطة رقم واحد", "\N{ROCK}\N{MAGNET}", "x" * 200, "a&b&&c", "%s{0}")


def folder_of(place: Path, *, rows: str = small_folder.READINGS, name: str = "Hollow Fell 1", more: str = "") -> Path:
    """A small survey folder with other readings, another name, or more in its survey.toml."""
    place.mkdir(parents=True)
    toml = small_folder.TOML.replace("Hollow Fell 1", name) + more
    (place / "survey.toml").write_text(toml, encoding="utf-8")
    (place / "readings.csv").write_text(rows, encoding="utf-8")
    return place


def exclude(window, rows, reason: str = "pump started") -> None:
    assert window.document.act(Exclude(rows=tuple(rows), reason=reason)) is None
    window.wait()


def rows_at(window, station: str) -> list[int]:
    readings = window.document.survey.readings
    return [row for row in range(len(readings)) if readings.station[row] == station]


def idle(window) -> None:
    """Wait until nothing is read, reduced or written."""
    wait_until(lambda: not window.document.busy and not window.document.at_work)
    window.settle()


# -- surveys that hardly are any ------------------------------------------------------------------------------


@pytest.mark.parametrize("readings", [1, 2])
def test_one_station_is_shown_in_every_stage_and_scale(driven, tmp_path, readings):
    lines = small_folder.READINGS.splitlines()
    rows = "\n".join([lines[0], lines[1], lines[3]][: readings + 1]) + "\n"
    window = driven()
    window.open(folder_of(tmp_path / "one", rows=rows))
    for stage in states.STAGES:
        window.stage(stage)
    window.stage(states.DENSITY)
    assert "densities need gravity at two depths" in window.work.ledger.rows.sentence
    for key in ("depth elevation", "unit ft", "depth TVD", "whole", "bars 1"):
        window.desk.do(key)
        window.settle()
    assert window.work.shown.scale.unit == "ft"


def test_odd_names_stand_as_they_are(driven, tmp_path):
    lines = ["time,station,depth [m],reading [mGal]"]
    for place, name in enumerate((*ODD_NAMES, ODD_NAMES[0])):
        depth = 100.0 + 10.0 * (place % len(ODD_NAMES))
        lines.append(f'2026-05-04T{9 + place:02d}:00:00Z,"{name}",{depth},{4000 + depth / 10:.3f}')
    window = driven()
    folder = folder_of(tmp_path / "a&b محطة", rows="\n".join(lines) + "\n", name="محطة a&b " + "n" * 150)
    window.open(folder)
    for stage in states.STAGES:
        window.stage(stage)
    assert window.work.shown.results.stations.label == ODD_NAMES
    assert "a&b" in window.shell.windowTitle()
    window.desk.actions.recent.aboutToShow.emit()
    shown = window.desk.actions.recent.actions()[0].text()
    assert shown == str(folder).replace("&", "&&")


def test_a_folder_that_cannot_be_reduced_whole_says_so_where_it_is_handed_over(driven, tmp_path):
    window = driven()
    folder = folder_of(tmp_path / "mine", more='openings = "openings.csv"\n')
    (folder / "openings.csv").write_text("x\n1\n")
    window.open(folder)
    window.stage(states.HANDOVER)
    assert any(one.code == "not_applied" and one.severity == "error" for one in window.document.results.findings)
    window.work.handover.write_wanted.emit(str(tmp_path / "out"))
    idle(window)
    assert (tmp_path / "out" / "summary.json").exists() and "written" in window.work.handover.said.words


# -- folders that fail ----------------------------------------------------------------------------------------


def test_a_folder_that_cannot_be_read_leaves_the_open_survey_one_click_away(driven, tmp_path):
    window = driven()
    window.open(SHAFT)
    spoiled = tmp_path / "spoiled"
    shutil.copytree(SHAFT, spoiled)
    (spoiled / "readings.csv").write_text("")
    for folder in (tmp_path / "gone", spoiled, SHAFT / "readings.csv", Path("x" * 300), Path("a\0b")):
        window.desk.open(folder)
        idle(window)
        problem = window.desk.problems.problems[0]
        assert problem.found and problem.mend
        assert window.work.front.currentWidget() is not window.work.body
    assert "still open: a click on a stage leads back" in window.desk.notice.words
    window.work.stage_line.stage_chosen.emit(window.work.stage)
    window.settle()
    assert window.work.front.currentWidget() is window.work.body
    window.desk.do("again")
    window.wait()
    assert window.document.folder == SHAFT.resolve()


@pytest.mark.skipif(os.name != "posix", reason="only POSIX systems let a plain user make links")
def test_links_that_lead_in_a_circle_are_refused_in_words(driven, tmp_path):
    (tmp_path / "circle").symlink_to(tmp_path / "circle")
    window = driven()
    window.desk.open(tmp_path / "circle")
    idle(window)
    # From Python 3.13 on such a link is no error to follow, it leads to nothing.
    assert window.desk.problems.problems[0].found in ("a name that cannot be opened", "no such folder")


def test_a_folder_that_was_mended_is_read_again_with_its_acts(driven, tmp_path):
    folder = tmp_path / "shaft"
    shutil.copytree(SHAFT, folder)
    good = (folder / "readings.csv").read_text()
    window = driven()
    window.open(folder)
    exclude(window, [3])
    (folder / "readings.csv").write_text("time\n")
    window.desk.do("again")
    idle(window)
    assert window.work.front.currentWidget() is not window.work.body
    (folder / "readings.csv").write_text(good)
    window.desk.do("again")
    window.wait()
    assert [one.reason for one in window.document.case.overlay.rows] == ["pump started"]
    (folder / "readings.csv").write_text("\n".join(good.splitlines()[:-1]) + "\n")
    window.desk.do("again")
    window.wait()
    assert not window.document.case.overlay.rows
    assert "1 act was made on earlier readings" in window.desk.notice.words


def test_an_act_that_no_longer_applies_is_told_and_the_survey_is_shown_without_it(driven, tmp_path):
    tare = '\n[[tare]]\nrun = "1"\ntime = "2026-05-04T09:10:00Z"\n'
    folder = folder_of(tmp_path / "fell", more=tare)
    window = driven()
    window.open(folder)
    (listed,) = window.document.survey.tares
    assert window.document.act(DropTare(run=listed.run, time=listed.time)) is None
    window.wait()
    (folder / "survey.toml").write_text(small_folder.TOML)
    window.desk.do("again")
    window.wait()
    assert "cannot be applied any more" in window.desk.notice.words and window.document.history.cursor == 0


def test_the_folder_asked_for_last_is_the_one_that_opens(driven, monkeypatch):
    gate, real = threading.Event(), document_module.read_survey

    def slow(folder):
        gate.wait(5.0)
        return real(folder)

    window = driven()
    monkeypatch.setattr(document_module, "read_survey", slow)
    opened = []
    window.document.opened.connect(lambda: opened.append(window.document.folder))
    for folder in (SHAFT, MINE, SHAFT, MINE):
        window.desk.open(folder)
    gate.set()
    wait_until(lambda: window.document.folder == MINE.resolve() and window.reduced())
    assert opened == [MINE.resolve()]


def test_reading_that_is_stopped_leaves_everything_as_it_was(driven, monkeypatch):
    gate, real = threading.Event(), document_module.read_survey

    def slow(folder):
        gate.wait(5.0)
        return real(folder)

    window = driven()
    window.open(SHAFT)
    monkeypatch.setattr(document_module, "read_survey", slow)
    window.desk.open(MINE)
    window.desk.status.stop_clicked.emit()
    assert not window.document.busy and "was not opened" in window.desk.notice.words
    gate.set()
    monkeypatch.undo()
    window.open(WELL)
    assert window.document.folder == WELL.resolve()


def test_a_question_is_put_away_when_another_survey_is_opened(driven):
    window = driven()
    window.open(SHAFT)
    window.work.selection.choose("reading", (3, 4))
    window.desk.do("use")
    assert window.work.reasons.isVisible()
    window.open(MINE)
    assert not window.work.reasons.isVisible() and not window.document.case.overlay.rows


# -- acts -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "stage, level",
    [
        (states.READINGS, "reading"), (states.DRIFT, "visit"), (states.REDUCTION, "station"),
        (states.DENSITY, "interval"),
    ],
)  # fmt: skip
def test_what_is_chosen_is_carried_over_a_station_that_falls_out(driven, stage, level):
    window = driven()
    window.open(SHAFT)
    window.stage(stage)
    labels, n = window.document.results.stations.label, len(window.work.ledger.table)
    kept = set(labels) - {labels[1]}
    window.work.selection.choose(level, range(n))
    window.work.following._point_at_row(n - 1)
    exclude(window, rows_at(window, labels[1]))
    rows, shown = window.work.selection.rows, window.work.shown
    assert rows and max(rows) < len(window.work.ledger.table) and window.work.selection.row is None
    assert set(window.work.ledger.chosen_rows()) == set(rows)
    lit = {shown.results.stations.label[one] for one in shown.stations_of(level, rows)}
    assert lit <= kept and (level == "reading" or lit == kept)
    for other in states.STAGES:
        window.stage(other)


def test_the_station_that_is_chosen_stays_so_when_one_above_it_falls_out(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.REDUCTION)
    labels = window.document.results.stations.label
    window.work.selection.choose("station", (3,))
    exclude(window, rows_at(window, labels[1]))
    (row,) = window.work.selection.rows
    assert window.work.shown.results.stations.label[row] == labels[3]


def test_all_readings_are_refused_and_all_but_one_can_be_seen_and_undone(driven):
    window = driven()
    window.open(SHAFT)
    n = len(window.document.survey.readings)
    assert "nothing could be reduced" in window.document.act(Exclude(rows=tuple(range(n)), reason="x"))
    exclude(window, range(1, n))
    for stage in states.STAGES:
        window.stage(stage)
    window.desk.do("undo")
    window.wait()
    assert len(window.document.results.stations) == 4


def test_undo_and_redo_hammered_end_where_the_history_says(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    for row in range(5):
        assert window.document.act(Exclude(rows=(row,), reason=f"reason {row}")) is None
    for turn in range(50):
        window.desk.do("undo" if turn % 3 else "redo")
        if turn % 10 == 0:
            window.desk.do(f"stage {states.STAGES[turn // 10]}")
    window.desk.do("redo")
    window.desk.do("redo")
    window.wait()
    assert window.document.history.cursor == 2 and len(window.document.case.overlay.rows) == 2
    expected = reduce(window.document.case).intervals.density.values
    assert np.array_equal(window.document.results.intervals.density.values, expected)


class FullDisk:
    """A connection to a database on a disk that is full."""

    def __init__(self, connection: sqlite3.Connection) -> None:
        self._connection = connection

    def __getattr__(self, name: str) -> object:
        return getattr(self._connection, name)

    def execute(self, statement: str, *values: object) -> object:
        if statement.startswith(("INSERT", "UPDATE")):
            error = sqlite3.OperationalError("database or disk is full")
            error.sqlite_errorcode = sqlite3.SQLITE_FULL
            raise error
        return self._connection.execute(statement, *values)

    executemany = execute


def test_on_a_full_disk_nothing_changes_and_the_reason_is_told(driven):
    window = driven()
    window.open(SHAFT)
    exclude(window, [3])
    keeper, case = window.document._keeper, window.document.case
    real = keeper._connection
    keeper._connection = FullDisk(real)
    window.work.selection.choose("reading", (9,))
    window.desk.do("use")
    window.answer("later")
    assert "the disk is full" in window.work.reasons.wrong.words and window.work.reasons.field.text() == "later"
    window.desk.do("undo")
    assert "so it was not made: the disk is full" in window.desk.notice.words
    assert window.document.case is case and len(window.document.history.points) == 2 and window.reduced()
    keeper._connection = real
    window.desk.do("undo")
    window.wait()
    assert window.document.history.cursor == 0 and not window.desk.notice.words


def test_an_act_that_fails_to_be_kept_does_not_swallow_the_result_that_is_awaited(driven, monkeypatch):
    window = driven()
    window.open(SHAFT)
    exclude(window, [3])
    gate, real = threading.Event(), document_module.reduce

    def slow(case, kept):
        gate.wait(5.0)
        return real(case, kept=kept)

    monkeypatch.setattr(document_module, "reduce", slow)
    assert window.document.act(Exclude(rows=(5,), reason="x")) is None
    assert window.document.act(Exclude(rows=(6,), reason="x")) is None
    keeper = window.document._keeper
    connection, keeper._connection = keeper._connection, FullDisk(keeper._connection)
    assert "disk is full" in window.document.act(Exclude(rows=(7,), reason="x"))
    gate.set()
    window.wait()
    assert [one.row for one in window.document.reduced_case.overlay.rows] == [3, 5, 6]
    keeper._connection = connection


def test_the_second_window_on_a_survey_looks_on_until_the_first_is_closed(driven):
    first, second = driven(), driven()
    first.open(SHAFT)
    second.open(SHAFT)
    assert "open in another window" in second.desk.notice.words
    second.work.selection.choose("reading", (9,))
    second.desk.do("use")
    second.answer("later")
    assert "acts are made there" in second.work.reasons.wrong.words and second.reduced()
    second.work.reasons.let_be()
    setting = SetRecipe(name=second.document.case.chosen_name, key="reference_density", value=2.4)
    assert "acts are made there" in second.document.act(setting)
    first.close()
    second.desk.do("again")
    second.wait()
    exclude(second, [9])
    assert len(second.document.history.points) == 2


def test_a_note_that_may_not_stand_is_refused_in_words_that_are_all_seen(driven):
    window = driven(size=(760, 520), scale=1.6)
    window.open(SHAFT)
    for text in ("line\nbreak", "\u202ertl", "x" * 10_000):
        assert window.document.act(Note(rows=(3,), text=text))
    window.work.selection.choose("reading", (3,))
    window.desk.do("note")
    window.work.reasons.field.setText("x" * 10_000)
    window.key(window.work.reasons.field, Qt.Key.Key_Return)
    wrong = window.work.reasons.wrong
    assert "at most 2000 characters" in wrong.words and wrong.isVisible()
    assert wrong.height() >= wrong.height_for(wrong.width())
    window.work.reasons.let_be()


# -- the window -----------------------------------------------------------------------------------------------


def test_depths_that_are_none_do_not_move_the_window(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    for top, base in ((float("nan"), 1.0), (1.0, float("inf")), (1e9, -1e9), (5.0, 5.0), (-1e9, 1e9)):
        window.work.strip.window_wanted.emit(top, base)
        window.settle()
    top, base = window.work.selection.window
    assert np.isfinite(top + base) and base > top


def test_the_least_and_the_largest_window_hold_at_both_ends_of_the_text_scale(driven):
    window = driven()
    window.open(MINE)
    for scale in (0.9, 1.6):
        window.look.choose(text_scale=scale)
        for size in ((760, 520), (3840, 2160)):
            window.shell.resize(*size)
            for stage in states.STAGES:
                window.stage(stage)
            window.desk.do("tray")
            window.settle()
            window.desk.do("tray")
    assert window.shell.width() == 3840
