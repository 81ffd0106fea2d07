"""The icons: drawn in the colour of a role at the size of the text, as published, with their licence."""

import re

import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QImage

from plumbwell.desk.parts.icons import draw_icon
from plumbwell.plates.painting import painting
from plumbwell.plates.theme import theme_named
from plumbwell.resources import resource

NAMES = sorted(path.stem for path in resource("icons").glob("*.svg"))


def drawn(name, theme, role, size=64):
    """An icon on nothing."""
    image = QImage(size, size, QImage.Format.Format_ARGB32)
    image.fill(Qt.GlobalColor.transparent)
    with painting(image) as painter:
        draw_icon(painter, name, theme, role, x=0, y=0, size=size)
    return image


def inked(image):
    """The pixels that are covered at all."""
    pixels = ((x, y) for x in range(image.width()) for y in range(image.height()))
    return {(x, y): image.pixelColor(x, y) for x, y in pixels if image.pixelColor(x, y).alpha() > 0}


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize(("theme", "role"), [("light", "ink"), ("dark", "accent")])
def test_an_icon_has_the_colour_of_its_role(name, theme, role):
    colours = theme_named(theme)
    found = max(inked(drawn(name, colours, role)).values(), key=lambda colour: colour.alpha())
    wanted = colours.colour(role)
    assert found.alpha() > 250
    for part in ("red", "green", "blue"):
        assert abs(getattr(found, part)() - getattr(wanted, part)()) <= 2


def test_an_icon_fills_the_square_that_it_is_given():
    theme = theme_named("light")
    for size in (16, 24, 64):
        places = inked(drawn("search", theme, "ink", size))
        reach = max(x for x, _ in places) - min(x for x, _ in places)
        assert 0.6 * size < reach <= size


def test_the_drawings_are_those_published_with_their_licence():
    licence = resource("icons/LICENSE").read_text("utf-8")
    assert "ISC License" in licence and "The MIT License (MIT)" in licence
    for name in NAMES:
        drawing = resource(f"icons/{name}.svg").read_text("utf-8")
        assert drawing.startswith("<!-- @license lucide-static v1.62.0 - ISC -->")
        assert re.search(r'stroke="currentColor"\s+stroke-width="2"', drawing)


def test_there_is_no_icon_of_another_name():
    with pytest.raises(FileNotFoundError):
        drawn("rocket", theme_named("light"), "ink")
