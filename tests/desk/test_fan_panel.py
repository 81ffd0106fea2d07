"""The fan on the desk: ribbons and threads join ledger and tracks to the pixel, and rows are chosen in it."""

import math

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QColor
from PySide6.QtTest import QTest

from plumbwell.desk.hole.fan import Fan, FanRow
from plumbwell.desk.look import Look
from plumbwell.plates.axis import head_height
from plumbwell.plates.theme import theme_named

HEIGHT, ROW = 552, 24
WINDOW = (500.0, 1000.0)
DENSITIES = (2.0, 2.4, 2.9, 2.1, 2.6, 2.3)


@pytest.fixture
def look(qapp):
    look = Look()
    look.theme = theme_named("light")
    return look


@pytest.fixture
def fan(qtbot, look):
    fan = Fan(look)
    qtbot.addWidget(fan)
    fan.resize(60, HEIGHT)
    fan.set_window(*WINDOW)
    fan.show()
    return fan


def intervals(first=40, scrolled=0):
    """Rows of 50 units each from 600 on, the first at the head of the ledger."""
    return [
        FanRow(
            first + n, n * ROW - scrolled, (n + 1) * ROW - scrolled, 600.0 + 50 * n, 650.0 + 50 * n, density
        )
        for n, density in enumerate(DENSITIES)
    ]


def stations(depths=(600.0, 650.0, 700.0, 750.0, 800.0, 850.0), numbers=(40, 41, 42, 43, 44, 45)):
    return [
        FanRow(row, n * ROW, (n + 1) * ROW, depth, depth, density)
        for n, (row, depth, density) in enumerate(zip(numbers, depths, DENSITIES, strict=True))
    ]


def y_of(look, depth):
    """Px row of a depth in tracks of the fan's height, as they draw it."""
    head = head_height(look.theme)
    return math.floor(head + (depth - WINDOW[0]) / (WINDOW[1] - WINDOW[0]) * (HEIGHT - head) + 0.5)


def colour(look, role):
    return QColor(look.theme.roles[role])


def rows_of(image, x, wanted):
    return [y for y in range(image.height()) if image.pixelColor(x, y) == wanted]


def told(signal):
    heard = []
    signal.connect(heard.append)
    return heard


def test_a_ribbon_begins_at_its_row_and_ends_at_its_depths_in_its_tone(fan, look):
    fan.set_rows("interval", intervals())
    image = fan.grab().toImage()
    head = head_height(look.theme)
    for n, density in enumerate(DENSITIES):
        assert image.pixelColor(2, head + n * ROW + 12) == look.theme.tone(density)
        assert image.pixelColor(58, y_of(look, 625.0 + 50 * n)) == look.theme.tone(density)
    assert image.pixelColor(58, y_of(look, 590.0)) == colour(look, "ground")
    assert image.pixelColor(58, y_of(look, 910.0)) == colour(look, "ground")


@pytest.mark.parametrize("scrolled", [0, 7])
def test_the_thread_of_an_interval_joins_row_and_tracks_to_the_pixel(fan, look, scrolled):
    fan.set_rows("interval", intervals(scrolled=scrolled), [42])
    image = fan.grab().toImage()
    accent, head = colour(look, "accent"), head_height(look.theme)
    top = head + 2 * ROW - scrolled
    assert rows_of(image, 3, accent) == [top, top + 1, top + ROW - 2, top + ROW - 1]
    upper, lower = y_of(look, 700.0), y_of(look, 750.0)
    assert rows_of(image, 56, accent) == [upper, upper + 1, lower - 1, lower]
    assert rows_of(image, 0, accent) == list(range(top, top + ROW)), "it is closed at the ledger"
    assert rows_of(image, 59, accent) == list(range(upper, lower + 1)), "and at the tracks"


def test_chosen_neighbours_have_one_outline(fan, look):
    fan.set_rows("interval", intervals(), [41, 42, 45])
    image, accent = fan.grab().toImage(), colour(look, "accent")
    upper, lower = y_of(look, 650.0), y_of(look, 750.0)
    first, last = y_of(look, 850.0), y_of(look, 900.0)
    expected = [upper, upper + 1, lower - 1, lower, first, first + 1, last - 1, last]
    assert rows_of(image, 56, accent) == expected


def test_the_thread_of_a_station_runs_from_the_middle_of_its_row_to_its_depth(fan, look):
    fan.resize(52, HEIGHT)
    fan.set_rows("station", stations(), [43])
    image, accent = fan.grab().toImage(), colour(look, "accent")
    middle = head_height(look.theme) + 3 * ROW + ROW // 2
    assert rows_of(image, 2, accent) == [middle - 1, middle]
    at = y_of(look, 750.0)
    assert rows_of(image, 49, accent) == [at, at + 1]
    ground = colour(look, "ground")
    assert image.pixelColor(2, middle - 2) == image.pixelColor(2, middle + 1) == ground, "it is cased"


