"""A folder that cannot be read: all its problems, each with its row as it stands in the file."""

import shutil
from pathlib import Path

import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest

from plumbwell.desk.opening.file_excerpt import cell_span, elided_around, file_excerpt, visible
from plumbwell.desk.opening.problems import MOST_BLOCKS, Problems
from plumbwell.files.folder import read_survey
from plumbwell.survey.errors import InputError, NumericalError, Problem, SurveyError
from reduced_surveys import WELL
from shown_texts import SCALES, cut_short, look_of, placed_texts, shown_words


def problem(row=3, column="depth [m]", file="a.csv", **more):
    parts = {"found": '"x"', "expected": "a number such as 12.5", "mend": "write the value"} | more
    return Problem(file=file, row=row, column=column, **parts)


def spoiled(folder: Path) -> InputError:
    """A copy of the sample well with mistakes in four files; the error that reading it gives."""
    shutil.copytree(WELL, folder)
    for name, row, old, new in (
        ("path.csv", 5, "60.0", "é0.0"),
        ("open_hole.las", 80, "2.", "2,"),
        ("survey.toml", 6, "latitude = ", "latitude = 1"),
        ("readings.csv", 60, ",", ",9,"),
    ):
        lines = (folder / name).read_text("utf-8").split("\n")
        lines[row - 1] = lines[row - 1].replace(old, new, 1)
        (folder / name).write_text("\n".join(lines), "utf-8")
    with pytest.raises(InputError) as raised:
        read_survey(folder)
    return raised.value


def made_page(look, qtbot, *, width=1190, height=560):
    page = Problems(look)
    qtbot.addWidget(page)
    page.resize(width, height)
    with qtbot.waitActive(page):
        page.show()
        page.activateWindow()
    return page


def marked(page):
    """The text in brick on the right side."""
    return [line.text[slice(*line.marked)] for line in page.excerpt.lines if line.marked]


def test_all_problems_of_a_folder_stand_under_their_count(look, qtbot, tmp_path):
    error = spoiled(tmp_path / "well")
    page = made_page(look, qtbot)
    page.show_error(tmp_path / "well", error)
    words = shown_words(page)
    assert f"This folder cannot be read yet: {len(error.problems)} problems" in words
    assert len(page.list.blocks) == len(error.blocks) >= 4
    for one in error.blocks:
        assert f"{one.file}, row {one.row}" in " ".join(words)
    assert {"found", "expected", "to mend"} <= set(words)


def test_each_problem_shows_its_cell_in_its_row(look, qtbot, tmp_path):
    error = spoiled(tmp_path / "well")
    page = made_page(look, qtbot)
    page.show_error(tmp_path / "well", error)
    cells = {}
    for index, one in enumerate(error.blocks):
        page.list.choose(index)
        assert [line.number for line in page.excerpt.lines][:4] == list(range(one.row - 3, one.row + 1))
        cells[one.file] = marked(page)
    assert cells["path.csv"] == ["é0.0"]
    assert cells["survey.toml"] == ["155.2140"]
    assert cells["readings.csv"][0].count(",") == 9
    assert "2,0" in cells["open_hole.las"][0]


def test_a_click_and_the_arrows_choose_the_problem(look, qtbot, tmp_path):
    (tmp_path / "a.csv").write_text("depth [m],note\n1,a\nx,b\n3,c\ny,d\n", "utf-8")
    page = made_page(look, qtbot)
    page.set_problems(InputError([problem(3), problem(5, mend="look")]), tmp_path)
    assert marked(page) == ["x"]
    QTest.mouseClick(page.list.blocks[1], Qt.MouseButton.LeftButton, pos=QPoint(50, 12))
    assert marked(page) == ["y"]
    QTest.keyClick(page.list.blocks[1], Qt.Key.Key_Up)
    assert marked(page) == ["x"] and page.list.blocks[0].hasFocus()
    (tmp_path / "a.csv").write_text("depth [m],note\n1,a\n2x,b\n", "utf-8")
    QTest.keyClick(page.list.blocks[0], Qt.Key.Key_Return)
    assert marked(page) == ["2x"]


def test_the_wrong_cell_is_brick_and_the_file_is_left_alone(look, qtbot, tmp_path):
    text = "depth [m],note\r\n1,a\r\nx,b\r\n"
    (tmp_path / "a.csv").write_bytes(text.encode())
    page = made_page(look, qtbot)
    page.set_problems(InputError([problem(3)]), tmp_path)
    box = next(one for one in placed_texts(page.excerpt) if one.drawn == "x").needed.toRect()
    picture = page.excerpt.grab().toImage()
    glyph = [picture.pixelColor(x, y) for x in range(box.left(), box.right()) for y in range(box.top(), box.top() + 9)]
    assert max(colour.red() - colour.blue() for colour in glyph) > 80
    assert (tmp_path / "a.csv").read_bytes() == text.encode()


def test_read_again_and_copy_the_list(look, qtbot, tmp_path):
    (tmp_path / "a.csv").write_text("depth [m]\n1\nx\n", "utf-8")
    page = made_page(look, qtbot)
    page.set_problems(InputError([problem(3)]), tmp_path)
    with qtbot.waitSignal(page.read_again):
        QTest.mouseClick(page.again, Qt.MouseButton.LeftButton)
    page.copy.setFocus()
    QTest.keyClick(page.copy, Qt.Key.Key_Return)
    assert QGuiApplication.clipboard().text() == (
        'a.csv, row 3, depth [m]\n  found: "x"\n  expected: a number such as 12.5\n  to mend: write the value'
    )


