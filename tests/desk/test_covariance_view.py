"""The picture of correlations with neighbours: squares, numbers, words; another interval by click or keys."""

import pytest
from PySide6.QtCore import QPoint, QRectF, Qt
from PySide6.QtGui import QColor, QImage
from PySide6.QtTest import QTest

from plumbwell.desk.tray.covariance_view import NOTHING_CHOSEN, CovarianceView
from plumbwell.plates.covariance_picture import draw_correlation, neighbour_sentence
from plumbwell.plates.lettering import text_placed
from plumbwell.plates.painting import painting
from plumbwell.plates.theme import theme_named

COUNT = 20
LABELS = [str(number) for number in range(1, COUNT + 1)]
MATRIX = [
    [1.0 if row == column else {1: -0.49, 2: 0.06}.get(abs(row - column), 0.01) for column in range(COUNT)]
    for row in range(COUNT)
]
MATRIX[9][10] = MATRIX[10][9] = -0.48


@pytest.fixture
def view(look, qtbot):
    """The picture about interval 10, 600 x 260."""
    view = CovarianceView(look)
    qtbot.addWidget(view)
    view.resize(600, 260)
    view.set_matrix(LABELS, MATRIX, 9, sds=[0.012] * COUNT)
    view.show()
    return view


def heard(signal):
    """A list that fills with what a signal carries."""
    found = []
    signal.connect(found.append)
    return found


def drawn(view):
    """The words that the view writes."""
    with text_placed() as placed:
        view.grab()
    return placed


def test_four_neighbours_to_each_side_are_shown_with_numbers_and_the_sentence(view):
    words = [one.drawn for one in drawn(view)]
    assert {"6", "10", "14"} <= set(words) and not {"5", "15"} & set(words)
    assert words.count("\u22120.48") == 1
    assert "Neighbours share a station: correlation \u22120.49 above, \u22120.48 below." in words
    assert words.count("±\u00a00.012") == 9


def test_with_less_room_there_are_fewer_neighbours_and_at_an_end_one_side(view):
    view.resize(600, 190)
    assert view.covariance_layout().count == 5
    view.set_matrix(LABELS, MATRIX, 0)
    layout = view.covariance_layout()
    assert (layout.first, layout.last) == (0, 3)


def test_clicking_a_row_chooses_its_interval_and_in_the_chosen_row_the_column(view):
    chosen = heard(view.chosen)
    layout = view.covariance_layout()
    for row, column in ((7, 8), (9, 12), (9, 9)):
        QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=layout.cell(row, column).center().toPoint())
    QTest.mouseClick(view, Qt.MouseButton.LeftButton, pos=QPoint(590, 250))
    assert chosen == [7, 12]


def test_keys_lead_to_the_neighbour(view):
    chosen = heard(view.chosen)
    QTest.keyClick(view, Qt.Key.Key_Up)
    QTest.keyClick(view, Qt.Key.Key_Down)
    view.set_matrix(LABELS, MATRIX, COUNT - 1)
    QTest.keyClick(view, Qt.Key.Key_Down)
    assert chosen == [8, 10]


@pytest.mark.parametrize("name", ["light", "dark"])
def test_area_goes_with_size_and_the_sign_is_filled_or_hollow(qapp, name):
    theme = theme_named(name)

    def ink(value):
        image = QImage(40, 40, QImage.Format.Format_RGB32)
        image.fill(theme.colour("ground"))
        with painting(image) as painter:
            draw_correlation(painter, theme, QRectF(0, 0, 40, 40), value)
        spots = [(x, y) for x in range(40) for y in range(40) if image.pixel(x, y) != theme.colour("ground").rgb()]
        width = max(x for x, _ in spots) - min(x for x, _ in spots) + 1 if spots else 0
        return width, QColor(image.pixel(20, 20)).name()

    half, middle = ink(0.5)
    whole, _ = ink(1.0)
    assert (half / whole) ** 2 == pytest.approx(0.5, abs=0.06)
    assert middle == theme.roles["ink"].lower()
    negative, hollow = ink(-0.5)
    assert negative == half
    assert hollow == theme.roles["ground"].lower()
    assert ink(0.0)[0] == 0 and ink(float("nan"))[0] == 0


def test_the_chosen_row_and_column_are_framed_in_accent(view, look):
    image = view.grab().toImage()
    layout = view.covariance_layout()
    accent = look.theme.roles["accent"].lower()
    row, column = layout.cell(9, layout.first), layout.cell(layout.first, 9)
    assert QColor(image.pixel(int(row.left()) + 8, int(row.top()))).name() == accent
    assert QColor(image.pixel(int(column.left()), int(column.top()) + 8)).name() == accent


def test_what_it_shows_is_told(view):
    assert view.accessibleDescription() == (
        "Interval 10 and its neighbours. Neighbours share a station: correlation \u22120.49 above, \u22120.48 below."
    )
    view.set_empty()
    assert view.accessibleDescription() == NOTHING_CHOSEN
    assert [one.drawn for one in drawn(view)] == [NOTHING_CHOSEN]


def test_the_sentence_at_an_end_and_of_one_alone():
    assert neighbour_sentence(MATRIX, 0) == "Neighbours share a station: correlation \u22120.49 below."
    assert neighbour_sentence([[1.0]], 0) == "No neighbour shares a station with it."


def test_what_does_not_belong_together_is_refused(view):
    with pytest.raises(ValueError, match="20 labels to a matrix of 3 rows"):
        view.set_matrix(LABELS, MATRIX[:3], 0)
    with pytest.raises(ValueError, match="interval 20 is none of 20"):
        view.set_matrix(LABELS, MATRIX, 20)


@pytest.mark.parametrize("scale", [0.9, 1.0, 1.3, 1.6])
@pytest.mark.parametrize("size", [(600, 190), (480, 190), (600, 320)])
def test_no_word_is_cut_off(view, look, scale, size):
    look.choose(wanted="dark", text_scale=scale)
    view.resize(*size)
    placed = drawn(view)
    # Where the sentence takes two lines of the largest text, it says alone what the neighbours do.
    assert view.covariance_layout().count >= (1 if (scale, size) == (1.6, (480, 190)) else 3)
    for one in placed:
        assert one.drawn == one.words, one
        assert one.needed.left() >= 0 and one.needed.right() <= size[0] + 0.01, one
        assert one.needed.bottom() <= size[1], one
