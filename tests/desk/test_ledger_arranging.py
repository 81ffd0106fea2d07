"""Sorting, filtering, choosing columns, scrolling to depths, and what stays when the table is another one."""

import json

import numpy as np
import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from made_ledger import interval_table, large_table, seconds, visit_table
from plumbwell.desk.ledger.ledger import Ledger
from plumbwell.desk.ledger.ledger_menu import column_menu
from plumbwell.desk.ledger.table import LedgerColumn
from plumbwell.desk.look import Look
from plumbwell.plates.lettering import text_placed

LEFT, CTRL = Qt.MouseButton.LeftButton, Qt.KeyboardModifier.ControlModifier


@pytest.fixture
def open_ledger(qtbot):
    """Opens a ledger on a table, twelve rows high."""

    def opened(table=None, memory=None):
        made = Ledger(Look(), memory)
        qtbot.addWidget(made)
        made.set_table(interval_table() if table is None else table)
        made.resize(made.natural_width(), 52 + 24 * 12)
        made.show()
        made.setFocus()
        QApplication.processEvents()
        return made

    return opened


def rows(ledger):
    """Table rows from the top of the view."""
    return [row for row, _, _ in ledger.rows_in_view()]


def shown(ledger):
    """Keys of the columns in view."""
    return [choice.key for choice in ledger.column_choices() if choice.shown]


def click_head(ledger, key):
    """Click the head of a column."""
    head = ledger.rows.head
    section = shown(ledger).index(key)
    x = head.sectionViewportPosition(section) + head.sectionSize(section) // 2
    QTest.mouseClick(head.viewport(), LEFT, Qt.KeyboardModifier.NoModifier, QPoint(x, 20))


def write(ledger, text):
    """Write into the field of the filter."""
    ledger.line.field.clear()
    QTest.keyClicks(ledger.line.field, text)


def words(ledger):
    """All words as drawn."""
    with text_placed() as placed:
        ledger.grab()
    return [one.drawn for one in placed]


def test_clicks_on_a_head_sort_up_then_down_then_as_given(open_ledger):
    ledger = open_ledger()
    click_head(ledger, "density")
    assert rows(ledger)[:3] == [12, 14, 13] and not ledger.in_depth_order()
    click_head(ledger, "density")
    assert rows(ledger)[:3] == [19, 17, 18]
    click_head(ledger, "density")
    assert rows(ledger)[:3] == [0, 1, 2] and ledger.in_depth_order()


def test_a_column_that_rows_are_given_by_turns_round_at_the_first_click(open_ledger):
    ledger = open_ledger()
    click_head(ledger, "top")
    assert rows(ledger)[:2] == [19, 18]
    click_head(ledger, "top")
    assert rows(ledger)[:2] == [0, 1]


def test_the_wedge_stands_at_the_column_that_rows_stand_by(open_ledger):
    ledger = open_ledger(interval_table(repeats=10))

    def wedges():
        return {key: ledger.rows.wedge_of(key) for key in shown(ledger) if ledger.rows.wedge_of(key)}

    assert wedges() == {"top": "down"}
    ledger.choose_columns(["base", "density"])
    assert wedges() == {"base": "down"}
    ledger.rows.verticalScrollBar().setValue(500)
    ledger.sort_by("density", descending=True)
    assert wedges() == {"density": "up"} and ledger.rows_in_view()[0][1] == 0


def test_the_corner_puts_rows_back_as_given(open_ledger):
    ledger = open_ledger()
    click_head(ledger, "density")
    QTest.mouseClick(ledger.rows.corner, LEFT, Qt.KeyboardModifier.NoModifier, QPoint(20, 20))
    assert rows(ledger)[:3] == [0, 1, 2]


def test_rows_without_a_value_come_last_whichever_way(open_ledger):
    ledger = open_ledger(visit_table())
    ledger.sort_by("residual")
    assert rows(ledger) == [2, 3, 6, 0, 1, 4, 5]
    ledger.sort_by("residual", descending=True)
    assert rows(ledger) == [6, 3, 2, 0, 1, 4, 5]


def test_the_filter_opens_filters_as_one_writes_and_escape_shows_all_again(open_ledger):
    ledger = open_ledger()
    top = ledger.body_top()
    QTest.keyClick(ledger.rows, Qt.Key.Key_F, CTRL)
    assert ledger.line.isVisible() and ledger.line.field.hasFocus() and ledger.body_top() > top
    write(ledger, "density > 2.9 and ratio > 0")
    assert rows(ledger) == [17, 18, 19] and "3 of 20 rows" in words(ledger)
    QTest.keyClick(ledger.line.field, Qt.Key.Key_Return)
    assert ledger.rows.hasFocus() and rows(ledger) == [17, 18, 19]
    QTest.keyClick(ledger.rows, Qt.Key.Key_Escape)
    assert not ledger.line.isVisible() and len(rows(ledger)) == 12 and ledger.body_top() == top
    QTest.keyClick(ledger.rows, Qt.Key.Key_F, CTRL)
    assert ledger.line.field.text() == ""
    QTest.keyClick(ledger.line.field, Qt.Key.Key_Escape)
    assert not ledger.line.isVisible() and ledger.rows.hasFocus()