@pytest.mark.parametrize(
    ("error", "heading", "text"),
    [
        (SurveyError("there is no station"), "This survey cannot be reduced yet", "there is no station."),
        (NumericalError("no rank."), "This folder cannot be read yet", "no rank."),
        (FileNotFoundError(2, "No such file", "/a/b"), "This folder cannot be read yet", "/a/b: No such file."),
        (MemoryError(), "This folder cannot be read yet", "There is not enough memory for this survey."),
    ],
)
def test_other_errors_are_said_in_a_sentence(look, qtbot, tmp_path, error, heading, text):
    page = made_page(look, qtbot)
    page.set_problems(InputError([problem(3)]), tmp_path)
    page.show_error(tmp_path, error)
    assert {heading, text} <= set(shown_words(page))
    assert not page.copy.isVisible() and not page.list.isVisible() and page.again.isVisible()


def test_an_unforeseen_error_tells_no_cell(look, qtbot, tmp_path):
    page = made_page(look, qtbot)
    page.show_error(tmp_path, ValueError("could not convert 2440.671"))
    words = " ".join(shown_words(page))
    assert "ValueError" in words and "2440.671" not in words


@pytest.mark.parametrize(
    ("row", "file", "message"),
    [
        (None, "a.csv", "This concerns the whole file."),
        (99, "a.csv", "The file has changed since: it has no such row any more."),
        (3, "gone.csv", "The file cannot be read: there is no such file."),
    ],
)
def test_a_row_that_cannot_be_shown_is_said(look, qtbot, tmp_path, row, file, message):
    (tmp_path / "a.csv").write_text("depth [m]\n1\n", "utf-8")
    page = made_page(look, qtbot)
    page.set_problems(InputError([problem(row, file=file)]), tmp_path)
    assert message in shown_words(page.excerpt)


def test_thousands_of_problems_are_counted_not_all_listed(look, qtbot, tmp_path):
    many = [problem(None, found=str(number)) for number in range(MOST_BLOCKS + 1200)]
    page = made_page(look, qtbot)
    page.set_problems(InputError(many), tmp_path)
    assert len(page.list.blocks) == MOST_BLOCKS
    assert "and 1\u00a0200 more: the copied list holds them all" in shown_words(page)
    QTest.mouseClick(page.copy, Qt.MouseButton.LeftButton)
    assert QGuiApplication.clipboard().text().count("found:") == len(many)


@pytest.mark.parametrize(
    ("line", "header", "column", "cell"),
    [
        ("1,2,3", "a,b [m],c", "b [m]", "2"),
        ("1, 2 ,3", "a, B [m],c", "b [m]", "2"),
        ('"a,b",2', "name,depth", "depth", "2"),
        ('"a,b",2', "name,depth", "name", '"a,b"'),
        ("1,2,3", "a,b,c", "column 3", "3"),
        ("1,,3", "a,b,c", "b", ","),
        ("  1,2", "a,b", "nothing", "1,2"),
        ("1,2", "a,b", None, "1,2"),
        ("1", "a,b", "b", "1"),
        ("latitude = 154.2   # deg", None, "[site] latitude", "154.2"),
        ('name = "a # b" # c', None, "[site] name", '"a # b"'),
        ("tide_facto = 1.2", None, "[recipe] tide_facto", "1.2"),
        ("latitude =", None, "[site] latitude", "latitude ="),
    ],
)
def test_the_cell_of_a_column_is_found_in_its_line(line, header, column, cell):
    low, high = cell_span(line, header, column)
    assert line[low:high] == cell


def test_any_bytes_can_be_shown(tmp_path):
    for data, wanted in (
        (b"depth [m]\n1\nx\xff\x00\x1b,2\n", "x\\xff\\x00\\x1b,2"),
        ("depth [m]\n1\nxé,2\n".encode("utf-16"), "xé,2"),
        (b"\xef\xbb\xbfdepth [m]\r1\rx\t1\r", "x    1"),
    ):
        (tmp_path / "a.csv").write_bytes(data)
        lines = file_excerpt(tmp_path, problem(3))
        assert [line.number for line in lines] == [1, 2, 3] and lines[2].text == wanted


def test_a_file_without_line_ends_is_cut_and_shown(tmp_path):
    (tmp_path / "a.csv").write_bytes(b"depth [m]\n" + b"7" * 3_000_000 + b"\nx\n4\n")
    lines = file_excerpt(tmp_path, problem(3))
    assert [line.number for line in lines] == [1, 2, 3, 4]
    assert len(lines[1].text) <= 1 << 16 and lines[2].text == "x"


def test_a_long_line_is_cut_about_its_wrong_cell():
    text = "".join(f"{number}," for number in range(500))
    low = text.index(",250,") + 1
    before, cell, after = elided_around(text, (low, low + 3), 40)
    assert cell == "250" and before.startswith("…") and after.endswith("…")
    assert before.endswith("249,") and after.startswith(",251") and len(before + cell + after) <= 40
    assert elided_around("a,b,c", (2, 3), 40) == ("a,", "b", ",c")
    assert elided_around("a" * 90, (0, 90), 40)[1] == "a" * 39 + "…"


def test_what_cannot_be_printed_is_written_as_its_code():
    assert visible("a\u202eb\x07") == "a\\u202eb\\x07" and visible("µé") == "µé"


@pytest.mark.parametrize("scale", SCALES)
def test_problems_have_room_at_every_text_scale(qtbot, tmp_path, scale):
    error = spoiled(tmp_path / "well")
    with look_of("dark", scale) as look:
        page = made_page(look, qtbot)
        page.show_error(tmp_path / "well", error)
        for index in range(len(error.blocks)):
            page.list.choose(index)
            assert cut_short(page) == []
            right = page.excerpt.width()
            assert all(one.needed.right() <= right + 1 for one in placed_texts(page.excerpt))
