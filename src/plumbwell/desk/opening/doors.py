"""What stands in the window when nothing is open: the ways to begin, and the surveys opened before.

It opens nothing itself: it tells which door or which recent survey was chosen. Every way is a button; arrow keys walk
from one to the next.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from PySide6.QtCore import QEvent, QObject, QRectF, Qt, Signal
from PySide6.QtGui import QFontMetricsF, QKeyEvent, QKeySequence, QPainter, QPaintEvent, QResizeEvent, QShortcut
from PySide6.QtWidgets import QAbstractButton, QFrame, QScrollArea, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.opening.samples import SAMPLES
from plumbwell.desk.parts.words import ENTER_KEYS, Word, draw_focus
from plumbwell.plates.lettering import draw_text, face_font, text_width, wrapped
from plumbwell.plates.painting import hairline_across, painting
from plumbwell.plates.theme import Theme

SAMPLE, NEW, OPEN = "sample", "new", "open"
BEGIN, RECENT = "Begin with one of these", "Recent"
NO_RECENT = "Nothing yet. What you open is listed here."
GONE = "not there any more"

MARGIN, COLUMN_GAP, DOORS_SHARE = 16, 62, 0.55
STACKED_BELOW = 600
HEADING, LEAST_HEADING, HEADING_SHARE = 80, 34, 0.105
RULE_BELOW = 21
INDENT = 16
TITLE_AT, SENTENCE_AT, LINE, DOOR_FOOT = 28, 51, 20, 21
WORDS_HEIGHT, WORD_GAP = 26, 20
RECENT_NAME, RECENT_PATH, RECENT_HEIGHT = 22, 40, 52


@dataclass(frozen=True, slots=True, kw_only=True)
class Door:
    """A way to begin: its key, what it is called, what it does in a sentence, and its shortcut."""

    key: str
    title: str
    sentence: str
    shortcut: str


DOORS = (
    Door(
        key=SAMPLE,
        title="Open a sample survey",
        sentence="Two invented surveys with the truth they were made from: a well and a mine shaft.",
        shortcut="Alt+1",
    ),
    Door(
        key=NEW,
        title="Start a survey folder",
        sentence="A small commented folder with invented readings to put your own in.",
        shortcut="Alt+2",
    ),
    Door(
        key=OPEN,
        title="Open a survey folder",
        sentence="Or drop it anywhere on this window.",
        shortcut="Ctrl+O",
    ),
)


class _Row(QAbstractButton):
    """A row that is a button: what it shows is painted by its kind; hovered it is sunk, focused it is framed."""

    def __init__(self, look: Look, parent: QWidget) -> None:
        super().__init__(parent)
        self._look = look

    def draw(self, painter: QPainter, theme: Theme) -> None:
        """Draw what the row shows."""
        raise TypeError(f"{type(self).__name__} shows nothing")

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            inner = QRectF(0, 3, self.width(), self.height() - 7)
            if self.isEnabled() and (self.underMouse() or self.isDown()):
                painter.fillRect(inner, theme.colour("sunk"))
            self.draw(painter, theme)
            hairline_across(painter, 0, self.width(), self.height() - 1, theme.colour("hair"))
            if self.hasFocus():
                draw_focus(painter, theme, inner)

    def enterEvent(self, event: QEvent) -> None:
        self.update()

    def leaveEvent(self, event: QEvent) -> None:
        self.update()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() in ENTER_KEYS:
            self.click()
        else:
            super().keyPressEvent(event)


class DoorRow(_Row):
    """A door: title in accent, its shortcut at the right, its sentence beneath."""

    def __init__(self, door: Door, look: Look, parent: QWidget) -> None:
        super().__init__(look, parent)
        self.door = door
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setAccessibleName(f"{door.title}, {door.shortcut}")
        self.setAccessibleDescription(door.sentence)

    def _lines(self, width: float) -> list[str]:
        theme = self._look.theme
        return wrapped(theme, "text", self.door.sentence, width - 2 * theme.px(INDENT))

    def height_for(self, width: float, lines: int) -> int:
        """Return the height in px that the door takes in a width, with so many lines of words beneath it."""
        return self.last_baseline(width) + lines * self._look.theme.px(WORDS_HEIGHT) + self._look.theme.px(DOOR_FOOT)

    def last_baseline(self, width: float) -> int:
        """Return the baseline of the sentence's last line in a width."""
        theme = self._look.theme
        return theme.px(SENTENCE_AT) + (len(self._lines(width)) - 1) * theme.px(LINE)

    def draw(self, painter: QPainter, theme: Theme) -> None:
        """Draw title, shortcut and sentence."""
        left, right = theme.px(INDENT), self.width() - theme.px(INDENT)
        shortcut = text_width(theme, "small", self.door.shortcut)
        title = (left, right - shortcut - theme.px(WORD_GAP))
        draw_text(
            painter,
            theme,
            self.door.title,
            x=left,
            baseline=theme.px(TITLE_AT),
            face="emphasis",
            role="accent",
            room=title,
        )
        draw_text(
            painter,
            theme,
            self.door.shortcut,
            x=right,
            baseline=theme.px(TITLE_AT),
            face="small",
            role="muted",
            align="right",
        )
        for index, line in enumerate(self._lines(self.width())):
            baseline = theme.px(SENTENCE_AT) + index * theme.px(LINE)
            draw_text(painter, theme, line, x=left, baseline=baseline, room=(left, right))


