"""What the tracks show: tracks over one depth axis, the selection, a crosshair and its read-out, painted.

What is painted comes from `plumbwell.plates`; layers that stay are kept in `track_layers`. What hand
and keyboard do is left to `tracks`.
"""

from __future__ import annotations

from collections.abc import MutableMapping, Sequence
from dataclasses import replace

from PySide6.QtCore import QRect, QRectF, QSize, Qt
from PySide6.QtGui import QFocusEvent, QPainter, QPaintEvent, QPixmap, QRegion, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import draw_focus
from plumbwell.desk.tracks.track_layers import Layers, Places, TrackScene, heads_of, layers_of, places_of
from plumbwell.desk.tracks.track_scales import ValueScales
from plumbwell.plates.axis import axis_width, head_height, number_boxes, numbered_depths, track_graduation
from plumbwell.plates.numbers import counted, number, step_decimals
from plumbwell.plates.painting import hairline_across, painting
from plumbwell.plates.track import Track
from plumbwell.plates.track_marks import (
    BAR_REACH,
    READOUT_LINE,
    TAG_HEIGHT,
    Span,
    draw_chosen_steps,
    draw_depth_tag,
    draw_hovered,
    draw_readout,
    draw_rings,
    draw_selection_bands,
    knocked_out,
    merged_spans,
    placed_readout,
)
from plumbwell.plates.track_readout import told
from plumbwell.plates.track_row import least_widths, track_gap

STALE_OPACITY = 0.5


