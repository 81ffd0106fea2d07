"""The core strip at the left of the window: the grip that says which depths are in view, brush and clicks.

It changes nothing itself: it tells what the person wants, and is told the window and the selection. Depths grow
downward, in the unit of the plate.
"""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QPointF, Qt, Signal
from PySide6.QtGui import QFocusEvent, QKeyEvent, QMouseEvent, QWheelEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.hole.strip_view import BRUSH, FINDING, StripView
from plumbwell.desk.hole.strip_window import Window
from plumbwell.desk.look import Look
from plumbwell.plates.strip_places import BASE, MOVE, TOP, depth_at, grip_rows

DRAG_FROM = 3.0
STEP, PAGE, ZOOM = 0.1, 0.9, 1.25
NOTCH = 120


@dataclass(slots=True, kw_only=True)
class _Press:
    """What the mouse holds: a part of the grip, the core (a brush) or a finding; from where, and the window then."""

    part: str
    at: QPointF
    offset: float
    window: Window
    moved: bool = False
    finding: int = -1
    extend: bool = False


class Strip(StripView):
    """The core strip with the survey's name above and the key of tones below it.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    window_wanted(float, float)
        Other depths are to be in view: the grip was dragged, the wheel turned, a key pressed.
    range_brushed(float, float)
        Depths were brushed over the core; again at every move of the brush.
    depth_chosen(float, bool)
        The core was clicked at a depth; whether to add to what is chosen.
    finding_chosen(int)
        A mark was clicked: index into the plate's findings.
    """

    window_wanted = Signal(float, float)
    range_brushed = Signal(float, float)
    depth_chosen = Signal(float, bool)
    finding_chosen = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(look, parent)
        self._press: _Press | None = None
        self.setMouseTracking(True)

    def _want(self, window: Window) -> None:
        if window != self._window:
            self.window_wanted.emit(*window)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self._framed = False
        self.update()
        if event.button() != Qt.MouseButton.LeftButton or self._plate is None:
            return
        at, frame = event.position(), self.frame()
        part = self.part_at(at.x(), at.y())
        mark = self.mark_at(at.x(), at.y())
        window = self._window
        if part is None:
            columns = self._kept(self._plate, frame).columns
            if at.x() < columns.names - 4 or not frame.top <= at.y() <= frame.base:
                return
            # Beside the bracket: it comes to the pointer, and stays in its hand.
            part, window = MOVE, self._limits().about(window, depth_at(frame, at.y()))
            self._want(window)
        rows = dict(zip((TOP, BASE), grip_rows(frame, window), strict=True))
        held = Qt.KeyboardModifier.ShiftModifier | Qt.KeyboardModifier.ControlModifier
        self._press = _Press(
            part=part,
            at=at,
            offset=rows.get(part, at.y()) - at.y(),
            window=window,
            finding=-1 if mark is None else mark.finding,
            extend=bool(event.modifiers() & held),
        )
        self._shape_cursor(at)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        press, at = self._press, event.position()
        if press is None or self._plate is None:
            self._shape_cursor(at)
            return
        if not press.moved and abs(at.y() - press.at.y()) < DRAG_FROM:
            return
        press.moved = True
        frame = self.frame()
        per_px = (frame.depth_base - frame.depth_top) / (frame.base - frame.top)
        if press.part in (TOP, BASE):
            depth = frame.depth_top + (at.y() + press.offset - frame.top) * per_px
            self._want(self._limits().resized(press.window, press.part, depth))
        elif press.part == MOVE:
            self._want(self._limits().moved(press.window, (at.y() - press.at.y()) * per_px))
        elif press.part == BRUSH:
            first, last = sorted(depth_at(frame, y) for y in (press.at.y(), at.y()))
            self._brushed = (first, last)
            self.range_brushed.emit(first, last)
            self.update()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        press, self._press, self._brushed = self._press, None, None
        if press is None or event.button() != Qt.MouseButton.LeftButton:
            return
        if not press.moved and press.part == BRUSH:
            self.depth_chosen.emit(depth_at(self.frame(), press.at.y()), press.extend)
        elif not press.moved and press.part == FINDING:
            self.finding_chosen.emit(press.finding)
        self._shape_cursor(event.position())
        self.update()

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        frame, at = self.frame(), event.position()
        inside = frame.top - 8 <= at.y() <= frame.base + 8
        if self._plate is not None and inside and self.part_at(at.x(), at.y()) != FINDING:
            self._want(self._limits().whole)

    def wheelEvent(self, event: QWheelEvent) -> None:
        frame, y = self.frame(), event.position().y()
        turned = event.angleDelta().y() or event.angleDelta().x()
        if self._plate is None or not turned or not frame.top <= y <= frame.base:
            event.ignore()
            return
        notches = turned / NOTCH
        if event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            length = self._window[1] - self._window[0]
            self._want(self._limits().moved(self._window, -notches * STEP * length))
        else:
            self._want(self._limits().zoomed(self._window, depth_at(frame, y), ZOOM**-notches))
        event.accept()

    def _shape_cursor(self, at: QPointF) -> None:
        part = self._press.part if self._press else self.part_at(at.x(), at.y())
        hand = Qt.CursorShape.ClosedHandCursor if self._press else Qt.CursorShape.OpenHandCursor
        shapes = {
            TOP: Qt.CursorShape.SizeVerCursor,
            BASE: Qt.CursorShape.SizeVerCursor,
            MOVE: hand,
            FINDING: Qt.CursorShape.PointingHandCursor,
        }
        self.setCursor(shapes.get(part or "", Qt.CursorShape.ArrowCursor))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        limits, window = self._limits(), self._window
        length = window[1] - window[0]
        key = event.key()
        steps = {
            Qt.Key.Key_Up: -STEP,
            Qt.Key.Key_Down: STEP,
            Qt.Key.Key_PageUp: -PAGE,
            Qt.Key.Key_PageDown: PAGE,
        }
        zooms = {
            Qt.Key.Key_Plus: 1 / ZOOM,
            Qt.Key.Key_Equal: 1 / ZOOM,
            Qt.Key.Key_Minus: ZOOM,
        }
        if key == Qt.Key.Key_Escape and self._press is not None:
            # What was dragged goes back to where it was; a brush ends where it is.
            if self._press.part in (TOP, BASE, MOVE):
                self._want(self._press.window)
            self._press, self._brushed = None, None
        elif self._plate is None or event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            super().keyPressEvent(event)
            return
        elif key in steps:
            self._want(limits.moved(window, steps[Qt.Key(key)] * length))
        elif key in zooms:
            self._want(limits.zoomed(window, (window[0] + window[1]) / 2, zooms[Qt.Key(key)]))
        elif key == Qt.Key.Key_Home:
            self._want(limits.whole)
        else:
            super().keyPressEvent(event)
            return
        self._framed = True
        self.update()

    def focusInEvent(self, event: QFocusEvent) -> None:
        by_key = (Qt.FocusReason.TabFocusReason, Qt.FocusReason.BacktabFocusReason, Qt.FocusReason.ShortcutFocusReason)
        self._framed = event.reason() in by_key or (self._framed and event.reason() != Qt.FocusReason.MouseFocusReason)
        self.update()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self._press, self._brushed = None, None
        self.update()
