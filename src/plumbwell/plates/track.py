"""Tracks: value against depth, with staircases and bands, points and whiskers, logs, and their heads.

A track is plain values; `draw_track` paints it into a frame. Grid lines and markers run across all tracks and
the gaps between them, so they are painted once, by `draw_grid`. Bars and bands are two standard deviations.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from statistics import median, quantiles

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPainterPath, QPolygonF

from plumbwell.plates.axis import (
    HEAD_HEIGHT,
    TITLE_BASELINE,
    UNIT_BASELINE,
    Frame,
    multiples,
    round_step,
    value_ticks,
)
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import (
    dotted_across,
    fill_shape,
    hairline_across,
    hairline_down,
    polygon,
    rectangle,
    smooth_line,
    stroke_shape,
    whole,
)
from plumbwell.plates.polyline import inside_pieces, log_pieces
from plumbwell.plates.theme import Theme

BAND_ALPHA, SPREAD_ALPHA = 38, 72
LEAST_BAND = 3
MANY_THIN = 20
DISC_RADIUS, SMALL_RADIUS = 3.0, 2.0
WEDGE = 6.0


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
    points : tuple of Point
        In the order in which those of one part are joined.
    line_depths, line_values : tuple
        A log, None where it has a gap.
    decimals : int
        Of the values written in the track.
    signed : bool
        A plus before positive numbers, and a zero line.
    step_name, line_name : str
        Names at the curves; empty for none.
    """

    title: str
    unit: str
    low: float
    high: float
    weight: float = 1.0
    steps: tuple[Step, ...] = ()
    points: tuple[Point, ...] = ()
    line_depths: tuple[float, ...] = ()
    line_values: tuple[float | None, ...] = ()
    decimals: int = 3
    signed: bool = False
    step_name: str = ""
    line_name: str = ""

    def x(self, value: float, frame: Frame) -> float:
        """Return the px column of a value in a frame."""
        return frame.left + (value - self.low) / (self.high - self.low) * (frame.right - frame.left)


