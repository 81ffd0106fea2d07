"""The page that shows how the chosen reading's visit settled: readings can be chosen by click and by arrow keys."""

from __future__ import annotations

from collections.abc import Collection

from PySide6.QtCore import QEvent, QPointF, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.times.time_pointing import nearest_row
from plumbwell.desk.tray.small_picture import SmallPicture
from plumbwell.plates.numbers import counted, number
from plumbwell.plates.settle_plot import SettlePlot, draw_settle_cut, draw_settle_frame, settle_layout
from plumbwell.plates.time_curves import draw_time_curves
from plumbwell.plates.time_frame import TimeLayout
from plumbwell.plates.time_plot import TimePlot
from plumbwell.plates.time_words import draw_chosen_rings, draw_hovered_point, draw_time_words

NOTHING_CHOSEN = "Choose a reading to see how its visit settled"
REACH = 12.0
JOINING = Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier


class SettleView(SmallPicture):
    """Readings of one visit against the minutes since its first one.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    rows_chosen : tuple of int
        Rows that were clicked; with Ctrl they join those chosen before, or a chosen one leaves them.
    row_hovered : int or None
        Row of the reading under the pointer.
    walked : int
        Row that the arrow keys lead to.
    """

    rows_chosen = Signal(object)
    row_hovered = Signal(object)
    walked = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(
            look, parent, name="Settle-down of a visit", empty=NOTHING_CHOSEN, height=190, least_height=120
        )
        self._visit: SettlePlot | None = None
        self._plot: TimePlot | None = None
        self._rows: frozenset[int] = frozenset()
        self._hovered: int | None = None
        self._layout: TimeLayout | None = None
        self.setMouseTracking(True)
        self.forget()

    def set_visit(self, visit: SettlePlot | None) -> None:
        """Show the readings of another visit, or none."""
        self._visit = visit if visit is not None and len(visit.minutes) else None
        self._plot = None if self._visit is None else self._visit.time_plot()
        self.forget()

    def set_selection(self, rows: Collection[int]) -> None:
        """Show rows as chosen."""
        self._rows = frozenset(int(row) for row in rows)
        super().forget()

    def set_hovered(self, row: int | None) -> None:
        """Show a row as the one that the pointer is at, here or elsewhere."""
        if row != self._hovered:
            self._hovered = row
            self.update()

    def set_empty(self, words: str) -> None:
        """Show no visit, but words that say what to do next."""
        self._empty = words
        self.set_visit(None)

    def settle_layout(self) -> TimeLayout | None:
        """Return where the readings lie, in px of the widget; None where there is no visit."""
        if self._layout is None and self._plot is not None:
            theme = self._look.theme
            self._layout = settle_layout(self._plot, theme, width=self.width(), height=self.height())
        return self._layout

    def forget(self) -> None:
        """Lay the readings anew."""
        self._layout = None
        super().forget()

    def is_shown(self) -> bool:
        """Whether a visit is shown."""
        return self._plot is not None

    def _in_order(self) -> list[int]:
        """Return the rows of the visit in order of time."""
        if self._visit is None:
            return []
        pairs = sorted(zip(self._visit.minutes, self._visit.rows, strict=True))
        return [int(row) for _, row in pairs]

    def said(self) -> str:
        """The visit, its readings, and which of them are chosen."""
        words = super().said()
        if self._visit is not None and self._plot is not None:
            visit = self._visit
            count = counted(len(visit.rows), "reading")
            parts = [visit.title, f"{count} in {number(max(visit.minutes), 1)} min" if len(visit.rows) > 1 else count]
            left_out = int(self._plot.panels[0].points.excluded.sum())
            if left_out:
                parts.append(f"{left_out} left out")
            if visit.cut is not None:
                parts.append(f"creeps, {visit.leave_out} first to leave out")
            chosen = [place for place, row in enumerate(self._in_order(), 1) if row in self._rows]
            if len(chosen) == 1:
                place = [row for row in self._in_order() if row in self._rows][0]
                value = visit.values[[int(row) for row in visit.rows].index(place)]
                parts.append(f"reading {chosen[0]} chosen, {number(value, 1, signed=True)} {visit.unit} from the mean")
            elif chosen:
                parts.append(f"{counted(len(chosen), 'reading')} chosen")
            words = ", ".join(parts)
        return words

    def paint(self, painter: QPainter) -> None:
        """Paint the readings about their mean."""
        theme, layout = self._look.theme, self.settle_layout()
        if self._plot is None or layout is None:
            return
        plots = (self._plot,)
        draw_settle_frame(painter, self._plot, layout, theme)
        if self._visit is not None:
            draw_settle_cut(painter, self._visit, layout, theme)
        draw_time_curves(painter, plots, layout, theme)
        if self._hovered is not None:
            draw_hovered_point(painter, plots, layout, theme, self._hovered)
        draw_chosen_rings(painter, plots, layout, theme, self._rows)
        draw_time_words(painter, plots, layout, theme)

    def _row_at(self, place: QPointF) -> int | None:
        layout = self.settle_layout()
        if self._plot is None or layout is None:
            return None
        return nearest_row((self._plot,), layout, x=place.x(), y=place.y(), reach=REACH)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        if event.button() != Qt.MouseButton.LeftButton:
            return
        row = self._row_at(event.position())
        if row is None:
            return
        chosen: tuple[int, ...] = (row,)
        if event.modifiers() & JOINING:
            chosen = tuple(one for one in self._in_order() if (one in self._rows) != (one == row))
        self.rows_chosen.emit(chosen)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        self._take_hovered(self._row_at(event.position()))

    def leaveEvent(self, event: QEvent) -> None:
        self._take_hovered(None)
        super().leaveEvent(event)

    def _take_hovered(self, row: int | None) -> None:
        if row != self._hovered:
            self.set_hovered(row)
            self.row_hovered.emit(row)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        steps = {int(Qt.Key.Key_Left): -1, int(Qt.Key.Key_Right): 1}
        order = self._in_order()
        if event.key() not in steps or not order:
            super().keyPressEvent(event)
            return
        step = steps[event.key()]
        chosen = [place for place, row in enumerate(order) if row in self._rows]
        at = ((chosen[-1] if step > 0 else chosen[0]) + step) if chosen else 0
        if 0 <= at < len(order):
            self.walked.emit(order[at])
