"""Small widgets that the pages of the tray share: action words, painted captions, choosers and fields.

They hold the look and measure anew when it changes. An action is an underlined word in the accent colour; a
frame in the same colour tells where the keyboard is.
"""

from __future__ import annotations

from math import ceil

from PySide6.QtCore import QEvent, QRectF, QSize, Qt
from PySide6.QtGui import (
    QEnterEvent,
    QFontMetricsF,
    QKeyEvent,
    QPainter,
    QPaintEvent,
    QResizeEvent,
    QWheelEvent,
)
from PySide6.QtWidgets import QAbstractButton, QComboBox, QLineEdit, QSizePolicy, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.icons import draw_icon
from plumbwell.plates.lettering import draw_text, face_font, text_height, text_width, wrapped
from plumbwell.plates.painting import hairline_across, painting, polygon, stroke_shape, whole
from plumbwell.plates.theme import Theme

LINE = 19
"""Distance of baselines in running text, px of the unscaled design."""

SENTENCE_LINE = 20
"""The same in the sentence of an empty picture, which stands alone."""

WORD_PAD = 3
"""Room on both sides of an action word for its focus frame."""

FOCUS_WIDTH = 1.4
ENTER_KEYS = (Qt.Key.Key_Return, Qt.Key.Key_Enter)
CHEVRON = 14


def draw_focus(painter: QPainter, theme: Theme, box: QRectF, role: str = "accent") -> None:
    """Draw the frame of keyboard focus inside a box."""
    inset = FOCUS_WIDTH / 2
    box = box.adjusted(inset, inset, -inset, -inset)
    corners = (
        (box.left(), box.top()),
        (box.right(), box.top()),
        (box.right(), box.bottom()),
        (box.left(), box.bottom()),
    )
    stroke_shape(painter, polygon(*corners), theme.colour(role), FOCUS_WIDTH)


def draw_sentence(painter: QPainter, theme: Theme, words: str, *, width: float, baseline: float) -> None:
    """Draw what an empty picture says, broken at a width, from the left."""
    for line in wrapped(theme, "text", words, width):
        draw_text(painter, theme, line, x=0, baseline=baseline, role="muted", room=(0, width))
        baseline += theme.px(SENTENCE_LINE)


def middle_baseline(theme: Theme, face: str, height: float) -> int:
    """Return the baseline, in whole px, of a text whose capitals stand in the middle of a height."""
    return whole((height + text_height(theme, face)) / 2)


class Pressed(QAbstractButton):
    """A painted button that mouse, Space and Return press, and that is painted anew under the pointer."""

    def enterEvent(self, event: QEnterEvent) -> None:
        self.update()
        super().enterEvent(event)

    def leaveEvent(self, event: QEvent) -> None:
        self.update()
        super().leaveEvent(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() in ENTER_KEYS:
            self.click()
        else:
            super().keyPressEvent(event)


class Word(Pressed):
    """An action as an underlined word: the mouse, Space and Return do it.

    Parameters
    ----------
    words : str
    look : Look
    parent : QWidget or None
    face : str
        "text" or "small".
    """

    def __init__(self, words: str, look: Look, parent: QWidget | None = None, *, face: str = "text") -> None:
        super().__init__(parent)
        self.look = look
        self.face = face
        self.setText(words)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setSizePolicy(QSizePolicy.Policy.Fixed, QSizePolicy.Policy.Fixed)
        look.changed.connect(self._look_changed)

    def _look_changed(self) -> None:
        self.updateGeometry()
        self.update()

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(ceil(text_width(theme, self.face, self.text())) + 2 * WORD_PAD, theme.px(LINE) + 2)

    def minimumSizeHint(self) -> QSize:
        return self.sizeHint()

    @property
    def baseline(self) -> int:
        """Baseline of the word in px below its upper edge."""
        return middle_baseline(self.look.theme, self.face, self.sizeHint().height())

    def stand_at(self, *, x: float, baseline: float) -> None:
        """Take the place where the word begins at `x` and stands on `baseline`, in px of the parent."""
        self.setGeometry(
            whole(x) - WORD_PAD, whole(baseline) - self.baseline, self.sizeHint().width(), self.sizeHint().height()
        )

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        with painting(self) as painter:
            baseline = middle_baseline(theme, self.face, self.height())
            box = draw_text(
                painter,
                theme,
                self.text(),
                x=WORD_PAD,
                baseline=baseline,
                face=self.face,
                role="accent" if self.isEnabled() else "strong",
                room=(0, self.width()),
            )
            if self.isEnabled():
                thick = 2 if self.underMouse() or self.isDown() else 1
                hairline_across(painter, box.left(), box.right(), baseline + 2, theme.colour("accent"), thick)
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))


