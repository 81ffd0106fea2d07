"""What lies over and under the curves of tracks for a while: selection, hovered points, crosshair and read-out.

All of it is cheap to paint, so that curves need not be painted anew when the pointer moves.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QPointF, QRectF
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.plates.axis import NUMBERS_LEFT, Frame, number_baseline
from plumbwell.plates.curve_rows import all_extents
from plumbwell.plates.lettering import draw_text, elided, text_box, text_height, text_width
from plumbwell.plates.painting import fill_shape, hairline_across, rectangle, stroke_shape, whole
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import PointColumns, Track
from plumbwell.plates.track_curves import DISC_RADIUS, SMALL_RADIUS, disc_radius, draw_discs
from plumbwell.plates.track_readout import Reading, readings_at
from plumbwell.survey.column import Array

Span = tuple[float, float]
STEP_OVERLAY, RING_WIDTH, RING_RADIUS, SMALL_RING = 3, 2.0, 4.5, 3.0
GROWN = 1.0
READOUT_LINE, OVER_LINE, READOUT_PAD = 17, 6, 5
LEAST_READOUT_NAME = 18
TAG_PAD, TAG_HEIGHT = 7, 24
# Px from a stacked bar within which the crosshair tells its standard deviation.
BAR_REACH = 5.0
# How much of what lies behind words is cleared, of 255.
KNOCK_OUT = 225


def merged_spans(spans: Sequence[Span]) -> list[Span]:
    """Return spans in order of depth, those that touch or overlap made one."""
    merged: list[Span] = []
    for top, base in sorted((min(span), max(span)) for span in spans):
        if merged and top <= merged[-1][1] + 1e-6 * max(1.0, abs(top)):
            merged[-1] = (merged[-1][0], max(base, merged[-1][1]))
        else:
            merged.append((top, base))
    return merged


def draw_selection_bands(
    painter: QPainter, frame: Frame, theme: Theme, spans: Sequence[Span], *, spared: Sequence[QRectF] = ()
) -> None:
    """Draw selected depths as tinted bands with accent edges across a frame; a span of equal ends is a line.

    An edge does not strike through the words whose boxes are `spared`.
    """
    for top, base in merged_spans(spans):
        if base < frame.depth_top or top > frame.depth_base:
            continue
        upper, lower = frame.y(max(top, frame.depth_top)), frame.y(min(base, frame.depth_base))
        if lower > upper:
            shape = rectangle(frame.left, whole(upper), frame.right, whole(lower))
            painter.fillPath(shape, theme.colour("tint"))
        for depth in {top, base}:
            if frame.depth_top <= depth <= frame.depth_base:
                y, left = frame.y(depth), frame.left
                for box in spared:
                    if box.top() - 1 <= whole(y) <= box.bottom() + 1:
                        hairline_across(painter, left, box.left() - 3, y, theme.colour("accent"))
                        left = box.right() + 3
                hairline_across(painter, left, frame.right, y, theme.colour("accent"))


def draw_chosen_steps(painter: QPainter, track: Track, frame: Frame, theme: Theme, spans: Sequence[Span]) -> None:
    """Draw the overlay of 3 px on the steps that lie in selected depths."""
    columns = track.step_columns
    which = columns.shown(frame)
    if not len(which) or not spans:
        return
    middle = (columns.top[which] + columns.base[which]) / 2
    merged = merged_spans(spans)
    chosen = np.zeros(len(which), dtype=bool)
    for top, base in merged:
        chosen |= (middle > top) & (middle < base)
    which = which[chosen]
    upper, lower = columns.rows(frame, which)
    x = track.held_x_of(columns.value[which], frame)
    for column, top_row, base_row in zip(x.tolist(), upper.tolist(), lower.tolist(), strict=True):
        left = whole(column - STEP_OVERLAY / 2)
        box = QRectF(left, top_row, STEP_OVERLAY, max(base_row - top_row, 1))
        painter.fillRect(box, theme.colour("accent"))


def _places(track: Track, frame: Frame, depths: Sequence[float]) -> tuple[Array, Array]:
    """Return the px columns and rows of a track's points, and of those of its effect curves, at some depths."""
    wanted = np.array(depths, dtype=np.float64)
    wanted = wanted[(wanted >= frame.depth_top) & (wanted <= frame.depth_base)]
    near = 1e-6 * np.maximum(1.0, np.abs(wanted))
    found: list[tuple[Array, Array]] = [(wanted[:0], wanted[:0])]
    curves: list[PointColumns] = [track.point_columns, *(curve.columns for curve in track.lines)]
    for columns in curves:
        if not len(columns.depth) or not len(wanted):
            continue
        order = np.argsort(columns.depth, kind="stable")
        ordered = columns.depth[order]
        at = np.minimum(np.searchsorted(ordered, wanted - near), len(ordered) - 1)
        which = order[at[np.abs(ordered[at] - wanted) <= near]]
        which = which[(columns.value[which] >= track.low) & (columns.value[which] <= track.high)]
        found.append((track.x_of(columns.value[which], frame), frame.y_of(columns.depth[which])))
    return np.concatenate([x for x, _ in found]), np.concatenate([y for _, y in found])