class RecentRow(_Row):
    """A survey opened before: the name of its folder, and where that lies; disabled when it is gone."""

    def __init__(self, path: str, look: Look, parent: QWidget) -> None:
        super().__init__(look, parent)
        self.path = path
        # os.path answers no where Path raises: in a folder that may not be looked into.
        self.there = os.path.exists(path)
        self.name, self.place = Path(path).name or path, str(Path(path).parent)
        self.setEnabled(self.there)
        self.setAccessibleName(self.name if self.there else f"{self.name}, {GONE}")
        self.setAccessibleDescription(path)
        self.setToolTip(path if self.there else f"{path}\n{GONE}")
        if self.there:
            self.setCursor(Qt.CursorShape.PointingHandCursor)

    def draw(self, painter: QPainter, theme: Theme) -> None:
        """Draw name and place, the latter shortened in the middle."""
        there = self.there
        left, right = 0.0, float(self.width())
        baseline = theme.px(RECENT_NAME)
        if not there:
            box = draw_text(
                painter, theme, GONE, x=right, baseline=baseline, face="small", role="muted", align="right"
            )
            right = box.left() - theme.px(WORD_GAP)
        draw_text(
            painter,
            theme,
            self.name,
            x=left,
            baseline=baseline,
            face="emphasis",
            role="accent" if there else "strong",
            room=(left, right),
        )
        metrics = QFontMetricsF(face_font(theme, "small"))
        place = metrics.elidedText(self.place, Qt.TextElideMode.ElideMiddle, self.width() - 1.0)
        draw_text(
            painter,
            theme,
            place,
            x=left,
            baseline=theme.px(RECENT_PATH),
            face="small",
            role="muted" if there else "strong",
            room=(left, self.width()),
        )


