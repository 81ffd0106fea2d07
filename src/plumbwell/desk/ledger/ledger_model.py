"""The rows and columns of a ledger as a Qt model: a table, an order of its rows, the columns that are chosen.

Cells are formatted when they are asked for. Rows of the view are places in `order`; rows of the table are what the
world outside the ledger knows.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt

from plumbwell.desk.ledger.ledger_filter import Condition, kept_rows, parsed
from plumbwell.desk.ledger.ledger_order import Rows, downward, rises, sorted_rows
from plumbwell.desk.ledger.ledger_words import ColumnWords, number_words
from plumbwell.desk.ledger.table import LedgerTable
from plumbwell.survey.column import Array

Index = QModelIndex | QPersistentModelIndex

DISPLAY = int(Qt.ItemDataRole.DisplayRole)
ALIGNMENT = int(Qt.ItemDataRole.TextAlignmentRole)
SPOKEN = int(Qt.ItemDataRole.AccessibleTextRole)
TOOL_TIP = int(Qt.ItemDataRole.ToolTipRole)
RIGHT = int(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
LEFT = int(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)

NOWHERE = QModelIndex()


def empty_table() -> LedgerTable:
    """A table without rows and columns."""
    none = np.empty(0)
    return LedgerTable(
        stage="",
        level="",
        numbers=(),
        columns=(),
        marks=(),
        hints=(),
        excluded=np.empty(0, dtype=bool),
        top=none,
        base=none,
        density=none,
    )


class LedgerModel(QAbstractTableModel):
    """A table with an order of its rows and a choice of its columns.

    The numbers of the rows are the vertical head; the columns of the model are the chosen ones.
    """

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.table = empty_table()
        self.numbers = number_words(self.table)
        self.all_columns: tuple[ColumnWords, ...] = ()
        self.columns: tuple[ColumnWords, ...] = ()
        self.order: Rows = np.empty(0, dtype=np.intp)
        self.sorting: tuple[str, bool] | None = None
        self.filter: tuple[Condition, ...] = ()
        self._sorted: Rows | None = None
        self._places: Rows | None = None
        self._downward: bool | None = None
        self._given: str | None = None

    def set_table(self, table: LedgerTable, chosen: Iterable[str]) -> None:
        """Show another table with the columns of some keys; a sort by a column that it lacks is given up."""
        self.beginResetModel()
        self.table = table
        self.numbers = number_words(table)
        self.all_columns = tuple(ColumnWords(column) for column in table.columns)
        self.columns = self._of_keys(chosen)
        self.filter = ()
        if self.sorting is not None and self.column_of(self.sorting[0]) is None:
            self.sorting = None
        self._sorted = None
        self._reorder()
        self.endResetModel()

    def _of_keys(self, keys: Iterable[str]) -> tuple[ColumnWords, ...]:
        wanted = set(keys)
        self._given = None
        return tuple(words for words in self.all_columns if words.column.key in wanted)

    def choose(self, keys: Iterable[str]) -> None:
        """Show the columns of some keys, in the order of the table."""
        self.beginResetModel()
        self.columns = self._of_keys(keys)
        self._reorder()
        self.endResetModel()

    def arrange(self, *, sort: tuple[str, bool] | None, text: str) -> None:
        """Sort by a column's key, descending or not (None: as given), and filter as written.

        Raises
        ------
        FilterError
            The filter cannot be understood; nothing has changed.
        """
        conditions = parsed(text, (self.numbers, *self.all_columns))
        self.beginResetModel()
        self.filter = conditions
        if sort is not None and self.column_of(sort[0]) is None:
            sort = None
        if sort != self.sorting:
            self.sorting, self._sorted = sort, None
        self._reorder()
        self.endResetModel()

    def _reorder(self) -> None:
        if self._sorted is None:
            words = None if self.sorting is None else self.column_of(self.sorting[0])
            if words is None or self.sorting is None:
                self._sorted = np.arange(len(self.table), dtype=np.intp)
            else:
                self._sorted = sorted_rows(words, descending=self.sorting[1])
        self.order = self._sorted
        if self.filter:
            kept = kept_rows(self.filter, (self.numbers, *self.columns), len(self.table))
            self.order = self._sorted[kept[self._sorted]]
        self._places = None
        self._downward = None

    def column_of(self, key: str) -> ColumnWords | None:
        """The column of a key, chosen or not."""
        return next((words for words in self.all_columns if words.column.key == key), None)

    def given_key(self) -> str | None:
        """Key of the first chosen column by whose numbers the rows stand as they are given."""
        if self._given is None:
            rising = (words for words in self.columns if not words.is_text and rises(words.values))
            self._given = next((words.column.key for words in rising), "")
        return self._given or None

    def falling_key(self) -> str | None:
        """Key of the first chosen column whose numbers fall as the rows are given, where none rises: elevations."""
        if self.given_key() is not None:
            return None
        falling = (words for words in self.columns if not words.is_text and rises(-words.values))
        return next((words.column.key for words in falling), None)

    @property
    def places(self) -> Rows:
        """Row of the view of each row of the table, -1 where the filter hides it."""
        if self._places is None:
            self._places = np.full(len(self.table), -1, dtype=np.intp)
            self._places[self.order] = np.arange(self.order.size)
        return self._places

    @property
    def downward(self) -> bool:
        """Whether the rows in view go down the hole."""
        if self._downward is None:
            self._downward = downward(self.table.top[self.order], self.table.base[self.order])
        return self._downward

    def spans(self) -> tuple[Array, Array]:
        """Depths of top and base of the rows, in the order of the view."""
        return self.table.top[self.order], self.table.base[self.order]

    def rowCount(self, parent: Index = NOWHERE) -> int:
        return 0 if parent.isValid() else int(self.order.size)

    def columnCount(self, parent: Index = NOWHERE) -> int:
        return 0 if parent.isValid() else len(self.columns)

    def data(self, index: Index, role: int = DISPLAY) -> object:
        """A cell as Qt and screen readers ask for it."""
        if not index.isValid():
            return None
        words = self.columns[index.column()]
        if role == DISPLAY:
            row = self.order.item(index.row())
            sd = words.sd(row)
            return f"{words.value(row)} {sd}" if sd else words.value(row)
        if role == ALIGNMENT:
            return LEFT if words.is_text else RIGHT
        if role == SPOKEN:
            return words.spoken(self.order.item(index.row()))
        return None

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = DISPLAY) -> object:
        if orientation == Qt.Orientation.Horizontal:
            if not 0 <= section < len(self.columns):
                return None
            words = self.columns[section]
            if role in (DISPLAY, SPOKEN):
                return f"{words.name}, {words.unit}" if words.unit else words.name
            return words.column.what or None if role == TOOL_TIP else None
        if not 0 <= section < self.order.size:
            return None
        row = self.order.item(section)
        if role == DISPLAY:
            return self.table.numbers[row]
        if role == TOOL_TIP:
            return self.table.hints[row] or None
        return self.spoken_row(row) if role == SPOKEN else None

    def spoken_row(self, row: int) -> str:
        """The head of a table row in words: its number, its mark and whether it is left out."""
        mark = self.table.marks[row]
        told = {"look": "wants a look", "error": "error", "note": "note", "changed": "changed by a person"}
        words = [f"{self.table.level} {self.table.numbers[row]}".strip()]
        if mark in told:
            words.append(told[mark])
        if self.table.excluded[row]:
            words.append("left out")
        if self.table.hints[row]:
            words.append(self.table.hints[row])
        return ", ".join(words)
