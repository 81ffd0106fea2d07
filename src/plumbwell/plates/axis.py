"""Axes: depth windows, value scales, ticks at 1, 2 and 5 times powers of ten, the graduated depth axis.

Depth grows downward on the page. Depths and values are in the units of people; px are whole where lines lie.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import ceil, floor, log10

import numpy as np
from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter

from plumbwell.plates.lettering import draw_text, text_height, text_width
from plumbwell.plates.numbers import number, step_decimals
from plumbwell.plates.painting import draw_graduated_bar, hairline_across, whole
from plumbwell.plates.theme import Theme
from plumbwell.survey.column import Array

STATION_TICK, LEAST_TICK_GAP = 4, 3
BAR_LEFT, NUMBERS_LEFT = 8, 21


def head_height(theme: Theme) -> int:
    """Return the height of the heads of ledger and tracks in px: 52, grown with the text."""
    return theme.px(52)


def title_baseline(theme: Theme) -> int:
    """Return how far below the upper edge of a head its names stand, in px: 22, grown with the text."""
    return theme.px(22)


def unit_baseline(theme: Theme) -> int:
    """Return how far below the upper edge of a head its units stand, in px: 41, grown with the text."""
    return theme.px(41)


def axis_width(theme: Theme) -> int:
    """Return the width of the depth axis in px: 58, grown with the text."""
    return theme.px(58)


@dataclass(frozen=True, slots=True, kw_only=True)
class Frame:
    """A rectangle in px with the depth window it shows: depth grows from its top edge to its base.

    With `upward` the numbers that are written grow upward: depth is the negative of an elevation.
    """

    left: float
    top: float
    right: float
    base: float
    depth_top: float
    depth_base: float
    upward: bool = False

    def number_of(self, depth: float) -> float:
        """Return the number that is written for a depth."""
        return 0.0 - depth if self.upward else depth

    def y(self, depth: float) -> float:
        """Return the px row of a depth."""
        share = (depth - self.depth_top) / (self.depth_base - self.depth_top)
        return self.top + share * (self.base - self.top)

    def y_of(self, depths: Array) -> Array:
        """Return the px rows of many depths."""
        share = (depths - self.depth_top) / (self.depth_base - self.depth_top)
        return np.asarray(self.top + share * (self.base - self.top))

    def across(self, left: float, right: float) -> Frame:
        """Return the frame with the same depths between other edges."""
        return Frame(
            left=left,
            top=self.top,
            right=right,
            base=self.base,
            depth_top=self.depth_top,
            depth_base=self.depth_base,
            upward=self.upward,
        )


def round_step(least: float) -> tuple[float, int]:
    """Return the smallest step of 1, 2 or 5 x 10^n that is at least `least`, and its leading figure."""
    exponent = floor(log10(least))
    for figure, power in ((1, exponent), (2, exponent), (5, exponent), (1, exponent + 1)):
        # Written as text so that 5 x 10^-3 is the float nearest to 0.005, not a product of two roundings.
        step = float(f"{figure}e{power}")
        if step >= least * (1 - 1e-9):
            return step, figure
    return float(f"2e{exponent + 1}"), 2


def multiples(step: float, low: float, high: float) -> list[float]:
    """Return the multiples of `step` from `low` to `high`, ends included."""
    first, last = ceil(low / step - 1e-9), floor(high / step + 1e-9)
    decimals = step_decimals(step)
    return [round(index * step, decimals) + 0.0 for index in range(first, last + 1)]


def value_ticks(
    theme: Theme, low: float, high: float, *, left: float, width: float, counted_from: float = 0.0
) -> list[tuple[float, str, float]]:
    """Return the ticks of a value axis, their numbers and the px columns on which the numbers are centred.

    Three to six numbers where they find room, at multiples of 1, 2 or 5 x 10^n. The numbers at both ends are
    shifted into the axis, not dropped.

    Parameters
    ----------
    low, high : float
        Ends of the scale.
    left, width : float
        Left edge and width of the axis in px.
    counted_from : float
        What the numbers count from.
    """
    best: list[tuple[float, str, float]] = []
    for gap in (8.0, 4.0):
        for wanted in (6, 5, 4, 3, 7, 2, 1):
            step, _ = round_step((high - low) / wanted)
            row: list[tuple[float, str, float]] = []
            end = left - gap
            for tick in multiples(step, low, high):
                words = number(tick - counted_from, step_decimals(step))
                half = text_width(theme, "small", words) / 2
                middle = left + (tick - low) / (high - low) * width
                middle = min(max(middle, left + half), left + width - half)
                if middle - half < end + gap - 1e-6:
                    break
                row.append((tick, words, middle))
                end = middle + half
            else:
                if len(row) >= 3:
                    return row
                best = row if len(row) > len(best) else best
    return best


@dataclass(frozen=True, slots=True, kw_only=True)
class Graduation:
    """Fields of a depth axis: the step of one field and how many fields lie between two numbers."""

    step: float
    fields: int

    @property
    def numbered(self) -> float:
        """Distance between numbers."""
        return float(f"{self.step * self.fields:.6g}")


def strip_graduation(depth_span: float, height: float) -> Graduation:
    """Return the graduation of a core strip: a step of 1, 2 or 5 x 10^n that makes 20 to 40 fields."""
    step, figure = round_step(max(depth_span / 40, 4 * depth_span / height))
    fields = 5 if figure == 2 else 2
    while step * fields / depth_span * height < 20:
        fields *= 5 if fields in (2, 4) else 2
    return Graduation(step=step, fields=fields)


def track_graduation(depth_span: float, height: float) -> Graduation:
    """Return the graduation of the tracks' depth axis: fields of 12 to 30 px, a number every five."""
    step, figure = round_step(12 * depth_span / height)
    return Graduation(step=step, fields=5)


