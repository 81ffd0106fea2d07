"""What a track shows: value against depth, as staircases, points, logs, curves and stacked bars; plain values.

`plumbwell.plates.track_curves` paints them, `plumbwell.plates.naming` writes the names at the curves. Depths grow
downward. Standard deviations are one standard deviation; bars and bands drawn from them reach `Theme.reach` of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from statistics import median, quantiles

import numpy as np
from numpy.typing import NDArray

from plumbwell.plates.axis import Frame, multiples, round_step
from plumbwell.plates.log_curve import LogCurve
from plumbwell.survey.column import Array, Index

Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """An interval's value: depths of its top and base, value, standard deviation or None."""

    top: float
    base: float
    value: float
    sd: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """A station's value: depth, value, standard deviation or None; only points of one part are joined."""

    depth: float
    value: float
    sd: float | None = None
    part: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class OriginBar:
    """A station's standard deviation, split by origin.

    Parameters
    ----------
    depth, sd : float
        Depth of the station, and the whole standard deviation: the length of the bar.
    shares : tuple of float
        Share of each origin of the track in the variance; they add up to 1.
    """

    depth: float
    sd: float
    shares: tuple[float, ...]


def _sds(items: Sequence[Step | Point]) -> Array:
    return np.array([np.nan if item.sd is None else item.sd for item in items], dtype=np.float64)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class StepColumns:
    """Steps as arrays: top, base, value, standard deviation or NaN, and whether each joins the one before."""

    top: Array
    base: Array
    value: Array
    sd: Array
    joined: Flags

    @classmethod
    def of(cls, steps: Sequence[Step]) -> StepColumns:
        """Return the columns of steps; neighbours that touch are joined."""
        top, base, value = (
            np.array([getattr(step, name) for step in steps], dtype=np.float64) for name in ("top", "base", "value")
        )
        joined = np.zeros(len(steps), dtype=bool)
        joined[1:] = np.abs(base[:-1] - top[1:]) <= 1e-6 * np.maximum(1.0, np.abs(top[1:]))
        return cls(top=top, base=base, value=value, sd=_sds(steps), joined=joined)

    def shown(self, frame: Frame) -> Index:
        """Return the numbers of the steps that reach into a frame."""
        return np.flatnonzero((self.base > frame.depth_top) & (self.top < frame.depth_base))

    def rows(self, frame: Frame, which: Index) -> tuple[Index, Index]:
        """Return the px rows of top and base of some steps, kept inside the frame."""
        upper = np.floor(np.maximum(frame.y_of(self.top[which]), frame.top) + 0.5)
        lower = np.floor(np.minimum(frame.y_of(self.base[which]), frame.base) + 0.5)
        return upper.astype(np.intp), lower.astype(np.intp)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class PointColumns:
    """Points as arrays: depth, value, standard deviation or NaN, and the pairs of points that are joined."""

    depth: Array
    value: Array
    sd: Array
    pairs: Index

    @classmethod
    def of(cls, points: Sequence[Point]) -> PointColumns:
        """Return the columns of points; those of one part are joined in their order."""
        depth, value = (
            np.array([getattr(point, name) for point in points], dtype=np.float64) for name in ("depth", "value")
        )
        parts: dict[int, list[int]] = {}
        for number, point in enumerate(points):
            parts.setdefault(point.part, []).append(number)
        pairs = [pair for part in parts.values() for pair in pairwise(part)]
        ends = np.array(pairs, dtype=np.intp).reshape(-1, 2)
        return cls(depth=depth, value=value, sd=_sds(points), pairs=ends)

    def shown(self, frame: Frame) -> Index:
        """Return the numbers of the points inside a frame."""
        return np.flatnonzero((self.depth >= frame.depth_top) & (self.depth <= frame.depth_base))

    def joins(self, frame: Frame) -> list[list[int]]:
        """Return the runs of joined points of which some part may lie between the top and base of a frame."""
        ends = self.depth[self.pairs]
        reach = (ends.max(axis=1) >= frame.depth_top) & (ends.min(axis=1) <= frame.depth_base)
        runs: list[list[int]] = []
        for first, second in self.pairs[reach].tolist():
            if runs and runs[-1][-1] == first:
                runs[-1].append(second)
            else:
                runs.append([first, second])
        return runs

    def at(self, depth: float) -> tuple[float, float | None] | None:
        """Return the value at a depth, and its standard deviation where that is a point; None beyond the points.

        Between joined points the value is linear. Where several lie at the depth, the first counts.
        """
        near = np.flatnonzero(np.abs(self.depth - depth) <= 1e-9 * max(1.0, abs(depth)))
        if len(near):
            sd = float(self.sd[near[0]])
            return float(self.value[near[0]]), sd if np.isfinite(sd) else None
        ends = self.depth[self.pairs]
        around = np.flatnonzero((ends.min(axis=1) <= depth) & (depth <= ends.max(axis=1)))
        if not len(around):
            return None
        (z0, z1), (v0, v1) = ends[around[0]].tolist(), self.value[self.pairs[around[0]]].tolist()
        return v0 + (depth - z0) / (z1 - z0) * (v1 - v0), None


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class EffectCurve:
    """A curve from point to point with its name, solid or dashed.

    Parameters
    ----------
    name : str
        Stands at the curve.
    points : tuple of Point
        In the order in which they are joined.
    dashes : tuple of float
        Lengths of dashes and gaps in px; empty for a solid curve.
    """

    name: str
    points: tuple[Point, ...]
    dashes: tuple[float, ...] = ()
    columns: PointColumns = field(init=False, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "columns", PointColumns.of(self.points))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class BarColumns:
    """Stacked bars as arrays: depths, and the values between which the shares of each bar lie, from zero on."""

    depth: Array
    edges: Array

    @classmethod
    def of(cls, bars: Sequence[OriginBar]) -> BarColumns:
        """Return the columns of stacked bars, all of equally many shares."""
        depth, sd = (np.array([getattr(bar, name) for bar in bars], dtype=np.float64) for name in ("depth", "sd"))
        count = len(bars[0].shares) if bars else 0
        shares = np.array([bar.shares for bar in bars], dtype=np.float64).reshape(len(bars), count)
        ends = np.cumsum(np.concatenate([np.zeros((len(bars), 1)), shares], axis=1), axis=1)
        return cls(depth=depth, edges=ends * sd[:, None])

    @property
    def sd(self) -> Array:
        """Return the whole length of each bar."""
        return np.asarray(self.edges[:, -1])

    def shown(self, frame: Frame) -> Index:
        """Return the numbers of the bars inside a frame."""
        return np.flatnonzero((self.depth >= frame.depth_top) & (self.depth <= frame.depth_base))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Track:
    """One track.

    Parameters
    ----------
    title, unit : str
    low, high : float
        Ends of the value scale.
    weight : float
        Share of the width.
    steps : tuple of Step
        In order of depth; neighbours that touch are joined.
    beside : tuple of Step
        The same of a second recipe: dashed, without bands.
    points : tuple of Point
        In the order in which those of one part are joined.
    line : LogCurve or None
        A log.
    lines : tuple of EffectCurve
    bars : tuple of OriginBar
        Stacked bars, in order of depth.
    origins : tuple of str
        What the shares of the bars are of, the largest first.
    decimals : int
        Of the values written in the track.
    signed : bool
        A plus before positive numbers, and a zero line.
    step_name, beside_name, line_name : str
        Names at the curves; empty for none.
    narrow : bool
        Shown where there is little room too.
    counted_from : float
        What the tick numbers count from; where it is not 0 it is told at the track.
    """

    title: str
    unit: str
    low: float
    high: float
    weight: float = 1.0
    steps: tuple[Step, ...] = ()
    beside: tuple[Step, ...] = ()
    points: tuple[Point, ...] = ()
    line: LogCurve | None = None
    lines: tuple[EffectCurve, ...] = ()
    bars: tuple[OriginBar, ...] = ()
    origins: tuple[str, ...] = ()
    decimals: int = 3
    signed: bool = False
    step_name: str = ""
    beside_name: str = ""
    line_name: str = ""
    narrow: bool = True
    counted_from: float = 0.0
    step_columns: StepColumns = field(init=False, repr=False)
    beside_columns: StepColumns = field(init=False, repr=False)
    point_columns: PointColumns = field(init=False, repr=False)
    bar_columns: BarColumns = field(init=False, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "bar_columns", BarColumns.of(self.bars))
        object.__setattr__(self, "step_columns", StepColumns.of(self.steps))
        object.__setattr__(self, "beside_columns", StepColumns.of(self.beside))
        object.__setattr__(self, "point_columns", PointColumns.of(self.points))

    def x(self, value: float, frame: Frame) -> float:
        """Return the px column of a value in a frame."""
        return frame.left + (value - self.low) / (self.high - self.low) * (frame.right - frame.left)

    def x_of(self, values: Array, frame: Frame) -> Array:
        """Return the px columns of many values."""
        share = (values - self.low) / (self.high - self.low)
        return np.asarray(frame.left + share * (frame.right - frame.left))

    def held_x_of(self, values: Array, frame: Frame) -> Array:
        """Return the px columns of many values, kept inside the frame."""
        return np.minimum(np.maximum(self.x_of(values, frame), frame.left), frame.right)

    def value_at(self, x: float, frame: Frame) -> float:
        """Return the value at a px column of a frame."""
        return self.low + (x - frame.left) / (frame.right - frame.left) * (self.high - self.low)

    def depths(self) -> Array:
        """Return the depths at which the track has points, curves' points or bars."""
        curves = [curve.columns.depth for curve in self.lines]
        return np.concatenate([self.point_columns.depth, *curves, self.bar_columns.depth])


