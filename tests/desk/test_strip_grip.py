"""The core strip in the hands of a person: grip, wheel, brush, clicks, keys, and what it says and shows."""

from dataclasses import replace

import pytest
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QColor, QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from plumbwell.desk.hole.strip import Strip
from plumbwell.desk.look import Look
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.plate import PlateFinding, PlateInterval, PlateStation, SurveyPlate
from plumbwell.plates.strip_places import CORE_LEFT, core_width, grip_rows
from plumbwell.plates.theme import theme_named

LEFT = Qt.MouseButton.LeftButton
CORE, FINDINGS, RIGHT = 90, 48, 180


def plate(densities=(2.0, 2.4, 2.6, 2.2, 2.9, 2.5), **changes):
    edges = [100.0 * index for index in range(len(densities) + 1)]
    values = {
        "title": "Tolmire 4",
        "subtitle": "7 stations in 600 m",
        "depth_label": "MD",
        "intervals": tuple(
            PlateInterval(number=n + 1, top=edges[n], base=edges[n + 1], density=density, sd=0.012)
            for n, density in enumerate(densities)
        ),
        "stations": tuple(PlateStation(label=str(n), depth=depth) for n, depth in enumerate(edges)),
        "markers": (("Hask Gravel", 0.0), ("Marrow Shale", 200.0), ("Kett Anhydrite", 400.0)),
        "findings": (
            PlateFinding(severity="look", depth=150.0, words="Lighter than the log."),
            PlateFinding(severity="error", depth=152.0, words="Heavier than any rock."),
            PlateFinding(severity="look", depth=350.0, words="A wide hole."),
            PlateFinding(severity="look", words="Nowhere at all."),
        ),
    }
    return SurveyPlate(**{**values, **changes})


@pytest.fixture
def look(qapp):
    look = Look()
    look.theme = theme_named("light")
    return look


def recolour(look, name, scale=1.0):
    look.theme = theme_named(name, scale)
    look.changed.emit()


@pytest.fixture
def strip(qtbot, look):
    strip = Strip(look)
    qtbot.addWidget(strip)
    strip.set_plate(plate())
    strip.set_window(200.0, 400.0)
    strip.resize(216, 740)
    strip.show()
    return strip


def at(strip, x, depth):
    return QPoint(x, round(strip.frame().y(depth)))


def told(signal):
    heard = []
    signal.connect(lambda *values: heard.append(values if len(values) > 1 else values[0]))
    return heard


def drag(strip, start, *way, release=True):
    QTest.mousePress(strip, LEFT, pos=start)
    for point in way:
        QTest.mouseMove(strip, point)
    if release:
        QTest.mouseRelease(strip, LEFT, pos=way[-1])


def turn(strip, point, notches, modifiers=Qt.KeyboardModifier.NoModifier):
    event = QWheelEvent(
        QPointF(point),
        QPointF(strip.mapToGlobal(point)),
        QPoint(),
        QPoint(0, round(120 * notches)),
        Qt.MouseButton.NoButton,
        modifiers,
        Qt.ScrollPhase.NoScrollPhase,
        False,
    )
    QApplication.sendEvent(strip, event)


def words_of(strip):
    with text_placed() as placed:
        strip.grab()
    return placed


def test_drawing_a_line_of_the_grip_resizes_the_window(strip):
    wanted = told(strip.window_wanted)
    drag(strip, at(strip, RIGHT, 400.0), at(strip, RIGHT, 450.0), at(strip, RIGHT, 500.0))
    drag(strip, at(strip, CORE, 200.0), at(strip, CORE, 100.0))
    assert [top for top, _ in wanted[:-1]] == [200.0] * (len(wanted) - 1)
    assert wanted[-2][1] == pytest.approx(500.0, abs=1.0)
    assert wanted[-1] == (pytest.approx(100.0, abs=1.0), 400.0)


def test_a_line_drawn_over_the_other_stops_at_the_least_window(strip):
    wanted = told(strip.window_wanted)
    drag(strip, at(strip, RIGHT, 400.0), at(strip, RIGHT, 100.0))
    assert wanted[-1] == (200.0, pytest.approx(202.0))


def test_the_bracket_moves_and_keeps_its_length(strip):
    wanted = told(strip.window_wanted)
    drag(strip, at(strip, 212, 300.0), at(strip, 212, 350.0))
    assert wanted[-1] == (pytest.approx(250.0, abs=1.0), pytest.approx(450.0, abs=1.0))
    assert wanted[-1][1] - wanted[-1][0] == pytest.approx(200.0)
    drag(strip, at(strip, 150, 300.0), QPoint(150, 5000))
    assert wanted[-1][1] == pytest.approx(600.0 * 1.012), "it stops where the hole ends"


