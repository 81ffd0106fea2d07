"""The history: newest first, the present point marked, every point one act away, by mouse and keyboard."""

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest

from plumbwell.desk.tray.history_page import AHEAD, ASIDE, BACK, HERE, HistoryPage, HistoryRow, way_of
from shown_texts import SCALES, cut_short, look_of, placed_texts, shown_words

ROWS = (
    HistoryRow(0, "10:02", "R. Aldous", "Opened the survey"),
    HistoryRow(1, "10:14", "R. Aldous", "Reference density 2.41 g/cm³", "before the tare"),
    HistoryRow(2, "10:15", "R. Aldous", "Excluded 3 readings", branch=True),
    HistoryRow(3, "10:31", "R. Aldous", "Sd of depths 0.04 m", here=True),
    HistoryRow(4, "10:40", "R. Aldous", "Drift order 2", ahead=True),
)


def made_page(look, qtbot, rows=ROWS, *, width=760, height=300):
    page = HistoryPage(look)
    qtbot.addWidget(page)
    page.resize(width, height)
    page.set_points(rows)
    with qtbot.waitActive(page):
        page.show()
        page.activateWindow()
    return page


def box_of(page, number):
    rows = page.view.rows.rows
    return page.view.visualRect(page.view.rows.index([row.number for row in rows].index(number)))


def test_points_stand_newest_first_whatever_order_they_come_in(look, qtbot):
    page = made_page(look, qtbot, (ROWS[3], ROWS[0], ROWS[4], ROWS[1], ROWS[2]))
    sentences = [words for words in shown_words(page) if words in {row.sentence for row in ROWS}]
    assert sentences == [row.sentence for row in reversed(ROWS)]


def test_every_point_but_the_present_one_has_its_way(look, qtbot):
    page = made_page(look, qtbot)
    words = shown_words(page)
    assert [words.count(one) for one in (AHEAD, HERE, ASIDE, BACK)] == [1, 1, 1, 2]
    assert way_of(ROWS[3]) == ""
    assert {"R. Aldous, undone", "R. Aldous, another branch", "before the tare"} <= set(words)


def test_a_click_on_the_way_goes_and_one_beside_it_does_not(look, qtbot):
    page = made_page(look, qtbot)
    gone = []
    page.go_to.connect(gone.append)
    QTest.mouseClick(page.view.viewport(), Qt.MouseButton.LeftButton, pos=box_of(page, 1).center())
    assert gone == []
    way = page.view.painter.way_box(ROWS[1], box_of(page, 1))
    QTest.mouseClick(page.view.viewport(), Qt.MouseButton.LeftButton, pos=way.center())
    assert gone == [1]
    at = box_of(page, 3).topRight() + QPoint(-10, 10)
    QTest.mouseClick(page.view.viewport(), Qt.MouseButton.LeftButton, pos=at)
    assert gone == [1]


def test_the_keyboard_walks_and_return_goes(look, qtbot):
    page = made_page(look, qtbot)
    gone = []
    page.go_to.connect(gone.append)
    page.setFocus()
    QTest.keyClick(page.view, Qt.Key.Key_Return)
    assert gone == []
    QTest.keyClick(page.view, Qt.Key.Key_Up)
    QTest.keyClick(page.view, Qt.Key.Key_Return)
    QTest.keyClick(page.view, Qt.Key.Key_End)
    QTest.keyClick(page.view, Qt.Key.Key_Return)
    assert gone == [4, 0]


def test_the_present_point_has_the_accent_bar_and_the_undone_are_muted(look, qtbot):
    page = made_page(look, qtbot)
    picture = page.view.viewport().grab().toImage()
    colours = {row.number: picture.pixelColor(1, box_of(page, row.number).center().y()) for row in ROWS}
    assert colours[3] == look.theme.colour("accent")
    assert all(colours[number] == look.theme.colour("ground") for number in (0, 1, 2, 4))
    spoken = [page.view.rows.data(page.view.rows.index(row), Qt.ItemDataRole.AccessibleTextRole) for row in range(5)]
    assert spoken[0] == "10:40, Drift order 2, R. Aldous, undone"
    assert spoken[1] == "10:31, Sd of depths 0.04 m, R. Aldous, present point"
    assert spoken[2].endswith("another branch")


def test_the_present_point_is_named_by_return_and_by_the_word(look, qtbot):
    page = made_page(look, qtbot)
    named = []
    page.point_named.connect(named.append)
    page.start_naming()
    assert page.name.hasFocus()
    QTest.keyClick(page.name, Qt.Key.Key_Return)
    QTest.keyClicks(page.name, "  first   try ")
    QTest.keyClick(page.name, Qt.Key.Key_Return)
    QTest.mouseClick(page.give, Qt.MouseButton.LeftButton)
    assert named == ["first try", "first try"]


def test_a_name_being_typed_stays_while_an_act_is_added(look, qtbot):
    page = made_page(look, qtbot)
    page.start_naming()
    QTest.keyClicks(page.name, "half a na")
    page.set_points((*ROWS[:3], HistoryRow(5, "10:50", "me", "Tide none", here=True)))
    assert page.name.text() == "half a na"
    QTest.keyClick(page.name, Qt.Key.Key_Escape)
    assert page.name.text() == ""
    page.set_points((HistoryRow(1, "10:14", "me", "Tide none", "kept", here=True),))
    assert page.name.text() == "kept"


def test_without_points_the_page_says_so(look, qtbot):
    page = made_page(look, qtbot, ())
    assert shown_words(page) == ["Nothing has been done yet. Every act is kept and listed here."]
    assert not page.name.isVisible()


def test_a_long_sentence_leaves_room_for_name_and_way(look, qtbot):
    long = HistoryRow(9, "10:59", "R. Aldous", "Excluded reading 17 of station TB-12 " * 5, "after the storm")
    page = made_page(look, qtbot, (long,), width=620)
    placed = {one.words: one for one in placed_texts(page.view)}
    assert placed["after the storm"].drawn == "after the storm"
    assert placed[long.sentence].needed.right() < placed["after the storm"].needed.left()
    assert placed["after the storm"].needed.right() < placed["R. Aldous"].needed.left() < placed[BACK].needed.left()
    assert page.view.rows.data(page.view.rows.index(0), Qt.ItemDataRole.ToolTipRole) == long.sentence


@pytest.mark.parametrize("scale", SCALES)
def test_times_and_ways_have_room_at_every_text_scale(qtbot, scale):
    with look_of("dark", scale) as look:
        page = made_page(look, qtbot, width=750)
        assert cut_short(page, [row.sentence for row in ROWS] + [row.name for row in ROWS]) == []
        assert page.view.visualRect(page.view.rows.index(0)).height() == look.theme.px(28)
