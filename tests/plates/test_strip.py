"""The core strip: silhouette, names pushed apart, openings, the grip."""

from dataclasses import replace
from itertools import pairwise

import pytest
from PySide6.QtGui import QColor, QImage

from plumbwell.plates.axis import Frame
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.painting import draw_mark, painting
from plumbwell.plates.plate import PlateFinding, PlateInterval, SurveyPlate
from plumbwell.plates.strip import draw_strip, draw_tone_key, key_height, strip_room
from plumbwell.plates.strip_names import spread_names
from plumbwell.plates.strip_places import CORE_LEFT, chosen_rows, core_width, finding_marks, strip_columns
from plumbwell.plates.theme import theme_named

FRAME = Frame(left=0, top=20, right=216, base=620, depth_top=0.0, depth_base=600.0)


def drawn(plate, theme, **options):
    image = QImage(216, 640, QImage.Format.Format_RGB32)
    image.fill(theme.colour("ground"))
    with painting(image) as painter:
        draw_strip(painter, plate, FRAME, theme, **options)
    return image


def layers(*densities):
    rows = [
        PlateInterval(number=index, top=100.0 * index, base=100.0 * index + 100, density=density)
        for index, density in enumerate(densities)
    ]
    return SurveyPlate(title="Tolmire 4", intervals=tuple(rows))


def test_heavy_rock_stands_out_and_light_rock_recedes():
    assert core_width(1.9) == pytest.approx(0.30 * 56)
    assert core_width(3.0) == pytest.approx(56)
    assert (
        core_width(1.2)
        == core_width(1.6)
        < core_width(2.0)
        < core_width(2.9)
        < core_width(3.2)
        == core_width(4)
    )


def test_tone_and_silhouette_say_the_same(qapp, light):
    image = drawn(layers(2.0, 2.9, 2.4), light)
    ink = QColor(light.roles["ink"])
    for row, density in ((70, 2.0), (170, 2.9), (270, 2.4)):
        assert image.pixelColor(CORE_LEFT + 2, row) == light.tone(density)
        assert image.pixelColor(CORE_LEFT + round(core_width(density)), row) == ink
        assert image.pixelColor(CORE_LEFT + round(core_width(density)) + 2, row) == QColor(
            light.roles["ground"]
        )


def test_unknown_rock_has_no_tone(qapp, light):
    image = drawn(layers(2.0, None, 2.4), light)
    ground = QColor(light.roles["ground"])
    assert all(image.pixelColor(x, 170) == ground for x in range(CORE_LEFT + 4, CORE_LEFT + 20))


def test_openings_are_void_and_water_is_water(qapp, any_theme):
    plate = replace(layers(2.4, 2.4, 2.4, 2.4), openings=((100.0, 200.0),), waters=((200.0, 300.0),))
    image = drawn(plate, any_theme)
    for row, role in ((170, "void"), (290, "water")):
        assert image.pixelColor(CORE_LEFT + 30, row) == QColor(any_theme.roles[role])
        assert image.pixelColor(CORE_LEFT - 1, row) == QColor(any_theme.roles["ink"])


def test_names_are_pushed_apart_and_keep_their_order():
    rows = spread_names([100, 102, 104, 300, 596, 599], spacing=16, top=10, base=600)
    assert all(b - a >= 16 - 1e-9 for a, b in pairwise(rows))
    assert rows[1] == pytest.approx(102), "a group keeps its mean"
    assert rows[3] == 300, "what has room is not moved"
    assert rows[-1] <= 600
    assert spread_names([], spacing=16, top=0, base=100) == []


@pytest.mark.parametrize("count", [2, 30, 37, 38, 39, 100])
def test_crowded_names_stay_inside(count):
    rows = spread_names([590.0] * count, spacing=16, top=10, base=600)
    assert rows[0] >= 10 - 1e-9
    assert rows[-1] <= 600 + 1e-9
    assert all(b > a for a, b in pairwise(rows))