def test_escape_puts_a_dragged_window_back(strip):
    wanted = told(strip.window_wanted)
    drag(strip, at(strip, 212, 300.0), at(strip, 212, 350.0), release=False)
    strip.set_window(*wanted[-1])
    QTest.keyClick(strip, Qt.Key.Key_Escape)
    assert wanted[-1] == (200.0, 400.0)
    QTest.mouseMove(strip, at(strip, 212, 100.0))
    assert wanted[-1] == (200.0, 400.0), "the hand holds nothing any more"


def test_a_press_beside_the_bracket_brings_it_there(strip):
    wanted = told(strip.window_wanted)
    QTest.mouseClick(strip, LEFT, pos=at(strip, RIGHT, 480.0))
    assert wanted == [(pytest.approx(380.0, abs=1.0), pytest.approx(580.0, abs=1.0))]


def test_the_wheel_zooms_about_the_pointer_and_with_shift_moves(strip):
    wanted = told(strip.window_wanted)
    turn(strip, at(strip, CORE, 250.0), 1)
    top, base = wanted[-1]
    assert base - top == pytest.approx(160.0)
    assert (250.0 - top) / (base - top) == pytest.approx(0.25, abs=0.01)
    turn(strip, at(strip, CORE, 250.0), -1, Qt.KeyboardModifier.ShiftModifier)
    assert wanted[-1] == (pytest.approx(220.0), pytest.approx(420.0))
    turn(strip, QPoint(40, 10), 1)
    assert len(wanted) == 2, "over the name there is no depth"


def test_a_double_click_shows_the_whole_hole(strip):
    wanted = told(strip.window_wanted)
    QTest.mouseDClick(strip, LEFT, pos=at(strip, RIGHT, 300.0))
    assert wanted == [(pytest.approx(-7.2), pytest.approx(607.2))]


def test_a_click_on_the_core_chooses_its_depth(strip):
    chosen, brushed = told(strip.depth_chosen), told(strip.range_brushed)
    QTest.mouseClick(strip, LEFT, pos=at(strip, CORE, 450.0))
    QTest.mouseClick(strip, LEFT, Qt.KeyboardModifier.ShiftModifier, at(strip, CORE, 120.0))
    assert chosen == [(pytest.approx(450.0, abs=1.0), False), (pytest.approx(120.0, abs=1.0), True)]
    assert brushed == []


def test_a_brush_over_the_core_tells_its_depths_downward(strip):
    chosen, brushed = told(strip.depth_chosen), told(strip.range_brushed)
    drag(strip, at(strip, CORE, 450.0), at(strip, CORE, 520.0), at(strip, CORE, 430.0))
    assert brushed[0] == (pytest.approx(450.0, abs=1.0), pytest.approx(520.0, abs=1.0))
    assert brushed[-1] == (pytest.approx(430.0, abs=1.0), pytest.approx(450.0, abs=1.0))
    drag(strip, at(strip, CORE, 550.0), QPoint(CORE, 5000))
    assert brushed[-1][1] == 600.0
    assert chosen == []


def test_a_mark_tells_its_findings_and_goes_to_the_gravest(strip):
    found, wanted = told(strip.finding_chosen), told(strip.window_wanted)
    QTest.mouseClick(strip, LEFT, pos=at(strip, FINDINGS, 151.0))
    QTest.mouseClick(strip, LEFT, pos=at(strip, FINDINGS, 350.0))
    QTest.mouseClick(strip, LEFT, pos=at(strip, FINDINGS, 500.0))
    assert found == [1, 2]
    assert wanted == []
    hint = strip.hint_at(FINDINGS, strip.frame().y(151.0))
    assert hint == "Heavier than any rock.\nLighter than the log."


def test_hovering_over_the_core_tells_the_rock(strip):
    hint = strip.hint_at(CORE, strip.frame().y(250.0))
    assert hint == "Marrow Shale\ninterval 3, 200.0 to 300.0 m MD: 2.600\u00a0\u00b1\u00a00.012 g/cm\u00b3"
    assert strip.hint_at(10, strip.frame().y(250.0)) == ""


def test_the_pointer_takes_the_shape_of_what_it_can_do(strip):
    shapes = {
        (RIGHT, 400.0): Qt.CursorShape.SizeVerCursor,
        (CORE, 200.0): Qt.CursorShape.SizeVerCursor,
        (RIGHT, 300.0): Qt.CursorShape.OpenHandCursor,
        (FINDINGS, 350.0): Qt.CursorShape.PointingHandCursor,
        (CORE, 300.0): Qt.CursorShape.ArrowCursor,
    }
    for (x, depth), shape in shapes.items():
        QTest.mouseMove(strip, at(strip, x, depth))
        assert strip.cursor().shape() == shape, (x, depth)


