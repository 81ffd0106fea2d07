"""Upright value axis of plots against time: its scale, ticks at 1, 2 and 5 times powers of ten, numbers and grid.

Values grow upward, px downward. Units are those of the caller.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtGui import QPainter

from plumbwell.plates.axis import multiples, round_step
from plumbwell.plates.lettering import draw_text, text_height, text_width
from plumbwell.plates.numbers import number, step_decimals
from plumbwell.plates.painting import hairline_across
from plumbwell.plates.theme import Theme

TICK_ROOM = 20


@dataclass(frozen=True, slots=True, kw_only=True)
class UprightScale:
    """Values between two px rows: `high` at the top, `low` at the base."""

    top: float
    base: float
    low: float
    high: float

    def y(self, value: float) -> float:
        """Return the px row of a value."""
        return self.base - (value - self.low) / (self.high - self.low) * (self.base - self.top)

    def value(self, y: float) -> float:
        """Return the value of a px row."""
        return self.low + (self.base - y) / (self.base - self.top) * (self.high - self.low)

    def held(self, value: float) -> float:
        """Return the px row of a value, kept between top and base."""
        return min(max(self.y(value), self.top), self.base)


def upright_ticks(theme: Theme, scale: UprightScale) -> list[tuple[float, str]]:
    """Return the ticks of a scale and their numbers: three to six where they find room, else as near to that."""
    most = max((scale.base - scale.top) / theme.px(TICK_ROOM), 1.0)
    best: list[tuple[float, str]] = []
    for wanted in (6, 5, 4, 3, 7, 2, 1):
        step, _ = round_step((scale.high - scale.low) / wanted)
        if (scale.high - scale.low) / step > most:
            continue
        ticks = [(tick, number(tick, step_decimals(step))) for tick in multiples(step, scale.low, scale.high)]
        if len(ticks) >= 3:
            return ticks
        best = ticks if len(ticks) > len(best) else best
    return best


def numbers_width(theme: Theme, ticks: Sequence[tuple[float, str]]) -> float:
    """Return the width of the widest number, px."""
    return max((text_width(theme, "small", words) for _, words in ticks), default=0.0)


def draw_upright_numbers(
    painter: QPainter,
    theme: Theme,
    scale: UprightScale,
    ticks: Sequence[tuple[float, str]],
    *,
    left: float,
    right: float,
) -> None:
    """Draw the numbers of ticks, their right edges at `right`; the uppermost and lowest are shifted in."""
    cap = text_height(theme, "small")
    for tick, words in ticks:
        baseline = min(max(scale.y(tick) + cap / 2, scale.top + cap + 3), scale.base + cap / 2)
        draw_text(
            painter,
            theme,
            words,
            x=right,
            baseline=baseline,
            face="small",
            role="muted",
            align="right",
            room=(left, right),
        )


def draw_upright_grid(
    painter: QPainter,
    theme: Theme,
    scale: UprightScale,
    ticks: Sequence[tuple[float, str]],
    *,
    left: float,
    right: float,
    zero: bool,
) -> None:
    """Draw the grid lines of ticks between two px columns; with `zero` the line of zero in `strong`."""
    for tick, _ in ticks:
        if tick != 0 or not zero:
            hairline_across(painter, left, right, scale.y(tick), theme.colour("hair"), theme.hairline)
    if zero and scale.low <= 0 <= scale.high:
        hairline_across(painter, left, right, scale.y(0.0), theme.colour("strong"), theme.hairline)
