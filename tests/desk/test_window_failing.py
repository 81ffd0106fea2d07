"""The real window when results do not come, work is cut short, or the program itself fails."""

from __future__ import annotations

import faulthandler
import os
import subprocess
import sys
import threading

import pytest

import small_folder
from driven_desk import wait_until
from plumbwell.desk import document as document_module
from plumbwell.desk.following import FANS
from plumbwell.desk.opening import failure
from plumbwell.desk.stages import states
from plumbwell.plates import outputs
from plumbwell.study.acts import Exclude
from plumbwell.survey.errors import SurveyError
from reduced_surveys import CHECKOUT, MINE, SHAFT, WELL


def exclude(window, rows, reason: str = "pump started") -> None:
    assert window.document.act(Exclude(rows=tuple(rows), reason=reason)) is None
    window.wait()


def idle(window) -> None:
    """Wait until nothing is read, reduced or written."""
    wait_until(lambda: not window.document.busy and not window.document.at_work)
    window.settle()


def refuse(case, kept):
    raise SurveyError("no reading in use belongs to a station: nothing can be reduced")


def fail(*_, **__):
    raise ZeroDivisionError("reading 4859.511")


# -- results that do not come ---------------------------------------------------------------------------------


def test_a_case_that_cannot_be_reduced_is_told_and_undo_brings_the_numbers_back(driven, tmp_path, monkeypatch):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    with monkeypatch.context() as patch:
        patch.setattr(document_module, "reduce", refuse)
        window.document.act(Exclude(rows=(3,), reason="x"))
        idle(window)
    words = window.desk.notice.words
    assert "cannot be reduced" in words and "those of before" in words and "Undo" in words
    assert window.work.ledger.rows.stale and not window.reduced()
    figures = {one.key: one.figure for one in window.work.stage_line._stages}
    assert figures[states.DENSITY] == "waiting"
    window.work.handover.write_wanted.emit(str(tmp_path / "out"))
    assert "nothing is written" in window.work.handover.said.words and not (tmp_path / "out").exists()
    window.desk.do("undo")
    window.wait()
    assert not window.work.ledger.rows.stale and not window.desk.notice.words
    # Another act that can be reduced puts the words away just as well.
    with monkeypatch.context() as patch:
        patch.setattr(document_module, "reduce", refuse)
        window.document.act(Exclude(rows=(3,), reason="x"))
        idle(window)
    assert window.desk.notice.words
    exclude(window, [4])
    assert not window.work.ledger.rows.stale and not window.desk.notice.words


def test_a_survey_that_cannot_be_reduced_shows_nothing_of_the_one_before(driven, monkeypatch):
    window = driven()
    window.open(WELL)
    window.stage(states.DENSITY)
    with monkeypatch.context() as patch:
        patch.setattr(document_module, "reduce", refuse)
        window.desk.open(MINE)
        wait_until(lambda: window.document.folder == MINE.resolve() and not window.document.busy)
        window.settle()
    for stage in (states.DRIFT, states.REDUCTION, states.DENSITY, states.HANDOVER):
        window.stage(stage)
        assert len(window.work.ledger.table) == 0 and "cannot be reduced" in window.work.ledger.rows.sentence
        assert not window.work.fan._rows and not window.work.docket.findings
        assert stage not in FANS or not window.tracks
    window.stage(states.READINGS)
    assert len(window.work.ledger.table) == len(window.document.survey.readings)
    window.desk.do("use")
    assert "not reduced yet" in window.desk.notice.words
    window.document.act(Exclude(rows=(3,), reason="x"))
    window.wait()
    window.stage(states.DENSITY)
    assert len(window.work.ledger.table) and window.work.docket.findings


@pytest.fixture
def failures(tmp_path):
    """Makes the window's own taking of unforeseen errors, as the start of the program does."""
    was_enabled = faulthandler.is_enabled()
    yield lambda window: failure.install(tmp_path / "home", window.look, window.shell)
    failure.uninstall()
    if was_enabled:
        faulthandler.enable(file=sys.__stderr__)


