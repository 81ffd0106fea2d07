"""Editors of single recipe values: a word, a number, a word or number, a station, a measured gradient.

They show and give values as written in survey.toml. They know no recipe and keep what was typed until another value
is shown; whether it may stand is asked of `survey.recipe`.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

from PySide6.QtCore import QEvent, QObject, Qt, Signal
from PySide6.QtGui import QPaintEvent
from PySide6.QtWidgets import QLineEdit, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import Chooser, Field, middle_baseline
from plumbwell.plates.lettering import draw_text
from plumbwell.plates.numbers import MINUS, PLUS_MINUS
from plumbwell.plates.painting import painting
from plumbwell.survey.recipe import KEYS, is_unavailable

NORMAL, MEASURED = "normal", "measured"
HIGHEST = "highest"
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?")


def number_typed(text: str) -> float:
    """Return the number that a person typed, with a decimal point; raises ValueError for anything else."""
    plain = text.strip().replace(MINUS, "-")
    if not _NUMBER.fullmatch(plain):
        raise ValueError(text)
    return float(plain)


def value_text(value: Any) -> str:
    """Return a written value as it stands in its editor."""
    if isinstance(value, dict):
        return f"{value_text(value['gradient'])} {PLUS_MINUS} {value_text(value['sd'])}"
    if isinstance(value, float):
        return f"{value:.12g}".replace("-", MINUS)
    return HIGHEST if value is None else str(value)


def unit_text(unit: str) -> str:
    """Return a unit of the recipe as people read it."""
    return unit.replace("uGal", "µGal").replace("cm3", "cm³")


class ValueEditor(QWidget):
    """What the editors have in common.

    Signals
    -------
    committed
        The person ended an entry: Return, leaving the field, a choice from a list.
    pointed
        The keyboard came to the editor.
    resized
        It takes more or fewer lines than before.
    """

    committed = Signal()
    pointed = Signal()
    resized = Signal()

    def __init__(self, key: str, look: Look) -> None:
        super().__init__()
        self.key = key
        self.look = look

    @property
    def parts(self) -> tuple[QWidget, ...]:
        """The widgets that take the keyboard."""
        raise TypeError("an editor without parts")

    @property
    def second_line(self) -> QWidget | None:
        """A further line of the editor, if it shows one."""
        return None

    def show_value(self, value: Any) -> None:
        """Show a written value in place of what was typed."""
        raise TypeError("an editor that shows nothing")

    def typed_value(self) -> Any:
        """Return what stands in the editor as a written value; raises ValueError where it is none."""
        raise TypeError("an editor that gives nothing")

    def is_typing(self) -> bool:
        """Return whether the keyboard is here and something was typed that has not been committed."""
        return self.is_half_written() or any(edit.hasFocus() and edit.isModified() for edit in self._edits())

    def is_half_written(self) -> bool:
        """Return whether a value of several parts is not whole yet and still being written."""
        return False

    def _choose(self) -> None:
        self.committed.emit()

    def settle(self) -> None:
        """Count what stands here as committed."""
        for edit in self._edits():
            edit.setModified(False)

    def _edits(self) -> list[QLineEdit]:
        found = [part.edit if isinstance(part, Chooser) else part for part in self.parts]
        return [edit for edit in found if isinstance(edit, QLineEdit)]

    def _watch(self) -> None:
        """Connect the parts once they are made."""
        name = KEYS[self.key].label
        for part in self.parts:
            part.setAccessibleName(part.accessibleName() or name)
            part.installEventFilter(self)
            if isinstance(part, Chooser):
                part.activated.connect(self._choose)
        for edit in self._edits():
            edit.editingFinished.connect(self.committed)
            edit.installEventFilter(self)
            edit.setAccessibleName(edit.accessibleName() or name)
        self.setFocusProxy(self.parts[0])

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if event.type() == QEvent.Type.FocusIn:
            self.pointed.emit()
        return super().eventFilter(watched, event)

    def resizeEvent(self, event: QEvent) -> None:
        self.parts[0].setGeometry(self.rect())


class WordEditor(ValueEditor):
    """One of the words of a key that this version can do."""

    def __init__(self, key: str, look: Look) -> None:
        super().__init__(key, look)
        self.words = tuple(word for word in KEYS[key].words if not is_unavailable(key, word))
        self.chooser = Chooser(look, self)
        self.chooser.addItems([str(word) for word in self.words])
        self._watch()

    @property
    def parts(self) -> tuple[QWidget, ...]:
        """The chooser."""
        return (self.chooser,)

    def show_value(self, value: Any) -> None:
        """Show a word; one that this version cannot do is shown and not offered."""
        self.chooser.unlisted = value_text(value)
        self.chooser.setCurrentIndex(self.words.index(value) if value in self.words else -1)

    def typed_value(self) -> Any:
        """Return the chosen word."""
        index = self.chooser.currentIndex()
        if index < 0:
            raise ValueError(self.key)
        return self.words[index]


class NumberEditor(ValueEditor):
    """A number."""

    def __init__(self, key: str, look: Look) -> None:
        super().__init__(key, look)
        self.field = Field(look, self)
        self._watch()

    @property
    def parts(self) -> tuple[QWidget, ...]:
        """The field."""
        return (self.field,)

    def show_value(self, value: Any) -> None:
        """Show a number."""
        self.field.setText(value_text(value))

    def typed_value(self) -> Any:
        """Return the number typed."""
        return number_typed(self.field.text())


class EitherEditor(ValueEditor):
    """A word of a key, or a number."""

    def __init__(self, key: str, look: Look) -> None:
        super().__init__(key, look)
        self.words = tuple(word for word in KEYS[key].words if not is_unavailable(key, word))
        self.chooser = Chooser(look, self, editable=True)
        self.chooser.addItems([str(word) for word in self.words])
        self._watch()

    @property
    def parts(self) -> tuple[QWidget, ...]:
        """The chooser, which can be typed into."""
        return (self.chooser,)

    def show_value(self, value: Any) -> None:
        """Show a word or a number."""
        self.chooser.setCurrentIndex(self.words.index(value) if value in self.words else -1)
        self.chooser.setEditText(value_text(value))
        self.settle()

    def typed_value(self) -> Any:
        """Return the word or number that stands here."""
        text = self.chooser.currentText().strip()
        for word in self.words:
            if text == str(word):
                return word
        return number_typed(text)


class StationEditor(ValueEditor):
    """A station of the survey, or none: the highest of the column."""

    def __init__(self, key: str, look: Look) -> None:
        super().__init__(key, look)
        self.stations: tuple[str, ...] = ()
        self.chooser = Chooser(look, self)
        self.chooser.addItem(HIGHEST)
        self._watch()

    @property
    def parts(self) -> tuple[QWidget, ...]:
        """The chooser."""
        return (self.chooser,)

    def offer(self, stations: Sequence[str]) -> None:
        """Offer the stations of a survey, from the top down."""
        if tuple(stations) == self.stations:
            return
        self.stations = tuple(stations)
        self.chooser.clear()
        self.chooser.addItems([HIGHEST, *self.stations])

    def show_value(self, value: Any) -> None:
        """Show a station, or None."""
        self.chooser.unlisted = value_text(value)
        index = 0 if value is None else -1
        if value in self.stations:
            index = self.stations.index(value) + 1
        self.chooser.setCurrentIndex(index)

    def typed_value(self) -> Any:
        """Return the label of the chosen station, or None."""
        index = self.chooser.currentIndex()
        if index < 0:
            raise ValueError(self.key)
        return self.stations[index - 1] if index else None


class GradientLine(QWidget):
    """The second line of a measured gradient: gradient, sd and unit."""

    def __init__(self, key: str, look: Look) -> None:
        super().__init__()
        self.key = key
        self.look = look
        self.gradient, self.sd = Field(look, self), Field(look, self)
        self.gradient.setAccessibleName(f"{KEYS[key].label}, measured")
        self.sd.setAccessibleName(f"{KEYS[key].label}, standard deviation")

    def _widths(self) -> tuple[int, int, int]:
        theme = self.look.theme
        return theme.px(84), theme.px(20), theme.px(70)

    def resizeEvent(self, event: QEvent) -> None:
        first, between, second = self._widths()
        self.gradient.setGeometry(0, 0, first, self.height())
        self.sd.setGeometry(first + between, 0, second, self.height())

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        first, between, second = self._widths()
        with painting(self) as painter:
            baseline = middle_baseline(theme, "text", self.height() - 2)
            draw_text(
                painter, theme, PLUS_MINUS, x=first + between / 2, baseline=baseline, role="muted", align="middle"
            )
            x = first + between + second + theme.px(6)
            unit = unit_text(KEYS[self.key].unit)
            draw_text(painter, theme, unit, x=x, baseline=baseline, face="small", role="muted", room=(x, self.width()))


class GradientEditor(ValueEditor):
    """The normal gradient, or a measured one with its sd on a second line."""

    def __init__(self, key: str, look: Look) -> None:
        super().__init__(key, look)
        self.chooser = Chooser(look, self)
        self.chooser.addItems([NORMAL, MEASURED])
        self.line = GradientLine(key, look)
        self._watch()

    @property
    def parts(self) -> tuple[QWidget, ...]:
        """The chooser and both fields."""
        return (self.chooser, self.line.gradient, self.line.sd)

    @property
    def is_measured(self) -> bool:
        """Whether a measured gradient is asked for."""
        return self.chooser.currentText() == MEASURED

    @property
    def second_line(self) -> QWidget | None:
        """The fields, while a measured gradient is asked for."""
        return self.line if self.is_measured else None

    def is_half_written(self) -> bool:
        """Return whether one of the fields is empty and the keyboard is still with them."""
        empty = not (self.line.gradient.text().strip() and self.line.sd.text().strip())
        return self.is_measured and empty and any(part.hasFocus() for part in self.parts)

    def _choose(self) -> None:
        self.resized.emit()
        if self.is_measured and not self.line.gradient.text():
            self.line.gradient.setFocus(Qt.FocusReason.OtherFocusReason)
        else:
            self.committed.emit()

    def show_value(self, value: Any) -> None:
        """Show "normal", or a gradient with its sd."""
        measured = isinstance(value, dict)
        self.chooser.setCurrentIndex(1 if measured else 0)
        for field, part in ((self.line.gradient, "gradient"), (self.line.sd, "sd")):
            field.setText(value_text(value[part]) if measured else "")
        self.resized.emit()

    def typed_value(self) -> Any:
        """Return "normal" or the gradient with its sd."""
        if not self.is_measured:
            return NORMAL
        return {"gradient": number_typed(self.line.gradient.text()), "sd": number_typed(self.line.sd.text())}


def editor_of(key: str, look: Look) -> ValueEditor:
    """Return the editor that fits a key of the recipe."""
    one = KEYS[key]
    if key == "datum_station":
        return StationEditor(key, look)
    if key == "free_air":
        return GradientEditor(key, look)
    free = one.factor is not None and not is_unavailable(key, 1.0)
    if not one.words:
        return NumberEditor(key, look)
    return EitherEditor(key, look) if free else WordEditor(key, look)
