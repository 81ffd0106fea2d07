"""The fan: every row of the ledger flows, in its own tone, into the true depth it stands for.

Rows are equally tall and rock is not; ribbons join the two. Coordinates in px of the plate.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QPointF
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.plates.axis import Frame
from plumbwell.plates.painting import fill_tone, stroke_shape, whole
from plumbwell.plates.theme import Theme

STRAIGHT = 6.0
THREAD, CASING = 2.0, 4.0
# Ribbons end so many heights of the frame out of view at the most: a painter's px are not without end.
BEYOND = 4.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Ribbon:
    """A ribbon from px rows at the ledger to depths at the tracks.

    Parameters
    ----------
    row_top, row_base : float
        Edges at the ledger in px.
    top, base : float
        Edges at the tracks in depth.
    density : float or None
        In g/cm3, for the tone.
    from_prior, selected : bool
    """

    row_top: float
    row_base: float
    top: float
    base: float
    density: float | None
    from_prior: bool = False
    selected: bool = False


def _held_y(frame: Frame, depth: float) -> float:
    """Return the px row of a depth; far outside the frame it is held."""
    reach = BEYOND * (frame.base - frame.top)
    return min(max(frame.y(depth), frame.top - reach), frame.base + reach)


def _edge(
    path: QPainterPath,
    left: float,
    right: float,
    start: float,
    end: float,
    *,
    backward: bool = False,
    inset: float = 0.0,
) -> None:
    """Add the S-shaped edge of a ribbon: straight, a cubic with control points at mid width, straight.

    With `inset` the straight ends stop short of both sides.
    """
    middle = (left + right) / 2
    if backward:
        path.lineTo(QPointF(right - STRAIGHT, end))
        path.cubicTo(QPointF(middle, end), QPointF(middle, start), QPointF(left + STRAIGHT, start))
        path.lineTo(QPointF(left + inset, start))
    else:
        path.lineTo(QPointF(left + STRAIGHT, start))
        path.cubicTo(QPointF(middle, start), QPointF(middle, end), QPointF(right - STRAIGHT, end))
        path.lineTo(QPointF(right - inset, end))


def ribbon_shape(ribbon: Ribbon, frame: Frame) -> QPainterPath:
    """Return the closed shape of a ribbon between the sides of a frame."""
    path = QPainterPath(QPointF(frame.left, ribbon.row_top))
    top, base = _held_y(frame, ribbon.top), _held_y(frame, ribbon.base)
    _edge(path, frame.left, frame.right, ribbon.row_top, top)
    path.lineTo(QPointF(frame.right, base))
    _edge(path, frame.left, frame.right, ribbon.row_base, base, backward=True)
    path.closeSubpath()
    return path


def _boundary(frame: Frame, row: float, depth: float) -> QPainterPath:
    path = QPainterPath(QPointF(frame.left, row))
    _edge(path, frame.left, frame.right, row, _held_y(frame, depth))
    return path


def boundary_row(frame: Frame, row: float, depth: float, x: float) -> float:
    """Return the px row in which the edge from a ledger's px row to a depth crosses a px column."""
    left, right = frame.left + STRAIGHT, frame.right - STRAIGHT
    end = _held_y(frame, depth)
    if x <= left or x >= right:
        return row if x <= left else end
    middle = (left + right) / 2
    low, high = 0.0, 1.0
    # Both control points lie at mid width, so that the column grows with the curve's parameter.
    for _ in range(24):
        part = (low + high) / 2
        rest = 1 - part
        column = rest**3 * left + 3 * rest * part * middle + part**3 * right
        low, high = (part, high) if column < x else (low, part)
    share = low * low * (3 - 2 * low)
    return row + share * (end - row)


def interval_ribbons(
    intervals: Sequence[tuple[float, float, float | None, bool]], *, first_row: float, row_height: float
) -> list[Ribbon]:
    """Return one ribbon a row from (top, base, density, from prior), rows downward from `first_row` px."""
    return [
        Ribbon(
            row_top=first_row + index * row_height,
            row_base=first_row + (index + 1) * row_height,
            top=top,
            base=base,
            density=density,
            from_prior=prior,
        )
        for index, (top, base, density, prior) in enumerate(intervals)
    ]


