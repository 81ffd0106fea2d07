"""The cells of a ledger as painted: rows of one height, values over their slots, the frame of the current cell.

A number that finds no room becomes an ellipsis; cut short it would be a wrong number. Texts are shortened.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.desk.ledger.ledger_words import ColumnWords
from plumbwell.plates.lettering import ELLIPSIS, draw_text, text_height, text_width
from plumbwell.plates.numbers import NO_VALUE
from plumbwell.plates.painting import draw_mark, hairline_across, stroke_shape, whole
from plumbwell.plates.theme import Theme

ROW_HEIGHT = 24
EDGE, LEAD, ROOM, SD_GAP = 8, 16, 4, 5
MARK_CENTRE, MARK_ROOM, BAR = 11, 22, 3
FRAME = 1.4
WIDEST_TEXT, WIDEST_LABEL = 220, 140


@dataclass(frozen=True, slots=True, kw_only=True)
class RowInView:
    """A row as it lies in the view: its table row, px of its upper edge, and its state."""

    row: int
    top: int
    chosen: bool
    hovered: bool
    excluded: bool


@dataclass(frozen=True, eq=False, kw_only=True)
class ColumnFit:
    """A column measured in a theme.

    Parameters
    ----------
    words : ColumnWords
    theme : Theme
    """

    words: ColumnWords
    theme: Theme

    @cached_property
    def sd_slot(self) -> float:
        """Px at the right that standard deviations take, the gap before them included."""
        width = self.words.sd_width(self.theme)
        return width + self.theme.px(SD_GAP) if width else 0.0

    @cached_property
    def natural(self) -> int:
        """The width in px that shows every number of the column and its head."""
        theme, words = self.theme, self.words
        content = self.words.value_width(theme) + self.sd_slot
        if words.is_text:
            content = min(content, theme.px(WIDEST_TEXT))
        head = max(text_width(theme, "emphasis", words.column.name), text_width(theme, "small", words.unit))
        return whole(max(content, head) + 0.5) + theme.px(EDGE if words.is_text else LEAD) + theme.px(EDGE)


def number_column_width(numbers: ColumnWords, theme: Theme) -> int:
    """Width in px of the frozen first column: room for a mark, then the widest number or label."""
    content = min(numbers.value_width(theme), theme.px(WIDEST_LABEL))
    head = max(text_width(theme, "emphasis", numbers.column.name), text_width(theme, "small", numbers.unit))
    inner = max(theme.px(MARK_ROOM + ROOM) + content, theme.px(EDGE) + head)
    return whole(inner + 0.5) + theme.px(EDGE)


def row_height(theme: Theme) -> int:
    """Height of every row in px, its hairline included."""
    return theme.px(ROW_HEIGHT)


def baseline(theme: Theme) -> float:
    """How far the baseline of the text lies below the upper edge of a row."""
    return (row_height(theme) - 1 + text_height(theme, "text")) / 2


def draw_row_grounds(
    painter: QPainter, theme: Theme, rows: Sequence[RowInView], *, left: float, right: float, bar: bool
) -> None:
    """Fill chosen and hovered rows and draw the hairline under each; with the accent bar where `bar` says so."""
    height = row_height(theme)
    hair, tint, sunk = theme.colour("hair"), theme.colour("tint"), theme.colour("sunk")
    for one in rows:
        if one.chosen or one.hovered:
            painter.fillRect(QRectF(left, one.top, right - left, height - 1), tint if one.chosen else sunk)
        hairline_across(painter, left, right, one.top + height - 1, hair)
        if bar and one.chosen:
            painter.fillRect(QRectF(left, one.top, BAR, height), theme.colour("accent"))


def draw_row_heads(
    painter: QPainter,
    theme: Theme,
    rows: Sequence[RowInView],
    *,
    numbers: Sequence[str],
    marks: Sequence[str | None],
    width: float,
) -> None:
    """Draw the frozen first column: mark and number of each row, Semibold where it is chosen."""
    height, down = row_height(theme), baseline(theme)
    edge = width - theme.px(EDGE)
    for one in rows:
        mark = marks[one.row] or ("excluded" if one.excluded else None)
        if mark:
            draw_mark(painter, theme, mark, x=theme.px(MARK_CENTRE), y=one.top + (height - 1) / 2)
        draw_text(
            painter,
            theme,
            numbers[one.row],
            x=edge,
            baseline=one.top + down,
            face="emphasis" if one.chosen else "text",
            role="muted" if one.excluded else "ink",
            align="right",
            room=(float(theme.px(MARK_ROOM)), edge),
        )


def draw_column(
    painter: QPainter,
    fit: ColumnFit,
    rows: Sequence[RowInView],
    *,
    left: float,
    right: float,
    width: float,
    stale: bool,
    current: int | None,
) -> None:
    """Draw the cells of a column.

    Parameters
    ----------
    fit : ColumnFit
    rows : sequence of RowInView
    left, right : float
        Edges of the column in px.
    width : float
        Px in view, from 0. A number that would be cut there is not shown in part.
    stale : bool
        Numbers are muted until the new ones are there.
    current : int or None
        Table row of the current cell, when it is in this column.
    """
    words, theme = fit.words, fit.theme
    down, edge = baseline(theme), right - theme.px(EDGE)
    strike = whole(down - text_height(theme, "text") / 2)
    # Texts keep to what is in view of their column; numbers are in view as a whole or not at all.
    seen = min(edge, width - theme.px(ROOM))
    start = max(left, 0.0) + theme.px(EDGE if words.is_text else ROOM)
    value_edge = edge - fit.sd_slot
    if seen - start < text_width(theme, "text", ELLIPSIS):
        return
    for one in rows:
        row, line = one.row, one.top + down
        value = words.value(row)
        known = value != NO_VALUE if not words.is_text else bool(value)
        quiet = one.excluded or not known or (stale and not words.is_text)
        amber = not quiet and words.wants_look(row)
        face = words.face(strong=amber or row == current)
        role = "muted" if quiet else "amber" if amber else "ink"
        if words.is_text:
            draw_text(painter, theme, value, x=start, baseline=line, face=face, role=role, room=(start, seen))
        elif text_width(theme, face, value) > (value_edge if known else edge) - start or edge > width:
            _draw_right(painter, theme, ELLIPSIS, seen, line, start, face="text", role="muted")
        else:
            sd = words.sd(row)
            # A column's dashes stand at its edge: there is no standard deviation to leave room for.
            _draw_right(painter, theme, value, value_edge if known else edge, line, start, face=face, role=role)
            if sd:
                _draw_right(painter, theme, sd, edge, line, value_edge, face="text", role="muted")
        if one.excluded and known:
            hairline_across(painter, left + theme.px(EDGE), edge, one.top + strike, theme.colour("muted"))


def _draw_right(
    painter: QPainter, theme: Theme, words: str, x: float, line: float, start: float, *, face: str, role: str
) -> None:
    draw_text(
        painter, theme, words, x=x, baseline=line, face=face, role=role, align="right", room=(min(start, x), x)
    )


def draw_current(painter: QPainter, theme: Theme, *, left: float, right: float, top: float) -> None:
    """Draw the accent frame inside the current cell."""
    inset = 1 + FRAME / 2
    frame = QPainterPath()
    height = row_height(theme) - 1
    frame.addRect(QRectF(left + inset, top + inset, right - left - 2 * inset, height - 2 * inset))
    stroke_shape(painter, frame, theme.colour("accent"), FRAME)
