"""What is wrong with a folder that cannot be read: every problem in words, and its row as it stands in the file.

Shown in place of ledger and tracks. A plain message (a survey that cannot be reduced, a folder that is gone) stands
on the same page. Nothing is written; files are read again when a row is shown.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from PySide6.QtCore import QRectF, Signal
from PySide6.QtGui import QGuiApplication, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.opening.file_excerpt import ExcerptLine, elided_around, file_excerpt
from plumbwell.desk.parts.words import LINE, WORD_PAD, Caption, Word
from plumbwell.desk.tray.blocks import WORDS_X, Block, BlockLine, BlockList, shortened
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.numbers import counted, number
from plumbwell.plates.painting import draw_mark, hairline_across, painting
from plumbwell.survey.errors import InputError, PlumbwellError, Problem, SurveyError

HEADING_BASELINE, RULE, LIST_TOP = 26, 40, 50
LIST_SHARE = 0.52
BETWEEN = 32
KIND_WIDTH = 66
MOST_BLOCKS = 300
"""Problems that are listed; more help nobody, and "Copy the list" holds them all."""

MOST_CHARACTERS = 400


def place_of(problem: Problem) -> str:
    """Return where a problem is: file, row, column."""
    row = f"row {problem.row}" if problem.row is not None else None
    return ", ".join(part for part in (problem.file, row, problem.column) if part is not None)


def list_text(problems: Sequence[Problem]) -> str:
    """Return problems as plain text, one paragraph each."""
    return "\n\n".join(
        f"{place_of(one)}\n  found: {one.found}\n  expected: {one.expected}\n  to mend: {one.mend}" for one in problems
    )


def message_of(error: Exception) -> tuple[str, str]:
    """Return heading and text for an error that is no list of problems."""
    if isinstance(error, SurveyError):
        return "This survey cannot be reduced yet", f"{str(error).rstrip('.')}."
    heading = "This folder cannot be read yet"
    if isinstance(error, PlumbwellError):
        return heading, f"{str(error).rstrip('.')}."
    if isinstance(error, OSError):
        where = f"{error.filename}: " if error.filename is not None else ""
        return heading, f"{where}{error.strerror or type(error).__name__}."
    if isinstance(error, MemoryError):
        return heading, "There is not enough memory for this survey."
    return heading, f"An unforeseen error stopped the reading ({type(error).__name__}); this is a fault of the program."


class ProblemBlock(Block):
    """One problem: where, what was found, what is expected, how to mend it."""

    def __init__(self, look: Look, problem: Problem) -> None:
        self.problem = problem
        super().__init__(look, mark="error")
        self.setAccessibleName(place_of(problem))
        self.setAccessibleDescription(f"found: {problem.found}; expected: {problem.expected}; to mend: {problem.mend}")

    def lines_of(self, width: float) -> list[BlockLine]:
        """Return the lines: the place, then the parts, each with its name before its first line."""
        theme, one = self.look.theme, self.problem
        inset = theme.px(KIND_WIDTH)
        lines = [
            BlockLine(words=words, face="emphasis")
            for words in shortened(theme, "emphasis", place_of(one), width, None)
        ]
        for kind, words in (("found", one.found), ("expected", one.expected), ("to mend", one.mend)):
            for index, part in enumerate(shortened(theme, "text", words, width - inset, None)):
                lines.append(BlockLine(words=part, inset=KIND_WIDTH, lead="" if index else kind))
        return lines


class Excerpt(QWidget):
    """The lines around a problem, with their numbers; the wrong cell in brick."""

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.title = ""
        self.lines: tuple[ExcerptLine, ...] = ()
        self.message = ""
        look.changed.connect(self.update)

    def show_problem(self, folder: Path, problem: Problem) -> None:
        """Read the lines around a problem and show them."""
        self.title = place_of(problem)
        self.lines, self.message = (), ""
        try:
            self.lines = file_excerpt(folder, problem)
        except OSError as error:
            self.message = f"The file cannot be read: {error.strerror or type(error).__name__}."
        else:
            if problem.row is None:
                self.message = "This concerns the whole file." if problem.file else ""
            elif not self.lines:
                self.message = "The file has changed since: it has no such row any more."
        self.setAccessibleName(f"As it stands in the file: {self.title}")
        spoken = [f"row {line.number}: {line.text[:MOST_CHARACTERS]}" for line in self.lines if line.marked]
        self.setAccessibleDescription(self.message or " ".join(spoken))
        self.update()

    def clear(self) -> None:
        """Show nothing."""
        self.title, self.lines, self.message = "", (), ""
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        if not self.title:
            return
        with painting(self) as painter:
            baseline = theme.px(17)
            draw_text(painter, theme, self.title, x=0, baseline=baseline, face="emphasis", room=(0, self.width()))
            baseline += theme.px(LINE + 7)
            if self.message:
                draw_text(painter, theme, self.message, x=0, baseline=baseline, role="muted", room=(0, self.width()))
            widest = max((text_width(theme, "small", str(line.number)) for line in self.lines), default=0.0)
            numbers, left = theme.px(16) + widest, theme.px(16) + widest + theme.px(14)
            for line in self.lines:
                wrong = line.marked is not None
                if wrong:
                    painter.fillRect(
                        QRectF(0, baseline - theme.px(17), self.width(), theme.px(24)), theme.colour("sunk")
                    )
                    draw_mark(painter, theme, "error", x=theme.px(6), y=baseline - theme.px(4.5))
                draw_text(
                    painter,
                    theme,
                    str(line.number),
                    x=numbers,
                    baseline=baseline,
                    face="small",
                    role="ink" if wrong else "muted",
                    align="right",
                )
                self._paint_line(painter, line, left, baseline)
                baseline += theme.px(24)

    def _paint_line(self, painter: QPainter, line: ExcerptLine, left: float, baseline: float) -> None:
        theme, right = self.look.theme, float(self.width())
        # The other lines are cut about the same place as the wrong one, so that columns are seen together.
        at = next((one.marked[0] for one in self.lines if one.marked is not None), 0)
        span = line.marked or (min(at, len(line.text)),) * 2
        faces = ("text", "emphasis", "text")

        def width(most: int) -> float:
            pieces = elided_around(line.text, span, most)
            return sum(text_width(theme, face, piece) for face, piece in zip(faces, pieces, strict=True))

        low, high = 1, min(len(line.text), MOST_CHARACTERS) + 2
        while low < high:
            middle = (low + high + 1) // 2
            low, high = (middle, high) if width(middle) <= right - left - 2 else (low, middle - 1)
        x, role = left, "ink" if line.marked else "muted"
        for face, piece in zip(faces, elided_around(line.text, span, low), strict=True):
            shade = "brick" if face == "emphasis" else role
            draw_text(painter, theme, piece, x=x, baseline=baseline, face=face, role=shade, room=(x, right))
            end = x + text_width(theme, face, piece)
            if face == "emphasis" and piece:
                hairline_across(painter, x, end, baseline + 3, theme.colour("brick"))
            x = end


class Problems(QWidget):
    """The page of a folder that cannot be read, or of one plain message.

    Up and Down walk from problem to problem; the row of the current one is shown at the right, and Return reads it
    again.

    Signals
    -------
    read_again
        The folder is to be read again.
    """

    read_again = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.folder = Path()
        self.problems: tuple[Problem, ...] = ()
        self.heading = Caption("", look, self, face="heading")
        self.message = Caption("", look, self, lines=20)
        self.more = Caption("", look, self, role="muted")
        self.list = BlockList(look, self)
        self.excerpt = Excerpt(look, self)
        self.again = Word("Read again", look, self)
        self.again.clicked.connect(self.read_again)
        self.copy = Word("Copy the list", look, self)
        self.copy.clicked.connect(self._copy)
        self.list.current_changed.connect(self._show)
        self.list.entered.connect(self._show)
        self.setFocusProxy(self.list)
        look.changed.connect(self._arrange)

    def show_error(self, folder: Path, error: Exception) -> None:
        """Show why a folder could not be opened, whatever the error: its problems, or a sentence."""
        if isinstance(error, InputError):
            self.set_problems(error, folder)
        else:
            self.set_message(*message_of(error))

    def set_problems(self, error: InputError, folder: Path) -> None:
        """Show what is wrong with a folder.

        Parameters
        ----------
        error : InputError
        folder : Path
            The survey folder, to which the files of the problems are relative.
        """
        count = counted(len(error.problems), "problem")
        self._head(f"This folder cannot be read yet: {count}", "")
        self.folder, self.problems = folder, error.blocks
        left = len(self.problems) - MOST_BLOCKS
        self.more.say(f"and {number(float(left), 0)} more: the copied list holds them all" if left > 0 else "")
        self.list.set_blocks([ProblemBlock(self.look, one) for one in self.problems[:MOST_BLOCKS]])
        self.list.setAccessibleName(f"Problems, {count}")
        self._arrange()

    def set_message(self, heading: str, text: str) -> None:
        """Show one plain message."""
        self._head(heading, text)
        self.problems = ()
        self.more.say("")
        self.list.set_blocks(())
        self.excerpt.clear()
        self._arrange()

    def _head(self, heading: str, text: str) -> None:
        self.heading.say(heading)
        self.message.say(text)
        self.setAccessibleName(heading)
        self.setAccessibleDescription(text)

    def _show(self, index: int) -> None:
        self.excerpt.show_problem(self.folder, self.problems[index])

    def _copy(self) -> None:
        QGuiApplication.clipboard().setText(list_text(self.problems))

    def _arrange(self) -> None:
        theme, listed = self.look.theme, bool(self.problems)
        for widget in (self.list, self.excerpt, self.copy):
            widget.setVisible(listed)
        self.message.setVisible(not listed)
        self.more.setVisible(bool(self.more.words))
        x = self.width()
        for word in (self.copy, self.again) if listed else (self.again,):
            x -= word.sizeHint().width()
            word.stand_at(x=x + WORD_PAD, baseline=theme.px(HEADING_BASELINE))
            x -= theme.px(18)
        top, line = theme.px(LIST_TOP), theme.px(LINE)
        self.heading.setGeometry(0, theme.px(HEADING_BASELINE) - theme.px(20), max(x, 0), theme.px(27))
        self.message.setGeometry(0, top, min(self.width(), theme.px(720)), max(self.height() - top, 0))
        base = self.height() - (line + theme.px(6) if self.more.words else 0)
        width = round((self.width() - theme.px(BETWEEN)) * LIST_SHARE)
        self.list.setGeometry(0, top, width, max(base - top, 0))
        self.more.setGeometry(theme.px(WORDS_X), base + theme.px(2), max(width - theme.px(WORDS_X), 0), line)
        left = width + theme.px(BETWEEN)
        self.excerpt.setGeometry(left, top, max(self.width() - left, 0), max(self.height() - top, 0))
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._arrange()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        with painting(self) as painter:
            hairline_across(painter, 0, self.width(), theme.px(RULE), theme.colour("ink"))
