"""The heads of a ledger: two lines a column over one ink line, a wedge at the sorted one; and the frozen first column.

The head is as tall as the heads of the tracks, so that one line runs under all. Below it there may be room for the
filter's line.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtCore import QPoint, QSize, Qt, Signal
from PySide6.QtGui import QContextMenuEvent, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QHeaderView, QWidget

from plumbwell.desk.ledger.ledger_cells import EDGE, draw_row_grounds, draw_row_heads
from plumbwell.desk.ledger.ledger_words import ColumnWords
from plumbwell.desk.look import Look
from plumbwell.desk.parts.hints import Hints
from plumbwell.plates.axis import head_height, title_baseline, unit_baseline
from plumbwell.plates.lettering import ELLIPSIS, draw_text, text_height, text_width
from plumbwell.plates.painting import fill_shape, hairline_across, painting, polygon
from plumbwell.plates.theme import Theme

if TYPE_CHECKING:
    from plumbwell.desk.ledger.ledger_view import LedgerView

WEDGE = 5
LEAST_WIDTH = 24


def draw_head(
    painter: QPainter, theme: Theme, words: ColumnWords, *, left: float, right: float, wedge: str | None = None
) -> None:
    """Draw the two lines of a column's head: name Semibold, unit small and muted beneath.

    Parameters
    ----------
    left, right : float
        Edges of the column in px.
    wedge : str or None
        "up" or "down" at the column that rows are sorted by: the way its numbers grow.
    """
    edge = right - theme.px(EDGE)
    start = left + theme.px(EDGE) if words.is_text and words.column.key != "number" else left + 2
    if edge - start < text_width(theme, "small", ELLIPSIS):
        return
    align = "left" if words.is_text and words.column.key != "number" else "right"
    x = start if align == "left" else edge
    lines = (
        (words.column.name, "emphasis", "ink", title_baseline(theme)),
        (words.unit, "small", "muted", unit_baseline(theme)),
    )
    for text, face, role, down in lines:
        draw_text(
            painter, theme, text, x=x, baseline=down, face=face, role=role, align=align, room=(start, edge)
        )
    if wedge is not None:
        name = min(text_width(theme, "emphasis", words.column.name), edge - start)
        tip = (start + name if align == "left" else edge) + 2
        middle = title_baseline(theme) - text_height(theme, "emphasis") / 2
        size = theme.px(WEDGE)
        half = size / 2 if wedge == "down" else -size / 2
        corners = ((tip, middle - half + 0.5), (tip + size, middle - half + 0.5), (tip + size / 2, middle + half))
        fill_shape(painter, polygon(*corners), theme.colour("ink"))


class LedgerHead(QHeaderView):
    """The heads of the columns.

    A click sorts, a drag of an edge resizes, the context menu chooses columns; the ledger listens to all three.
    """

    menu_wanted = Signal(int, QPoint)

    def __init__(self, look: Look, rows: LedgerView) -> None:
        super().__init__(Qt.Orientation.Horizontal, rows)
        self._look, self._rows = look, rows
        self.below = 0
        self.setSectionsClickable(True)
        self.setHighlightSections(False)
        self.setSectionResizeMode(QHeaderView.ResizeMode.Interactive)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setContextMenuPolicy(Qt.ContextMenuPolicy.CustomContextMenu)
        self.customContextMenuRequested.connect(self._ask_menu)

    def measure(self) -> None:
        """Take the heights of the theme in force."""
        self.setMinimumSectionSize(self._look.theme.px(LEAST_WIDTH))
        self.updateGeometry()

    def _ask_menu(self, at: QPoint) -> None:
        self.menu_wanted.emit(self.logicalIndexAt(at), self.viewport().mapToGlobal(at))

    def sizeHint(self) -> QSize:
        return QSize(self.length(), head_height(self._look.theme) + self.below)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, model, width = self._look.theme, self._rows.ledger, self.viewport().width()
        with painting(self.viewport()) as painter:
            painter.fillRect(event.rect(), theme.colour("ground"))
            for section, words in enumerate(model.columns):
                left = self.sectionViewportPosition(section)
                right = left + self.sectionSize(section)
                if right > event.rect().left() and left <= event.rect().right():
                    wedge = self._rows.wedge_of(words.column.key)
                    draw_head(painter, theme, words, left=max(left, 0), right=min(right, width), wedge=wedge)
            _draw_line(painter, theme, width)


def _draw_line(painter: QPainter, theme: Theme, width: int) -> None:
    hairline_across(painter, 0, width, head_height(theme) - 1, theme.colour("ink"))


class LedgerCorner(QWidget):
    """The head of the frozen first column; a click puts the rows back into the order they were given in."""

    clicked = Signal()
    menu_wanted = Signal(int, QPoint)

    def __init__(self, look: Look, rows: LedgerView) -> None:
        super().__init__(rows)
        self._look, self._rows = look, rows
        self.setToolTip("Order as given")
        self.setAccessibleName("Order as given")

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        if event.button() == Qt.MouseButton.LeftButton and self.rect().contains(event.position().toPoint()):
            self.clicked.emit()

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        self.menu_wanted.emit(-1, event.globalPos())

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            draw_head(painter, theme, self._rows.ledger.numbers, left=0, right=self.width())
            _draw_line(painter, theme, self.width())


class LedgerNumbers(QHeaderView):
    """The frozen first column: mark and number of each row, for the pointer a part of the row like any other.

    Signals
    -------
    pressed : float, KeyboardModifier
        Pressed at a px row of the viewport.
    dragged : float
        Moved with the button down, to a px row.
    hovered : float or None
        The pointer is at a px row, or has left.
    """

    pressed = Signal(float, object)
    dragged = Signal(float)
    hovered = Signal(object)

    def __init__(self, look: Look, rows: LedgerView) -> None:
        super().__init__(Qt.Orientation.Vertical, rows)
        self._look, self._rows = look, rows
        self.column_width = 0
        self.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        self.setHighlightSections(False)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.viewport().setMouseTracking(True)
        Hints(self.viewport(), self._hint, left=lambda: self.hovered.emit(None))

    def sizeHint(self) -> QSize:
        return QSize(self.column_width, 0)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, table = self._look.theme, self._rows.ledger.table
        rows = self._rows.in_view(event.rect().top(), event.rect().bottom())
        with painting(self.viewport()) as painter:
            painter.fillRect(event.rect(), theme.colour("ground"))
            draw_row_grounds(painter, theme, rows, left=0, right=self.width(), bar=True)
            draw_row_heads(painter, theme, rows, numbers=table.numbers, marks=table.marks, width=self.width())

    def mousePressEvent(self, event: QMouseEvent) -> None:
        if event.button() == Qt.MouseButton.LeftButton:
            self.pressed.emit(event.position().y(), event.modifiers())

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        self.hovered.emit(event.position().y())
        if event.buttons() & Qt.MouseButton.LeftButton:
            self.dragged.emit(event.position().y())

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        event.accept()

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        self.mousePressEvent(event)

    def _hint(self, at: QPoint) -> str:
        row = self._rows.row_at(at.y())
        hint = self._rows.ledger.headerData(row, Qt.Orientation.Vertical, int(Qt.ItemDataRole.ToolTipRole))
        return hint if isinstance(hint, str) else ""