def test_names_outside_the_window_are_muted_and_the_grip_frames_it(qapp, light):
    plate = replace(layers(2.0, 2.4, 2.6, 2.8), markers=(("Upper bed", 50.0), ("Inner bed", 250.0)))
    image = drawn(plate, light, window=(200.0, 300.0), selected=[(220.0, 240.0)])
    accent = QColor(light.roles["accent"])
    rows = [y for y in range(640) if image.pixelColor(200, y) == accent]
    assert rows == [220, 320]
    assert image.pixelColor(100, 240) == accent
    assert image.pixelColor(100, 260) == accent


def test_a_finding_has_its_mark_at_its_depth(qapp, light):
    plate = replace(
        layers(2.0, 2.4),
        findings=(
            PlateFinding(severity="look", depth=100.0),
            PlateFinding(severity="error", depth=102.0),
            PlateFinding(severity="look", depth=180.0),
        ),
    )
    image = drawn(plate, light)
    assert image.pixelColor(47, 122) == QColor(light.roles["brick"]), "the gravest stands for its neighbours"
    assert image.pixelColor(47, 201) == QColor(light.roles["amber"])


def test_the_strip_widens_for_names_but_not_without_end(qapp, light):
    short = replace(layers(2.4), markers=(("Clay", 0.0),))
    middling = replace(layers(2.4), markers=(("Upper Greel Marl bed", 0.0),))
    long = replace(layers(2.4), markers=(("Clay " * 40, 0.0),))
    assert strip_room(light, short) == 216
    assert 216 < strip_room(light, middling) < 264
    assert strip_room(light, long) == 264
    with text_placed() as placed:
        drawn(long, light)
    assert [text.drawn for text in placed if text.drawn.startswith("Clay")][0].endswith("\u2026")


def test_unknown_marks_and_severities_are_refused(qapp, light):
    with (
        pytest.raises(ValueError, match="no mark 'star'"),
        painting(QImage(9, 9, QImage.Format.Format_RGB32)) as painter,
    ):
        draw_mark(painter, light, "star", x=4, y=4)
    with pytest.raises(ValueError, match="severity 'bad' is none of note, look, error"):
        PlateFinding(severity="bad")


def test_the_layer_that_the_depths_begin_in_is_named_at_their_beginning(qapp, light):
    markers = (("Deep", 900.0), ("Marl", 150.0), ("Till", -30.0), ("Older", -80.0))
    plate = replace(layers(2.0, 2.4), markers=markers)
    assert plate.names_in_view == (("Till", 0.0), ("Marl", 150.0))
    assert replace(plate, markers=(*markers, ("Sand", 0.0))).names_in_view == (("Sand", 0.0), ("Marl", 150.0))
    with text_placed() as placed:
        drawn(plate, light)
    names = [text.drawn for text in placed if text.drawn.isalpha()]
    assert names == ["Till", "Marl"]


def test_no_sliver_is_left_between_a_top_and_the_station_beside_it(qapp, light):
    plate = replace(layers(2.0, 2.9), markers=(("Marrow Shale", 99.1),))
    image = drawn(plate, light)
    edge, ground = CORE_LEFT + round(core_width(2.0)), QColor(light.roles["ground"])
    row = round(FRAME.y(100.0))
    assert image.pixelColor(CORE_LEFT + 2, row) == ground
    assert image.pixelColor(CORE_LEFT + 2, row - 1) == light.tone(2.0)
    assert image.pixelColor(edge, row - 1) == QColor(light.roles["ink"])


def test_leaders_of_crowded_names_spread_beside_the_core(qapp, light):
    plate = replace(layers(2.0, 2.4), markers=tuple((f"Seam {n}", 100.0 + 2 * n) for n in range(8)))
    image = drawn(plate, light)
    ground = QColor(light.roles["ground"])
    start = CORE_LEFT + round(core_width(2.4)) + 7
    rows = [
        [y for y in range(60, 220) if image.pixelColor(x, y) != ground] for x in (start + 4, 120)
    ]
    reach = [found[-1] - found[0] for found in rows]
    assert reach[1] > reach[0] + 20, "they slant apart over the whole way from the core to the names"