class TrackView(QWidget):
    """Tracks side by side over one depth axis, as they are shown.

    Parameters
    ----------
    look : Look
    parent : QWidget or None
    memory : MutableMapping or None
        Keeps which tracks a person chose, by stage.
    """

    def __init__(
        self, look: Look, parent: QWidget | None = None, *, memory: MutableMapping[str, object] | None = None
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.memory: MutableMapping[str, object] = {} if memory is None else memory
        self._all: tuple[Track, ...] = ()
        self._stage = ""
        self._scene = TrackScene()
        self._scales = ValueScales()
        self._narrow = False
        self._stale = False
        self._said = ""
        self._crosshair: float | None = None
        self._hovered: float | None = None
        self._band: Span | None = None
        self._kept: tuple[Places, Layers] | None = None
        self._heads: tuple[tuple[object, ...], QPixmap] | None = None
        self._laid_out = QSize()
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self.setAccessibleName("tracks")
        look.changed.connect(self._look_changed)
        self._describe()

    def set_tracks(
        self,
        tracks: Sequence[Track],
        *,
        depth_label: str,
        unit: str,
        upward: bool,
        stations: Sequence[float],
        markers: Sequence[tuple[str, float]],
        measured: tuple[float, float],
        stage: str = "",
    ) -> None:
        """Show tracks.

        Parameters
        ----------
        tracks : sequence of Track
            In order from the left; their titles are unlike.
        depth_label, unit : str
            What depth is ("MD", "TVD", "elevation") and its unit ("m", "ft").
        upward : bool
            Written numbers are minus the depths.
        stations : sequence of float
            Depths of stations.
        markers : sequence of (str, float)
            Tops of layers.
        measured : tuple of float
            Depths from and to which there are values.
        stage : str
            What the choice of tracks is remembered by.
        """
        self._all, self._stage = tuple(tracks), stage
        self._scene = replace(
            self._scene,
            depth_label=depth_label,
            unit=unit,
            upward=upward,
            stations=tuple(stations),
            markers=tuple(markers),
            measured=measured,
        )
        self._tracks_changed()

    def set_window(self, top: float, base: float) -> None:
        """Show the depths from `top` to `base`."""
        if base > top and (top, base) != self._scene.window:
            self._scene = replace(self._scene, window=(top, base))
            self._repaint_all()

    def set_selection(self, spans: Sequence[Span], stations: Sequence[float] = (), *, said: str = "") -> None:
        """Show what is selected.

        Parameters
        ----------
        spans : sequence of (float, float)
            Depths from and to; equal ones are a line. Those that touch become one band.
        stations : sequence of float
            Depths of the stations whose points get a ring.
        said : str
            The selection in words for those who hear it, as "interval 28"; by default its depths.
        """
        self._scene = replace(self._scene, spans=tuple(merged_spans(spans)), lit=tuple(stations))
        self._said = said
        self._describe()
        self.update()

    def set_crosshair(self, depth: float | None) -> None:
        """Show the crosshair at a depth, or none."""
        if depth != self._crosshair:
            self._update_about(self._crosshair)
            self._crosshair = depth
            self._update_about(depth)
            self._describe()

    def set_hovered(self, depth: float | None) -> None:
        """Show the points at a depth grown, or none."""
        if depth != self._hovered:
            self._update_about(self._hovered)
            self._hovered = depth
            self._update_about(depth)

    def set_narrow(self, narrow: bool) -> None:
        """Show only the tracks that stay where there is little room, unless a person chose otherwise."""
        if narrow != self._narrow:
            self._narrow = narrow
            self._tracks_changed()

    def set_stale(self, stale: bool) -> None:
        """Show the curves at half strength until new ones arrive."""
        if stale != self._stale:
            self._stale = stale
            self.update()

    @property
    def depth_window(self) -> Span:
        """Depths in view."""
        return self._scene.window

    def track_choices(self) -> list[tuple[str, bool]]:
        """Return the title of every track and whether it is shown."""
        shown = {track.title for track in self._chosen()}
        return [(track.title, track.title in shown) for track in self._all]

    def choose_tracks(self, titles: Sequence[str]) -> None:
        """Show the tracks with these titles, in their order of old; remembered for the stage."""
        wanted = set(titles)
        if any(track.title in wanted for track in self._all):
            kept = dict(self._choice())
            kept.update({track.title: track.title in wanted for track in self._all})
            self.memory[self._memory_key()] = kept
            self._tracks_changed()

    def _memory_key(self) -> str:
        return f"tracks/{self._stage}"

    def _choice(self) -> dict[str, bool]:
        kept = self.memory.get(self._memory_key())
        if not isinstance(kept, dict):
            return {}
        return {str(title): bool(shown) for title, shown in kept.items()}

    def _chosen(self) -> tuple[Track, ...]:
        """Return the tracks to show: as chosen, else those that have room; never none."""
        choice = self._choice()
        roomy = not any(track.narrow for track in self._all) or not (self._narrow or self._crowded(self._all))
        chosen = [track for track in self._all if choice.get(track.title, roomy or track.narrow)] or list(self._all)
        # Where even those have no room, the least of them that nobody asked for goes.
        while len(chosen) > 1 and self._crowded(chosen):
            unasked = [track for track in reversed(chosen) if track.title not in choice]
            if not unasked:
                break
            chosen.remove(min(unasked, key=lambda track: track.weight))
        return tuple(chosen)

    def _crowded(self, tracks: Sequence[Track]) -> bool:
        """Return whether the titles of tracks have no room side by side."""
        theme, across = self.look.theme, self._places().across
        gaps = track_gap(theme) * (len(tracks) - 1)
        return sum(least_widths(theme, tracks)) + gaps > across.right - across.left

    def _tracks_changed(self) -> None:
        self._kept = None
        self._scene = replace(self._scene, tracks=tuple(self._scales.applied(self._chosen())))
        self._repaint_all()

    def fit_values(self, title: str | None = None) -> None:
        """Give the value scale of a track, or of all, back its own ends."""
        self._scales.fit(title)
        self._tracks_changed()

    def _look_changed(self) -> None:
        self.updateGeometry()
        self._tracks_changed()

    def _repaint_all(self) -> None:
        self._kept = None
        self._describe()
        self.update()

    def _places(self) -> Places:
        return self._kept[0] if self._kept is not None else places_of(self._scene, self.look.theme, self.size())

    def _layers(self) -> tuple[Places, Layers]:
        ratio = self.devicePixelRatioF()
        if self._kept is None or self._kept[1].ground.devicePixelRatio() != ratio:
            theme = self.look.theme
            places = places_of(self._scene, theme, self.size())
            key = (self._scene.tracks, theme, self.width(), self.height(), ratio, places.across.left)
            if self._heads is None or self._heads[0] != key:
                self._heads = key, heads_of(self._scene, theme, places, self.size(), ratio)
            self._kept = places, layers_of(self._scene, theme, places, self.size(), ratio, self._heads[1])
        return self._kept

    def _update_about(self, depth: float | None) -> None:
        """Paint anew the rows about a depth: crosshair, tag, and the lines of the read-out above or below."""
        if depth is not None:
            y = self._places().axis.y(depth)
            lines = 3 + max((len(track.lines) for track in self._scene.tracks), default=0)
            reach = self.look.theme.px(TAG_HEIGHT) + lines * self.look.theme.px(READOUT_LINE)
            top = int(max(min(y - reach, self.height()), -1))
            self.update(QRect(0, top, self.width(), int(min(y + reach, self.height() + 1)) - top + 1))

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, scene = self.look.theme, self._scene
        places, layers = self._layers()
        body = places.axis.across(0.0, float(self.width()))
        with painting(self) as painter:
            painter.drawPixmap(0, 0, layers.ground)
            bands = scene.spans if self._band is None else (*scene.spans, self._band)
            numbers = number_boxes(theme, places.axis, scene.measured) if bands else ()
            draw_selection_bands(painter, body, theme, bands, spared=numbers)
            painter.setOpacity(STALE_OPACITY if self._stale else 1.0)
            painter.drawPixmap(0, 0, layers.curves)
            painter.setOpacity(1.0)
            depth = self._crosshair if self._crosshair is not None and self._in_view(self._crosshair) else None
            readouts = [
                [] if depth is None else placed_readout(track, own, theme, depth)
                for track, own in zip(scene.tracks, places.tracks, strict=True)
            ]
            crossed = [knocked_out(one.box) for row in readouts for one in row]
            if depth is not None:
                crossed.append(QRectF(places.axis.right, body.y(depth) - 2, body.right - places.axis.right, 4))
            self._draw_names(painter, layers, crossed)
            for track, own in zip(scene.tracks, places.tracks, strict=True):
                draw_chosen_steps(painter, track, own, theme, scene.spans)
                if self._hovered is not None:
                    draw_hovered(painter, track, own, theme, self._hovered)
                draw_rings(painter, track, own, theme, scene.lit)
            if depth is not None:
                y = body.y(depth)
                hairline_across(painter, places.axis.right, body.right, y, theme.colour("ink"))
                for placed, own in zip(readouts, places.tracks, strict=True):
                    draw_readout(painter, placed, own, theme, spans=bands)
                draw_depth_tag(
                    painter,
                    places.axis,
                    theme,
                    self._depth_words(depth),
                    depth=depth,
                    numbered=numbered_depths(places.axis, scene.measured),
                    spans=bands,
                )
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))

    def _in_view(self, depth: float) -> bool:
        return self._scene.window[0] <= depth <= self._scene.window[1]

    def _draw_names(self, painter: QPainter, layers: Layers, crossed: Sequence[QRectF]) -> None:
        """Draw axis and names, without the names that read-out or crosshair would cover in part."""
        hidden = [box for box in layers.names if any(box.intersects(other) for other in crossed)]
        painter.save()
        if hidden:
            region = QRegion(self.rect())
            for box in hidden:
                region = region.subtracted(QRegion(box.toAlignedRect()))
            painter.setClipRegion(region, Qt.ClipOperation.IntersectClip)
        painter.drawPixmap(0, 0, layers.words)
        painter.restore()

    def _depth_words(self, depth: float, unit: bool = False) -> str:
        """Return a depth as written: one decimal, more where the axis is graduated finer."""
        axis = self._places().axis
        graduation = track_graduation(axis.depth_base - axis.depth_top, axis.base - axis.top)
        words = number(axis.number_of(depth), max(1, step_decimals(graduation.step)))
        return f"{words} {self._scene.unit} {self._scene.depth_label}" if unit else words

    def _describe(self) -> None:
        """Say in words what is shown."""
        scene = self._scene
        count = len(scene.tracks)
        if not count:
            self.setAccessibleDescription("no tracks")
            return
        axis = self._places().axis
        graduation = track_graduation(axis.depth_base - axis.depth_top, axis.base - axis.top)
        ends = [number(axis.number_of(depth), step_decimals(graduation.step)) for depth in scene.window]
        kind = f"{scene.unit} {scene.depth_label}"
        parts = [counted(count, "track"), f"{ends[0]} to {ends[1]} {kind}"]
        if scene.spans:
            top, base = scene.spans[0]
            depths = self._depth_words(top) if top == base else f"{self._depth_words(top)} to {self._depth_words(base)}"
            more = f" and {len(scene.spans) - 1} more" if len(scene.spans) > 1 else ""
            parts.append(f"{self._said or f'{depths} {kind}{more}'} chosen")
        words = ", ".join(parts)
        if self._crosshair is not None:
            reach = BAR_REACH * (scene.window[1] - scene.window[0]) / max(self.height(), 1)
            values = (told(track, self._crosshair, reach=reach) for track in scene.tracks)
            here = "; ".join(filter(None, values))
            words += f". At {self._depth_words(self._crosshair, unit=True)}: {here or 'no value'}"
        self.setAccessibleDescription(words)

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(theme.px(600), head_height(theme) + theme.px(400))

    def minimumSizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(axis_width(theme) + track_gap(theme) + theme.px(120), head_height(theme) + theme.px(60))

    def resizeEvent(self, event: QResizeEvent) -> None:
        if self.size() != self._laid_out:
            self._laid_out = self.size()
            self._tracks_changed()
        super().resizeEvent(event)

    def focusInEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusInEvent(event)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self.update()
        super().focusOutEvent(event)
