"""Marks of readings and visits: one shape and colour a run, whiskers, the cross of what is left out, wedges, rings.

Places in px. Runs are told apart by shape as well as colour: disc, square, triangle in turn; after three the mark
at the run's name is hollow. In a plot filled and hollow tell repeated stations from single ones.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from functools import cache

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QBrush, QPainter, QPainterPath, QPen

from plumbwell.plates.painting import fill_shape, polygon, stroke_shape
from plumbwell.plates.theme import Theme

DISC, SQUARE, TRIANGLE = "disc", "square", "triangle"
SHAPES = (DISC, SQUARE, TRIANGLE)
RIM, EDGE, WHISKER = 1.0, 1.4, 1.3
REACH, CROSS_REACH, RING_RADIUS, WEDGE = 3.6, 3.5, 7.0, 6.0


def run_role(run_index: int) -> str:
    """Return the colour role of a run: "run_1", "run_2", "run_3" in turn."""
    return f"run_{run_index % len(SHAPES) + 1}"


def run_shape(run_index: int) -> str:
    """Return the shape of a run's marks: "disc", "square", "triangle" in turn."""
    return SHAPES[run_index % len(SHAPES)]


def run_filled(run_index: int) -> bool:
    """Return whether the mark at a run's name is filled: of the first three runs, and again after six."""
    return run_index // len(SHAPES) % 2 == 0


@cache
def _outline(shape: str, reach: float) -> QPainterPath:
    """Return a mark's outline about the origin; `reach` is the radius of the disc, others look as large."""
    path = QPainterPath()
    if shape == DISC:
        path.addEllipse(QPointF(0.0, 0.0), reach, reach)
    elif shape == SQUARE:
        half = 0.92 * reach
        path.addRect(QRectF(-half, -half, 2 * half, 2 * half))
    else:
        path = polygon((0.0, -1.25 * reach), (1.15 * reach, 0.8 * reach), (-1.15 * reach, 0.8 * reach))
    return path


def draw_run_marks(
    painter: QPainter,
    theme: Theme,
    run_index: int,
    places: Iterable[tuple[float, float, bool]],
    *,
    reach: float = REACH,
) -> None:
    """Draw marks of a run, each with a rim of `ground` that parts it from the one under it.

    Parameters
    ----------
    painter, theme
    run_index : int
        Sets shape and colour.
    places : iterable of (float, float, bool)
        Column and row in px, and whether the mark is filled.
    reach : float
        Radius of the disc in px; the other shapes look as large.
    """
    shape = run_shape(run_index)
    rim, full, hollow = (_outline(shape, reach + more) for more in (RIM, 0.0, -EDGE / 2))
    ground, colour = QBrush(theme.colour("ground")), QBrush(theme.colour(run_role(run_index)))
    edge = QPen(colour, EDGE, Qt.PenStyle.SolidLine, Qt.PenCapStyle.FlatCap, Qt.PenJoinStyle.MiterJoin)
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    for x, y, filled in places:
        painter.fillPath(rim.translated(x, y), ground)
        if filled:
            painter.fillPath(full.translated(x, y), colour)
        else:
            painter.strokePath(hollow.translated(x, y), edge)
    painter.restore()


def draw_whiskers(
    painter: QPainter, theme: Theme, whiskers: Sequence[tuple[float, float, float]], *, role: str
) -> None:
    """Draw upright whiskers (column, upper and lower row) without end caps."""
    lines = QPainterPath()
    for x, upper, lower in whiskers:
        lines.moveTo(QPointF(x, upper))
        lines.lineTo(QPointF(x, lower))
    stroke_shape(painter, lines, theme.colour(role), WHISKER)


def draw_left_out(
    painter: QPainter, theme: Theme, places: Sequence[tuple[float, float]], *, reach: float = CROSS_REACH
) -> None:
    """Draw `muted` crosses where values were measured that are out of all fits."""
    crosses = QPainterPath()
    for x, y in places:
        for lean in (-1, 1):
            crosses.moveTo(QPointF(x - reach, y - reach * lean))
            crosses.lineTo(QPointF(x + reach, y + reach * lean))
    stroke_shape(painter, crosses, theme.colour("muted"), EDGE)


def draw_ring(painter: QPainter, theme: Theme, *, x: float, y: float, radius: float = RING_RADIUS) -> None:
    """Draw the accent ring of a chosen point."""
    ring = QPainterPath()
    ring.addEllipse(QPointF(x, y), radius, radius)
    stroke_shape(painter, ring, theme.colour("ground"), 4)
    stroke_shape(painter, ring, theme.colour("accent"), 2)


def draw_wedge(painter: QPainter, theme: Theme, *, x: float, y: float, upward: bool, role: str) -> None:
    """Draw a wedge at the upper or lower edge of a plot, its tip on row `y`: a value lies beyond."""
    away = WEDGE if upward else -WEDGE
    fill_shape(painter, polygon((x, y), (x + WEDGE / 2, y + away), (x - WEDGE / 2, y + away)), theme.colour(role))
