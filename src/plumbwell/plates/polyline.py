"""Long curves made fit for painting: cut at the frame's edges, and gathered to what px can show.

No painter is asked to clip, since an SVG of the small profile knows no clipping. Lines are columns and rows in px.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from plumbwell.plates.axis import Frame
from plumbwell.plates.log_curve import LogCurve
from plumbwell.survey.column import Array, Index

Place = tuple[float, float]
# Samples to a px row from which a log is gathered: more would fill the rows with ink.
CROWDED = 2.0


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LogPiece:
    """A stretch of a log without a gap, in px.

    Parameters
    ----------
    x, y : (n,) array
        What is drawn as a line: the samples, or their mean in each px row where they are crowded.
    least, most : (n,) array or None
        Least and greatest column at the places of the line; None where the line is the samples.
    """

    x: Array
    y: Array
    least: Array | None = None
    most: Array | None = None

    @property
    def extent(self) -> tuple[Array, Array]:
        """Return the least and greatest column at each place of the line."""
        return (self.x, self.x) if self.least is None or self.most is None else (self.least, self.most)


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


def inside_pieces(x: Array, y: Array, frame: Frame) -> list[tuple[Array, Array]]:
    """Return the pieces of a line that lie inside a frame, cut at its edges, as columns and rows."""
    within = (x >= frame.left) & (x <= frame.right) & (y >= frame.top) & (y <= frame.base)
    if len(x) < 2:
        return []
    if within.all():
        return [(x, y)]
    out = ~within
    beside = ((y[:-1] < frame.top) & (y[1:] < frame.top)) | ((y[:-1] > frame.base) & (y[1:] > frame.base))
    cuts = np.flatnonzero((out[:-1] | out[1:]) & ~beside)
    # What is cut, by the number of the segment; whole stretches lie between.
    parts: list[tuple[int, Array, Array]] = []
    for number in cuts.tolist():
        (x0, x1), (y0, y1) = x[number : number + 2].tolist(), y[number : number + 2].tolist()
        part = _cut_segment((x0, y0), (x1, y1), frame)
        if part is not None:
            parts.append((number, np.array([part[0][0], part[1][0]]), np.array([part[0][1], part[1][1]])))
    edges = np.flatnonzero(np.diff(np.concatenate([[False], within[:-1] & within[1:], [False]])))
    parts += [(begin, x[begin : end + 1], y[begin : end + 1]) for begin, end in edges.reshape(-1, 2).tolist()]
    parts.sort(key=lambda part: part[0])
    pieces: list[tuple[list[Array], list[Array]]] = []
    for _, columns, rows in parts:
        if pieces and pieces[-1][0][-1][-1] == columns[0] and pieces[-1][1][-1][-1] == rows[0]:
            pieces[-1][0].append(columns[1:])
            pieces[-1][1].append(rows[1:])
        else:
            pieces.append(([columns], [rows]))
    return [(np.concatenate(columns), np.concatenate(rows)) for columns, rows in pieces]


def _columns(value: Array, low: float, high: float, frame: Frame) -> Array:
    return np.asarray(frame.left + (value - low) / (high - low) * (frame.right - frame.left))


def _row_begins(depth: Array, frame: Frame, first: int, last: int) -> Index:
    """Return the first sample of each px row that has samples, among those from `first` to before `last`.

    Rows are told by the place in px, as everywhere else: the depth that a row begins with only says about where
    to look.
    """
    shown = depth[first:last]
    upper, lower = np.floor(frame.y_of(shown[[0, -1]])).astype(int).tolist()
    rows = np.arange(upper + 1, lower + 1, dtype=np.float64)
    share = (rows - frame.top) / (frame.base - frame.top)
    begins = np.searchsorted(shown, frame.depth_top + share * (frame.depth_base - frame.depth_top))
    while True:
        early = (begins < len(shown)) & (frame.y_of(shown[np.minimum(begins, len(shown) - 1)]) < rows)
        late = (begins > 0) & (frame.y_of(shown[np.maximum(begins - 1, 0)]) >= rows)
        if not (early.any() or late.any()):
            break
        begins[early] = np.searchsorted(shown, shown[begins[early]], side="right")
        begins[late] = np.searchsorted(shown, shown[begins[late] - 1], side="left")
    return first + np.unique(np.concatenate([[0], begins[begins < len(shown)]]))


def _gathered(line: LogCurve, low: float, high: float, frame: Frame, first: int, last: int) -> list[LogPiece]:
    """Return the samples from `first` to before `last` gathered to px rows, one piece a stretch without a gap.

    A piece is its mean line, and least and greatest column in each row. The first and last place keep the depth of
    the first and last sample, so that a piece within one row has a length too. Where gaps are more than rows,
    those narrower than a row are passed over.
    """
    depth, value, runs = line.depth, line.value, np.array(line.runs_between(first, last))
    if len(runs) > frame.base - frame.top:
        known = first + np.flatnonzero(np.isfinite(value[first:last]))
        depth, value, first, last = depth[known], value[known], 0, len(known)
        begins = _row_begins(depth, frame, first, last)
        rows = np.floor(frame.y_of(depth[begins]))
        broken = np.flatnonzero(np.diff(rows) > 1) + 1
        edges = np.concatenate([begins[:1], begins[broken]])
        runs = np.stack([edges, np.concatenate([edges[1:], [last]])], axis=1)
    else:
        begins = np.union1d(_row_begins(depth, frame, first, last), runs)
        begins = begins[begins < last]
    counts = np.diff(np.concatenate([begins, [last]]))
    x, inner = _columns(value[first:last], low, high, frame), begins - first
    mean = np.add.reduceat(x, inner) / counts
    least, most = np.minimum.reduceat(x, inner), np.maximum.reduceat(x, inner)
    middle = np.floor(frame.y_of(depth[begins])) + 0.5
    pieces = []
    for begin, end in runs.tolist():
        if end - begin < 2:
            continue
        own = slice(*np.searchsorted(begins, (begin, end)).tolist())
        ends = frame.y_of(depth[[begin, end - 1]])
        y = np.concatenate([ends[:1], middle[own][1:-1], ends[1:]])
        line_x, lower, upper = (
            np.repeat(values[own], 2) if len(values[own]) == 1 else values[own] for values in (mean, least, most)
        )
        pieces.append(LogPiece(x=line_x, y=y, least=lower, most=upper))
    return pieces


@lru_cache(maxsize=8)
def log_pieces(line: LogCurve, low: float, high: float, frame: Frame) -> tuple[LogPiece, ...]:
    """Return a log in px between the top and base of a frame, broken at its gaps.

    A log with more than two samples to a px row is gathered: its mean in each row is the line, and its least
    and greatest value are the spread, so no spike is lost. The last few logs are kept: one plate asks for the
    same pieces several times.

    Parameters
    ----------
    line : LogCurve
    low, high : float
        Ends of the value scale.
    frame : Frame
    """
    first, last = line.span(frame.depth_top, frame.depth_base)
    runs = line.runs_between(first, last)
    if runs:
        upper, lower = frame.y_of(line.depth[[runs[0][0], runs[-1][1] - 1]]).tolist()
        if sum(end - begin for begin, end in runs) > CROWDED * (lower - upper + 1.0):
            return tuple(_gathered(line, low, high, frame, runs[0][0], runs[-1][1]))
    # With a sample beyond each edge, towards which the line leaves the frame.
    pieces = []
    for begin, end in line.runs_between(max(first - 1, 0), min(last + 1, len(line.depth))):
        if end - begin < 2:
            continue
        own = slice(begin, end)
        x = _columns(line.value[own], low, high, frame)
        pieces.append(LogPiece(x=x, y=frame.y_of(line.depth[own])))
    return tuple(pieces)
