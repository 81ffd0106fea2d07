"""Time axis of runs: a panel a run, as wide as the run is long, with gaps instead of nights, and round ticks.

Times are s since 2000-01-01 UTC, px grow to the right. Gaps between panels keep their width when the panels are
zoomed. Painting is left to `plumbwell.plates.time_frame`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import UTC, datetime, timedelta
from math import ceil

from plumbwell.plates.lettering import text_width
from plumbwell.plates.theme import Theme

EPOCH = datetime(2000, 1, 1, tzinfo=UTC)
MINUTE, HOUR, DAY = 60, 3600, 86400
SECONDS = (1, 2, 5, 10, 15, 30)
STEPS = (
    *SECONDS,
    *(MINUTE * count for count in SECONDS),
    *(HOUR * count for count in (1, 2, 3, 6, 12)),
    *(DAY * count for count in (1, 2, 5, 10, 20, 50, 100, 200, 500, 1000, 2000, 5000)),
)
MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")
LEAST_PANEL, GAP, MARGIN_SHARE, LEAST_MARGIN = 44, 14, 0.05, 60.0
CLOSEST = 60.0  # a view never shows less time than this, s


def moment(time: float) -> datetime:
    """Return s since 2000-01-01 UTC as a date and time, to the nearest second."""
    return EPOCH + timedelta(seconds=round(time))


def clock(time: float, *, seconds: bool = False) -> str:
    """Return the time of day, as "11:42" or "11:42:05"; without seconds the minute that has begun."""
    return moment(time).strftime("%H:%M:%S" if seconds else "%H:%M")


def day(time: float, *, year: bool = False) -> str:
    """Return the day, as "15 Oct" or "15 Oct 2025"."""
    date = moment(time)
    words = f"{date.day}\u00a0{MONTHS[date.month - 1]}"
    return f"{words}\u00a0{date.year}" if year else words


def days(first: float, last: float, *, year: bool = False) -> str:
    """Return the days from one time to another, as "15 Oct", "14 to 16 Oct" or "30 Sep to 2 Oct"."""
    begin, end = moment(first), moment(last)
    if begin.date() == end.date():
        return day(last, year=year)
    if (begin.year, begin.month) == (end.year, end.month):
        return f"{begin.day} to {day(last, year=year)}"
    return f"{day(first, year=year and begin.year != end.year)} to {day(last, year=year)}"


@dataclass(frozen=True, slots=True, kw_only=True)
class RunSpan:
    """A run and the times of its first and last value; with `margin` s of room at both ends, by default some."""

    run_index: int
    name: str
    first: float
    last: float
    margin: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Panel:
    """The panel of a run: px of its edges, and the times there.

    Parameters
    ----------
    span : RunSpan
    left, right : float
        Edges in px, outside the view too where it is zoomed.
    first, last : float
        Times at the edges; a margin beyond the run's own.
    """

    span: RunSpan
    left: float
    right: float
    first: float
    last: float

    @property
    def scale(self) -> float:
        """Px a second."""
        return (self.right - self.left) / (self.last - self.first)

    def x(self, time: float) -> float:
        """Return the px column of a time."""
        return self.left + (time - self.first) * self.scale

    def time(self, x: float) -> float:
        """Return the time of a px column."""
        return self.first + (x - self.left) / self.scale

    def cut(self, left: float, right: float) -> Panel:
        """Return the part of the panel between two px columns."""
        begin, end = max(left, self.left), min(right, self.right)
        return replace(self, left=begin, right=end, first=self.time(begin), last=self.time(end))


@dataclass(frozen=True, slots=True, kw_only=True)
class TimeView:
    """What of the time axis is in view: times the fitted width, and the share of it that lies at the left outside."""

    zoom: float = 1.0
    hidden: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class TimeAxis:
    """Panels of all runs between two px columns.

    Parameters
    ----------
    spans : tuple of RunSpan
        In order of time.
    left, right : float
        Edges of the view in px.
    widths : tuple of float
        Width of each panel in px where everything is in view.
    gap : float
        Between panels, px.
    view : TimeView
    """

    spans: tuple[RunSpan, ...]
    left: float
    right: float
    widths: tuple[float, ...]
    gap: float
    view: TimeView

    @property
    def gaps(self) -> float:
        """All gaps together, px."""
        return self.gap * max(len(self.spans) - 1, 0)

    @property
    def content(self) -> float:
        """Width of all panels and gaps at the present zoom, px."""
        return self.view.zoom * sum(self.widths) + self.gaps

    @property
    def most_zoom(self) -> float:
        """The zoom at which the shortest time is seen that a view may show."""
        scales = [panel.scale / self.view.zoom for panel in self.panels()]
        return max((self.right - self.left) / CLOSEST / min(scales), 1.0) if scales else 1.0

    def panels(self) -> tuple[Panel, ...]:
        """Return the panels of all runs, those out of view too."""
        found = []
        x = self.left - self.view.hidden * self.content
        for span, width in zip(self.spans, self.widths, strict=True):
            first, last = _margined(span)
            right = x + width * self.view.zoom
            found.append(Panel(span=span, left=x, right=right, first=first, last=last))
            x = right + self.gap
        return tuple(found)

    def shown(self) -> tuple[Panel, ...]:
        """Return the parts of the panels that are in view."""
        return tuple(
            panel.cut(self.left, self.right)
            for panel in self.panels()
            if min(panel.right, self.right) - max(panel.left, self.left) > 0.5
        )

    def panel_at(self, x: float) -> Panel | None:
        """Return the panel in view that is nearest to a px column."""
        shown = self.shown()
        return min(shown, key=lambda panel: max(panel.left - x, x - panel.right, 0.0), default=None)

    def _moved(self, zoom: float, hidden: float) -> TimeView:
        """Return the view at a zoom with so many px hidden at the left, held inside what there is."""
        content = zoom * sum(self.widths) + self.gaps
        hidden = min(max(hidden, 0.0), content - (self.right - self.left))
        return TimeView(zoom=zoom, hidden=max(hidden, 0.0) / content if content > 0 else 0.0)

    def zoomed(self, x: float, factor: float) -> TimeView:
        """Return the view with `factor` times the zoom, in which the time at a px column keeps its place."""
        zoom = min(max(self.view.zoom * factor, 1.0), self.most_zoom)
        growth = zoom / self.view.zoom
        before = x - self.left + self.view.hidden * self.content
        at, place = 0.0, 0.0
        for width in self.widths:
            wide = width * self.view.zoom
            if before <= at + wide:
                # A place in a gap keeps its distance from the panel after it: gaps do not grow.
                inside = (before - at) * (growth if before > at else 1.0)
                return self._moved(zoom, place + inside - x + self.left)
            at += wide + self.gap
            place += wide * growth + self.gap
        return self._moved(zoom, place + before - at - x + self.left)

    def panned(self, px: float) -> TimeView:
        """Return the view moved so that what is shown moves by `px` to the right."""
        return self._moved(self.view.zoom, self.view.hidden * self.content - px)

    def revealed(self, run_index: int, time: float) -> TimeView:
        """Return the view that holds a time of a run: the present one, or one with that time in its middle."""
        for panel in self.panels():
            if panel.span.run_index == run_index:
                x = panel.x(time)
                if self.left <= x <= self.right:
                    return self.view
                return self.panned((self.left + self.right) / 2 - x)
        return self.view


def _margined(span: RunSpan) -> tuple[float, float]:
    margin = max(MARGIN_SHARE * (span.last - span.first), LEAST_MARGIN) if span.margin is None else span.margin
    return span.first - margin, span.last + margin


def panel_widths(durations: Sequence[float], width: float, least: float) -> tuple[float, ...]:
    """Return panel widths in proportion to durations, none below `least`, that fill a width."""
    least = min(least, width / len(durations)) if durations else least
    narrow: set[int] = set()
    while len(narrow) < len(durations):
        rest = sum(duration for index, duration in enumerate(durations) if index not in narrow)
        scale = (width - least * len(narrow)) / rest
        found = {i for i, duration in enumerate(durations) if i not in narrow and duration * scale < least - 1e-9}
        if not found:
            return tuple(least if i in narrow else duration * scale for i, duration in enumerate(durations))
        narrow |= found
    return tuple(width / len(durations) for _ in durations)


def time_axis(spans: Sequence[RunSpan], theme: Theme, *, left: float, right: float, view: TimeView) -> TimeAxis:
    """Return the time axis of runs between two px columns.

    Parameters
    ----------
    spans : sequence of RunSpan
        In the order in which their panels stand.
    theme : Theme
        Its text scale sets the least width of a panel.
    left, right : float
        px.
    view : TimeView
        What of it is in view.
    """
    width = max(right - left, 1.0)
    count = max(len(spans), 1)
    gap = min(float(theme.px(GAP)), 0.25 * width / count)
    room = width - gap * (count - 1)
    durations = [last - first for first, last in (_margined(span) for span in spans)]
    # Half the room is left to proportion, however many the runs are.
    widths = panel_widths(durations, room, min(float(theme.px(LEAST_PANEL)), 0.5 * room / count))
    return TimeAxis(spans=tuple(spans), left=left, right=left + width, widths=widths, gap=gap, view=view)


def tick_words(time: float, step: int) -> str:
    """Return what stands at a tick: the time of day; at midnight and with steps of days the day."""
    if step >= DAY or round(time) % DAY == 0:
        return day(time)
    return clock(time, seconds=step < MINUTE)


def _steps(theme: Theme, panel: Panel) -> list[int]:
    """Return the steps whose words have room between each other, and then the finer ones, coarser first."""
    spare = theme.px(12)
    past_midnight = panel.first // DAY != panel.last // DAY
    wide = [
        step
        for step in STEPS
        if step * panel.scale >= text_width(theme, "small", _widest_words(step, past_midnight)) + spare
    ]
    chosen = wide[0] if wide else STEPS[-1]
    return [chosen, *(step for step in reversed(STEPS) if step < chosen)]


def _widest_words(step: int, past_midnight: bool) -> str:
    if step < MINUTE:
        return "00:00:00"
    return "30\u00a0May" if step >= DAY or past_midnight else "00:00"


def time_ticks(theme: Theme, panel: Panel, *, room: tuple[float, float]) -> list[tuple[float, str, float]]:
    """Return the ticks of the shown part of a panel: time, its words ("" for none), and their middle in px.

    Ticks stand at round seconds, minutes, hours or days, so far apart that their words have room. Words stand
    under their tick; where none of them finds room so, one is shifted in, and a panel too narrow has none.

    Parameters
    ----------
    theme : Theme
    panel : Panel
        As `TimeAxis.shown` gives it.
    room : tuple of float
        Left and right limit of the words in px.
    """
    roomy, *finer = _steps(theme, panel)
    for step in (roomy, *finer):
        first = ceil(panel.first / step - 1e-9)
        times = []
        while first * step <= panel.last:
            times.append(float(first * step))
            first += 1
        if times:
            break
    else:
        return []
    low, high = room
    halves = {time: text_width(theme, "small", tick_words(time, step)) / 2 for time in times}
    free = [time for time in times if low <= panel.x(time) - halves[time] and panel.x(time) + halves[time] <= high]
    if step < roomy or not free:
        # A finer step than has room: one of its ticks is told, the one nearest to the middle.
        middle = (panel.first + panel.last) / 2
        time = min(times, key=lambda tick: abs(tick - middle))
        half = halves[time]
        if 2 * half > high - low:
            return [(time, "", panel.x(time))]
        return [(time, tick_words(time, step), min(max(panel.x(time), low + half), high - half))]
    return [(time, tick_words(time, step) if time in free else "", panel.x(time)) for time in times]
