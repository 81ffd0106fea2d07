"""Text on plates: the bundled faces, their widths, and the one primitive through which every word is drawn.

Lengths in px. Text is placed at its baseline. In files of pictures it is drawn as outlines, so that a plate
shows right where the font is missing. `text_placed` records what is drawn, for checks of room.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass
from functools import cache, lru_cache

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontDatabase, QFontMetricsF, QImage, QPainter, QPainterPath, QTransform
from PySide6.QtSvg import QSvgGenerator

from plumbwell.plates.svg_text import Glyph, SvgText, gathering_texts, glyphs_of, leave_mark
from plumbwell.plates.theme import Theme
from plumbwell.resources import resource

FAMILY = "Source Sans 3"
FONT_FILES = ("SourceSans3-Regular.ttf", "SourceSans3-It.ttf", "SourceSans3-Semibold.ttf")
ELLIPSIS = "\u2026"
UNITS_PER_EM = 1000
# On these, text is drawn as outlines; a screen and a PDF take the font itself.
FILE_DEVICES = (QSvgGenerator, QImage)

# Face: (index into Theme.sizes, semibold, italic). Upright is measured or computed, italic is interpreted.
FACES = {
    "heading": (0, True, False),
    "text": (1, False, False),
    "emphasis": (1, True, False),
    "small": (2, False, False),
    "name": (2, False, True),
    "formula": (1, False, True),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedText:
    """A text as drawn: its words before shortening, the box its ink needs, and the span it may take."""

    words: str
    drawn: str
    needed: QRectF
    allowed: tuple[float, float] | None


_RECORD: ContextVar[list[PlacedText] | None] = ContextVar("placed_text", default=None)


@contextmanager
def text_placed() -> Iterator[list[PlacedText]]:
    """Give a list that fills with every text drawn while the block runs."""
    placed: list[PlacedText] = []
    token = _RECORD.set(placed)
    try:
        yield placed
    finally:
        _RECORD.reset(token)


@cache
def plate_family() -> str:
    """Return the family of the bundled font, loaded once; the system's sans family where loading fails."""
    loaded = [QFontDatabase.addApplicationFont(str(resource(f"fonts/{name}"))) for name in FONT_FILES]
    if min(loaded) < 0:
        return QFontDatabase.systemFont(QFontDatabase.SystemFont.GeneralFont).family()
    return FAMILY


@cache
def _font(pixels: int, semibold: bool, italic: bool) -> QFont:
    family = plate_family()
    font = QFont(family)
    font.setPixelSize(pixels)
    font.setWeight(QFont.Weight.DemiBold if semibold else QFont.Weight.Normal)
    font.setItalic(italic)
    font.setHintingPreference(QFont.HintingPreference.PreferNoHinting)
    if family != FAMILY:
        font.setFeature(QFont.Tag("tnum"), 1)
    return font


@cache
def _metrics(pixels: int, semibold: bool, italic: bool) -> QFontMetricsF:
    return QFontMetricsF(_font(pixels, semibold, italic))


@cache
def _outline(semibold: bool, italic: bool, words: str) -> QPainterPath:
    outline = QPainterPath()
    outline.setFillRule(Qt.FillRule.WindingFill)
    outline.addText(QPointF(0.0, 0.0), _font(UNITS_PER_EM, semibold, italic), words)
    return outline


@lru_cache(maxsize=8192)
def _glyphs(semibold: bool, italic: bool, words: str) -> tuple[Glyph, ...]:
    return glyphs_of(_font(UNITS_PER_EM, semibold, italic), words)


def _placed_outline(
    pixels: int, semibold: bool, italic: bool, words: str, *, x: float, baseline: float
) -> QPainterPath:
    """Return words as outlines at a baseline.

    The outlines are taken where one px is one unit of the font and then scaled. Taken at their size they
    would be rounded to 1/64 px, and not always alike: equal plates would not give equal files.
    """
    scale = pixels / UNITS_PER_EM
    return QTransform(scale, 0.0, 0.0, scale, x, baseline).map(_outline(semibold, italic, words))


@lru_cache(maxsize=256)
def _cut(theme: Theme, face: str) -> tuple[int, bool, bool]:
    size, semibold, italic = FACES[face]
    return round(theme.sizes[size] * theme.text_scale), semibold, italic


@lru_cache(maxsize=256)
def _ink(theme: Theme, role: str) -> QColor:
    return theme.colour(role)


def face_font(theme: Theme, face: str) -> QFont:
    """Return the font of a face: "heading", "text", "emphasis", "small", "name" or "formula"."""
    return QFont(_font(*_cut(theme, face)))


