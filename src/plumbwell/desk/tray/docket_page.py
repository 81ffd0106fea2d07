"""The docket: the findings of the survey, gravest first, each with its place and a word that goes there."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from PySide6.QtCore import Signal
from PySide6.QtGui import QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import Word
from plumbwell.desk.tray.blocks import FIRST_BASELINE, Block, BlockLine, BlockList, shortened
from plumbwell.plates.lettering import draw_text
from plumbwell.plates.numbers import counted
from plumbwell.plates.painting import painting
from plumbwell.study.finding import Finding
from plumbwell.survey.recipe import KEYS

GRAVEST_FIRST = ("error", "look", "note")
SPOKEN = {"error": "error", "look": "wants a look", "note": "note"}
SHORT_LINES = 2
WIDEST = 720
"""Widest line of words, px of the unscaled design; longer ones are hard to follow."""

EMPTY = "Nothing wants your eye."


def recipe_key_of(finding: Finding) -> str | None:
    """Return the key of the recipe that a finding is about, or None where it is about something else."""
    where, _, key = finding.place.partition(", ")
    return key if where == "recipe" and key in KEYS else None


def place_words(finding: Finding) -> str:
    """Return the place of a finding as people read it: a setting of the recipe by its label."""
    key = recipe_key_of(finding)
    return finding.place if key is None else f"Recipe, {KEYS[key].label}"


def has_place(finding: Finding) -> bool:
    """Return whether a finding leads somewhere: to stations, intervals, readings or a key of the recipe."""
    return bool(finding.stations or finding.intervals or finding.rows or recipe_key_of(finding))


class FindingBlock(Block):
    """One finding; the current one shows all its words and what can be done about it."""

    def __init__(self, look: Look, finding: Finding, *, can_go: bool) -> None:
        self.finding = finding
        self.go = Word("Go there", look)
        super().__init__(look, mark=finding.severity, words=(self.go,) if can_go else ())
        self.go.setAccessibleName(f"Go there: {place_words(finding)}")
        self.setAccessibleName(f"{SPOKEN[finding.severity]}: {place_words(finding)}")
        self.setAccessibleDescription(f"{finding.text} {finding.mend}")

    def lines_of(self, width: float) -> list[BlockLine]:
        """Return place and words; of a block that is not the current one, one line and two."""
        theme, one = self.look.theme, self.finding
        width = min(width, theme.px(WIDEST))
        places = shortened(theme, "emphasis", place_words(one), width, None if self.current else 1)
        texts = shortened(theme, "text", one.text, width, None if self.current else SHORT_LINES)
        mends = shortened(theme, "text", one.mend, width, None) if self.current else []
        return [
            *(BlockLine(words=words, face="emphasis") for words in places),
            *(BlockLine(words=words) for words in texts),
            *(BlockLine(words=words, role="muted") for words in mends),
        ]


class DocketPage(QWidget):
    """The page of the findings.

    Up and Down walk from finding to finding, Return goes to the place of the current one.

    Signals
    -------
    go_there
        The person wants to see the place of a finding; the finding.
    """

    go_there = Signal(object)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.look = look
        self.findings: tuple[Finding, ...] = ()
        self._can_go: Callable[[Finding], bool] = has_place
        self.list = BlockList(look, self)
        self.list.entered.connect(self._go)
        self.setFocusProxy(self.list)
        look.changed.connect(self.update)
        self.set_findings(())

    def set_findings(
        self, findings: Sequence[Finding], *, can_go: Callable[[Finding], bool] = has_place, empty: str = EMPTY
    ) -> None:
        """Show the findings, errors first, then what wants a look, then notes.

        The finding that was the current one stays so while it is among them.

        Parameters
        ----------
        findings : sequence of Finding
        can_go : callable
            Tells whether there is a place to go to; where there is none, no word offers it.
        empty : str
            What stands there where there are none.
        """
        before = self.current
        ordered = sorted(findings, key=lambda one: GRAVEST_FIRST.index(one.severity))
        if tuple(ordered) == self.findings and can_go is self._can_go and self.list.blocks:
            return
        self.findings, self._can_go = tuple(ordered), can_go
        blocks = []
        for one in self.findings:
            block = FindingBlock(self.look, one, can_go=can_go(one))
            block.go.clicked.connect(lambda checked=False, one=one: self.go_there.emit(one))
            blocks.append(block)
        same = [index for index, one in enumerate(self.findings) if before and _same(one, before)]
        self.list.setVisible(bool(blocks))
        self.list.set_blocks(blocks, current=same[0] if same else 0)
        words = f"Docket, {counted(len(blocks), 'finding')}"
        self.setAccessibleName(words)
        self.list.setAccessibleName(words)
        self._empty = empty
        self.setAccessibleDescription("" if blocks else empty)
        self.update()

    @property
    def current(self) -> Finding | None:
        """The current finding."""
        return self.findings[self.list.current] if 0 <= self.list.current < len(self.findings) else None

    def _go(self, index: int) -> None:
        if self._can_go(self.findings[index]):
            self.go_there.emit(self.findings[index])

    def resizeEvent(self, event: QResizeEvent) -> None:
        self.list.setGeometry(self.rect())

    def paintEvent(self, event: QPaintEvent) -> None:
        if self.findings:
            return
        theme = self.look.theme
        with painting(self) as painter:
            draw_text(
                painter, theme, self._empty, x=0, baseline=theme.px(FIRST_BASELINE), role="muted",
                room=(0, self.width()),
            )  # fmt: skip


def _same(one: Finding, other: Finding) -> bool:
    """Whether two findings of successive reductions are about the same thing."""
    return (one.code, one.place) == (other.code, other.place)
