"""The fan between ledger and tracks: the ledger's rows in view flow into their true depths.

It paints what it is told: rows with their px places in the ledger, the depth window, the chosen rows. Its head is as
tall as the ledger's and the tracks', so that the ink line under the heads and every thread run on to the pixel.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable
from dataclasses import dataclass
from itertools import pairwise
from math import isfinite

from PySide6.QtCore import QEvent, Qt, Signal
from PySide6.QtGui import QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.plates.axis import Frame, head_height
from plumbwell.plates.fan import Ribbon, boundary_row, draw_fan, draw_interval_threads, draw_station_threads
from plumbwell.plates.numbers import counted
from plumbwell.plates.painting import hairline_across, painting

INTERVAL, STATION = "interval", "station"
STALE = 0.5


@dataclass(frozen=True, slots=True)
class FanRow:
    """A row of the ledger as the fan needs it.

    Parameters
    ----------
    row : int
        The row's number in the table, told when it is chosen or hovered.
    top_px, base_px : float
        Its edges in the ledger's body: px below the first row's upper edge when nothing is scrolled.
    top, base : float
        Depths from and to, equal for a station; NaN where it has none.
    density : float or None
        g/cm3 of the interval; of a station that of the rock below it. None or NaN where unknown.
    from_prior : bool
        The density rests on the prior alone.
    """

    row: int
    top_px: float
    base_px: float
    top: float
    base: float
    density: float | None
    from_prior: bool = False

    @property
    def centre_px(self) -> float:
        """Middle of the row in the ledger's body."""
        return (self.top_px + self.base_px) / 2

    @property
    def tone(self) -> float | None:
        """The density if it is known."""
        return self.density if self.density is not None and isfinite(self.density) else None


class Fan(QWidget):
    """The panel of ribbons.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    row_chosen(int)
        A ribbon, or the station line nearest to the pointer, was clicked.
    row_hovered(int)
        The pointer is over another row; -1 when over none.
    """

    row_chosen = Signal(int)
    row_hovered = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look = look
        self._stale = False
        self._kind: str | None = None
        self._rows: tuple[FanRow, ...] = ()
        self._named: frozenset[int] = frozenset()
        self._window = (0.0, 1.0)
        self._selected: frozenset[int] = frozenset()
        self._hovered = -1
        self.setMouseTracking(True)
        self.setAccessibleName("fan")
        look.changed.connect(self.update)
        self._say()

    def set_rows(self, kind: str | None, rows: Iterable[FanRow], selected: Collection[int] = ()) -> None:
        """Take the rows of the ledger that are in view, and which rows of the table are chosen.

        Parameters
        ----------
        kind : str or None
            "interval", "station", or None for a table that is not in order of depth: then only the threads of the
            chosen rows are drawn.
        rows : iterable of FanRow
            Downward as in the ledger, with one row beyond each end where there is one.
        selected : collection of int
            Chosen rows, in view or not.
        """
        rows = tuple(rows)
        self._kind = kind
        self._rows = tuple(row for row in rows if isfinite(row.top) and isfinite(row.base))
        self._named = frozenset(row.row for row in rows)
        self._selected = frozenset(selected)
        self._say()
        self.update()

    def set_stale(self, stale: bool) -> None:
        """Show that new densities are on their way: the ribbons are pale."""
        if stale != self._stale:
            self._stale = stale
            self.update()

    def set_window(self, top: float, base: float) -> None:
        """Take the depths between which the tracks show."""
        if (top, base) != self._window:
            self._window = (top, base)
            self.update()

    def _say(self) -> None:
        drawn = "drawn into their depths" if self._kind else "in view, not in order of depth"
        chosen = sum(row.row in self._selected for row in self._rows)
        said = f"{counted(len(self._rows), 'row')} {drawn}"
        self.setAccessibleDescription(f"{said}, {chosen} chosen" if chosen else said)

    def _frame(self) -> Frame:
        top = head_height(self._look.theme)
        # The frame keeps a height while the widget has none yet.
        base = max(self.height(), top + 1)
        depth_top, depth_base = self._window
        return Frame(left=0, top=top, right=self.width(), base=base, depth_top=depth_top, depth_base=depth_base)

    def _interval_ribbon(self, row: FanRow, head: float) -> Ribbon:
        return Ribbon(
            row_top=head + row.top_px,
            row_base=head + row.base_px,
            top=row.top,
            base=row.base,
            density=row.tone,
            from_prior=row.from_prior,
            selected=row.row in self._selected,
        )

    def _station_ribbon(self, above: FanRow, below: FanRow, head: float) -> Ribbon:
        # A filter may hide stations between two rows: the density below the upper one is not that of the whole way.
        whole = all(row in self._named for row in range(above.row + 1, below.row))
        return Ribbon(
            row_top=head + above.centre_px,
            row_base=head + below.centre_px,
            top=above.top,
            base=below.top,
            density=above.tone if whole else None,
            from_prior=above.from_prior,
        )

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        frame = self._frame()
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            painter.save()
            painter.setClipRect(0, int(frame.top), self.width(), self.height())
            painter.setOpacity(STALE if self._stale else 1.0)
            self._draw_ribbons(painter, frame)
            painter.setOpacity(1.0)
            self._draw_threads(painter, frame)
            painter.restore()
            hairline_across(painter, 0, self.width(), frame.top - 1, theme.colour("ink"))

    def _draw_ribbons(self, painter: QPainter, frame: Frame) -> None:
        ribbons = []
        if self._kind == INTERVAL:
            ribbons = [self._interval_ribbon(row, frame.top) for row in self._rows]
        elif self._kind == STATION:
            ribbons = [self._station_ribbon(above, below, frame.top) for above, below in pairwise(self._rows)]
        draw_fan(painter, ribbons, frame, self._look.theme)

    def _draw_threads(self, painter: QPainter, frame: Frame) -> None:
        """Draw the threads of chosen rows that no ribbon carries: of stations, and of tables in another order."""
        chosen = [row for row in self._rows if row.row in self._selected]
        stations = [(frame.top + row.centre_px, row.top) for row in chosen if row.top == row.base]
        draw_station_threads(painter, stations, frame, self._look.theme)
        if self._kind is None:
            ribbons = [self._interval_ribbon(row, frame.top) for row in chosen if row.top != row.base]
            draw_interval_threads(painter, ribbons, frame, self._look.theme)

    def row_at(self, x: float, y: float) -> int:
        """Return the table's row whose ribbon lies at a point, or whose station line is nearest; -1 for none."""
        frame = self._frame()
        if y < frame.top:
            return -1
        if self._kind == INTERVAL:
            for row in self._rows:
                upper = boundary_row(frame, frame.top + row.top_px, row.top, x)
                lower = boundary_row(frame, frame.top + row.base_px, row.base, x)
                if upper <= y < lower:
                    return row.row
        elif self._kind == STATION:
            lines = [boundary_row(frame, frame.top + row.centre_px, row.top, x) for row in self._rows]
            for (upper, lower), (above, below) in zip(pairwise(lines), pairwise(self._rows), strict=True):
                if upper <= y < lower:
                    return above.row if y - upper < lower - y else below.row
        return -1

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        self._hover(self.row_at(event.position().x(), event.position().y()))

    def leaveEvent(self, event: QEvent) -> None:
        self._hover(-1)

    def _hover(self, row: int) -> None:
        if row != self._hovered:
            self._hovered = row
            self.row_hovered.emit(row)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        row = self.row_at(event.position().x(), event.position().y())
        if event.button() == Qt.MouseButton.LeftButton and row >= 0:
            self.row_chosen.emit(row)
