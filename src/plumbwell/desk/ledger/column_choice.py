"""Which columns a ledger shows, how wide and in which order of rows, remembered stage by stage; and the menu of them.

What a person chose is kept as differences from what a stage shows of itself, so that a column that is new comes into
view. Widths are kept in px at text scale 1.
"""

from __future__ import annotations

from collections.abc import Iterable, MutableMapping, Sequence
from typing import NamedTuple

from PySide6.QtCore import Qt
from PySide6.QtGui import QAction, QKeyEvent, QMouseEvent
from PySide6.QtWidgets import QMenu, QWidget

from plumbwell.desk.ledger.table import LedgerColumn, LedgerTable

ADDED, HIDDEN, WIDTHS, SORT = "added", "hidden", "widths", "sort"


class ColumnChoice(NamedTuple):
    """A column that may be chosen: its key, its name, what it tells, and whether it is shown."""

    key: str
    name: str
    what: str
    shown: bool


class ColumnMemory:
    """What is remembered of the columns of one stage.

    Parameters
    ----------
    memory : MutableMapping of str to object, or None
        Where it is kept, as lists and dicts of plain values; None forgets at the end.
    table : LedgerTable
        Names the stage and the kind of rows.
    """

    def __init__(self, memory: MutableMapping[str, object] | None, table: LedgerTable) -> None:
        self._memory: MutableMapping[str, object] = {} if memory is None else memory
        self._name = f"ledger/{table.stage}/{table.level}"

    def _key(self, what: str, narrow: bool = False) -> str:
        return f"{self._name}/{what}" + ("_narrow" if narrow else "")

    def _texts(self, key: str) -> set[str]:
        kept = self._memory.get(key)
        return {one for one in kept if isinstance(one, str)} if isinstance(kept, list | tuple) else set()

    def chosen(self, columns: Sequence[LedgerColumn], *, narrow: bool) -> list[str]:
        """Keys of the columns to show, in the order of the table."""
        added, hidden = self._texts(self._key(ADDED, narrow)), self._texts(self._key(HIDDEN, narrow))
        return [
            column.key
            for column in columns
            if (_of_itself(column, narrow) or column.key in added) and column.key not in hidden
        ]

    def choose(self, columns: Sequence[LedgerColumn], keys: Iterable[str], *, narrow: bool) -> None:
        """Keep a choice of columns. What was chosen of columns that are not there stays."""
        wanted = set(keys)
        there = {column.key for column in columns}
        of_itself = {column.key for column in columns if _of_itself(column, narrow)}
        for what, now in ((ADDED, wanted - of_itself), (HIDDEN, of_itself - wanted)):
            key = self._key(what, narrow)
            self._memory[key] = sorted((self._texts(key) - there) | (now & there))

    @property
    def widths(self) -> dict[str, float]:
        """Widths that a person dragged, by key, at text scale 1."""
        kept = self._memory.get(self._key(WIDTHS))
        if not isinstance(kept, dict):
            return {}
        return {
            key: float(width)
            for key, width in kept.items()
            if isinstance(width, int | float) and not isinstance(width, bool) and width > 0
        }

    def set_width(self, key: str, width: float | None) -> None:
        """Keep a width; None gives the column back to its content."""
        widths = self.widths
        widths.pop(key, None)
        if width is not None:
            widths[key] = width
        self._memory[self._key(WIDTHS)] = widths

    def forget_widths(self) -> None:
        """Give all columns back to their content."""
        self._memory[self._key(WIDTHS)] = {}

    @property
    def sort(self) -> tuple[str, bool] | None:
        """Key that rows are sorted by and whether descending; None as given."""
        kept = self._memory.get(self._key(SORT))
        if isinstance(kept, list | tuple) and len(kept) == 2 and isinstance(kept[0], str):
            return kept[0], bool(kept[1])
        return None

    @sort.setter
    def sort(self, sort: tuple[str, bool] | None) -> None:
        """Keep a sort."""
        self._memory[self._key(SORT)] = [] if sort is None else list(sort)


def _of_itself(column: LedgerColumn, narrow: bool) -> bool:
    """Whether a column is shown unless the person chose otherwise."""
    return column.shown and (column.narrow or not narrow)


class ColumnMenu(QMenu):
    """A menu of columns with a check mark at those shown; it stays open while several are chosen.

    Parameters
    ----------
    parent : QWidget
    """

    def __init__(self, parent: QWidget) -> None:
        super().__init__("Columns", parent)
        self.setToolTipsVisible(True)

    def add_choice(self, words: str, what: str, shown: bool) -> QAction:
        """Add a column by its name, with what it tells as a tool tip."""
        action = self.addAction(words.replace("&", "&&"))
        action.setCheckable(True)
        action.setChecked(shown)
        action.setToolTip(what or words)
        return action

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        under = self.actionAt(event.position().toPoint())
        if under is not None and under.isCheckable():
            under.trigger()
        else:
            super().mouseReleaseEvent(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        at = self.activeAction()
        chooses = event.key() in (Qt.Key.Key_Space, Qt.Key.Key_Return, Qt.Key.Key_Enter)
        if chooses and at is not None and at.isCheckable():
            at.trigger()
        else:
            super().keyPressEvent(event)
