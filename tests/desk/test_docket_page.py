"""The docket: gravest first, the current finding in full, and a way to the place of each."""

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest

from plumbwell.desk.parts.words import Word
from plumbwell.desk.tray.docket_page import EMPTY, DocketPage, has_place, place_words, recipe_key_of
from plumbwell.study.finding import Finding
from shown_texts import SCALES, look_of, placed_texts, shown_words


def finding(code, severity="note", text="Something was seen.", mend="Look at it.", **more):
    return Finding(
        code=code, severity=severity, place=more.pop("place", f"place of {code}"), text=text, mend=mend, **more
    )


LONG = "The repeat readings of this station part by more than their noise would let them; " * 4
FOUND = (
    finding("n", "note", place="path"),
    finding("l", "look", LONG.strip(), "Leave the reading out.", stations=(3,)),
    finding("e", "error", "No tie fixes gravity.", "Name a tie.", rows=(1, 2)),
    finding("r", "note", place="recipe, drift_walk"),
)


def made_page(look, qtbot, findings=FOUND, *, width=424, height=600):
    page = DocketPage(look)
    qtbot.addWidget(page)
    page.resize(width, height)
    page.set_findings(findings)
    with qtbot.waitActive(page):
        page.show()
        page.activateWindow()
    return page


def blocks(page):
    return page.list.blocks


def test_errors_stand_before_looks_and_looks_before_notes(look, qtbot):
    page = made_page(look, qtbot)
    assert [block.finding.code for block in blocks(page)] == ["e", "l", "n", "r"]
    assert [block.y() for block in blocks(page)] == sorted(block.y() for block in blocks(page))
    assert page.accessibleName() == "Docket, 4 findings"


def test_the_word_under_a_finding_goes_to_its_place(look, qtbot):
    page = made_page(look, qtbot)
    with qtbot.waitSignal(page.go_there) as gone:
        QTest.mouseClick(blocks(page)[1].go, Qt.MouseButton.LeftButton)
    assert gone.args == [FOUND[1]]


def test_a_finding_without_a_place_offers_no_way(look, qtbot):
    page = made_page(look, qtbot)
    offered = [any(word.isVisibleTo(block) for word in block.findChildren(Word)) for block in blocks(page)]
    assert offered == [True, True, False, True]
    gone = []
    page.go_there.connect(gone.append)
    page.list.choose(2)
    QTest.keyClick(blocks(page)[2], Qt.Key.Key_Return)
    assert gone == []


def test_the_window_may_say_itself_where_there_is_a_way(look, qtbot):
    page = made_page(look, qtbot)
    page.set_findings(FOUND, can_go=lambda one: one.code == "n")
    assert [bool(block.words) for block in blocks(page)] == [False, False, True, False]


def test_a_finding_about_a_setting_leads_to_its_key():
    assert recipe_key_of(FOUND[3]) == "drift_walk" and has_place(FOUND[3])
    assert place_words(FOUND[3]) == "Recipe, Drift walk" and place_words(FOUND[0]) == FOUND[0].place
    assert recipe_key_of(finding("x", place="recipe")) is None
    assert recipe_key_of(finding("x", place="recipe, nothing")) is None
    assert not has_place(FOUND[0])


def test_the_arrows_walk_and_return_goes_there(look, qtbot):
    page = made_page(look, qtbot)
    page.setFocus()
    assert blocks(page)[0].hasFocus()
    QTest.keyClick(blocks(page)[0], Qt.Key.Key_Down)
    assert page.current == FOUND[1] and blocks(page)[1].hasFocus()
    with qtbot.waitSignal(page.go_there) as gone:
        QTest.keyClick(blocks(page)[1], Qt.Key.Key_Return)
    assert gone.args == [FOUND[1]]
    QTest.keyClick(blocks(page)[1], Qt.Key.Key_End)
    assert page.current == FOUND[3]
    QTest.keyClick(blocks(page)[3], Qt.Key.Key_Down)
    assert page.current == FOUND[3]
    QTest.keyClick(blocks(page)[3], Qt.Key.Key_Home)
    assert page.current == FOUND[2]


def test_only_the_current_finding_and_its_word_are_reached_by_tab(look, qtbot):
    page = made_page(look, qtbot)
    reached = [block.focusPolicy() == Qt.FocusPolicy.StrongFocus for block in blocks(page)]
    assert reached == [True, False, False, False]
    assert blocks(page)[1].go.focusPolicy() == Qt.FocusPolicy.NoFocus


