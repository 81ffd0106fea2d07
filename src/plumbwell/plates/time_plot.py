"""What a plot against time shows, as plain values: runs with their points, drift lines, tares and joined repeats.

Times are s since 2000-01-01 UTC; values and standard deviations are in the unit of the plot. Also here: the value
range that holds what belongs together, and the thinning of many points to what px can show. Painting is left to
`plumbwell.plates.time_frame` and `plumbwell.plates.time_curves`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from plumbwell.plates.time_axis import RunSpan

Floats = NDArray[np.float64]
Indexes = NDArray[np.intp]
Flags = NDArray[np.bool_]

BARS_HELD = 2.0
PAD_SHARE, LINE_SHARE, LEFT_OUT_SHARE = 0.06, 0.25, 0.25
FENCE = 3.0
LEAST_JUDGED = 4


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TimePoints:
    """Points of one run, (n,) each, in any order.

    Parameters
    ----------
    times : float array
        s since 2000-01-01 UTC.
    values : float array
        NaN is not drawn.
    sds : float array or None
        Standard deviations; NaN has no whisker.
    rows : int array
        Row of the ledger that each point stands for.
    repeated : bool array
        Filled marks: the station was read more than once. Single ones are hollow.
    excluded : bool array
        Crosses: left out of all fits.
    """

    times: Floats
    values: Floats
    sds: Floats | None
    rows: Indexes
    repeated: Flags
    excluded: Flags

    def __len__(self) -> int:
        return len(self.times)


def time_points(
    times: Sequence[float] | Floats,
    values: Sequence[float] | Floats,
    *,
    rows: Sequence[int] | Indexes,
    sds: Sequence[float] | Floats | None = None,
    repeated: Sequence[bool] | Flags | bool = True,
    excluded: Sequence[bool] | Flags | bool = False,
) -> TimePoints:
    """Return points made of sequences or arrays; `repeated` and `excluded` may be one for all.

    Raises
    ------
    ValueError
        The columns are not equally long.
    """
    count = len(times)
    made = TimePoints(
        times=np.asarray(times, dtype=np.float64),
        values=np.asarray(values, dtype=np.float64),
        sds=None if sds is None else np.asarray(sds, dtype=np.float64),
        rows=np.asarray(rows, dtype=np.intp),
        repeated=np.full(count, repeated) if isinstance(repeated, bool) else np.asarray(repeated, dtype=bool),
        excluded=np.full(count, excluded) if isinstance(excluded, bool) else np.asarray(excluded, dtype=bool),
    )
    columns = [made.values, made.rows, made.repeated, made.excluded, *([] if made.sds is None else [made.sds])]
    if any(len(column) != count for column in columns):
        raise ValueError(f"columns of {sorted({len(column) for column in columns})} values to {count} times")
    return made


@dataclass(frozen=True, slots=True, kw_only=True)
class DriftLine:
    """A fitted line without a jump: its times, values and half the width of its band.

    Parameters
    ----------
    times, values : tuple of float
        In order of time; straight in between.
    band : tuple of float or None
        One standard deviation of the line at each time; None draws no band.
    """

    times: tuple[float, ...]
    values: tuple[float, ...]
    band: tuple[float, ...] | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class TareMark:
    """A tare: what it is known by, its time, and its words ("tare −38 ± 6 µGal")."""

    key: int
    time: float
    words: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RepeatLink:
    """A thin line between two points of a run, by their places in its points; dashed across a tare."""

    first: int
    second: int
    dashed: bool = False


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class RunPanel:
    """What a plot shows of one run.

    Parameters
    ----------
    name : str
        As it stands over the panel: "run 2".
    run_index : int
        Sets colour and shape; panels of stacked plots with the same one share their place.
    points : TimePoints
    lines : tuple of DriftLine
        One between each two tares.
    rate_words : str
        The drift's slope with its standard deviation: "+8.8 ± 0.8 µGal/h".
    tares : tuple of TareMark
    links : tuple of RepeatLink
    """

    name: str
    run_index: int
    points: TimePoints
    lines: tuple[DriftLine, ...] = ()
    rate_words: str = ""
    tares: tuple[TareMark, ...] = ()
    links: tuple[RepeatLink, ...] = ()


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TimePlot:
    """One of the plots that stand above one another on a common time axis.

    Parameters
    ----------
    title, unit : str
    panels : tuple of RunPanel
        In order of time.
    low, high : float, optional
        Ends of the value scale where they are given from outside; else what belongs together is held.
    decimals : int
        Of values written in the plot.
    signed : bool
        A plus before positive values.
    zero_line : bool
        Zero is drawn in `strong`, and lies in the scale.
    least_span : float
        The value scale is at least this long.
    """

    title: str
    unit: str
    panels: tuple[RunPanel, ...]
    low: float | None = None
    high: float | None = None
    decimals: int = 1
    signed: bool = True
    zero_line: bool = False
    least_span: float = 1.0


def known_sds(sds: Floats) -> Floats:
    """Return standard deviations with 0 for those that are not finite, which have no whisker."""
    return np.where(np.isfinite(sds), sds, 0.0)


def run_spans(plots: Sequence[TimePlot]) -> tuple[RunSpan, ...]:
    """Return the runs of all plots with the times of their first and last value, tare or point of a line."""
    found: dict[int, RunSpan] = {}
    for plot in plots:
        for panel in plot.panels:
            known = panel.points.times[np.isfinite(panel.points.times)]
            times = [float(known.min()), float(known.max())] if len(known) else []
            times += [time for line in panel.lines for time in line.times]
            times += [tare.time for tare in panel.tares]
            if not times:
                continue
            first, last = min(times), max(times)
            before = found.get(panel.run_index)
            if before is not None:
                first, last = min(first, before.first), max(last, before.last)
            found[panel.run_index] = RunSpan(run_index=panel.run_index, name=panel.name, first=first, last=last)
    return tuple(sorted(found.values(), key=lambda span: span.first))


def _fence(values: Floats, usual_sd: float) -> tuple[float, float]:
    """Return the least and greatest value that belong to the others; everything does where all are equal."""
    if len(values) < LEAST_JUDGED:
        return -np.inf, np.inf
    first, third = (float(edge) for edge in np.percentile(values, (25, 75)))
    reach = FENCE * max(third - first, usual_sd)
    return (first - reach, third + reach) if reach > 0 else (-np.inf, np.inf)


def _belonging(panels: Sequence[RunPanel]) -> list[tuple[Floats, Floats]]:
    """Return values and standard deviations of each panel that belong together.

    A value belongs when it lies no more than three quartile ranges beyond the quartiles of all values, or of
    those of its own run: a run on another level than the rest is no outlier.
    """
    used = [~panel.points.excluded & np.isfinite(panel.points.values) for panel in panels]
    everything = [panel.points.values[use] for panel, use in zip(panels, used, strict=True)]
    if not any(len(values) for values in everything):
        # All is left out: then that sets the scale, or nothing could be seen of it.
        used = [np.isfinite(panel.points.values) for panel in panels]
        everything = [panel.points.values[use] for panel, use in zip(panels, used, strict=True)]
    sds = [
        np.zeros(np.count_nonzero(use)) if panel.points.sds is None else known_sds(panel.points.sds[use])
        for panel, use in zip(panels, used, strict=True)
    ]
    if not any(len(values) for values in everything):
        return []
    usual = float(np.median(np.concatenate(sds)))
    low, high = _fence(np.concatenate(everything), usual)
    found = []
    for values, errors in zip(everything, sds, strict=True):
        inside = (values >= low) & (values <= high)
        if len(values) >= LEAST_JUDGED:
            own_low, own_high = _fence(values, usual)
            inside |= (values >= own_low) & (values <= own_high)
        found.append((values[inside], errors[inside]))
    return found


@lru_cache(maxsize=8)
def value_window(
    plot: TimePlot,
    *,
    line_share: float = LINE_SHARE,
    left_out_share: float = LEFT_OUT_SHARE,
    bars: float = BARS_HELD,
) -> tuple[float, float]:
    """Return the ends of a plot's value scale: those given, or such as hold all values that belong together.

    Whiskers are held too, of two standard deviations at least, except where one is wider than three times the usual.
    The last few windows are kept: each step of a zoom asks again.

    Parameters
    ----------
    plot : TimePlot
    line_share, left_out_share : float
        How far drift lines with their bands, and values that are left out, may stretch the scale to each side, as
        shares of the range of the other values; a value left out that lies farther away has no say.
    bars : float
        Standard deviations that whiskers and bands reach.
    """
    if plot.low is not None and plot.high is not None:
        return plot.low, plot.high
    kept = _belonging(plot.panels)
    values = np.concatenate([part for part, _ in kept]) if kept else np.zeros(0)
    if not len(values):
        return -plot.least_span / 2, plot.least_span / 2
    sds = np.concatenate([part for _, part in kept])
    known = sds[sds > 0]
    usual = float(np.median(known)) if len(known) else 0.0
    held = max(bars, BARS_HELD)
    reach = held * np.minimum(sds, 3 * usual)
    low, high = float((values - reach).min()), float((values + reach).max())
    values_low, values_high, span = low, high, high - low
    for line in (line for run in plot.panels for line in run.lines if line.times):
        along = np.array(line.values, dtype=np.float64)
        half = held * np.array(line.band or (0.0,) * len(along), dtype=np.float64)
        low = min(low, max(float(np.min(along - half)), values_low - line_share * span))
        high = max(high, min(float(np.max(along + half)), values_high + line_share * span))
    left_out = np.concatenate([run.points.values[run.points.excluded] for run in plot.panels])
    least, most = values_low - left_out_share * span, values_high + left_out_share * span
    left_out = left_out[(left_out >= least) & (left_out <= most)]
    if len(left_out):
        low, high = min(low, float(left_out.min())), max(high, float(left_out.max()))
    if plot.zero_line:
        low, high = min(low, 0.0), max(high, 0.0)
    pad = PAD_SHARE * (high - low)
    low, high = low - pad, high + pad
    if high - low < plot.least_span:
        middle = (low + high) / 2
        low, high = middle - plot.least_span / 2, middle + plot.least_span / 2
    return low, high


def told_extremes(x: Floats, y: Floats) -> Indexes:
    """Return the places of the least and greatest value in each px column, in order of columns.

    Points that a px column cannot tell apart are thinned so without losing any spike.
    """
    if not len(x):
        return np.zeros(0, dtype=np.intp)
    columns = np.floor(x)
    order = np.lexsort((y, columns))
    begins = np.flatnonzero(np.diff(columns[order], prepend=np.nan) != 0)
    ends = np.append(begins[1:], len(order)) - 1
    return order[np.unique(np.concatenate([begins, ends]))]