def station_ribbons(
    depths: Sequence[float], densities: Sequence[float | None], *, first_row: float, row_height: float
) -> list[Ribbon]:
    """Return ribbons between the centres of neighbouring station rows; one density fewer than depths."""
    return [
        Ribbon(
            row_top=first_row + (index + 0.5) * row_height,
            row_base=first_row + (index + 1.5) * row_height,
            top=depths[index],
            base=depths[index + 1],
            density=density,
        )
        for index, density in enumerate(densities)
    ]


def draw_fan(painter: QPainter, ribbons: Sequence[Ribbon], frame: Frame, theme: Theme) -> None:
    """Draw ribbons in their tones, parted by ground lines; selected ones are outlined in accent.

    The free edges, above and below and where neighbours do not touch, have an ink outline: the lightest tones
    hardly differ from paper.
    """
    for ribbon in ribbons:
        if ribbon.density is not None:
            fill_tone(
                painter, ribbon_shape(ribbon, frame), theme, ribbon.density, from_prior=ribbon.from_prior
            )
    edges: dict[tuple[float, float], list[bool]] = {}
    for ribbon in ribbons:
        for edge in ((ribbon.row_top, ribbon.top), (ribbon.row_base, ribbon.base)):
            edges.setdefault(edge, []).append(ribbon.density is not None)
    for (row, depth), known in edges.items():
        boundary = _boundary(frame, row, depth)
        if not any(known):
            stroke_shape(painter, boundary, theme.colour("strong"), 1, (1, 3))
        elif known == [True, True]:
            stroke_shape(painter, boundary, theme.colour("ground"), 1.1)
        else:
            stroke_shape(painter, boundary, theme.colour("ink"), 1)
    draw_interval_threads(painter, [ribbon for ribbon in ribbons if ribbon.selected], frame, theme)


def draw_interval_threads(
    painter: QPainter, ribbons: Sequence[Ribbon], frame: Frame, theme: Theme
) -> None:
    """Outline ribbons in accent; those that touch have one outline.

    The outline lies inside the ribbon on whole px: at the left it takes the first and last px of the row, at the
    right the px rows on which tracks draw the edges of the band.
    """
    merged: list[Ribbon] = []
    for ribbon in ribbons:
        above = merged[-1] if merged else None
        if above is not None and (above.row_base, above.base) == (ribbon.row_top, ribbon.top):
            merged[-1] = Ribbon(
                row_top=above.row_top, row_base=ribbon.row_base, top=above.top, base=ribbon.base, density=None
            )
        else:
            merged.append(ribbon)
    half = THREAD / 2
    for ribbon in merged:
        upper = whole(_held_y(frame, ribbon.top)) + half
        lower = max(whole(_held_y(frame, ribbon.base)) + 1 - half, upper)
        path = QPainterPath(QPointF(frame.left + half, ribbon.row_top + half))
        _edge(path, frame.left, frame.right, ribbon.row_top + half, upper, inset=half)
        path.lineTo(QPointF(frame.right - half, lower))
        _edge(path, frame.left, frame.right, ribbon.row_base - half, lower, backward=True, inset=half)
        path.closeSubpath()
        stroke_shape(painter, path, theme.colour("accent"), THREAD)


def draw_station_threads(
    painter: QPainter, stations: Sequence[tuple[float, float]], frame: Frame, theme: Theme
) -> None:
    """Draw chosen stations, each from the px row of its ledger row's middle to its depth, cased in ground."""
    lines = []
    for row, depth in stations:
        # One of its two px rows is the one on which tracks draw the station.
        start, end = float(whole(row)), whole(_held_y(frame, depth)) + THREAD / 2
        line = QPainterPath(QPointF(frame.left, start))
        _edge(line, frame.left, frame.right, start, end)
        lines.append(line)
    for role, width in (("ground", CASING), ("accent", THREAD)):
        for line in lines:
            stroke_shape(painter, line, theme.colour(role), width)
