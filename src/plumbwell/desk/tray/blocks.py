"""Lists of text blocks, one of them the current one: what the docket and the problems of a folder are shown in.

A block has painted lines and action words. The current one has the accent bar and may say more. What is below the
lower edge is counted there ("3 more"), and no line is cut through.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QEvent, QRectF, Qt, Signal
from PySide6.QtGui import QEnterEvent, QFocusEvent, QKeyEvent, QMouseEvent, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QScrollArea, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import ENTER_KEYS, LINE, Word, draw_focus
from plumbwell.plates.lettering import draw_text, elided, text_width, wrapped
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import draw_mark, hairline_across, hairline_down, painting
from plumbwell.plates.theme import Theme

FIRST_BASELINE, AFTER_LAST, BAR_TO_END, HAIR_TO_END = 17, 17, 8, 4
MARK_X, WORDS_X = 15, 30
BAR = 3
BETWEEN_WORDS = 20
MORE_HEIGHT = 28


@dataclass(frozen=True, slots=True, kw_only=True)
class BlockLine:
    """One painted line of a block.

    Parameters
    ----------
    words, face, role : str
    inset : float
        How far the words are set in, px of the unscaled design.
    lead : str
        Small muted word before them, where they are set in.
    """

    words: str
    face: str = "text"
    role: str = "ink"
    inset: float = 0
    lead: str = ""


def shortened(theme: Theme, face: str, words: str, width: float, most: int | None) -> list[str]:
    """Return words broken into at most `most` lines of a width in px, the last one shortened; None: all lines.

    A word longer than a line goes on in the next one, so that nothing is lost where all lines are wanted.
    """
    pieces = [piece for word in words.split(" ") for piece in _in_lines(theme, face, word, width)]
    lines = wrapped(theme, face, " ".join(pieces), width)
    if most is None or len(lines) <= most:
        return lines
    return [*lines[: most - 1], elided(theme, face, " ".join(lines[most - 1 :]), width)]


def _in_lines(theme: Theme, face: str, word: str, width: float) -> list[str]:
    """A word in pieces that a line holds; the word itself where it fits."""
    pieces = []
    while len(word) > 1 and text_width(theme, face, word) > width:
        low, high = 1, len(word) - 1
        while low < high:
            middle = (low + high + 1) // 2
            low, high = (middle, high) if text_width(theme, face, word[:middle]) <= width else (low, middle - 1)
        pieces.append(word[:low])
        word = word[low:]
    return [*pieces, word]


class Block(QWidget):
    """One block: a mark, lines, action words. Subclasses say the lines (`lines_of`).

    Parameters
    ----------
    look : Look
    mark : str
        Kind of mark ("error", "look", "note"), or "" for none.
    words : sequence of Word
        Actions, shown under the lines from left to right.
    """

    chosen = Signal()
    entered = Signal()

    def __init__(self, look: Look, *, mark: str = "", words: Sequence[Word] = ()) -> None:
        super().__init__()
        self.look = look
        self.mark = mark
        self.words = tuple(words)
        self.current = False
        self.cut = 1 << 20
        for word in self.words:
            word.setParent(self)
        self.setFocusPolicy(Qt.FocusPolicy.ClickFocus)
        self.become(current=False)

    def lines_of(self, width: float) -> list[BlockLine]:
        """Return the lines in a width in px; fewer where the block is not the current one."""
        raise TypeError("a block without lines")

    def become(self, *, current: bool) -> None:
        """Be the current block, or no longer: only the current one and its words are reached by Tab."""
        self.current = current
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus if current else Qt.FocusPolicy.ClickFocus)
        for word in self.words:
            word.setFocusPolicy(Qt.FocusPolicy.StrongFocus if current else Qt.FocusPolicy.NoFocus)

    def _words_width(self) -> float:
        return self.width() - self.look.theme.px(WORDS_X)

    def height_for(self, width: int) -> int:
        """Return the height in px that the block takes in a width."""
        theme = self.look.theme
        count = len(self.lines_of(width - theme.px(WORDS_X))) + (1 if self.words else 0)
        return theme.px(FIRST_BASELINE) + max(count - 1, 0) * theme.px(LINE) + theme.px(AFTER_LAST)

    def place_words(self) -> None:
        """Put the action words under the lines; what lies beyond the cut is hidden."""
        theme = self.look.theme
        baseline = theme.px(FIRST_BASELINE) + len(self.lines_of(self._words_width())) * theme.px(LINE)
        x = float(theme.px(WORDS_X))
        for word in self.words:
            word.stand_at(x=x, baseline=baseline)
            word.setVisible(baseline + theme.px(5) <= self.cut)
            x += word.width() + theme.px(BETWEEN_WORDS)

    def cut_at(self, y: int) -> None:
        """Paint nothing below `y`, in px of the block."""
        if y != self.cut:
            self.cut = y
            self.place_words()
            self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        self.place_words()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self.chosen.emit()

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        self.entered.emit()

    def enterEvent(self, event: QEnterEvent) -> None:
        self.update()

    def leaveEvent(self, event: QEvent) -> None:
        self.update()

    def focusInEvent(self, event: QFocusEvent) -> None:
        self.chosen.emit()
        self.update()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        left, bottom = theme.px(WORDS_X), min(self.height() - theme.px(BAR_TO_END), self.cut)
        with painting(self) as painter:
            if self.underMouse() and not self.current:
                painter.fillRect(QRectF(0, 1, self.width(), bottom - 1), theme.colour("sunk"))
            if self.current:
                hairline_down(painter, 0, 1, bottom, theme.colour("accent"), theme.px(BAR))
            baseline = theme.px(FIRST_BASELINE)
            if self.mark and baseline + theme.px(5) <= self.cut:
                draw_mark(painter, theme, self.mark, x=theme.px(MARK_X), y=baseline - theme.px(4.5))
            for line in self.lines_of(self._words_width()):
                if baseline + theme.px(5) > self.cut:
                    break
                x = left + theme.px(line.inset)
                if line.lead:
                    room = (left, x)
                    draw_text(
                        painter, theme, line.lead, x=left, baseline=baseline, face="small", role="muted", room=room
                    )
                draw_text(
                    painter,
                    theme,
                    line.words,
                    x=x,
                    baseline=baseline,
                    face=line.face,
                    role=line.role,
                    room=(x, self.width()),
                )
                baseline += theme.px(LINE)
            hair = self.height() - theme.px(HAIR_TO_END)
            if hair < self.cut:
                hairline_across(painter, left, self.width(), hair, theme.colour("hair"))
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(0, 1, self.width(), bottom - 1))


class BlockList(QScrollArea):
    """Blocks under one another. Up and Down walk, Home and End go to the ends, Return enters the current one.

    Signals
    -------
    current_changed
        Another block is the current one; its number.
    entered
        The current block was entered by Return or a double click; its number.
    """

    current_changed = Signal(int)
    entered = Signal(int)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.blocks: list[Block] = []
        self.current = -1
        self.setFrameShape(QScrollArea.Shape.NoFrame)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self._sheet = QWidget()
        self.setWidget(self._sheet)
        self._strip = QWidget(self)
        self._strip.setAutoFillBackground(True)
        self._more = Word("", look, self._strip)
        self._more.clicked.connect(self.show_more)
        self.verticalScrollBar().valueChanged.connect(self._cut)
        look.changed.connect(self.arrange)

    def set_blocks(self, blocks: Sequence[Block], *, current: int = 0) -> None:
        """Show other blocks; the one numbered `current` becomes the current one."""
        focused = any(block.hasFocus() or block.isAncestorOf(self.focusWidget() or self) for block in self.blocks)
        for old in self.blocks:
            old.setParent(None)
            old.deleteLater()
        self.blocks = list(blocks)
        self.current = -1
        for index, block in enumerate(self.blocks):
            block.setParent(self._sheet)
            block.chosen.connect(lambda index=index: self.choose(index))
            block.entered.connect(lambda index=index: self.entered.emit(index))
            block.show()
        self.verticalScrollBar().setValue(0)
        self.choose(min(current, len(self.blocks) - 1))
        if focused and self.blocks:
            self.blocks[self.current].setFocus()
        self.arrange()

    def choose(self, index: int) -> None:
        """Make a block the current one and bring it into view."""
        if not 0 <= index < len(self.blocks) or index == self.current:
            return
        for number_, block in enumerate(self.blocks):
            if block.current or number_ == index:
                block.become(current=number_ == index)
                block.update()
        self.current = index
        self.arrange()
        self._bring(index)
        self.current_changed.emit(index)

    def _bring(self, index: int) -> None:
        block, bar = self.blocks[index], self.verticalScrollBar()
        base = block.y() + block.height() + (self._strip.height() if index + 1 < len(self.blocks) else 0)
        if base > bar.value() + self.viewport().height():
            bar.setValue(base - self.viewport().height())
        if block.y() < bar.value():
            bar.setValue(block.y())

    def focusInEvent(self, event: QFocusEvent) -> None:
        # Who wants the list wants the current block: there the frame is seen.
        if self.blocks:
            self.blocks[self.current].setFocus(event.reason())

    def keyPressEvent(self, event: QKeyEvent) -> None:
        steps = {
            Qt.Key.Key_Up: self.current - 1,
            Qt.Key.Key_Down: self.current + 1,
            Qt.Key.Key_Home: 0,
            Qt.Key.Key_End: len(self.blocks) - 1,
        }
        if event.key() in ENTER_KEYS and self.current >= 0:
            self.entered.emit(self.current)
        elif event.key() in steps and self.blocks:
            self.choose(min(max(steps[Qt.Key(event.key())], 0), len(self.blocks) - 1))
            self.blocks[self.current].setFocus(Qt.FocusReason.OtherFocusReason)
        else:
            super().keyPressEvent(event)

    def arrange(self) -> None:
        """Set the blocks under one another in the present width."""
        # The bar's room is kept free in any case, so that lines do not break anew when it comes.
        width = max(self.width() - self.verticalScrollBar().sizeHint().width(), self.look.theme.px(80))
        y = 0
        for block in self.blocks:
            height = block.height_for(width)
            block.setGeometry(0, y, width, height)
            block.place_words()
            y += height
        self._sheet.resize(width, y)
        self._strip.setFixedHeight(self.look.theme.px(MORE_HEIGHT))
        self._cut()

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.arrange()

    def hidden_below(self) -> int:
        """Return how many blocks begin below the lower edge."""
        view = self.viewport().height()
        bottom = self.verticalScrollBar().value() + view
        if self._sheet.height() <= bottom:
            return 0
        bottom -= self._strip.height()
        least = self.look.theme.px(FIRST_BASELINE + 5)
        return sum(1 for block in self.blocks if block.y() + least > bottom)

    def show_more(self) -> None:
        """Scroll so that the first block that begins below the lower edge stands at the top."""
        hidden = self.hidden_below()
        if hidden:
            self.verticalScrollBar().setValue(self.blocks[-hidden].y())

    def _cut(self) -> None:
        hidden, view = self.hidden_below(), self.viewport().height()
        self._strip.setVisible(bool(hidden))
        base = self.verticalScrollBar().value() + view
        if hidden:
            theme = self.look.theme
            self._more.setText(f"{number(float(hidden), 0)} more")
            self._strip.setGeometry(0, view - self._strip.height(), self._sheet.width(), self._strip.height())
            self._more.stand_at(x=theme.px(WORDS_X), baseline=theme.px(19))
            base -= self._strip.height()
        for block in self.blocks:
            # Lines that the strip would cut through are left out; at the window's own edge they are clipped.
            block.cut_at(base - block.y() if hidden else 1 << 20)