def closed(failures, window) -> str:
    """The sentence of the one dialog that is shown; closes it."""
    window.settle()
    dialog = failures.dialog
    assert dialog is not None
    words = dialog.sentence.words
    dialog.close()
    window.settle()
    assert failures.dialog is None
    failures._last = -failure.QUIET_SECONDS
    return words


def test_unforeseen_errors_are_told_once_and_the_window_goes_on(driven, tmp_path, monkeypatch, failures):
    window = driven()
    window.open(SHAFT)
    window.stage(states.DENSITY)
    taken = failures(window)
    with monkeypatch.context() as patch:
        patch.setattr(document_module, "reduce", fail)
        window.document.act(Exclude(rows=(3,), reason="x"))
        idle(window)
    assert "ZeroDivisionError" in closed(taken, window)
    assert "A fault of the program" in window.desk.notice.words and not window.document.busy
    window.desk.do("undo")
    window.wait()
    window.document.long_work(lambda progress: [][1])
    idle(window)
    assert "IndexError" in closed(taken, window)
    assert "What stood there before is unchanged" in window.work.handover.said.words
    with monkeypatch.context() as patch:
        patch.setattr(document_module, "read_survey", lambda folder: {}["4859.511"])
        window.desk.open(MINE)
        idle(window)
    assert "KeyError" in closed(taken, window) and "KeyError" in window.desk.problems.message.words
    window.stage(states.DENSITY)
    exclude(window, [4])
    assert len(window.document.history.points) == 3 and window.work.shown.results is window.document.results
    assert "4859.511" not in (tmp_path / "home" / "plumbwell.log").read_text()


# -- handing over ---------------------------------------------------------------------------------------------


def test_writing_that_is_stopped_midway_leaves_nothing(driven, tmp_path, monkeypatch):
    window = driven()
    window.open(SHAFT)
    window.stage(states.HANDOVER)
    begun, gate, real = threading.Event(), threading.Event(), outputs._with_figures

    def slow(results, aside):
        begun.set()
        gate.wait(5.0)
        return real(results, aside)

    monkeypatch.setattr(outputs, "_with_figures", slow)
    place = tmp_path / "place"
    place.mkdir()
    panel = window.work.handover
    panel.write_wanted.emit(str(place / "out"))
    wait_until(begun.is_set)
    panel.write_wanted.emit(str(place / "other"))
    assert "being written already" in panel.said.words
    window.desk.status.stop_clicked.emit()
    gate.set()
    idle(window)
    assert panel.said.words == "Stopped. Nothing was written." and not list(place.iterdir())
    panel.write_wanted.emit(str(place / "out"))
    idle(window)
    assert (place / "out" / "summary.json").exists()


def test_work_that_waits_is_told_as_stopped(driven):
    window = driven()
    begun, gate, told = threading.Event(), threading.Event(), []
    window.document.not_done.connect(told.append)
    window.document.long_work(lambda progress: (begun.set(), gate.wait(5.0)))
    wait_until(begun.is_set)
    window.document.long_work(lambda progress: None)
    window.document.stop()
    assert len(told) == 1
    gate.set()
    idle(window)


def test_a_folder_for_outputs_without_a_place_of_its_own_lies_beside_the_survey(driven, tmp_path):
    window = driven()
    fell = tmp_path / "surveys" / "fell"
    fell.mkdir(parents=True)
    (fell / "survey.toml").write_text(small_folder.TOML)
    (fell / "readings.csv").write_text(small_folder.READINGS)
    window.open(fell)
    window.work.handover.write_wanted.emit("fell_out")
    idle(window)
    assert (tmp_path / "surveys" / "fell_out" / "summary.json").exists()
    (tmp_path / "surveys" / "theirs").mkdir()
    (tmp_path / "surveys" / "theirs" / "stations.csv").write_text("theirs")
    for refused, words in (("theirs", "Nothing is overwritten"), ("fell", "is the survey folder itself")):
        window.work.handover.write_wanted.emit(refused)
        idle(window)
        assert words in window.work.handover.said.words
    assert (tmp_path / "surveys" / "theirs" / "stations.csv").read_text() == "theirs"


