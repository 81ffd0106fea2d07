"""The recipe form: every setting shown as written, changed by mouse and keyboard, refused where it may not stand."""

from dataclasses import replace

import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QWheelEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from plumbwell.desk.parts.words import Chooser
from plumbwell.desk.tray.recipe_editors import number_typed, value_text
from plumbwell.desk.tray.recipe_page import GROUPS, WITHOUT_EFFECT, RecipePage, spread
from plumbwell.survey.recipe import DEFAULT, KEYS, UNAVAILABLE, as_written, is_unavailable, with_written
from shown_texts import SCALES, cut_short, look_of, shown_words

STATIONS = ("P1", "P2", "P3")


class Asked(list):
    """What the page asked for, in order."""

    def __init__(self, page):
        super().__init__()
        page.key_changed.connect(lambda key, value: self.append((key, value)))


def made_page(look, qtbot, recipe=DEFAULT, folder=DEFAULT, *, width=760, height=700):
    page = RecipePage(look)
    qtbot.addWidget(page)
    page.set_names(("as surveyed", "heavier"), "as surveyed")
    page.set_recipe(recipe, folder, stations=STATIONS)
    page.resize(width, height)
    with qtbot.waitActive(page):
        page.show()
        page.activateWindow()
    return page


def editor(page, key):
    return page.form.rows[key].editor


def write(widget, text):
    """Type a text in place of what stands in a field."""
    widget.setFocus()
    QTest.keyClick(widget, Qt.Key.Key_A, Qt.KeyboardModifier.ControlModifier)
    QTest.keyClicks(widget, text)


def choose(chooser, text):
    """Choose from the list of a chooser by the keyboard."""
    chooser.setFocus()
    QTest.keyClick(chooser, Qt.Key.Key_Down)
    view = chooser.view()
    assert view.isVisible()
    view.setCurrentIndex(chooser.model().index(chooser.findText(text), 0))
    QTest.keyClick(view, Qt.Key.Key_Return)


def test_every_key_stands_in_the_form_once_but_for_those_without_effect():
    keys = [key for _, keys in GROUPS for key in keys]
    assert sorted([*keys, *WITHOUT_EFFECT]) == sorted(KEYS)


def test_values_stand_as_written_with_their_units(look, qtbot):
    recipe = with_written(DEFAULT, "reference_density", 2.35)
    page = made_page(look, qtbot, recipe, recipe)
    assert editor(page, "reference_density").chooser.currentText() == "2.35"
    assert editor(page, "pressure_admittance").field.text() == "\u22120.3"
    assert editor(page, "visit_gap").field.text() == "15"
    assert editor(page, "normal_gravity").chooser.currentText() == "WGS84"
    words = shown_words(page)
    assert {"g/cm³", "µGal/hPa", "min", "Reference density"} <= set(words)
    assert page.changed_keys == () and "Put back" not in words


