"""Which px columns the curves of a track take in each px row of its frame: what names and read-outs keep clear of."""

from __future__ import annotations

from functools import lru_cache
from math import ceil, floor

import numpy as np

from plumbwell.plates.axis import Frame
from plumbwell.plates.polyline import log_pieces
from plumbwell.plates.track import PointColumns, StepColumns, Track
from plumbwell.plates.track_curves import BAR_HEIGHT
from plumbwell.survey.column import Array, Index

Extent = tuple[float, float]
# Px beside a line from point to point that count as taken, and px of it that are taken at a time.
POINT_REACH, PIECE = 4, 4


class CurveRows:
    """The least and greatest px column that a curve takes in each px row of a frame."""

    def __init__(self, frame: Frame) -> None:
        self._first = floor(frame.top)
        self._count = ceil(frame.base) - self._first + 1
        self._least, self._most = np.full(self._count, np.inf), np.full(self._count, -np.inf)

    def add(self, left: Array, right: Array, top: Array | Index, base: Array | Index) -> None:
        """Take the columns from `left` to `right` in the rows from `top` to `base`, each one value a place."""
        begin = np.clip(np.floor(top).astype(np.intp) - self._first, 0, self._count)
        end = np.clip(np.ceil(base).astype(np.intp) - self._first + 1, 0, self._count)
        lengths = np.maximum(end - begin, 0)
        ends = np.cumsum(lengths)
        rows = np.repeat(begin - ends + lengths, lengths) + np.arange(ends[-1] if len(ends) else 0)
        np.minimum.at(self._least, rows, np.repeat(left, lengths))
        np.maximum.at(self._most, rows, np.repeat(right, lengths))

    def within(self, top: Array, base: Array) -> tuple[Array, Array]:
        """Return the columns taken in the rows from each `top` to its `base`; infinite where the curve is absent."""
        begin = np.clip(np.floor(top).astype(np.intp) - self._first, 0, self._count)
        end = np.clip(np.ceil(base).astype(np.intp) - self._first + 1, 0, self._count)
        ends = np.stack([begin, end], axis=1).ravel()
        absent = end <= begin
        least = np.minimum.reduceat(np.append(self._least, np.inf), ends)[::2]
        most = np.maximum.reduceat(np.append(self._most, -np.inf), ends)[::2]
        return np.where(absent, np.inf, least), np.where(absent, -np.inf, most)

    def between(self, top: float, base: float) -> Extent | None:
        """Return the columns taken in the rows from `top` to `base`; None where the curve is absent."""
        least, most = self.within(np.array([top]), np.array([base]))
        return None if least[0] == np.inf else (float(least[0]), float(most[0]))


def _add_steps(rows: CurveRows, columns: StepColumns, track: Track, frame: Frame, bars: float) -> None:
    which = columns.shown(frame)
    if not len(which):
        return
    upper, lower = columns.rows(frame, which)
    value = columns.value[which]
    x = track.held_x_of(value, frame)
    sd = columns.sd[which]
    reach = bars * np.where(np.isfinite(sd), sd, 0.0)
    rows.add(track.held_x_of(value - reach, frame), track.held_x_of(value + reach, frame), upper, lower)
    joins = 1 + np.flatnonzero(columns.joined[which][1:])
    rows.add(np.minimum(x[joins], x[joins - 1]), np.maximum(x[joins], x[joins - 1]), upper[joins], upper[joins])


def _add_points(rows: CurveRows, columns: PointColumns, track: Track, frame: Frame) -> None:
    x, y = track.x_of(columns.value, frame), frame.y_of(columns.depth)
    first, second = columns.pairs[:, 0], columns.pairs[:, 1]
    reach = (np.maximum(y[first], y[second]) >= frame.top) & (np.minimum(y[first], y[second]) <= frame.base)
    first, second = first[reach], second[reach]
    if not len(first):
        return
    dx, dy = x[second] - x[first], y[second] - y[first]
    pieces = np.maximum(1, np.ceil(np.abs(dy) / PIECE).astype(np.intp))
    ends = np.cumsum(pieces)
    index = np.arange(ends[-1]) - np.repeat(ends - pieces, pieces)
    count = np.repeat(pieces, pieces)
    x0, y0, dx, dy = (np.repeat(values, pieces) for values in (x[first], y[first], dx, dy))
    a, b = index / count, (index + 1) / count
    xs, ys = (x0 + a * dx, x0 + b * dx), (y0 + a * dy, y0 + b * dy)
    rows.add(np.minimum(*xs) - POINT_REACH, np.maximum(*xs) + POINT_REACH, np.minimum(*ys), np.maximum(*ys))


@lru_cache(maxsize=16)
def step_extent(track: Track, frame: Frame, bars: float = 0.0) -> CurveRows:
    """Return the rows taken by a track's staircase and points, and by its bands of so many sd."""
    rows = CurveRows(frame)
    _add_steps(rows, track.step_columns, track, frame, bars)
    _add_points(rows, track.point_columns, track, frame)
    return rows


@lru_cache(maxsize=16)
def line_extent(track: Track, frame: Frame) -> CurveRows:
    """Return the rows taken by a track's log."""
    rows = CurveRows(frame)
    if track.line is None:
        return rows
    for piece in log_pieces(track.line, track.low, track.high, frame):
        (low, high), y = piece.extent, piece.y
        rows.add(
            np.minimum(low[:-1], low[1:]),
            np.maximum(high[:-1], high[1:]),
            np.minimum(y[:-1], y[1:]),
            np.maximum(y[:-1], y[1:]),
        )
    return rows


@lru_cache(maxsize=16)
def curve_extent(track: Track, number: int, frame: Frame) -> CurveRows:
    """Return the rows taken by one of a track's effect curves."""
    rows = CurveRows(frame)
    _add_points(rows, track.lines[number].columns, track, frame)
    return rows


@lru_cache(maxsize=16)
def beside_extent(track: Track, frame: Frame) -> CurveRows:
    """Return the rows taken by the staircase of a second recipe."""
    rows = CurveRows(frame)
    _add_steps(rows, track.beside_columns, track, frame, 0.0)
    return rows


@lru_cache(maxsize=16)
def bar_extent(track: Track, frame: Frame) -> CurveRows:
    """Return the rows taken by a track's stacked bars."""
    rows = CurveRows(frame)
    which = track.bar_columns.shown(frame)
    edges, y = track.held_x_of(track.bar_columns.edges[which], frame), frame.y_of(track.bar_columns.depth[which])
    rows.add(edges[:, 0], edges[:, -1], y - BAR_HEIGHT / 2, y + BAR_HEIGHT / 2)
    return rows


def all_extents(track: Track, frame: Frame, bars: float = 0.0) -> list[CurveRows]:
    """Return the rows taken by each curve of a track that it has."""
    found = [step_extent(track, frame, bars), line_extent(track, frame)]
    found += [curve_extent(track, number, frame) for number in range(len(track.lines))]
    found += [beside_extent(track, frame)] if track.beside else []
    return found + ([bar_extent(track, frame)] if track.bars else [])
