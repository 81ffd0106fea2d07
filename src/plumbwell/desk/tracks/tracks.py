"""The tracks under hand and keyboard: zoomed, panned, brushed, pointed at, chosen from.

They ask for depth windows, brushed depths and chosen points by signals and show what they are told; they hold no
survey.
"""

from __future__ import annotations

from collections.abc import MutableMapping
from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QEvent, QPointF, Qt, Signal
from PySide6.QtGui import QContextMenuEvent, QKeyEvent, QMouseEvent, QWheelEvent
from PySide6.QtWidgets import QMenu, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.tracks.track_view import TrackView
from plumbwell.desk.tracks.track_window import held, whole_window, zoomed
from plumbwell.plates.track import Track
from plumbwell.plates.track_marks import Span

ZOOM_STEP, KEY_ZOOM = 1.2, 1.5
PAGE = 0.8
# Px that the pointer moves before a press becomes a drag, and px about a point in which it is hovered.
DRAG_FROM, HOVER_REACH = 4, 10
EXTENDING = Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier


@dataclass(slots=True, kw_only=True)
class _Drag:
    """A pressed button: where, over which window, and whether it pans the window or brushes depths."""

    button: Qt.MouseButton
    pressed: QPointF
    window: Span
    pans: bool
    moved: bool = False


