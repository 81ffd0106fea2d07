"""How one visit settled: its readings against the minutes since its first one, about the mean of those used.

Values relative to the mean, in the unit of the plot. The readings are painted as those of any plot against time;
here are the values, the frame with its minutes, the layout, and the cut that is proposed where the visit creeps.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import isfinite

from PySide6.QtGui import QPainter

from plumbwell.plates.axis import multiples, round_step
from plumbwell.plates.lettering import draw_text, text_height, text_width
from plumbwell.plates.numbers import number, step_decimals
from plumbwell.plates.painting import hairline_across, hairline_down
from plumbwell.plates.theme import Theme
from plumbwell.plates.time_axis import MINUTE, Panel, RunSpan, TimeView, time_axis
from plumbwell.plates.time_frame import GUTTER, PlotFrame, TimeLayout
from plumbwell.plates.time_plot import DriftLine, RunPanel, TimePlot, time_points, value_window
from plumbwell.plates.upright_axis import (
    UprightScale,
    draw_upright_grid,
    draw_upright_numbers,
    numbers_width,
    upright_ticks,
)

HEAD, TITLE_AT, FOOT = 30, 18, 24
MEAN, MINUTES = "mean", "min"
LEAST_SPAN, LINE_BEYOND = 1.0, 20.0
# The readings keep at least a third of the height, whatever the mean errs by.
LINE_SHARE, LEFT_OUT_SHARE = 1.0, 1.5


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class SettlePlot:
    """The readings of one visit; all sequences are equally long.

    Parameters
    ----------
    title, unit : str
        "Settle-down of visit 33, 640.0 m"; the unit of the values.
    run_index : int
        Sets colour and shape.
    minutes : sequence of float
        Since the visit's first row.
    values : sequence of float
        Less the visit's mean.
    rows : sequence of int
        Row of the ledger of each reading.
    sds : sequence of float or None
        Standard deviation of each reading.
    excluded : sequence of bool
        Left out of the mean.
    mean_sd : float or None
        Standard deviation of the mean; None draws no band.
    leave_out : int
        How many first readings are proposed to be left out.
    cut : float or None
        Minutes of the cut after those readings; None draws none.
    plateau : float
        Level of the readings after the cut.
    """

    title: str
    unit: str
    run_index: int
    minutes: Sequence[float]
    values: Sequence[float]
    rows: Sequence[int]
    sds: Sequence[float] | None = None
    excluded: Sequence[bool] | bool = False
    mean_sd: float | None = None
    leave_out: int = 0
    cut: float | None = None
    plateau: float = 0.0

    def cut_words(self) -> str:
        """The proposal as it stands at the cut, "" where there is none: "leave out 2"."""
        return "" if self.cut is None else f"leave out {self.leave_out}"

    def time_plot(self) -> TimePlot:
        """Return the readings as a plot against time with one run; its times are s since the first row."""
        seconds = [MINUTE * minute for minute in self.minutes]
        points = time_points(seconds, self.values, rows=self.rows, sds=self.sds, excluded=self.excluded)
        mean = DriftLine(
            times=(min(seconds) - LINE_BEYOND, max(seconds) + LINE_BEYOND),
            values=(0.0, 0.0),
            band=None if self.mean_sd is None or not isfinite(self.mean_sd) else (self.mean_sd, self.mean_sd),
        )
        # Of one reading there is no mean beside itself.
        lines = (mean,) if len(seconds) > 1 else ()
        run = RunPanel(name="", run_index=self.run_index, points=points, lines=lines)
        return TimePlot(title=self.title, unit=self.unit, panels=(run,), zero_line=True, least_span=LEAST_SPAN)


def settle_layout(plot: TimePlot, theme: Theme, *, width: float, height: float) -> TimeLayout:
    """Return the layout of a visit's readings, as `SettlePlot.time_plot` gives them."""
    low, high = value_window(plot, line_share=LINE_SHARE, left_out_share=LEFT_OUT_SHARE, bars=theme.reach)
    top = float(theme.px(HEAD))
    scale = UprightScale(top=top, base=max(height - theme.px(FOOT), top + 2), low=low, high=high)
    left = max(float(theme.px(GUTTER)), numbers_width(theme, upright_ticks(theme, scale)) + theme.px(12))
    right = width - text_width(theme, "small", MEAN) - theme.px(8)
    seconds = plot.panels[0].points.times
    times = [float(seconds.min()) - LINE_BEYOND, float(seconds.max()) + LINE_BEYOND]
    span = RunSpan(run_index=plot.panels[0].run_index, name="", first=min(times), last=max(times), margin=0.0)
    axis = time_axis((span,), theme, left=left, right=right, view=TimeView())
    frame = PlotFrame(head_top=0.0, title_right=width, scale=scale)
    return TimeLayout(width=width, height=height, axis=axis, frames=(frame,))