def value_range(
    values: Sequence[float], sds: Sequence[float | None], *, least_span: float, plausible: tuple[float, float]
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
    """
    low, high = plausible
    if len(values) >= 4:
        first, _, third = quantiles(values, n=4, method="inclusive")
        low, high = min(low, first - 3 * (third - first)), max(high, third + 3 * (third - first))
    known = [sd for sd in sds if sd is not None]
    widest = 6 * median(known) if known else 0.0
    kept = [(value, sd) for value, sd in zip(values, sds, strict=True) if low <= value <= high]
    if not kept:
        kept = [(median(values), None)]
    least = min(value - min(2 * (sd or 0.0), widest) for value, sd in kept)
    most = max(value + min(2 * (sd or 0.0), widest) for value, sd in kept)
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


def draw_grid(
    painter: QPainter,
    frame: Frame,
    theme: Theme,
    *,
    depths: Sequence[float],
    markers: Sequence[float],
    ground: bool,
) -> None:
    """Draw grid lines at numbered depths and dotted marker lines across a frame; with `ground` one at 0."""
    for depth in depths:
        if frame.depth_top < depth < frame.depth_base:
            hairline_across(
                painter, frame.left, frame.right, frame.y(depth), theme.colour("hair"), theme.hairline
            )
    for depth in markers:
        if frame.depth_top < depth < frame.depth_base:
            dotted_across(painter, frame.left, frame.right, frame.y(depth), theme.colour("strong"))
    if ground:
        hairline_across(
            painter, frame.left, frame.right, frame.y(0.0), theme.colour("strong"), theme.hairline
        )


def draw_track_head(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    """Draw a track's title, unit, tick numbers and ticks above its frame, and its value grid inside it.

    The ink line under the head is drawn once for the whole plate, so that it is continuous.
    """
    head = frame.top - HEAD_HEIGHT
    unit_width = text_width(theme, "small", track.unit)
    box = draw_text(
        painter,
        theme,
        track.title,
        x=frame.left,
        baseline=head + TITLE_BASELINE,
        face="emphasis",
        room=(frame.left, frame.right - unit_width - 5),
    )
    draw_text(
        painter,
        theme,
        track.unit,
        x=box.right() + 5,
        baseline=head + TITLE_BASELINE,
        face="small",
        role="muted",
    )
    width = frame.right - frame.left
    for tick, words, middle in value_ticks(theme, track.low, track.high, left=frame.left, width=width):
        x = track.x(tick, frame)
        draw_text(
            painter,
            theme,
            words,
            x=middle,
            baseline=head + UNIT_BASELINE,
            face="small",
            role="muted",
            align="middle",
        )
        hairline_down(painter, x, frame.top - 5, frame.top - 1, theme.colour("ink"))
        zero = track.signed and tick == 0
        hairline_down(
            painter, x, frame.top, frame.base, theme.colour("strong" if zero else "hair"), theme.hairline
        )


def held_x(track: Track, value: float, frame: Frame) -> float:
    """Return the px column of a value, kept inside the frame."""
    return min(max(track.x(value, frame), frame.left), frame.right)


def touching(above: Step, below: Step) -> bool:
    """Return whether the base of one step is the top of the next."""
    return abs(above.base - below.top) <= 1e-6 * max(1.0, abs(below.top))


def _shown_steps(track: Track, frame: Frame) -> list[Step]:
    return [step for step in track.steps if step.base > frame.depth_top and step.top < frame.depth_base]


def joined_points(points: Sequence[Point]) -> list[list[Point]]:
    """Return the points of each part, in their order."""
    parts: dict[int, list[Point]] = {}
    for point in points:
        parts.setdefault(point.part, []).append(point)
    return list(parts.values())


def step_rows(step: Step, frame: Frame) -> tuple[int, int]:
    """Return the px rows of a step's top and base, kept inside the frame."""
    return whole(max(frame.y(step.top), frame.top)), whole(min(frame.y(step.base), frame.base))


def _draw_bands(painter: QPainter, track: Track, frame: Frame, theme: Theme, steps: Sequence[Step]) -> None:
    """Draw the bands of steps; a thin step has a whisker, but where thin steps are many they share a band.

    Many whiskers would run together into a dark block, so each px row of such steps is covered once, from the
    least to the greatest value of the bands in it.
    """
    band = QPainterPath()
    rows: dict[int, tuple[float, float]] = {}
    heights = [lower - upper for upper, lower in (step_rows(step, frame) for step in steps)]
    many_thin = sum(height < LEAST_BAND for height in heights) > len(steps) / MANY_THIN
    for step, height in zip(steps, heights, strict=True):
        if step.sd is None:
            continue
        upper, lower = step_rows(step, frame)
        left = held_x(track, step.value - 2 * step.sd, frame)
        right = held_x(track, step.value + 2 * step.sd, frame)
        if height >= LEAST_BAND:
            band.addRect(QRectF(left, upper, right - left, lower - upper))
        elif many_thin:
            for row in range(upper, max(lower, upper + 1)):
                low, high = rows.get(row, (left, right))
                rows[row] = (min(low, left), max(high, right))
        else:
            middle = (frame.y(step.top) + frame.y(step.base)) / 2
            smooth_line(painter, ((left, middle), (right, middle)), theme.colour("ink"), 1.3)
    for row, (left, right) in rows.items():
        band.addRect(QRectF(left, row, right - left, 1))
    painter.fillPath(band, theme.colour("ink", BAND_ALPHA))


def _draw_steps(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    steps = _shown_steps(track, frame)
    _draw_bands(painter, track, frame, theme, steps)
    stair = QPainterPath()
    before: Step | None = None
    for step in steps:
        upper, lower = step_rows(step, frame)
        x = held_x(track, step.value, frame)
        if before is not None and touching(before, step):
            stair.lineTo(QPointF(x, upper))
        else:
            stair.moveTo(QPointF(x, upper))
        stair.lineTo(QPointF(x, max(lower, upper + 0.5)))
        before = step
    stroke_shape(painter, stair, theme.colour("ink"), theme.step)


def _draw_points(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    shown = [point for point in track.points if frame.depth_top <= point.depth <= frame.depth_base]
    places = [(track.x(point.value, frame), frame.y(point.depth)) for point in shown]
    lines = [
        piece
        for part in joined_points(shown)
        for piece in inside_pieces(
            [(track.x(point.value, frame), frame.y(point.depth)) for point in part], frame
        )
    ]
    for piece in lines:
        smooth_line(painter, piece, theme.colour("strong"), 1)
    radius = DISC_RADIUS if len(shown) * 8 <= frame.base - frame.top else SMALL_RADIUS
    crowded = len(shown) * 3 > frame.base - frame.top
    for point, (_x, y) in zip(shown, places, strict=True):
        if point.sd is not None and not crowded:
            ends = [held_x(track, point.value + 2 * side * point.sd, frame) for side in (-1, 1)]
            if ends[1] - ends[0] > 2 * radius:
                smooth_line(painter, ((ends[0], y), (ends[1], y)), theme.colour("ink"), 1.3)
    if crowded:
        band = QPainterPath()
        for point, (_x, y) in zip(shown, places, strict=True):
            ends = [held_x(track, point.value + 2 * side * (point.sd or 0.0), frame) for side in (-1, 1)]
            band.addRect(QRectF(ends[0], whole(y), ends[1] - ends[0], 1))
        band.setFillRule(Qt.FillRule.WindingFill)
        painter.fillPath(band, theme.colour("ink", BAND_ALPHA))
        for piece in lines:
            smooth_line(painter, piece, theme.colour("ink"), 1.2)
        return
    for x, y in places:
        if frame.left <= x <= frame.right:
            for reach, role in ((radius + 1, "ground"), (radius, "ink")):
                disc = QPainterPath()
                disc.addEllipse(QPointF(x, y), reach, reach)
                fill_shape(painter, disc, theme.colour(role))


def _draw_line(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    """Draw the log; one crowded with samples as its mean line over its paler spread.

    Drawn sample by sample it would be a block of plum in which neither log nor staircase can be seen.
    """
    pieces = log_pieces(track.line_depths, track.line_values, track, frame)
    spreads = QPainterPath()
    for piece in pieces:
        sides = [
            [QPointF(min(max(row[side], frame.left), frame.right), row[2]) for row in piece.spread]
            for side in (0, 1)
        ]
        if piece.spread:
            spreads.addPolygon(QPolygonF([*sides[0], *reversed(sides[1])]))
            spreads.closeSubpath()
    fill_shape(painter, spreads, theme.colour("log", SPREAD_ALPHA))
    for piece in pieces:
        for part in inside_pieces(piece.line, frame):
            smooth_line(painter, part, theme.colour("log"), 1)


def _excursions(track: Track) -> list[tuple[float, float, str]]:
    """Return depth, value and role of what lies outside the scale: the extreme of each unbroken run."""
    samples = [((step.top + step.base) / 2, step.value) for step in track.steps]
    samples += [(point.depth, point.value) for point in track.points]
    found = [(depth, value, "ink") for depth, value in samples if not track.low <= value <= track.high]
    run: list[tuple[float, float]] = []
    for depth, value in [*zip(track.line_depths, track.line_values, strict=True), (0.0, None)]:
        side = 0 if value is None else (value > track.high) - (value < track.low)
        if run and (side == 0 or (run[-1][1] > track.high) != (side > 0)):
            extreme = max(run, key=lambda sample: abs(sample[1] - track.low))
            found.append((*extreme, "log"))
            run = []
        if side and value is not None:
            run.append((depth, value))
    return found


def _draw_wedges(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> list[QRectF]:
    """Draw wedges where values leave the scale, with the extreme value; return the boxes of the words."""
    middle = (track.low + track.high) / 2
    taken: list[QRectF] = []
    rows: list[tuple[int, float]] = []
    for depth, value, role in sorted(_excursions(track), key=lambda found: -abs(found[1] - middle)):
        if not frame.depth_top <= depth <= frame.depth_base:
            continue
        y = min(max(frame.y(depth), frame.top + 8), frame.base - 8)
        side, edge, align = (1, frame.right, "right") if value > track.high else (-1, frame.left, "left")
        if any(side == other and abs(row - y) < 18 for other, row in rows):
            continue
        rows.append((side, y))
        box = draw_text(
            painter,
            theme,
            number(value, track.decimals, signed=track.signed),
            x=edge - side * (WEDGE + 3),
            baseline=y + 4.5,
            face="small",
            role=role,
            align=align,
            knock_out=True,
        )
        fill_shape(
            painter,
            polygon((edge, y), (edge - side * WEDGE, y - WEDGE / 2), (edge - side * WEDGE, y + WEDGE / 2)),
            theme.colour(role),
        )
        taken.append(box)
    return taken


def draw_track(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> list[QRectF]:
    """Draw the curves of a track inside its frame and return the boxes of the words written among them.

    Log under staircase, points on top; what leaves the value scale ends at the edge, with a wedge and the
    extreme value. Names at the curves are left to `plumbwell.plates.naming`.
    """
    _draw_line(painter, track, frame, theme)
    _draw_steps(painter, track, frame, theme)
    _draw_points(painter, track, frame, theme)
    return _draw_wedges(painter, track, frame, theme)


def draw_selection_band(painter: QPainter, frame: Frame, theme: Theme, *, top: float, base: float) -> None:
    """Draw the selected depths as a tinted band with accent edges across a frame; equal ones as a line."""
    upper, lower = frame.y(max(top, frame.depth_top)), frame.y(min(base, frame.depth_base))
    if lower > upper:
        painter.fillPath(rectangle(frame.left, whole(upper), frame.right, whole(lower)), theme.colour("tint"))
        hairline_across(painter, frame.left, frame.right, lower, theme.colour("accent"))
    hairline_across(painter, frame.left, frame.right, upper, theme.colour("accent"))
