"""The few icons of the window, drawn in the colour of a role and at the size of the text.

The drawings in ``resources/icons`` are those of Lucide as published; colour and weight are given here, when one
is drawn. What is a word elsewhere has no icon.
"""

from __future__ import annotations

from functools import cache

from PySide6.QtCore import QByteArray, QRectF
from PySide6.QtGui import QPainter
from PySide6.QtSvg import QSvgRenderer

from plumbwell.plates.theme import Theme
from plumbwell.resources import resource

ICON_SIZE = 16
STROKE = 1.6
"""Weight of the lines, in the 24 units of the drawing; published with 2."""


@cache
def _drawing(name: str) -> str:
    return resource(f"icons/{name}.svg").read_text(encoding="utf-8")


def draw_icon(painter: QPainter, name: str, theme: Theme, role: str, *, x: float, y: float, size: float) -> None:
    """Draw an icon in the colour of a role into a square of `size` px whose upper left corner is given."""
    drawing = _drawing(name).replace("currentColor", theme.roles[role])
    drawing = drawing.replace('stroke-width="2"', f'stroke-width="{STROKE}"')
    QSvgRenderer(QByteArray(drawing.encode())).render(painter, QRectF(x, y, size, size))