def test_keys_move_and_zoom_the_window(strip):
    wanted = told(strip.window_wanted)
    for key in (Qt.Key.Key_Down, Qt.Key.Key_Up, Qt.Key.Key_PageDown, Qt.Key.Key_Home):
        QTest.keyClick(strip, key)
    assert wanted[:3] == [
        (pytest.approx(220.0), pytest.approx(420.0)),
        (pytest.approx(180.0), pytest.approx(380.0)),
        (pytest.approx(380.0), pytest.approx(580.0)),
    ]
    assert wanted[3] == (pytest.approx(-7.2), pytest.approx(607.2))
    QTest.keyClick(strip, Qt.Key.Key_Plus)
    QTest.keyClick(strip, Qt.Key.Key_Minus)
    assert wanted[4] == (pytest.approx(220.0), pytest.approx(380.0))
    assert wanted[5] == (pytest.approx(175.0), pytest.approx(425.0))


def test_the_strip_says_what_it_shows(strip):
    assert strip.accessibleName() == "core strip"
    assert strip.accessibleDescription() == (
        "6 intervals 0 to 600 m MD, 2.00 to 2.90 g/cm\u00b3; window 200 to 400 m; 4 findings"
    )
    strip.set_window(100.0, 250.0)
    strip.set_selection([(120.0, 120.0)])
    strip.set_stale(True)
    assert strip.accessibleDescription().endswith(
        "window 100 to 250 m; chosen 120 m; 4 findings; computing"
    )


def test_elevations_are_written_with_their_own_sign_and_have_no_ground_line(strip, look):
    rows = tuple(
        replace(row, top=row.top - 250.0, base=row.base - 250.0) for row in plate().intervals
    )
    marks = [(name, depth - 250.0) for name, depth in plate().markers]
    below = replace(plate(), intervals=rows, stations=(), markers=tuple(marks), depth_label="elevation")
    strip.set_window(50.0, 200.0)

    def ground_line():
        image = strip.grab().toImage()
        return image.pixelColor(44, round(strip.frame().y(0.0))) == QColor(look.theme.roles["ink"])

    strip.set_plate(below)
    assert ground_line()
    strip.set_plate(below, upward=True)
    assert not ground_line()
    placed = {text.drawn: text.needed.center().y() for text in words_of(strip)}
    for words, depth in (("200", -200.0), ("0", 0.0), ("\u2212300", 300.0)):
        assert placed[words] == pytest.approx(strip.frame().y(depth), abs=2.0)
    assert "250 to \u2212350 m elevation" in strip.accessibleDescription()


def test_touching_selections_are_one_band_and_others_have_their_own(strip, look):
    strip.set_selection([(200.0, 300.0), (300.0, 400.0), (500.0, 500.0)])
    strip.set_window(0.0, 600.0)
    image = strip.grab().toImage()
    accent = QColor(look.theme.roles["accent"])
    column = CORE_LEFT - 4
    rows = [y for y in range(image.height()) if image.pixelColor(column, y) == accent]
    frame = strip.frame()
    inside = [y for y in rows if y not in grip_rows(frame, (0.0, 600.0))]
    assert inside == [round(frame.y(depth)) for depth in (200.0, 400.0, 500.0)]


def test_a_window_that_reaches_beyond_the_hole_ends_at_the_strip(strip, look):
    strip.set_window(-7.2, 607.2)
    image = strip.grab().toImage()
    accent = QColor(look.theme.roles["accent"])
    rows = [y for y in range(image.height()) if image.pixelColor(200, y) == accent]
    assert rows == [round(strip.frame().top), round(strip.frame().base)]


def test_stale_rock_stays_at_half_strength_with_its_numbers(strip, look):
    words = [text.drawn for text in words_of(strip)]
    row = round(strip.frame().y(550.0))
    fresh = strip.grab().toImage().pixelColor(CORE, row)
    strip.set_stale(True)
    assert [text.drawn for text in words_of(strip)] == words
    stale = strip.grab().toImage().pixelColor(CORE, row)
    ground = QColor(look.theme.roles["ground"])
    assert stale.red() == pytest.approx((fresh.red() + ground.red()) / 2, abs=2)


def test_another_theme_and_another_text_size_are_shown_at_once(strip, look):
    before = strip.frame().top
    recolour(look, "dark", 1.5)
    image = strip.grab().toImage()
    assert image.pixelColor(4, 4) == QColor(theme_named("dark").roles["ground"])
    row = round(strip.frame().y(550.0))
    edge = CORE_LEFT + round(core_width(2.5))
    inks = [x for x in range(edge, edge + 40) if image.pixelColor(x, row) == QColor(look.theme.roles["ink"])]
    assert len(inks) == 1 and inks[0] > edge, "the core has moved right of the larger numbers, its outline with it"
    assert strip.frame().top > before


