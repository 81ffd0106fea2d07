"""What of the tracks stays while the pointer moves, painted once into pixmaps: ground, curves, words.

The selection lies between ground and curves and the crosshair over all of them, so that neither asks for the curves
to be painted anew.
"""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QRectF, QSize, Qt
from PySide6.QtGui import QPainter, QPixmap

from plumbwell.plates.axis import BAR_LEFT, Frame, axis_room, draw_depth_axis, head_height, numbered_depths
from plumbwell.plates.excursions import draw_wedges
from plumbwell.plates.naming import draw_base_name, draw_curve_names, draw_layer_names, draw_origin_names
from plumbwell.plates.painting import hairline_across, painting
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Track
from plumbwell.plates.track_curves import draw_curves
from plumbwell.plates.track_marks import KNOCK_OUT, knocked_out
from plumbwell.plates.track_row import draw_grid, draw_track_head, names_track, track_frames, track_gap

Markers = tuple[tuple[str, float], ...]


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TrackScene:
    """What the tracks show, and which depths of it.

    Parameters
    ----------
    tracks : tuple of Track
        In order from the left.
    depth_label, unit : str
        What depth is ("MD", "TVD", "elevation") and its unit.
    upward : bool
        The written numbers are minus the depths.
    stations : tuple of float
        Depths of stations, for the ticks of the axis.
    markers : tuple of (str, float)
        Tops of layers.
    measured, window : tuple of float
        Depths from and to which there are values, and those in view.
    spans : tuple of (float, float)
        Selected depths in order, none of which touch.
    lit : tuple of float
        Depths of the selected stations.
    """

    tracks: tuple[Track, ...] = ()
    depth_label: str = ""
    unit: str = ""
    upward: bool = False
    stations: tuple[float, ...] = ()
    markers: Markers = ()
    measured: tuple[float, float] = (0.0, 1.0)
    window: tuple[float, float] = (0.0, 1.0)
    spans: tuple[tuple[float, float], ...] = ()
    lit: tuple[float, ...] = ()

    def names_in_view(self) -> Markers:
        """Return names and tops of layers in the window; the layer it begins in is named at its upper edge."""
        top, base = self.window
        ordered = sorted(self.markers, key=lambda marker: marker[1])
        above = [name for name, depth in ordered if depth < top][-1:]
        inside = tuple((name, depth) for name, depth in ordered if top <= depth <= base)
        return (*((name, top) for name in above), *inside)


@dataclass(frozen=True, slots=True, kw_only=True)
class Places:
    """Where axis and tracks lie in the widget, in px: the axis, all tracks together, each track."""

    axis: Frame
    across: Frame
    tracks: tuple[Frame, ...]

    def track_at(self, x: float) -> int | None:
        """Return the number of the track at a px column, in a gap the nearer one; None where there is no track."""
        if not self.tracks:
            return None

        def away(number: int) -> float:
            return max(self.tracks[number].left - x, x - self.tracks[number].right, 0.0)

        return min(range(len(self.tracks)), key=away)


