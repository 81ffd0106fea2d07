"""The panel of the Handover stage: where the outputs go, written with progress; the findings that go with them.

Asks for nothing but a folder. What is written is what the command line writes.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from PySide6.QtCore import Qt, QUrl, Signal
from PySide6.QtGui import QDesktopServices, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QFileDialog, QHBoxLayout, QScrollArea, QVBoxLayout, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.words import WORD_PAD, Caption, Field, MainAction, Word, middle_baseline
from plumbwell.desk.tray.docket_page import place_words
from plumbwell.plates.axis import head_height, title_baseline, unit_baseline
from plumbwell.plates.numbers import counted
from plumbwell.plates.painting import draw_mark, hairline_across, painting
from plumbwell.study.cautions import CAUTIONS
from plumbwell.study.finding import Finding

MOST_LINES = 12
CAUTION_PAD = 10
WIDEST = 680
"""Widest column of words, px of the unscaled design; longer lines are hard to follow."""


class Marked(QWidget):
    """A finding in words with its mark before it."""

    def __init__(self, finding: Finding, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look, self._severity = look, finding.severity
        self.place = Caption(place_words(finding), look, self, face="emphasis")
        self.text = Caption(finding.text, look, self, lines=MOST_LINES)
        self.setAccessibleName(f"{finding.severity}: {place_words(finding)}: {finding.text}")
        look.changed.connect(self._lay)

    def _lay(self) -> None:
        left = self._look.theme.px(24)
        width = max(self.width() - left, 40)
        line, high = self.place.line, self.text.height_for(width)
        self.place.setGeometry(left, 4, width, line)
        self.text.setGeometry(left, 4 + line, width, high)
        self.setFixedHeight(8 + line + high)

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            draw_mark(painter, theme, self._severity, x=theme.px(9), y=4 + self.place.line / 2)
            hairline_across(painter, 0, self.width(), self.height() - 1, theme.colour("hair"))


class Text(Caption):
    """Running text that is as high as its lines."""

    def __init__(self, words: str, look: Look, parent: QWidget | None = None, *, role: str = "ink") -> None:
        super().__init__(words, look, parent, role=role, lines=40)

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.setFixedHeight(self.height_for(self.width()))

    def say(self, words: str, role: str | None = None) -> None:
        """Show other words, in another role where one is given."""
        super().say(words, role)
        if self.width() > 0:
            self.setFixedHeight(self.height_for(self.width()))


class Caution(QWidget):
    """The cautions that go with every output, framed by rules above and below."""

    def __init__(self, words: str, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look = look
        self.text = Text(words, look)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, CAUTION_PAD, 0, CAUTION_PAD)
        column.addWidget(self.text)

    def paintEvent(self, event: QPaintEvent) -> None:
        ink = self._look.theme.colour("ink")
        with painting(self) as painter:
            hairline_across(painter, 0, self.width(), 0, ink)
            hairline_across(painter, 0, self.width(), self.height() - 1, ink)


class HandoverPanel(QWidget):
    """Where the outputs go, and what is said with them.

    Signals
    -------
    write_wanted(str)
        The folder into which the outputs shall be written.
    copy_wanted(str)
        The folder into which a copy of the survey folder shall be written.
    finding_chosen(Finding)
    """

    write_wanted = Signal(str)
    copy_wanted = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._look = look
        self._written: Path | None = None
        self._title = Caption("Write the outputs", look, self, face="emphasis")
        self._under_title = Caption(
            "the files at the left, as plumbwell reduce writes them", look, self, face="small", role="muted"
        )
        self._folder_title = Caption("into the folder", look, self, face="small", role="muted")
        self.folder = Field(look, self)
        self.folder.setAccessibleName("Folder for the outputs")
        self.choose = Word("Choose a folder", look, self)
        self.write = MainAction("Write", look, self)
        self.said = Text("", look, self, role="muted")
        self.show_folder = Word("Show the folder", look, self)
        self.copy = Word("Save a copy as survey folder", look, self)
        self._copy_text = Text(
            "The files as they were measured, with what you left out, notes, tares and recipe in them; it reduces to "
            "the same numbers.",
            look,
            self,
            role="muted",
        )
        self._findings_title = Caption("", look, self, face="emphasis")
        self._findings = QVBoxLayout()
        self._cautions = Caution(" ".join(CAUTIONS), look, self)
        self._copy_title = Caption("Or keep the survey itself", look, self, face="emphasis")
        inner = self._inner = QWidget()
        column = QVBoxLayout(inner)
        column.setContentsMargins(0, 12, 16, 12)
        column.setSpacing(4)
        line = QHBoxLayout()
        line.setSpacing(12)
        line.addWidget(self.folder, 1)
        line.addWidget(self.choose)
        acts = QHBoxLayout()
        acts.setSpacing(20)
        acts.addWidget(self.write)
        acts.addWidget(self.show_folder)
        acts.addStretch(1)
        column.addWidget(self._folder_title)
        column.addLayout(line)
        column.addSpacing(12)
        column.addLayout(acts)
        column.addWidget(self.said)
        column.addSpacing(12)
        column.addWidget(self._cautions)
        column.addSpacing(16)
        column.addWidget(self._findings_title)
        column.addLayout(self._findings)
        column.addSpacing(16)
        column.addWidget(self._copy_title)
        column.addWidget(self._copy_text)
        kept = QHBoxLayout()
        # A word has room for its focus frame, and stands with its letters on the edge of the column.
        kept.setContentsMargins(-WORD_PAD, 0, 0, 0)
        kept.addWidget(self.copy)
        kept.addStretch(1)
        column.addLayout(kept)
        column.addStretch(1)
        self.said.hide()
        self._area = QScrollArea(self)
        self._area.setWidget(inner)
        self._area.setWidgetResizable(True)
        self._area.setFrameShape(QScrollArea.Shape.NoFrame)
        self._area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self._area.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.choose.clicked.connect(self._choose)
        self.write.clicked.connect(lambda: self.write_wanted.emit(self.folder.text().strip()))
        self.folder.returnPressed.connect(lambda: self.write_wanted.emit(self.folder.text().strip()))
        self.show_folder.clicked.connect(self._show_folder)
        self.copy.clicked.connect(self.choose_copy)
        self.show_folder.hide()
        look.changed.connect(self._lay)

    def set_folder(self, folder: Path) -> None:
        """Propose a folder."""
        self.folder.setText(str(folder))

    def set_findings(self, findings: Sequence[Finding]) -> None:
        """Show the findings that stand in the summary: errors and what wants a look; notes are counted."""
        while (item := self._findings.takeAt(0)) is not None:
            widget = item.widget()
            if widget is not None:
                widget.deleteLater()
        graver = [one for one in findings if one.severity != "note"]
        notes = len(findings) - len(graver)
        title = counted(len(graver), "open finding") if graver else "No open finding"
        self._findings_title.say(f"{title}, {counted(notes, 'note')}, in summary.json" if notes else title)
        for finding in graver:
            self._findings.addWidget(Marked(finding, self._look, self))

    def say(self, words: str, *, wrong: bool = False, written: Path | None = None) -> None:
        """Tell how writing went; `written` is the folder that can be shown."""
        self._written = written
        self.said.say(words, "brick" if wrong else "muted")
        self.said.setVisible(bool(words))
        self.show_folder.setVisible(written is not None)

    def _choose(self) -> None:
        chosen = QFileDialog.getExistingDirectory(self, "Folder for the outputs", self.folder.text())
        if chosen:
            self.folder.setText(chosen)

    def choose_copy(self) -> None:
        """Ask where a copy of the survey folder shall be, and tell it."""
        chosen, _ = QFileDialog.getSaveFileName(self, "Save a copy as survey folder", self.folder.text() + "_copy")
        if chosen:
            self.copy_wanted.emit(chosen)

    def _show_folder(self) -> None:
        if self._written is not None:
            QDesktopServices.openUrl(QUrl.fromLocalFile(str(self._written)))

    def _lay(self) -> None:
        theme = self._look.theme
        top = head_height(theme)
        for caption, baseline in ((self._title, title_baseline(theme)), (self._under_title, unit_baseline(theme))):
            middle = middle_baseline(theme, caption.face, caption.line)
            caption.setGeometry(0, baseline - middle, self.width(), caption.line)
        self._area.setGeometry(0, top, self.width(), self.height() - top)
        self._inner.setMaximumWidth(theme.px(WIDEST))
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            hairline_across(painter, 0, self.width(), head_height(theme) - 1, theme.colour("ink"))
