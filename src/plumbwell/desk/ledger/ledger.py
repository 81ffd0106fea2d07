"""The ledger: the table of the present stage, with sorting, a filter, a choice of columns, and its end of the thread.

It shows a `LedgerTable` and speaks in rows of that table. What the person does is signalled; what is set from outside
is not.
"""

from __future__ import annotations

from collections.abc import Iterable, MutableMapping
from itertools import accumulate

import numpy as np
from PySide6.QtCore import QEvent, QPoint, Qt, Signal
from PySide6.QtGui import QGuiApplication, QKeyEvent
from PySide6.QtWidgets import QMenu, QVBoxLayout, QWidget

from plumbwell.desk.hole.fan import FanRow
from plumbwell.desk.ledger.column_choice import ColumnChoice, ColumnMemory
from plumbwell.desk.ledger.ledger_cells import row_height
from plumbwell.desk.ledger.ledger_copy import copied
from plumbwell.desk.ledger.ledger_filter import FilterError
from plumbwell.desk.ledger.ledger_filter_line import FilterLine
from plumbwell.desk.ledger.ledger_menu import column_menu, ledger_menu
from plumbwell.desk.ledger.ledger_model import LedgerModel, empty_table
from plumbwell.desk.ledger.ledger_rows import LedgerRows
from plumbwell.desk.ledger.table import LedgerTable
from plumbwell.desk.look import Look
from plumbwell.plates.axis import head_height

NO_ROWS = "There are no rows."
NONE_LEFT = "No row passes the filter. Esc shows all rows."


