"""The real window driven as a person does, for tests and for the pictures of the gallery."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QEventLoop, QPoint, Qt, QTimer
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.settings import Settings
from plumbwell.desk.shell import Shell
from plumbwell.desk.tray.history_page import HistoryRow
from plumbwell.desk.window import Desk
from plumbwell.plates.track import Track

PATIENCE = 60_000


def wait_until(true: Callable[[], bool], patience: int = PATIENCE) -> None:
    """Let the window work until something is true; fails when it takes too long."""
    if true():
        return
    loop, over = QEventLoop(), QTimer()
    over.setSingleShot(True)
    over.timeout.connect(loop.quit)
    poll = QTimer()
    poll.timeout.connect(lambda: loop.quit() if true() else None)
    poll.start(2)
    over.start(patience)
    loop.exec()
    poll.stop()
    over.stop()
    assert true(), "the window did not come to it in time"


class Driven:
    """A window with a person at it.

    Parameters
    ----------
    home : Path
        The user's data folder.
    size : tuple of int
    theme : str
    scale : float
        Text scale.
    """

    def __init__(
        self, home: Path, *, size: tuple[int, int] = (1440, 900), theme: str = "light", scale: float = 1.0
    ) -> None:
        self._closed = False
        application = QApplication.instance()
        assert isinstance(application, QApplication)
        application.setStyle("Fusion")
        self.look = Look()
        self.settings = Settings(home)
        self.settings["theme"], self.settings["text scale"] = theme, scale
        self.shell = Shell(self.look, self.settings)
        self.shell.resize(*size)
        self.shell.show()
        self.desk = Desk(self.shell, home)
        self.work = self.desk.workspace
        self.document = self.desk.document
        self.settle()

    def settle(self) -> None:
        """Let everything be laid and painted."""
        for _ in range(4):
            QApplication.processEvents()

    def open(self, folder: Path) -> None:
        """Open a survey folder and wait for its densities."""
        self.desk.open(folder)
        wait_until(lambda: self.document.folder == folder.resolve() and self.reduced())
        self.settle()

    def reduced(self) -> bool:
        """Whether the result of the present case is shown."""
        document = self.document
        return not document.busy and document.results is not None and document.reduced_case is document.case

    def wait(self) -> None:
        """Wait for the result of what was just done."""
        wait_until(self.reduced)
        self.settle()

    def stage(self, key: str) -> None:
        """Go to a stage as Ctrl and its number do."""
        self.desk.do(f"stage {key}")
        self.settle()

    def key(self, widget: QWidget, key: Qt.Key, modifier: Qt.KeyboardModifier = Qt.KeyboardModifier.NoModifier) -> None:
        """Press a key in a widget, or in the part of it that takes the keyboard."""
        while widget.focusProxy() is not None:
            widget = widget.focusProxy()
        QTest.keyClick(widget, key, modifier)
        self.settle()

    def click(self, widget: QWidget, x: float, y: float) -> None:
        """Click into a widget."""
        QTest.mouseClick(widget, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, QPoint(int(x), int(y)))
        self.settle()

    def answer(self, text: str) -> None:
        """Type an answer into the line that asks, and press Return."""
        field = self.work.reasons.field
        field.clear()
        QTest.keyClicks(field, text)
        QTest.keyClick(field, Qt.Key.Key_Return)

    @property
    def tracks(self) -> tuple[Track, ...]:
        """The tracks that are painted."""
        return self.work.tracks._scene.tracks

    @property
    def history_rows(self) -> tuple[HistoryRow, ...]:
        """The points of the history page."""
        return self.work.history.view.model().rows

    @property
    def strip_densities(self) -> list[float | None]:
        """The densities that the strip is toned by."""
        return [one.density for one in self.work.strip._plate.intervals]

    def picture(self, path: Path) -> None:
        """Save what the window shows."""
        self.settle()
        assert self.shell.grab().save(str(path))

    def close(self) -> None:
        """Close the window; once is enough."""
        if self._closed:
            return
        self._closed = True
        self.shell.close()
        self.shell.deleteLater()
        self.settle()
