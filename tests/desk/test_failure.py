"""When the program fails: logged without readings, shown once, and everything put back at the end."""

import faulthandler
import os
import subprocess
import sys
import threading
from contextlib import contextmanager
from pathlib import Path

import pytest
from PySide6.QtCore import Qt, qInstallMessageHandler, qWarning
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest

from plumbwell.desk.opening.failure import SAFE, Failures, install, sentence_of, uninstall
from plumbwell.desk.opening.failure_log import KEPT, LARGEST, LOG_NAME, FailureLog, traced
from plumbwell.survey.errors import InputError, Problem, SurveyError
from shown_texts import SCALES, cut_short, look_of, shown_words

SECRET = "2440.671"


@contextmanager
def installed(folder, look):
    """The hooks in place; put back, and Python's own crash handler too. In the test, over those of pytest."""
    was_enabled = faulthandler.is_enabled()
    try:
        yield install(folder, look)
    finally:
        uninstall()
        if was_enabled:
            faulthandler.enable(file=sys.__stderr__)


@pytest.fixture
def failures(look, tmp_path):
    """A taker of errors with a clock of its own, nothing installed."""
    now = [100.0]
    made = Failures(FailureLog(tmp_path), look, clock=lambda: now[0])
    made.now = now
    yield made
    if made.dialog is not None:
        made.dialog.close()
    made.log.close()


def raised(message=SECRET, kind=ValueError):
    """An error that came out of a function with readings in its variables."""

    def reduced(reading):
        raise kind(message)

    try:
        reduced(float(SECRET))
    except kind as error:
        return error


def other():
    try:
        return {}["TB-12"]
    except KeyError as error:
        return error


def text_of(folder: Path) -> str:
    return (folder / LOG_NAME).read_text("utf-8")


def shown(qtbot, failures):
    qtbot.waitUntil(lambda: failures.dialog is not None, timeout=5000)
    return failures.dialog


def test_a_trace_tells_type_and_places_and_no_value():
    lines = traced(raised()).splitlines()
    assert lines[0] == "ValueError"
    assert [line.split()[-1] for line in lines[1:]] == ["raised", "reduced"]
    assert all("/test_failure.py:" in line for line in lines[1:])
    assert SECRET not in "\n".join(lines)


def test_causes_are_told_without_their_messages_too():
    try:
        try:
            raise raised()
        except ValueError as error:
            raise InputError([Problem(file="a", row=1, column="b", found=SECRET, expected="", mend="")]) from error
    except InputError as error:
        text = traced(error)
    assert text.startswith("plumbwell.survey.errors.InputError") and "caused by ValueError" in text
    assert SECRET not in text


def test_an_error_that_causes_itself_ends():
    one, two = raised(), other()
    one.__cause__, two.__cause__ = two, one
    assert traced(one).count("caused by") == 1


def test_trouble_of_the_system_is_named_without_its_file():
    error = FileNotFoundError(2, "No such file", f"/home/ann/{SECRET}.csv")
    assert traced(error) == "FileNotFoundError (ENOENT)"
    assert sentence_of(error) == "The disk or the system refused something: No such file."


def test_a_deep_recursion_is_shortened():
    def deep(count):
        return 1 / 0 if count == 0 else deep(count - 1)

    with pytest.raises(ZeroDivisionError) as caught:
        deep(500)
    lines = traced(caught.value).splitlines()
    assert len(lines) < 70 and any(line.endswith("more") for line in lines)


def test_the_log_holds_no_reading(failures, tmp_path):
    failures.take(raised())
    failures.take(other())
    text = text_of(tmp_path)
    assert "ValueError" in text and "KeyError" in text and "Plumbwell" in text
    assert SECRET not in text and "TB-12" not in text


def test_the_dialog_says_what_happened_and_that_nothing_is_lost(qtbot, failures, tmp_path):
    failures.take(raised())
    dialog = shown(qtbot, failures)
    words = shown_words(dialog)
    assert "A fault of the program stopped what was just asked (ValueError)." in words
    assert SAFE in words and str(tmp_path / LOG_NAME) in " ".join(words)
    assert SECRET not in " ".join(words) + dialog.details.toPlainText()
    QTest.mouseClick(dialog.copy, Qt.MouseButton.LeftButton)
    copied = QGuiApplication.clipboard().text()
    assert copied.startswith("ValueError\n") and "Plumbwell" in copied and SECRET not in copied