class Tracks(TrackView):
    """Tracks side by side over one depth axis.

    Parameters
    ----------
    look : Look
    parent : QWidget or None
    memory : MutableMapping or None
        Keeps which tracks a person chose, by stage.

    Signals
    -------
    window_wanted
        Depths from and to that a person wants in view.
    depth_hovered
        The depth under the pointer; None when it leaves.
    range_brushed
        Depths from and to of a drag.
    point_chosen
        Depth of the point, bar or middle of the step that was clicked, and whether the selection is extended.
    walked
        -1 for the row above, 1 for the row below.
    """

    window_wanted = Signal(float, float)
    depth_hovered = Signal(object)
    range_brushed = Signal(float, float)
    point_chosen = Signal(float, bool)
    walked = Signal(int)

    def __init__(
        self, look: Look, parent: QWidget | None = None, *, memory: MutableMapping[str, object] | None = None
    ) -> None:
        super().__init__(look, parent, memory=memory)
        self._drag: _Drag | None = None
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)

    def _depth_at(self, y: float) -> float:
        axis = self._places().axis
        held_y = min(max(y, axis.top), axis.base)
        return axis.depth_top + (held_y - axis.top) / (axis.base - axis.top) * (axis.depth_base - axis.depth_top)

    def _want(self, window: Span) -> None:
        if window != self._scene.window:
            self.window_wanted.emit(*window)

    def _pan(self, shift: float, window: Span) -> None:
        moved = (window[0] + shift, window[1] + shift)
        self._want(held(moved, self._scene.measured, self._scene.unit))

    def _zoom(self, factor: float, depth: float) -> None:
        scene = self._scene
        self._want(zoomed(scene.window, factor, depth, scene.measured, scene.unit))

    def fit_depth(self) -> None:
        """Ask for the whole measured range."""
        self._want(whole_window(self._scene.measured, self._scene.unit))

    def _track_at(self, x: float) -> int | None:
        places = self._places()
        return places.track_at(x) if x > places.axis.right else None

    def wheelEvent(self, event: QWheelEvent) -> None:
        turned = event.angleDelta().y() or event.angleDelta().x()
        if not turned:
            event.ignore()
            return
        factor = ZOOM_STEP ** (-turned / 120.0)
        at, places = event.position(), self._places()
        if event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            index = self._track_at(at.x())
            if index is not None:
                track = self._scene.tracks[index]
                self._scales.zoom(track, factor, track.value_at(at.x(), places.tracks[index]))
                self._tracks_changed()
        elif at.y() >= places.axis.top:
            self._zoom(factor, self._depth_at(at.y()))
        event.accept()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        at, places = event.position(), self._places()
        left = event.button() == Qt.MouseButton.LeftButton
        if self._drag is not None or at.y() < places.axis.top or not (
            left or event.button() == Qt.MouseButton.MiddleButton
        ):
            return
        pans = not left or at.x() <= places.axis.right
        self._drag = _Drag(button=event.button(), pressed=at, window=self._scene.window, pans=pans)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        at = event.position()
        if self._drag is None:
            self._hover(at)
            return
        drag, axis = self._drag, self._places().axis
        drag.moved = drag.moved or abs(at.y() - drag.pressed.y()) >= DRAG_FROM
        if not drag.moved:
            return
        if drag.pans:
            length = drag.window[1] - drag.window[0]
            self._pan((drag.pressed.y() - at.y()) / (axis.base - axis.top) * length, drag.window)
        else:
            ends = (self._depth_at(drag.pressed.y()), self._depth_at(at.y()))
            self._band = (min(ends), max(ends))
            self._hover(at)
            self.update()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        drag, band = self._drag, self._band
        if drag is None or event.button() != drag.button:
            return
        self._drag = self._band = None
        if band is not None:
            self.update()
            self.range_brushed.emit(*band)
        elif not drag.pans and not drag.moved:
            self._choose(drag.pressed, bool(event.modifiers() & EXTENDING))
        if not self.rect().contains(event.position().toPoint()):
            self._leave()

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        if event.button() != Qt.MouseButton.LeftButton:
            return
        at = event.position()
        if at.y() >= self._places().axis.top:
            self.fit_depth()
            return
        index = self._track_at(at.x())
        if index is not None:
            self.fit_values(self._scene.tracks[index].title)

    def leaveEvent(self, event: QEvent) -> None:
        if self._drag is None:
            self._leave()

    def _leave(self) -> None:
        self.set_hovered(None)
        if self._crosshair is not None:
            self.set_crosshair(None)
            self.depth_hovered.emit(None)

    def _hover(self, at: QPointF) -> None:
        """Show the crosshair under the pointer, grow the point near it, and tell the depth."""
        places = self._places()
        if at.y() < places.axis.top:
            self._leave()
            return
        depth = self._depth_at(at.y())
        index = self._track_at(at.x())
        near = None if index is None else self._nearest(self._scene.tracks[index], depth)
        reach = self.look.theme.px(HOVER_REACH)
        self.set_hovered(near if near is not None and abs(places.axis.y(near) - at.y()) <= reach else None)
        self.set_crosshair(depth)
        self.depth_hovered.emit(depth)

    @staticmethod
    def _nearest(track: Track, depth: float) -> float | None:
        """Return the depth of the point or bar of a track that is nearest to a depth."""
        depths = track.depths()
        return float(depths[np.abs(depths - depth).argmin()]) if len(depths) else None

    def _choose(self, at: QPointF, extends: bool) -> None:
        depth, index = self._depth_at(at.y()), self._track_at(at.x())
        if index is None:
            return
        track = self._scene.tracks[index]
        columns = track.step_columns
        around = np.flatnonzero((columns.top <= depth) & (depth <= columns.base))
        if len(around):
            depth = float((columns.top[around[0]] + columns.base[around[0]]) / 2)
        else:
            nearest = self._nearest(track, depth)
            depth = depth if nearest is None else nearest
        self.point_chosen.emit(depth, extends)

    # The keyboard

    def keyPressEvent(self, event: QKeyEvent) -> None:
        key, (top, base) = event.key(), self._scene.window
        middle = (top + base) / 2 if self._crosshair is None else min(max(self._crosshair, top), base)
        if key in (Qt.Key.Key_Up, Qt.Key.Key_Down):
            self.walked.emit(-1 if key == Qt.Key.Key_Up else 1)
        elif key in (Qt.Key.Key_PageUp, Qt.Key.Key_PageDown):
            self._pan((-PAGE if key == Qt.Key.Key_PageUp else PAGE) * (base - top), (top, base))
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self._zoom(1 / KEY_ZOOM, middle)
        elif key == Qt.Key.Key_Minus:
            self._zoom(KEY_ZOOM, middle)
        elif key == Qt.Key.Key_Home:
            self.fit_depth()
        elif key == Qt.Key.Key_Escape and self._drag is not None:
            self._drag = self._band = None
            self.update()
        else:
            super().keyPressEvent(event)

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        self.menu().popup(event.globalPos())

    def menu(self) -> QMenu:
        """Return a menu to choose tracks and to fit depth and values; it goes when it is closed."""
        menu = QMenu(self)
        choices = self.track_choices()
        shown = [title for title, is_shown in choices if is_shown]
        for title, is_shown in choices:
            action = menu.addAction(title.replace("&", "&&"))
            action.setCheckable(True)
            action.setChecked(is_shown)
            # The last one stays: a stage without any track would show nothing to bring it back from.
            action.setEnabled(shown != [title])
            wanted = [other for other in shown if other != title] if is_shown else [*shown, title]
            action.triggered.connect(lambda _checked=False, wanted=wanted: self.choose_tracks(wanted))
        menu.addSeparator()
        menu.addAction("Whole depth").triggered.connect(self.fit_depth)
        menu.addAction("Whole scales").triggered.connect(lambda: self.fit_values())
        menu.aboutToHide.connect(menu.deleteLater)
        return menu
