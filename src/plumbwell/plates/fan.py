"""The fan: every row of the ledger flows, in its own tone, into the true depth it stands for.

Rows are equally tall and rock is not; ribbons join the two. Coordinates in px of the plate.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QPointF
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.plates.axis import Frame
from plumbwell.plates.painting import fill_tone, stroke_shape
from plumbwell.plates.theme import Theme

STRAIGHT = 6.0


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


def _edge(path: QPainterPath, left: float, right: float, start: float, end: float, *, backward: bool) -> None:
    """Add the S-shaped edge of a ribbon: straight, a cubic with control points at mid width, straight."""
    middle = (left + right) / 2
    if backward:
        path.lineTo(QPointF(right - STRAIGHT, end))
        path.cubicTo(QPointF(middle, end), QPointF(middle, start), QPointF(left + STRAIGHT, start))
        path.lineTo(QPointF(left, start))
    else:
        path.lineTo(QPointF(left + STRAIGHT, start))
        path.cubicTo(QPointF(middle, start), QPointF(middle, end), QPointF(right - STRAIGHT, end))
        path.lineTo(QPointF(right, end))


def ribbon_shape(ribbon: Ribbon, frame: Frame) -> QPainterPath:
    """Return the closed shape of a ribbon between the sides of a frame."""
    path = QPainterPath(QPointF(frame.left, ribbon.row_top))
    top, base = (min(max(frame.y(depth), frame.top), frame.base) for depth in (ribbon.top, ribbon.base))
    _edge(path, frame.left, frame.right, ribbon.row_top, top, backward=False)
    path.lineTo(QPointF(frame.right, base))
    _edge(path, frame.left, frame.right, ribbon.row_base, base, backward=True)
    path.closeSubpath()
    return path


def _boundary(frame: Frame, row: float, depth: float) -> QPainterPath:
    path = QPainterPath(QPointF(frame.left, row))
    _edge(path, frame.left, frame.right, row, min(max(frame.y(depth), frame.top), frame.base), backward=False)
    return path


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
    """Draw ribbons in their tones, parted by ground lines; a selected one is outlined in accent.

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
    for ribbon in ribbons:
        if ribbon.selected:
            stroke_shape(painter, ribbon_shape(ribbon, frame), theme.colour("accent"), 2)
