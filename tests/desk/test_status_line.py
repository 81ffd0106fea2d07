"""The status line: what it tells, its switches, long work, and how it makes do with little room."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QColor
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QAbstractButton

from plumbwell.desk.frame.status_line import StatusLine
from plumbwell.desk.look import Look
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.theme import theme_named

PAIRS = [
    ("", "712.4 m MD"),
    ("", "711.5 m TVD"),
    ("density", "2.498 \u00b1 0.007 g/cm\u00b3"),
    ("", "Marrow Shale"),
]


@pytest.fixture
def look(qapp):
    look = Look()
    look.theme = theme_named("light")
    return look


@pytest.fixture
def line(qtbot, look):
    line = StatusLine(look)
    qtbot.addWidget(line)
    line.resize(1440, line.height())
    line.set_left(PAIRS)
    line.set_right("2 sd", "m", "MD", "10:42")
    line.show()
    return line


def shown(line):
    with text_placed() as placed:
        image = line.grab().toImage()
    return image, {text.drawn: text for text in placed}


def word(line, words):
    return next(one for one in line.findChildren(QAbstractButton) if one.text() == words and one.isVisible())


def told(signal):
    heard = []
    signal.connect(lambda: heard.append(True))
    return heard


def test_it_tells_where_the_pointer_is_and_what_the_plots_show(line):
    _, texts = shown(line)
    lefts = [texts[words].needed.left() for words in ("712.4 m MD", "711.5 m TVD", "density", PAIRS[2][1])]
    assert lefts == sorted(lefts) and lefts[0] == 16
    assert {"bars and bands 2 sd", "metres,", "MD", "saved 10:42"} <= set(texts)
    assert texts["saved 10:42"].needed.right() == pytest.approx(1440 - 16, abs=0.5)
    for said in ("712.4 m MD", "density 2.498", "saved 10:42"):
        assert said in line.accessibleDescription()


@pytest.mark.parametrize(
    ("words", "signal"),
    [("bars and bands 2 sd", "bars_clicked"), ("metres,", "unit_clicked"), ("MD", "kind_clicked")],
)
def test_each_switch_is_a_word_for_mouse_and_keyboard(line, words, signal):
    others = {"bars_clicked", "unit_clicked", "kind_clicked", "stop_clicked"} - {signal}
    heard, silent = told(getattr(line, signal)), [told(getattr(line, other)) for other in others]
    QTest.mouseClick(word(line, words), Qt.MouseButton.LeftButton)
    QTest.keyClick(word(line, words), Qt.Key.Key_Return)
    assert (len(heard), silent) == (2, [[], [], []])
    assert word(line, words).focusPolicy() & Qt.FocusPolicy.TabFocus
    assert word(line, words).accessibleName().endswith(": switch")


def test_switches_tell_the_state_they_are_told(line):
    line.set_right("1 sd", "ft", "elevation", "")
    _, texts = shown(line)
    assert {"bars and bands 1 sd", "feet,", "elevation"} <= set(texts)
    assert not any(words.startswith("saved") for words in texts)
    line.set_right(None, "m", "MD", "")
    _, texts = shown(line)
    assert not any(words.startswith("bars") for words in texts)


def test_long_work_shows_its_share_its_words_and_a_way_to_stop(line, look):
    heard = told(line.stop_clicked)
    accent, rule = QColor(look.theme.roles["accent"]), QColor(look.theme.roles["rule"])
    image, _ = shown(line)
    assert image.pixelColor(5, 0) == rule
    line.set_progress(0.25, "terrain of 54 stations")
    image, texts = shown(line)
    assert all(image.pixelColor(358, y) == accent for y in (0, 1))
    assert image.pixelColor(362, 0) == rule and image.pixelColor(358, 2) != accent
    assert texts["terrain of 54 stations"].needed.right() < word(line, "Stop").x()
    assert "terrain of 54 stations" in line.accessibleDescription()
    QTest.mouseClick(word(line, "Stop"), Qt.MouseButton.LeftButton)
    assert heard == [True]
    line.set_progress(None, "searching")
    image, texts = shown(line)
    assert image.pixelColor(5, 0) == rule and "searching" in texts
    line.set_progress(None, "")
    _, texts = shown(line)
    assert not {"searching", "Stop"} & set(texts)


@pytest.mark.parametrize("width", [960, 1180, 1440])
@pytest.mark.parametrize("scale", [0.9, 1.0, 1.6])
@pytest.mark.parametrize("phrase", ["", "a phrase that goes on and on about work that goes on and on"])
def test_nothing_runs_into_anything_and_no_number_is_cut(line, look, width, scale, phrase):
    look.theme = theme_named("light", scale)
    look.changed.emit()
    line.resize(width, line.height())
    line.set_progress(0.5, phrase)
    with text_placed() as placed:
        line.grab()
    boxes = []
    for text in placed:
        # What a word paints is told in px of the word.
        owner = next((one for one in line.findChildren(QAbstractButton) if one.text() == text.words), None)
        box = text.needed.translated(owner.x(), owner.y()) if owner else text.needed
        boxes.append(box)
        assert 0 <= box.left() and box.right() <= width and box.bottom() <= line.height()
        assert text.drawn == text.words or text.words == phrase
    assert not any(one.intersects(two) for n, one in enumerate(boxes) for two in boxes[n + 1 :])


def test_pairs_without_room_are_left_out_whole_and_told_by_hovering(line):
    assert line.hint_at(20) == ""
    line.resize(620, line.height())
    _, texts = shown(line)
    assert "712.4 m MD" in texts and "Marrow Shale" not in texts and "\u2026" in texts
    assert line.hint_at(20).splitlines()[-1] == "Marrow Shale"
