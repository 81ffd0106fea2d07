"""One setting of the recipe as a row of the form: mark, label, editor, unit, and what is to be said about it.

A changed setting has the diamond, the folder's value and "Put back"; a value that may not stand is refused in brick
under its field, which keeps what was typed.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

from PySide6.QtCore import QEvent, Qt, Signal
from PySide6.QtGui import QEnterEvent, QKeyEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import Word, middle_baseline
from plumbwell.desk.tray.recipe_editors import GradientEditor, editor_of, unit_text, value_text
from plumbwell.plates.lettering import draw_text, text_width, wrapped
from plumbwell.plates.painting import draw_mark, painting
from plumbwell.plates.theme import Theme
from plumbwell.survey.recipe import DEFAULT, KEYS, as_written, expected_of, from_written

ROW, SMALL_LINE = 28, 19
MARK_X, LABEL_X, GAP = 5, 14, 8
EDITOR_WIDTH = 96


@lru_cache(maxsize=4)
def label_width(theme: Theme) -> int:
    """Return the width in px of the widest label of the form."""
    return max(round(text_width(theme, "text", one.label)) + 1 for one in KEYS.values())


@lru_cache(maxsize=4)
def row_width(theme: Theme) -> int:
    """Return the least width in px of a row that shows all its words."""
    unit = max(text_width(theme, "small", unit_text(one.unit)) for one in KEYS.values() if one.factor is not None)
    return theme.px(LABEL_X + 2 * GAP + EDITOR_WIDTH) + label_width(theme) + round(unit) + 1


def written_with_unit(key: str, value: Any) -> str:
    """Return a written value in words, with its unit where it is a number."""
    unit = unit_text(KEYS[key].unit)
    counts = isinstance(value, dict) or (isinstance(value, float) and bool(unit))
    return f"{value_text(value)} {unit}" if counts else value_text(value)


def what_of(key: str) -> str:
    """Return what a key does, its default and its source, in sentences."""
    one = KEYS[key]
    what = unit_text(one.what[:1].upper() + one.what[1:])
    default = written_with_unit(key, as_written(DEFAULT)[key])
    return f"{what}. Default {default}. Source: {one.source}."


def refusal_of(key: str) -> str:
    """Return what is expected of a value, as it stands beside a refused one."""
    return f"Not taken; expected {unit_text(expected_of(key))}."


class RecipeRow(QWidget):
    """The row of one key.

    Signals
    -------
    changed
        A value was committed that may stand and is another one; as written.
    pointed
        The mouse or the keyboard came to the row.
    left
        The mouse left it.
    resized
        It needs another height.
    """

    changed = Signal(object)
    pointed = Signal()
    left = Signal()
    resized = Signal()

    def __init__(self, key: str, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.key = key
        self.look = look
        self.value: Any = None
        self.folder: Any = None
        self.refusal = ""
        self._asked: Any = self
        self.editor = editor_of(key, look)
        self.editor.setParent(self)
        if isinstance(self.editor, GradientEditor):
            self.editor.line.setParent(self)
        self.put_back = Word("Put back", look, self, face="small")
        self.put_back.setAccessibleName(f"Put back {KEYS[key].label}")
        self.put_back.clicked.connect(self._put_back)
        self.editor.committed.connect(self._committed)
        self.editor.pointed.connect(self.pointed)
        self.editor.resized.connect(self.resized)
        self.setToolTip(what_of(key))
        for part in self.editor.parts:
            part.setAccessibleDescription(what_of(key))

    @property
    def is_changed(self) -> bool:
        """Whether the value is another one than the folder's."""
        return bool(self.value != self.folder)

    def show_value(self, value: Any, folder: Any) -> None:
        """Show a written value beside that of the folder.

        What is being typed stays, and so does a refused entry while the value behind it stays.
        """
        same = value == self.value and self._asked is self
        self.value, self.folder, self._asked = value, folder, self
        keep = self.editor.is_typing() or (same and bool(self.refusal))
        if not keep:
            self.editor.show_value(value)
            self.refusal = ""
        self._say()

    def refuse(self, words: str) -> None:
        """Say in brick, under the field, why what stands there is not taken."""
        self.refusal, self._asked = words, self
        self._say()

    def _say(self) -> None:
        changed = f"changed; {written_with_unit(self.key, self.folder)} in the folder" if self.is_changed else ""
        self.setAccessibleDescription(self.refusal or changed)
        for part in self.editor.parts:
            part.setAccessibleDescription(" ".join(filter(None, (self.refusal, changed, what_of(self.key)))))
        self.arrange()
        if self.height_for(self.width()) != self.height():
            self.resized.emit()

    def _committed(self) -> None:
        if self.editor.is_half_written():
            return
        try:
            value = self.editor.typed_value()
            if value is not None:
                from_written(self.key, value)
        except ValueError:
            self.refuse(refusal_of(self.key))
            return
        self.editor.settle()
        asked = self.value if self._asked is self else self._asked
        if self.refusal:
            self.refusal = ""
            self._say()
        if value == asked and isinstance(value, str) == isinstance(asked, str):
            self.editor.show_value(asked)
            return
        self._asked = value
        self.changed.emit(value)

    def restore(self) -> None:
        """Show the value in force again in place of what was typed."""
        self.editor.show_value(self.value)
        self.refusal = ""
        self._say()

    def _put_back(self) -> None:
        self.restore()
        if self.is_changed:
            self._asked = self.folder
            self.changed.emit(self.folder)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape and (self.refusal or self.editor.is_typing()):
            self.restore()
        else:
            super().keyPressEvent(event)

    def _refusal_lines(self, width: int) -> list[str]:
        return (
            wrapped(self.look.theme, "small", self.refusal, width - self.look.theme.px(LABEL_X)) if self.refusal else []
        )

    def base_height(self) -> int:
        """Return the height in px of the row when there is nothing to say about it."""
        return self.look.theme.px(ROW)

    def height_for(self, width: int) -> int:
        """Return the height in px that the row takes in a width."""
        theme = self.look.theme
        lines = len(self._refusal_lines(width)) + (1 if self.is_changed else 0)
        second = theme.px(ROW) if self.editor.second_line is not None else 0
        return theme.px(ROW) + second + lines * theme.px(SMALL_LINE) + (theme.px(5) if lines else 0)

    def resizeEvent(self, event: QResizeEvent) -> None:
        self.arrange()

    def arrange(self) -> None:
        """Put the parts of the row in their places."""
        theme = self.look.theme
        row = theme.px(ROW)
        x = theme.px(LABEL_X) + label_width(theme) + theme.px(GAP)
        self.editor.setGeometry(x, 1, theme.px(EDITOR_WIDTH), row - theme.px(4))
        y = row
        line = self.editor.second_line
        if isinstance(self.editor, GradientEditor):
            self.editor.line.setVisible(line is not None)
            self.editor.line.setGeometry(theme.px(LABEL_X), y + 1, self.width() - theme.px(LABEL_X), row - theme.px(4))
        if line is not None:
            y += row
        self.put_back.setVisible(self.is_changed)
        self.put_back.stand_at(x=x, baseline=y + theme.px(14))
        self.update()

    def enterEvent(self, event: QEnterEvent) -> None:
        self.pointed.emit()

    def leaveEvent(self, event: QEvent) -> None:
        self.left.emit()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme, one = self.look.theme, KEYS[self.key]
        left, row = theme.px(LABEL_X), theme.px(ROW)
        label = label_width(theme)
        editor = left + label + theme.px(GAP)
        with painting(self) as painter:
            baseline = middle_baseline(theme, "text", row - theme.px(4)) + 1
            if self.is_changed:
                draw_mark(painter, theme, "changed", x=theme.px(MARK_X), y=baseline - theme.px(4.5))
            draw_text(painter, theme, one.label, x=left, baseline=baseline, room=(left, editor))
            line = self.editor.second_line
            x = editor + theme.px(EDITOR_WIDTH) + theme.px(GAP)
            if one.factor is not None and isinstance(self.value, float):
                unit = unit_text(one.unit)
                draw_text(
                    painter, theme, unit, x=x, baseline=baseline, face="small", role="muted", room=(x, self.width())
                )
            y = row if line is None else 2 * row
            if self.is_changed:
                words = f"{value_text(self.folder)} in the folder"
                draw_text(
                    painter,
                    theme,
                    words,
                    x=left,
                    baseline=y + theme.px(14),
                    face="small",
                    role="muted",
                    room=(left, self.put_back.x()),
                )
                y += theme.px(SMALL_LINE)
            for index, words in enumerate(self._refusal_lines(self.width())):
                if index == 0:
                    draw_mark(painter, theme, "error", x=theme.px(MARK_X), y=y + theme.px(14) - theme.px(4.5))
                draw_text(
                    painter,
                    theme,
                    words,
                    x=left,
                    baseline=y + theme.px(14),
                    face="small",
                    role="brick",
                    room=(left, self.width()),
                )
                y += theme.px(SMALL_LINE)
