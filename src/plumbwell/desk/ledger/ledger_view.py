"""The view of a ledger: where its rows and columns lie in px, and all that is painted of them.

Rows are equally tall, so a row's place follows from the scroll position alone. Pointer and keys are left to
`ledger_rows`.
"""

from __future__ import annotations

from PySide6.QtCore import QPoint, QRect, Qt, Signal
from PySide6.QtGui import QPaintEvent, QPalette, QResizeEvent
from PySide6.QtWidgets import QAbstractItemView, QFrame, QTableView, QWidget

from plumbwell.desk.ledger.ledger_cells import (
    EDGE,
    ColumnFit,
    RowInView,
    draw_column,
    draw_current,
    draw_row_grounds,
    number_column_width,
    row_height,
)
from plumbwell.desk.ledger.ledger_chosen import ChosenRows
from plumbwell.desk.ledger.ledger_head import LedgerCorner, LedgerHead, LedgerNumbers
from plumbwell.desk.ledger.ledger_model import LedgerModel
from plumbwell.desk.ledger.ledger_rail import LedgerRail
from plumbwell.desk.look import Look
from plumbwell.plates.axis import head_height
from plumbwell.plates.lettering import draw_text, text_width, wrapped
from plumbwell.plates.painting import painting


class LedgerView(QTableView):
    """A table view that paints its cells in one go, without asking the model for every one of their roles.

    Parameters
    ----------
    look : Look
    ledger : LedgerModel
    parent : QWidget, optional

    Signals
    -------
    laid_out
        Head, rows and what lies over them have other places.
    """

    laid_out = Signal()

    def __init__(self, look: Look, ledger: LedgerModel, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look, self.ledger = look, ledger
        self.chosen = ChosenRows()
        self.hovered = -1
        self.stale = False
        self.sentence = ""
        self._fits: dict[str, ColumnFit] = {}
        self.cell: tuple[int, str] | None = None
        self.setModel(ledger)
        self.head = LedgerHead(look, self)
        self.numbers = LedgerNumbers(look, self)
        self.setHorizontalHeader(self.head)
        self.setVerticalHeader(self.numbers)
        self.setCornerButtonEnabled(False)
        self.corner = LedgerCorner(look, self)
        self.rail = LedgerRail(look, self)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setShowGrid(False)
        self.setSelectionMode(QAbstractItemView.SelectionMode.NoSelection)
        self.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.setTabKeyNavigation(False)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.viewport().setMouseTracking(True)
        self.viewport().setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self.measure()

    # Measures

    def measure(self) -> None:
        """Take heights and colours of the theme in force, and forget how wide columns were in the one before."""
        theme = self._look.theme
        height = row_height(theme)
        self._fits.clear()
        self.numbers.setMinimumSectionSize(1)
        self.numbers.setDefaultSectionSize(height)
        self.numbers.column_width = number_column_width(self.ledger.numbers, theme)
        self.verticalScrollBar().setSingleStep(height)
        self.head.measure()
        colours = self.palette()
        for role in (QPalette.ColorRole.Base, QPalette.ColorRole.Window):
            colours.setColor(role, theme.colour("ground"))
        self.setPalette(colours)
        self.updateGeometries()
        self.lay()
        for part in (self.viewport(), self.head.viewport(), self.numbers.viewport(), self.corner):
            part.update()

    def fit(self, column: int) -> ColumnFit:
        """How a column of the view measures in the theme in force."""
        words = self.ledger.columns[column]
        fit = self._fits.get(words.column.key)
        if fit is None or fit.words is not words:
            fit = self._fits[words.column.key] = ColumnFit(words=words, theme=self._look.theme)
        return fit

    def wedge_of(self, key: str) -> str | None:
        """Which way the numbers of a column grow, when rows stand sorted by it."""
        if self.ledger.sorting is None:
            if key == self.ledger.given_key():
                return "down"
            return "up" if key == self.ledger.falling_key() else None
        by, descending = self.ledger.sorting
        return None if key != by else "up" if descending else "down"

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.lay()

    def lay(self) -> None:
        """Give the parts that lie over the view their places."""
        beside, below = self.numbers.column_width, head_height(self._look.theme) + self.head.below
        self.corner.setGeometry(0, 0, beside, below)
        self.corner.raise_()
        self.rail.place(self.viewport().geometry())
        self.laid_out.emit()

    # Rows and px

    def row_at(self, y: float) -> int:
        """Row of the view at a px row of the viewport, -1 for none."""
        row = int(y + self.numbers.offset()) // row_height(self._look.theme)
        return row if 0 <= row < self.ledger.order.size else -1

    def row_top(self, place: int) -> int:
        """Px of the upper edge of a row of the view, in the viewport."""
        return place * row_height(self._look.theme) - self.numbers.offset()

    def places_in_view(self, top: int, base: int) -> range:
        """Rows of the view that lie between two px rows of the viewport, both included."""
        height, offset = row_height(self._look.theme), self.numbers.offset()
        first = max((top + offset) // height, 0)
        last = min((base + offset) // height, int(self.ledger.order.size) - 1)
        return range(first, last + 1)

    def in_view(self, top: int, base: int) -> list[RowInView]:
        """Rows that lie between two px rows of the viewport, with their state."""
        order, excluded, chosen = self.ledger.order, self.ledger.table.excluded, self.chosen.mask
        found = []
        for place in self.places_in_view(top, base):
            row = order.item(place)
            found.append(
                RowInView(
                    row=row,
                    top=self.row_top(place),
                    chosen=chosen.item(row),
                    hovered=row == self.hovered,
                    excluded=bool(excluded[row]),
                )
            )
        return found

    def scroll_to(self, place: int) -> None:
        """Scroll as little as brings a row of the view wholly into sight."""
        height, bar = row_height(self._look.theme), self.verticalScrollBar()
        top = place * height
        bar.setValue(min(max(bar.value(), top + height - self.viewport().height()), top))

    def _update_row(self, row: int) -> None:
        place = self.ledger.places.item(row) if 0 <= row < self.ledger.places.size else -1
        if place >= 0:
            strip = QRect(0, self.row_top(place), self.width(), row_height(self._look.theme))
            self.viewport().update(strip)
            self.numbers.viewport().update(strip)

    def update_rows(self) -> None:
        """Repaint all rows."""
        self.viewport().update()
        self.numbers.viewport().update()

    # Painting

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, area = self._look.theme, event.rect()
        rows = self.in_view(area.top(), area.bottom())
        width = self.viewport().width()
        current_row, current_key = self.cell or (-1, "")
        with painting(self.viewport()) as painter:
            painter.fillRect(area, theme.colour("ground"))
            draw_row_grounds(painter, theme, rows, left=0, right=width, bar=False)
            for column, words in enumerate(self.ledger.columns):
                left = self.columnViewportPosition(column)
                right = left + self.columnWidth(column)
                if right <= area.left() or left > area.right():
                    continue
                current = current_row if words.column.key == current_key else None
                draw_column(
                    painter,
                    self.fit(column),
                    rows,
                    left=left,
                    right=right,
                    width=width,
                    stale=self.stale,
                    current=current,
                )
                for one in rows:
                    if one.row == current:
                        draw_current(painter, theme, left=left, right=right, top=one.top)
            if not self.ledger.order.size:
                line = row_height(theme)
                room = width - 2 * theme.px(8)
                for number, part in enumerate(wrapped(theme, "text", self.sentence, room)):
                    y = (number + 1) * line
                    draw_text(painter, theme, part, x=theme.px(8), baseline=y, role="muted")

    # Tool tips

    def shortened_text(self, at: QPoint) -> str:
        """The whole of a text that is shown shortened at a place of the viewport, nothing elsewhere."""
        place, column = self.row_at(at.y()), self.columnAt(at.x())
        if place < 0 or column < 0 or not self.ledger.columns[column].is_text:
            return ""
        words = self.ledger.columns[column]
        text = words.value(self.ledger.order.item(place))
        room = self.columnWidth(column) - 2 * self._look.theme.px(EDGE)
        return text if text_width(self._look.theme, words.face(strong=False), text) > room else ""
