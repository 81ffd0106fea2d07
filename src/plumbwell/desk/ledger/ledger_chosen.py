"""Which rows of a ledger are chosen: a mark on each row of the table, so that no sort or filter can lose one.

Rows of the view come in, rows of the table go out. Nothing here grows with the number of unbroken ranges.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from plumbwell.desk.ledger.ledger_order import Rows, runs
from plumbwell.desk.ledger.ledger_search import Mask


class ChosenRows:
    """The chosen rows of a table of `n` rows, none at first."""

    def __init__(self, n: int = 0) -> None:
        self.mask: Mask = np.zeros(n, dtype=bool)
        self._kept: Mask = self.mask
        self._anchor: int | None = None

    def rows(self) -> tuple[int, ...]:
        """Chosen rows of the table, rising."""
        return tuple(np.flatnonzero(self.mask).tolist())

    def set(self, rows: Iterable[int]) -> bool:
        """Choose these rows of the table and no others; rows that are not there are passed over. Whether it changed."""
        wanted = np.array(list(rows), dtype=np.intp)
        wanted = wanted[(wanted >= 0) & (wanted < self.mask.size)]
        mask = np.zeros(self.mask.size, dtype=bool)
        mask[wanted] = True
        self._anchor = int(wanted[0]) if wanted.size else None
        self._kept = np.zeros(self.mask.size, dtype=bool)
        return self._take(mask)

    def only(self, row: int) -> bool:
        """Choose one row of the table; ranges go from there."""
        return self.set((row,))

    def toggle(self, row: int) -> bool:
        """Choose a row too, or no longer; ranges go from there."""
        mask = self.mask.copy()
        mask[row] = not mask[row]
        self._anchor, self._kept = row, mask.copy()
        return self._take(mask)

    def extend(self, place: int, order: Rows, places: Rows, *, add: bool = False) -> bool:
        """Choose all rows of the view from where ranges go to a place in it.

        Parameters
        ----------
        place : int
            Row of the view.
        order, places : int arrays
            Table rows in the order of the view, and the reverse.
        add : bool
            Rows that were chosen apart from this range stay so.
        """
        start = -1 if self._anchor is None else places.item(self._anchor)
        if start < 0:
            start, self._anchor = place, order.item(place)
        if not add:
            self._kept = np.zeros(self.mask.size, dtype=bool)
        mask = self._kept.copy()
        mask[order[min(start, place) : max(start, place) + 1]] = True
        return self._take(mask)

    def everything(self, order: Rows) -> bool:
        """Choose all rows in view."""
        mask = np.zeros(self.mask.size, dtype=bool)
        mask[order] = True
        return self._take(mask)

    def _take(self, mask: Mask) -> bool:
        changed = not np.array_equal(mask, self.mask)
        self.mask = mask
        return changed

    def in_order(self, order: Rows) -> Rows:
        """Chosen rows of the table that are in view, in its order."""
        return order[self.mask[order]]

    def ranges(self, order: Rows) -> tuple[Rows, Rows]:
        """First and last row of the view of each unbroken range of chosen rows."""
        return runs(np.flatnonzero(self.mask[order]))