def depth_fields(graduation: Graduation, frame: Frame, first: float, last: float) -> tuple[list[float], int]:
    """Return the boundaries in px of the fields between two depths, and the number of the first field."""
    depths = [first, *multiples(graduation.step, first, last), last]
    edges = [frame.y(depth) for depth in depths]
    edges = [edge for index, edge in enumerate(edges) if index == 0 or edge - edges[index - 1] > 0.5]
    return edges, floor(first / graduation.step + 1e-9)


def spaced_rows(frame: Frame, depths: Sequence[float], gap: float) -> list[int]:
    """Return the px rows of depths inside a frame, thinned so that no two are closer than `gap`."""
    rows: list[int] = []
    for depth in sorted(depths):
        if frame.depth_top <= depth <= frame.depth_base:
            row = whole(frame.y(depth))
            if not rows or row - rows[-1] >= gap:
                rows.append(row)
    return rows


def numbered_depths(frame: Frame, measured: tuple[float, float]) -> list[float]:
    """Return the depths that have a number on the tracks' depth axis, inside the frame and the measured range."""
    graduation = track_graduation(frame.depth_base - frame.depth_top, frame.base - frame.top)
    first, last = max(measured[0], frame.depth_top), min(measured[1], frame.depth_base)
    return multiples(graduation.numbered, first, last) if first <= last else []


def axis_room(theme: Theme, frame: Frame, measured: tuple[float, float], label: str) -> float:
    """Return the width in px that the depth axis needs: 58, more for long numbers and a long label.

    The numbers of the whole measured range count, so that the axis keeps its width while the window moves.
    """
    graduation = track_graduation(frame.depth_base - frame.depth_top, frame.base - frame.top)
    decimals = step_decimals(graduation.numbered)
    numbers = [number(frame.number_of(depth), decimals) for depth in measured]
    widest = max(text_width(theme, "small", words) for words in numbers)
    return max(axis_width(theme), NUMBERS_LEFT + widest + 6, text_width(theme, "emphasis", label) + theme.px(8))


