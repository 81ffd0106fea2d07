"""Words, tares and chosen points over the curves of plots against time.

Slopes stand at the foot of their panel under the end of the drift line, tares at their own line with a tag to
drag, and the value of what lies beyond the scale at its wedge. The accent marks what is chosen and nothing else.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QColor, QPainter

from plumbwell.plates.lettering import draw_text, text_box, text_height, text_width
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import fill_shape, hairline_down, polygon, whole
from plumbwell.plates.run_marks import RING_RADIUS, WEDGE, draw_ring, draw_run_marks, run_role
from plumbwell.plates.theme import Theme
from plumbwell.plates.time_axis import MINUTE, Panel, clock
from plumbwell.plates.time_curves import beyond_scale, panel_columns, panel_pairs, point_places, point_reach
from plumbwell.plates.time_frame import TARE_LINE, TimeLayout, tare_lines
from plumbwell.plates.time_plot import TareMark, TimePlot, told_extremes

HOVER_GROWTH = 2.0
TAG_WIDTH, TAG_HEIGHT = 10.0, 14.0


def drawn_tares(plots: Sequence[TimePlot], layout: TimeLayout) -> list[tuple[TareMark, Panel, float]]:
    """Return the tares in view with their panels and px columns, in order of columns; each once."""
    found: dict[int, tuple[TareMark, Panel, float]] = {}
    for plot in plots:
        for panel, run in panel_pairs(layout, plot):
            for tare in run.tares:
                x = panel.x(tare.time)
                if panel.left - 0.5 <= x <= panel.right + 0.5:
                    found.setdefault(tare.key, (tare, panel, x))
    return sorted(found.values(), key=lambda tare: tare[2])


def _thread(painter: QPainter, layout: TimeLayout, x: float, colour: QColor, thick: float) -> None:
    """Draw a line down through all plots and the heads between them, but not across a title."""
    above: float | None = None
    for frame in layout.frames:
        free = above is not None and x > frame.title_right + 3
        hairline_down(
            painter, x, above if free and above is not None else frame.scale.top, frame.scale.base, colour, thick
        )
        above = frame.scale.base


def _draw_tag(painter: QPainter, theme: Theme, x: float, top: float, *, grown: bool) -> None:
    half, height = TAG_WIDTH / 2 + grown, TAG_HEIGHT + 2 * grown
    middle = whole(x) + 0.5
    shape = polygon(
        (middle - half, top),
        (middle + half, top),
        (middle + half, top + height - half),
        (middle, top + height),
        (middle - half, top + height - half),
    )
    fill_shape(painter, shape, theme.colour("accent"))


def draw_tare(painter: QPainter, layout: TimeLayout, theme: Theme, *, x: float, chosen: bool = False) -> None:
    """Draw the line of a tare through all plots and its tag at the top; a chosen one is 2 px and its tag grown."""
    _thread(painter, layout, x, theme.colour("accent"), 2 if chosen else 1)
    _draw_tag(painter, theme, x, layout.top, grown=chosen)


def _draw_tare_words(
    painter: QPainter, layout: TimeLayout, theme: Theme, tare: TareMark, x: float, taken: list[QRectF]
) -> None:
    """Draw a tare's words beside its tag where they overlap no other's; else they are left to the tool tip."""
    first_plot = layout.frames[0].scale
    count = tare_lines(theme, first_plot.base - first_plot.top)
    lines = ((tare.words, "accent"), (clock(tare.time), "muted"))[:count]
    beside = TAG_WIDTH / 2 + theme.px(5)
    for level in range(3):
        first = layout.top + theme.px(TARE_LINE * (1 + count * level))
        for align, at in (("left", x + beside), ("right", x - beside)):
            boxes = [
                text_box(theme, "small", words, x=at, baseline=first + row * theme.px(TARE_LINE), align=align)
                for row, (words, _) in enumerate(lines)
            ]
            whole_box = boxes[0].united(boxes[-1]).adjusted(-2, -2, 2, 2)
            if whole_box.left() < 0 or whole_box.right() > layout.width + 2:
                continue
            if whole_box.bottom() > first_plot.base or any(whole_box.intersects(box) for box in taken):
                continue
            taken.append(whole_box)
            for row, (words, role) in enumerate(lines):
                draw_text(
                    painter,
                    theme,
                    words,
                    x=at,
                    baseline=first + row * theme.px(TARE_LINE),
                    face="small",
                    role=role,
                    align=align,
                    room=(0.0, layout.width),
                    knock_out=True,
                )
            return


def draw_tares(
    painter: QPainter,
    plots: Sequence[TimePlot],
    layout: TimeLayout,
    theme: Theme,
    *,
    chosen: int | None = None,
    without: int | None = None,
) -> None:
    """Draw all tares in view: line, tag, size with its standard deviation, and time of day.

    Parameters
    ----------
    painter, plots, layout, theme
        As for the frame.
    chosen : int, optional
        Key of the tare that the keys move.
    without : int, optional
        Key of a tare that is not drawn, since it is being dragged.
    """
    shown = [tare for tare in drawn_tares(plots, layout) if tare[0].key != without]
    taken = [QRectF(x - TAG_WIDTH / 2, layout.top, TAG_WIDTH, TAG_HEIGHT) for _, _, x in shown]
    for tare, _, x in shown:
        draw_tare(painter, layout, theme, x=x, chosen=tare.key == chosen)
    for tare, _, x in shown:
        _draw_tare_words(painter, layout, theme, tare, x, taken)


def draw_dragged_tare(painter: QPainter, layout: TimeLayout, theme: Theme, *, run_index: int, time: float) -> None:
    """Draw a tare while it is dragged, with the time of day it is at."""
    for panel in layout.axis.shown():
        x = panel.x(time)
        if panel.span.run_index != run_index or not panel.left - 0.5 <= x <= panel.right + 0.5:
            continue
        draw_tare(painter, layout, theme, x=x, chosen=True)
        words, beside = clock(time, seconds=round(time) % MINUTE != 0), TAG_WIDTH / 2 + theme.px(5)
        fits = x + beside + text_width(theme, "small", words) <= layout.width
        draw_text(
            painter,
            theme,
            words,
            x=x + beside if fits else x - beside,
            baseline=layout.top + theme.px(TARE_LINE),
            face="small",
            role="accent",
            align="left" if fits else "right",
            room=(0.0, layout.width),
            knock_out=True,
        )


def shortened_rate(theme: Theme, words: str, room: float) -> str:
    """Return the words of a slope as far as they have room: whole, without the unit, or none; never cut off."""
    without_unit = words.rsplit(maxsplit=1)[0] if words.split() else ""
    for candidate in (words, without_unit):
        if text_width(theme, "small", candidate) <= room:
            return candidate
    return ""


def draw_time_words(
    painter: QPainter, plots: Sequence[TimePlot], layout: TimeLayout, theme: Theme, *, stale: bool = False
) -> None:
    """Draw the slopes of drift lines and the values beyond the scale; `muted` while new values are awaited."""
    for plot, frame in zip(plots, layout.frames, strict=True):
        scale = frame.scale
        for panel, run in panel_pairs(layout, plot):
            spill = (panel.left - layout.axis.gap / 2, panel.right)
            draw_text(
                painter,
                theme,
                shortened_rate(theme, run.rate_words, spill[1] - spill[0]),
                x=panel.right,
                baseline=scale.base - theme.px(8),
                face="small",
                role="muted" if stale else "ink",
                align="right",
                room=spill,
                knock_out=True,
            )
            cap = text_height(theme, "small")
            for x, above, value, left_out in beyond_scale(theme, panel, run, scale):
                words = number(value, plot.decimals, signed=plot.signed)
                width = text_width(theme, "small", words)
                align, at = ("left", x + WEDGE) if x + WEDGE + width <= layout.width else ("right", x - WEDGE)
                draw_text(
                    painter,
                    theme,
                    words,
                    x=at,
                    baseline=scale.top + cap + 4 if above else scale.base - 4,
                    face="small",
                    role="muted" if stale or left_out else run_role(run.run_index),
                    align=align,
                    room=(0.0, layout.width),
                    knock_out=True,
                )


def draw_chosen_time(
    painter: QPainter, plots: Sequence[TimePlot], layout: TimeLayout, theme: Theme, rows: Collection[int]
) -> None:
    """Draw the time of a single chosen row as an accent line through all plots; it lies under the curves."""
    if len(rows) != 1:
        return
    (row,) = rows
    columns: set[int] = set()
    for plot in plots:
        for panel, run in panel_pairs(layout, plot):
            x = panel_columns(panel, run.points.times[run.points.rows == row])
            columns |= {whole(column) for column in x.tolist() if panel.left <= column <= panel.right}
    for column in sorted(columns):
        _thread(painter, layout, column, theme.colour("accent"), 1)


def draw_chosen_rings(
    painter: QPainter, plots: Sequence[TimePlot], layout: TimeLayout, theme: Theme, rows: Collection[int]
) -> None:
    """Draw a ring at each chosen point; where rings would run together they are small, and thinned."""
    wanted = np.fromiter(rows, dtype=np.intp, count=len(rows))
    for plot, frame in zip(plots, layout.frames, strict=True):
        reach = point_reach(layout, plot, frame.scale)
        for panel, run in panel_pairs(layout, plot):
            x, y, inside = point_places(panel, run, frame.scale)
            ringed = inside[np.isin(run.points.rows[inside], wanted)]
            width = panel.right - panel.left
            radius = RING_RADIUS if len(ringed) * RING_RADIUS <= width else reach + 1.5
            if len(ringed) > width / 2:
                ringed = ringed[told_extremes(x[ringed], y[ringed])]
            for place in ringed.tolist():
                draw_ring(painter, theme, x=float(x[place]), y=float(y[place]), radius=radius)


def draw_hovered_point(
    painter: QPainter, plots: Sequence[TimePlot], layout: TimeLayout, theme: Theme, row: int
) -> None:
    """Draw the points of a row grown by 2 px, in every plot that shows it."""
    for plot, frame in zip(plots, layout.frames, strict=True):
        radius = point_reach(layout, plot, frame.scale) + HOVER_GROWTH
        for panel, run in panel_pairs(layout, plot):
            x, y, inside = point_places(panel, run, frame.scale)
            hit = inside[run.points.rows[inside] == row]
            places = zip(x[hit].tolist(), y[hit].tolist(), run.points.repeated[hit].tolist(), strict=True)
            draw_run_marks(painter, theme, run.run_index, places, reach=radius)


def draw_brushed(painter: QPainter, layout: TimeLayout, theme: Theme, left: float, right: float) -> None:
    """Draw the times between two px columns as a tinted band with accent edges, under the curves."""
    for frame in layout.frames:
        scale = frame.scale
        painter.fillRect(QRectF(left, scale.top, right - left, scale.base - scale.top), theme.colour("tint"))
        for edge in (left, right):
            hairline_down(painter, edge, scale.top, scale.base, theme.colour("accent"))
