"""The tray: pages by their names, side by side or one at a time, by mouse and keyboard."""

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QAccessible
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QTabBar, QWidget

from plumbwell.desk.tray.tray import Tray, TrayPage
from shown_texts import SCALES, cut_short, look_of, shown_words

KEYS = ("docket", "workings", "layers", "recipe", "history")


@pytest.fixture
def look():
    with look_of() as look:
        yield look


def made_tray(look, qtbot, *, width=1190, height=232, keys=KEYS):
    tray = Tray(look)
    qtbot.addWidget(tray)
    tray.set_pages([TrayPage(key, key.capitalize(), QWidget()) for key in keys])
    tray.resize(width, height)
    with qtbot.waitActive(tray):
        tray.show()
        tray.activateWindow()
    return tray


def seen(tray):
    return [page.key for page in tray.pages if page.widget.isVisible()]


def bar_with(tray, name):
    for bar in tray.findChildren(QTabBar):
        for index in range(bar.count()):
            if bar.tabText(index) == name and bar.isVisible():
                return bar, index
    raise AssertionError(name)


def click_name(tray, name):
    bar, index = bar_with(tray, name)
    QTest.mouseClick(bar, Qt.MouseButton.LeftButton, pos=bar.tabRect(index).topLeft() + QPoint(8, 15))


def test_a_wide_tray_has_the_docket_beside_the_first_other_page(look, qtbot):
    tray = made_tray(look, qtbot)
    assert seen(tray) == ["docket", "workings"]
    docket, workings = (page.widget.geometry() for page in tray.pages[:2])
    assert docket.left() == 0 and docket.right() < 436
    assert (workings.left(), workings.right()) == (436, 1189)
    assert docket.top() == workings.top() == 34 and docket.bottom() == workings.bottom() == 231


def test_a_click_on_a_name_opens_its_page(look, qtbot):
    tray = made_tray(look, qtbot)
    with qtbot.waitSignal(tray.page_opened) as opened:
        click_name(tray, "Recipe")
    assert opened.args == ["recipe"]
    assert seen(tray) == ["docket", "recipe"]


def test_the_arrows_walk_over_all_names_and_return_opens(look, qtbot):
    tray = made_tray(look, qtbot)
    bar, _ = bar_with(tray, "Docket")
    bar.setFocus()
    opened = []
    tray.page_opened.connect(opened.append)
    for _ in range(2):
        QTest.keyClick(tray.focusWidget(), Qt.Key.Key_Right)
    assert tray.focusWidget().focused == "layers" and not opened
    QTest.keyClick(tray.focusWidget(), Qt.Key.Key_Return)
    assert opened == ["layers"] and seen(tray) == ["docket", "layers"]
    for _ in range(3):
        QTest.keyClick(tray.focusWidget(), Qt.Key.Key_Left)
    assert tray.focusWidget().focused == "docket"


def test_a_narrow_tray_shows_one_page_at_a_time(look, qtbot):
    tray = made_tray(look, qtbot, width=960)
    tray.set_narrow(True)
    assert seen(tray) == ["docket"]
    click_name(tray, "Layers")
    assert seen(tray) == ["layers"]
    assert tray.pages[2].widget.geometry().left() == 0
    tray.set_narrow(False)
    assert seen(tray) == ["docket", "layers"]


def test_large_text_leaves_no_room_for_two_columns(qtbot):
    with look_of(text_scale=1.6) as look:
        tray = made_tray(look, qtbot)
        assert tray.is_single and seen(tray) == ["docket"]
        assert tray.pages[0].widget.geometry().top() == look.theme.px(34)


def test_a_folded_tray_shows_its_names_alone_and_asks_to_be_opened_by_any_of_them(look, qtbot):
    tray = made_tray(look, qtbot, height=34)
    assert tray.is_folded and seen(tray) == []
    assert "Workings" in shown_words(tray)
    with qtbot.waitSignal(tray.page_opened) as opened:
        click_name(tray, "Workings")
    assert opened.args == ["workings"]
    tray.resize(1190, 232)
    assert seen(tray) == ["docket", "workings"]


def test_a_state_stands_after_the_name_and_goes_again(look, qtbot):
    tray = made_tray(look, qtbot)
    tray.set_state("recipe", "2 changed")
    assert "2 changed" in shown_words(tray)
    bar, index = bar_with(tray, "Recipe")
    assert bar.accessibleTabName(index) == "Recipe 2 changed"
    tray.set_state("recipe", "")
    assert "2 changed" not in shown_words(tray)


def test_other_pages_keep_what_is_open_and_hide_what_is_gone(look, qtbot):
    tray = made_tray(look, qtbot)
    tray.open_page("history")
    docket, workings, _, _, history = tray.pages
    tray.set_pages([docket, TrayPage("alternatives", "Alternatives", QWidget()), history])
    assert seen(tray) == ["docket", "history"]
    assert not workings.widget.isVisible()
    tray.set_pages([docket, workings])
    assert seen(tray) == ["docket", "workings"] and not history.widget.isVisible()


def test_a_page_that_is_not_there_cannot_be_opened(look, qtbot):
    tray = made_tray(look, qtbot)
    with pytest.raises(KeyError):
        tray.open_page("sections")


def test_the_accent_lies_on_the_rule_over_open_names_only(look, qtbot):
    tray = made_tray(look, qtbot)
    picture = tray.grab().toImage()
    accent, rule = look.theme.colour("accent"), look.theme.colour("rule")
    bar, index = bar_with(tray, "Layers")
    layers = bar.mapTo(tray, bar.tabRect(index).topLeft()).x() + 8
    assert [picture.pixelColor(x, 0) for x in (8, 444)] == [accent, accent]
    assert [picture.pixelColor(x, 0) for x in (layers, 300, 1180)] == [rule, rule, rule]
    tray.open_page("layers")
    assert tray.grab().toImage().pixelColor(layers, 0) == accent


def test_a_screen_reader_gets_a_list_of_tabs(look, qtbot):
    tray = made_tray(look, qtbot)
    bar, _ = bar_with(tray, "Workings")
    seen_as = QAccessible.queryAccessibleInterface(bar)
    assert seen_as.role() == QAccessible.Role.PageTabList
    assert seen_as.child(0).role() == QAccessible.Role.PageTab
    assert seen_as.child(0).text(QAccessible.Text.Name) == "Workings"


@pytest.mark.parametrize("scale", SCALES)
@pytest.mark.parametrize("width", [960, 1190, 1600])
def test_every_name_has_room_at_every_text_scale(qtbot, scale, width):
    with look_of("dark", scale) as look:
        tray = made_tray(look, qtbot, width=width)
        tray.set_state("recipe", "2 changed")
        tray.set_state("docket", "12")
        assert cut_short(tray) == []
        words = shown_words(tray)
        assert {"Docket", "Workings", "Layers", "Recipe", "History"} <= set(words)


def test_states_give_way_to_names_and_stand_in_the_tool_tip(look, qtbot):
    tray = made_tray(look, qtbot, width=310)
    tray.set_state("recipe", "2 changed")
    assert cut_short(tray) == [] and "2 changed" not in shown_words(tray)
    bar, index = bar_with(tray, "Recipe")
    assert bar.tabToolTip(index) == "Recipe, 2 changed"


def test_names_that_cannot_stand_beside_each_other_are_shortened_within_their_room(look, qtbot):
    tray = made_tray(look, qtbot, width=240)
    bar, _ = bar_with(tray, "History")
    assert bar.tabRect(bar.count() - 1).right() <= 240
