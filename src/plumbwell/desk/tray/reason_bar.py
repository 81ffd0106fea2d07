"""The line over the tray in which a reason is given: for taking readings out or in, or a note.

It asks in place, never in a window of its own, and keeps the last reasons at hand.
"""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeyEvent, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QCompleter, QHBoxLayout, QVBoxLayout, QWidget

from plumbwell.desk.frame.body import MARGIN
from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import WORD_PAD, Caption, Field, Word
from plumbwell.desk.settings import Settings
from plumbwell.plates.painting import hairline_across, painting

REASONS = "reasons"
MOST_REASONS = 12
MOST_LINES = 4


class ReasonBar(QWidget):
    """A question, a field for the reason, and the words that do it or let it be.

    Signals
    -------
    closed
        The question was answered or let be.
    """

    closed = Signal()

    def __init__(self, look: Look, settings: Settings, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look, self._settings = look, settings
        self._act: Callable[[str], str | None] | None = None
        self._question = Caption("", look, self, face="emphasis")
        self.field = Field(look, self)
        # Under the field, so that neither is shortened by the other.
        self.wrong = Caption("", look, self, face="small", role="brick", lines=MOST_LINES)
        self.do = Word("Do it", look, self)
        self.leave = Word("Cancel", look, self)
        column = QVBoxLayout(self)
        row = QHBoxLayout()
        # On the edges of ledger and plots; a word has room for its focus frame beside it.
        column.setContentsMargins(MARGIN, 4, MARGIN - WORD_PAD, 4)
        column.setSpacing(0)
        row.setSpacing(12)
        row.addWidget(self._question)
        row.addWidget(self.field, 1)
        row.addWidget(self.do)
        row.addWidget(self.leave)
        column.addLayout(row)
        column.addWidget(self.wrong)
        look.changed.connect(self._fit)
        self.field.returnPressed.connect(self._answer)
        self.do.clicked.connect(self._answer)
        self.leave.clicked.connect(self.let_be)
        self.field.textEdited.connect(lambda _: self._say_wrong(""))
        self.hide()

    def ask(self, question: str, words: str, act: Callable[[str], str | None], *, text: str = "") -> None:
        """Ask for a reason.

        Parameters
        ----------
        question : str
            "Leave out 3 readings, because:".
        words : str
            The word that does it.
        act : callable
            Given the reason; returns None, or why it cannot be.
        text : str
            What stands in the field at first.
        """
        self._act = act
        self._question.say(question)
        self.field.setAccessibleName(question)
        self.do.setText(words)
        self.field.setText(text)
        completer = QCompleter(self._settings.texts(REASONS), self.field)
        completer.setCaseSensitivity(Qt.CaseSensitivity.CaseInsensitive)
        self.field.setCompleter(completer)
        self._say_wrong("")
        self.show()
        self.field.setFocus(Qt.FocusReason.OtherFocusReason)
        self.field.selectAll()

    def let_be(self) -> None:
        """Close without doing anything."""
        self._act = None
        self.hide()
        self.closed.emit()

    def _say_wrong(self, words: str) -> None:
        self.wrong.say(words)
        self.wrong.setVisible(bool(words))
        self._fit()

    def _fit(self) -> None:
        width = max(self.width() - 2 * MARGIN + WORD_PAD, 1)
        self.wrong.setFixedHeight(self.wrong.height_for(width))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._fit()

    def _answer(self) -> None:
        reason = self.field.text().strip()
        if self._act is None:
            return
        wrong = self._act(reason)
        if wrong is not None:
            self._say_wrong(wrong)
            return
        if reason:
            before = [one for one in self._settings.texts(REASONS) if one != reason]
            self._settings[REASONS] = [reason, *before][:MOST_REASONS]
        self.let_be()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Escape:
            self.let_be()
        else:
            super().keyPressEvent(event)

    def paintEvent(self, event: QPaintEvent) -> None:
        painter: QPainter
        with painting(self) as painter:
            hairline_across(painter, MARGIN, self.width() - MARGIN, 0, self._look.theme.colour("rule"))
