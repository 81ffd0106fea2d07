"""Paints the curves of a track: staircases and bands, points and whiskers, logs, effect curves, stacked bars.

Names at the curves are left to `plumbwell.plates.naming`, heads and grid to `plumbwell.plates.track_row`. What
leaves the value scale ends at the edge of the track; `plumbwell.plates.excursions` marks it there.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QBrush, QColor, QPainter, QPainterPath

from plumbwell.plates.axis import Frame
from plumbwell.plates.excursions import draw_wedges
from plumbwell.plates.lettering import FILE_DEVICES
from plumbwell.plates.painting import fill_shape, smooth_line, stroke_shape, whole
from plumbwell.plates.polyline import LogPiece, inside_pieces, log_pieces
from plumbwell.plates.shapes import broken_line, draw_line_of, polygon_of, rectangles
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Flags, StepColumns, Track
from plumbwell.survey.column import Array, Index

BAND_ALPHA, SPREAD_ALPHA = 38, 72
LEAST_BAND = 3
MANY_THIN = 20
# Steps to a px row from which a staircase is gathered: more would fill the rows with ink.
CROWDED_STEPS = 2
DISC_RADIUS, SMALL_RADIUS = 3.0, 2.0
# By how many px a sample must stand out from the rows above and below to be inked as a spike.
SPIKE = 16.0
BESIDE_DASHES = (5.0, 3.0)
BESIDE_WIDTH, EFFECT_WIDTH, OUTLINE_WIDTH = 1.2, 1.3, 0.8
BAR_HEIGHT, OUTLINED_BAR = 6, 4
BAR_ROLES = ("ink", "strong", "rule", "ground")


def _draw_bands(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    """Draw the bands of steps; a thin step has a whisker, but where thin steps are many they share a band.

    Many whiskers would run together into a dark block, so each px row of such steps is covered once, from the
    least to the greatest value of the bands in it.
    """
    columns = track.step_columns
    which = columns.shown(frame)
    upper, lower = columns.rows(frame, which)
    thin = lower - upper < LEAST_BAND
    many_thin = int(thin.sum()) > len(which) / MANY_THIN
    reach = theme.reach * columns.sd[which]
    left = track.held_x_of(columns.value[which] - reach, frame)
    right = track.held_x_of(columns.value[which] + reach, frame)
    known = np.isfinite(reach)
    tall = known & ~thin
    boxes = [np.stack([left[tall], upper[tall], right[tall], lower[tall]])]
    if many_thin:
        boxes.append(_shared_rows(upper, lower, left, right, known & thin))
    else:
        middle = (frame.y_of(columns.top[which]) + frame.y_of(columns.base[which])) / 2
        for number in np.flatnonzero(known & thin).tolist():
            y = float(middle[number])
            ends = ((float(left[number]), y), (float(right[number]), y))
            smooth_line(painter, ends, theme.colour("ink"), 1.3)
    painter.fillPath(rectangles(*np.concatenate(boxes, axis=1)), theme.colour("ink", BAND_ALPHA))


def _shared_rows(upper: Index, lower: Index, left: Array, right: Array, which: Flags) -> Array:
    """Return the px rows that thin steps lie in as boxes, from the least to the greatest column of their bands.

    Left edges, upper edges, right edges and lower edges, a column each box.
    """
    if not which.any():
        return np.empty((4, 0))
    first = int(upper[which].min())
    count = int(max(lower[which].max(), upper[which].max() + 1)) - first
    least, most = np.full(count, np.inf), np.full(count, -np.inf)
    for below in range(LEAST_BAND):
        there = which & ((lower - upper > below) | (below == 0))
        rows = upper[there] - first + below
        np.minimum.at(least, rows, left[there])
        np.maximum.at(most, rows, right[there])
    rows = np.flatnonzero(np.isfinite(least))
    return np.stack([least[rows], first + rows, most[rows], first + rows + 1])


def _stair_path(columns: StepColumns, track: Track, frame: Frame) -> QPainterPath:
    """Return a staircase as a line; where steps are crowded, from least to greatest value in each px row."""
    which = columns.shown(frame)
    upper, lower = columns.rows(frame, which)
    x = track.held_x_of(columns.value[which], frame)
    joined = columns.joined[which]
    if not len(which):
        return QPainterPath()
    begins = ~joined
    begins[0] = True
    if len(which) > CROWDED_STEPS * (frame.base - frame.top):
        first = np.flatnonzero(np.diff(upper, prepend=upper[0] - 1))
        last = np.append(first[1:], len(which)) - 1
        least, most = np.minimum.reduceat(x, first), np.maximum.reduceat(x, first)
        row = upper[first]
        columns_of = [x[first], least, most, x[last], x[last]]
        rows_of = [row, row, row, row, np.maximum(lower[last], row + 0.5)]
        begins = begins[first]
    else:
        columns_of, rows_of = [x, x], [upper, np.maximum(lower, upper + 0.5)]
    new = np.zeros((len(begins), len(columns_of)), dtype=bool)
    new[:, 0] = begins
    return broken_line(np.stack(columns_of, axis=1), np.stack(rows_of, axis=1), new)


def _draw_steps(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    _draw_bands(painter, track, frame, theme)
    if track.beside:
        dashes = tuple(length / BESIDE_WIDTH for length in BESIDE_DASHES)
        path = _stair_path(track.beside_columns, track, frame)
        stroke_shape(painter, path, theme.colour("ink"), BESIDE_WIDTH, dashes)
    stroke_shape(painter, _stair_path(track.step_columns, track, frame), theme.colour("ink"), theme.step)


def disc_radius(track: Track, frame: Frame) -> float | None:
    """Return the radius of the discs of a track's points in px; None where they are too crowded for discs."""
    count, height = len(track.point_columns.shown(frame)), frame.base - frame.top
    if count * 3 > height:
        return None
    return DISC_RADIUS if count * 8 <= height else SMALL_RADIUS


