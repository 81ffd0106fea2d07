"""The settle-down of a visit: its readings about their mean, chosen by click and keys, and words when there is none."""

from dataclasses import replace

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QColor
from PySide6.QtTest import QTest

from plumbwell.desk.tray.settle_view import NOTHING_CHOSEN, SettleView
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.settle_plot import SettlePlot

MINUTES = (0.0, 1.1, 2.1, 3.2, 4.1, 5.3, 6.2)
VALUES = (19.0, 6.0, 9.1, -1.2, -3.1, 0.9, -1.6)
VISIT = SettlePlot(
    title="Settle-down of visit 33, 640.0 m",
    unit="µGal",
    run_index=1,
    minutes=MINUTES,
    values=VALUES,
    rows=range(200, 207),
    sds=[4.0] * 7,
    excluded=[True] + [False] * 6,
    mean_sd=1.7,
)


@pytest.fixture
def view(look, qtbot):
    """The page with the invented visit, 600 x 190."""
    view = SettleView(look)
    qtbot.addWidget(view)
    view.resize(600, 190)
    view.set_visit(VISIT)
    view.show()
    return view


def heard(signal):
    """A list that fills with what a signal carries."""
    found = []
    signal.connect(found.append)
    return found


def spot(view, index):
    """Where a reading lies."""
    layout = view.settle_layout()
    (panel,) = layout.axis.shown()
    return QPoint(round(panel.x(60 * MINUTES[index])), round(layout.frames[0].scale.y(VALUES[index])))


def has(image, x, y, role, theme):
    """Whether a pixel has the colour of a role."""
    return QColor(image.pixel(x, y)).name() == theme.roles[role].lower()


def test_without_a_visit_it_says_what_to_do(look, qtbot):
    view = SettleView(look)
    qtbot.addWidget(view)
    view.resize(600, 190)
    with text_placed() as placed:
        view.grab()
    assert [one.drawn for one in placed] == [NOTHING_CHOSEN]
    assert view.accessibleDescription() == NOTHING_CHOSEN


def test_title_unit_minutes_and_mean_are_written(view):
    with text_placed() as placed:
        view.grab()
    words = [one.drawn for one in placed]
    assert {"Settle-down of visit 33, 640.0 m", "µGal", "min", "mean", "0", "6"} <= set(words)
    assert "\u22121" not in words, "no time before the first reading"


def test_clicking_a_reading_chooses_its_row(view):
    chosen = heard(view.rows_chosen)
    QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=spot(view, 2))
    QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=spot(view, 0))
    assert chosen == [(202,), (200,)], "the one left out too"


def test_ctrl_click_joins_and_leaves(view):
    chosen = heard(view.rows_chosen)
    view.set_selection([203, 205])
    control = Qt.KeyboardModifier.ControlModifier
    QTest.mouseClick(view, Qt.MouseButton.LeftButton, control, pos=spot(view, 1))
    QTest.mouseClick(view, Qt.MouseButton.LeftButton, control, pos=spot(view, 5))
    assert chosen == [(201, 203, 205), (203,)]


def test_keys_walk_the_readings_in_time(view):
    walked = heard(view.walked)
    QTest.keyClick(view, Qt.Key.Key_Right)
    view.set_selection([205])
    QTest.keyClick(view, Qt.Key.Key_Right)
    QTest.keyClick(view, Qt.Key.Key_Left)
    view.set_selection([206])
    QTest.keyClick(view, Qt.Key.Key_Right)
    assert walked == [200, 206, 204]


def test_the_mean_is_a_line_with_its_band(view, look):
    image = view.grab().toImage()
    layout = view.settle_layout()
    scale, (panel,) = layout.frames[0].scale, layout.axis.shown()
    x = round(panel.x(60 * 2.6))
    ground = QColor(look.theme.roles["ground"]).name()
    assert QColor(image.pixel(x, round(scale.y(0.0)))).lightness() < 90
    assert QColor(image.pixel(x, round(scale.y(3.0)))).name() != ground
    assert QColor(image.pixel(x, round(scale.y(4.2)))).name() == ground


def test_the_reading_left_out_is_a_cross_without_a_whisker(view, look):
    image, at = view.grab().toImage(), spot(view, 0)
    colours = {QColor(image.pixel(at.x() + dx, at.y() + dy)).name() for dx in range(-3, 4) for dy in range(-3, 4)}
    assert look.theme.roles["muted"].lower() in colours
    assert look.theme.roles["run_2"].lower() not in colours


def test_hovering_tells_the_row(view):
    hovered = heard(view.row_hovered)
    QTest.mouseMove(view, spot(view, 4))
    QTest.mouseMove(view, QPoint(20, 100))
    assert hovered == [204, None]


def test_it_is_told_in_words(view):
    assert view.accessibleDescription() == ("Settle-down of visit 33, 640.0 m, 7 readings in 6.2 min, 1 left out")
    view.set_selection([203])
    assert view.accessibleDescription().endswith("reading 4 chosen, \u22121.2 µGal from the mean")


def test_one_reading_alone_can_be_shown(view):
    view.set_visit(
        SettlePlot(
            title="Settle-down of visit 1, 0.0 m", unit="µGal", run_index=0, minutes=[0.0], values=[0.0], rows=[9]
        )
    )
    chosen = heard(view.rows_chosen)
    layout = view.settle_layout()
    (panel,) = layout.axis.shown()
    at = QPoint(round(panel.x(0.0)), round(layout.frames[0].scale.y(0.0)))
    QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=at)
    assert chosen == [(9,)]


@pytest.mark.parametrize("scale", [0.9, 1.6])
@pytest.mark.parametrize("width", [480, 600])
def test_no_word_is_cut_off(view, look, scale, width):
    look.choose(wanted="dark", text_scale=scale)
    view.resize(width, 190)
    with text_placed() as placed:
        view.grab()
    assert len(placed) >= 7
    for one in placed:
        assert one.drawn == one.words and one.needed.left() >= 0 and one.needed.right() <= width + 0.01, one
        assert one.needed.bottom() <= 190, one


def test_the_cut_of_a_visit_that_creeps_is_drawn_and_said(view):
    assert "leave out" not in view.accessibleDescription()
    view.set_visit(replace(VISIT, excluded=False, leave_out=2, cut=1.6, plateau=-6.0))
    with text_placed() as placed:
        image = view.grab().toImage()
    assert "leave out 2" in [one.drawn for one in placed]
    assert "creeps, 2 first to leave out" in view.accessibleDescription()
    layout, theme = view.settle_layout(), view._look.theme
    (panel,) = layout.axis.shown()
    cut, scale = round(panel.x(96.0)), layout.frames[0].scale
    assert has(image, cut, round(scale.base - 3), "amber", theme)
    assert has(image, round(panel.x(60 * 3.7)), round(scale.y(-6.0)), "amber", theme), "the plateau after the cut"
    assert not has(image, round(panel.x(60 * 0.5)), round(scale.y(-6.0)), "amber", theme), "and none before"