class _Page(QWidget):
    """The sheet that holds doors and recent surveys, as high as they need."""

    def __init__(self, look: Look, area: QScrollArea) -> None:
        super().__init__()
        self._look = look
        self._area = area
        self.doors = [DoorRow(door, look, self) for door in DOORS]
        self.samples = [Word(words, look, self) for words in SAMPLES.values()]
        for button in (*self.doors, *self.samples):
            button.installEventFilter(self)
        self.recent: list[RecentRow] = []
        self._heading = 0
        self._columns = (0.0, 0.0, 0.0, 0.0)
        self._recent_top = 0
        look.changed.connect(self.lay)
        self._order()

    def set_recent(self, paths: Sequence[str]) -> None:
        """Take the folders of surveys opened before."""
        for row in self.recent:
            row.hide()
            row.deleteLater()
        self.recent = [RecentRow(path, self._look, self) for path in paths]
        for row in self.recent:
            row.installEventFilter(self)
            row.show()
        self._order()
        self.lay()

    def _grid(self) -> list[list[QAbstractButton]]:
        """Return what can have the focus, row by row: doors with the sample surveys beneath the first."""
        rows: list[list[QAbstractButton]] = []
        for door in self.doors:
            rows.append([door])
            if door.door.key == SAMPLE:
                rows.append(list(self.samples))
        return rows

    def _order(self) -> None:
        chain: list[QWidget] = [button for row in self._grid() for button in row]
        chain += self.recent
        for before, after in zip(chain, chain[1:], strict=False):
            QWidget.setTabOrder(before, after)

    def lay(self) -> None:
        """Give every row its place, and the page the height that all of them need."""
        theme, width = self._look.theme, float(self.width())
        height = self._area.viewport().height()
        self._heading = min(max(int(height * HEADING_SHARE), theme.px(LEAST_HEADING)), theme.px(HEADING))
        inner, gap = width - 2 * MARGIN, theme.px(COLUMN_GAP)
        stacked = width < theme.px(STACKED_BELOW)
        doors = inner if stacked else float(round((inner - gap) * DOORS_SHARE))
        left = MARGIN if stacked else MARGIN + doors + gap
        self._columns = (MARGIN, MARGIN + doors, left, width - MARGIN)
        y = self._heading + theme.px(RULE_BELOW) + 1
        for row in self.doors:
            lines = self._lay_samples(doors, y + row.last_baseline(doors)) if row.door.key == SAMPLE else 0
            row.setGeometry(MARGIN, y, int(doors), row.height_for(doors, lines))
            y += row.height()
        self._recent_top = y + theme.px(HEADING) // 2 if stacked else self._heading
        below = self._recent_top + theme.px(RULE_BELOW) + 1
        for recent in self.recent:
            recent.setGeometry(int(left), below, int(width - MARGIN - left), theme.px(RECENT_HEIGHT))
            below += recent.height()
        self.setMinimumHeight(max(y, below + theme.px(RECENT_HEIGHT)) + MARGIN)
        self.update()

    def _lay_samples(self, width: float, above: int) -> int:
        """Place the names of the sample surveys beneath a baseline, and return how many lines they take."""
        theme = self._look.theme
        left, right = float(MARGIN + theme.px(INDENT)), MARGIN + width - theme.px(INDENT)
        x, lines = left, 1
        for word in self.samples:
            needed = text_width(theme, "text", word.text())
            if x > left and x + needed > right:
                x, lines = left, lines + 1
            word.stand_at(x=x, baseline=above + lines * theme.px(WORDS_HEIGHT))
            word.raise_()
            x += needed + theme.px(WORD_GAP)
        return lines

    def resizeEvent(self, event: QResizeEvent) -> None:
        self.lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        left, middle, right_left, right = self._columns
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            for words, x, end, baseline in (
                (BEGIN, left, middle, self._heading),
                (RECENT, right_left, right, self._recent_top),
            ):
                draw_text(painter, theme, words, x=x, baseline=baseline, face="heading", room=(x, end))
                hairline_across(painter, x, end, baseline + theme.px(RULE_BELOW), theme.colour("ink"))
            if not self.recent:
                baseline = self._recent_top + theme.px(RULE_BELOW) + theme.px(27)
                for index, line in enumerate(wrapped(theme, "text", NO_RECENT, right - right_left)):
                    draw_text(
                        painter,
                        theme,
                        line,
                        x=right_left,
                        baseline=baseline + index * theme.px(LINE),
                        role="muted",
                        room=(right_left, right),
                    )

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if isinstance(event, QKeyEvent) and event.type() == QEvent.Type.KeyPress:
            steps = {
                Qt.Key.Key_Up: (-1, 0),
                Qt.Key.Key_Down: (1, 0),
                Qt.Key.Key_Left: (0, -1),
                Qt.Key.Key_Right: (0, 1),
            }
            if event.key() in steps and isinstance(watched, QAbstractButton):
                self._walk(watched, *steps[Qt.Key(event.key())])
                return True
        return super().eventFilter(watched, event)

    def _walk(self, button: QAbstractButton, down: int, across: int) -> None:
        """Give the focus to the neighbour of a button: up and down in its column, across to the other one."""
        recent: list[QAbstractButton] = [row for row in self.recent if row.isEnabled()]
        grid = self._grid()
        if button in recent:
            index = recent.index(button) + down
            target = grid[0][0] if across < 0 else recent[min(max(index, 0), len(recent) - 1)]
        else:
            row = next(index for index, buttons in enumerate(grid) if button in buttons)
            place = grid[row].index(button) + across
            if 0 <= place < len(grid[row]):
                target = grid[min(max(row + down, 0), len(grid) - 1)][0] if down else grid[row][place]
            else:
                target = recent[0] if across > 0 and recent else button
        target.setFocus(Qt.FocusReason.TabFocusReason)
        self._area.ensureWidgetVisible(target)


class Doors(QScrollArea):
    """The ways to begin, and the surveys opened before.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    door_chosen(str)
        "new", "open", or the folder name of a sample survey; the door of the samples opens the first of them.
    recent_chosen(str)
        The path of a survey opened before.
    """

    door_chosen = Signal(str)
    recent_chosen = Signal(str)

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._page = _Page(look, self)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setWidgetResizable(True)
        self.setWidget(self._page)
        self.setAccessibleName("ways to begin")
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setFocusProxy(self._page.doors[0])
        for row in self._page.doors:
            self._lead(row, next(iter(SAMPLES)) if row.door.key == SAMPLE else row.door.key)
            # The window's menu holds the shortcut of opening a folder.
            if row.door.key != OPEN:
                QShortcut(QKeySequence(row.door.shortcut), self, row.click)
        for word, key in zip(self._page.samples, SAMPLES, strict=True):
            self._lead(word, key)

    def _lead(self, button: QAbstractButton, key: str) -> None:
        button.clicked.connect(lambda: self.door_chosen.emit(key))

    def set_recent(self, paths: Sequence[str]) -> None:
        """Take the folders of surveys opened before, the latest first; those that are gone are shown so."""
        self._page.set_recent(paths)
        for row in self._page.recent:
            row.clicked.connect(lambda _=False, path=row.path: self.recent_chosen.emit(path))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._page.lay()
