"""What a widget shows in words, for tests of the desk: every painted text with its box and its room."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from contextlib import contextmanager

from PySide6.QtWidgets import QApplication, QWidget

from plumbwell.desk.look import Look
from plumbwell.plates.lettering import PlacedText, text_placed

SCALES = (0.9, 1.0, 1.25, 1.6)


@contextmanager
def look_of(wanted: str = "light", text_scale: float = 1.0) -> Iterator[Look]:
    """A look in force while the block runs."""
    application = QApplication.instance()
    assert isinstance(application, QApplication)
    before = application.palette(), application.font(), application.styleSheet()
    look = Look()
    look.choose(wanted=wanted, text_scale=text_scale)
    yield look
    application.setPalette(before[0])
    application.setFont(before[1])
    application.setStyleSheet(before[2])


def placed_texts(widget: QWidget) -> list[PlacedText]:
    """Every text that a widget and what is in it paint."""
    with text_placed() as placed:
        widget.grab()
    return placed


def shown_words(widget: QWidget) -> list[str]:
    """The words that a widget and what is in it paint, as drawn."""
    return [one.drawn for one in placed_texts(widget)]


def cut_short(widget: QWidget, unless: Iterable[str] = ()) -> list[str]:
    """Painted words that had no room, but for those that may be shortened."""
    allowed = set(unless)
    return [one.words for one in placed_texts(widget) if one.drawn != one.words and one.words not in allowed]
