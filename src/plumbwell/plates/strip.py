"""The core strip: the hole standing upright as a drill core with a weathered edge.

Heavy rock is darker and stands out, light rock is paler and recedes: tone and silhouette say the same number
twice. Beside it the graduated bar, findings, station ticks, and the names of tops. Lengths in px.
"""

from __future__ import annotations

from collections.abc import Sequence

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
from plumbwell.plates.lettering import draw_text, text_height, text_width
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
    smooth_line,
    stroke_shape,
    whole,
)
from plumbwell.plates.plate import DENSITY_UNIT, PlateFinding, PlateInterval, SurveyPlate
from plumbwell.plates.theme import Theme

STRIP_WIDTH, WIDEST_STRIP = 216, 264
NUMBERS_RIGHT, BAR_LEFT, FINDINGS_MIDDLE = 33, 38, 48
TICKS_LEFT, CORE_LEFT, NAMES_LEFT = 53, 60, 131
CORE_WIDTH = 56
NAME_SPACING = 16
KEY_HEIGHT = 62
KEY_LOW, KEY_HIGH = 1.8, 3.2
UNKNOWN_DENSITY = 2.2
SLIVER = 1.5


def core_width(density: float) -> float:
    """Return how far the core stands out at a density in g/cm3, in px: from 6.1 at 1.6 to 63.1 at 3.2.

    Notes
    -----
    56 (0.30 + 0.70 (rho - 1.9) / 1.1), with rho held to 1.6 to 3.2.
    """
    held = min(max(density, 1.6), 3.2)
    return CORE_WIDTH * (0.30 + 0.70 * (held - 1.9) / 1.1)


def _number_inset(theme: Theme, first: float, last: float) -> float:
    """Return how far the strip is moved right so that long depths have room: none up to four figures."""
    widest = max(text_width(theme, "small", number(depth, 0)) for depth in (first, last))
    return float(max(whole(widest) + 2 - NUMBERS_RIGHT, 0))


def _width(interval: PlateInterval) -> float:
    """Return the width of the core in an interval, in whole px; a middling one where no density is known."""
    return float(whole(core_width(UNKNOWN_DENSITY if interval.density is None else interval.density)))


def _layer_row(
    intervals: Sequence[PlateInterval], frame: Frame, depth: float
) -> tuple[int, list[PlateInterval]]:
    """Return the px row of a top and the intervals that meet there.

    A station is seldom read just at a top; one a px from it stands for it, so that no sliver is left between.
    """
    y = frame.y(depth)
    edges = [edge for interval in intervals for edge in (interval.top, interval.base)]
    nearest = min(edges, key=lambda edge: abs(frame.y(edge) - y), default=depth)
    at = nearest if abs(frame.y(nearest) - y) <= SLIVER else depth
    return whole(frame.y(at)), [i for i in intervals if i.top - 1e-6 <= at <= i.base + 1e-6]


def _draw_depths(painter: QPainter, frame: Frame, theme: Theme, graduation: Graduation, left: float) -> None:
    edges, before = depth_fields(graduation, frame, frame.depth_top, frame.depth_base)
    draw_graduated_bar(painter, theme, x=left + BAR_LEFT, edges=edges, fields_before=before)
    cap = text_height(theme, "small")
    for depth in multiples(graduation.numbered, frame.depth_top, frame.depth_base):
        words = number(depth, step_decimals(graduation.numbered))
        draw_text(
            painter,
            theme,
            words,
            x=left + NUMBERS_RIGHT,
            baseline=frame.y(depth) + cap / 2,
            face="small",
            role="muted",
            align="right",
        )


def _draw_core(
    painter: QPainter,
    intervals: Sequence[PlateInterval],
    frame: Frame,
    theme: Theme,
    left: float,
    tops: Sequence[float],
) -> None:
    """Draw the intervals in their tones, then their free edge, then ground lines at the tops of layers."""
    core = left + CORE_LEFT
    ink: list[QRectF] = []
    # Width and lower row of the outlined interval just above; None where there is none.
    above: tuple[float, int] | None = None
    for interval in intervals:
        upper, lower = whole(frame.y(interval.top)), whole(frame.y(interval.base))
        if lower <= upper:
            continue
        width = _width(interval)
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
    for depth in tops:
        row, meeting = _layer_row(intervals, frame, depth)
        known = [_width(interval) for interval in meeting if interval.density is not None]
        if known and whole(frame.y(intervals[0].top)) < row < whole(frame.y(intervals[-1].base)):
            hairline_across(painter, core, core + min(known), row, theme.colour("ground"))


