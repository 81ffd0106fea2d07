"""The thread: what is chosen, what the pointer is at, and which depths are in view; one, everywhere.

Rows are chosen on one level (readings, visits, stations, intervals); every view asks for the level it shows. Depths
are downward, in the unit and kind of the depth axis.
"""

from __future__ import annotations

from collections.abc import Iterable
from math import isfinite

from PySide6.QtCore import QObject, Signal


class Selection(QObject):
    """What is chosen and in view.

    Signals
    -------
    chosen
        Other rows are chosen.
    pointed
        The pointer is at another depth or row.
    window_moved
        Other depths are in view.
    """

    chosen = Signal()
    pointed = Signal()
    window_moved = Signal()

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.level = "station"
        self.rows: tuple[int, ...] = ()
        self.depth: float | None = None
        self.row: int | None = None
        self.window = (0.0, 1.0)
        self.whole = (0.0, 1.0)

    def choose(self, level: str, rows: Iterable[int]) -> None:
        """Choose rows of a level; the chosen ones before are no longer so."""
        wanted = tuple(dict.fromkeys(int(row) for row in rows))
        if (level, wanted) != (self.level, self.rows):
            self.level, self.rows = level, wanted
            self.chosen.emit()

    def point(self, *, depth: float | None = None, row: int | None = None) -> None:
        """Take note of the depth and the row of the present table that the pointer is at."""
        if (depth, row) != (self.depth, self.row):
            self.depth, self.row = depth, row
            self.pointed.emit()

    def show(self, top: float, base: float) -> None:
        """Bring depths into view, held so that the window never leaves the hole by more than half its length."""
        if not isfinite(top + base):
            return
        low, high = self.whole
        length = min(max(base - top, (high - low) / 500.0, 1e-6), 2.0 * (high - low))
        middle = min(max((top + base) / 2.0, low), high)
        window = (middle - length / 2.0, middle + length / 2.0)
        if window != self.window:
            self.window = window
            self.window_moved.emit()

    def show_whole(self) -> None:
        """Bring the whole hole into view."""
        self.show(*self.padded())

    def padded(self) -> tuple[float, float]:
        """The depths of the whole hole with a little air at both ends."""
        low, high = self.whole
        air = 0.012 * (high - low)
        return low - air, high + air

    def hold(self, whole: tuple[float, float], *, window: tuple[float, float] | None = None) -> None:
        """Take the depths of another hole or another depth scale, and a window in it."""
        self.whole = whole
        self.window = self.padded() if window is None else window
        self.window_moved.emit()