def test_a_number_is_taken_by_return(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    field = editor(page, "depth_sd").field
    write(field, "0.05")
    assert asked == []
    QTest.keyClick(field, Qt.Key.Key_Return)
    assert asked == [("depth_sd", 0.05)]
    QTest.keyClick(field, Qt.Key.Key_Return)
    assert len(asked) == 1


def test_a_number_is_taken_on_leaving_the_field(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    write(editor(page, "pressure_admittance").field, "-0.35")
    editor(page, "visit_gap").field.setFocus()
    assert asked == [("pressure_admittance", -0.35)]


def test_a_field_that_was_only_visited_asks_for_nothing(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    for key in ("depth_sd", "reference_density", "tide"):
        page.show_key(key)
        QTest.keyClick(QApplication.focusWidget(), Qt.Key.Key_Tab)
    write(editor(page, "depth_sd").field, "0.030")
    QTest.keyClick(editor(page, "depth_sd").field, Qt.Key.Key_Return)
    assert asked == [] and editor(page, "depth_sd").field.text() == "0.03"


@pytest.mark.parametrize("text", ["abc", "", "-1", "101", "0,05", "nan", "inf", "1e999", "1_0"])
def test_a_wrong_number_is_refused_beside_the_field_and_stays_there(look, qtbot, text):
    page = made_page(look, qtbot)
    asked = Asked(page)
    field = editor(page, "depth_sd").field
    write(field, text)
    if not text:
        QTest.keyClick(field, Qt.Key.Key_Backspace)
    QTest.keyClick(field, Qt.Key.Key_Return)
    assert asked == [] and field.text() == text
    words = "Not taken; expected a number in m from 0 to 100."
    assert page.form.rows["depth_sd"].refusal == words
    assert " ".join(shown_words(page.form.rows["depth_sd"])[2:]) == words
    assert words in field.accessibleDescription()


def test_a_refusal_goes_when_the_value_may_stand_and_with_escape(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    field, row = editor(page, "depth_sd").field, page.form.rows["depth_sd"]
    write(field, "x")
    QTest.keyClick(field, Qt.Key.Key_Return)
    assert row.refusal
    low = row.height()
    write(field, "0.04")
    QTest.keyClick(field, Qt.Key.Key_Return)
    assert not row.refusal and asked == [("depth_sd", 0.04)]
    write(field, "y")
    QTest.keyClick(field, Qt.Key.Key_Return)
    QTest.keyClick(field, Qt.Key.Key_Escape)
    assert not row.refusal and field.text() == "0.03" and row.height() < low


def test_escape_in_a_chooser_with_numbers_gives_back_what_stood_there(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    chooser = editor(page, "reference_density").chooser
    write(chooser, "9")
    QTest.keyClick(chooser, Qt.Key.Key_Escape)
    assert chooser.currentText() == "2.67" and asked == []


def test_a_refused_entry_stays_while_the_rest_is_recomputed(look, qtbot):
    page = made_page(look, qtbot)
    field = editor(page, "depth_sd").field
    write(field, "x")
    editor(page, "visit_gap").field.setFocus()
    page.set_recipe(with_written(DEFAULT, "visit_gap", 20.0), DEFAULT, stations=STATIONS)
    assert field.text() == "x" and page.form.rows["depth_sd"].refusal
    page.set_recipe(with_written(DEFAULT, "depth_sd", 0.5), DEFAULT, stations=STATIONS)
    assert field.text() == "0.5" and not page.form.rows["depth_sd"].refusal


def test_a_word_is_chosen_from_the_list_and_asked_for_once(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    choose(editor(page, "tide").chooser, "longman")
    assert asked == [("tide", "longman")]
    choose(editor(page, "drift_order").chooser, "2")
    assert asked[1:] == [("drift_order", 2)] and isinstance(asked[1][1], int)


def test_the_wheel_changes_no_setting_in_passing(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    chooser = editor(page, "tide").chooser
    chooser.setFocus()
    middle = chooser.rect().center().toPointF()
    turned = QWheelEvent(
        middle,
        chooser.mapToGlobal(middle),
        middle.toPoint(),
        middle.toPoint() * -120,
        Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier,
        Qt.ScrollPhase.NoScrollPhase,
        False,
    )
    QApplication.sendEvent(chooser, turned)
    assert chooser.currentText() == "ephemeris" and asked == []


def test_a_key_of_words_and_numbers_takes_both(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    chooser = editor(page, "reference_density").chooser
    choose(chooser, "markers")
    write(chooser, "2.4")
    QTest.keyClick(chooser, Qt.Key.Key_Return)
    write(chooser, "granite")
    QTest.keyClick(chooser, Qt.Key.Key_Return)
    assert asked == [("reference_density", "markers"), ("reference_density", 2.4)]
    assert chooser.currentText() == "granite"
    assert 'expected "markers", "log" or a number in g/cm³' in page.form.rows["reference_density"].refusal


def test_what_this_version_cannot_do_is_not_offered(look, qtbot):
    page = made_page(look, qtbot)
    for key in UNAVAILABLE:
        chooser = editor(page, key).chooser
        offered = [chooser.itemText(index) for index in range(chooser.count())]
        assert offered == [word for word in KEYS[key].words if not is_unavailable(key, word)]
        assert not chooser.isEditable()


def test_a_value_that_cannot_be_done_is_shown_and_can_be_left(look, qtbot):
    recipe = replace(DEFAULT, layers="smooth")
    page = made_page(look, qtbot, recipe, recipe)
    asked = Asked(page)
    chooser = editor(page, "layers").chooser
    assert "smooth" in shown_words(chooser)
    choose(chooser, "plain")
    assert asked == [("layers", "plain")]


def test_a_measured_gradient_is_asked_for_when_it_is_whole(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    one = editor(page, "free_air")
    low = page.form.rows["free_air"].height()
    choose(one.chooser, "measured")
    assert one.line.gradient.hasFocus() and page.form.rows["free_air"].height() > low
    write(one.line.gradient, "0.3072")
    QTest.keyClick(one.line.gradient, Qt.Key.Key_Return)
    QTest.keyClick(one.line.gradient, Qt.Key.Key_Tab)
    assert one.line.sd.hasFocus() and asked == [] and not page.form.rows["free_air"].refusal
    write(one.line.sd, "0.0004")
    QTest.keyClick(one.line.sd, Qt.Key.Key_Return)
    assert asked == [("free_air", {"gradient": 0.3072, "sd": 0.0004})]
    measured = with_written(DEFAULT, *asked[0])
    page.set_recipe(measured, DEFAULT, stations=STATIONS)
    assert "normal in the folder" in shown_words(page.form.rows["free_air"])
    choose(one.chooser, "normal")
    assert asked[1:] == [("free_air", "normal")]


def test_a_gradient_left_half_written_is_refused(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    one = editor(page, "free_air")
    choose(one.chooser, "measured")
    write(one.line.gradient, "0.3072")
    page.chooser.setFocus()
    assert asked == [] and '"normal" or {' in page.form.rows["free_air"].refusal
    one.line.sd.setFocus()
    QTest.keyClick(one.line.sd, Qt.Key.Key_Escape)
    assert one.chooser.currentText() == "normal" and not page.form.rows["free_air"].refusal


def test_the_datum_is_one_of_the_stations_or_the_highest(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    chooser = editor(page, "datum_station").chooser
    assert [chooser.itemText(index) for index in range(chooser.count())] == ["highest", *STATIONS]
    choose(chooser, "P3")
    page.set_recipe(replace(DEFAULT, datum_station="P3"), DEFAULT, stations=STATIONS)
    choose(chooser, "highest")
    assert asked == [("datum_station", "P3"), ("datum_station", None)]


def test_a_changed_setting_is_marked_and_can_be_put_back(look, qtbot):
    recipe = with_written(with_written(DEFAULT, "reference_density", 2.75), "drift_order", 1)
    page = made_page(look, qtbot, recipe)
    asked = Asked(page)
    assert page.changed_keys == ("reference_density", "drift_order")
    row = page.form.rows["reference_density"]
    assert {"2.67 in the folder", "Put back"} <= set(shown_words(row))
    assert "2.67 g/cm³ in the folder" in row.accessibleDescription()
    ink = row.grab().toImage().pixelColor(5, 12)
    assert ink == look.theme.colour("ink")
    QTest.mouseClick(row.put_back, Qt.MouseButton.LeftButton)
    assert asked == [("reference_density", 2.67)]
    page.set_recipe(with_written(DEFAULT, "drift_order", 1), DEFAULT, stations=STATIONS)
    assert not row.put_back.isVisible() and page.changed_keys == ("drift_order",)


def test_a_new_recipe_is_shown_without_echo_and_leaves_the_keyboard(look, qtbot):
    page = made_page(look, qtbot)
    asked = Asked(page)
    field = editor(page, "depth_sd").field
    write(field, "0.0")
    recipe = DEFAULT
    for key, value in (("tide", "none"), ("depth_sd", 0.7), ("reference_density", "log"), ("datum_sd", 3.0)):
        recipe = with_written(recipe, key, value)
    page.set_recipe(recipe, DEFAULT, stations=STATIONS)
    assert asked == [] and field.hasFocus() and field.text() == "0.0"
    assert editor(page, "tide").chooser.currentText() == "none"
    assert {key: page.value_of(key) for key in page.form.rows} == {
        key: value for key, value in as_written(recipe).items() if key in page.form.rows
    }


def test_the_window_can_refuse_what_the_survey_has_not(look, qtbot):
    page = made_page(look, qtbot)
    choose(editor(page, "reference_density").chooser, "markers")
    page.refuse("reference_density", "The survey names no markers.")
    assert "The survey names no markers." in shown_words(page.form.rows["reference_density"])
    assert editor(page, "reference_density").chooser.currentText() == "markers"


def test_what_a_setting_does_is_told_where_the_keyboard_is(look, qtbot):
    page = made_page(look, qtbot)
    page.show_key("visit_gap")
    assert editor(page, "visit_gap").field.hasFocus()
    assert page.what.words == "A longer pause ends a visit. Default 15 min. Source: common practice."
    assert page.form.rows["visit_gap"].toolTip() == page.what.words
    page.show_key("no such key")


def test_a_setting_out_of_sight_is_brought_into_view(look, qtbot):
    page = made_page(look, qtbot, height=200)
    page.show_key("layer_boundaries")
    row = page.form.rows["layer_boundaries"]
    assert page.form.viewport().rect().contains(row.mapTo(page.form.viewport(), row.rect().center()))


def test_another_recipe_is_chosen_and_a_new_one_named(look, qtbot):
    page = made_page(look, qtbot)
    chosen, added = [], []
    page.recipe_chosen.connect(chosen.append)
    page.recipe_added.connect(added.append)
    choose(page.chooser, "heavier")
    assert chosen == ["heavier"]
    QTest.mouseClick(page.add, Qt.MouseButton.LeftButton)
    assert page.name.hasFocus() and not page.add.isVisible()
    QTest.keyClicks(page.name, "heavier")
    QTest.keyClick(page.name, Qt.Key.Key_Return)
    assert added == [] and "Not taken; there is one of this name." in shown_words(page)
    QTest.keyClicks(page.name, " rock ")
    QTest.keyClick(page.name, Qt.Key.Key_Return)
    assert added == ["heavier rock"] and not page.name.isVisible() and page.add.isVisible()
    QTest.mouseClick(page.add, Qt.MouseButton.LeftButton)
    QTest.keyClick(page.name, Qt.Key.Key_Escape)
    assert not page.name.isVisible() and len(added) == 1


def test_groups_are_spread_so_that_the_highest_column_is_low():
    assert spread([5, 5, 5, 5], 2) == [0, 0, 1, 1]
    assert spread([9, 1, 1, 1], 2) == [0, 1, 1, 1]
    assert spread([3, 3], 4) == [0, 1]
    assert spread([1, 2, 3], 1) == [0, 0, 0]


def test_there_are_as_many_columns_as_there_is_room_for(look, qtbot):
    page = made_page(look, qtbot)
    for width, columns in ((360, 1), (760, 2), (1300, 3)):
        page.resize(width, 700)
        assert len({row.x() for row in page.form.rows.values()}) == columns


@pytest.mark.parametrize("text", ["1.5", "\u22120.5", "+2", ".5", "5.", "1e-3", " 7 "])
def test_numbers_as_people_type_them(text):
    assert number_typed(text) == float(text.replace("\u2212", "-"))


def test_a_value_reads_back_as_it_is_shown():
    for key, value in as_written(DEFAULT).items():
        if isinstance(value, float):
            assert number_typed(value_text(value)) == value, key


@pytest.mark.parametrize("scale", SCALES)
@pytest.mark.parametrize("width", [750, 960])
def test_all_words_of_the_form_have_room_at_every_text_scale(qtbot, scale, width):
    measured = with_written(DEFAULT, "free_air", {"gradient": 0.3072, "sd": 0.0004})
    measured = with_written(measured, "reference_density", 2.755)
    with look_of("dark", scale) as look:
        page = made_page(look, qtbot, measured, width=width)
        for key in page.form.rows:
            page.form.rows[key].refuse("Not taken; expected a number.")
        for chooser in page.findChildren(Chooser):
            assert chooser.height() >= look.theme.px(20)
        assert cut_short(page.form) == []
