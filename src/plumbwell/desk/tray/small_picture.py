"""A small picture that is a page of the tray: painted, focusable, with a sentence where there is nothing to show.

What it shows, and what hand and keys do with it, is said by who extends it.
"""

from __future__ import annotations

from PySide6.QtCore import QRectF, QSize, Qt
from PySide6.QtGui import QFocusEvent, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import draw_focus, draw_sentence
from plumbwell.plates.painting import painting

EMPTY_BASELINE = 17
WIDTH, LEAST_WIDTH = 600, 200


class SmallPicture(QWidget):
    """A painted page of the tray.

    Parameters
    ----------
    look : Look
    parent : QWidget or None
    name : str
        What a screen reader calls it.
    empty : str
        What is said while there is nothing to show.
    height, least_height : int
        px of the unscaled design.
    """

    def __init__(
        self, look: Look, parent: QWidget | None, *, name: str, empty: str, height: int, least_height: int
    ) -> None:
        super().__init__(parent)
        self._look, self._empty = look, empty
        self._height, self._least_height = height, least_height
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName(name)
        look.changed.connect(self._look_changed)

    def said(self) -> str:
        """What is shown, in words for those who hear it."""
        return self._empty

    def is_shown(self) -> bool:
        """Whether there is anything to show."""
        return False

    def paint(self, painter: QPainter) -> None:
        """Paint what there is to show."""

    def forget(self) -> None:
        """Measure anew, paint anew, and keep what is said true."""
        words = self.said()
        if words != self.accessibleDescription():
            self.setAccessibleDescription(words)
        self.update()

    def _look_changed(self) -> None:
        self.forget()
        self.updateGeometry()

    def sizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(theme.px(WIDTH), theme.px(self._height))

    def minimumSizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(theme.px(LEAST_WIDTH), theme.px(self._least_height))

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            if self.is_shown():
                self.paint(painter)
            else:
                baseline = theme.px(EMPTY_BASELINE)
                draw_sentence(painter, theme, self._empty, width=self.width(), baseline=baseline)
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))

    def resizeEvent(self, event: QResizeEvent) -> None:
        self.forget()

    def focusInEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusInEvent(event)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusOutEvent(event)
