"""Frame of stacked plots against time: where each plot and panel lies, their heads, numbers, grid and times.

Everything in px from the upper left corner of the whole. What the panels hold is painted by
`plumbwell.plates.time_curves`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtGui import QPainter

from plumbwell.plates.axis import head_height, title_baseline, unit_baseline
from plumbwell.plates.lettering import draw_text, elided, text_height, text_width
from plumbwell.plates.painting import hairline_across, hairline_down
from plumbwell.plates.run_marks import draw_run_marks, run_filled, run_role
from plumbwell.plates.theme import Theme
from plumbwell.plates.time_axis import Panel, TimeAxis, TimeView, days, moment, time_axis, time_ticks
from plumbwell.plates.time_plot import TimePlot, run_spans, value_window
from plumbwell.plates.upright_axis import (
    UprightScale,
    draw_upright_grid,
    draw_upright_numbers,
    numbers_width,
    upright_ticks,
)

LOWER_HEAD, LOWER_BASELINE, FOOT, GUTTER = 44, 32, 24, 52
EDGE_ROOM, RATE_ROOM, MOST_ROOM = 5, 24, 0.4
TARE_LINE, TALL = 17, 150
ZONE = "UTC"


@dataclass(frozen=True, slots=True, kw_only=True)
class PlotFrame:
    """One plot below its head.

    Parameters
    ----------
    head_top : float
        Upper edge of the head, px.
    title_right : float
        Right edge of title and unit, px.
    scale : UprightScale
        Values with the top and base of the plot.
    """

    head_top: float
    title_right: float
    scale: UprightScale


@dataclass(frozen=True, slots=True, kw_only=True)
class TimeLayout:
    """Where everything lies.

    Parameters
    ----------
    width, height : float
        Of the whole.
    axis : TimeAxis
        Between the numbers of the value axes and the right edge.
    frames : tuple of PlotFrame
        One a plot, downward.
    """

    width: float
    height: float
    axis: TimeAxis
    frames: tuple[PlotFrame, ...]

    @property
    def top(self) -> float:
        """Upper edge of the first plot."""
        return self.frames[0].scale.top if self.frames else 0.0

    @property
    def base(self) -> float:
        """Lower edge of the last plot."""
        return self.frames[-1].scale.base if self.frames else self.height


def tare_lines(theme: Theme, height: float) -> int:
    """Return how many lines the words of a tare take in a plot of some height: 2, with the time; 1 in a low one."""
    return 2 if height >= theme.px(TALL) else 1


def _roomy(plot: TimePlot, theme: Theme, height: float) -> tuple[float, float]:
    """Return the value window of a plot with room for the words of tares above and of slopes below."""
    low, high = value_window(plot, bars=theme.reach)
    words = TARE_LINE * tare_lines(theme, height) + 8
    above = words if any(panel.tares for panel in plot.panels) else EDGE_ROOM
    below = RATE_ROOM if any(panel.rate_words for panel in plot.panels) else EDGE_ROOM
    if plot.low is not None and plot.high is not None:
        return low, high
    room = min(1.0, MOST_ROOM * height / max(theme.px(above + below), 1))
    up, down = theme.px(above) * room, theme.px(below) * room
    a_px = (high - low) / max(height - up - down, 1.0)
    return low - down * a_px, high + up * a_px


def time_layout(
    plots: Sequence[TimePlot],
    theme: Theme,
    *,
    width: float,
    height: float,
    weights: Sequence[float] = (),
    view: TimeView | None = None,
    windows: Sequence[tuple[float, float] | None] = (),
) -> TimeLayout:
    """Return the layout of plots stacked on a common time axis.

    Parameters
    ----------
    plots : sequence of TimePlot
        Downward.
    theme : Theme
    width, height : float
        px.
    weights : sequence of float
        Shares of the height; equal ones where there are none.
    view : TimeView, optional
        What of the time axis is in view; everything where it is not given.
    windows : sequence of (float, float) or None
        Least and greatest value in view of each plot; None shows all that belongs together.
    """
    heads = [head_height(theme) if index == 0 else theme.px(LOWER_HEAD) for index in range(len(plots))]
    body = max(height - sum(heads) - theme.px(FOOT), 2.0 * max(len(plots), 1))
    weights = tuple(weights) or (1.0,) * len(plots)
    frames, row = [], 0.0
    for index, (plot, head, weight) in enumerate(zip(plots, heads, weights, strict=True)):
        tall = float(round(body * weight / sum(weights)))
        window = windows[index] if index < len(windows) else None
        low, high = window or _roomy(plot, theme, tall)
        scale = UprightScale(top=row + head, base=row + head + tall, low=low, high=high)
        title = text_width(theme, "emphasis", plot.title) + theme.px(6) + text_width(theme, "small", plot.unit)
        frames.append(PlotFrame(head_top=row, title_right=title, scale=scale))
        row += head + tall
    widest = max((numbers_width(theme, upright_ticks(theme, frame.scale)) for frame in frames), default=0.0)
    left = max(float(theme.px(GUTTER)), widest + theme.px(12))
    axis = time_axis(run_spans(plots), theme, left=left, right=width, view=view or TimeView())
    return TimeLayout(width=width, height=height, axis=axis, frames=tuple(frames))


def shown_days(panel: Panel, *, year: bool) -> str:
    """Return the days that a panel in view shows of its run."""
    first, last = max(panel.first, panel.span.first), min(panel.last, panel.span.last)
    return days(first, last, year=year) if first <= last else days(panel.first, panel.last, year=year)


def _short_name(name: str) -> str:
    """Return the last word of a run's name: "10" of "run 10"."""
    return name.split()[-1] if name.split() else name