def places_of(scene: TrackScene, theme: Theme, size: QSize) -> Places:
    """Return where axis and tracks lie in a size in px."""
    whole = Frame(
        left=0.0,
        top=float(head_height(theme)),
        right=float(size.width()),
        base=float(max(size.height(), head_height(theme) + 1)),
        depth_top=scene.window[0],
        depth_base=scene.window[1],
        upward=scene.upward,
    )
    axis = whole.across(0.0, float(round(axis_room(theme, whole, scene.measured, scene.depth_label))))
    across = whole.across(axis.right + track_gap(theme) // 2, max(whole.right, axis.right + 1))
    return Places(axis=axis, across=across, tracks=tuple(track_frames(theme, scene.tracks, across)))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Layers:
    """Ground with heads and grid, then curves, then axis and words; the last two are clear where nothing is.

    `names` are the boxes of the words in the tracks.
    """

    ground: QPixmap
    curves: QPixmap
    words: QPixmap
    names: tuple[QRectF, ...]


def _blank(size: QSize, ratio: float, theme: Theme | None) -> QPixmap:
    pixmap = QPixmap(size * ratio)
    pixmap.setDevicePixelRatio(ratio)
    pixmap.fill(theme.colour("ground") if theme is not None else Qt.GlobalColor.transparent)
    return pixmap


def heads_of(scene: TrackScene, theme: Theme, places: Places, size: QSize, ratio: float) -> QPixmap:
    """Return the heads of the tracks and the grid of their values, clear where nothing is.

    They are the same in every depth window.
    """
    heads = _blank(size, ratio, None)
    with painting(heads) as painter:
        for track, own in zip(scene.tracks, places.tracks, strict=True):
            draw_track_head(painter, track, own, theme)
    return heads


def _draw_ground(painter: QPainter, scene: TrackScene, theme: Theme, places: Places, heads: QPixmap) -> None:
    low, high = scene.measured
    draw_grid(
        painter,
        places.across,
        theme,
        depths=numbered_depths(places.axis, scene.measured),
        markers=[depth for _, depth in scene.markers],
        # The ground is where depth is zero; as an elevation that is the level of the sea.
        ground=low < 0 < high and not scene.upward,
    )
    painter.drawPixmap(0, 0, heads)


def _draw_words(painter: QPainter, scene: TrackScene, theme: Theme, places: Places) -> list[QRectF]:
    """Draw axis, names and the line under the heads, and return the boxes of the names."""
    # Over the curves, whose smooth edges would dull it.
    hairline_across(painter, 0, places.across.right, places.axis.top - 1, theme.colour("ink"))
    draw_depth_axis(
        painter,
        places.axis,
        theme,
        label=scene.depth_label,
        unit=scene.unit,
        stations=scene.stations,
        measured=scene.measured,
        inset=BAR_LEFT,
    )
    if not scene.tracks:
        return []
    found: list[QRectF] = []
    names_stand = names_track(scene.tracks)
    for index, (track, own) in enumerate(zip(scene.tracks, places.tracks, strict=True)):
        boxes = draw_wedges(painter, track, own, theme, knock_out=False)
        boxes += draw_base_name(painter, track, own, theme, taken=boxes, knock_out=False)
        boxes += draw_curve_names(painter, track, own, theme, taken=boxes, knock_out=False)
        boxes += draw_origin_names(painter, track, own, theme, knock_out=False)
        if index == names_stand:
            names = scene.names_in_view()
            boxes += draw_layer_names(painter, track, own, theme, markers=names, taken=boxes, knock_out=False)
        found += boxes
    return found


def layers_of(
    scene: TrackScene, theme: Theme, places: Places, size: QSize, ratio: float, heads: QPixmap
) -> Layers:
    """Return the layers of tracks, painted for a size in px and so many device px to each px.

    Behind names the grid and the curves are cleared each in its own layer, so that a selection that lies between the
    two is not.
    """
    ground, curves, words = (_blank(size, ratio, of) for of in (theme, None, None))
    with painting(ground) as painter:
        _draw_ground(painter, scene, theme, places, heads)
    with painting(curves) as painter:
        for track, own in zip(scene.tracks, places.tracks, strict=True):
            draw_curves(painter, track, own, theme)
    with painting(words) as painter:
        boxes = [knocked_out(box) for box in _draw_words(painter, scene, theme, places)]
    with painting(ground) as painter:
        for box in boxes:
            painter.fillRect(box, theme.colour("ground", KNOCK_OUT))
    with painting(curves) as painter:
        painter.setCompositionMode(QPainter.CompositionMode.CompositionMode_DestinationOut)
        for box in boxes:
            painter.fillRect(box, theme.colour("ink", KNOCK_OUT))
    return Layers(ground=ground, curves=curves, words=words, names=tuple(boxes))
