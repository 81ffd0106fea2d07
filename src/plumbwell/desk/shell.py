"""The bare window: there at once, in the colours of the theme, while the rest of the desk is being loaded.

It holds geometry and takes what the system tells a window; what that means is said by whom it is `inhabited` by.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path
from typing import Protocol

from PySide6.QtCore import QByteArray
from PySide6.QtGui import QCloseEvent, QDragEnterEvent, QDropEvent, QGuiApplication, QResizeEvent
from PySide6.QtWidgets import QMainWindow

from plumbwell.desk.look import BARS, DARK, LIGHT, SYSTEM, Look
from plumbwell.desk.settings import Settings
from plumbwell.plates.depth_scale import ELEVATION, FOOT, MD, METRE, TVD, DepthScale

WIDTH, HEIGHT = 1440, 900
LEAST_WIDTH, LEAST_HEIGHT = 1180, 720


class Inhabitant(Protocol):
    """What the shell asks of the desk that lives in it."""

    def open(self, path: Path) -> None:
        """Open a survey folder that was dropped."""

    def resized(self) -> None:
        """The window has another size."""

    def closing(self) -> None:
        """The window is about to close."""


class Shell(QMainWindow):
    """The window of Plumbwell without its contents.

    Parameters
    ----------
    look : Look
    settings : Settings
    """

    def __init__(self, look: Look, settings: Settings) -> None:
        super().__init__()
        self.look, self.settings = look, settings
        self.inhabited: Inhabitant | None = None
        self.setWindowTitle("Plumbwell")
        self.setMinimumSize(760, 520)
        self.setAcceptDrops(True)
        look.depth = DepthScale(
            kind=one_of(settings.text("depth", MD), MD, TVD, ELEVATION),
            unit=one_of(settings.text("unit", METRE), METRE, FOOT),
        )
        look.choose(
            wanted=one_of(settings.text("theme", SYSTEM), SYSTEM, LIGHT, DARK),
            text_scale=settings.number("text scale", 1.0),
            bars=next((one for one in BARS if one == settings.number("bars", BARS[0])), BARS[0]),
        )
        geometry = settings.text("geometry", "")
        if not geometry or not self.restoreGeometry(QByteArray.fromBase64(geometry.encode())):
            room = QGuiApplication.primaryScreen().availableGeometry()
            self.resize(min(WIDTH, max(room.width(), LEAST_WIDTH)), min(HEIGHT, max(room.height(), LEAST_HEIGHT)))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        if self.inhabited is not None:
            self.inhabited.resized()

    def closeEvent(self, event: QCloseEvent) -> None:
        self.settings["geometry"] = bytes(self.saveGeometry().toBase64().data()).decode()
        if self.inhabited is not None:
            self.inhabited.closing()
        self.settings.write()
        super().closeEvent(event)

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        if dropped(event.mimeData().urls() if event.mimeData().hasUrls() else []):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        paths = dropped(event.mimeData().urls())
        if paths and self.inhabited is not None:
            event.acceptProposedAction()
            self.inhabited.open(paths[0])


def one_of(word: str, *words: str) -> str:
    """The word where it is one of some, else the first of those."""
    return word if word in words else words[0]


def dropped(urls: Sequence[object]) -> list[Path]:
    """The survey folders among what was dropped: folders, or their survey.toml."""
    found = []
    for url in urls:
        path = Path(url.toLocalFile())  # type: ignore[attr-defined]
        # os.path answers no where Path raises: a name too long, a folder that may not be looked into.
        if url.isLocalFile() and (os.path.isdir(path) or path.name == "survey.toml"):  # type: ignore[attr-defined]
            found.append(path)
    return found