def _draw_openings(painter: QPainter, frame: Frame, theme: Theme, left: float, *, plate: SurveyPlate) -> None:
    core, full = left + CORE_LEFT, core_width(3.2)
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


def spread_names(wanted: Sequence[float], *, spacing: float, top: float, base: float) -> list[float]:
    """Return rows near the wanted ones, in their order, at least `spacing` apart and inside top and base.

    Where the names do not all fit, they are evenly spread. Neighbours that would collide share the shift:
    each group of them keeps its mean.
    """
    if not wanted:
        return []
    if (len(wanted) - 1) * spacing > base - top:
        step = (base - top) / (len(wanted) - 1)
        return [top + index * step for index in range(len(wanted))]
    groups: list[tuple[float, int]] = []
    for row in wanted:
        centre, count = row, 1
        while groups:
            above_centre, above_count = groups[-1]
            if (
                centre - (count - 1) * spacing / 2 - (above_centre + (above_count - 1) * spacing / 2)
                >= spacing
            ):
                break
            groups.pop()
            # Mean of the wanted rows of both groups, each taken about its own middle.
            centre = (centre * count + above_centre * above_count) / (count + above_count)
            count += above_count
        half = (count - 1) * spacing / 2
        centre = min(max(centre, top + half), base - half)
        groups.append((centre, count))
    rows = [
        centre + (index - (count - 1) / 2) * spacing for centre, count in groups for index in range(count)
    ]
    for index in range(len(rows) - 2, -1, -1):
        rows[index] = min(rows[index], rows[index + 1] - spacing)
    return rows


