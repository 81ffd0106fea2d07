"""Text in SVG files: outlines, each glyph written once and used wherever it stands.

So a plate shows right where the font is missing, and a file full of numbers stays small. While a file is
drawn each text leaves a mark, a path far above the page; then `with_glyphs` puts the glyphs in its place.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass

from PySide6.QtCore import QPointF
from PySide6.QtGui import QFont, QPainter, QPainterPath, QRawFont, QTextLayout

MARK_ROW = -90000
_MARK = re.compile(rb'<path[^>]* d="m(\d+)-90000"/>')
_NO_DEFINITIONS = re.compile(rb"<defs>\s*</defs>")
_LETTERS = {
    QPainterPath.ElementType.MoveToElement: "m",
    QPainterPath.ElementType.LineToElement: "l",
    QPainterPath.ElementType.CurveToElement: "c",
    QPainterPath.ElementType.CurveToDataElement: " ",
}


@dataclass(frozen=True, slots=True)
class Glyph:
    """A glyph: relative path data, and its place; in whole units of the font, from the text's baseline."""

    path: str
    x: int
    y: int


@dataclass(frozen=True, slots=True, kw_only=True)
class SvgText:
    """A text: its glyphs, px to each unit of the font, left edge and baseline in px."""

    glyphs: tuple[Glyph, ...]
    scale: float
    x: float
    baseline: float


_TEXTS: ContextVar[list[SvgText] | None] = ContextVar("svg_texts", default=None)


def _path_data(outline: QPainterPath) -> str:
    """Return an outline as relative path data in whole units of the font; filling closes it."""
    written: list[str] = []
    pen = end = (0, 0)
    for index in range(outline.elementCount()):
        element = outline.elementAt(index)
        letter = _LETTERS[element.type]  # type: ignore[attr-defined]
        # The three places of a curve are all relative to where the curve begins.
        pen = pen if letter == " " else end
        end = (round(element.x), round(element.y))  # type: ignore[attr-defined]
        written.append(f"{letter}{end[0] - pen[0]} {end[1] - pen[1]}")
    return "".join(written).replace(" -", "-")


# Path data by family, style and index of a glyph: the few that numbers are made of are asked for all the time.
_PATHS: dict[tuple[str, str, int], str] = {}


def _glyph_path(face: QRawFont, index: int) -> str:
    key = (face.familyName(), face.styleName(), index)
    if key not in _PATHS:
        _PATHS[key] = _path_data(face.pathForGlyph(index))
    return _PATHS[key]


def glyphs_of(font: QFont, words: str) -> tuple[Glyph, ...]:
    """Return the glyphs of words that show anything, in a font of one px to each of its units."""
    layout = QTextLayout(words, font)
    layout.beginLayout()
    line = layout.createLine()
    line.setLineWidth(1e9)
    layout.endLayout()
    found = []
    for run in layout.glyphRuns():
        face = run.rawFont()
        for index, place in zip(run.glyphIndexes(), run.positions(), strict=True):
            path = _glyph_path(face, index)
            if path:
                found.append(Glyph(path, round(place.x()), round(place.y() - line.ascent())))
    return tuple(found)


@contextmanager
def svg_texts() -> Iterator[list[SvgText]]:
    """Give a list that fills with every text that leaves a mark while the block runs."""
    texts: list[SvgText] = []
    token = _TEXTS.set(texts)
    try:
        yield texts
    finally:
        _TEXTS.reset(token)


def gathering_texts() -> bool:
    """Return whether texts are to leave marks."""
    return _TEXTS.get() is not None


def leave_mark(painter: QPainter, text: SvgText) -> None:
    """Draw the mark of a text, with the brush that fills it, and keep the text for `with_glyphs`."""
    texts = _TEXTS.get()
    if texts is None:
        raise RuntimeError("a text can leave its mark only inside svg_texts")
    painter.drawPath(QPainterPath(QPointF(len(texts), MARK_ROW)))
    texts.append(text)


def _places(text: SvgText, names: dict[str, str]) -> str:
    """Return the glyphs of a text, used where they stand; a glyph not yet named gets the next name."""
    used = []
    for glyph in text.glyphs:
        name = names.setdefault(glyph.path, f"g{len(names)}")
        x, y = (f' {axis}="{at}"' if at else "" for axis, at in (("x", glyph.x), ("y", glyph.y)))
        used.append(f'<use xlink:href="#{name}"{x}{y}/>')
    place = f"translate({text.x:.2f} {text.baseline:.2f})scale({text.scale:g})"
    return f'<g fill-rule="nonzero" transform="{place}">{"".join(used)}</g>'


def with_glyphs(content: bytes, texts: Sequence[SvgText]) -> bytes:
    """Return a compact SVG with glyphs in place of the marks of texts.

    Parameters
    ----------
    content : bytes
        As `compact_svg` gives it.
    texts : sequence of SvgText
        Those that left the marks, in their order.
    """
    names: dict[str, str] = {}
    content = _MARK.sub(lambda found: _places(texts[int(found.group(1))], names).encode(), content)
    written = "\n".join(f'<path id="{name}" d="{path}"/>' for path, name in names.items())
    return _NO_DEFINITIONS.sub(f"<defs>\n{written}\n</defs>".encode(), content, count=1)
