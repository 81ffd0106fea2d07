"""Long lines and many rectangles as Qt's shapes, straight from arrays.

Made point by point they would take longer than painting them. Qt reads its own shapes from a byte stream, and an
array of numbers is written as one in a single step.
"""

from __future__ import annotations

from math import floor

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QByteArray, QDataStream, Qt
from PySide6.QtGui import QColor, QPainter, QPainterPath, QPen, QPolygonF

from plumbwell.survey.column import Array

# How `QDataStream` writes these shapes from version 5.0 of Qt on: a count, then what follows, most significant
# byte first. An element of a path is its kind (0 begins a piece, 1 goes straight on) and its place.
_VERSION = QDataStream.Version.Qt_5_0
_ELEMENT = np.dtype([("kind", ">i4"), ("x", ">f8"), ("y", ">f8")])
_RECTANGLE = (0, 1, 1, 1, 1)
MANY_POINTS = 200


def _count(number: int) -> bytes:
    return number.to_bytes(4, "big")


def polygon_of(x: Array, y: Array) -> QPolygonF:
    """Return places in px, given by their columns and rows, as a polygon or line."""
    places = np.empty((len(x), 2), dtype=">f8")
    places[:, 0], places[:, 1] = x, y
    stream = QDataStream(QByteArray(_count(len(x)) + places.tobytes()))
    stream.setVersion(_VERSION)
    polygon = QPolygonF()
    stream >> polygon
    return polygon


def _path_of(elements: np.ndarray, fill: Qt.FillRule) -> QPainterPath:
    path = QPainterPath()
    if not elements.size:
        return path
    content = _count(elements.size) + elements.tobytes() + _count(0) + _count(fill.value)
    stream = QDataStream(QByteArray(content))
    stream.setVersion(_VERSION)
    stream >> path
    return path


def rectangles(
    left: Array, top: Array, right: Array, base: Array, *, fill: Qt.FillRule = Qt.FillRule.OddEvenFill
) -> QPainterPath:
    """Return rectangles, given by the px of their sides, as one shape."""
    elements = np.empty((len(left), 5), dtype=_ELEMENT)
    elements["kind"] = _RECTANGLE
    x, y = elements["x"], elements["y"]
    for corners, values, sides in (((0, 3, 4), x, left), ((1, 2), x, right), ((0, 1, 4), y, top), ((2, 3), y, base)):
        for corner in corners:
            values[:, corner] = sides
    return _path_of(elements, fill)


def dots_across(left: float, right: float, y: float) -> QPainterPath:
    """Return the dots of a horizontal dotted line, 1 px on and 3 px off from a whole px on, as one shape."""
    x = np.arange(floor(left + 0.5), right, 4.0)
    row = np.full(len(x), floor(y + 0.5), dtype=np.float64)
    return rectangles(x, row, x + 1, row + 1)


def broken_line(x: Array, y: Array, begins: NDArray[np.bool_]) -> QPainterPath:
    """Return a line through places in px as a shape; where `begins` is true a new piece begins."""
    elements = np.empty(x.size, dtype=_ELEMENT)
    elements["kind"], elements["x"], elements["y"] = ~begins.ravel(), x.ravel(), y.ravel()
    return _path_of(elements, Qt.FillRule.OddEvenFill)


def draw_line_of(painter: QPainter, x: Array, y: Array, colour: QColor, width: float) -> None:
    """Draw one smooth line through places in px."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    pen = QPen(colour, width, Qt.PenStyle.SolidLine, Qt.PenCapStyle.FlatCap, Qt.PenJoinStyle.MiterJoin)
    if len(x) > MANY_POINTS:
        pen.setJoinStyle(Qt.PenJoinStyle.BevelJoin)
    painter.setPen(pen)
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.drawPolyline(polygon_of(x, y))
    painter.restore()