def _draw_names(
    painter: QPainter,
    frame: Frame,
    theme: Theme,
    *,
    left: float,
    right: float,
    markers: Sequence[tuple[str, float]],
    window: tuple[float, float] | None,
    intervals: Sequence[PlateInterval],
) -> None:
    """Draw names of tops with their leaders, kinked where names were pushed apart."""
    shown = list(markers)
    most = int((frame.base - frame.top) // NAME_SPACING)
    if len(shown) > most > 0:
        # More names than lines: every so many-th top is named, all keep their boundary in the core.
        shown = [shown[index * len(shown) // most] for index in range(most)]
    cap = text_height(theme, "name")
    rows = spread_names(
        [frame.y(depth) + 9 for _, depth in shown],
        spacing=NAME_SPACING,
        top=frame.top + cap / 2,
        base=frame.base - cap / 2,
    )
    # Leaders slant right of the widest core, so that none crosses the free edge.
    core_right = left + CORE_LEFT + max((_width(interval) for interval in intervals), default=0.0)
    for (words, depth), row in zip(shown, rows, strict=True):
        y, meeting = _layer_row(intervals, frame, depth)
        widths = [_width(interval) for interval in meeting]
        start, end = left + CORE_LEFT + max(widths, default=0.0) + 4, left + NAMES_LEFT - 4
        if abs(row - frame.y(depth) - 9) < 0.5:
            hairline_across(painter, start, end, y, theme.colour("strong"))
        else:
            kink = core_right + 6
            hairline_across(painter, start, kink, y, theme.colour("strong"))
            smooth_line(painter, ((kink, y + 0.5), (end + 1, row)), theme.colour("strong"), 1)
        inside = window is None or window[0] <= depth <= window[1]
        draw_text(
            painter,
            theme,
            words,
            x=left + NAMES_LEFT,
            baseline=row + cap / 2,
            face="name",
            role="ink" if inside else "muted",
            room=(left + NAMES_LEFT, right),
        )


def draw_tone_key(painter: QPainter, theme: Theme, *, left: float, top: float, width: float) -> None:
    """Draw the key of density tones, 1.8 to 3.2, its title at `top` px and 62 px high in all."""
    draw_text(
        painter, theme, f"density, {DENSITY_UNIT}", x=left, baseline=top + 14, face="small", role="muted"
    )
    bar_top, bar_height = whole(top) + 22, 11
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
            baseline=bar_top + bar_height + 17,
            face="small",
            role="muted",
            align="middle",
        )


def _draw_findings(
    painter: QPainter, findings: Sequence[PlateFinding], frame: Frame, theme: Theme, left: float
) -> None:
    """Draw a mark at each finding that has a depth; where marks would overlap, the gravest stands for all."""
    taken: list[float] = []
    grave = {"error": 0, "look": 1, "note": 2}
    for finding in sorted(findings, key=lambda finding: grave[finding.severity]):
        if finding.depth is None or not frame.depth_top <= finding.depth <= frame.depth_base:
            continue
        y = frame.y(finding.depth)
        if any(abs(y - other) < 10 for other in taken):
            continue
        taken.append(y)
        draw_mark(painter, theme, finding.severity, x=left + FINDINGS_MIDDLE - 0.5, y=y)


def draw_strip(
    painter: QPainter,
    plate: SurveyPlate,
    frame: Frame,
    theme: Theme,
    *,
    window: tuple[float, float] | None = None,
    selected: tuple[float, float] | None = None,
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
    selected : tuple of float, optional
        Selected depths, equal for a station.
    """
    left = frame.left + _number_inset(theme, frame.depth_top, frame.depth_base)
    span, height = frame.depth_base - frame.depth_top, frame.base - frame.top
    tops = [depth for _, depth in plate.markers]
    _draw_depths(painter, frame, theme, strip_graduation(span, height), left)
    if plate.intervals:
        _draw_core(painter, plate.intervals, frame, theme, left, tops)
    else:
        stroke_shape(
            painter,
            rectangle(
                left + CORE_LEFT,
                frame.top + 0.5,
                left + CORE_LEFT + core_width(UNKNOWN_DENSITY),
                frame.base - 0.5,
            ),
            theme.colour("strong"),
            1,
            (1, 3),
        )
    _draw_openings(painter, frame, theme, left, plate=plate)
    for row in spaced_rows(frame, [station.depth for station in plate.stations], 2):
        hairline_across(painter, left + TICKS_LEFT, left + TICKS_LEFT + 5, row, theme.colour("ink"))
    if frame.depth_top < 0 < frame.depth_base:
        hairline_across(painter, left + BAR_LEFT, left + NAMES_LEFT - 4, frame.y(0.0), theme.colour("ink"))
    _draw_names(
        painter,
        frame,
        theme,
        left=left,
        right=frame.right - 8,
        markers=plate.names_in_view,
        window=window,
        intervals=plate.intervals,
    )
    _draw_findings(painter, plate.findings, frame, theme, left)
    if selected is not None:
        _draw_selection(painter, frame, theme, selected, left)
    if window is not None:
        _draw_grip(painter, frame, theme, window)


def _draw_selection(
    painter: QPainter, frame: Frame, theme: Theme, selected: tuple[float, float], left: float
) -> None:
    """Draw the selected depths over the core, with a pointer at the right."""
    upper, lower = (whole(frame.y(depth)) for depth in selected)
    start, end = left + TICKS_LEFT, left + NAMES_LEFT - 4
    painter.fillRect(QRectF(start, upper, end - start, lower - upper), theme.colour("tint", 60))
    for y in {upper, lower}:
        hairline_across(painter, start, end, y, theme.colour("accent"))
    middle = (upper + lower) / 2 + 0.5
    fill_shape(
        painter, polygon((end, middle), (end + 6, middle - 4), (end + 6, middle + 4)), theme.colour("accent")
    )


def _draw_grip(painter: QPainter, frame: Frame, theme: Theme, window: tuple[float, float]) -> None:
    """Draw the bracket about the depth window: open to the left, blocks on its corners."""
    upper, lower = (whole(frame.y(depth)) for depth in window)
    right = frame.right - 2
    for y in (upper, lower):
        hairline_across(painter, frame.left + BAR_LEFT - 4, right, y, theme.colour("accent"))
        painter.fillRect(QRectF(right - 3, y - 5, 5, 10), theme.colour("accent"))
    hairline_down(painter, right - 1, upper, lower, theme.colour("accent"))


def strip_room(theme: Theme, plate: SurveyPlate) -> float:
    """Return the width in px that a strip needs for the names of a plate, 216 to 264."""
    widest = max((text_width(theme, "name", words) for words, _ in plate.markers), default=0.0)
    widest += _number_inset(theme, *plate.depth_range)
    return float(min(max(whole(NAMES_LEFT + widest + 12), STRIP_WIDTH), WIDEST_STRIP))