@pytest.mark.parametrize("width", [168, 204, 320])
@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
@pytest.mark.parametrize("upward", [False, True])
def test_every_text_has_its_room(strip, look, width, scale, upward):
    recolour(look, "light", scale)
    deep = replace(
        plate(),
        title="A survey whose name has no end and no room in any strip there is",
        intervals=tuple(replace(row, top=10 * row.top, base=10 * row.base) for row in plate().intervals),
        stations=(),
        markers=tuple((f"{name} of the long formation", 10 * depth) for name, depth in plate().markers),
    )
    strip.set_plate(deep, upward=upward)
    strip.set_window(1000.0, 1500.0)
    strip.resize(width, 640)
    placed = words_of(strip)
    assert len(placed) > 10
    for text in placed:
        assert 0 <= text.needed.left() and text.needed.right() <= width, text.drawn
        assert 0 <= text.needed.top() and text.needed.bottom() <= 640, text.drawn
        if text.drawn != text.words:
            assert not text.words.strip("\u2212\u00a0.").isdigit(), "no number is shortened"
    boxes = [text.needed.adjusted(0.5, 1, -0.5, -2) for text in placed]
    assert not any(
        one.intersects(other) for index, one in enumerate(boxes) for other in boxes[index + 1 :]
    )
    assert "no room" in strip.hint_at(30, 20)


def test_names_that_have_no_room_are_told_by_hovering(strip):
    frame = strip.frame()
    texts = words_of(strip)
    kett = next(text for text in texts if text.words == "Kett Anhydrite")
    middle = kett.needed.center().y()
    assert strip.hint_at(150, middle) == ("Kett Anhydrite" if kett.drawn != kett.words else "")
    strip.resize(168, 740)
    assert not any(text.drawn.startswith("Kett") for text in words_of(strip))
    assert strip.hint_at(150, middle) == "Kett Anhydrite"
    assert frame.top == strip.frame().top


def test_the_key_of_tones_stands_where_there_are_densities(strip):
    key = "density, g/cm\u00b3"
    assert key in [text.drawn for text in words_of(strip)]
    base = strip.frame().base
    strip.set_plate(replace(plate(), intervals=()))
    assert key not in [text.drawn for text in words_of(strip)]
    assert strip.frame().base > base, "the hole takes its room"
    assert strip.accessibleDescription().startswith("7 stations 0 to 600 m MD; window")


def test_without_a_survey_the_strip_says_so_and_asks_for_nothing(strip):
    heard = [told(signal) for signal in (strip.window_wanted, strip.depth_chosen, strip.range_brushed)]
    strip.set_nothing()
    words = [text.drawn for text in words_of(strip)]
    assert ["No survey", "nothing open"] == words[:2]
    assert "the hole, once" in words and "Tolmire 4" not in words
    drag(strip, QPoint(CORE, 200), QPoint(CORE, 300))
    turn(strip, QPoint(CORE, 200), 1)
    QTest.mouseDClick(strip, LEFT, pos=QPoint(CORE, 200))
    QTest.keyClick(strip, Qt.Key.Key_Home)
    assert heard == [[], [], []]


def test_the_strip_asks_for_the_width_of_its_names(strip):
    assert strip.sizeHint().width() == 218, "Kett Anhydrite beside the grip"
    strip.set_plate(replace(plate(), markers=()))
    assert strip.sizeHint().width() == 216


def test_the_keyboard_is_seen_to_be_there(strip, look, qtbot):
    accent = QColor(look.theme.roles["accent"])

    def framed():
        image = strip.grab().toImage()
        return image.pixelColor(100, round(strip.frame().top) - 8) == accent

    qtbot.waitUntil(strip.hasFocus)
    QTest.mouseClick(strip, LEFT, pos=at(strip, CORE, 450.0))
    assert not framed()
    QTest.keyClick(strip, Qt.Key.Key_Down)
    assert framed()


def test_a_small_window_can_still_be_moved(strip):
    strip.set_window(298.0, 304.0)
    wanted = told(strip.window_wanted)
    drag(strip, at(strip, RIGHT, 301.0), at(strip, RIGHT, 351.0))
    assert wanted[-1] == (pytest.approx(348.0, abs=1.0), pytest.approx(354.0, abs=1.0))


@pytest.mark.parametrize("scale", [1.0, 1.6])
def test_crowded_names_are_pushed_apart(strip, look, scale):
    recolour(look, "light", scale)
    strip.set_plate(replace(plate(), markers=tuple((f"Seam {n}", 300.0 + 4 * n) for n in range(8))))
    names = [text.needed for text in words_of(strip) if text.words.startswith("Seam")]
    assert len(names) == 8
    assert all(below.top() > above.bottom() - 3 for above, below in zip(names, names[1:], strict=False))