def test_an_error_of_ours_is_said_in_its_own_words():
    assert sentence_of(SurveyError("there is no station")) == "there is no station."


def test_the_dialog_is_closed_by_return_and_by_escape(qtbot, failures):
    failures.take(raised())
    dialog = shown(qtbot, failures)
    QTest.keyClick(dialog.leave, Qt.Key.Key_Return)
    assert failures.dialog is None
    failures.now[0] += 5
    failures.take(other())
    QTest.keyClick(shown(qtbot, failures), Qt.Key.Key_Escape)
    assert failures.dialog is None


def test_the_same_failure_is_shown_once(qtbot, failures):
    def fail():
        failures.take(raised())
        qtbot.wait(1)

    fail()
    shown(qtbot, failures).close()
    failures.now[0] += 60
    fail()
    assert failures.dialog is None


def test_nothing_is_shown_within_two_seconds_of_the_last(qtbot, failures):
    failures.take(raised())
    shown(qtbot, failures).close()
    failures.now[0] += 1.5
    failures.take(other())
    qtbot.wait(1)
    assert failures.dialog is None
    failures.now[0] += 1.0
    failures.take(other())
    assert "KeyError" in shown(qtbot, failures).details.toPlainText()


def test_a_flood_is_one_dialog_and_a_short_log(qtbot, failures, tmp_path):
    for _ in range(500):
        failures.take(raised())
        failures.take(other())
    first = shown(qtbot, failures)
    qtbot.wait(1)
    assert failures.dialog is first
    assert text_of(tmp_path).count("KeyError") == 3


def test_a_failure_while_a_failure_is_told_is_left_alone(failures, monkeypatch):
    said = []

    def broken(text):
        said.append(text)
        failures.take(other())
        raise RuntimeError

    monkeypatch.setattr(failures.log, "write", broken)
    failures.take(raised())
    assert len(said) == 1


def test_an_error_in_painting_is_shown_once_after_it(tmp_path):
    source = (
        "import sys; from pathlib import Path\n"
        "from PySide6.QtWidgets import QApplication, QWidget; from PySide6.QtCore import QTimer\n"
        "from plumbwell.desk.opening.failure import install, uninstall; from plumbwell.desk.look import Look\n"
        "class Broken(QWidget):\n"
        "    def paintEvent(self, event):\n"
        f"        raise ZeroDivisionError({SECRET!r})\n"
        "def main():\n"
        "    application = QApplication([])\n"
        "    failures = install(Path(sys.argv[1]), Look())\n"
        "    widget, timer = Broken(), QTimer(); widget.show()\n"
        "    timer.timeout.connect(widget.update); timer.start(2)\n"
        "    log = Path(sys.argv[1]) / 'plumbwell.log'\n"
        "    def look():\n"
        "        if log.read_text().count('paintEvent') == 3 and failures.dialog is not None:\n"
        "            print(failures.dialog.details.toPlainText()); widget.hide(); application.exit()\n"
        "    timer.timeout.connect(look); application.exec(); uninstall()\n"
        "main()\n"
    )
    ended = subprocess.run(
        [sys.executable, "-c", source, str(tmp_path)], check=False, capture_output=True, text=True, timeout=60
    )
    assert ended.returncode == 0, ended.stderr
    assert ended.stdout.startswith("ZeroDivisionError\n") and "paintEvent" in ended.stdout
    assert SECRET not in ended.stdout + ended.stderr + text_of(tmp_path)
    assert text_of(tmp_path).count("paintEvent") == 3


def test_an_error_in_a_thread_is_taken(qtbot, look, tmp_path):
    with installed(tmp_path, look) as failures:
        thread = threading.Thread(target=lambda: 1 / 0)
        thread.start()
        thread.join()
        assert "ZeroDivisionError" in shown(qtbot, failures).details.toPlainText()
    assert "ZeroDivisionError" in text_of(tmp_path)


