"""The line in which a filter is written, between head and rows: the field, and beneath it how many rows are left or
what is wrong.

It knows nothing of tables; the ledger filters and tells it what came of that.
"""

from __future__ import annotations

from PySide6.QtCore import QEvent, QRectF, QSize, Qt, QTimer, Signal
from PySide6.QtGui import QKeyEvent, QKeySequence, QPaintEvent
from PySide6.QtWidgets import QLineEdit, QWidget

from plumbwell.desk.look import Look
from plumbwell.plates.lettering import draw_text, face_font, text_height
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import draw_mark, hairline_across, painting

EXAMPLE = "words, or density > 2.4 and ratio <= -3"
HEIGHT, FIELD = 56, 30
MARGIN = 8
# From so many rows on, a pause in the writing is waited for.
MANY, PAUSE = 100_000, 200


class FilterField(QLineEdit):
    """The field: Esc clears and closes, Return and Down go to the rows."""

    closed = Signal()
    left = Signal()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape:
            self.closed.emit()
        elif event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Down):
            self.left.emit()
        elif event.matches(QKeySequence.StandardKey.Find):
            self.selectAll()
        else:
            super().keyPressEvent(event)


class FilterLine(QWidget):
    """The line of the filter.

    Signals
    -------
    written : str
        The person wrote another filter.
    closed
        Esc: no filter any more.
    left
        On to the rows.
    """

    written = Signal(str)
    closed = Signal()
    left = Signal()

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(parent)
        self._look = look
        self.rows = 0
        self.count, self.reason = "", ""
        self.field = FilterField(self)
        self.field.setPlaceholderText(EXAMPLE)
        self.field.setAccessibleName("Filter rows")
        self.field.textEdited.connect(self._edited)
        self.field.closed.connect(self.closed)
        self.field.left.connect(self._leave)
        self._pause = QTimer(self)
        self._pause.setSingleShot(True)
        self._pause.setInterval(PAUSE)
        self._pause.timeout.connect(self._tell)
        self.setFocusProxy(self.field)
        self.hide()

    def _edited(self) -> None:
        if self.rows >= MANY:
            self._pause.start()
        else:
            self._tell()

    def _tell(self) -> None:
        self._pause.stop()
        self.written.emit(self.field.text())

    def _leave(self) -> None:
        if self._pause.isActive():
            self._tell()
        self.left.emit()

    def clear(self) -> None:
        """Empty the field without a word to anybody."""
        self._pause.stop()
        self.field.clear()

    def tell(self, *, shown: int, rows: int, reason: str) -> None:
        """Show how many of how many rows are left, or what is wrong with the filter."""
        self.rows, self.reason = rows, reason
        self.count = f"{number(float(shown), 0)} of {number(float(rows), 0)} {'row' if rows == 1 else 'rows'}"
        self.field.setAccessibleDescription(reason or self.count)
        self.setToolTip(reason)
        self.update()

    def measure(self) -> None:
        """Take fonts and heights of the theme in force."""
        theme = self._look.theme
        self.field.setFont(face_font(theme, "text"))
        self.field.setFixedHeight(theme.px(FIELD))
        self._lay()
        self.update()

    def sizeHint(self) -> QSize:
        return QSize(0, self._look.theme.px(HEIGHT))

    def _lay(self) -> None:
        margin = self._look.theme.px(MARGIN)
        self.field.setGeometry(margin, 0, max(self.width() - 2 * margin, 0), self.field.height())

    def resizeEvent(self, event: QEvent) -> None:
        self._lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        margin = theme.px(MARGIN)
        with painting(self) as painter:
            painter.fillRect(QRectF(self.rect()), theme.colour("ground"))
            hairline_across(painter, 0, self.width(), self.height() - 1, theme.colour("rule"))
            line = (theme.px(FIELD) + self.height() + text_height(theme, "small")) / 2 - 1
            x, room = float(margin), (float(margin), float(max(self.width() - margin, margin)))
            if self.reason:
                draw_mark(painter, theme, "error", x=x + 5, y=line - text_height(theme, "small") / 2)
                x += theme.px(8) + 8
            role = "brick" if self.reason else "muted"
            draw_text(
                painter, theme, self.reason or self.count, x=x, baseline=line, face="small", role=role,
                room=(x, room[1]),
            )
