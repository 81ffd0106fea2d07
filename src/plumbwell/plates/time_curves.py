"""What the panels of plots against time hold: bands, drift lines, joined repeats, points and wedges.

Nothing is drawn outside a panel. Words, tares and what is chosen are left to `plumbwell.plates.time_words`, since
curves that wait for new values are paled and words never are.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.plates.axis import Frame
from plumbwell.plates.painting import fill_shape, hairline_across, polygon, rectangle, smooth_line, stroke_shape, whole
from plumbwell.plates.polyline import inside_pieces
from plumbwell.plates.run_marks import (
    REACH,
    draw_left_out,
    draw_run_marks,
    draw_wedge,
    draw_whiskers,
    run_role,
)
from plumbwell.plates.theme import Theme
from plumbwell.plates.time_axis import Panel
from plumbwell.plates.time_frame import TimeLayout
from plumbwell.plates.time_plot import (
    DriftLine,
    Floats,
    Indexes,
    RepeatLink,
    RunPanel,
    TimePlot,
    known_sds,
    told_extremes,
)
from plumbwell.plates.upright_axis import UprightScale

BAND_ALPHA = 38
SMALL_REACH, DRIFT_LINE = 2.4, 1.4
WHISKER_GAP, FULL_GAP = 3.0, 5.5
LINK_DASHES = (4, 3)


def panel_columns(panel: Panel, times: Floats) -> Floats:
    """Return the px columns of many times."""
    return panel.left + (times - panel.first) * panel.scale


def scale_rows(scale: UprightScale, values: Floats) -> Floats:
    """Return the px rows of many values."""
    return scale.base - (values - scale.low) / (scale.high - scale.low) * (scale.base - scale.top)


def panel_pairs(layout: TimeLayout, plot: TimePlot) -> list[tuple[Panel, RunPanel]]:
    """Return the panels in view with what the plot shows in them."""
    by_run = {run.run_index: run for run in plot.panels}
    return [(panel, by_run[panel.span.run_index]) for panel in layout.axis.shown() if panel.span.run_index in by_run]


def _box(panel: Panel, scale: UprightScale) -> Frame:
    return Frame(
        left=panel.left, right=panel.right, top=scale.top, base=scale.base, depth_top=scale.top, depth_base=scale.base
    )


def _line_places(
    panel: Panel, line: DriftLine, scale: UprightScale, bars: float
) -> tuple[Floats, Floats, Floats | None]:
    """Return columns, rows and half band width in px of a drift line, at no more places than its px columns."""
    x = panel_columns(panel, np.array(line.times, dtype=np.float64))
    every = max(int(len(x) / max(float(np.ptp(x)), 2.0)), 1)
    kept = np.union1d(np.arange(0, len(x), every), [len(x) - 1])
    a_px = (scale.base - scale.top) / (scale.high - scale.low)
    reach = None if line.band is None else bars * a_px * np.array(line.band, dtype=np.float64)[kept]
    return x[kept], scale_rows(scale, np.array(line.values, dtype=np.float64)[kept]), reach


def _draw_lines(painter: QPainter, theme: Theme, panel: Panel, run: RunPanel, scale: UprightScale) -> None:
    """Draw the bands of drift lines, then the lines."""
    bands = QPainterPath()
    lines = [_line_places(panel, line, scale, theme.reach) for line in run.lines]
    for x, y, reach in lines:
        if reach is not None and len(x) > 1:
            columns, upper, lower = x.tolist(), (y - reach).tolist(), (y + reach).tolist()
            edges = zip([*columns, *reversed(columns)], [*upper, *reversed(lower)], strict=True)
            bands.addPath(polygon(*edges))
    inside = rectangle(panel.left, scale.top, panel.right, scale.base)
    fill_shape(painter, bands.intersected(inside), theme.colour("ink", BAND_ALPHA))
    for x, y, _ in lines:
        for piece_x, piece_y in inside_pieces(x, y, _box(panel, scale)):
            if np.ptp(piece_y) == 0:
                left, right = float(piece_x[0]), float(piece_x[-1])
                hairline_across(painter, left, right, float(piece_y[0]), theme.colour("ink"), theme.hairline)
                continue
            places = list(zip(piece_x.tolist(), piece_y.tolist(), strict=True))
            smooth_line(painter, places, theme.colour("ink"), DRIFT_LINE)


def _shown_links(panel: Panel, run: RunPanel, scale: UprightScale) -> list[tuple[RepeatLink, Floats, Floats]]:
    """Return the links that may cross a panel, with the columns and rows of both ends; never to what is left out.

    None where they are more than the px columns: they would only be a veil.
    """
    if not run.links:
        return []
    ends = np.array([(link.first, link.second) for link in run.links], dtype=np.intp)
    x, y = panel_columns(panel, run.points.times[ends]), scale_rows(scale, run.points.values[ends])
    near = (x.max(axis=1) >= panel.left) & (x.min(axis=1) <= panel.right)
    near &= (y.max(axis=1) >= scale.top) & (y.min(axis=1) <= scale.base)
    near &= ~run.points.excluded[ends].any(axis=1)
    shown = np.flatnonzero(near).tolist()
    if len(shown) > panel.right - panel.left:
        return []
    return [(run.links[place], x[place], y[place]) for place in shown]


def _draw_links(painter: QPainter, theme: Theme, panel: Panel, run: RunPanel, scale: UprightScale) -> None:
    """Draw the lines that join repeats, dashed across a tare."""
    solid, dashed = QPainterPath(), QPainterPath()
    for link, x, y in _shown_links(panel, run, scale):
        for columns, rows in inside_pieces(x, y, _box(panel, scale)):
            path = dashed if link.dashed else solid
            path.moveTo(QPointF(float(columns[0]), float(rows[0])))
            path.lineTo(QPointF(float(columns[-1]), float(rows[-1])))
    stroke_shape(painter, solid, theme.colour("strong"), 1)
    stroke_shape(painter, dashed, theme.colour("strong"), 1, LINK_DASHES)


def point_places(panel: Panel, run: RunPanel, scale: UprightScale) -> tuple[Floats, Floats, Indexes]:
    """Return columns and rows in px of all points, and which of them lie in the panel."""
    x, y = panel_columns(panel, run.points.times), scale_rows(scale, run.points.values)
    edge = _left_out_edge(run)
    within = np.isfinite(y) & (x >= panel.left) & (x <= panel.right)
    within &= (y >= scale.top + edge) & (y <= scale.base - edge)
    return x, y, np.flatnonzero(within)


def _left_out_edge(run: RunPanel) -> Floats:
    """Return how far inside the plot each point must lie, px: a cross at the edge would strike through the head."""
    return np.where(run.points.excluded, REACH + 1.0, 0.0)


def point_reach(layout: TimeLayout, plot: TimePlot, scale: UprightScale) -> float:
    """Return the radius of the marks of a plot, px: small where those of any panel would touch."""
    full = all(
        len(point_places(panel, run, scale)[2]) * FULL_GAP <= panel.right - panel.left
        for panel, run in panel_pairs(layout, plot)
    )
    return REACH if full else SMALL_REACH


def _draw_points(
    painter: QPainter, theme: Theme, panel: Panel, run: RunPanel, scale: UprightScale, radius: float
) -> None:
    """Draw whiskers and marks; without whiskers where they would run together, thinned where marks would."""
    x, y, inside = point_places(panel, run, scale)
    points = run.points
    used, left_out = inside[~points.excluded[inside]], inside[points.excluded[inside]]
    width = panel.right - panel.left
    role = run_role(run.run_index)
    if points.sds is not None and len(used) * WHISKER_GAP <= width:
        reach = theme.reach * known_sds(points.sds[used]) / (scale.high - scale.low) * (scale.base - scale.top)
        upper, lower = np.maximum(y[used] - reach, scale.top), np.minimum(y[used] + reach, scale.base)
        rows = zip(x[used].tolist(), upper.tolist(), lower.tolist(), strict=True)
        draw_whiskers(painter, theme, list(rows), role=role)
    if len(used) > width:
        # More than one point to a px column: small squares of the extremes, no shape could be told.
        used = used[told_extremes(x[used], y[used])]
        squares = QPainterPath()
        squares.setFillRule(Qt.FillRule.WindingFill)
        for px, py in zip(x[used].tolist(), y[used].tolist(), strict=True):
            squares.addRect(QRectF(whole(px) - 1, whole(py) - 1, 2, 2))
        painter.fillPath(squares, theme.colour(role))
    else:
        filled = points.repeated[used].tolist()
        places = zip(x[used].tolist(), y[used].tolist(), filled, strict=True)
        draw_run_marks(painter, theme, run.run_index, places, reach=radius)
    if len(left_out) > width:
        left_out = left_out[told_extremes(x[left_out], y[left_out])]
    draw_left_out(painter, theme, list(zip(x[left_out].tolist(), y[left_out].tolist(), strict=True)))


def beyond_scale(
    theme: Theme, panel: Panel, run: RunPanel, scale: UprightScale
) -> list[tuple[float, bool, float, bool]]:
    """Return column, whether above, value and whether left out of what lies beyond the value scale.

    Of neighbours whose numbers would overlap only the farthest away is told.
    """
    points = run.points
    x = panel_columns(panel, points.times)
    y, edge = scale_rows(scale, points.values), _left_out_edge(run)
    outside = np.isfinite(points.values) & ((y < scale.top + edge) | (y > scale.base - edge))
    places = np.flatnonzero(outside & (x >= panel.left) & (x <= panel.right))
    middle = (scale.low + scale.high) / 2
    found: list[tuple[float, bool, float, bool]] = []
    for place in places[np.argsort(-np.abs(points.values[places] - middle))].tolist():
        above = bool(points.values[place] > middle)
        if any(above == other and abs(x[place] - column) < theme.px(48) for column, other, _, _ in found):
            continue
        found.append((float(x[place]), above, float(points.values[place]), bool(points.excluded[place])))
        if len(found) * theme.px(24) > panel.right - panel.left:
            break
    return found


def draw_time_curves(painter: QPainter, plots: Sequence[TimePlot], layout: TimeLayout, theme: Theme) -> None:
    """Draw bands, drift lines, joined repeats, points and the wedges of what lies beyond the value scale."""
    for plot, frame in zip(plots, layout.frames, strict=True):
        reach = point_reach(layout, plot, frame.scale)
        for panel, run in panel_pairs(layout, plot):
            _draw_lines(painter, theme, panel, run, frame.scale)
            _draw_links(painter, theme, panel, run, frame.scale)
            _draw_points(painter, theme, panel, run, frame.scale, reach)
            for x, above, _, left_out in beyond_scale(theme, panel, run, frame.scale):
                edge = frame.scale.top if above else frame.scale.base
                role = "muted" if left_out else run_role(run.run_index)
                draw_wedge(painter, theme, x=x, y=edge, upward=above, role=role)