def minute_ticks(theme: Theme, panel: Panel) -> list[tuple[float, str]]:
    """Return times in s at round minutes, so far apart that their numbers have room, and the numbers."""
    first, last = panel.first / MINUTE, panel.last / MINUTE
    step, _ = round_step((last - first) * theme.px(44) / max(panel.right - panel.left, 1.0))
    return [(MINUTE * tick, number(tick, step_decimals(step))) for tick in multiples(step, max(first, 0.0), last)]


def draw_settle_frame(painter: QPainter, plot: TimePlot, layout: TimeLayout, theme: Theme) -> None:
    """Draw title, values, minutes and grid of a visit's readings, and the name of the mean at its line."""
    scale, baseline = layout.frames[0].scale, theme.px(TITLE_AT)
    apart = theme.px(6)
    box = draw_text(
        painter,
        theme,
        plot.title,
        x=0.0,
        baseline=baseline,
        face="emphasis",
        room=(0.0, layout.width - apart - text_width(theme, "small", plot.unit)),
    )
    draw_text(painter, theme, plot.unit, x=box.right() + apart, baseline=baseline, face="small", role="muted")
    hairline_across(painter, 0.0, layout.width, scale.top - 1, theme.colour("ink"))
    values, cap = upright_ticks(theme, scale), text_height(theme, "small")
    numbers_right = layout.axis.left - theme.px(8)
    draw_upright_numbers(painter, theme, scale, values, left=0.0, right=numbers_right)
    foot = scale.base + theme.px(8) + cap
    for panel in layout.axis.shown():
        ticks = minute_ticks(theme, panel) if plot.panels[0].lines else [(0.0, number(0.0, 0))]
        for time, _ in ticks:
            hairline_down(painter, panel.x(time), scale.top, scale.base, theme.colour("hair"), theme.hairline)
        draw_upright_grid(painter, theme, scale, values, left=panel.left, right=panel.right, zero=False)
        for time, words in ticks:
            half = text_width(theme, "small", words) / 2
            middle = min(max(panel.x(time), panel.left + half), layout.width - half)
            draw_text(
                painter,
                theme,
                words,
                x=middle,
                baseline=foot,
                face="small",
                role="muted",
                align="middle",
                room=(panel.left - 1, layout.width),
            )
        if not plot.panels[0].lines:
            continue
        end = min(panel.x(time) for line in plot.panels[0].lines for time in line.times[-1:])
        draw_text(
            painter,
            theme,
            MEAN,
            x=end + theme.px(5),
            baseline=min(max(scale.y(0.0) + cap / 2, scale.top + cap), scale.base),
            face="small",
            room=(0.0, layout.width),
        )
    draw_text(
        painter,
        theme,
        MINUTES,
        x=numbers_right,
        baseline=foot,
        face="small",
        role="muted",
        align="right",
        room=(0.0, layout.axis.left),
    )


def draw_settle_cut(painter: QPainter, visit: SettlePlot, layout: TimeLayout, theme: Theme) -> None:
    """Draw the proposed cut of a visit that creeps, in `amber`: a line, its words, and the plateau after it."""
    if visit.cut is None:
        return
    scale, amber = layout.frames[0].scale, theme.colour("amber")
    for panel in layout.axis.shown():
        x = panel.x(MINUTE * visit.cut)
        hairline_down(painter, x, scale.top, scale.base, amber, 2)
        if scale.low <= visit.plateau <= scale.high:
            hairline_across(painter, x, panel.right, scale.y(visit.plateau), amber, 2)
        # The words stand at the end of the plot that the creep leaves free.
        above = visit.plateau > 0.0
        baseline = scale.base - theme.px(6) if above else scale.top + theme.px(4) + text_height(theme, "small")
        words, beside = visit.cut_words(), theme.px(6)
        fits = x + beside + text_width(theme, "small", words) <= panel.right
        draw_text(
            painter,
            theme,
            words,
            x=x + beside if fits else x - beside,
            baseline=baseline,
            face="small",
            role="amber",
            align="left" if fits else "right",
            room=(0.0, layout.width),
            knock_out=True,
        )