def test_ribbons_of_stations_lie_between_the_middles_of_their_rows(fan, look):
    fan.set_rows("station", stations())
    image, head = fan.grab().toImage(), head_height(look.theme)
    for n, density in enumerate(DENSITIES[:-1]):
        assert image.pixelColor(2, head + (n + 1) * ROW) == look.theme.tone(density)
    assert image.pixelColor(2, head + 4) == colour(look, "ground"), "nothing is known above the first"


def test_no_tone_goes_past_stations_that_are_not_shown(fan, look):
    fan.set_rows("station", stations(numbers=(40, 41, 44, 45, 46, 47)))
    image, head = fan.grab().toImage(), head_height(look.theme)
    assert image.pixelColor(2, head + 1 * ROW) == look.theme.tone(DENSITIES[0])
    assert image.pixelColor(2, head + 2 * ROW) == colour(look, "ground")
    assert image.pixelColor(2, head + 3 * ROW) == look.theme.tone(DENSITIES[2])


def test_rows_without_a_depth_have_no_ribbon(fan, look):
    rows = stations()
    nowhere = FanRow(42, 2 * ROW, 3 * ROW, math.nan, math.nan, math.nan)
    fan.set_rows("station", [*rows[:2], nowhere, *rows[3:]], [42])
    image, head = fan.grab().toImage(), head_height(look.theme)
    assert rows_of(image, 2, colour(look, "accent")) == []
    assert image.pixelColor(2, head + 2 * ROW + 12) == look.theme.tone(DENSITIES[1]), "its neighbours join"


def test_a_table_in_another_order_shows_only_the_thread_of_what_is_chosen(fan, look):
    fan.set_rows(None, reversed(intervals()), [42])
    image = fan.grab().toImage()
    head = head_height(look.theme)
    tones = {look.theme.tone(density).name() for density in DENSITIES}
    shown = {image.pixelColor(2, y).name() for y in range(head, HEIGHT)}
    assert not shown & tones
    assert len(rows_of(image, 56, colour(look, "accent"))) == 4
    heard = told(fan.row_chosen)
    QTest.mouseClick(fan, Qt.MouseButton.LeftButton, pos=QPoint(3, head + 3 * ROW + 12))
    assert heard == []


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.5])
def test_the_line_under_the_heads_runs_across(fan, look, scale):
    look.theme = theme_named("dark", scale)
    look.changed.emit()
    fan.set_rows("interval", intervals(scrolled=10), [40])
    image = fan.grab().toImage()
    row = head_height(look.theme) - 1
    ink, ground = colour(look, "ink"), colour(look, "ground")
    assert all(image.pixelColor(x, row) == ink for x in range(60))
    assert all(image.pixelColor(x, y) == ground for x in range(60) for y in range(row)), "the head stays empty"


def test_ribbons_out_of_the_window_leave_it_upward_and_downward(fan, look):
    fan.set_window(2000.0, 2100.0)
    fan.set_rows("interval", intervals())
    image = fan.grab().toImage()
    ground = colour(look, "ground")
    assert all(image.pixelColor(58, y) == ground for y in range(head_height(look.theme), HEIGHT))
    assert fan.row_at(58, 300.0) == -1


def test_a_click_on_a_ribbon_chooses_its_row(fan, look):
    fan.set_rows("interval", intervals())
    heard = told(fan.row_chosen)
    head = head_height(look.theme)
    for point in (
        QPoint(2, head + 3 * ROW + 5),
        QPoint(57, y_of(look, 760.0)),
        QPoint(57, y_of(look, 590.0)),
        QPoint(30, head - 10),
    ):
        QTest.mouseClick(fan, Qt.MouseButton.LeftButton, pos=point)
    assert heard == [43, 43]
    middle = (head + 3 * ROW + 12 + y_of(look, 775.0)) // 2
    QTest.mouseClick(fan, Qt.MouseButton.LeftButton, pos=QPoint(30, middle))
    assert heard[2:] == [43], "in the slope too"


def test_a_click_between_stations_chooses_the_nearer(fan, look):
    fan.set_rows("station", stations())
    heard = told(fan.row_chosen)
    for depth in (640.0, 655.0, 670.0, 680.0):
        QTest.mouseClick(fan, Qt.MouseButton.LeftButton, pos=QPoint(58, y_of(look, depth)))
    assert heard == [41, 41, 41, 42]


def test_hovering_tells_each_row_once_and_when_none_is_left(fan, look):
    fan.set_rows("interval", intervals())
    heard = told(fan.row_hovered)
    head = head_height(look.theme)
    for y in (head + 5, head + 8, head + ROW + 5, head - 20):
        QTest.mouseMove(fan, QPoint(3, y))
    assert heard == [40, 41, -1]


def test_the_fan_says_what_it_shows(fan):
    fan.set_rows("interval", intervals(), [41, 99])
    assert (fan.accessibleName(), fan.accessibleDescription()) == (
        "fan",
        "6 rows drawn into their depths, 1 chosen",
    )
    fan.set_rows(None, intervals()[:1])
    assert fan.accessibleDescription() == "1 row in view, not in order of depth"