def draw_discs(painter: QPainter, theme: Theme, x: Array, y: Array, radius: float) -> None:
    """Draw points: discs of ink, each with a rim of 1 px in ground."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    shapes = []
    for reach, role in ((radius + 1, "ground"), (radius, "ink")):
        disc = QPainterPath()
        disc.addEllipse(QPointF(0.0, 0.0), reach, reach)
        shapes.append((disc, QBrush(theme.colour(role))))
    for column, row in zip(x.tolist(), y.tolist(), strict=True):
        for disc, brush in shapes:
            painter.fillPath(disc.translated(column, row), brush)
    painter.restore()


def _draw_points(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    columns = track.point_columns
    if not len(columns.depth):
        return
    x, y = track.x_of(columns.value, frame), frame.y_of(columns.depth)
    lines = [piece for run in columns.joins(frame) for piece in inside_pieces(x[run], y[run], frame)]
    for piece in lines:
        draw_line_of(painter, *piece, theme.colour("strong"), 1)
    which = columns.shown(frame)
    radius = disc_radius(track, frame)
    reach = theme.reach * columns.sd[which]
    values, rows = columns.value[which], y[which]
    if radius is None:
        reach = np.where(np.isfinite(reach), reach, 0.0)
    left, right = (track.held_x_of(values + side * reach, frame) for side in (-1, 1))
    if radius is None:
        upper = np.floor(rows + 0.5)
        band = rectangles(left, upper, right, upper + 1, fill=Qt.FillRule.WindingFill)
        painter.fillPath(band, theme.colour("ink", BAND_ALPHA))
        for piece in lines:
            draw_line_of(painter, *piece, theme.colour("ink"), 1.2)
        return
    for number in np.flatnonzero(right - left > 2 * radius).tolist():
        row = float(rows[number])
        ends = ((float(left[number]), row), (float(right[number]), row))
        smooth_line(painter, ends, theme.colour("ink"), 1.3)
    inside = which[(x[which] >= frame.left) & (x[which] <= frame.right)]
    draw_discs(painter, theme, x[inside], y[inside], radius)


def _spikes(piece: LogPiece, frame: Frame) -> list[QRectF]:
    """Return the rows in which a gathered log stands far out from the rows above and below, as 1 px lines.

    The spread runs from row to row, and would come to such a row in a tip too fine to be seen.
    """
    if piece.least is None or piece.most is None:
        return []
    low, high = (np.clip(side, frame.left, frame.right) for side in (piece.least, piece.most))
    inf = np.array([np.inf])
    near_high = np.maximum(np.concatenate([-inf, high[:-1]]), np.concatenate([high[1:], -inf]))
    near_low = np.minimum(np.concatenate([inf, low[:-1]]), np.concatenate([low[1:], inf]))
    found = []
    for begin, end in ((near_high, high), (low, near_low)):
        for number in np.flatnonzero(np.isfinite(end - begin) & (end - begin > SPIKE)).tolist():
            x = float(begin[number])
            found.append(QRectF(x, int(piece.y[number]), float(end[number]) - x, 1))
    return found


def _draw_spread(painter: QPainter, pieces: Sequence[LogPiece], frame: Frame, colour: QColor) -> None:
    """Draw the spread of a gathered log: in a file as a smooth shape, on a screen row by row.

    Smoothing so jagged a shape takes a screen longer than all other curves together.
    """
    shape = QPainterPath()
    for piece in pieces:
        if piece.least is None or piece.most is None:
            continue
        low, high = (np.clip(side, frame.left, frame.right) for side in (piece.least, piece.most))
        if isinstance(painter.device(), FILE_DEVICES):
            shape.addPolygon(polygon_of(np.concatenate([low, high[::-1]]), np.concatenate([piece.y, piece.y[::-1]])))
            shape.closeSubpath()
        else:
            rows = np.floor(piece.y)
            shape.addPath(rectangles(low, rows, high, rows + 1))
    if isinstance(painter.device(), FILE_DEVICES):
        fill_shape(painter, shape, colour)
    else:
        painter.fillPath(shape, colour)


def _draw_log(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    """Draw the log; one crowded with samples as its mean line over its paler spread.

    Drawn sample by sample it would be a block of plum in which neither log nor staircase can be seen.
    """
    if track.line is None:
        return
    pieces = log_pieces(track.line, track.low, track.high, frame)
    _draw_spread(painter, pieces, frame, theme.colour("log", SPREAD_ALPHA))
    for piece in pieces:
        for spike in _spikes(piece, frame):
            painter.fillRect(spike, theme.colour("log"))
        for part in inside_pieces(piece.x, piece.y, frame):
            draw_line_of(painter, *part, theme.colour("log"), 1)


def _draw_effects(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    for curve in track.lines:
        columns = curve.columns
        x, y = track.x_of(columns.value, frame), frame.y_of(columns.depth)
        path = QPainterPath()
        for run in columns.joins(frame):
            for piece in inside_pieces(x[run], y[run], frame):
                path.addPolygon(polygon_of(*piece))
        dashes = tuple(length / EFFECT_WIDTH for length in curve.dashes)
        stroke_shape(painter, path, theme.colour("ink"), EFFECT_WIDTH, dashes)


def bar_height(track: Track, frame: Frame) -> int:
    """Return the height of a track's stacked bars in px: 6, less where stations are crowded in the frame."""
    rows = frame.y_of(track.bar_columns.depth[track.bar_columns.shown(frame)])
    closest = float(np.diff(rows).min()) if len(rows) > 1 else BAR_HEIGHT + 2
    return min(max(whole(closest) - 2, 1), BAR_HEIGHT)