def draw_rings(painter: QPainter, track: Track, frame: Frame, theme: Theme, depths: Sequence[float]) -> None:
    """Draw rings about the points of selected stations."""
    radius = RING_RADIUS if disc_radius(track, frame) == DISC_RADIUS else SMALL_RING
    x_of, y_of = _places(track, frame, depths)
    for x, y in zip(x_of.tolist(), y_of.tolist(), strict=True):
        ring = QPainterPath()
        ring.addEllipse(QPointF(x, y), radius, radius)
        fill_shape(painter, ring, theme.colour("ground"))
        stroke_shape(painter, ring, theme.colour("accent"), RING_WIDTH)


def draw_hovered(painter: QPainter, track: Track, frame: Frame, theme: Theme, depth: float) -> None:
    """Draw the points at a depth grown by 2 px."""
    radius = (disc_radius(track, frame) or SMALL_RADIUS) + GROWN
    draw_discs(painter, theme, *_places(track, frame, [depth]), radius)


def _fitting(theme: Theme, reading: Reading, room: float) -> str:
    """Return the longest form of a reading that fits a width, with its name before it, shortened if need be."""
    forms = [f"{reading.name} {form}".lstrip() for form in reading.forms]
    for words in forms:
        if text_width(theme, "small", words) <= room:
            return words
    value = reading.forms[-1]
    left = room - text_width(theme, "small", f" {value}")
    name = elided(theme, "small", reading.name, left) if left > theme.px(LEAST_READOUT_NAME) else ""
    return f"{name} {value}".lstrip()


def _packed(theme: Theme, readings: Sequence[Reading], room: float) -> list[list[tuple[str, str]]]:
    """Return the read-out in lines of words and colour roles that fit a width."""
    lines: list[list[tuple[str, str]]] = []
    used = 0.0
    for reading in readings:
        words = _fitting(theme, reading, room)
        if lines and used + text_width(theme, "small", ", " + words) <= room:
            lines[-1][-1] = (lines[-1][-1][0] + ", ", lines[-1][-1][1])
            lines[-1].append((words, reading.role))
            used += text_width(theme, "small", ", " + words)
        else:
            lines.append([(words, reading.role)])
            used = text_width(theme, "small", words)
    return lines


def knocked_out(box: QRectF) -> QRectF:
    """Return the px that are cleared behind words with this box."""
    return box.adjusted(-2, -2, 2, 1)


def _clear(painter: QPainter, frame: Frame, theme: Theme, box: QRectF, spans: Sequence[Span], alpha: int) -> None:
    """Clear the px of a box to what lies behind the curves: ground, and the selection in it.

    On a screen alone, since this clips.
    """
    painter.save()
    painter.setClipRect(box)
    painter.fillRect(box, theme.colour("ground", alpha))
    if any(frame.y(top) <= box.bottom() and frame.y(base) >= box.top() for top, base in spans):
        # No edge of a band strikes through the words; where nothing is written it runs on.
        draw_selection_bands(painter, frame, theme, spans, spared=(box,) if alpha < 255 else ())
    painter.restore()


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedWords:
    """Words of a read-out with their colour role, place and box."""

    words: str
    role: str
    x: float
    baseline: float
    box: QRectF