def value_range(
    values: Sequence[float],
    sds: Sequence[float | None],
    *,
    least_span: float,
    plausible: tuple[float, float],
    bars: float = 2,
) -> tuple[float, float]:
    """Return ends of a value scale that hold all values which belong together, and their bands.

    Left out are values outside `plausible` that also lie more than three quartile ranges beyond the
    quartiles; they get a wedge at the edge. A band wider than three times the usual one does not stretch the
    scale.

    Parameters
    ----------
    values : sequence of float
        At least one.
    sds : sequence of float or None
        One each value.
    least_span : float
        The scale is at least this long.
    plausible : tuple of float
        Least and greatest value that always belong.
    bars : float
        Standard deviations that a band reaches to each side.
    """
    low, high = plausible
    if len(values) >= 4:
        first, _, third = quantiles(values, n=4, method="inclusive")
        low, high = min(low, first - 3 * (third - first)), max(high, third + 3 * (third - first))
    known = [sd for sd in sds if sd is not None]
    widest = 3 * bars * median(known) if known else 0.0
    kept = [(value, sd) for value, sd in zip(values, sds, strict=True) if low <= value <= high]
    if not kept:
        kept = [(median(values), None)]
    least = min(value - min(bars * (sd or 0.0), widest) for value, sd in kept)
    most = max(value + min(bars * (sd or 0.0), widest) for value, sd in kept)
    pad = 0.06 * (most - least)
    least, most = least - pad, most + pad
    if most - least < least_span:
        middle = (least + most) / 2
        least, most = middle - least_span / 2, middle + least_span / 2
    return _with_three_ticks(least, most)


def _with_three_ticks(least: float, most: float) -> tuple[float, float]:
    """Return ends of a scale, one moved out to the next tick where a narrow track would show only two.

    By a quarter at most: where that is not enough there is room for a finer step.
    """
    step, _ = round_step((most - least) / 4)
    ticks = multiples(step, least, most)
    if len(ticks) != 2:
        return least, most
    below, above = ticks[0] - step, ticks[-1] + step
    moved = (below, most) if least - below < above - most else (least, above)
    return moved if moved[1] - moved[0] <= 1.25 * (most - least) else (least, most)
