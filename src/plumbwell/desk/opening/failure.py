"""What happens when the program itself fails: a line in the log, and one plain dialog.

Errors of threads, of slots and of painting arrive here; mistakes in a survey do not, they are told where they are
made. Installed by the start of the window only, so that tests see errors as they are.
"""

from __future__ import annotations

import os
import sys
import threading
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path
from types import TracebackType
from typing import Any

from PySide6.QtCore import QMessageLogContext, QObject, Qt, QtMsgType, Signal, qInstallMessageHandler
from PySide6.QtGui import QGuiApplication, QKeyEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QDialog, QPlainTextEdit, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.opening.failure_log import LONGEST_MESSAGE, FailureLog, start_log, traced, versions
from plumbwell.desk.parts.words import Caption, Word
from plumbwell.plates.lettering import face_font
from plumbwell.plates.painting import hairline_across, painting
from plumbwell.survey.errors import PlumbwellError

QUIET_SECONDS = 2.0
"""After a dialog, other failures are only logged for so long: one trouble often makes several."""

DEBUG = "PLUMBWELL_DEBUG"
"""With this in the environment, errors are also printed as Python prints them."""

SAFE = "Nothing is lost: every act is already kept."
WIDTH, HEIGHT, MARGIN = 620, 380, 20
LEVELS = {
    QtMsgType.QtDebugMsg: "debug",
    QtMsgType.QtInfoMsg: "info",
    QtMsgType.QtWarningMsg: "warning",
    QtMsgType.QtCriticalMsg: "critical",
    QtMsgType.QtFatalMsg: "fatal",
}


def sentence_of(error: BaseException) -> str:
    """Return what happened, in a sentence for the person at the desk."""
    if isinstance(error, PlumbwellError):
        return f"{str(error).rstrip('.')}."
    if isinstance(error, MemoryError):
        return "The memory was not enough for what was just asked."
    if isinstance(error, OSError):
        return f"The disk or the system refused something: {error.strerror or type(error).__name__}."
    return f"A fault of the program stopped what was just asked ({type(error).__name__})."