def number_baseline(theme: Theme, frame: Frame, depth: float) -> float:
    """Return the baseline of a number on the tracks' depth axis: beside its depth, and inside the frame."""
    cap = text_height(theme, "small")
    return min(max(frame.y(depth) + cap / 2, frame.top + cap + 4), frame.base - 1)


def number_boxes(theme: Theme, frame: Frame, measured: tuple[float, float]) -> list[QRectF]:
    """Return the boxes of the numbers on the tracks' depth axis, in px."""
    depths = numbered_depths(frame, measured)
    graduation = track_graduation(frame.depth_base - frame.depth_top, frame.base - frame.top)
    texts = [number(frame.number_of(depth), step_decimals(graduation.numbered)) for depth in depths]
    widths = [text_width(theme, "small", words) for words in texts]
    right, cap = frame.left + NUMBERS_LEFT + max(widths, default=0.0), text_height(theme, "small")
    return [
        QRectF(right - width, number_baseline(theme, frame, depth) - cap, width, cap)
        for depth, width in zip(depths, widths, strict=True)
    ]


def draw_depth_axis(
    painter: QPainter,
    frame: Frame,
    theme: Theme,
    *,
    label: str,
    unit: str,
    stations: Sequence[float],
    measured: tuple[float, float],
    head_room: float = 0.0,
    inset: float = 0.0,
) -> list[float]:
    """Draw the depth axis of the tracks with its head, and return the numbered depths for the grid.

    Parameters
    ----------
    painter : QPainter
    frame : Frame
        The axis below its head; the head takes the px above.
    theme : Theme
    label, unit : str
        What depth is ("depth", "MD", "chainage") and its unit.
    stations : sequence of float
        Depths of stations, drawn as ticks.
    measured : tuple of float
        Depths from and to which the bar is drawn, inside those of the frame.
    head_room : float
        Empty px left of the axis' head, for a long label.
    inset : float
        How far right of the left edge a label stands that has its unit beside it.
    """
    head, gap, edge = frame.top - head_height(theme), theme.px(5), frame.right - theme.px(8)
    unit_width = text_width(theme, "small", unit)
    if inset + text_width(theme, "emphasis", label) + gap + unit_width <= frame.right - frame.left + 4:
        left = frame.left + inset
        box = draw_text(painter, theme, label, x=left, baseline=head + title_baseline(theme), face="emphasis")
        x, baseline, align = box.right() + gap, head + title_baseline(theme), "left"
    else:
        room = (frame.left - head_room, edge)
        draw_text(
            painter,
            theme,
            label,
            x=edge,
            baseline=head + title_baseline(theme),
            face="emphasis",
            align="right",
            room=room,
        )
        x, baseline, align = edge, head + unit_baseline(theme), "right"
    draw_text(painter, theme, unit, x=x, baseline=baseline, face="small", role="muted", align=align)
    graduation = track_graduation(frame.depth_base - frame.depth_top, frame.base - frame.top)
    first, last = max(measured[0], frame.depth_top), min(measured[1], frame.depth_base)
    bar = frame.left + BAR_LEFT
    if first < last:
        edges, before = depth_fields(graduation, frame, first, last)
        draw_graduated_bar(painter, theme, x=bar, edges=edges, fields_before=before)
    for row in spaced_rows(frame, stations, LEAST_TICK_GAP):
        hairline_across(painter, bar + 4, bar + 4 + STATION_TICK, row, theme.colour("ink"))
    numbered = numbered_depths(frame, measured)
    texts = [number(frame.number_of(depth), step_decimals(graduation.numbered)) for depth in numbered]
    numbers_right = frame.left + NUMBERS_LEFT + max((text_width(theme, "small", words) for words in texts), default=0.0)
    for depth, words in zip(numbered, texts, strict=True):
        baseline = number_baseline(theme, frame, depth)
        draw_text(painter, theme, words, x=numbers_right, baseline=baseline, face="small", align="right")
    return numbered
