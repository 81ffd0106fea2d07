"""How the errors of an interval go with those of its neighbours: a small matrix of correlations.

Below the diagonal each correlation is a square whose area is its size, filled where it is positive and outlined
where negative; above the diagonal the same is written as a number. The diagonal holds the names of the intervals.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import isfinite, sqrt

from PySide6.QtCore import QRectF
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.plates.lettering import draw_text, text_height, text_width, wrapped
from plumbwell.plates.numbers import column_decimals, number, sd_text
from plumbwell.plates.painting import hairline_across, stroke_shape, whole
from plumbwell.plates.theme import Theme

MOST_NEIGHBOURS = 4
TITLE_AT, NAME_AT, HEAD, LOW_HEAD, ROW, LINE, FOOT, CELL_PAD = 18, 36, 46, 28, 20, 19, 8, 12
WIDEST_NUMBER = "\u22120.99"
WHAT = "correlation of their errors"
DECIMALS = 2
LEAST_SIDE, OUTLINE = 2.0, 1.2


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class CovariancePicture:
    """What the picture shows.

    Parameters
    ----------
    title : str
    labels : sequence of str
        Names of the intervals from the top down: numbers or depths.
    matrix : sequence of sequence of float
        Correlations between them, -1 to 1, as many rows and columns as labels.
    chosen : int
        Place of the chosen interval.
    sds : sequence of float
        Standard deviations of the intervals' densities, written beside their rows; may be empty.
    sd_name : str
        What stands over them: "sd, g/cm³".
    sentence : str
        What the picture says, in words.
    """

    title: str
    labels: Sequence[str]
    matrix: Sequence[Sequence[float]]
    chosen: int
    sds: Sequence[float] = ()
    sd_name: str = ""
    sentence: str = ""


def neighbour_sentence(matrix: Sequence[Sequence[float]], chosen: int) -> str:
    """Return the correlations of an interval with those directly above and below it, in words.

    Parameters
    ----------
    matrix : sequence of sequence of float
        Correlations from the top down.
    chosen : int
        Place of the interval.
    """
    said = []
    for place, where in ((chosen - 1, "above"), (chosen + 1, "below")):
        if 0 <= place < len(matrix) and isfinite(matrix[chosen][place]):
            said.append(f"{number(matrix[chosen][place], DECIMALS, signed=True)} {where}")
    if not said:
        return "No neighbour shares a station with it."
    return f"Neighbours share a station: correlation {', '.join(said)}."


@dataclass(frozen=True, slots=True, kw_only=True)
class CovarianceLayout:
    """Where the matrix lies.

    Parameters
    ----------
    first, last : int
        Places of the first interval shown and of the one after the last.
    left, top : float
        Its upper left corner in px.
    wide, tall : float
        Size of a cell in px.
    """

    first: int
    last: int
    left: float
    top: float
    wide: float
    tall: float

    @property
    def count(self) -> int:
        """Intervals shown."""
        return self.last - self.first

    @property
    def right(self) -> float:
        """Right edge of the matrix."""
        return self.left + self.count * self.wide

    @property
    def base(self) -> float:
        """Lower edge of the matrix."""
        return self.top + self.count * self.tall

    def cell(self, row: int, column: int) -> QRectF:
        """Return the box of a cell, by the places of its intervals."""
        x = self.left + (column - self.first) * self.wide
        return QRectF(x, self.top + (row - self.first) * self.tall, self.wide, self.tall)

    def place_at(self, x: float, y: float, chosen: int) -> int | None:
        """Return the interval that a click means: that of its row, or in the chosen row that of its column."""
        if not (self.left <= x < self.right and self.top <= y < self.base):
            return None
        row = self.first + int((y - self.top) / self.tall)
        column = self.first + int((x - self.left) / self.wide)
        return column if row == chosen else row


def _sentence_lines(theme: Theme, picture: CovariancePicture, width: float) -> list[str]:
    return wrapped(theme, "small", picture.sentence, width)


def _sds_width(theme: Theme, picture: CovariancePicture) -> float:
    words = [picture.sd_name, *_sd_words(picture, range(len(picture.sds)))]
    return max((text_width(theme, "small", word) for word in words), default=0.0)


def _sd_words(picture: CovariancePicture, places: Sequence[int]) -> list[str]:
    decimals = column_decimals([picture.sds[place] for place in places], default=3)
    return [sd_text(picture.sds[place], decimals) for place in places]


def _with_sds(theme: Theme, picture: CovariancePicture, layout: CovarianceLayout, width: float) -> bool:
    matrix_right = max(layout.right, text_width(theme, "small", WHAT))
    return bool(picture.sds) and matrix_right + theme.px(16) + _sds_width(theme, picture) <= width


def covariance_layout(picture: CovariancePicture, theme: Theme, *, width: float, height: float) -> CovarianceLayout:
    """Return the layout: the chosen interval and as many neighbours to both sides as fit, four at most.

    Where not even one does, the head keeps its title alone.
    """
    words = [WIDEST_NUMBER, *picture.labels]
    most = min(max(text_width(theme, "emphasis", word) for word in words), width / 3)
    wide, tall = float(int(most) + theme.px(CELL_PAD)), float(theme.px(ROW))
    below = len(_sentence_lines(theme, picture, width)) * theme.px(LINE) + theme.px(FOOT)
    side, head = 0, HEAD
    for head in (HEAD, LOW_HEAD):
        fit = int(min((height - theme.px(head) - below) / tall, width / wide))
        side = min(max((fit - 1) // 2, 0), MOST_NEIGHBOURS)
        if side:
            break
    return CovarianceLayout(
        first=max(picture.chosen - side, 0),
        last=min(picture.chosen + side + 1, len(picture.labels)),
        left=0.0,
        top=float(theme.px(head)),
        wide=wide,
        tall=tall,
    )


def draw_correlation(painter: QPainter, theme: Theme, box: QRectF, value: float) -> None:
    """Draw a correlation as a square in the middle of a box: area by its size, filled above zero, outlined below.

    Less than one in two hundred draws nothing, as does what is not finite.
    """
    if not isfinite(value) or abs(value) < 0.005:
        return
    most = min(box.width(), box.height()) - 4
    side = max(whole(most * sqrt(min(abs(value), 1.0))), LEAST_SIDE)
    left, top = whole(box.center().x() - side / 2), whole(box.center().y() - side / 2)
    if value > 0:
        painter.fillRect(QRectF(left, top, side, side), theme.colour("ink"))
        return
    square = QPainterPath()
    inset = OUTLINE / 2
    square.addRect(QRectF(left, top, side, side).adjusted(inset, inset, -inset, -inset))
    stroke_shape(painter, square, theme.colour("ink"), OUTLINE)


def _draw_cells(painter: QPainter, theme: Theme, picture: CovariancePicture, layout: CovarianceLayout) -> None:
    shown = range(layout.first, layout.last)
    cap = text_height(theme, "small")
    for row in shown:
        for column in shown:
            box = layout.cell(row, column)
            value = float(picture.matrix[row][column])
            if column < row:
                draw_correlation(painter, theme, box, value)
                continue
            words = picture.labels[row] if row == column else number(value, DECIMALS, signed=True)
            bold = row == column == picture.chosen
            near = picture.chosen in (row, column)
            draw_text(
                painter,
                theme,
                words,
                x=box.right() - theme.px(CELL_PAD) / 2,
                baseline=box.center().y() + cap / 2,
                face="emphasis" if bold else "small",
                role="ink" if near or row == column else "muted",
                align="right",
                room=(box.left(), box.right()),
            )


def _draw_thread(painter: QPainter, theme: Theme, chosen: int, layout: CovarianceLayout) -> None:
    """Draw the accent frame about row and column of the chosen interval."""
    row = layout.cell(chosen, layout.first).united(layout.cell(chosen, layout.last - 1))
    column = layout.cell(layout.first, chosen).united(layout.cell(layout.last - 1, chosen))
    frame, other = QPainterPath(), QPainterPath()
    # Half a px in, so that a line of 1 px lies on whole px.
    frame.addRect(row.adjusted(0.5, 0.5, -0.5, -0.5))
    other.addRect(column.adjusted(0.5, 0.5, -0.5, -0.5))
    stroke_shape(painter, frame.united(other).simplified(), theme.colour("accent"), 1)


def draw_covariance(
    painter: QPainter, picture: CovariancePicture, layout: CovarianceLayout, theme: Theme, *, width: float
) -> None:
    """Draw title, matrix, standard deviations where they have room, and the sentence."""
    with_sds = _with_sds(theme, picture, layout, width)
    matrix_right = max(layout.right, text_width(theme, "small", WHAT))
    sds_right = matrix_right + theme.px(16) + _sds_width(theme, picture)
    title = text_width(theme, "emphasis", picture.title)
    right = min(max(sds_right if with_sds else matrix_right, title), width)
    draw_text(painter, theme, picture.title, x=0.0, baseline=theme.px(TITLE_AT), face="emphasis", room=(0.0, width))
    names = theme.px(NAME_AT)
    named = layout.top >= theme.px(HEAD)
    if named:
        draw_text(painter, theme, WHAT, x=0.0, baseline=names, face="small", role="muted", room=(0.0, width))
    hairline_across(painter, 0.0, right, layout.top - 1, theme.colour("ink"))
    for row in range(1, layout.count + 1):
        y = layout.top + row * layout.tall - 1
        hairline_across(painter, 0.0, right, y, theme.colour("hair"), theme.hairline)
    _draw_cells(painter, theme, picture, layout)
    if layout.count > 1:
        _draw_thread(painter, theme, picture.chosen, layout)
    if with_sds and named:
        draw_text(
            painter,
            theme,
            picture.sd_name,
            x=sds_right,
            baseline=names,
            face="small",
            role="muted",
            align="right",
            room=(0.0, width),
        )
    if with_sds:
        shown = range(layout.first, layout.last)
        for place, words in zip(shown, _sd_words(picture, shown), strict=True):
            draw_text(
                painter,
                theme,
                words,
                x=sds_right,
                baseline=layout.cell(place, layout.first).center().y() + text_height(theme, "small") / 2,
                face="small",
                role="ink" if place == picture.chosen else "muted",
                align="right",
                room=(layout.right, width),
            )
    foot = layout.base + theme.px(LINE)
    for words in _sentence_lines(theme, picture, width):
        draw_text(painter, theme, words, x=0.0, baseline=foot, face="small", role="muted", room=(0.0, width))
        foot += theme.px(LINE)
