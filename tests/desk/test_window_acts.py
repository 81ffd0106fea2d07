"""A person's acts in the real window: what is left out, set and taken back is seen everywhere, and kept."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys

import pytest
from PySide6.QtCore import QMimeData, QPointF, Qt, QUrl
from PySide6.QtGui import QDropEvent
from PySide6.QtTest import QTest

from driven_desk import wait_until
from plumbwell.desk.stages import states
from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.study.tables import TABLES
from reduced_surveys import CHECKOUT, MINE, SHAFT, WELL


def densities(window) -> list[str]:
    """Densities as the ledger holds them, to the last bit."""
    table = window.work.ledger.table
    column = next(one for one in table.columns if one.key == "density")
    return [float(value).hex() for value in column.values]


def track_densities(window) -> list[float]:
    """Densities as the track holds them."""
    track = next(one for one in window.tracks if one.title == "density")
    return [step.value for step in track.steps]


def exclude(window, row: int, reason: str) -> None:
    window.stage(states.READINGS)
    window.work.ledger.choose_rows((row,))
    window.work.selection.choose("reading", (row,))
    window.key(window.work.ledger, Qt.Key.Key_Space)
    assert window.work.reasons.isVisible()
    window.answer(reason)
    window.wait()


def test_a_reading_left_out_moves_the_densities_everywhere_and_undo_brings_back_the_last_bit(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    before, track, strip = densities(window), track_densities(window), window.strip_densities
    exclude(window, 3, "pump started")
    window.stage(states.DENSITY)
    assert densities(window) != before and track_densities(window) != track
    assert window.strip_densities != strip
    assert track_densities(window) == [float.fromhex(one) for one in densities(window)]
    window.desk.do("undo")
    window.wait()
    assert densities(window) == before and track_densities(window) == track
    told = [row.sentence for row in window.history_rows]
    assert any("pump started" in one and "Left out 1 reading" in one for one in told)
    here = next(row for row in window.history_rows if row.here)
    ahead = [row for row in window.history_rows if row.ahead]
    assert here.number == 0 and len(ahead) == 1
    window.desk.do("redo")
    window.wait()
    assert densities(window) != before


def test_the_excluded_row_is_struck_through_with_its_reason(driven):
    window = driven()
    window.open(SHAFT)
    exclude(window, 3, "pump started")
    table = window.work.ledger.table
    assert table.excluded[3] and table.marks[3] == "excluded" and "pump started" in table.hints[3]
    note = next(one for one in table.columns if one.key == "note")
    assert note.values[3] == "pump started" and note.shown
    # Space on a row that is out asks to take it in again.
    window.work.selection.choose("reading", (3,))
    window.key(window.work.ledger, Qt.Key.Key_Space)
    window.answer("")
    window.wait()
    assert not window.work.ledger.table.excluded[3]


def test_a_blank_reason_is_refused_in_its_place(driven):
    window = driven()
    window.open(SHAFT)
    window.work.selection.choose("reading", (3,))
    window.key(window.work.ledger, Qt.Key.Key_Space)
    window.answer("  ")
    assert window.work.reasons.isVisible() and "Say why" in window.work.reasons.wrong.words
    assert len(window.document.history.points) == 1
    window.key(window.work.reasons.field, Qt.Key.Key_Escape)
    assert not window.work.reasons.isVisible()


def test_a_setting_changes_the_ledger_at_once_and_a_wrong_value_is_refused_beside_the_field(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    window.work.open_page("recipe")
    window.settle()
    before = densities(window)
    window.work.recipe.key_changed.emit("reference_density", 2.4)
    window.wait()
    assert densities(window) != before
    assert window.work.recipe.changed_keys == ("reference_density",)
    expected = reduce(Case(survey=read_survey(SHAFT), recipe=window.document.case.chosen))
    assert densities(window) == [float(one).hex() for one in TABLES["intervals"].column("density").values(expected)]
    points = len(window.document.history.points)
    window.work.recipe.key_changed.emit("reference_density", "granite")
    assert "a number in g/cm3" in window.work.recipe.form.rows["reference_density"].refusal
    assert len(window.document.history.points) == points
    window.work.recipe.key_changed.emit("reference_density", None)
    window.wait()
    assert densities(window) == before


def test_going_back_to_any_point_of_the_history(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    first = densities(window)
    exclude(window, 3, "one")
    exclude(window, 9, "two")
    window.work.history.go_to.emit(1)
    window.wait()
    assert window.document.case.overlay.rows[0].reason == "one" and len(window.document.case.overlay.rows) == 1
    window.work.history.point_named.emit("before lunch")
    assert any(row.name == "before lunch" for row in window.history_rows)
    window.work.history.go_to.emit(0)
    window.wait()
    window.stage(states.DENSITY)
    assert densities(window) == first


def test_acts_are_there_when_the_survey_is_opened_again(driven):
    window = driven()
    window.open(SHAFT)
    exclude(window, 3, "pump started")
    window.stage(states.DENSITY)
    after = densities(window)
    window.close()
    again = driven()
    again.open(SHAFT)
    again.stage(states.DENSITY)
    assert densities(again) == after
    assert again.document.case.overlay.rows[0].reason == "pump started"


@pytest.mark.skipif(os.name != "posix", reason="a process can be killed so only where there is SIGKILL")
def test_a_program_killed_after_an_exclusion_finds_it_at_the_next_start(driven, tmp_path):
    script = f"""