def _draw_bars(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    columns = track.bar_columns
    which = columns.shown(frame)
    if not len(which):
        return
    height = bar_height(track, frame)
    top = np.floor(frame.y_of(columns.depth[which]) - height / 2 + 0.5)
    upper, lower = np.maximum(top, frame.top), np.minimum(top + height, frame.base)
    edges = track.held_x_of(columns.edges[which], frame)
    outlines = QPainterPath()
    for number, role in enumerate(BAR_ROLES[: edges.shape[1] - 1]):
        left, right = edges[:, number], edges[:, number + 1]
        # Where stations share px rows, one bar lies over the other instead of doing away with it.
        boxes = rectangles(left, upper, right, lower, fill=Qt.FillRule.WindingFill)
        painter.fillPath(boxes, theme.colour(role))
        there = right > left
        outlines.addPath(rectangles(left[there], upper[there], right[there], lower[there]))
    if height >= OUTLINED_BAR:
        stroke_shape(painter, outlines, theme.colour("ink"), OUTLINE_WIDTH)


def draw_curves(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    """Draw the curves of a track inside its frame: log under staircase, points on top."""
    _draw_log(painter, track, frame, theme)
    _draw_bars(painter, track, frame, theme)
    _draw_steps(painter, track, frame, theme)
    _draw_effects(painter, track, frame, theme)
    _draw_points(painter, track, frame, theme)


def draw_track(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> list[QRectF]:
    """Draw the curves of a track and the wedges at its edges, and return the boxes of the words at the wedges."""
    draw_curves(painter, track, frame, theme)
    return draw_wedges(painter, track, frame, theme)