def test_the_current_finding_says_everything_and_the_others_two_lines(look, qtbot):
    page = made_page(look, qtbot)
    short = shown_words(blocks(page)[1])
    assert "Leave the reading out." not in short and any(words.endswith("…") for words in short)
    low = blocks(page)[1].height()
    QTest.mouseClick(blocks(page)[1], Qt.MouseButton.LeftButton, pos=QPoint(60, 10))
    placed = placed_texts(blocks(page)[1])
    lines = [one.drawn for one in placed if one.drawn not in ("place of l", "Go there", "Leave the reading out.")]
    assert " ".join(lines) == LONG.strip()
    assert "Leave the reading out." in [one.drawn for one in placed]
    assert blocks(page)[1].height() > low
    assert blocks(page)[2].y() >= blocks(page)[1].y() + blocks(page)[1].height()


def test_a_word_longer_than_a_line_is_told_whole(look, qtbot):
    label = "TB-" + "x1" * 98
    page = made_page(look, qtbot, [finding("w", text=f"Station {label} is odd.")])
    drawn = "".join(one.drawn for one in placed_texts(blocks(page)[0]))
    assert label in drawn


def test_what_has_no_room_is_counted_and_the_count_leads_on(look, qtbot):
    many = [finding(str(number), stations=(number,)) for number in range(12)]
    page = made_page(look, qtbot, many, height=198)
    hidden = page.list.hidden_below()
    assert 8 <= hidden <= 10 and f"{hidden} more" in shown_words(page)
    more = next(word for word in page.findChildren(Word) if word.text() == f"{hidden} more")
    QTest.mouseClick(more, Qt.MouseButton.LeftButton)
    assert page.list.hidden_below() < hidden
    page.list.choose(11)
    assert page.list.hidden_below() == 0
    assert not any("more" in words for words in shown_words(page))


def test_no_line_is_cut_through_by_the_count(look, qtbot):
    many = [finding(str(number), text=LONG, stations=(number,)) for number in range(12)]
    page = made_page(look, qtbot, many, height=198)
    strip = next(word for word in page.findChildren(Word) if word.text().endswith("more")).parentWidget()
    for offset in range(0, 60, 7):
        page.list.verticalScrollBar().setValue(offset)
        for block in blocks(page):
            top = strip.y() + offset - block.y()
            for one in placed_texts(block):
                assert one.needed.bottom() <= top or one.needed.top() >= block.height() or one.drawn == "Go there"


def test_nothing_found_is_said(look, qtbot):
    page = made_page(look, qtbot, ())
    assert shown_words(page) == [EMPTY]
    page.set_findings(FOUND)
    assert EMPTY not in shown_words(page)


def test_the_current_finding_stays_while_the_survey_is_reduced_anew(look, qtbot):
    page = made_page(look, qtbot)
    page.list.choose(1)
    blocks(page)[1].setFocus()
    newer = (finding("new", "error"), *FOUND[:1], finding("l", "look", "Now 40 µGal.", stations=(3,)), *FOUND[2:])
    page.set_findings(newer)
    assert page.current.code == "l" and page.current.text == "Now 40 µGal."
    assert blocks(page)[page.list.current].hasFocus()


def test_each_finding_is_told_to_a_screen_reader(look, qtbot):
    page = made_page(look, qtbot)
    assert blocks(page)[0].accessibleName() == "error: place of e"
    assert blocks(page)[0].accessibleDescription() == "No tie fixes gravity. Name a tie."
    assert blocks(page)[0].go.accessibleName() == "Go there: place of e"


def test_the_mark_tells_the_grade_by_shape_and_colour(look, qtbot):
    page = made_page(look, qtbot)
    page.list.choose(3)
    picture = page.grab().toImage()
    for index, role in ((0, "brick"), (1, "amber")):
        assert picture.pixelColor(15, blocks(page)[index].y() + 13) == look.theme.colour(role)
    bar = picture.pixelColor(1, blocks(page)[3].y() + 10)
    assert bar == look.theme.colour("accent")


@pytest.mark.parametrize("scale", SCALES)
def test_real_findings_have_room_at_every_text_scale(qtbot, shaft, well, scale):
    with look_of("dark", scale) as look:
        page = made_page(look, qtbot, shaft.findings + well.findings, width=round(424 * scale), height=1500)
        for index in range(len(page.findings)):
            page.list.choose(index)
            block = blocks(page)[index]
            assert not [one.words for one in placed_texts(block) if one.drawn != one.words]
            assert all(one.needed.right() <= block.width() for one in placed_texts(block))


def test_another_text_scale_sets_the_lines_anew(look, qtbot):
    page = made_page(look, qtbot)
    before = blocks(page)[1].height()
    look.choose(text_scale=1.5)
    assert blocks(page)[1].height() > before
