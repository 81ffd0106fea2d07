"""Painting primitives shared by all plates: hairlines, marks, the graduated bar, tones and hatching.

Coordinates in px, y downward. Horizontal and vertical lines are filled rectangles on whole px, so that they
are sharp on a screen, in print and at any scale; curves and slanted lines are smooth.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from math import floor

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QBrush, QColor, QPaintDevice, QPainter, QPainterPath, QPen, QPolygonF

from plumbwell.plates.theme import Theme, beyond_scale

NO_PEN = Qt.PenStyle.NoPen
MARK_SIZE = 9.0
PRIOR_OPACITY = 0.45
HATCH_STEP = 6.0


@contextmanager
def painting(device: QPaintDevice) -> Iterator[QPainter]:
    """Give a painter on a device and end it in any case: one left open on a device ends the process."""
    painter = QPainter(device)
    try:
        yield painter
    finally:
        painter.end()


def whole(value: float) -> int:
    """Return the whole px nearest to a coordinate; halves go down the page."""
    return floor(value + 0.5)


def hairline_across(
    painter: QPainter, left: float, right: float, y: float, colour: QColor, thick: float = 1
) -> None:
    """Draw a horizontal line whose upper edge lies on the whole px nearest to `y`."""
    painter.fillRect(QRectF(left, whole(y), right - left, thick), colour)


def hairline_down(
    painter: QPainter, x: float, top: float, base: float, colour: QColor, thick: float = 1
) -> None:
    """Draw a vertical line whose left edge lies on the whole px nearest to `x`."""
    painter.fillRect(QRectF(whole(x), top, thick, base - top), colour)


def dotted_across(painter: QPainter, left: float, right: float, y: float, colour: QColor) -> None:
    """Draw a horizontal dotted line: 1 px on, 3 px off."""
    dots = QPainterPath()
    x, row = float(whole(left)), whole(y)
    while x < right:
        dots.addRect(QRectF(x, row, 1, 1))
        x += 4
    painter.fillPath(dots, QBrush(colour))


def smooth_line(
    painter: QPainter, points: Sequence[tuple[float, float]], colour: QColor, width: float
) -> None:
    """Draw one smooth line through points in px."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    pen = QPen(colour, width, Qt.PenStyle.SolidLine, Qt.PenCapStyle.FlatCap, Qt.PenJoinStyle.MiterJoin)
    if len(points) > 200:
        pen.setJoinStyle(Qt.PenJoinStyle.BevelJoin)
    painter.setPen(pen)
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.drawPolyline(QPolygonF([QPointF(x, y) for x, y in points]))
    painter.restore()


def fill_shape(painter: QPainter, shape: QPainterPath, colour: QColor) -> None:
    """Fill a shape with smooth edges and no outline."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    painter.fillPath(shape, QBrush(colour))
    painter.restore()


def stroke_shape(
    painter: QPainter, shape: QPainterPath, colour: QColor, width: float, dashes: Sequence[float] = ()
) -> None:
    """Outline a shape; `dashes` in multiples of the line's width."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    pen = QPen(colour, width, Qt.PenStyle.SolidLine, Qt.PenCapStyle.FlatCap, Qt.PenJoinStyle.MiterJoin)
    if dashes:
        pen.setDashPattern(list(dashes))
    painter.setPen(pen)
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.drawPath(shape)
    painter.restore()


def _hatching(bounds: QRectF) -> QPainterPath:
    """Return 1 px wide lines at 45 degrees, 6 px apart across, that cover a rectangle."""
    lines = QPainterPath()
    height = bounds.height()
    # Anchored to the page, not to the shape, so that hatching runs on from one shape to the next.
    first = (bounds.left() + bounds.top()) // HATCH_STEP * HATCH_STEP
    total = first
    while total < bounds.right() + bounds.bottom():
        x = total - bounds.bottom()
        corners = ((x, 0.0), (x + 1.4, 0.0), (x + 1.4 + height, -height), (x + height, -height))
        lines.addPolygon(QPolygonF([QPointF(cx, bounds.bottom() + cy) for cx, cy in corners]))
        lines.closeSubpath()
        total += HATCH_STEP
    return lines


