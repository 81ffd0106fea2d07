"""A person's pointer and keys in a ledger, and the thread to and from the world outside."""

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QContextMenuEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from made_ledger import interval_table, large_table, visit_table
from plumbwell.desk.ledger.ledger import Ledger
from plumbwell.desk.look import Look

LEFT = Qt.MouseButton.LeftButton
SHIFT, CTRL = Qt.KeyboardModifier.ShiftModifier, Qt.KeyboardModifier.ControlModifier


@pytest.fixture
def ledger(qtbot):
    """Twenty intervals in a ledger that has the focus, and every signal it gives."""
    made = Ledger(Look())
    qtbot.addWidget(made)
    made.set_table(interval_table())
    made.resize(made.natural_width(), 52 + 24 * 12)
    made.show()
    made.setFocus()
    QApplication.processEvents()
    made.told = []
    for name in ("rows_chosen", "row_hovered", "cell_reached", "use_toggled", "activated"):
        getattr(made, name).connect(lambda *what, name=name: made.told.append((name, *what)))
    return made


def at(ledger, row, key="density"):
    """Middle of a cell in the viewport."""
    column = [choice.key for choice in ledger.column_choices() if choice.shown].index(key)
    top = {one: upper for one, upper, _ in ledger.rows_in_view()}[row]
    return QPoint(ledger.rows.columnViewportPosition(column) + ledger.rows.columnWidth(column) // 2, top + 12)


def click(ledger, row, key="density", modifiers=Qt.KeyboardModifier.NoModifier):
    """Click a cell."""
    QTest.mouseClick(ledger.rows.viewport(), LEFT, modifiers, at(ledger, row, key))


def press(ledger, key, modifiers=Qt.KeyboardModifier.NoModifier):
    """Press a key in the rows."""
    QTest.keyClick(ledger.rows, key, modifiers)


def chosen(ledger):
    """What was last signalled as chosen."""
    return [what[1] for what in ledger.told if what[0] == "rows_chosen"][-1]


def test_a_click_chooses_the_row_and_goes_to_the_cell(ledger):
    click(ledger, 4)
    assert ledger.told == [("rows_chosen", (4,)), ("cell_reached", 4, "density")]
    assert ledger.current_cell() == (4, "density") and ledger.chosen_rows() == (4,)
    click(ledger, 4, "ratio")
    assert ledger.told[2:] == [("cell_reached", 4, "ratio")], "the same row is not chosen anew"


def test_shift_extends_and_control_adds_and_takes_away(ledger):
    click(ledger, 2)
    click(ledger, 5, modifiers=SHIFT)
    assert chosen(ledger) == (2, 3, 4, 5)
    click(ledger, 8, modifiers=CTRL)
    assert chosen(ledger) == (2, 3, 4, 5, 8)
    click(ledger, 3, modifiers=CTRL)
    assert chosen(ledger) == (2, 4, 5, 8)
    click(ledger, 10, modifiers=CTRL)
    click(ledger, 11, modifiers=SHIFT | CTRL)
    assert chosen(ledger) == (2, 4, 5, 8, 10, 11)
    click(ledger, 9, modifiers=SHIFT)
    assert chosen(ledger) == (9, 10)


def test_dragging_over_rows_chooses_them_also_in_the_frozen_column(ledger):
    for part, x in ((ledger.rows.viewport(), 80), (ledger.rows.numbers.viewport(), 30)):
        ledger.choose_rows(())
        QTest.mousePress(part, LEFT, Qt.KeyboardModifier.NoModifier, QPoint(x, 1 * 24 + 12))
        for row in (2, 3, 4):
            _move(part, QPoint(x, row * 24 + 12), LEFT)
        QTest.mouseRelease(part, LEFT, Qt.KeyboardModifier.NoModifier, QPoint(x, 4 * 24 + 12))
        assert chosen(ledger) == (1, 2, 3, 4)


def _move(part, to, buttons=Qt.MouseButton.NoButton):
    """Move the pointer as a window system tells it, with the buttons that are down."""
    from PySide6.QtGui import QMouseEvent

    event = QMouseEvent(
        QEvent.Type.MouseMove,
        QPointF(to),
        QPointF(part.mapToGlobal(to)),
        Qt.MouseButton.NoButton,
        buttons,
        Qt.KeyboardModifier.NoModifier,
    )
    QApplication.sendEvent(part, event)


def test_a_click_on_a_row_number_chooses_the_row(ledger):
    QTest.mouseClick(ledger.rows.numbers.viewport(), LEFT, Qt.KeyboardModifier.NoModifier, QPoint(30, 6 * 24 + 5))
    assert ledger.told[0] == ("rows_chosen", (6,))


def test_arrow_keys_walk_rows_and_cells_and_the_view_follows(ledger):
    click(ledger, 10)
    ledger.told.clear()
    press(ledger, Qt.Key.Key_Down)
    press(ledger, Qt.Key.Key_Down)
    press(ledger, Qt.Key.Key_Right)
    assert ledger.told == [
        ("rows_chosen", (11,)),
        ("cell_reached", 11, "density"),
        ("rows_chosen", (12,)),
        ("cell_reached", 12, "density"),
        ("cell_reached", 12, "log"),
    ]
    assert ledger.rows_in_view()[-1][0] == 12 and ledger.rows_in_view()[-1][2] <= ledger.rows.viewport().height()
    press(ledger, Qt.Key.Key_Home, CTRL)
    assert chosen(ledger) == (0,) and ledger.rows_in_view()[0][:2] == (0, 0)


def test_shift_and_arrows_extend_and_control_a_chooses_all(ledger):
    click(ledger, 5)
    press(ledger, Qt.Key.Key_Down, SHIFT)
    press(ledger, Qt.Key.Key_Down, SHIFT)
    assert chosen(ledger) == (5, 6, 7)
    press(ledger, Qt.Key.Key_Up, SHIFT)
    assert chosen(ledger) == (5, 6)
    press(ledger, Qt.Key.Key_A, CTRL)
    assert chosen(ledger) == tuple(range(20))
    press(ledger, Qt.Key.Key_Down)
    assert chosen(ledger) == (7,)


def test_space_toggles_the_use_of_chosen_rows_and_return_goes_to_the_row(ledger):
    press(ledger, Qt.Key.Key_Space)
    assert ledger.told == [("use_toggled", [0])], "with nothing chosen it is the row of the current cell"
    ledger.sort_by("density", descending=True)
    ledger.choose_rows((3, 1, 12))
    ledger.told.clear()
    press(ledger, Qt.Key.Key_Space)
    assert ledger.told == [("use_toggled", [1, 3, 12])]
    press(ledger, Qt.Key.Key_Return)
    assert ledger.told[1:] == [("activated", ledger.current_cell()[0])]


def test_rows_that_the_filter_hides_are_not_toggled_or_copied(ledger):
    ledger.choose_rows((1, 2, 17))
    ledger.set_filter("density > 2.9")
    press(ledger, Qt.Key.Key_Space)
    assert ledger.told == [("use_toggled", [17])]
    assert ledger.copied_text().count("\n") == 2
    assert ledger.chosen_rows() == (1, 2, 17), "they stay chosen"


def test_a_double_click_goes_to_the_row(ledger):
    QTest.mouseDClick(ledger.rows.viewport(), LEFT, Qt.KeyboardModifier.NoModifier, at(ledger, 3))
    assert ("activated", 3) in ledger.told


def test_choosing_from_outside_brings_the_row_into_view_and_echoes_nothing(ledger):
    ledger.choose_rows((18, 17))
    assert ledger.told == [] and ledger.chosen_rows() == (17, 18)
    assert 17 in [row for row, _, _ in ledger.rows_in_view()]
    assert ledger.current_cell()[0] == 17
    where = ledger.rows_in_view()
    ledger.choose_rows((0,), scroll=False)
    assert ledger.rows_in_view() == where and ledger.chosen_rows() == (0,)
    ledger.choose_rows(())
    assert ledger.told == [] and ledger.chosen_rows() == ()


def test_rows_that_are_not_there_are_passed_over(ledger):
    ledger.choose_rows((-1, 3, 900))
    assert ledger.chosen_rows() == (3,)


def test_walking_from_outside_is_the_persons_doing(ledger):
    ledger.choose_rows((4,))
    ledger.walk(1)
    ledger.walk(2)
    assert [what for what in ledger.told if what[0] == "rows_chosen"] == [("rows_chosen", (5,)), ("rows_chosen", (7,))]
    ledger.walk(-100)
    assert chosen(ledger) == (0,)


def test_hovering_is_told_once_a_row_and_shown_from_outside_without_echo(ledger):
    viewport = ledger.rows.viewport()
    _move(viewport, at(ledger, 3))
    _move(viewport, at(ledger, 3, "ratio"))
    _move(ledger.rows.numbers.viewport(), QPoint(20, 4 * 24 + 12))
    QApplication.sendEvent(viewport, QEvent(QEvent.Type.Leave))
    assert ledger.told == [("row_hovered", 3), ("row_hovered", 4), ("row_hovered", -1)]
    ledger.set_hovered(7)
    assert len(ledger.told) == 3


def test_many_scattered_rows_stay_chosen_through_sorting(qtbot):
    ledger = Ledger(Look())
    qtbot.addWidget(ledger)
    table = large_table(30_000)
    ledger.set_table(table)
    rows = tuple(range(0, 30_000, 2))
    ledger.choose_rows(rows)
    ledger.sort_by("value_1")
    assert ledger.chosen_rows() == rows
    values = np.array([float(line.split("\t")[3]) for line in ledger.copied_text().splitlines()[1:]])
    assert values.size == 15_000


def test_screen_readers_are_told_what_is_chosen(ledger):
    ledger.choose_rows((2, 3, 9))
    model = ledger.rows.selectionModel()
    assert sorted(index.row() for index in model.selectedRows()) == [2, 3, 9]
    ledger.sort_by("top", descending=True)
    assert sorted(index.row() for index in model.selectedRows()) == [10, 16, 17]


def test_a_click_below_the_last_row_chooses_nothing(qtbot):
    ledger = Ledger(Look())
    qtbot.addWidget(ledger)
    ledger.set_table(visit_table())
    ledger.resize(600, 400)
    ledger.show()
    ledger.choose_rows((2,))
    with qtbot.waitSignal(ledger.rows_chosen) as told:
        QTest.mouseClick(ledger.rows.viewport(), LEFT, Qt.KeyboardModifier.NoModifier, QPoint(50, 300))
    assert told.args == [()]


def test_the_right_button_changes_nothing_and_opens_the_menu_of_its_column(ledger):
    ledger.choose_rows((2,))
    place = at(ledger, 5, "log")
    QTest.mousePress(ledger.rows.viewport(), Qt.MouseButton.RightButton, Qt.KeyboardModifier.NoModifier, place)
    where = ledger.rows.viewport().mapToGlobal(place)
    QApplication.sendEvent(
        ledger.rows.viewport(), QContextMenuEvent(QContextMenuEvent.Reason.Mouse, place, where)
    )
    menu = QApplication.activePopupWidget()
    assert ledger.chosen_rows() == (2,) and menu.actions()[0].text() == "Sort by log"
    menu.close()
