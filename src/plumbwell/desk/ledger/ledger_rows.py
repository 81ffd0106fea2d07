"""Pointer and keys of a ledger: choosing rows, walking cells, hovering.

Qt's selection model only mirrors what is chosen, for screen readers, and only while that is few ranges: its cost grows
with the square of their number. Signals tell rows of the table and tell what the person did, nothing else.
"""

from __future__ import annotations

from collections.abc import Iterable

from PySide6.QtCore import QItemSelection, QItemSelectionModel, Qt, Signal
from PySide6.QtGui import QContextMenuEvent, QCursor, QFocusEvent, QKeyEvent, QKeySequence, QMouseEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.ledger.ledger_cells import row_height
from plumbwell.desk.ledger.ledger_chosen import ChosenRows
from plumbwell.desk.ledger.ledger_model import LedgerModel
from plumbwell.desk.ledger.ledger_view import LedgerView
from plumbwell.desk.look import Look
from plumbwell.desk.parts.hints import Hints

# More ranges than these are not mirrored in Qt's selection model.
MOST_RANGES = 200

UPDATE = QItemSelectionModel.SelectionFlag.NoUpdate
REPLACE = QItemSelectionModel.SelectionFlag.ClearAndSelect


class LedgerRows(LedgerView):
    """The rows of a ledger as a person handles them.

    Signals
    -------
    rows_chosen : tuple of int
        The person chose these table rows.
    row_hovered : int
        The pointer is over this table row; -1 for none.
    cell_reached : int, str
        The person made this cell the current one: table row, key of the column.
    use_toggled : list of int
        Space: these table rows are to be left out or taken in.
    row_activated : int
        Return or a double click on this table row.
    copy_wanted, filter_wanted
        Ctrl+C, Ctrl+F.
    menu_wanted : int, QPoint
        The context menu for a column of the view, -1 for none, at a place on the screen.
    """

    rows_chosen = Signal(object)
    row_hovered = Signal(int)
    cell_reached = Signal(int, str)
    use_toggled = Signal(list)
    row_activated = Signal(int)
    copy_wanted = Signal()
    filter_wanted = Signal()
    menu_wanted = Signal(int, object)

    def __init__(self, look: Look, ledger: LedgerModel, parent: QWidget | None = None) -> None:
        super().__init__(look, ledger, parent)
        Hints(self.viewport(), self.shortened_text, left=self._left)
        self.numbers.pressed.connect(self._number_pressed)
        self.numbers.dragged.connect(lambda y: self.drag_to(y, scroll=True))
        self.numbers.hovered.connect(self.hover_at)

    # Choosing

    def choose(self, rows: Iterable[int], *, scroll: bool) -> None:
        """Choose table rows from outside; nothing is signalled."""
        self.chosen.set(rows)
        self.mirror()
        self.update_rows()
        shown = self.chosen.in_order(self.ledger.order)
        if not shown.size:
            return
        first = shown.item(0)
        if self.cell is None or not self.chosen.mask.item(self.cell[0]):
            self.reach(first, self.cell[1] if self.cell else "", scroll=False)
        if scroll:
            place = self.ledger.places.item(self.cell[0]) if self.cell else -1
            self.scroll_to(place if place >= 0 else self.ledger.places.item(first))

    def mirror(self) -> None:
        """Tell Qt's selection model, and with it screen readers, what is chosen."""
        tops, bases = self.chosen.ranges(self.ledger.order)
        mirrored = QItemSelection()
        last = len(self.ledger.columns) - 1
        if last >= 0 and tops.size <= MOST_RANGES:
            for top, base in zip(tops.tolist(), bases.tolist(), strict=True):
                mirrored.select(self.ledger.index(top, 0), self.ledger.index(base, last))
        self.selectionModel().select(mirrored, REPLACE)

    def reach(self, row: int, key: str, *, scroll: bool) -> None:
        """Make a cell the current one; nothing is signalled."""
        keys = [words.column.key for words in self.ledger.columns]
        place = self.ledger.places.item(row) if 0 <= row < self.ledger.places.size else -1
        if place < 0 or not keys:
            return
        column = keys.index(key) if key in keys else 0
        before = self.cell
        self.cell = (row, keys[column])
        # Qt scrolls to a current cell by itself, also when the person is looking elsewhere.
        self.setAutoScroll(False)
        self.selectionModel().setCurrentIndex(self.ledger.index(place, column), UPDATE)
        self.setAutoScroll(True)
        if scroll:
            self.scroll_to(place)
        for changed in {row, before[0] if before else row}:
            self._update_row(changed)

    def renew(self, n: int, chosen: Iterable[int], *, keep_current: bool) -> None:
        """Hold the chosen rows of another table of `n` rows."""
        self.chosen = ChosenRows(n)
        self.chosen.set(chosen)
        self.hovered = -1
        if not keep_current:
            self.cell = None

    def restore(self) -> None:
        """Find the current cell and the chosen rows again after the model was arranged anew."""
        self.mirror()
        if self.cell is not None:
            self.reach(*self.cell, scroll=False)
        self.update_rows()

    def _follow_current(self) -> None:
        """Take the current cell from Qt after the person moved it."""
        index = self.currentIndex()
        if not index.isValid():
            return
        before = self.cell
        self.cell = (self.ledger.order.item(index.row()), self.ledger.columns[index.column()].column.key)
        if self.cell != before:
            if before is not None:
                self._update_row(before[0])
            self._update_row(self.cell[0])
            self.cell_reached.emit(*self.cell)

    def walk(self, step: int) -> None:
        """Go so many rows on, as the arrow keys do."""
        if not self.ledger.order.size:
            return
        place = self.ledger.places.item(self.cell[0]) if self.cell else -1
        last = int(self.ledger.order.size) - 1
        start = place if place >= 0 else -1 if step > 0 else last + 1
        self.press_row(min(max(start + step, 0), last), Qt.KeyboardModifier.NoModifier)

    def choose_all(self) -> None:
        """Choose all rows in view, as the person's own doing."""
        self._told(self.chosen.everything(self.ledger.order))

    def _told(self, changed: bool) -> None:
        if changed:
            self.mirror()
            self.update_rows()
            self.rows_chosen.emit(self.chosen.rows())

    def press_row(self, place: int, modifiers: Qt.KeyboardModifier, *, column: int | None = None) -> None:
        """Choose as a press on a row of the view does: Ctrl toggles it, Shift extends to it."""
        if place < 0:
            self._told(not modifiers and self.chosen.set(()))
            return
        row = self.ledger.order.item(place)
        key = self.cell[1] if self.cell else ""
        if column is not None and column >= 0:
            key = self.ledger.columns[column].column.key
        before = self.cell
        self.reach(row, key, scroll=column is None)
        if modifiers & Qt.KeyboardModifier.ShiftModifier:
            add = bool(modifiers & Qt.KeyboardModifier.ControlModifier)
            changed = self.chosen.extend(place, self.ledger.order, self.ledger.places, add=add)
        elif modifiers & Qt.KeyboardModifier.ControlModifier:
            changed = self.chosen.toggle(row)
        else:
            changed = self.chosen.only(row)
        self._told(changed)
        if self.cell is not None and self.cell != before:
            self.cell_reached.emit(*self.cell)

    def drag_to(self, y: float, *, scroll: bool = False) -> None:
        """Extend the choice to the row at a px row of the viewport, or to the nearest one."""
        if not self.ledger.order.size:
            return
        last = int(self.ledger.order.size) - 1
        height = row_height(self._look.theme)
        place = min(max(int(y + self.numbers.offset()) // height, 0), last)
        self._told(self.chosen.extend(place, self.ledger.order, self.ledger.places, add=True))
        if scroll:
            self.scroll_to(place)

    # Pointer and keys

    def hover_at(self, y: float | None) -> None:
        """Take note of the row under the pointer, None when it has left."""
        place = -1 if y is None else self.row_at(y)
        row = self.ledger.order.item(place) if place >= 0 else -1
        if row != self.hovered:
            self.set_hovered(row)
            self.row_hovered.emit(row)

    def set_hovered(self, row: int) -> None:
        """Show a table row as hovered; nothing is signalled."""
        if row != self.hovered:
            before, self.hovered = self.hovered, row
            self._update_row(before)
            self._update_row(row)

    def _number_pressed(self, y: float, modifiers: Qt.KeyboardModifier) -> None:
        self.setFocus(Qt.FocusReason.MouseFocusReason)
        self.press_row(self.row_at(y), modifiers)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        if event.button() != Qt.MouseButton.LeftButton:
            return
        at = event.position().toPoint()
        place, column = self.row_at(at.y()), self.columnAt(at.x())
        super().mousePressEvent(event)
        self.press_row(place, event.modifiers(), column=column)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        super().mouseMoveEvent(event)
        if event.buttons() & Qt.MouseButton.LeftButton:
            self.drag_to(event.position().y())
            self._follow_current()
        self.hover_at(event.position().y())

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        place = self.row_at(event.position().y())
        if event.button() == Qt.MouseButton.LeftButton and place >= 0:
            self.row_activated.emit(self.ledger.order.item(place))

    def scrollContentsBy(self, across: int, down: int) -> None:
        super().scrollContentsBy(across, down)
        if across:
            # What is shown of a column depends on how much of it is in view.
            self.viewport().update()
            self.head.viewport().update()
        # Rows move under a pointer that rests.
        if down and self.hovered >= 0 and self.viewport().underMouse():
            self.hover_at(self.viewport().mapFromGlobal(QCursor.pos()).y())

    def _left(self) -> None:
        if not self.rail.underMouse():
            self.hover_at(None)

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        column = self.columnAt(event.pos().x())
        at = event.globalPos()
        if event.reason() == QContextMenuEvent.Reason.Keyboard:
            column = self.currentIndex().column()
            at = self.viewport().mapToGlobal(self.visualRect(self.currentIndex()).bottomLeft())
        self.menu_wanted.emit(column, at)

    def focusInEvent(self, event: QFocusEvent) -> None:
        super().focusInEvent(event)
        index = self.currentIndex()
        if self.cell is None and index.isValid():
            self.cell = (self.ledger.order.item(index.row()), self.ledger.columns[index.column()].column.key)
            self._update_row(self.cell[0])

    def keyboardSearch(self, search: str) -> None:
        """Nothing: Qt would walk all rows through `data`; the filter finds rows."""

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.matches(QKeySequence.StandardKey.Copy):
            self.copy_wanted.emit()
        elif event.matches(QKeySequence.StandardKey.Find):
            self.filter_wanted.emit()
        elif event.matches(QKeySequence.StandardKey.SelectAll):
            self.choose_all()
        elif event.key() == Qt.Key.Key_Space:
            self._toggle_use()
        elif event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            if self.cell is not None:
                self.row_activated.emit(self.cell[0])
        else:
            self._walk(event)

    def _toggle_use(self) -> None:
        rows = sorted(self.chosen.in_order(self.ledger.order).tolist())
        if not rows and self.cell is not None and self.ledger.places.item(self.cell[0]) >= 0:
            rows = [self.cell[0]]
        if rows:
            self.use_toggled.emit(rows)

    def _walk(self, event: QKeyEvent) -> None:
        before = self.currentIndex().row()
        super().keyPressEvent(event)
        place = self.currentIndex().row()
        if place < 0 or place == before:
            self._follow_current()
            return
        if event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            changed = self.chosen.extend(place, self.ledger.order, self.ledger.places)
        else:
            changed = self.chosen.only(self.ledger.order.item(place))
        self._told(changed)
        self._follow_current()