@lru_cache(maxsize=8192)
def _advance(pixels: int, semibold: bool, italic: bool, words: str) -> float:
    return _metrics(pixels, semibold, italic).horizontalAdvance(words)


def text_width(theme: Theme, face: str, words: str) -> float:
    """Return the width of words in a face, in px."""
    return _advance(*_cut(theme, face), words)


def text_height(theme: Theme, face: str) -> float:
    """Return the height of capitals and figures of a face, in px."""
    return _metrics(*_cut(theme, face)).capHeight()


def elided(theme: Theme, face: str, words: str, width: float) -> str:
    """Return words shortened at the end by an ellipsis so that they take at most `width` px."""
    if text_width(theme, face, words) <= width:
        return words
    low, high = 0, len(words)
    while low < high:
        middle = (low + high + 1) // 2
        if text_width(theme, face, words[:middle].rstrip() + ELLIPSIS) <= width:
            low = middle
        else:
            high = middle - 1
    return words[:low].rstrip() + ELLIPSIS


def wrapped(theme: Theme, face: str, words: str, width: float) -> list[str]:
    """Return words broken into lines of at most `width` px, at spaces; a longer word is shortened.

    A no-break space holds: a number is not parted from its thousands or its unit.
    """
    lines: list[str] = []
    for word in filter(None, words.replace("\n", " ").split(" ")):
        longer = f"{lines[-1]} {word}" if lines else word
        if lines and text_width(theme, face, longer) <= width:
            lines[-1] = longer
        else:
            lines.append(elided(theme, face, word, width))
    return lines


def text_box(
    theme: Theme, face: str, words: str, *, x: float, baseline: float, align: str = "left"
) -> QRectF:
    """Return the box that words take: from the height of capitals to the foot of descenders."""
    width = text_width(theme, face, words)
    left = x - width if align == "right" else x - width / 2 if align == "middle" else x
    metrics = _metrics(*_cut(theme, face))
    return QRectF(left, baseline - metrics.capHeight(), width, metrics.capHeight() + 0.75 * metrics.descent())


def draw_text(
    painter: QPainter,
    theme: Theme,
    words: str,
    *,
    x: float,
    baseline: float,
    face: str = "text",
    role: str = "ink",
    align: str = "left",
    room: tuple[float, float] | None = None,
    knock_out: bool = False,
) -> QRectF:
    """Draw words at a baseline and return the box they take.

    Parameters
    ----------
    painter : QPainter
        Paints in px of the plate.
    theme : Theme
        Colours and sizes.
    words : str
        Nothing is drawn for an empty text.
    x, baseline : float
        Left edge, right edge or middle of the text after `align`, and its baseline.
    face, role : str
        Face and colour role.
    align : str
        "left", "right" or "middle"; the last for tick numbers and names, not for columns.
    room : tuple of float, optional
        Left and right limit. Names that do not fit are shortened; numbers are given enough room beforehand.
    knock_out : bool
        Clears the ground behind the words, where they stand among curves.

    Returns
    -------
    QRectF
        The box of the drawn words.
    """
    drawn = words
    if room is not None:
        reach = {"left": room[1] - x, "right": x - room[0], "middle": 2 * min(x - room[0], room[1] - x)}[
            align
        ]
        drawn = elided(theme, face, words, reach)
    box = text_box(theme, face, drawn, x=x, baseline=baseline, align=align)
    if not words:
        return box
    if knock_out:
        painter.fillRect(box.adjusted(-2, -2, 2, 1), theme.colour("ground", 225))
    record = _RECORD.get()
    if record is not None:
        record.append(PlacedText(words=words, drawn=drawn, needed=QRectF(box), allowed=room))
    device = painter.device()
    if not isinstance(device, FILE_DEVICES):
        # A screen: here most words are drawn, so the painter's state is not put by and taken up again.
        painter.setFont(_font(*_cut(theme, face)))
        painter.setPen(_ink(theme, role))
        painter.drawText(QPointF(box.left(), baseline), drawn)
        return box
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    painter.setRenderHint(QPainter.RenderHint.TextAntialiasing, True)
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(theme.colour(role))
    if isinstance(device, QSvgGenerator) and gathering_texts():
        pixels, semibold, italic = _cut(theme, face)
        leave_mark(
            painter,
            SvgText(
                glyphs=_glyphs(semibold, italic, drawn),
                scale=pixels / UNITS_PER_EM,
                x=box.left(),
                baseline=baseline,
            ),
        )
    else:
        painter.drawPath(_placed_outline(*_cut(theme, face), drawn, x=box.left(), baseline=baseline))
    painter.restore()
    return box