import os, signal, sys
sys.path.insert(0, {str(CHECKOUT / "tests" / "made")!r})
from pathlib import Path
from PySide6.QtWidgets import QApplication
application = QApplication([])
from driven_desk import Driven
window = Driven(Path({str(tmp_path / "home")!r}))
window.open(Path({str(SHAFT)!r}))
window.work.selection.choose("reading", (3,))
window.desk.do("use")
window.answer("pump started")
os.kill(os.getpid(), signal.SIGKILL)
"""
    ended = subprocess.run(
        [sys.executable, "-c", script],
        env={**os.environ, "QT_QPA_PLATFORM": "offscreen", "PYTHONPATH": str(CHECKOUT / "src")},
        check=False,
        timeout=120,
    )
    assert ended.returncode == -9
    window = driven()
    window.open(SHAFT)
    assert [one.reason for one in window.document.case.overlay.rows] == ["pump started"]
    assert not window.document.results.survey.readings.use[3]


def test_a_copy_of_the_survey_folder_reduces_to_the_same_numbers(driven, tmp_path):
    window = driven()
    window.open(WELL)
    exclude(window, 20, "sledge on the road")
    window.work.recipe.key_changed.emit("reference_density", 2.4)
    window.wait()
    window.stage(states.DENSITY)
    window.work.handover.copy_wanted.emit(str(tmp_path / "copy"))
    wait_until(lambda: (tmp_path / "copy" / "survey.toml").exists() and "copy" in window.desk.notice.words)
    results = reduce(Case(survey=read_survey(tmp_path / "copy")))
    assert densities(window) == [float(one).hex() for one in TABLES["intervals"].column("density").values(results)]


def test_nothing_is_written_into_the_survey_folder(driven, tmp_path):
    folder = tmp_path / "survey"
    shutil.copytree(SHAFT, folder)
    before = {path.name: path.read_bytes() for path in folder.iterdir()}
    window = driven()
    window.open(folder)
    exclude(window, 3, "pump started")
    window.close()
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == before


def test_a_tare_is_listed_before_the_chosen_reading_and_dropped_again(driven):
    window = driven()
    window.open(MINE)
    window.work.selection.choose("reading", (12,))
    window.desk.do("tare")
    window.wait()
    assert len(window.document.results.survey.tares) == len(read_survey(MINE).tares) + 1
    window.work.selection.choose("reading", (12,))
    window.desk.do("drop tare")
    window.wait()
    assert len(window.document.results.survey.tares) == len(read_survey(MINE).tares)


def test_a_folder_is_opened_by_dropping_it(driven):
    window = driven()
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(SHAFT / "survey.toml"))])
    event = QDropEvent(
        QPointF(200, 200), Qt.DropAction.CopyAction, data, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier
    )
    window.shell.dropEvent(event)
    wait_until(lambda: window.document.folder == SHAFT.resolve() and window.reduced())
    assert "Reiche Zeche" in window.shell.windowTitle()


def test_outputs_are_those_of_the_command_line(driven, tmp_path):
    from plumbwell.cli import main

    window = driven()
    window.open(SHAFT)
    window.stage(states.HANDOVER)
    window.work.handover.folder.setText(str(tmp_path / "by window"))
    QTest.mouseClick(window.work.handover.write, Qt.MouseButton.LeftButton)
    wait_until(lambda: (tmp_path / "by window" / "summary.json").exists() and bool(window.work.written))
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "by line"), "--quiet"]) == 0
    for path in (tmp_path / "by line").iterdir():
        if path.name != "summary.json":
            assert (tmp_path / "by window" / path.name).read_bytes() == path.read_bytes(), path.name


def test_a_folder_for_outputs_that_cannot_serve_is_refused_in_words(driven):
    window = driven()
    window.open(SHAFT)
    window.stage(states.HANDOVER)
    window.work.handover.write_wanted.emit(str(SHAFT))
    assert "is the survey folder itself" in window.work.handover.said.words


def test_a_slow_step_leaves_the_window_free_and_a_second_change_drops_the_first_result(driven, monkeypatch):
    import threading

    from plumbwell.study import reduce as chain

    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    before = densities(window)
    gate, seen = threading.Event(), []
    real = chain.docket

    def slow(results):
        seen.append(results.recipe.reference_density)
        gate.wait(3.0)
        return real(results)

    monkeypatch.setattr(chain, "docket", slow)
    shown = []
    window.document.reduced.connect(lambda: shown.append(window.document.results.recipe.reference_density))
    window.work.recipe.key_changed.emit("reference_density", 2.4)
    wait_until(lambda: bool(seen))
    window.work.recipe.key_changed.emit("reference_density", 2.5)
    # The window answers meanwhile: another stage, another row, a repaint.
    window.stage(states.REDUCTION)
    window.work.ledger.walk(1)
    window.settle()
    assert window.work.stage == states.REDUCTION and window.document.busy
    gate.set()
    window.wait()
    assert shown == [2500.0] and seen[-1] == 2500.0
    window.stage(states.DENSITY)
    assert densities(window) != before