def test_larger_numbers_push_the_core_right_and_leave_it_as_wide(qapp):
    columns = {scale: strip_columns(theme_named("light", scale), FRAME) for scale in (0.9, 1.0, 1.5)}
    assert (columns[1.0].numbers_right, columns[1.0].core, columns[1.0].names) == (33, 60, 131)
    assert columns[0.9].core < 60 < columns[1.5].core
    for one in columns.values():
        assert one.names - one.core == 71 and one.core - one.numbers_right == 27


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
@pytest.mark.parametrize("upward", [False, True])
def test_depth_numbers_stand_apart_left_of_the_bar(qapp, scale, upward):
    theme = theme_named("light", scale)
    frame = replace(FRAME, depth_top=-226.0, depth_base=1218.0, upward=upward)
    with text_placed() as placed, painting(QImage(216, 640, QImage.Format.Format_RGB32)) as painter:
        draw_strip(painter, layers(2.4), frame, theme)
    numbers = [text for text in placed if text.drawn.strip("\u2212\u00a0").replace("\u00a0", "").isdigit()]
    assert len(numbers) >= 5
    for above, below in pairwise(numbers):
        assert below.needed.top() - above.needed.bottom() > 3
    bar = strip_columns(theme, frame).bar
    assert all(0 <= text.needed.left() and text.needed.right() < bar for text in numbers)
    shown = [int(text.drawn.replace("\u2212", "-").replace("\u00a0", "")) for text in numbers]
    assert shown == sorted(shown, reverse=upward)


def test_chosen_spans_that_touch_are_one_and_those_outside_are_left_out():
    spans = [(300.0, 350.0), (100.0, 200.0), (200.0, 250.0), (90.0, 90.0), (700.0, 800.0), (-50.0, 10.0)]
    assert chosen_rows(FRAME, spans) == [(20, 30), (110, 110), (120, 270), (320, 370)]


def test_a_mark_stands_for_the_less_grave_findings_beside_it():
    findings = [
        PlateFinding(severity="note", depth=104.0),
        PlateFinding(severity="look", depth=100.0),
        PlateFinding(severity="error", depth=107.0),
        PlateFinding(severity="look", depth=300.0),
        PlateFinding(severity="look", depth=900.0),
        PlateFinding(severity="look"),
    ]
    marks = [(mark.finding, mark.others) for mark in finding_marks(findings, FRAME)]
    assert marks == [(2, (1, 0)), (3, ())]


def test_a_name_is_not_struck_through_by_the_grip(qapp, light):
    plate = replace(layers(2.0, 2.4, 2.6), markers=(("Marrow Shale", 100.0),))
    accent = QColor(light.roles["accent"])

    def line(base):
        image = drawn(plate, light, window=(20.0, base))
        row = round(FRAME.y(base))
        return [x for x in range(132, 200) if image.pixelColor(x, row) == accent]

    assert len(line(150.0)) == 68
    assert len(line(109.0)) < 10, "the line ends where the name begins"


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
def test_the_key_of_tones_fits_its_height(qapp, scale):
    theme = theme_named("light", scale)
    image = QImage(216, 200, QImage.Format.Format_RGB32)
    with text_placed() as placed, painting(image) as painter:
        draw_tone_key(painter, theme, left=17, top=10, width=176)
    assert [text.drawn for text in placed] == ["density, g/cm\u00b3", "2.0", "2.5", "3.0"]
    assert max(text.needed.bottom() for text in placed) <= 10 + key_height(theme)
    assert key_height(theme_named("light")) == 62
    title, first = placed[0].needed, placed[1].needed
    assert first.top() > title.bottom() + 11
