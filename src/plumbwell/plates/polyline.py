"""Long curves made fit for painting: cut at the frame's edges, and gathered to what px can show.

No painter is asked to clip, since an SVG of the small profile knows no clipping. Points are (x, y) in px.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from plumbwell.plates.axis import Frame

if TYPE_CHECKING:
    from plumbwell.plates.track import Track

Place = tuple[float, float]
Floats = NDArray[np.float64]
# Samples to a px row from which a log is gathered: more would fill the rows with ink.
CROWDED = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LogPiece:
    """A stretch of a log without a gap, in px.

    Parameters
    ----------
    line : tuple of (float, float)
        What is drawn as a line: the samples, or their mean in each px row where they are crowded.
    spread : tuple of (float, float, float)
        Least and greatest column, and row, at the places of the line; empty where the line is the samples.
    """

    line: tuple[Place, ...]
    spread: tuple[tuple[float, float, float], ...] = ()


def _cut_segment(start: Place, end: Place, frame: Frame) -> tuple[Place, Place] | None:
    """Return the part of a segment inside the frame, or None.

    Liang, Y.-D. and Barsky, B. A., 1984, A new concept and method for line clipping.
    """
    (x0, y0), (dx, dy) = start, (end[0] - start[0], end[1] - start[1])
    enter, leave = 0.0, 1.0
    for delta, room in (
        (-dx, x0 - frame.left),
        (dx, frame.right - x0),
        (-dy, y0 - frame.top),
        (dy, frame.base - y0),
    ):
        if delta == 0:
            if room < 0:
                return None
        elif delta < 0:
            enter = max(enter, room / delta)
        else:
            leave = min(leave, room / delta)
    if enter > leave:
        return None
    return (x0 + enter * dx, y0 + enter * dy), (x0 + leave * dx, y0 + leave * dy)


def inside_pieces(places: Sequence[Place], frame: Frame) -> list[list[Place]]:
    """Return the pieces of a line that lie inside a frame, cut at its edges."""
    pieces: list[list[Place]] = []
    for start, end in zip(places, places[1:], strict=False):
        part = _cut_segment(start, end, frame)
        if part is None:
            continue
        if pieces and pieces[-1][-1] == part[0]:
            pieces[-1].append(part[1])
        else:
            pieces.append([*part])
    return pieces


def _gathered(x: Floats, y: Floats) -> LogPiece:
    """Return a piece gathered to px rows: the mean line, and least and greatest column in each row.

    The first and last place keep the depth of the first and last sample.
    """
    rows = np.floor(y)
    begins = np.concatenate([[0], np.flatnonzero(np.diff(rows)) + 1])
    counts = np.diff(np.concatenate([begins, [len(x)]]))
    mean = np.add.reduceat(x, begins) / counts
    least, most = np.minimum.reduceat(x, begins), np.maximum.reduceat(x, begins)
    middle = rows[begins] + 0.5
    # Ends are added so that a piece within one row has a length too.
    middle = np.concatenate([y[:1], middle[1:-1] if len(middle) > 2 else middle[:0], y[-1:]])
    if len(mean) == 1:
        mean, least, most = (np.repeat(values, 2) for values in (mean, least, most))
    return LogPiece(
        line=tuple(zip(mean.tolist(), middle.tolist(), strict=True)),
        spread=tuple(zip(least.tolist(), most.tolist(), middle.tolist(), strict=True)),
    )


@lru_cache(maxsize=8)
def log_pieces(
    depths: tuple[float, ...], values: tuple[float | None, ...], track: Track, frame: Frame
) -> tuple[LogPiece, ...]:
    """Return a log in px between the top and base of a frame, broken at its gaps.

    A log with more than two samples to a px row is gathered: its mean in each row is the line, and its least
    and greatest value are the spread, so no spike is lost. The last few logs are kept: one plate asks for the
    same pieces several times.
    """
    depth = np.array(depths, dtype=np.float64)
    value = np.array(values, dtype=np.float64)  # None becomes NaN
    x = frame.left + (value - track.low) / (track.high - track.low) * (frame.right - frame.left)
    y = frame.top + (depth - frame.depth_top) / (frame.depth_base - frame.depth_top) * (frame.base - frame.top)
    known = np.isfinite(x) & np.isfinite(y)
    edges = np.flatnonzero(np.diff(np.concatenate([[False], known, [False]])))
    inside = y[known & (y >= frame.top) & (y <= frame.base)]
    crowded = len(inside) > CROWDED * (np.ptp(inside) + 1.0) if len(inside) else False
    pieces = []
    for first, last in edges.reshape(-1, 2).tolist():
        px, py = x[first:last], y[first:last]
        if crowded:
            within = (py >= frame.top) & (py <= frame.base)
            px, py = px[within], py[within]
        if len(px) < 2:
            continue
        if crowded:
            pieces.append(_gathered(px, py))
        else:
            pieces.append(LogPiece(line=tuple(zip(px.tolist(), py.tolist(), strict=True))))
    return tuple(pieces)
