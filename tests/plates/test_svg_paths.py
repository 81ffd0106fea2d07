"""SVG files made small show the same."""

import xml.etree.ElementTree as ElementTree

import pytest
from PySide6.QtCore import QBuffer, QByteArray, QIODevice, QRectF
from PySide6.QtGui import QImage
from PySide6.QtSvg import QSvgGenerator, QSvgRenderer

from plumbwell.plates.figure import figure_image, svg_bytes
from plumbwell.plates.lettering import draw_text
from plumbwell.plates.painting import painting
from plumbwell.plates.svg_paths import compact_svg
from plumbwell.plates.svg_text import SvgText, leave_mark

SVG, LINK = "{http://www.w3.org/2000/svg}", "{http://www.w3.org/1999/xlink}href"


@pytest.mark.parametrize(
    ("absolute", "relative"),
    [
        ("M10.5,20 L10.5,19 L12,19", "m10.5 20l0-1l1.5 0"),
        ("M1,1 C1,2 2,3 3,3 Z", "m1 1c0 1 1 2 2 2z"),
        ("M0.004,-0.5 L0.008,-0.25", "m0-.5l.01 .25"),
        ("M5,5 L6,6 Z M7,7 L8,8", "m5 5l1 1zm2 2l1 1"),
    ],
)
def test_path_data_is_relative_to_a_hundredth(absolute, relative):
    assert compact_svg(f'<path d="{absolute}"/>'.encode()) == f'<path d="{relative}"/>'.encode()


def test_rounding_does_not_add_up_along_a_path():
    absolute = "M0,0 " + " ".join(f"L{index * 1.004:.3f},0" for index in range(1, 1001))
    steps = compact_svg(f'<path d="{absolute}"/>'.encode()).decode().split('"')[1].split("l")[1:]
    assert sum(float(step.split()[0]) for step in steps) == pytest.approx(1004.0, abs=0.006)


def test_what_says_nothing_is_left_out():
    before = (
        b'<g fill="none" transform="matrix(1,0,0,1,0,0)"\nfont-family="Sans" font-size="9" font-weight="400" '
        b'font-style="normal" \n>\n<rect x="1"/>\n</g>\n<g fill="#000">\n</g>\n'
    )
    assert compact_svg(before) == b'<g fill="none">\n<rect x="1"/>\n</g>\n'


def test_the_svg_shows_what_the_image_shows(invented, light):
    plate = invented(20)
    image = figure_image(plate, light, 1).convertToFormat(QImage.Format.Format_Grayscale8)
    drawn = QImage(image.size(), QImage.Format.Format_RGB32)
    with painting(drawn) as painter:
        QSvgRenderer(QByteArray(svg_bytes(plate, light))).render(painter, QRectF(drawn.rect()))
    grey = drawn.convertToFormat(QImage.Format.Format_Grayscale8)
    ours, theirs = bytes(image.constBits()), bytes(grey.constBits())
    apart = sum(abs(a - b) > 40 for a, b in zip(ours, theirs, strict=True))
    assert apart < 0.004 * len(ours)


def test_each_glyph_is_written_once_and_used(invented, light):
    root = ElementTree.fromstring(svg_bytes(invented(20), light))
    paths = {path.attrib["id"]: path.attrib["d"] for path in root.iter(f"{SVG}path") if "id" in path.attrib}
    used = [use.attrib[LINK].removeprefix("#") for use in root.iter(f"{SVG}use")]
    assert set(used) == set(paths)
    assert len(set(paths.values())) == len(paths) < len(used) / 5
    assert not any("-90000" in path.attrib["d"] for path in root.iter(f"{SVG}path")), "no mark is left"


def test_a_text_outside_a_file_keeps_its_outlines(qapp, light):
    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    generator = QSvgGenerator()
    generator.setOutputDevice(buffer)
    with painting(generator) as painter:
        draw_text(painter, light, "2.431", x=10, baseline=20)
    assert len(bytes(buffer.data().data())) > 2000
    with pytest.raises(RuntimeError, match="svg_texts"):
        leave_mark(painter, SvgText(glyphs=(), scale=1.0, x=0.0, baseline=0.0))
