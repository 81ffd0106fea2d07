"""Names in a track: curves named beside themselves instead of in a legend, layers just under their top.

A name stands where the curves in view leave the widest gap. Lengths in px.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from plumbwell.plates.axis import Frame
from plumbwell.plates.curve_rows import (
    CurveRows,
    all_extents,
    beside_extent,
    curve_extent,
    line_extent,
    step_extent,
)
from plumbwell.plates.lettering import draw_text, elided, text_box, text_height, text_width
from plumbwell.plates.polyline import log_pieces
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Track
from plumbwell.plates.track_row import base_in_head, base_words
from plumbwell.survey.column import Array

CLEAR = 6.0
WIDE_BAND = 40.0
NEAR_JUMP = 10.0
# What standing on another curve counts against a place, in px of room.
ON_A_CURVE = 200.0
LEAST_NAME = 120.0
BETWEEN_ORIGINS = 10
# What the line and the paler spread of a log crowded with samples are.
GATHERED = ", mean and range"


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class NamedCurve:
    """A curve with the names it may have, the first that has room is taken; its rows without and with its band.

    Without a name at each of curves that look `alike` nobody could tell them apart.
    """

    names: tuple[str, ...]
    role: str
    rows: CurveRows
    band: CurveRows
    alike: bool = False


def _spans(rows: CurveRows, at: Array, *, above: float, below: float) -> tuple[Array, Array]:
    return rows.within(at - above, at + below)


def _best_place(
    words: str,
    own: NamedCurve,
    others: Sequence[NamedCurve],
    *,
    frame: Frame,
    theme: Theme,
    taken: Sequence[QRectF],
    over: bool,
) -> tuple[float, float] | None:
    """Return left edge and baseline of a curve's name: beside it, on the side away from the other ones.

    A name stands outside its curve's band where the band is narrow, and on it where it is wide; likewise
    beyond a curve of another colour where the two run together. With `over` it may stand on other curves.
    """
    width, cap = text_width(theme, "small", words), text_height(theme, "small")
    rows = []
    row = frame.top + cap + 8
    while row < frame.base - 8:
        rows.append(row)
        row += 4
    if not rows:
        return None
    at = np.array(rows)
    near_rows = {"above": cap + 3, "below": 5}
    mine, band = (_spans(curve, at, **near_rows) for curve in (own.rows, own.band))
    about = _spans(own.rows, at, above=cap + 3 + NEAR_JUMP, below=5 + NEAR_JUMP)
    there = np.isfinite(mine[0]) & np.isfinite(band[0]) & np.isfinite(about[0])
    # Where the curve is absent nothing below counts; finite numbers keep the sums silent.
    mine, band, about = (
        (np.where(there, low, 0.0), np.where(there, high, 0.0)) for low, high in (mine, band, about)
    )
    left = np.maximum(band[0], mine[0] - WIDE_BAND)
    right = np.minimum(band[1], mine[1] + WIDE_BAND)
    near = [(*_spans(other.rows, at, **near_rows), other.role != own.role) for other in others]
    for low, high, unlike in near:
        if not unlike:
            continue
        left = np.where((low < np.inf) & (low > mine[0] - WIDE_BAND), np.minimum(left, low), left)
        right = np.where((low < np.inf) & (high < mine[1] + WIDE_BAND), np.maximum(right, high), right)
    box = text_box(theme, "small", words, x=0.0, baseline=0.0)
    rooms = []
    for on_left in (True, False):
        x = left - CLEAR - width if on_left else right + CLEAR
        free = there & (x >= frame.left + 2) & (x + width <= frame.right - 2)
        for used in taken:
            free &= ~(
                (x - 4 < used.right())
                & (x + width + 4 > used.left())
                & (at + box.top() - 4 < used.bottom())
                & (at + box.bottom() + 4 > used.top())
            )
        # Beside a jump of its own curve a name would seem to belong to nothing.
        gap = mine[0] - frame.left if on_left else frame.right - mine[1]
        room = np.minimum(gap, 60.0) - 2 * np.maximum(about[1] - about[0] - 24.0, 0.0)
        room = room - (mine[0] - left if on_left else right - mine[1])
        apart: Array | None = None
        for low, high, _ in near:
            present = low < np.inf
            low, high = np.where(present, low, 0.0), np.where(present, high, 0.0)
            hit = present & (x + width + CLEAR > low) & (x - CLEAR < high)
            if over:
                room = room - np.where(hit, ON_A_CURVE, 0.0)
            else:
                free &= ~hit
            # A name is best where the curves are farthest apart, on the side away from the other ones.
            middle = (low + high - mine[0] - mine[1]) / 2
            away = np.where(present, np.maximum(middle if on_left else -middle, 0.0), np.inf)
            apart = away if apart is None else np.minimum(apart, away)
        if apart is not None:
            room = room + 4 * np.where(np.isfinite(apart), apart, 0.0)
        rooms.append((np.where(free, room, -np.inf).tolist(), x.tolist()))
    best: tuple[float, float, float] | None = None
    for number, row in enumerate(rows):
        for room_of, x_of in rooms:
            if room_of[number] > (-np.inf if best is None else best[0] + 1e-6):
                best = (room_of[number], x_of[number], row)
    return None if best is None else best[1:]


def _widest_room(rows: CurveRows, frame: Frame) -> float:
    """Return the px that a name beside a curve may take at most."""
    at = np.arange(frame.top, frame.base)
    low, high = rows.within(at, at)
    there = np.isfinite(low)
    if not there.any():
        return 0.0
    return float(max((frame.right - high[there]).max(), (low[there] - frame.left).max())) - CLEAR - 3


def _named_curves(track: Track, frame: Frame, theme: Theme) -> list[NamedCurve]:
    """Return the curves of a track, in the order in which they are named; none where none has a name."""
    if not (track.step_name or track.line_name or track.beside_name or track.lines):
        return []
    stair, band = step_extent(track, frame), step_extent(track, frame, theme.reach)
    curves = [NamedCurve(names=(track.step_name,), role="ink", rows=stair, band=band)]
    if track.line is not None:
        pieces = log_pieces(track.line, track.low, track.high, frame)
        name = track.line_name
        names = (name + GATHERED, name) if name and any(piece.least is not None for piece in pieces) else (name,)
        log = line_extent(track, frame)
        curves.append(NamedCurve(names=names, role="log", rows=log, band=log))
    if track.beside:
        rows = beside_extent(track, frame)
        curves.append(NamedCurve(names=(track.beside_name,), role="ink", rows=rows, band=rows))
    for number, curve in enumerate(track.lines):
        rows = curve_extent(track, number, frame)
        curves.append(NamedCurve(names=(curve.name,), role="ink", rows=rows, band=rows, alike=True))
    return curves


def draw_curve_names(
    painter: QPainter,
    track: Track,
    frame: Frame,
    theme: Theme,
    *,
    taken: Sequence[QRectF] = (),
    knock_out: bool = True,
) -> list[QRectF]:
    """Draw the names of a track's curves at the curves, and return the boxes they take.

    Parameters
    ----------
    taken : sequence of QRectF
        Boxes of words that already stand in the track.
    knock_out : bool
        Clears the ground behind the names.
    """
    boxes: list[QRectF] = []
    curves = _named_curves(track, frame, theme)
    for curve in curves:
        others = [other for other in curves if other is not curve]
        # The longer name where it has room, else the shorter; one of curves that look alike in any case.
        attempts = [(words, False) for words in curve.names if words]
        if curve.alike and attempts:
            room = _widest_room(curve.rows, frame)
            attempts += [(curve.names[-1], True), (elided(theme, "small", curve.names[-1], room), True)]
        for words, over in attempts:
            place = _best_place(
                words, curve, others, frame=frame, theme=theme, taken=[*taken, *boxes], over=over
            )
            if place is not None:
                x, baseline = place
                boxes.append(
                    draw_text(
                        painter,
                        theme,
                        words,
                        x=x,
                        baseline=baseline,
                        face="small",
                        role=curve.role,
                        knock_out=knock_out,
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
    knock_out: bool = True,
) -> list[QRectF]:
    """Draw layer names in italic just under their tops, on the side away from the curves; return their boxes.

    A name that would stand on a curve, on another name or on the next top is left out: the strip has them all.
    One too long for the room beside the curves is shortened.
    """
    boxes: list[QRectF] = []
    cap = text_height(theme, "name")
    named = []
    for words, depth in sorted(markers, key=lambda marker: marker[1]):
        baseline = frame.y(depth) + cap + 6
        crossed = any(0 < frame.y(other) - frame.y(depth) < cap + 8 for _, other in markers)
        if frame.depth_top <= depth < frame.depth_base and baseline + 4 <= frame.base and not crossed:
            named.append((words, baseline))
    at = np.array([baseline for _, baseline in named], dtype=np.float64)
    sides = [rows.within(at - cap - 2, at + 4) for rows in all_extents(track, frame, theme.reach)]
    lefts, rights = np.min([side[0] for side in sides], axis=0), np.max([side[1] for side in sides], axis=0)
    absent = ~np.isfinite(lefts)
    lefts, rights = (np.where(absent, frame.left, side).tolist() for side in (lefts, rights))
    for (words, baseline), left, right in zip(named, lefts, rights, strict=True):
        rooms = (frame.right - right, left - frame.left)
        for side in (0, 1) if rooms[0] >= rooms[1] else (1, 0):
            room = rooms[side] - 12 - CLEAR
            shown = elided(theme, "name", words, room) if room >= LEAST_NAME * theme.text_scale else words
            width = text_width(theme, "name", shown)
            x = frame.left + 6 if side else frame.right - 6 - width
            box = text_box(theme, "name", shown, x=x, baseline=baseline)
            if width <= room and not any(
                box.adjusted(-4, -3, 4, 3).intersects(used) for used in [*taken, *boxes]
            ):
                draw_text(
                    painter,
                    theme,
                    shown,
                    x=x,
                    baseline=baseline,
                    face="name",
                    role="muted",
                    knock_out=knock_out,
                )
                boxes.append(box)
                break
    return boxes


def draw_base_name(
    painter: QPainter,
    track: Track,
    frame: Frame,
    theme: Theme,
    *,
    taken: Sequence[QRectF] = (),
    knock_out: bool = True,
) -> list[QRectF]:
    """Draw what the tick numbers of a track count from where its head has no room for it; return its box.

    It stands under the head, or further down where curves leave room first.
    """
    words = base_words(track)
    width, cap = text_width(theme, "small", words), text_height(theme, "small")
    if not words or base_in_head(theme, track, frame) or width > frame.right - frame.left:
        return []
    rows = np.arange(frame.top + cap + CLEAR, frame.base - CLEAR, 4.0)
    if not len(rows):
        return []
    sides = [extent.within(rows - cap - 3, rows + 5) for extent in all_extents(track, frame, theme.reach)]
    left, right = np.min([side[0] for side in sides], axis=0), np.max([side[1] for side in sides], axis=0)
    for row, low, high in zip(rows.tolist(), left.tolist(), right.tolist(), strict=True):
        for x, free in ((frame.right - width, high + CLEAR), (frame.left + 2, frame.right)):
            box = text_box(theme, "small", words, x=x, baseline=row)
            beside = x >= free if x > frame.left + 2 else x + width + CLEAR <= low
            if beside and not any(box.adjusted(-3, -3, 3, 3).intersects(used) for used in taken):
                return [
                    draw_text(
                        painter,
                        theme,
                        words,
                        x=x,
                        baseline=row,
                        face="small",
                        role="muted",
                        knock_out=knock_out,
                    )
                ]
    return []


def _name_rows(theme: Theme, track: Track, frame: Frame, edges: Sequence[float]) -> list[list[tuple[str, float]]]:
    """Return the names of origins with their left edges, in rows: under their fill, what has no room there below."""
    rows: list[list[tuple[str, float]]] = []
    left = list(zip(track.origins, edges, strict=False))
    row: list[tuple[str, float]] = []
    end = frame.left - BETWEEN_ORIGINS
    while left:
        words, x = left[0]
        x = max(x + 1, end + theme.px(BETWEEN_ORIGINS))
        width = text_width(theme, "small", words)
        if x + width > frame.right and not row:
            x = max(frame.right - width, frame.left)
        elif x + width > frame.right:
            rows.append(row)
            row, end = [], frame.left - BETWEEN_ORIGINS
            # The fills that are left are slivers at the end of the bar, so their names end at the edge together.
            together = ", ".join(words for words, _ in left)
            width = text_width(theme, "small", together)
            if width <= frame.right - frame.left:
                return [*rows, [(together, frame.right - width)]]
            continue
        row.append((words, x))
        end = x + width
        left.pop(0)
    return [*rows, row] if row else rows


def draw_origin_names(
    painter: QPainter, track: Track, frame: Frame, theme: Theme, *, knock_out: bool = True
) -> list[QRectF]:
    """Draw the names of the origins once, between the stacked bars that lie farthest apart; return their boxes."""
    columns = track.bar_columns
    which = columns.shown(frame)
    if not len(which) or not track.origins:
        return []
    cap = text_height(theme, "small")
    middles = frame.y_of(columns.depth[which]).tolist()
    gaps = [below - above for above, below in pairwise([*middles, frame.base])]
    longest = which[columns.sd[which].argmax()]
    rows = _name_rows(theme, track, frame, track.held_x_of(columns.edges[longest], frame).tolist())
    starts = range(max(len(gaps) - len(rows) + 1, 1))
    first = max(starts, key=lambda start: min(gaps[start : start + len(rows)]))
    boxes = []
    if min(gaps[first : first + len(rows)]) >= cap + 2 * CLEAR and len(gaps) >= len(rows):
        baselines = [
            middles[first + index] + (gaps[first + index] + cap) / 2 for index in range(len(rows))
        ]
    else:
        # Between crowded bars there is no room: the names stand on them, in the middle of the track.
        line = cap + CLEAR
        start = (frame.top + frame.base - line * len(rows)) / 2 + cap
        baselines = [start + index * line for index in range(len(rows))]
    for row, baseline in zip(rows, baselines, strict=True):
        for words, x in row:
            boxes.append(
                draw_text(
                    painter,
                    theme,
                    words,
                    x=x,
                    baseline=baseline,
                    face="small",
                    knock_out=knock_out,
                    room=(x, frame.right + 0.5),
                )
            )
    return boxes