class MainAction(Word):
    """The one main action of a page: a word on a filled ground."""

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(ceil(text_width(theme, "emphasis", self.text())) + 2 * theme.px(20), theme.px(32))

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        with painting(self) as painter:
            baseline = middle_baseline(theme, "emphasis", self.height())
            if self.isEnabled():
                painter.fillRect(self.rect(), theme.colour("accent"))
            width = text_width(theme, "emphasis", self.text())
            left = (self.width() - width) / 2
            box = draw_text(
                painter,
                theme,
                self.text(),
                x=left,
                baseline=baseline,
                face="emphasis",
                role="on_accent" if self.isEnabled() else "strong",
                room=(0, self.width()),
            )
            if self.isEnabled() and (self.underMouse() or self.isDown()):
                hairline_across(painter, box.left(), box.right(), baseline + 2, theme.colour("on_accent"), 2)
            if self.hasFocus():
                inside = QRectF(self.rect()).adjusted(2, 2, -2, -2)
                draw_focus(painter, theme, inside, role="on_accent" if self.isEnabled() else "accent")


class Caption(QWidget):
    """Painted words in a face and role; shortened, or broken into lines, where room is short.

    Parameters
    ----------
    words : str
    look : Look
    parent : QWidget or None
    face, role : str
    lines : int
        Most lines it may take.
    """

    def __init__(
        self,
        words: str,
        look: Look,
        parent: QWidget | None = None,
        *,
        face: str = "text",
        role: str = "ink",
        lines: int = 1,
    ) -> None:
        super().__init__(parent)
        self.look = look
        self.face = face
        self.role = role
        self.lines = lines
        self.words = ""
        self.say(words)
        look.changed.connect(self._look_changed)

    def _look_changed(self) -> None:
        self.updateGeometry()
        self.update()

    def say(self, words: str, role: str | None = None) -> None:
        """Show other words, in another role where one is given."""
        self.words = words
        self.role = role or self.role
        self.setAccessibleName(words)
        self.updateGeometry()
        self.update()

    @property
    def line(self) -> int:
        """Distance of baselines in px."""
        return self.look.theme.px(
            LINE if self.face in ("text", "emphasis") else LINE - 2 if self.face != "heading" else 26
        )

    def _set(self, width: float) -> list[str]:
        broken = wrapped(self.look.theme, self.face, self.words, width) if self.lines > 1 else [self.words]
        kept = broken[: self.lines]
        if len(broken) > self.lines:
            kept[-1] = " ".join(broken[self.lines - 1 :])
        return kept if self.words else []

    def height_for(self, width: float) -> int:
        """Return the height in px that the words take in a width."""
        return max(len(self._set(width)), 1) * self.line

    def sizeHint(self) -> QSize:
        width = ceil(text_width(self.look.theme, self.face, self.words))
        return QSize(width, self.line)

    def minimumSizeHint(self) -> QSize:
        return QSize(0, self.line)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        with painting(self) as painter:
            baseline = middle_baseline(theme, self.face, self.line)
            if self.lines == 1:
                baseline = middle_baseline(theme, self.face, self.height())
            for words in self._set(self.width()):
                draw_text(
                    painter,
                    theme,
                    words,
                    x=0,
                    baseline=baseline,
                    face=self.face,
                    role=self.role,
                    room=(0, self.width()),
                )
                baseline += self.line


