"""Names in a track: curves named beside themselves instead of in a legend, layers just under their top.

A name stands where the curves in view leave the widest gap. Lengths in px.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from math import ceil, floor

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from plumbwell.plates.axis import Frame
from plumbwell.plates.lettering import draw_text, elided, text_box, text_height, text_width
from plumbwell.plates.polyline import log_pieces
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Step, Track, held_x, joined_points, step_rows, touching

Extent = tuple[float, float]
CLEAR = 6.0
WIDE_BAND = 40.0
NEAR_JUMP = 10.0
LEAST_NAME = 120.0
# What the line and the paler spread of a log crowded with samples are.
GATHERED = ", mean and range"


class CurveRows:
    """The least and greatest px column that a curve takes in each px row of a frame."""

    def __init__(self, frame: Frame) -> None:
        self._first = floor(frame.top)
        rows = ceil(frame.base) - self._first + 1
        self._least, self._most = np.full(rows, np.inf), np.full(rows, -np.inf)

    def _rows(self, top: float, base: float) -> slice:
        return slice(max(floor(top) - self._first, 0), max(ceil(base) - self._first + 1, 0))

    def add(self, left: float, right: float, top: float, base: float) -> None:
        """Take the columns from `left` to `right` in the rows from `top` to `base`."""
        rows = self._rows(top, base)
        np.minimum(self._least[rows], left, out=self._least[rows])
        np.maximum(self._most[rows], right, out=self._most[rows])

    def between(self, top: float, base: float) -> Extent | None:
        """Return the columns taken in the rows from `top` to `base`; None where the curve is absent."""
        rows = self._rows(top, base)
        least = float(self._least[rows].min(initial=np.inf))
        if least == np.inf:
            return None
        return least, float(self._most[rows].max())


def step_extent(track: Track, frame: Frame, *, bands: bool = True) -> CurveRows:
    """Return the rows taken by a track's staircase and points, and by its bands if asked for."""
    rows = CurveRows(frame)
    before: Step | None = None
    for step in track.steps:
        if step.base <= frame.depth_top or step.top >= frame.depth_base:
            continue
        upper, lower = step_rows(step, frame)
        reach = 2 * (step.sd or 0.0) if bands else 0.0
        low, x, high = (held_x(track, step.value + way * reach, frame) for way in (-1, 0, 1))
        rows.add(low, high, upper, lower)
        if before is not None and touching(before, step):
            joined = held_x(track, before.value, frame)
            rows.add(min(x, joined), max(x, joined), upper, upper)
        before = step
    neighbours = [pair for part in joined_points(track.points) for pair in zip(part, part[1:], strict=False)]
    for first, second in neighbours:
        (x0, y0), (x1, y1) = (
            (track.x(point.value, frame), frame.y(point.depth)) for point in (first, second)
        )
        pieces = max(1, ceil(abs(y1 - y0) / 4))
        for index in range(pieces):
            a, b = index / pieces, (index + 1) / pieces
            xs, ys = (x0 + a * (x1 - x0), x0 + b * (x1 - x0)), (y0 + a * (y1 - y0), y0 + b * (y1 - y0))
            rows.add(min(xs) - 4, max(xs) + 4, min(ys), max(ys))
    return rows


@lru_cache(maxsize=8)
def line_extent(track: Track, frame: Frame) -> CurveRows:
    """Return the rows taken by a track's log."""
    rows = CurveRows(frame)
    for piece in log_pieces(track.line_depths, track.line_values, track, frame):
        extents = piece.spread or tuple((x, x, y) for x, y in piece.line)
        for (low, high, y0), (next_low, next_high, y1) in zip(extents, extents[1:], strict=False):
            rows.add(min(low, next_low), max(high, next_high), min(y0, y1), max(y0, y1))
    return rows