def test_a_wrong_filter_says_why_and_hides_nothing(open_ledger):
    ledger = open_ledger()
    ledger.open_filter()
    write(ledger, "density > heavy")
    assert '"heavy" is not a number' in words(ledger) and rows(ledger)[0] == 0
    assert ledger.line.field.accessibleDescription() == '"heavy" is not a number'
    write(ledger, "density > 4")
    assert rows(ledger) == [] and "0 of 20 rows" in words(ledger)
    assert "No row passes the filter. Esc shows all rows." in words(ledger)


def test_sorting_and_filtering_go_together_and_are_told(open_ledger, qtbot):
    ledger = open_ledger()
    with qtbot.waitSignal(ledger.moved):
        ledger.sort_by("density", descending=True)
    with qtbot.waitSignal(ledger.moved):
        ledger.set_filter("density < 2.2")
    assert rows(ledger) == [15, 13, 14, 12]


def test_words_are_looked_for_in_the_columns_that_are_shown(open_ledger):
    ledger = open_ledger()
    ledger.set_filter("salt")
    assert rows(ledger) == []
    ledger.choose_columns([*shown(ledger), "layer"])
    assert rows(ledger) == [12, 13, 14, 15]


def test_chosen_columns_widths_and_sort_come_back_by_stage(open_ledger):
    memory = {}
    ledger = open_ledger(memory=memory)
    ledger.choose_columns(["top", "density", "layer"])
    ledger.rows.head.resizeSection(1, 150)
    ledger.sort_by("density", descending=True)
    kept = json.loads(json.dumps(memory))
    again = open_ledger(memory=kept)
    assert shown(again) == ["top", "density", "layer"] and again.rows.head.sectionSize(1) == 150
    assert rows(again)[0] == 19
    again.set_table(visit_table())
    assert "residual" in shown(again) and rows(again)[:2] == [0, 1]
    again.set_table(interval_table())
    assert shown(again) == ["top", "density", "layer"] and rows(again)[0] == 19


def test_a_column_that_is_new_comes_into_view_beside_chosen_ones(open_ledger):
    ledger = open_ledger()
    ledger.choose_columns(["top", "density"])
    table = interval_table()
    beside = LedgerColumn(key="beside", name="beside", values=np.zeros(20))
    ledger.set_table(interval_table(columns=(*table.columns, beside)))
    assert shown(ledger) == ["top", "density", "beside"]


def test_a_narrow_window_has_fewer_columns_and_a_choice_of_its_own(open_ledger):
    ledger = open_ledger()
    wide = ledger.natural_width()
    ledger.set_narrow(True)
    assert shown(ledger) == ["top", "base", "density", "log", "ratio"] and ledger.natural_width() < wide
    ledger.choose_columns(["top", "step"])
    ledger.set_narrow(False)
    assert shown(ledger) == ["top", "base", "step", "density", "log", "difference", "ratio"]
    ledger.set_narrow(True)
    assert shown(ledger) == ["top", "step"]


def test_the_menu_of_columns_stays_open_while_several_are_chosen(open_ledger):
    ledger = open_ledger()
    menu = column_menu(ledger, ledger)
    menu.popup(QPoint(0, 0))
    actions = {action.text(): action for action in menu.actions()}
    assert actions["density"].toolTip() == "interval density, shell form" and not actions["layer"].isChecked()
    QTest.mouseClick(menu, LEFT, Qt.KeyboardModifier.NoModifier, menu.actionGeometry(actions["layer"]).center())
    menu.setActiveAction(actions["base"])
    QTest.keyClick(menu, Qt.Key.Key_Space)
    assert menu.isVisible() and "layer" in shown(ledger) and "base" not in shown(ledger)
    menu.close()


def test_dragged_widths_are_given_back_by_a_double_click_on_the_edge(open_ledger):
    ledger = open_ledger()
    natural = ledger.natural_width()
    ledger.rows.head.resizeSection(2, 300)
    assert ledger.natural_width() > natural + 200
    ledger.rows.head.sectionHandleDoubleClicked.emit(2)
    assert ledger.natural_width() == natural


def test_the_same_rows_with_new_numbers_stay_sorted_filtered_chosen_and_in_place(open_ledger):
    ledger = open_ledger(interval_table(repeats=10))
    ledger.sort_by("top", descending=True)
    ledger.set_filter("density < 2.4")
    ledger.choose_rows((4, 150))
    ledger.go_to_cell(4, "density")
    ledger.rows.verticalScrollBar().setValue(240)
    before, cell = ledger.rows_in_view(), ledger.current_cell()
    moves = []
    ledger.moved.connect(lambda: moves.append(1))
    ledger.set_table(interval_table(repeats=10))
    assert (ledger.rows_in_view(), ledger.chosen_rows(), ledger.current_cell()) == (before, (4, 150), cell)
    assert ledger.line.field.text() == "density < 2.4" and not moves
    ledger.set_table(interval_table(repeats=9))
    assert ledger.chosen_rows() == () and rows(ledger)[0] < 180


