"""The find field: anything by a few letters, done by Return, the keyboard back where it was."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QLineEdit, QWidget

from plumbwell.desk.frame.find import NOTHING, FindEntry, FindField, found, sought
from shown_texts import SCALES, cut_short, look_of, shown_words

NAMES = (
    ("Undo", "Edit menu, Ctrl+Z"),
    ("Redo", "Edit menu, Ctrl+Shift+Z"),
    ("Reference density", "recipe"),
    ("Density", "stage, Ctrl+5"),
    ("Interval density table", "File menu"),
    *((f"Station TB-{number:02d}", f"{number * 25}.0 m MD") for number in range(1, 55)),
)


class Scene:
    """A window with a field of its own and the find field; what was run."""

    def __init__(self, look, qtbot, names=NAMES):
        self.done = []
        self.asked = 0
        self.names = names
        self.window = QWidget()
        qtbot.addWidget(self.window)
        self.other = QLineEdit(self.window)
        self.other.move(10, 200)
        self.find = FindField(look, self.window)
        self.find.setGeometry(680, 4, look.theme.px(196), look.theme.px(26))
        self.find.set_actions(self.entries)
        self.window.resize(900, 420)
        with qtbot.waitActive(self.window):
            self.window.show()
            self.window.activateWindow()
        self.other.setFocus()

    def entries(self):
        self.asked += 1
        return [FindEntry(words, detail, lambda words=words: self.done.append(words)) for words, detail in self.names]

    def type(self, text):
        QTest.keyClicks(self.find.edit, text)

    def key(self, key):
        QTest.keyClick(self.find.edit, key)

    @property
    def words(self):
        return [entry.words for entry in self.find.shown]


@pytest.fixture
def scene(look, qtbot):
    return Scene(look, qtbot)


def best(query):
    return [entry.words for entry in found(query, sought([FindEntry(words, detail, print) for words, detail in NAMES]))]


def test_whole_words_come_before_beginnings_and_scattered_letters():
    assert best("density")[:3] == ["Density", "Reference density", "Interval density table"]
    assert best("den")[0] == "Density"
    assert best("redo") == ["Redo"]


def test_names_are_found_shortened():
    assert best("tb21") == ["Station TB-21"]
    assert best("rd") == ["Reference density"]
    assert best("idt") == ["Interval density table"]


def test_where_nothing_else_fits_letters_need_only_their_order():
    assert best("rfrnc") == ["Reference density"]
    assert best("dnsty")[0] == "Density"
    assert best("zzz") == [] and best("ytisned") == []


def test_several_words_must_all_fit_in_any_order():
    assert best("density ref") == ["Reference density"]
    assert best("station 1350") == ["Station TB-54"]
    assert best("menu undo") == ["Undo"]


def test_the_place_and_the_shortcut_are_searched_too():
    assert best("1350.0")[0] == "Station TB-54" and best("ctrl+5")[0] == "Density"


def test_typing_lists_what_fits_and_return_does_the_first(scene):
    scene.find.open()
    scene.type("den")
    assert scene.find.is_open and scene.words[0] == "Density"
    scene.key(Qt.Key.Key_Return)
    assert scene.done == ["Density"] and not scene.find.is_open
    assert scene.other.hasFocus() and scene.find.edit.text() == ""


def test_the_arrows_choose_among_what_was_found(scene):
    scene.find.open()
    scene.type("density")
    scene.key(Qt.Key.Key_Down)
    assert scene.find.edit.accessibleDescription() == "Reference density, recipe"
    scene.key(Qt.Key.Key_Down)
    scene.key(Qt.Key.Key_Up)
    scene.key(Qt.Key.Key_Return)
    assert scene.done == ["Reference density"]


def test_the_last_is_one_arrow_up_from_the_first(scene):
    scene.find.open()
    scene.type("do")
    scene.key(Qt.Key.Key_Up)
    last = scene.words[-1]
    scene.key(Qt.Key.Key_Return)
    assert scene.done == [last]


def test_opening_lists_everything_and_escape_leaves(scene):
    scene.find.open()
    assert scene.words[:2] == ["Undo", "Redo"] and len(scene.words) == len(NAMES)
    scene.key(Qt.Key.Key_Escape)
    assert not scene.find.is_open and scene.other.hasFocus() and scene.done == []


def test_the_entries_are_asked_for_when_it_opens_and_not_for_each_letter(scene):
    scene.find.open()
    scene.type("den")
    assert scene.asked == 1
    scene.key(Qt.Key.Key_Escape)
    scene.find.open()
    assert scene.asked == 2


def test_a_click_does_an_entry(scene):
    scene.find.open()
    scene.type("redo")
    box = scene.find.list.visualRect(scene.find.list.entries.index(0))
    QTest.mouseClick(scene.find.list.viewport(), Qt.MouseButton.LeftButton, pos=box.center())
    assert scene.done == ["Redo"] and not scene.find.is_open


def test_nothing_found_is_said_and_return_does_nothing(scene):
    scene.find.open()
    scene.type("xylophone")
    assert NOTHING in shown_words(scene.window)
    scene.key(Qt.Key.Key_Return)
    assert scene.done == []


def test_leaving_the_field_closes_the_list(scene):
    scene.find.open()
    scene.type("den")
    scene.other.setFocus()
    assert not scene.find.is_open


def test_the_list_stands_under_the_field_inside_the_window(scene):
    scene.find.open()
    box, field = scene.find.list.geometry(), scene.find.geometry()
    assert box.right() == field.right() and box.top() > field.bottom()
    assert scene.window.rect().contains(box)


def test_an_act_may_open_the_field_again(scene):
    scene.find.set_actions(lambda: [FindEntry("Find", "", scene.find.open)])
    scene.find.open()
    scene.key(Qt.Key.Key_Return)
    assert scene.find.is_open and scene.find.edit.hasFocus()


@pytest.mark.parametrize("scale", SCALES)
def test_names_and_details_have_room_at_every_text_scale(qtbot, scale):
    with look_of("dark", scale) as look:
        scene = Scene(look, qtbot)
        scene.find.setGeometry(880 - look.theme.px(196), 4, look.theme.px(196), look.theme.px(26))
        scene.find.open()
        assert cut_short(scene.window) == []
        assert {"Ctrl+K", "Redo", "Edit menu, Ctrl+Shift+Z"} <= set(shown_words(scene.window))