class Ledger(QWidget):
    """The table of a stage.

    Parameters
    ----------
    look : Look
    memory : MutableMapping of str to object, optional
        Where chosen columns, dragged widths and sorting are kept, stage by stage.
    parent : QWidget, optional

    Signals
    -------
    rows_chosen : tuple of int
        The person chose these rows of the table.
    row_hovered : int
        The pointer is over this row of the table; -1 for none.
    cell_reached : int, str
        The person went to a cell: row of the table, key of the column.
    use_toggled : list of int
        These rows are to be left out, or taken in again.
    activated : int
        Return or a double click on this row.
    moved
        Rows lie elsewhere than before: scrolled, sorted, filtered, resized. Another table alone does not tell it.
    """

    rows_chosen = Signal(object)
    row_hovered = Signal(int)
    cell_reached = Signal(int, str)
    use_toggled = Signal(list)
    activated = Signal(int)
    moved = Signal()

    def __init__(
        self, look: Look, memory: MutableMapping[str, object] | None = None, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self._look, self._narrow = look, False
        self._store: MutableMapping[str, object] = {} if memory is None else memory
        self._memory = ColumnMemory(self._store, empty_table())
        self._empty = NO_ROWS
        self._quiet = 0
        self._model = LedgerModel(self)
        self.rows = LedgerRows(look, self._model, self)
        self.line = FilterLine(look, self.rows)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self.rows)
        self.setFocusProxy(self.rows)
        self._connect()
        self.set_table(empty_table())

    def _connect(self) -> None:
        rows, line = self.rows, self.line
        rows.rows_chosen.connect(self.rows_chosen)
        rows.row_hovered.connect(self.row_hovered)
        rows.cell_reached.connect(self.cell_reached)
        rows.use_toggled.connect(self.use_toggled)
        rows.row_activated.connect(self.activated)
        rows.copy_wanted.connect(self.copy)
        rows.filter_wanted.connect(self.open_filter)
        rows.menu_wanted.connect(self._show_menu)
        rows.head.menu_wanted.connect(self._show_menu)
        rows.corner.menu_wanted.connect(self._show_menu)
        rows.corner.clicked.connect(self.sort_as_given)
        rows.head.sectionClicked.connect(self._head_clicked)
        rows.head.sectionResized.connect(self._head_dragged)
        rows.head.sectionHandleDoubleClicked.connect(self._head_fitted)
        rows.verticalScrollBar().valueChanged.connect(self._scrolled)
        rows.laid_out.connect(self._place_line)
        line.written.connect(self.set_filter)
        line.closed.connect(self.close_filter)
        line.left.connect(rows.setFocus)
        self._look.changed.connect(self._look_changed)

    # What is shown

    @property
    def table(self) -> LedgerTable:
        """The table that is shown."""
        return self._model.table

    def set_table(self, table: LedgerTable) -> None:
        """Show another table.

        In the same stage, sorting, filter and scroll position stay; rows stay chosen where there are as many of the
        same level as before.
        """
        before, rows = self.table, self.rows
        same_stage = (before.stage, before.level) == (table.stage, table.level)
        same_rows = before.level == table.level and len(before) == len(table)
        scroll = rows.verticalScrollBar().value() if same_stage else 0
        chosen = rows.chosen.rows() if same_rows else ()
        if not same_stage:
            self._memory = ColumnMemory(self._store, table)
            self._model.sorting = self._memory.sort
            self.line.clear()
            self._show_line(False)
        self._quiet += 1
        self._model.set_table(table, self._memory.chosen(table.columns, narrow=self._narrow))
        rows.renew(len(table), chosen, keep_current=same_rows)
        self._arrange(self._model.sorting)
        self._measure()
        rows.verticalScrollBar().setValue(scroll)
        self._quiet -= 1
        rows.setAccessibleName(f"Ledger of {table.level}s" if table.level else "Ledger")

    def set_empty(self, words: str) -> None:
        """What stands in a table without rows: a sentence that says what to do next."""
        self._empty = words
        self._say_why_empty()

    def set_stale(self, stale: bool) -> None:
        """Mute the numbers while new ones are computed, or show them as good again."""
        self.rows.stale = stale
        self.rows.update_rows()

    def set_narrow(self, narrow: bool) -> None:
        """Show the fewer columns of a narrow window, or those of a wide one."""
        if narrow != self._narrow:
            self._narrow = narrow
            self._take_columns()

    # Columns

    def column_choices(self) -> list[ColumnChoice]:
        """Every column there is, shown or not."""
        shown = {words.column.key for words in self._model.columns}
        return [
            ColumnChoice(words.column.key, words.name, words.column.what, words.column.key in shown)
            for words in self._model.all_columns
        ]

    def choose_columns(self, keys: Iterable[str]) -> None:
        """Show the columns of these keys, in the order of the table, and remember it for the stage."""
        self._memory.choose(self.table.columns, keys, narrow=self._narrow)
        self._take_columns()

    def _take_columns(self) -> None:
        self._quiet += 1
        scroll = self.rows.verticalScrollBar().value()
        self._model.choose(self._memory.chosen(self.table.columns, narrow=self._narrow))
        self.rows.restore()
        self._measure()
        self.rows.verticalScrollBar().setValue(scroll)
        self._quiet -= 1
        self._tell_filter(self.line.reason)
        if self._model.filter:
            self.moved.emit()

    def natural_width(self) -> int:
        """Width in px at which all columns find room: as wide as their content, or as the person dragged them."""
        return self.column_edges()[-1]

    def column_edges(self) -> list[int]:
        """Widths in px at which no column is cut: after the row numbers, after the first column, and so on."""
        return list(accumulate(self._widths(), initial=self.rows.numbers.column_width))

    def _widths(self) -> list[int]:
        by_hand, theme = self._memory.widths, self._look.theme
        widths = []
        for column, words in enumerate(self._model.columns):
            dragged = by_hand.get(words.column.key)
            widths.append(self.rows.fit(column).natural if dragged is None else theme.px(dragged))
        return widths

    def _measure(self) -> None:
        self._quiet += 1
        self.line.measure()
        self.rows.head.below = self.line.sizeHint().height() if not self.line.isHidden() else 0
        self.rows.measure()
        for column, width in enumerate(self._widths()):
            self.rows.head.resizeSection(column, width)
        self._quiet -= 1
        self.updateGeometry()

    def _look_changed(self) -> None:
        self._measure()
        self.moved.emit()

    def _head_dragged(self, column: int, before: int, now: int) -> None:
        if not self._quiet and column < len(self._model.columns):
            self._memory.set_width(self._model.columns[column].column.key, now / self._look.theme.text_scale)
            self.rows.viewport().update()

    def _head_fitted(self, column: int) -> None:
        self._memory.set_width(self._model.columns[column].column.key, None)
        self._measure()

    def fit_columns(self) -> None:
        """Make all columns as wide as their content again."""
        self._memory.forget_widths()
        self._measure()

    # Sorting

    def sort_by(self, key: str, *, descending: bool = False) -> None:
        """Sort the rows by a column, and remember it for the stage."""
        self._sort((key, descending))

    def sort_as_given(self) -> None:
        """Put the rows back into the order they were given in."""
        self._sort(None)

    def _head_clicked(self, column: int) -> None:
        """Sort upward, then downward, then not; rows that are given upward begin with downward."""
        key = self._model.columns[column].column.key
        now = self._model.sorting
        if now == (key, True):
            self._sort(None)
        elif now == (key, False):
            self._sort((key, True))
        else:
            self._sort((key, now is None and self._model.given_key() == key))

    def _sort(self, sort: tuple[str, bool] | None) -> None:
        self._memory.sort = sort
        self._rearrange(sort)

    def _rearrange(self, sort: tuple[str, bool] | None) -> None:
        self._quiet += 1
        self._arrange(sort)
        for column, width in enumerate(self._widths()):
            self.rows.head.resizeSection(column, width)
        self.rows.verticalScrollBar().setValue(0)
        self._quiet -= 1
        self.rows.head.viewport().update()
        self.moved.emit()

    def _arrange(self, sort: tuple[str, bool] | None) -> None:
        reason = ""
        try:
            self._model.arrange(sort=sort, text=self.filter_text())
        except FilterError as error:
            # A filter that means nothing hides nothing.
            reason = str(error)
            self._model.arrange(sort=sort, text="")
        self.rows.restore()
        self._tell_filter(reason)

    # Filter

    def filter_text(self) -> str:
        """The filter as the person wrote it."""
        return "" if self.line.isHidden() else self.line.field.text()

    def open_filter(self) -> None:
        """Open the line of the filter and write there."""
        self._show_line(True)
        self._measure()
        self._tell_filter(self.line.reason)
        self.line.field.setFocus(Qt.FocusReason.ShortcutFocusReason)
        self.line.field.selectAll()
        self.moved.emit()

    def set_filter(self, text: str) -> None:
        """Filter the rows as if the person had written this; nothing written shows all rows."""
        if self.line.isHidden():
            if not text:
                return
            self._show_line(True)
            self._measure()
        if self.line.field.text() != text:
            self.line.field.setText(text)
        self._rearrange(self._model.sorting)

    def close_filter(self) -> None:
        """Show all rows again and close the line."""
        self.line.clear()
        self._show_line(False)
        self._measure()
        self._rearrange(self._model.sorting)
        self.rows.setFocus(Qt.FocusReason.OtherFocusReason)

    def _show_line(self, shown: bool) -> None:
        self.line.setVisible(shown)
        self.rows.head.below = self.line.sizeHint().height() if shown else 0

    def _place_line(self) -> None:
        top, height = head_height(self._look.theme), self.line.sizeHint().height()
        self.line.setGeometry(0, top, self.rows.width(), height)
        self.line.raise_()

    def _tell_filter(self, reason: str = "") -> None:
        self.line.tell(shown=self._model.rowCount(), rows=len(self.table), reason=reason)
        self._say_why_empty()

    def _say_why_empty(self) -> None:
        self.rows.sentence = NONE_LEFT if len(self.table) else self._empty
        self.rows.setAccessibleDescription("" if self._model.rowCount() else self.rows.sentence)
        self.rows.update_rows()

    # Choosing

    def choose_rows(self, rows: Iterable[int], scroll: bool = True) -> None:
        """Choose rows of the table from outside, and bring the first of them into view; nothing is signalled."""
        self.rows.choose(rows, scroll=scroll)

    def choose_all(self) -> None:
        """Choose all rows in view, as the person's own doing."""
        self.rows.choose_all()

    def walk(self, step: int) -> None:
        """Go so many rows down, or up, as the arrow keys do."""
        self.rows.walk(step)

    def chosen_rows(self) -> tuple[int, ...]:
        """Rows of the table that are chosen."""
        return self.rows.chosen.rows()

    def set_hovered(self, row: int) -> None:
        """Show a row of the table as hovered, -1 for none; nothing is signalled."""
        self.rows.set_hovered(row)

    def current_cell(self) -> tuple[int, str] | None:
        """Row of the table and key of the column of the current cell."""
        return self.rows.cell

    def go_to_cell(self, row: int, key: str) -> None:
        """Make a cell the current one and bring it into view; nothing is signalled."""
        self.rows.reach(row, key, scroll=True)

    # Place

    def body_top(self) -> int:
        """Px from the top of the ledger to the upper edge of its rows."""
        return self.rows.viewport().mapTo(self, QPoint(0, 0)).y()

    def rows_in_view(self) -> list[tuple[int, int, int]]:
        """Each row in view: row of the table, and px of its upper and lower edge below the body's top."""
        rows, height = self.rows, row_height(self._look.theme)
        return [
            (self._model.order.item(place), rows.row_top(place), rows.row_top(place) + height)
            for place in rows.places_in_view(0, rows.viewport().height() - 1)
        ]

    def fan_rows(self) -> list[FanRow]:
        """The rows in view, and one beyond each end, as the fan takes them: px below the heads' line."""
        rows, table, height = self.rows, self.table, row_height(self._look.theme)
        down = self.body_top() - head_height(self._look.theme)
        found = []
        for place in rows.places_in_view(-height, rows.viewport().height() - 1 + height):
            row, top = self._model.order.item(place), rows.row_top(place) + down
            found.append(
                FanRow(
                    row=row,
                    top_px=top,
                    base_px=top + height,
                    top=table.top.item(row),
                    base=table.base.item(row),
                    density=table.density.item(row),
                )
            )
        return found

    def in_depth_order(self) -> bool:
        """Whether the rows in view go down the hole."""
        return self._model.downward

    def visible_depths(self) -> tuple[float, float] | None:
        """Depths of the rows of which at least half is in view; None when none of them has a depth."""
        base = self.rows.viewport().height()
        rows = [row for row, upper, lower in self.rows_in_view() if upper + lower >= 0 and upper + lower <= 2 * base]
        tops, bases = self.table.top[rows], self.table.base[rows]
        known = np.isfinite(tops) & np.isfinite(bases)
        if not known.any():
            return None
        return float(tops[known].min()), float(bases[known].max())

    def show_depths(self, top: float, base: float) -> None:
        """Scroll as little as brings the rows of these depths into view, or fills the view with them.

        Rows that are sorted otherwise than down the hole stay where they are.
        """
        if not self.in_depth_order():
            return
        upper, lower = self._model.spans()
        at_once = (upper == lower) & (upper >= top) & (upper <= base)
        inside = np.flatnonzero(at_once | ((lower > top) & (upper < base)))
        if not inside.size:
            return
        height, bar = row_height(self._look.theme), self.rows.verticalScrollBar()
        ends = int(inside[0]) * height, (int(inside[-1]) + 1) * height - self.rows.viewport().height()
        value = min(max(bar.value(), min(ends)), max(ends))
        # A whole row stands under the head, unless the last one would be cut for it.
        bar.setValue(min(-(-value // height) * height, bar.maximum()))

    def _scrolled(self) -> None:
        if not self._quiet:
            self.moved.emit()

    def resizeEvent(self, event: QEvent) -> None:
        self.moved.emit()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape and not self.line.isHidden():
            self.close_filter()
        else:
            super().keyPressEvent(event)

    # Copy and menu

    def copied_text(self) -> str:
        """Chosen rows, all in view when none is chosen, as tab-separated text with a heading line."""
        rows = self.rows.chosen.in_order(self._model.order)
        return copied((self._model.numbers, *self._model.columns), rows if rows.size else self._model.order)

    def copy(self) -> None:
        """Put the chosen rows, or all, on the clipboard."""
        QGuiApplication.clipboard().setText(self.copied_text())

    def open_columns(self) -> None:
        """Open the menu of the columns under the head."""
        self._pop_up(column_menu(self, self), self.rows.corner.mapToGlobal(QPoint(0, head_height(self._look.theme))))

    def _show_menu(self, column: int, at: QPoint) -> None:
        self._pop_up(ledger_menu(self, column), at)

    def _pop_up(self, menu: QMenu, at: QPoint) -> None:
        menu.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        menu.popup(at)