def _draw_run_heads(painter: QPainter, theme: Theme, layout: TimeLayout, panels: Sequence[Panel]) -> None:
    """Draw mark, name and day of each run over its panel, as much as has room: first the day is dropped.

    Where a whole panel has no room for its name, all runs go by the last word of theirs: "10", not "ru…".
    """
    baseline, name_at, apart = unit_baseline(theme), theme.px(15), theme.px(6)
    ends = [*(panel.left - theme.px(4) for panel in panels[1:]), layout.width][: len(panels)]
    spans = {panel.span.run_index: panel for panel in layout.axis.panels()}
    short = any(
        text_width(theme, "emphasis", panel.span.name) > end - panel.left - name_at
        for panel, end in zip(panels, ends, strict=True)
        if panel.right - panel.left > spans[panel.span.run_index].right - spans[panel.span.run_index].left - 1
    )
    years = {moment(time).year for span in layout.axis.spans for time in (span.first, span.last)}
    for panel, end in zip(panels, ends, strict=True):
        index, room = panel.span.run_index, (panel.left, end)
        if end - panel.left < 2 * apart:
            continue
        middle = baseline - text_height(theme, "small") / 2
        draw_run_marks(painter, theme, index, [(panel.left + apart, middle, run_filled(index))])
        name = _short_name(panel.span.name) if short else panel.span.name
        if end - panel.left < name_at + text_width(theme, "emphasis", elided(theme, "emphasis", name, 1.0)):
            continue
        box = draw_text(
            painter,
            theme,
            name,
            x=panel.left + name_at,
            baseline=baseline,
            face="emphasis",
            role=run_role(index),
            room=room,
        )
        date = shown_days(panel, year=len(years) > 1)
        if box.right() + apart + text_width(theme, "small", date) <= end:
            draw_text(
                painter, theme, date, x=box.right() + apart, baseline=baseline, face="small", role="muted", room=room
            )


def _draw_head(painter: QPainter, theme: Theme, plot: TimePlot, frame: PlotFrame, *, width: float, first: bool) -> None:
    baseline = frame.head_top + (title_baseline(theme) if first else theme.px(LOWER_BASELINE))
    unit_room = text_width(theme, "small", plot.unit) + theme.px(6)
    box = draw_text(
        painter, theme, plot.title, x=0.0, baseline=baseline, face="emphasis", room=(0.0, width - unit_room)
    )
    draw_text(painter, theme, plot.unit, x=box.right() + theme.px(6), baseline=baseline, face="small", role="muted")
    hairline_across(painter, 0.0, width, frame.scale.top - 1, theme.colour("ink"))


def draw_time_frame(painter: QPainter, plots: Sequence[TimePlot], layout: TimeLayout, theme: Theme) -> None:
    """Draw heads, value numbers, grid and times of stacked plots.

    The name of a run stands in its colour over its panel, on the line of the units of a ledger's head beside it.
    """
    axis = layout.axis
    panels = axis.shown()
    spill = axis.gap / 2 - 1
    rooms = [(panel.left - spill, min(panel.right + spill, layout.width)) for panel in panels]
    ticks = [time_ticks(theme, panel, room=room) for panel, room in zip(panels, rooms, strict=True)]
    for index, (plot, frame) in enumerate(zip(plots, layout.frames, strict=True)):
        _draw_head(painter, theme, plot, frame, width=layout.width, first=index == 0)
        scale = frame.scale
        values = upright_ticks(theme, scale)
        draw_upright_numbers(painter, theme, scale, values, left=0.0, right=axis.left - theme.px(8))
        for panel, times in zip(panels, ticks, strict=True):
            for time, _, _ in times:
                hairline_down(painter, panel.x(time), scale.top, scale.base, theme.colour("hair"), theme.hairline)
            draw_upright_grid(painter, theme, scale, values, left=panel.left, right=panel.right, zero=plot.zero_line)
    _draw_run_heads(painter, theme, layout, panels)
    foot = layout.base + theme.px(8) + text_height(theme, "small")
    for times, room in zip(ticks, rooms, strict=True):
        for _, words, middle in times:
            draw_text(
                painter, theme, words, x=middle, baseline=foot, face="small", role="muted", align="middle", room=room
            )
    if panels:
        draw_text(
            painter,
            theme,
            ZONE,
            x=axis.left - theme.px(8) - spill,
            baseline=foot,
            face="small",
            role="muted",
            align="right",
            room=(0.0, axis.left - spill),
        )