def placed_readout(track: Track, frame: Frame, theme: Theme, depth: float) -> list[PlacedWords]:
    """Return what a track shows at a depth with its place: just above the crosshair, on the side left free.

    Near the upper edge it stands below the line.
    """
    reach = BAR_REACH * (frame.depth_base - frame.depth_top) / (frame.base - frame.top)
    pad = theme.px(READOUT_PAD)
    left, right = frame.left + pad, frame.right - pad
    lines = _packed(theme, readings_at(track, depth, reach=reach), right - left)
    if not lines:
        return []
    cap, line, y = text_height(theme, "small"), theme.px(READOUT_LINE), whole(frame.y(depth))
    first = y - theme.px(OVER_LINE) - (len(lines) - 1) * line
    if first - cap < frame.top + 2:
        first = y + theme.px(OVER_LINE) + whole(cap)
    upper, lower = first - cap - 2, first + (len(lines) - 1) * line + 4
    taken = [extent for rows in all_extents(track, frame) if (extent := rows.between(upper, lower))]
    free_left = min((extent[0] for extent in taken), default=frame.right) - frame.left
    free_right = frame.right - max((extent[1] for extent in taken), default=frame.left)
    placed = []
    for number, pieces in enumerate(lines):
        baseline = first + number * line
        widths = [text_width(theme, "small", words) for words, _ in pieces]
        x = left if free_left >= free_right else max(right - sum(widths), left)
        for (words, role), width in zip(pieces, widths, strict=True):
            box = text_box(theme, "small", words, x=x, baseline=baseline)
            placed.append(PlacedWords(words=words, role=role, x=x, baseline=baseline, box=box))
            x += width
    return placed


def draw_readout(
    painter: QPainter, placed: Sequence[PlacedWords], frame: Frame, theme: Theme, *, spans: Sequence[Span] = ()
) -> None:
    """Draw the read-out of a track; `spans` are selected depths, which are seen behind the words."""
    for one in placed:
        _clear(painter, frame, theme, knocked_out(one.box), spans, KNOCK_OUT)
        draw_text(painter, theme, one.words, x=one.x, baseline=one.baseline, face="small", role=one.role)


def draw_depth_tag(
    painter: QPainter,
    axis: Frame,
    theme: Theme,
    words: str,
    *,
    depth: float,
    numbered: Sequence[float],
    spans: Sequence[Span] = (),
) -> QRectF:
    """Draw the depth of the crosshair in a tag of ink that ends at the right edge of the axis; return its box.

    A number of the axis that the tag would cover in part is cleared.

    Parameters
    ----------
    axis : Frame
    words : str
        The depth as written.
    depth : float
    numbered : sequence of float
        The depths that have a number on the axis.
    spans : sequence of (float, float)
        Selected depths.
    """
    height, width = theme.px(TAG_HEIGHT), text_width(theme, "small", words) + 2 * theme.px(TAG_PAD)
    upper = min(max(whole(axis.y(depth) - height / 2), whole(axis.top)), whole(axis.base) - height)
    right, cap = axis.right, text_height(theme, "small")
    box = QRectF(right - width, upper, width, height)
    for other in numbered:
        baseline = number_baseline(theme, axis, other)
        covered = QRectF(axis.left + NUMBERS_LEFT, baseline - cap - 2, right - axis.left - NUMBERS_LEFT, cap + 4)
        if covered.intersects(box):
            _clear(painter, axis, theme, covered, spans, 255)
    painter.fillRect(box, theme.colour("ink"))
    draw_text(
        painter,
        theme,
        words,
        x=right - theme.px(TAG_PAD),
        baseline=upper + whole((height + text_height(theme, "small")) / 2),
        face="small",
        role="ground",
        align="right",
        room=(right - width, right),
    )
    return box