class Chooser(QComboBox):
    """A chooser as text over a rule with a chevron; its list opens by mouse, Space, Return and the arrows.

    The wheel scrolls what is around it: nobody shall change a setting in passing. Arrows open the list instead of
    stepping through it, so that each choice is one act. Where it is editable, Return and leaving the field end
    the typing (`edit.editingFinished`). Where the one thing to choose is chosen, it stands as plain text.
    `unlisted` is shown while nothing of the list is chosen: a value that is in force and not offered.
    """

    def __init__(self, look: Look, parent: QWidget | None = None, *, editable: bool = False) -> None:
        super().__init__(parent)
        self.look = look
        self.unlisted = ""
        self.edit: QLineEdit | None = None
        self.setEditable(editable)
        self.setFrame(False)
        self.setMaxVisibleItems(20)
        self.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        self.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
        if editable:
            self.setCompleter(None)  # type: ignore[arg-type]
        self.edit = self.lineEdit()
        if self.edit is not None:
            self.edit.setStyleSheet("QLineEdit, QLineEdit:focus { border: 0; padding: 0; }")
        look.changed.connect(self._look_changed)
        self._look_changed()

    def _look_changed(self) -> None:
        self.setFont(face_font(self.look.theme, "text"))
        self._place_edit()
        self.updateGeometry()
        self.update()

    def _place_edit(self) -> None:
        if self.edit is not None:
            chevron = self.look.theme.px(CHEVRON)
            self.edit.setFont(self.font())
            self.edit.setGeometry(0, 1, max(self.width() - chevron - 2, 0), max(self.height() - 4, 0))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._place_edit()

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        widest = max(
            (text_width(theme, "text", self.itemText(index)) for index in range(min(self.count(), 50))), default=0
        )
        return QSize(ceil(widest) + theme.px(CHEVRON) + 8, theme.px(24))

    def minimumSizeHint(self) -> QSize:
        return QSize(self.look.theme.px(40), self.look.theme.px(24))

    @property
    def is_plain(self) -> bool:
        """Whether there is nothing else to choose."""
        return not self.isEditable() and self.count() == 1 and self.currentIndex() == 0

    def showPopup(self) -> None:
        if not self.is_plain:
            super().showPopup()

    def wheelEvent(self, event: QWheelEvent) -> None:
        event.ignore()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        opening = (Qt.Key.Key_Up, Qt.Key.Key_Down, Qt.Key.Key_F4)
        if not self.isEditable():
            opening = (*opening, *ENTER_KEYS, Qt.Key.Key_Space)  # type: ignore[assignment]
        if event.key() in opening:
            self.showPopup()
        else:
            super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        size = theme.px(CHEVRON)
        focus = self.hasFocus() or (self.edit is not None and self.edit.hasFocus())
        with painting(self) as painter:
            if not self.isEditable():
                draw_text(
                    painter,
                    theme,
                    self.currentText() if self.currentIndex() >= 0 else self.unlisted,
                    x=2,
                    baseline=middle_baseline(theme, "text", self.height() - 2),
                    role="ink" if self.isEnabled() else "strong",
                    room=(0, self.width() - size - 2),
                )
            if self.is_plain:
                if focus:
                    draw_focus(painter, theme, QRectF(self.rect()))
                return
            draw_icon(
                painter,
                "chevron-down",
                theme,
                "muted" if self.isEnabled() else "strong",
                x=self.width() - size,
                y=(self.height() - 2 - size) / 2,
                size=size,
            )
            thick = 2 if focus else 1
            role = "accent" if focus else "strong"
            hairline_across(painter, 0, self.width(), self.height() - thick, theme.colour(role), thick)


class Field(QLineEdit):
    """A field over a rule, in the text of the look. Escape gives back what stood there before."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.setFrame(False)
        look.changed.connect(self._look_changed)
        self._look_changed()

    def _look_changed(self) -> None:
        self.setFont(face_font(self.look.theme, "text"))
        self.updateGeometry()

    def sizeHint(self) -> QSize:
        theme = self.look.theme
        return QSize(theme.px(84), max(theme.px(24), ceil(QFontMetricsF(self.font()).height()) + 6))

    def minimumSizeHint(self) -> QSize:
        return QSize(self.look.theme.px(30), self.sizeHint().height())
