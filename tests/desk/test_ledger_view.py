"""What a ledger shows: places of heads and rows, room for every number, states, and the look of its parts."""

from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QEvent, QPoint, Qt
from PySide6.QtGui import QAccessible, QColor, QHelpEvent
from PySide6.QtWidgets import QApplication, QToolTip

from made_ledger import interval_table, large_table, visit_table
from plumbwell.desk.ledger.ledger import Ledger
from plumbwell.desk.ledger.ledger_model import SPOKEN
from plumbwell.desk.ledger.table import LedgerColumn
from plumbwell.desk.look import Look
from plumbwell.plates.axis import head_height
from plumbwell.plates.lettering import ELLIPSIS, text_placed
from plumbwell.plates.numbers import MINUS, NO_VALUE


@pytest.fixture
def look(qapp):
    """A look of the light theme that leaves the application as it was."""
    return Look()


@pytest.fixture
def shown(qtbot, look):
    """Shows a table in a ledger as wide as it wants to be."""

    def show(table, *, height=560, width=None, **how):
        if how:
            look.theme = replace(look.theme, **how)
        ledger = Ledger(look)
        qtbot.addWidget(ledger)
        ledger.set_table(table)
        ledger.resize(width or ledger.natural_width(), height)
        ledger.show()
        QApplication.processEvents()
        return ledger

    return show


def painted(ledger):
    """Every text of a ledger as it is painted."""
    with text_placed() as placed:
        ledger.grab()
    return placed


def words(ledger):
    """The words of a ledger as they are drawn."""
    return [one.drawn for one in painted(ledger)]


def colour_at(ledger, x, y):
    """Name of the colour of a pixel."""
    return QColor(ledger.grab().toImage().pixel(x, y)).name()


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.25, 1.6])
@pytest.mark.parametrize("table", [interval_table, visit_table, lambda: large_table(500)])
def test_no_word_is_shortened_and_none_runs_out_of_its_room_at_natural_widths(shown, scale, table):
    ledger = shown(table(), text_scale=scale, height=900)
    ledger.choose_rows([1, 2])
    for key in [choice.key for choice in ledger.column_choices() if choice.shown]:
        ledger.go_to_cell(2, key)
        for one in painted(ledger):
            assert one.drawn == one.words, one
            if one.allowed is not None:
                assert one.allowed[0] - 0.01 <= one.needed.left() and one.needed.right() <= one.allowed[1] + 0.01, one


def test_numbers_of_a_column_end_at_one_edge_eight_px_before_the_next(shown):
    ledger = shown(visit_table())
    rights = {round(one.needed.right()) for one in painted(ledger) if one.words in ("874.0", "902.0", "0.0")}
    column = [choice.key for choice in ledger.column_choices() if choice.shown].index("depth")
    edge = ledger.rows.columnViewportPosition(column) + ledger.rows.columnWidth(column)
    assert rights == {edge - 8}


def test_a_number_too_wide_for_a_narrowed_column_becomes_an_ellipsis_and_never_another_number(shown):
    ledger = shown(interval_table())
    ledger.rows.head.resizeSection(3, 60)
    ledger.rows.head.resizeSection(4, 40)
    drawn = words(ledger)
    assert ELLIPSIS in drawn
    assert not [one for one in drawn if one.endswith(ELLIPSIS) and one[0].isdigit()]
    assert "2.216" not in drawn and "2.295" not in drawn and "626.0" in drawn


@pytest.mark.parametrize("cut", range(5, 60, 9))
def test_a_number_that_the_edge_of_the_view_would_cut_is_not_shown_in_part(shown, cut):
    ledger = shown(interval_table(), width=shown(interval_table()).natural_width() - cut)
    width = ledger.rows.viewport().width()
    drawn = words(ledger)
    assert not [one for one in painted(ledger) if one.needed.right() > width]
    assert ("+12.9" in drawn) == (cut <= 8) and "2.216" in drawn
    assert (ELLIPSIS in drawn) == (8 < cut < 40)
    ledger.rows.horizontalScrollBar().setValue(cut)
    assert not [one for one in painted(ledger) if one.needed.left() < 0]
    assert "+12.9" in words(ledger)


