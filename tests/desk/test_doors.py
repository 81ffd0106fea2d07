"""Nothing open: the ways to begin and the surveys opened before, by mouse, keys and shortcuts."""

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QColor, QPixmap
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QAbstractButton, QApplication, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.opening.doors import Doors
from plumbwell.desk.opening.samples import SAMPLES
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.theme import theme_named

WELL, MINE = SAMPLES
LEFT = Qt.MouseButton.LeftButton


@pytest.fixture
def look(qapp):
    look = Look()
    look.theme = theme_named("light")
    return look


@pytest.fixture
def doors(qtbot, look):
    doors = Doors(look)
    qtbot.addWidget(doors)
    doors.resize(1200, 760)
    doors.show()
    doors.activateWindow()
    qtbot.waitUntil(doors.isActiveWindow)
    doors.setFocus()
    return doors


@pytest.fixture
def folders(tmp_path):
    kept = tmp_path / "one" / "tolmire"
    kept.mkdir(parents=True)
    return [str(kept), str(tmp_path / "gone" / "quernlow")]


def button(doors, name):
    return next(
        one
        for one in doors.findChildren(QAbstractButton)
        if name in (one.text(), one.accessibleName().split(",")[0])
    )


def told(signal):
    heard = []
    signal.connect(heard.append)
    return heard


def shown(doors):
    """Texts as painted, with their boxes in px of the page."""
    found = []
    page = doors.widget()
    for part in (page, *page.findChildren(QAbstractButton)):
        picture = QPixmap(part.size())
        with text_placed() as placed:
            part.render(picture, renderFlags=QWidget.RenderFlag.DrawWindowBackground)
        corner = QPoint(0, 0) if part is page else part.pos()
        found += [(text, text.needed.translated(corner)) for text in placed]
    return found


def test_the_ways_to_begin_are_listed_with_what_they_do(doors):
    words = [text.words for text, _ in shown(doors)]
    for expected in (
        "Begin with one of these",
        "Open a sample survey",
        "Alt+1",
        "Two invented surveys with the truth they were made from: a well and a mine shaft.",
        "Start a survey folder",
        "Alt+2",
        "A small commented folder with invented readings to put your own in.",
        "Open a survey folder",
        "Ctrl+O",
        "Or drop it anywhere on this window.",
        "Recent",
        "Nothing yet. What you open is listed here.",
        *SAMPLES.values(),
    ):
        assert expected in words, expected


def test_a_click_goes_through_a_door(doors):
    heard = told(doors.door_chosen)
    for name in ("Open a sample survey", "Start a survey folder", "Open a survey folder", SAMPLES[MINE]):
        QTest.mouseClick(button(doors, name), LEFT)
    assert heard == [WELL, "new", "open", MINE]


def test_shortcuts_go_through_doors_only_while_they_are_seen(doors):
    heard = told(doors.door_chosen)
    QTest.keyClick(doors, Qt.Key.Key_1, Qt.KeyboardModifier.AltModifier)
    QTest.keyClick(doors, Qt.Key.Key_2, Qt.KeyboardModifier.AltModifier)
    assert heard == [WELL, "new"]
    doors.hide()
    QTest.keyClick(doors, Qt.Key.Key_1, Qt.KeyboardModifier.AltModifier)
    assert heard == [WELL, "new"]


def test_arrows_walk_from_door_to_door_and_return_goes_through(doors, folders):
    doors.set_recent(folders)
    heard, recent = told(doors.door_chosen), told(doors.recent_chosen)

    def walk(*keys):
        for key in keys:
            QTest.keyClick(QApplication.focusWidget(), key)

    key = Qt.Key
    assert QApplication.focusWidget() is button(doors, "Open a sample survey")
    walk(key.Key_Up, key.Key_Return)
    walk(key.Key_Down, key.Key_Right, key.Key_Return)
    walk(key.Key_Down, key.Key_Return)
    walk(key.Key_Down, key.Key_Down, key.Key_Return)
    assert heard == [WELL, MINE, "new", "open"]
    walk(key.Key_Right, key.Key_Down, key.Key_Return)
    assert recent == [folders[0]], "the one that is gone is passed over"
    walk(key.Key_Left)
    assert QApplication.focusWidget() is button(doors, "Open a sample survey")


def test_the_door_with_the_keyboard_is_framed(doors, look):
    row = button(doors, "Start a survey folder")
    accent, corner = QColor(look.theme.roles["accent"]), row.pos() + QPoint(200, 3)
    assert doors.widget().grab().toImage().pixelColor(corner) != accent
    QTest.keyClick(QApplication.focusWidget(), Qt.Key.Key_Tab)
    row.setFocus()
    assert doors.widget().grab().toImage().pixelColor(corner) == accent


def test_recent_surveys_open_and_those_that_are_gone_say_so(doors, folders):
    doors.set_recent(folders)
    heard = told(doors.recent_chosen)
    words = [text.words for text, _ in shown(doors)]
    assert {"tolmire", "quernlow", "not there any more"} <= set(words)
    assert "Nothing yet. What you open is listed here." not in words
    for name in ("tolmire", "quernlow"):
        QTest.mouseClick(button(doors, name), LEFT)
    assert heard == [folders[0]]
    gone = button(doors, "quernlow")
    assert not gone.isEnabled() and gone.accessibleName() == "quernlow, not there any more"
    assert gone.toolTip().splitlines() == [folders[1], "not there any more"]
    doors.set_recent([])
    assert "Nothing yet. What you open is listed here." in [text.words for text, _ in shown(doors)]


def test_a_long_place_is_shortened_in_its_middle(doors, tmp_path):
    deep = tmp_path.joinpath(*[f"a folder inside of the last one {n}" for n in range(9)])
    deep.mkdir(parents=True)
    doors.set_recent([str(deep)])
    place = next(text.words for text, _ in shown(doors) if "\u2026" in text.words)
    assert place.startswith(str(tmp_path)[:8]) and place.endswith("last one 7")


@pytest.mark.parametrize("size", [(1200, 760), (960, 580), (700, 400)])
@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
def test_every_text_has_its_room(doors, look, folders, size, scale):
    look.theme = theme_named("light", scale)
    look.changed.emit()
    doors.set_recent(folders)
    doors.resize(*size)
    texts = shown(doors)
    page = doors.widget().rect()
    for text, box in texts:
        assert page.left() <= box.left() and box.right() <= page.right() and box.bottom() <= page.bottom()
        assert text.drawn == text.words or text.words in ("tolmire", "quernlow"), text.words
    boxes = [box for _, box in texts]
    assert not any(one.intersects(two) for n, one in enumerate(boxes) for two in boxes[n + 1 :])


def test_a_short_window_scrolls_to_the_door_with_the_keyboard(doors, look):
    look.theme = theme_named("light", 1.6)
    look.changed.emit()
    doors.resize(800, 300)
    last = button(doors, "Open a survey folder")
    assert last.visibleRegion().isEmpty()
    for _ in range(3):
        QTest.keyClick(QApplication.focusWidget(), Qt.Key.Key_Down)
    assert QApplication.focusWidget() is last
    assert not last.visibleRegion().isEmpty()
