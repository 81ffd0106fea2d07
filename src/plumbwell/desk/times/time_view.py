"""Plots against time as the window shows them: layout, layers kept as pictures, what is chosen, hovered or stale.

How a hand moves them is left to `plumbwell.desk.times.time_plots`.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass

from PySide6.QtCore import QRectF, QSize, Qt
from PySide6.QtGui import QFocusEvent, QPaintEvent, QPixmap, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import draw_focus, draw_sentence
from plumbwell.desk.times.time_pointing import PlacedRows, rows_in_time, tares_in_time
from plumbwell.desk.times.time_telling import told
from plumbwell.plates.axis import head_height, title_baseline
from plumbwell.plates.painting import painting
from plumbwell.plates.time_axis import TimeView
from plumbwell.plates.time_curves import draw_time_curves
from plumbwell.plates.time_frame import TimeLayout, draw_time_frame, time_layout
from plumbwell.plates.time_plot import TimePlot, run_spans
from plumbwell.plates.time_words import (
    draw_brushed,
    draw_chosen_rings,
    draw_chosen_time,
    draw_dragged_tare,
    draw_hovered_point,
    draw_tares,
    draw_time_words,
)

Window = tuple[float, float] | None
CLOSEST_VALUES, WIDEST_VALUES = 1e-4, 4.0
STALE_OPACITY = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class TareDrag:
    """A tare under the hand: its key and run, the time it had before, and the one it has now."""

    key: int
    run_index: int
    before: float
    time: float


class ShownTimePlots(QWidget):
    """Stacked plots against time, without a hand on them.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional
    """

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look = look
        self._plots: tuple[TimePlot, ...] = ()
        self._weights: tuple[float, ...] = ()
        self._noun = "visit"
        self._named: Callable[[int], str] | None = None
        self._placed: PlacedRows | None = None
        self._rows: frozenset[int] = frozenset()
        self._hovered: int | None = None
        self._empty = ""
        self._stale = False
        self._movable = False
        self._view = TimeView()
        self._windows: tuple[Window, ...] = ()
        self._layout: TimeLayout | None = None
        self._layers: tuple[QPixmap, QPixmap] | None = None
        self._brush: tuple[float, float] | None = None
        self._tare: int | None = None
        self._drag: TareDrag | None = None
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("Plots against time")
        look.changed.connect(self._look_changed)

    def sizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(theme.px(640), theme.px(500))

    def minimumSizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(theme.px(240), theme.px(200))

    def set_plots(
        self,
        plots: Sequence[TimePlot],
        weights: Sequence[float] = (),
        *,
        noun: str = "visit",
        named: Callable[[int], str] | None = None,
    ) -> None:
        """Show other plots, downward. What is in view stays as long as the runs are the same.

        Parameters
        ----------
        plots : sequence of TimePlot
        weights : sequence of float
            Shares of the height; equal ones where there are none.
        noun : str
            What a row is: "visit", "reading".
        named : callable, optional
            Gives a row in words, "visit 33".
        """
        before = [(span.run_index, span.name) for span in run_spans(self._plots)]
        titles = [plot.title for plot in self._plots]
        self._plots, self._weights = tuple(plots), tuple(weights)
        self._noun, self._named, self._placed = noun, named, None
        if before != [(span.run_index, span.name) for span in run_spans(plots)]:
            self._view = TimeView()
            self._windows = ()
        if titles != [plot.title for plot in plots]:
            self._windows = ()
        if self._tare is not None and self._tare not in {tare.key for _, tare in tares_in_time(plots)}:
            self._tare = None
        self._forget()

    def set_selection(self, rows: Collection[int]) -> None:
        """Show rows as chosen; a single one that is out of view is brought into it."""
        wanted = frozenset(int(row) for row in rows if row >= 0)
        if len(wanted) == 1 and wanted != self._rows and self._plots:
            (row,) = wanted
            placed = self.placed_rows()
            place = placed.place_of(row)
            if place is not None:
                axis = self.time_layout().axis
                self._take_view(axis.revealed(int(placed.runs[place]), float(placed.times[place])))
        self._rows = wanted
        self._tell()
        self.update()

    def set_hovered(self, row: int | None) -> None:
        """Show a row as the one that the pointer is at, here or elsewhere."""
        if row != self._hovered:
            self._hovered = row
            self.update()

    def set_empty(self, words: str) -> None:
        """Show no plots, but words that say what to do next."""
        self._empty = words
        self.set_plots(())

    def set_stale(self, stale: bool) -> None:
        """Pale the curves while new values are awaited."""
        if stale != self._stale:
            self._stale = stale
            self._tell()
            self.update()

    def set_tares_movable(self, movable: bool) -> None:
        """Let tares be dragged, moved by keys, removed and added, or only be seen."""
        self._movable = movable
        self._take_tare(self._tare if movable else None)

    def _take_tare(self, key: int | None) -> None:
        """Take the tare that the keys move, or none."""
        self._tare = key
        self._tell()
        self.update()

    def time_layout(self) -> TimeLayout:
        """Return where plots and panels lie, in px of the widget."""
        if self._layout is None:
            self._layout = time_layout(
                self._plots,
                self._look.theme,
                width=self.width(),
                height=self.height(),
                weights=self._weights,
                view=self._view,
                windows=self._windows,
            )
        return self._layout

    def placed_rows(self) -> PlacedRows:
        """Return all rows in order of time."""
        if self._placed is None:
            self._placed = rows_in_time(self._plots)
        return self._placed

    def fit(self) -> None:
        """Bring everything into view."""
        self._windows = ()
        self._take_view(TimeView(), force=True)

    def zoom_time(self, x: float, factor: float) -> None:
        """Zoom the time axis; the time at a px column keeps its place."""
        self._take_view(self.time_layout().axis.zoomed(x, factor))

    def zoom_values(self, y: float, factor: float) -> None:
        """Zoom the values of the plot at a px row; the value there keeps its place."""
        for index, frame in enumerate(self.time_layout().frames):
            scale = frame.scale
            if scale.top <= y <= scale.base:
                fitted = (
                    time_layout(
                        self._plots, self._look.theme, width=self.width(), height=self.height(), weights=self._weights
                    )
                    .frames[index]
                    .scale
                )
                span = (scale.high - scale.low) / factor
                whole = fitted.high - fitted.low
                span = min(max(span, CLOSEST_VALUES * whole), WIDEST_VALUES * whole)
                share = (scale.base - y) / (scale.base - scale.top)
                low = scale.value(y) - share * span
                self._set_window(index, (low, low + span))

    def _set_window(self, index: int, window: Window) -> None:
        windows = [*self._windows, *(None for _ in range(len(self._plots) - len(self._windows)))]
        windows[index] = window
        self._windows = tuple(windows)
        self._forget()

    def _take_view(self, view: TimeView, *, force: bool = False) -> None:
        if force or view != self._view:
            self._view = view
            self._forget()

    def _look_changed(self) -> None:
        self._forget()
        self.updateGeometry()

    def _forget(self) -> None:
        """Lay out and paint anew, since something of what is shown is another one."""
        self._layout = None
        self._layers = None
        self._tell()
        self.update()

    def _tell(self) -> None:
        """Keep the accessible description true."""
        words = self._empty
        if self._plots:
            placed = self.placed_rows()
            words = told(
                self._plots,
                placed.among(self._rows),
                count=len(placed),
                noun=self._noun,
                named=self._named,
                taken=self._tare,
                stale=self._stale,
                panels=self.time_layout().axis.shown() if self._view.zoom > 1.0 else (),
            )
        if words != self.accessibleDescription():
            self.setAccessibleDescription(words)

    # Painting

    def _pixmap(self) -> QPixmap:
        ratio = self.devicePixelRatioF()
        pixmap = QPixmap(QSize(round(self.width() * ratio), round(self.height() * ratio)))
        pixmap.setDevicePixelRatio(ratio)
        return pixmap

    def _drawn_layers(self) -> tuple[QPixmap, QPixmap]:
        """Return frame and curves as pixmaps, painted anew only when what they show is another one."""
        if self._layers is None or self._layers[0].devicePixelRatio() != self.devicePixelRatioF():
            theme, layout = self._look.theme, self.time_layout()
            frame, curves = self._pixmap(), self._pixmap()
            frame.fill(theme.colour("ground"))
            curves.fill(Qt.GlobalColor.transparent)
            with painting(frame) as painter:
                draw_time_frame(painter, self._plots, layout, theme)
            with painting(curves) as painter:
                draw_time_curves(painter, self._plots, layout, theme)
            self._layers = (frame, curves)
        return self._layers

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        if not self._plots:
            self._paint_empty()
            return
        plots, layout = self._plots, self.time_layout()
        frame, curves = self._drawn_layers()
        with painting(self) as painter:
            painter.drawPixmap(0, 0, frame)
            if self._brush is not None:
                draw_brushed(painter, layout, theme, min(self._brush), max(self._brush))
            draw_chosen_time(painter, plots, layout, theme, self._rows)
            painter.setOpacity(STALE_OPACITY if self._stale else 1.0)
            painter.drawPixmap(0, 0, curves)
            painter.setOpacity(1.0)
            if self._hovered is not None:
                draw_hovered_point(painter, plots, layout, theme, self._hovered)
            draw_chosen_rings(painter, plots, layout, theme, self._rows)
            dragged = None if self._drag is None else self._drag.key
            draw_tares(painter, plots, layout, theme, chosen=self._tare, without=dragged)
            # Over the tares, whose lines would strike the slopes through.
            draw_time_words(painter, plots, layout, theme, stale=self._stale)
            if self._drag is not None:
                draw_dragged_tare(painter, layout, theme, run_index=self._drag.run_index, time=self._drag.time)
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))

    def _paint_empty(self) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            baseline = head_height(theme) + title_baseline(theme)
            draw_sentence(painter, theme, self._empty, width=self.width(), baseline=baseline)
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._forget()

    def focusInEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusInEvent(event)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusOutEvent(event)