def _best_place(
    words: str,
    own: CurveRows,
    own_band: CurveRows,
    other: CurveRows,
    *,
    frame: Frame,
    theme: Theme,
    taken: Sequence[QRectF],
) -> tuple[float, float] | None:
    """Return left edge and baseline of a curve's name: beside it, on the side away from the other one.

    A name stands outside its curve's band where the band is narrow, and on it where it is wide; likewise
    beyond the other curve where the two run together.
    """
    width, cap = text_width(theme, "small", words), text_height(theme, "small")
    best: tuple[float, float, float] | None = None
    row = frame.top + cap + 8
    while row < frame.base - 8:
        mine, band, near = (rows.between(row - cap - 3, row + 5) for rows in (own, own_band, other))
        about = own.between(row - cap - 3 - NEAR_JUMP, row + 5 + NEAR_JUMP)
        if mine is not None and band is not None and about is not None:
            left, right = max(band[0], mine[0] - WIDE_BAND), min(band[1], mine[1] + WIDE_BAND)
            if near is not None and near[0] > mine[0] - WIDE_BAND:
                left = min(left, near[0])
            if near is not None and near[1] < mine[1] + WIDE_BAND:
                right = max(right, near[1])
            for x in (left - CLEAR - width, right + CLEAR):
                box = text_box(theme, "small", words, x=x, baseline=row)
                if box.left() < frame.left + 2 or box.right() > frame.right - 2:
                    continue
                if any(box.adjusted(-4, -4, 4, 4).intersects(used) for used in taken):
                    continue
                gap = mine[0] - frame.left if x < mine[0] else frame.right - mine[1]
                # Beside a jump of its own curve a name would seem to belong to nothing.
                room = min(gap, 60.0) - 2 * max(about[1] - about[0] - 24.0, 0.0)
                room -= mine[0] - left if x < mine[0] else right - mine[1]
                if near is not None:
                    if box.right() + CLEAR > near[0] and box.left() - CLEAR < near[1]:
                        continue
                    # A name is best where the curves are farthest apart, on the side away from the other one.
                    apart = (near[0] + near[1] - mine[0] - mine[1]) / 2
                    room += 4 * max(apart if x < mine[0] else -apart, 0.0)
                if best is None or room > best[0] + 1e-6:
                    best = (room, x, row)
        row += 4
    return None if best is None else best[1:]


def draw_curve_names(
    painter: QPainter, track: Track, frame: Frame, theme: Theme, *, taken: Sequence[QRectF] = ()
) -> list[QRectF]:
    """Draw the names of a track's staircase and log at the curves, and return the boxes they take.

    Parameters
    ----------
    taken : sequence of QRectF
        Boxes of words that already stand in the track.
    """
    log = line_extent(track, frame)
    stair, band = step_extent(track, frame, bands=False), step_extent(track, frame)
    gathered = any(
        piece.spread for piece in log_pieces(track.line_depths, track.line_values, track, frame)
    )
    line_names = (track.line_name + GATHERED, track.line_name) if gathered else (track.line_name,)
    boxes: list[QRectF] = []
    for role, names, curves in (
        ("ink", (track.step_name,), (stair, band, log)),
        ("log", line_names if track.line_name else (), (log, log, stair)),
    ):
        # The longer name where it has room, else the shorter.
        for words in filter(None, names):
            place = _best_place(words, *curves, frame=frame, theme=theme, taken=[*taken, *boxes])
            if place is not None:
                x, baseline = place
                boxes.append(
                    draw_text(
                        painter, theme, words, x=x, baseline=baseline, face="small", role=role, knock_out=True
                    )
                )
                break
    return boxes


def draw_layer_names(
    painter: QPainter,
    track: Track,
    frame: Frame,
    theme: Theme,
    *,
    markers: Sequence[tuple[str, float]],
    taken: Sequence[QRectF] = (),
) -> list[QRectF]:
    """Draw layer names in italic just under their tops, on the side away from the curves; return their boxes.

    A name that would stand on a curve, on another name or on the next top is left out: the strip has them all.
    One too long for the room beside the curves is shortened.
    """
    curves = (step_extent(track, frame), line_extent(track, frame))
    boxes: list[QRectF] = []
    cap = text_height(theme, "name")
    for words, depth in sorted(markers, key=lambda marker: marker[1]):
        if not frame.depth_top <= depth < frame.depth_base:
            continue
        baseline = frame.y(depth) + cap + 6
        if baseline + 4 > frame.base:
            continue
        if any(0 < frame.y(other) - frame.y(depth) < cap + 8 for _, other in markers):
            continue
        extents = [extent for curve in curves if (extent := curve.between(baseline - cap - 2, baseline + 4))]
        left = min((extent[0] for extent in extents), default=frame.left)
        right = max((extent[1] for extent in extents), default=frame.left)
        rooms = (frame.right - right, left - frame.left)
        for side in (0, 1) if rooms[0] >= rooms[1] else (1, 0):
            room = rooms[side] - 12 - CLEAR
            shown = elided(theme, "name", words, room) if room >= LEAST_NAME else words
            width = text_width(theme, "name", shown)
            x = frame.left + 6 if side else frame.right - 6 - width
            box = text_box(theme, "name", shown, x=x, baseline=baseline)
            if width <= room and not any(
                box.adjusted(-4, -3, 4, 3).intersects(used) for used in [*taken, *boxes]
            ):
                draw_text(
                    painter, theme, shown, x=x, baseline=baseline, face="name", role="muted", knock_out=True
                )
                boxes.append(box)
                break
    return boxes