@pytest.mark.parametrize("scale", [1.0, 1.6])
def test_rows_begin_right_under_a_head_as_tall_as_that_of_the_tracks(shown, scale):
    ledger = shown(interval_table(), text_scale=scale)
    height = ledger._look.theme.px(24)
    assert ledger.body_top() == head_height(ledger._look.theme)
    assert ledger.rows_in_view()[:2] == [(0, 0, height), (1, height, 2 * height)]
    ink = ledger._look.theme.colour("ink").name()
    line = head_height(ledger._look.theme) - 1
    assert all(colour_at(ledger, x, line) == ink for x in (0, 20, ledger.width() // 2, ledger.width() - 1))
    hair = ledger._look.theme.colour("hair").name()
    assert colour_at(ledger, ledger.width() - 1, line + height) == hair


def test_head_tells_name_and_unit_and_the_day_of_times(shown):
    drawn = words(shown(visit_table()))
    for told in ("No", "visit", "time", "15 Oct 2025, UTC", "less tide", "µGal"):
        assert told in drawn


def test_chosen_row_is_tinted_with_a_bar_and_a_strong_number(shown):
    ledger = shown(interval_table())
    ledger.choose_rows([4])
    strong = [one.needed.width() for one in painted(ledger) if one.words in ("28", "25")]
    assert strong[0] != strong[1], "the number of a chosen row is Semibold"
    theme, middle = ledger._look.theme, 52 + 4 * 24 + 3
    assert colour_at(ledger, 1, middle) == theme.colour("accent").name()
    assert colour_at(ledger, 5, middle) == theme.colour("tint").name()
    assert colour_at(ledger, ledger.width() - 3, middle) == theme.colour("tint").name()
    assert colour_at(ledger, 1, middle + 24) == theme.colour("ground").name()


def test_hovered_row_is_sunk_unless_it_is_chosen(shown):
    ledger = shown(interval_table())
    ledger.set_hovered(9)
    theme, middle = ledger._look.theme, 52 + 9 * 24 + 3
    assert colour_at(ledger, 5, middle) == theme.colour("sunk").name()
    ledger.choose_rows([9], scroll=False)
    assert colour_at(ledger, 5, middle) == theme.colour("tint").name()


def test_excluded_cells_are_struck_through_and_gaps_are_not(shown):
    ledger = shown(visit_table())
    theme = ledger._look.theme
    image = ledger.grab().toImage()
    muted = theme.colour("muted").name()

    def longest_line(key):
        column = [choice.key for choice in ledger.column_choices() if choice.shown].index(key)
        left = ledger.rows.numbers.column_width + ledger.rows.columnViewportPosition(column) + 8
        right = left + ledger.rows.columnWidth(column) - 16
        rows = range(52 + 4 * 24, 52 + 5 * 24 - 1)
        return any(all(QColor(image.pixel(x, y)).name() == muted for x in range(left, right)) for y in rows)

    assert longest_line("time") and longest_line("depth") and longest_line("readings")
    assert not longest_line("less_tide") and not longest_line("ratio") and not longest_line("kind")


def colours_in(ledger, key, row):
    """Colours in a cell."""
    column = [choice.key for choice in ledger.column_choices() if choice.shown].index(key)
    image = ledger.grab().toImage()
    left = ledger.rows.numbers.column_width + ledger.rows.columnViewportPosition(column)
    top = ledger.body_top() + ledger.rows_in_view()[row][1]
    return {
        QColor(image.pixel(x, y)).name()
        for x in range(left, left + ledger.rows.columnWidth(column))
        for y in range(top, top + 23)
    }


def test_large_ratios_stand_in_amber_and_stale_numbers_are_muted(shown):
    ledger = shown(interval_table())
    amber, ink = (ledger._look.theme.colour(role).name() for role in ("amber", "ink"))
    assert amber in colours_in(ledger, "ratio", 3) and amber not in colours_in(ledger, "ratio", 0)
    assert ink in colours_in(ledger, "density", 0)
    ledger.set_stale(True)
    assert amber not in colours_in(ledger, "ratio", 3) and ink not in colours_in(ledger, "density", 0)
    ledger.set_stale(False)
    assert ink in colours_in(ledger, "density", 0)


def test_another_theme_and_text_size_are_taken_at_once(shown, look, qapp):
    ledger = shown(interval_table())
    before = ledger.natural_width()
    font, palette = qapp.font(), qapp.palette()
    try:
        look.choose(wanted="dark", text_scale=1.4)
        assert colour_at(ledger, 100, ledger.body_top() + 3) == look.theme.colour("ground").name()
        assert ledger.natural_width() > 1.3 * before
        assert ledger.body_top() == head_height(look.theme)
    finally:
        qapp.setStyleSheet("")
        qapp.setPalette(palette)
        qapp.setFont(font)


def test_an_empty_ledger_says_what_to_do_next(shown):
    table = interval_table()
    none = {
        name: getattr(table, name)[:0]
        for name in ("numbers", "marks", "hints", "excluded", "top", "base", "density")
    }
    columns = tuple(LedgerColumn(key=one.key, name=one.name, values=np.empty(0)) for one in table.columns[:4])
    ledger = shown(interval_table(columns=columns, **none))
    ledger.set_empty("Two stations make the first interval.")
    assert "Two stations make the first interval." in " ".join(words(ledger))
    assert ledger.rows_in_view() == [] and ledger.visible_depths() is None and not ledger.in_depth_order()


def test_hovering_over_a_mark_tells_its_hint(shown):
    ledger = shown(visit_table())
    at = QPoint(12, 4 * 24 + 12)
    numbers = ledger.rows.numbers.viewport()
    QApplication.sendEvent(numbers, QHelpEvent(QEvent.Type.ToolTip, at, numbers.mapToGlobal(at)))
    assert QToolTip.text() == "Pump started, needle restless."
    QToolTip.hideText()


def test_a_shortened_text_is_told_in_full(shown):
    long = "needle restless while the pump was running, twice read again and then left for the next day"
    table = visit_table()
    notes = LedgerColumn(key="note", name="note", kind="text", italic=True, values=(long,) + ("",) * 6)
    ledger = shown(visit_table(columns=(*table.columns, notes)))
    assert any(one.words == long and one.drawn.endswith(ELLIPSIS) for one in painted(ledger))
    left = ledger.rows.columnViewportPosition(7)
    assert ledger.rows.shortened_text(QPoint(left + 20, 12)) == long
    assert ledger.rows.shortened_text(QPoint(left + 20, 36)) == ""


def test_screen_readers_find_a_table_with_names_values_and_units(shown):
    ledger = shown(interval_table())
    face = QAccessible.queryAccessibleInterface(ledger.rows)
    assert face.role() == QAccessible.Role.Table
    assert face.text(QAccessible.Text.Name) == "Ledger of intervals"
    assert ledger.rows.model().index(4, 3).data(SPOKEN) == "density 2.216 ±\u00a00.012 g/cm³"
    head = ledger.rows.model().headerData(2, Qt.Orientation.Vertical, SPOKEN)
    assert head == "interval 26, wants a look, lighter than the log"


def test_only_cells_in_view_are_put_into_words(shown, monkeypatch):
    ledger = shown(large_table(20_000))
    asked = set()
    column = ledger.rows.ledger.columns[1]
    plain_value = column.value
    monkeypatch.setattr(column, "value", lambda row: asked.add(row) or plain_value(row))
    ledger.rows.verticalScrollBar().setValue(12_000 * 24)
    ledger.grab()
    in_view = {row for row, _, _ in ledger.rows_in_view()}
    assert in_view == asked and min(in_view) == 12_000


def test_minus_and_dash_are_the_true_ones(shown):
    drawn = words(shown(visit_table()))
    assert f"{MINUS}4.6" in drawn and NO_VALUE in drawn and "-4.6" not in drawn
