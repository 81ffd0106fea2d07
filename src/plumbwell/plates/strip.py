"""The core strip: the hole standing upright as a drill core with a weathered edge.

Heavy rock is darker and stands out, light rock is paler and recedes: tone and silhouette say the same number
twice. Beside it the graduated bar, findings, station ticks, and the names of tops. Lengths in px.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from plumbwell.plates.axis import (
    Frame,
    Graduation,
    depth_fields,
    multiples,
    spaced_rows,
    strip_graduation,
)
from plumbwell.plates.lettering import draw_text, text_height, text_width, wrapped
from plumbwell.plates.numbers import number, step_decimals
from plumbwell.plates.painting import (
    draw_graduated_bar,
    draw_mark,
    fill_shape,
    fill_tone,
    hairline_across,
    hairline_down,
    polygon,
    rectangle,
    stroke_shape,
    whole,
)
from plumbwell.plates.plate import DENSITY_UNIT, PlateFinding, PlateInterval, SurveyPlate
from plumbwell.plates.strip_names import PlacedName, draw_leader, draw_name, placed_names
from plumbwell.plates.strip_places import (
    BLOCK_HEIGHT,
    BLOCK_WIDTH,
    NAMES_LEFT,
    UNKNOWN_DENSITY,
    FindingMark,
    StripColumns,
    Tops,
    chosen_rows,
    core_width,
    finding_marks,
    grip_right,
    grip_rows,
    interval_width,
    number_inset,
    strip_columns,
)
from plumbwell.plates.theme import Theme

STRIP_WIDTH, WIDEST_STRIP = 216, 264
KEY_HEIGHT = 62
KEY_LOW, KEY_HIGH = 1.8, 3.2
NAMES_MARGIN, GRIP_MARGIN = 8, 10
STALE_OPACITY = 0.5
EMPTY_CORE = 40
EMPTY_WORDS = ("the hole, once", "a survey is open")


def draw_bar(painter: QPainter, frame: Frame, theme: Theme, columns: StripColumns) -> None:
    """Draw the graduated bar of a strip."""
    edges, before = depth_fields(_graduation(frame, theme), frame, frame.depth_top, frame.depth_base)
    draw_graduated_bar(painter, theme, x=columns.bar, edges=edges, fields_before=before)


def _graduation(frame: Frame, theme: Theme) -> Graduation:
    """Return the graduation of a strip; larger numbers stand farther apart."""
    return strip_graduation(frame.depth_base - frame.depth_top, (frame.base - frame.top) / theme.text_scale)


def draw_depths(painter: QPainter, frame: Frame, theme: Theme, columns: StripColumns) -> None:
    """Draw the depth numbers of a strip."""
    step = _graduation(frame, theme).numbered
    cap = text_height(theme, "small")
    for depth in multiples(step, frame.depth_top, frame.depth_base):
        draw_text(
            painter,
            theme,
            number(frame.number_of(depth), step_decimals(step)),
            x=columns.numbers_right,
            baseline=frame.y(depth) + cap / 2,
            face="small",
            role="muted",
            align="right",
        )


def _draw_intervals(
    painter: QPainter,
    intervals: Sequence[PlateInterval],
    frame: Frame,
    theme: Theme,
    core: float,
    tops: Sequence[float],
) -> None:
    """Draw the intervals in their tones, then their free edge, then ground lines at the tops of layers."""
    ink: list[QRectF] = []
    # Width and lower row of the outlined interval just above; None where there is none.
    above: tuple[float, int] | None = None
    for interval in intervals:
        upper, lower = whole(frame.y(interval.top)), whole(frame.y(interval.base))
        if lower <= upper:
            continue
        width = interval_width(interval)
        shape = rectangle(core, upper, core + width, lower)
        fill_tone(painter, shape, theme, interval.density, from_prior=interval.from_prior)
        if above is not None and above[1] != upper:
            ink.append(QRectF(core, above[1], above[0] + 1, 1))
            above = None
        if interval.density is None or interval.from_prior:
            if above is not None:
                ink.append(QRectF(core, upper, above[0] + 1, 1))
            above = None
            continue
        reach = 0.0 if above is None else above[0]
        ink.append(QRectF(core + min(width, reach), upper, abs(width - reach) + 1, 1))
        ink.append(QRectF(core + width, upper, 1, lower - upper))
        ink.append(QRectF(core - 1, upper, 1, lower - upper))
        above = (width, lower)
    if above is not None:
        ink.append(QRectF(core - 1, above[1], above[0] + 2, 1))
    for line in ink:
        painter.fillRect(line, theme.colour("ink"))
    places = Tops(intervals, frame)
    for depth in tops:
        row, meeting = places.at(depth)
        known = [interval_width(interval) for interval in meeting if interval.density is not None]
        if known and whole(frame.y(intervals[0].top)) < row < whole(frame.y(intervals[-1].base)):
            hairline_across(painter, core, core + min(known), row, theme.colour("ground"))


def _draw_openings(painter: QPainter, frame: Frame, theme: Theme, core: float, *, plate: SurveyPlate) -> None:
    full = core_width(3.2)
    for kind, spans in (("void", plate.openings), ("water", plate.waters)):
        for top, base in spans:
            upper, lower = (whole(min(max(frame.y(depth), frame.top), frame.base)) for depth in (top, base))
            painter.fillRect(QRectF(core, upper, full, lower - upper), theme.colour(kind))
            for x in (core - 1, core + full):
                hairline_down(painter, x, upper, lower, theme.colour("ink"))
            hairline_across(painter, core, core + full, upper, theme.colour("ink"))
            hairline_across(painter, core, core + full + 1, lower, theme.colour("ink"))
            if kind == "water" and lower - upper > 8:
                for line, inset in ((2, 14), (4, 20), (6, 26)):
                    hairline_across(
                        painter, core + inset, core + full - inset, upper + line, theme.colour("ink")
                    )


def draw_core(
    painter: QPainter,
    plate: SurveyPlate,
    frame: Frame,
    theme: Theme,
    columns: StripColumns,
    *,
    stale: bool = False,
) -> None:
    """Draw the core of a survey with its openings and station ticks; at half strength where it is stale."""
    painter.save()
    if stale:
        painter.setOpacity(STALE_OPACITY)
    if plate.intervals:
        tops = [depth for _, depth in plate.markers]
        _draw_intervals(painter, plate.intervals, frame, theme, columns.core, tops)
    else:
        right = columns.core + core_width(UNKNOWN_DENSITY)
        outline = rectangle(columns.core, frame.top + 0.5, right, frame.base - 0.5)
        stroke_shape(painter, outline, theme.colour("strong"), 1, (1, 3))
    _draw_openings(painter, frame, theme, columns.core, plate=plate)
    painter.restore()
    for row in spaced_rows(frame, [station.depth for station in plate.stations], 2):
        hairline_across(painter, columns.ticks, columns.ticks + 5, row, theme.colour("ink"))
    # An elevation of nought is no ground.
    if frame.depth_top < 0 < frame.depth_base and not frame.upward:
        hairline_across(painter, columns.bar, columns.names - 4, frame.y(0.0), theme.colour("ink"))


def draw_findings(
    painter: QPainter,
    findings: Sequence[PlateFinding],
    marks: Iterable[FindingMark],
    theme: Theme,
    columns: StripColumns,
) -> None:
    """Draw the marks of findings beside the core."""
    for mark in marks:
        draw_mark(painter, theme, findings[mark.finding].severity, x=columns.findings - 0.5, y=mark.y)


def draw_selection(
    painter: QPainter,
    frame: Frame,
    theme: Theme,
    columns: StripColumns,
    selected: Iterable[tuple[float, float]],
) -> None:
    """Draw chosen depths over the core: a band each, or a line, with a pointer left of the names."""
    start, end = columns.ticks - 1, columns.names - 8
    accent = theme.colour("accent")
    for upper, lower in chosen_rows(frame, selected):
        painter.fillRect(QRectF(start, upper, end - start, lower - upper), theme.colour("accent", 60))
        for y in {upper, lower}:
            hairline_across(painter, start, end, y, accent)
        middle = (upper + lower) / 2 + 0.5
        fill_shape(painter, polygon((end, middle), (end + 5, middle - 4), (end + 5, middle + 4)), accent)


def draw_grip(
    painter: QPainter, frame: Frame, theme: Theme, columns: StripColumns, window: tuple[float, float]
) -> None:
    """Draw the bracket about the depth window: open to the left, blocks on its corners."""
    rows = grip_rows(frame, window)
    accent = theme.colour("accent")
    right = grip_right(frame)
    for y in rows:
        hairline_across(painter, columns.bar - 4, right - 1, y, accent)
        painter.fillRect(QRectF(right - BLOCK_WIDTH, y - BLOCK_HEIGHT / 2, BLOCK_WIDTH, BLOCK_HEIGHT), accent)
    hairline_down(painter, right - 3, rows[0], rows[1], accent)


def draw_strip(
    painter: QPainter,
    plate: SurveyPlate,
    frame: Frame,
    theme: Theme,
    *,
    window: tuple[float, float] | None = None,
    selected: Iterable[tuple[float, float]] = (),
) -> None:
    """Draw the core strip of a survey.

    Parameters
    ----------
    painter : QPainter
    plate : SurveyPlate
    frame : Frame
        Whole width of the strip; its depths are those of the whole hole.
    theme : Theme
    window : tuple of float, optional
        Depths that ledger and tracks show: framed by a grip, names outside it muted.
    selected : iterable of tuple of float
        Chosen depths from and to, equal for a station.
    """
    columns = strip_columns(theme, frame)
    draw_bar(painter, frame, theme, columns)
    draw_depths(painter, frame, theme, columns)
    draw_core(painter, plate, frame, theme, columns)
    names = placed_names(frame, theme, columns, markers=plate.names_in_view, intervals=plate.intervals)
    for name in names:
        draw_leader(painter, theme, columns, name)
        if window is None:
            draw_name(painter, theme, columns, name, right=names_right(frame, window), window=window)
    if window is not None:
        draw_framed_names(painter, frame, theme, columns, names, window)
    draw_findings(painter, plate.findings, finding_marks(plate.findings, frame), theme, columns)
    draw_selection(painter, frame, theme, columns, selected)


def draw_framed_names(
    painter: QPainter,
    frame: Frame,
    theme: Theme,
    columns: StripColumns,
    names: Sequence[PlacedName],
    window: tuple[float, float],
) -> None:
    """Draw the grip about the depth window, and over it the names, which it must not strike through."""
    draw_grip(painter, frame, theme, columns, window)
    crossed, right = grip_rows(frame, window), names_right(frame, window)
    for name in names:
        draw_name(painter, theme, columns, name, right=right, window=window, crossed=crossed)


def names_right(frame: Frame, window: tuple[float, float] | None) -> float:
    """Return the right limit of names: beside a grip they keep clear of its blocks."""
    return frame.right - (NAMES_MARGIN if window is None else GRIP_MARGIN)


def strip_room(theme: Theme, plate: SurveyPlate, *, upward: bool = False, widest: int = WIDEST_STRIP) -> float:
    """Return the width in px that a strip needs for the names of a plate, 216 to `widest`."""
    low, high = plate.depth_range
    frame = Frame(left=0, top=0, right=0, base=1, depth_top=low, depth_base=high, upward=upward)
    names = max((text_width(theme, "name", words) for words, _ in plate.markers), default=0.0)
    names += number_inset(theme, frame)
    return float(min(max(whole(NAMES_LEFT + names + 12), STRIP_WIDTH), widest))


def draw_empty_strip(painter: QPainter, frame: Frame, theme: Theme) -> None:
    """Draw the strip where nothing is open: bar and core as outlines, and what would stand there."""
    columns = strip_columns(theme, frame)
    strong = theme.colour("strong")
    bar = rectangle(columns.bar + 0.5, frame.top + 0.5, columns.bar + 4.5, frame.base - 0.5)
    stroke_shape(painter, bar, strong, 1)
    core = rectangle(columns.core + 0.5, frame.top + 0.5, columns.core + EMPTY_CORE + 0.5, frame.base - 0.5)
    stroke_shape(painter, core, strong, 1, (3, 4))
    left, right = columns.core + EMPTY_CORE + 24, frame.right - 4
    lines = [line for words in EMPTY_WORDS for line in wrapped(theme, "small", words, right - left)]
    for index, words in enumerate(lines):
        draw_text(
            painter,
            theme,
            words,
            x=left,
            baseline=frame.top + theme.px(11) + index * theme.px(17),
            face="small",
            role="muted",
            room=(left, right),
        )


def key_height(theme: Theme) -> int:
    """Return the height of the key of density tones in px: 62 at scale 1."""
    return theme.px(22) + 11 + theme.px(17) + 12


def draw_tone_key(painter: QPainter, theme: Theme, *, left: float, top: float, width: float) -> None:
    """Draw the key of density tones, 1.8 to 3.2, its title just below `top` px."""
    draw_text(
        painter,
        theme,
        f"density, {DENSITY_UNIT}",
        x=left,
        baseline=top + theme.px(14),
        face="small",
        role="muted",
    )
    bar_top, bar_height = whole(top) + theme.px(22), 11
    for column in range(int(width)):
        density = KEY_LOW + (KEY_HIGH - KEY_LOW) * column / width
        painter.fillRect(QRectF(left + column, bar_top, width - column, bar_height), theme.tone(density))
    for y in (bar_top - 1, bar_top + bar_height):
        hairline_across(painter, left - 1, left + width + 1, y, theme.colour("ink"))
    for x in (left - 1, left + width):
        hairline_down(painter, x, bar_top, bar_top + bar_height, theme.colour("ink"))
    for density in (2.0, 2.5, 3.0):
        x = left + (density - KEY_LOW) / (KEY_HIGH - KEY_LOW) * width
        hairline_down(painter, x, bar_top + bar_height, bar_top + bar_height + 4, theme.colour("ink"))
        draw_text(
            painter,
            theme,
            number(density, 1),
            x=x,
            baseline=bar_top + bar_height + theme.px(17),
            face="small",
            role="muted",
            align="middle",
        )