def fill_tone(
    painter: QPainter, shape: QPainterPath, theme: Theme, density: float | None, *, from_prior: bool = False
) -> None:
    """Fill a shape with the tone of a density in g/cm3.

    Nothing is filled where no density is known, and the shape is outlined dotted. A density from the prior
    alone is paler and outlined dashed. Beyond the scale the end tone is crossed by ground hairlines.
    """
    if density is None:
        stroke_shape(painter, shape, theme.colour("strong"), 1, (1, 3))
        return
    tone = theme.tone(density)
    if from_prior:
        tone.setAlphaF(PRIOR_OPACITY)
    fill_shape(painter, shape, tone)
    if beyond_scale(density):
        fill_shape(painter, _hatching(shape.boundingRect()).intersected(shape), theme.colour("ground"))
    if from_prior:
        stroke_shape(painter, shape, theme.colour("ink"), 1, (4, 3))


def rectangle(left: float, top: float, right: float, base: float) -> QPainterPath:
    """Return a rectangle as a shape."""
    shape = QPainterPath()
    shape.addRect(QRectF(left, top, right - left, base - top))
    return shape


def polygon(*corners: tuple[float, float]) -> QPainterPath:
    """Return a closed shape with straight edges."""
    shape = QPainterPath(QPointF(*corners[0]))
    for corner in corners[1:]:
        shape.lineTo(QPointF(*corner))
    shape.closeSubpath()
    return shape


def draw_mark(painter: QPainter, theme: Theme, kind: str, *, x: float, y: float) -> None:
    """Draw a mark of 9 px about a centre.

    Parameters
    ----------
    kind : str
        "look" (triangle, amber), "error" (square, brick), "note" (ring, ink), "changed" (diamond, ink) or
        "excluded" (cross, ink).
    x, y : float
        Centre in px.
    """
    half = MARK_SIZE / 2
    if kind == "look":
        fill_shape(
            painter,
            polygon((x, y - half + 0.5), (x + half, y + half - 0.5), (x - half, y + half - 0.5)),
            theme.colour("amber"),
        )
    elif kind == "error":
        fill_shape(painter, rectangle(x - 4, y - 4, x + 4, y + 4), theme.colour("brick"))
    elif kind == "changed":
        fill_shape(
            painter, polygon((x, y - half), (x + half, y), (x, y + half), (x - half, y)), theme.colour("ink")
        )
    elif kind == "note":
        ring = QPainterPath()
        ring.addEllipse(QPointF(x, y), 3.5, 3.5)
        stroke_shape(painter, ring, theme.colour("ink"), 1.4)
    elif kind == "excluded":
        for lean in (-1, 1):
            smooth_line(
                painter, ((x - 3.5, y - 3.5 * lean), (x + 3.5, y + 3.5 * lean)), theme.colour("ink"), 1.4
            )
    else:
        raise ValueError(f"no mark {kind!r}")


def draw_graduated_bar(
    painter: QPainter,
    theme: Theme,
    *,
    x: float,
    edges: Sequence[float],
    fields_before: int = 0,
    width: float = 4,
) -> None:
    """Draw the graduated edge: fields of ink and ground in turn, outlined.

    Parameters
    ----------
    x : float
        Left edge in px.
    edges : sequence of float
        Boundaries of the fields in px, downward; the first and last are the ends of the bar.
    fields_before : int
        Number of the first field, so that a field keeps its colour when the window moves.
    width : float
        Width in px.
    """
    rows = [whole(edge) for edge in edges]
    top, base = rows[0], rows[-1]
    for colour, inset in ((theme.colour("ink"), 0), (theme.colour("ground"), 1)):
        painter.fillRect(QRectF(x + inset, top + inset, width - 2 * inset, base - top - 2 * inset), colour)
    for index, (upper, lower) in enumerate(zip(rows, rows[1:], strict=False)):
        if (index + fields_before) % 2 == 0:
            painter.fillRect(QRectF(x, upper, width, lower - upper), theme.colour("ink"))
