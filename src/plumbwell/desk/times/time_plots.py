"""Plots against time in the window: runs side by side on one time axis, plots stacked; chosen and hovered in all.

Left-click chooses, left-drag brushes a range of time, middle-drag pans, the wheel zooms time and with Shift the
values, a double click fits. Left and Right walk the points, + and - zoom, Home fits. Tares are dragged by their
tag; T takes the next one, then Left and Right move it by a minute and Delete removes it. It shows and asks;
whoever owns it decides.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from PySide6.QtCore import QEvent, QPointF, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QWheelEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.hints import Hints
from plumbwell.desk.times.time_pointing import before_row, nearest_row, rows_between, tare_at, tares_in_time
from plumbwell.desk.times.time_telling import run_sentence, tare_sentence
from plumbwell.desk.times.time_view import ShownTimePlots, TareDrag
from plumbwell.plates.time_axis import MINUTE, Panel
from plumbwell.plates.time_plot import TareMark

REACH, DRAG_FROM, COARSE = 12.0, 4.0, 10.0
WHEEL_FACTOR, KEY_FACTOR = 1.25, 1.5
JOINING = Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier


class TimePlots(ShownTimePlots):
    """Stacked plots against time with a hand on them.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    rows_chosen : tuple of int
        Rows that were clicked or brushed; empty where nothing is. With Ctrl they join those chosen before, or a
        chosen one leaves them.
    row_hovered : int or None
        Row of the point under the pointer.
    walked : int
        Row that the arrow keys lead to.
    tare_moving, tare_moved : int, float
        Key and time of a tare while it is dragged (at last its old time, where Escape ends the drag), and when it
        is let go or moved by a key.
    tare_removed : int
        Key of the tare that is to go.
    tare_asked : int, float
        Run and time of a tare that is to be added before the chosen row.
    """

    rows_chosen = Signal(object)
    row_hovered = Signal(object)
    walked = Signal(int)
    tare_moving = Signal(int, float)
    tare_moved = Signal(int, float)
    tare_removed = Signal(int)
    tare_asked = Signal(int, float)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(look, parent)
        self._pressed: QPointF | None = None
        self._panned: QPointF | None = None
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        Hints(self, lambda at: self.words_at(QPointF(at)))

    # The mouse

    def mousePressEvent(self, event: QMouseEvent) -> None:
        place = event.position()
        if not self._plots:
            return
        if event.button() == Qt.MouseButton.MiddleButton:
            self._panned = place
        elif event.button() == Qt.MouseButton.LeftButton:
            tare = self._tare_under(place)
            if tare is not None and self._movable:
                run_index = next(run for run, one in tares_in_time(self._plots) if one.key == tare.key)
                self._drag = TareDrag(key=tare.key, run_index=run_index, before=tare.time, time=tare.time)
                self._take_tare(tare.key)
            elif place.y() >= self.time_layout().top - REACH:
                self._pressed = place
                self._take_tare(None)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        place = event.position()
        if self._panned is not None:
            self._pan(place)
        elif self._drag is not None:
            self._drag_tare(place)
        elif self._pressed is not None:
            if self._brush is not None or abs(place.x() - self._pressed.x()) >= DRAG_FROM:
                axis = self.time_layout().axis
                begin, end = (min(max(x, axis.left), axis.right) for x in (self._pressed.x(), place.x()))
                self._brush = (begin, end)
                self.update()
        elif self._plots:
            self._hover(place)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        if event.button() == Qt.MouseButton.MiddleButton:
            self._panned = None
        elif event.button() == Qt.MouseButton.LeftButton and self._drag is not None:
            drag, self._drag = self._drag, None
            self.update()
            if drag.time != drag.before:
                self.tare_moved.emit(drag.key, drag.time)
        elif event.button() == Qt.MouseButton.LeftButton and self._pressed is not None:
            brush, self._pressed, self._brush = self._brush, None, None
            self.update()
            joining = bool(event.modifiers() & JOINING)
            if brush is not None:
                found = rows_between(self._plots, self.time_layout(), min(brush), max(brush))
                self.rows_chosen.emit(self._joined(found) if joining else found)
            else:
                self._click(event.position(), joining)

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        if event.button() == Qt.MouseButton.LeftButton and self._tare_under(event.position()) is None:
            self.fit()

    def wheelEvent(self, event: QWheelEvent) -> None:
        turn = event.angleDelta().y() or event.angleDelta().x()
        if not self._plots or not turn:
            event.ignore()
            return
        factor = WHEEL_FACTOR ** (turn / 120.0)
        if event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            self.zoom_values(event.position().y(), factor)
        else:
            self.zoom_time(event.position().x(), factor)
        event.accept()

    def leaveEvent(self, event: QEvent) -> None:
        self._take_hovered(None)
        super().leaveEvent(event)

    def words_at(self, place: QPointF) -> str:
        """Return the tool tip at a place: what a tare is at its tag, what a run is in the head over its panel."""
        if not self._plots:
            return ""
        tare = self._tare_under(place)
        if tare is not None:
            return tare_sentence(tare, movable=self._movable)
        layout = self.time_layout()
        panel = layout.axis.panel_at(place.x())
        if panel is None or place.y() > layout.top or not panel.left <= place.x() <= panel.right:
            return ""
        return run_sentence(self._plots, panel.span, self._noun)

    def _tare_under(self, place: QPointF) -> TareMark | None:
        return tare_at(self._plots, self.time_layout(), x=place.x(), y=place.y()) if self._plots else None

    def _point_under(self, place: QPointF) -> int | None:
        return nearest_row(self._plots, self.time_layout(), x=place.x(), y=place.y(), reach=REACH)

    def _click(self, place: QPointF, joining: bool) -> None:
        row = self._point_under(place)
        if row is None:
            if not joining:
                self.rows_chosen.emit(())
        elif joining and row in self._rows:
            self.rows_chosen.emit(tuple(one for one in self._joined(()) if one != row))
        else:
            self.rows_chosen.emit(self._joined((row,)) if joining else (row,))

    def _joined(self, rows: tuple[int, ...]) -> tuple[int, ...]:
        """Return rows and those chosen before, in order of time."""
        return self.placed_rows().among(self._rows | set(rows))

    def _hover(self, place: QPointF) -> None:
        grip = self._movable and self._tare_under(place) is not None
        self.setCursor(Qt.CursorShape.SizeHorCursor if grip else Qt.CursorShape.ArrowCursor)
        self._take_hovered(None if grip else self._point_under(place))

    def _take_hovered(self, row: int | None) -> None:
        if row != self._hovered:
            self.set_hovered(row)
            self.row_hovered.emit(row)

    def _pan(self, place: QPointF) -> None:
        before, self._panned = self._panned, place
        if before is None:
            return
        for index, window in enumerate(self._windows):
            scale = self.time_layout().frames[index].scale
            if window is not None and scale.top <= place.y() <= scale.base:
                up = scale.value(before.y()) - scale.value(place.y())
                self._set_window(index, (window[0] + up, window[1] + up))
        self._take_view(self.time_layout().axis.panned(place.x() - before.x()))

    # Tares

    def _panel_of(self, run_index: int) -> Panel | None:
        panels = self.time_layout().axis.panels()
        return next((panel for panel in panels if panel.span.run_index == run_index), None)

    def _held_time(self, run_index: int, time: float) -> float:
        """Return a time kept inside its run."""
        panel = self._panel_of(run_index)
        return time if panel is None else min(max(time, panel.span.first), panel.span.last)

    def _drag_tare(self, place: QPointF) -> None:
        """Follow the hand; to whole minutes where a px is longer than some seconds, else to whole seconds."""
        if self._drag is None:
            return
        panel = self._panel_of(self._drag.run_index)
        if panel is None:
            return
        grain = MINUTE if panel.scale * COARSE < 1.0 else 1
        time = self._held_time(panel.span.run_index, float(round(panel.time(place.x()) / grain) * grain))
        if time != self._drag.time:
            self._drag = replace(self._drag, time=time)
            self.update()
            self.tare_moving.emit(self._drag.key, time)

    def _next_tare(self) -> None:
        """Take the next tare in order of time for the keys, after the last one the first."""
        keys = [tare.key for _, tare in tares_in_time(self._plots)]
        if keys:
            at = keys.index(self._tare) + 1 if self._tare in keys else 0
            run_index, tare = tares_in_time(self._plots)[at % len(keys)]
            self._take_view(self.time_layout().axis.revealed(run_index, tare.time))
            self._take_tare(tare.key)

    def _tare_key(self, key: int) -> bool:
        """Do what a key does to the taken tare; False where it does nothing."""
        found = next(((run, one) for run, one in tares_in_time(self._plots) if one.key == self._tare), None)
        if found is None:
            return False
        run_index, tare = found
        if key in (Qt.Key.Key_Left, Qt.Key.Key_Right):
            minute = MINUTE if key == Qt.Key.Key_Right else -MINUTE
            time = self._held_time(run_index, tare.time + minute)
            if time != tare.time:
                self.tare_moved.emit(tare.key, time)
        elif key in (Qt.Key.Key_Delete, Qt.Key.Key_Backspace):
            self.tare_removed.emit(tare.key)
        elif key == Qt.Key.Key_Escape:
            self._take_tare(None)
        else:
            return False
        return True

    def _ask_tare(self) -> None:
        if len(self._rows) == 1:
            (row,) = self._rows
            place = before_row(self.placed_rows(), row)
            if place is not None:
                self.tare_asked.emit(*place)

    # The keys

    def keyPressEvent(self, event: QKeyEvent) -> None:
        key = event.key()
        plain = not event.modifiers() & (Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.AltModifier)
        if not self._plots or not plain or not self._do_key(key):
            super().keyPressEvent(event)

    def _do_key(self, key: int) -> bool:
        """Do what a key does; False where it does nothing here."""
        if key == Qt.Key.Key_Escape and (self._brush is not None or self._drag is not None):
            drag, self._pressed, self._brush, self._drag = self._drag, None, None, None
            self.update()
            if drag is not None and drag.time != drag.before:
                self.tare_moving.emit(drag.key, drag.before)
        elif self._movable and self._tare is not None and self._tare_key(key):
            return True
        elif key in (Qt.Key.Key_Left, Qt.Key.Key_Right):
            self._walk(1 if key == Qt.Key.Key_Right else -1)
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal, Qt.Key.Key_Minus):
            self.zoom_time(self._centre(), 1 / KEY_FACTOR if key == Qt.Key.Key_Minus else KEY_FACTOR)
        elif key == Qt.Key.Key_Home:
            self.fit()
        elif key == Qt.Key.Key_T and self._movable:
            self._next_tare()
        elif key == Qt.Key.Key_Insert and self._movable:
            self._ask_tare()
        else:
            return False
        return True

    def _walk(self, step: int) -> None:
        """Lead to the next point in time, from the chosen one, the last of several, or the first in view."""
        placed = self.placed_rows()
        chosen = np.flatnonzero(np.isin(placed.rows, list(self._rows)))
        if len(chosen):
            at = int(chosen[-1] if step > 0 else chosen[0]) + step
        else:
            in_view = np.zeros(len(placed), dtype=bool)
            for panel in self.time_layout().axis.shown():
                inside = (placed.times >= panel.first) & (placed.times <= panel.last)
                in_view |= inside & (placed.runs == panel.span.run_index)
            at = int(np.argmax(in_view)) if len(placed) else 0
        if 0 <= at < len(placed):
            self.walked.emit(int(placed.rows[at]))

    def _centre(self) -> float:
        """Return the px column that zooming by keys keeps: that of a single chosen row in view, or the middle."""
        axis, placed = self.time_layout().axis, self.placed_rows()
        if len(self._rows) == 1:
            (row,) = self._rows
            place = placed.place_of(row)
            panel = None if place is None else self._panel_of(int(placed.runs[place]))
            if place is not None and panel is not None:
                x = panel.x(float(placed.times[place]))
                if axis.left <= x <= axis.right:
                    return x
        return (axis.left + axis.right) / 2
