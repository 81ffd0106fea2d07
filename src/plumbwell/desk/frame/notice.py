"""A line over the status line that tells something once: what cannot be done, or what was found on opening.

It takes no focus and asks nothing; Escape or its word puts it away.
"""

from __future__ import annotations

from PySide6.QtCore import QRectF
from PySide6.QtGui import QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import Caption, Word
from plumbwell.plates.painting import draw_mark, hairline_across, painting

MOST_LINES = 4


class Notice(QWidget):
    """Told sentences, hidden while there is nothing to tell."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look = look
        self._wrong = False
        self.caption = Caption("", look, self, lines=MOST_LINES)
        self.away = Word("Put away", look, self)
        self.away.clicked.connect(self.clear)
        look.changed.connect(self._lay)
        self.hide()

    @property
    def words(self) -> str:
        """What is told; empty for nothing."""
        return "" if self.isHidden() else self.caption.words

    def say(self, words: str, *, wrong: bool = False) -> None:
        """Tell a sentence; a wrong wish has the amber mark."""
        self._wrong = wrong
        self.caption.say(words)
        self.setAccessibleName(words)
        self.setVisible(bool(words))
        self._lay()

    def clear(self) -> None:
        """Tell nothing."""
        self.say("")

    def _lay(self) -> None:
        theme = self._look.theme
        left, right = theme.px(32), theme.px(16)
        hint = self.away.sizeHint()
        width = max(self.width() - left - right - hint.width() - theme.px(16), 60)
        high = self.caption.height_for(width)
        self.setFixedHeight(high + theme.px(10))
        self.caption.setGeometry(left, theme.px(5), width, high)
        self.away.setGeometry(self.width() - right - hint.width(), theme.px(4), hint.width(), hint.height())
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            painter.fillRect(QRectF(self.rect()), theme.colour("sunk"))
            hairline_across(painter, 0, self.width(), 0, theme.colour("rule"))
            draw_mark(
                painter, theme, "look" if self._wrong else "note", x=theme.px(18), y=theme.px(5) + self.caption.line / 2
            )
