"""Wedges at the edges of a track, where values leave its scale, each with the extreme value."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from plumbwell.plates.axis import Frame
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import fill_shape, polygon
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Track
from plumbwell.survey.column import Array, Index

WEDGE = 6.0
SPACING = 18
NEAR_EDGE = 8
BELOW_MIDDLE = 4.5


@dataclass(frozen=True, slots=True, kw_only=True)
class Excursion:
    """A value outside the scale of its track, its depth, and the colour role of its curve."""

    depth: float
    value: float
    role: str


def _outside(track: Track, frame: Frame, depth: Array, value: Array) -> list[Excursion]:
    inside = (value >= track.low) & (value <= track.high)
    which = np.flatnonzero(~inside & (depth >= frame.depth_top) & (depth <= frame.depth_base))
    return [
        Excursion(depth=z, value=v, role="ink")
        for z, v in zip(depth[which].tolist(), value[which].tolist(), strict=True)
    ]


def _firsts(value: Array, begins: Index, extreme: Array) -> Index:
    """Return where each stretch, given by its begins, first takes its extreme."""
    counts = np.diff(np.append(begins, len(value)))
    hits = np.flatnonzero(value == np.repeat(extreme, counts))
    return hits[np.searchsorted(hits, begins)]


def _log_excursions(track: Track, frame: Frame) -> list[Excursion]:
    """Return the extreme of each unbroken run of a log outside the scale; of many in a px row the farthest."""
    line = track.line
    if line is None or not (line.low < track.low or line.high > track.high):
        return []
    first, last = line.span(frame.depth_top, frame.depth_base)
    depth, value = line.depth[first:last], line.value[first:last]
    found = []
    for out, farthest in ((value > track.high, np.maximum), (value < track.low, np.minimum)):
        at = np.flatnonzero(out)
        if not len(at):
            continue
        begins = np.flatnonzero(np.diff(at, prepend=at[0] - 2) > 1)
        at = at[_firsts(value[at], begins, farthest.reduceat(value[at], begins))]
        rows = np.floor(frame.y_of(depth[at]))
        begins = np.flatnonzero(np.diff(rows, prepend=rows[0] - 1))
        at = at[_firsts(value[at], begins, farthest.reduceat(value[at], begins))]
        found += [
            Excursion(depth=z, value=v, role="log")
            for z, v in zip(depth[at].tolist(), value[at].tolist(), strict=True)
        ]
    return found


def excursions(track: Track, frame: Frame) -> list[Excursion]:
    """Return what lies outside the value scale of a track in a frame, curve by curve."""
    steps, points = track.step_columns, track.point_columns
    found = _outside(track, frame, (steps.top + steps.base) / 2, steps.value)
    found += _outside(track, frame, points.depth, points.value)
    for curve in track.lines:
        found += _outside(track, frame, curve.columns.depth, curve.columns.value)
    bars = track.bar_columns
    found += [one for one in _outside(track, frame, bars.depth, bars.sd) if one.value > track.high]
    return found + _log_excursions(track, frame)


def draw_wedges(
    painter: QPainter, track: Track, frame: Frame, theme: Theme, *, knock_out: bool = True
) -> list[QRectF]:
    """Draw wedges where values leave the scale, with the extreme value; return the boxes of the words.

    With `knock_out` the ground behind the words is cleared.
    """
    middle = (track.low + track.high) / 2
    taken: list[QRectF] = []
    rows: list[tuple[int, float]] = []
    for one in sorted(excursions(track, frame), key=lambda found: -abs(found.value - middle)):
        near = theme.px(NEAR_EDGE)
        y = min(max(frame.y(one.depth), frame.top + near), frame.base - near)
        high = one.value > track.high
        side, edge, align = (1, frame.right, "right") if high else (-1, frame.left, "left")
        if any(side == other and abs(row - y) < theme.px(SPACING) for other, row in rows):
            continue
        rows.append((side, y))
        words = number(one.value, track.decimals, signed=track.signed)
        # In a track too narrow for the number the wedge stands alone.
        if text_width(theme, "small", words) + WEDGE + 3 <= frame.right - frame.left:
            taken.append(
                draw_text(
                    painter,
                    theme,
                    words,
                    x=edge - side * (WEDGE + 3),
                    baseline=y + BELOW_MIDDLE * theme.text_scale,
                    face="small",
                    role=one.role,
                    align=align,
                    knock_out=knock_out,
                )
            )
        fill_shape(
            painter,
            polygon((edge, y), (edge - side * WEDGE, y - WEDGE / 2), (edge - side * WEDGE, y + WEDGE / 2)),
            theme.colour(one.role),
        )
    return taken