def test_an_uncaught_error_is_taken(qtbot, look, tmp_path):
    with installed(tmp_path, look) as failures:
        error = raised()
        sys.excepthook(type(error), error, error.__traceback__)
        assert "ValueError" in shown(qtbot, failures).details.toPlainText()


def test_ctrl_c_goes_the_usual_way(look, tmp_path, monkeypatch):
    usual = []
    monkeypatch.setattr(sys, "excepthook", lambda *told: usual.append(told[0]))
    with installed(tmp_path, look) as failures:
        sys.excepthook(KeyboardInterrupt, KeyboardInterrupt(), None)
        assert usual == [KeyboardInterrupt] and failures.dialog is None


def test_messages_of_qt_are_logged_and_then_go_where_they_went(look, tmp_path):
    heard = []
    before = qInstallMessageHandler(lambda kind, context, text: heard.append(text))
    with installed(tmp_path, look):
        qWarning("QPainter::begin: not a device")
    qWarning("afterwards")
    qInstallMessageHandler(before)
    assert "Qt warning: QPainter::begin: not a device" in text_of(tmp_path)
    assert heard == ["afterwards"]


def test_everything_is_as_before_after_uninstalling(look, tmp_path):
    before = sys.excepthook, threading.excepthook
    with installed(tmp_path, look):
        assert sys.excepthook is not before[0] and threading.excepthook is not before[1]
        assert faulthandler.is_enabled()
    assert (sys.excepthook, threading.excepthook) == before
    uninstall()


def test_a_large_log_is_put_aside_and_old_ones_go(tmp_path):
    for number in range(KEPT + 3):
        (tmp_path / LOG_NAME).write_text(f"{number} " + "x" * LARGEST, "utf-8")
        FailureLog(tmp_path).close()
        assert (tmp_path / LOG_NAME).stat().st_size < 1000
    kept = sorted(path.name for path in tmp_path.iterdir())
    assert kept == [LOG_NAME, *(f"{LOG_NAME}.{number + 1}" for number in range(KEPT))]
    assert (tmp_path / f"{LOG_NAME}.1").read_text("utf-8").startswith(f"{KEPT + 2} ")


def test_one_run_does_not_fill_the_disk(tmp_path):
    log = FailureLog(tmp_path)
    for number in range(300):
        log.write(f"{number} " + "x" * 10_000)
    log.close()
    assert (tmp_path / LOG_NAME).stat().st_size < 1.1 * LARGEST


def test_a_disk_that_refuses_the_log_does_not_keep_the_window_from_failing_well(qtbot, look, tmp_path):
    (tmp_path / "file").write_text("", "utf-8")
    failures = Failures(FailureLog(tmp_path / "file" / "folder"), look)
    failures.take(raised())
    dialog = shown(qtbot, failures)
    assert dialog.details.toPlainText().startswith("ValueError\n")
    assert os.listdir(tmp_path) == ["file"]
    dialog.close()


def test_a_crash_writes_its_places_into_the_log(tmp_path):
    source = (
        "import faulthandler, sys; from pathlib import Path; from plumbwell.desk.opening.failure_log import start_log\n"
        f"secret = {SECRET!r}; log = start_log(Path(sys.argv[1]))\n"
        "def painted():\n    import os; os.abort()\n"
        "painted()\n"
    )
    ended = subprocess.run([sys.executable, "-c", source, str(tmp_path)], check=False, capture_output=True)
    assert ended.returncode != 0
    text = text_of(tmp_path)
    assert "in painted" in text and SECRET not in text


@pytest.mark.parametrize("scale", SCALES)
def test_the_dialog_has_room_at_every_text_scale(qtbot, scale, tmp_path):
    with look_of("dark", scale) as look:
        failures = Failures(FailureLog(tmp_path / "a" / "b"), look)
        failures.take(raised())
        dialog = shown(qtbot, failures)
        assert cut_short(dialog) == []
        assert dialog.details.height() > look.theme.px(60)
        dialog.close()
        failures.log.close()