# -- the process ----------------------------------------------------------------------------------------------


CLOSING = """
import sys, time
from pathlib import Path
from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication
from plumbwell.desk import document, start
from plumbwell.desk.shell import Shell
from plumbwell.plates import outputs

application = QApplication([])
when, begun = {when!r}, []

def endless(*given, **named):
    begun.append(when)
    time.sleep(100.0)

if when == "reading":
    document.read_survey = endless
elif when == "reducing":
    document.reduce = endless
else:
    outputs._with_figures = endless

def look():
    shells = [one for one in application.topLevelWidgets() if isinstance(one, Shell) and one.inhabited is not None]
    if begun:
        shells[0].close()
    elif shells and when == "writing" and shells[0].inhabited.document.current:
        if not shells[0].inhabited.document.at_work:
            shells[0].inhabited.workspace.handover.write_wanted.emit({out!r})

poll = QTimer()
poll.timeout.connect(look)
poll.start(10)
sys.exit(start.run(Path({folder!r}), Path({home!r})))
"""


PAINTING = """
import sys
from pathlib import Path
from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication
from plumbwell.desk import start
from plumbwell.desk.opening import failure
from plumbwell.desk.tracks import track_view
from plumbwell.desk.shell import Shell
from plumbwell.study.acts import Exclude

application = QApplication([])
real, seen = track_view.layers_of, []

def fail(*given, **named):
    seen.append(1)
    raise ZeroDivisionError("reading 4859.511")

def look():
    shells = [one for one in application.topLevelWidgets() if isinstance(one, Shell) and one.inhabited is not None]
    if not shells:
        return
    desk = shells[0].inhabited
    if not seen and desk.document.current:
        track_view.layers_of = fail
        desk.do("stage density")
    dialog = failure._installed[0].failures.dialog if failure._installed else None
    if 0 < len(seen) < 5:
        desk.workspace.tracks.set_window(float(len(seen)), 100.0)
    elif seen and dialog is not None:
        track_view.layers_of = real
        desk.workspace.tracks.update()
        dialog.close()
        assert desk.document.act(Exclude(rows=(3,), reason="x")) is None
        seen.append("act")
    elif "act" in seen and desk.document.current:
        print(desk.workspace.shown.case is desk.document.case)
        shells[0].close()

poll = QTimer()
poll.timeout.connect(look)
poll.start(10)
sys.exit(start.run(Path({folder!r}), Path({home!r})))
"""


def test_errors_in_painting_are_told_once_and_the_window_goes_on(tmp_path):
    script = PAINTING.format(folder=str(SHAFT), home=str(tmp_path / "home"))
    ended = in_a_process(script)
    assert ended.returncode == 0 and ended.stdout == "True\n", ended.stderr
    assert "4859.511" not in (tmp_path / "home" / "plumbwell.log").read_text()


def in_a_process(script: str) -> subprocess.CompletedProcess[str]:
    """Run a script in a Python of its own, offscreen."""
    return subprocess.run(
        [sys.executable, "-c", script],
        env={**os.environ, "QT_QPA_PLATFORM": "offscreen", "PYTHONPATH": str(CHECKOUT / "src")},
        check=False,
        timeout=60,
        capture_output=True,
        text=True,
    )


@pytest.mark.parametrize("when", ["reading", "reducing", "writing"])
def test_a_window_closes_while_work_goes_on_that_cannot_be_stopped(tmp_path, when):
    script = CLOSING.format(when=when, folder=str(SHAFT), home=str(tmp_path / "home"), out=str(tmp_path / "out"))
    ended = in_a_process(script)
    assert ended.returncode == 0, ended.stderr
    assert not (tmp_path / "out").exists()