def test_another_stage_has_no_filter_and_begins_at_the_top(open_ledger):
    ledger = open_ledger(interval_table(repeats=10))
    ledger.set_filter("density < 2.4")
    ledger.rows.verticalScrollBar().setValue(480)
    ledger.set_table(visit_table())
    assert not ledger.line.isVisible() and len(rows(ledger)) == 7


def test_scrolling_to_depths_moves_as_little_as_it_can(open_ledger):
    ledger = open_ledger(interval_table(repeats=10))
    ledger.show_depths(554.0, 700.0)
    assert rows(ledger)[0] == 0
    ledger.show_depths(1000.0, 1010.0)
    assert rows(ledger)[-1] == 26 and len(rows(ledger)) == 12
    where = ledger.rows_in_view()
    ledger.show_depths(990.0, 1005.0)
    assert ledger.rows_in_view() == where
    ledger.show_depths(902.0, 2000.0)
    assert rows(ledger)[0] == 20
    ledger.rows.verticalScrollBar().setValue(40 * 24)
    ledger.show_depths(902.0, 2000.0)
    assert rows(ledger)[0] == 40, "rows that lie within the depths fill the view already"
    top, base = ledger.visible_depths()
    table = ledger.table
    assert (top, base) == (table.top[rows(ledger)[0]], table.base[rows(ledger)[-1]])
    ledger.sort_by("density")
    where = ledger.rows_in_view()
    ledger.show_depths(3000.0, 3100.0)
    assert ledger.rows_in_view() == where and not ledger.in_depth_order()


def test_scrolling_is_told_with_the_places_of_rows(open_ledger, qtbot):
    ledger = open_ledger(interval_table(repeats=10))
    with qtbot.waitSignal(ledger.moved):
        ledger.rows.verticalScrollBar().setValue(36)
    assert ledger.rows_in_view()[0] == (1, -12, 12)
    fan = ledger.fan_rows()
    assert [one.row for one in fan[:2]] == [0, 1] and (fan[1].top_px, fan[1].base_px) == (-12, 12)
    assert fan[-1].row == rows(ledger)[-1] + 1 and fan[1].top == 576.0


def test_visits_of_a_day_are_not_in_order_of_depth(open_ledger):
    assert not open_ledger(visit_table()).in_depth_order()


def test_copied_rows_have_headings_sds_and_every_figure(open_ledger):
    ledger = open_ledger()
    ledger.choose_rows((4, 5))
    ledger.choose_columns(["top", "density", "layer"])
    ledger.sort_by("top", descending=True)
    QTest.keyClick(ledger.rows, Qt.Key.Key_C, CTRL)
    assert QGuiApplication.clipboard().text() == (
        "No\ttop [m]\tdensity [g/cm3]\tdensity_sd [g/cm3]\tlayer\n"
        "29\t640.0\t2.2121\t0.0138\tLower Pell\n"
        "28\t626.0\t2.2163\t0.0119\tLower Pell\n"
    )
    assert QGuiApplication.clipboard().mimeData().formats() == ["text/plain"]


def test_with_nothing_chosen_all_rows_in_view_of_the_filter_are_copied(open_ledger):
    ledger = open_ledger(visit_table())
    ledger.set_filter("depth >= 788")
    ledger.choose_columns(["time", "less_tide", "residual"])
    assert ledger.copied_text() == (
        "No\ttime\tless_tide [uGal]\tresidual [uGal]\tresidual_sd [uGal]\n"
        "31\t2025-10-15T11:22:00Z\t55.3\t\t2.9\n"
        "32\t2025-10-15T11:41:00Z\t59.02\t\t2.9\n"
        "37\t2025-10-15T13:22:00Z\t40.2\t12.04\t11.5\n"
    )


def test_copied_times_keep_parts_of_seconds_and_texts_keep_to_their_cell(open_ledger):
    table = interval_table()
    time = np.full(20, seconds(2025, 10, 15, 11, 42) + 0.25)
    time[0] = np.nan
    columns = (
        LedgerColumn(key="time", name="time", kind="time", values=time),
        LedgerColumn(key="note", name="note", kind="text", values=("two\tcells\nand lines",) * 20),
    )
    ledger = open_ledger(interval_table(columns=columns, numbers=table.numbers))
    lines = ledger.copied_text().splitlines()
    assert lines[0] == "No\ttime\tnote" and len(lines) == 21
    assert lines[1] == "24\t\ttwo cells and lines"
    assert lines[2] == "25\t2025-10-15T11:42:00.250Z\ttwo cells and lines"


def test_a_long_table_waits_for_a_pause_in_the_writing(open_ledger, qtbot):
    ledger = open_ledger(large_table(100_000))
    ledger.open_filter()
    QTest.keyClicks(ledger.line.field, "layer = corran salt")
    assert len(rows(ledger)) > 0 and rows(ledger)[:2] == [0, 1]
    QTest.keyClick(ledger.line.field, Qt.Key.Key_Return)
    layers = {ledger.table.columns[-1].values[row] for row in rows(ledger)}
    assert layers == {"Corran Salt"}