class FailureDialog(QDialog):
    """What happened, that nothing is lost, the details to copy, and where the log is.

    Parameters
    ----------
    look : Look
    sentence, details : str
    log : Path
    parent : QWidget or None
    """

    def __init__(self, look: Look, sentence: str, details: str, log: Path, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.setWindowTitle("Plumbwell")
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.heading = Caption("Something went wrong", look, self, face="heading")
        self.sentence = Caption(sentence, look, self, lines=8)
        self.safe = Caption(SAFE, look, self, face="emphasis")
        self.details = QPlainTextEdit(details, self)
        self.details.setReadOnly(True)
        self.details.setTabChangesFocus(True)
        self.details.setFrameShape(QPlainTextEdit.Shape.NoFrame)
        self.details.setAccessibleName("Details")
        self.place = Caption(f"The log is {log}", look, self, face="small", role="muted", lines=3)
        self.copy = Word("Copy details", look, self)
        self.copy.clicked.connect(lambda: QGuiApplication.clipboard().setText(self.details.toPlainText()))
        self.leave = Word("Close", look, self)
        self.leave.clicked.connect(self.close)
        self.setAccessibleDescription(f"{sentence} {SAFE}")
        look.changed.connect(self._arrange)
        self.resize(look.theme.px(WIDTH), look.theme.px(HEIGHT))
        self.leave.setFocus()

    def _arrange(self) -> None:
        theme, margin = self.look.theme, self.look.theme.px(MARGIN)
        self.details.setFont(face_font(theme, "small"))
        width = max(self.width() - 2 * margin, theme.px(80))
        y = margin
        for caption, after in ((self.heading, 8), (self.sentence, 6), (self.safe, 14)):
            height = caption.height_for(width)
            caption.setGeometry(margin, y, width, height)
            y += height + theme.px(after)
        foot = self.height() - margin
        below = self.place.height_for(width)
        top = max(foot - theme.px(24) - below - theme.px(14), y)
        self.details.setGeometry(margin, y, width, max(top - y, 0))
        self.place.setGeometry(margin, top + theme.px(6), width, below)
        x = self.width() - margin
        for word in (self.leave, self.copy):
            x -= word.sizeHint().width()
            word.stand_at(x=x, baseline=foot - theme.px(4))
            x -= theme.px(20)
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._arrange()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape:
            self.close()
        else:
            super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, box = self.look.theme, self.details.geometry()
        with painting(self) as painter:
            for y in (box.top() - theme.px(4), box.bottom() + theme.px(3)):
                hairline_across(painter, box.left(), box.right() + 1, y, theme.colour("rule"))


class Failures(QObject):
    """Takes every error that nobody caught: logs it, and shows one dialog at a time.

    The same failure is shown once in a run, and nothing within two seconds of the last dialog; all are logged.

    Parameters
    ----------
    log : FailureLog
    look : Look
    window : QWidget or None
        The window over which the dialog stands.
    clock : callable
        Seconds that only grow.
    """

    happened = Signal(object)

    def __init__(
        self,
        log: FailureLog,
        look: Look,
        window: QWidget | None = None,
        *,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        super().__init__()
        self.log = log
        self.look = look
        self.window = window
        self.dialog: FailureDialog | None = None
        self._clock = clock
        self._shown: set[str] = set()
        self._last = -QUIET_SECONDS
        self._busy = threading.local()
        # Queued: errors come from other threads and from the midst of painting, where no window may open.
        self.happened.connect(self._show, Qt.ConnectionType.QueuedConnection)

    def take(self, error: BaseException) -> None:
        """Log an error and have it shown; from any thread. Never raises."""
        if getattr(self._busy, "now", False):
            return
        self._busy.now = True
        try:
            details = traced(error)
            self.log.write(details)
            self.happened.emit((sentence_of(error), details))
        except Exception:  # noqa: BLE001
            # What fails while a failure is told must not be told again without end.
            return
        finally:
            self._busy.now = False

    def _show(self, told: tuple[str, str]) -> None:
        sentence, details = told
        now = self._clock()
        if self.dialog is not None or details in self._shown or now - self._last < QUIET_SECONDS:
            return
        self._shown.add(details)
        self._last = now
        text = f"{details}\n\n{versions()}"
        dialog = FailureDialog(self.look, sentence, text, self.log.path, self.window)
        # Both: the window over which it stands may go first, and then it is destroyed unfinished.
        dialog.finished.connect(partial(self._closed, id(dialog)))
        dialog.destroyed.connect(partial(self._closed, id(dialog)))
        self.dialog = dialog
        dialog.show()

    def _closed(self, which: int, *_: object) -> None:
        if self.dialog is not None and id(self.dialog) == which:
            self.dialog = None
            self._last = self._clock()


class _Installed:
    """What stood in the place of our hooks before they were installed."""

    def __init__(self, failures: Failures) -> None:
        self.failures = failures
        self.excepthook = sys.excepthook
        self.thread_hook = threading.excepthook
        self.message_handler: Any = None


_installed: list[_Installed] = []


def install(folder: Path, look: Look, window: QWidget | None = None) -> Failures:
    """Take all uncaught errors, crashes and messages of Qt from now on.

    Parameters
    ----------
    folder : Path
        The user's data folder, where the log lies.
    look : Look
    window : QWidget or None
        The main window.

    Returns
    -------
    Failures
        What shows them; `uninstall` ends it.
    """
    uninstall()
    failures = Failures(start_log(folder), look, window)
    before = _Installed(failures)

    def uncaught(kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        if issubclass(kind, KeyboardInterrupt):
            before.excepthook(kind, error, trace)
            return
        failures.take(error.with_traceback(trace))
        if os.environ.get(DEBUG):
            before.excepthook(kind, error, trace)

    def uncaught_in_thread(told: threading.ExceptHookArgs) -> None:
        if told.exc_value is not None and not issubclass(told.exc_type, SystemExit):
            failures.take(told.exc_value)
            if os.environ.get(DEBUG):
                before.thread_hook(told)

    def message(kind: QtMsgType, context: QMessageLogContext, text: str) -> None:
        failures.log.write(f"Qt {LEVELS.get(kind, 'message')}: {text[:LONGEST_MESSAGE]}")

    sys.excepthook = uncaught
    threading.excepthook = uncaught_in_thread
    before.message_handler = qInstallMessageHandler(message)
    _installed.append(before)
    return failures


def uninstall() -> None:
    """Put everything back as it was before `install`; nothing where nothing is installed."""
    while _installed:
        before = _installed.pop()
        sys.excepthook = before.excepthook
        threading.excepthook = before.thread_hook
        qInstallMessageHandler(before.message_handler)
        if before.failures.dialog is not None:
            before.failures.dialog.close()
        before.failures.log.close()
