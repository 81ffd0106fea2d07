"""The status line at the foot of the window: where the pointer is, what the plots show, and long work.

Left, pairs of a label and a value; right, the switches for bars, depth unit and depth kind, and when it was saved.
Long work is a teal line along the upper edge, a phrase and "Stop".
"""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QRectF, QSize, Signal
from PySide6.QtGui import QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QSizePolicy, QWidget

from plumbwell.desk.look import Look
from plumbwell.desk.parts.hints import Hints
from plumbwell.desk.parts.words import WORD_PAD, Word, draw_focus, middle_baseline
from plumbwell.plates.lettering import ELLIPSIS, draw_text, text_width
from plumbwell.plates.painting import hairline_across, painting

HEIGHT, MARGIN = 28, 16
PAIR_GAP, LABEL_GAP, WORD_GAP, UNIT_GAP = 26, 6, 13, 3
LINE = 2
PHRASE_SHARE = 0.3
UNITS = {"m": "metres", "ft": "feet"}


class QuietWord(Word):
    """A switch as a word: muted among its neighbours, in accent and underlined under the pointer."""

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self.look.theme
        lit = self.underMouse() or self.isDown() or self.hasFocus()
        with painting(self) as painter:
            baseline = middle_baseline(theme, self.face, self.height())
            box = draw_text(
                painter,
                theme,
                self.text(),
                x=WORD_PAD,
                baseline=baseline,
                face=self.face,
                role="accent" if lit else "muted",
                room=(0, self.width()),
            )
            if lit:
                hairline_across(painter, box.left(), box.right(), baseline + 2, theme.colour("accent"))
            if self.hasFocus():
                draw_focus(painter, theme, QRectF(self.rect()))


class StatusLine(QWidget):
    """The status line.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional

    Signals
    -------
    bars_clicked, unit_clicked, kind_clicked
        The reach of bars, the depth unit, the depth kind is to be another one.
    stop_clicked
        The long work is to end.
    """

    bars_clicked = Signal()
    unit_clicked = Signal()
    kind_clicked = Signal()
    stop_clicked = Signal()

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        Hints(self, lambda at: self.hint_at(at.x()))
        self._look = look
        self._pairs: tuple[tuple[str, str], ...] = ()
        self._saved = ""
        self._share: float | None = None
        self._phrase = ""
        self._shown: list[tuple[float, str, str]] = []
        self._stop = Word("Stop", look, self, face="small")
        self._bars, self._unit, self._kind = (QuietWord("", look, self, face="small") for _ in range(3))
        for word, signal in (
            (self._stop, self.stop_clicked),
            (self._bars, self.bars_clicked),
            (self._unit, self.unit_clicked),
            (self._kind, self.kind_clicked),
        ):
            word.hide()
            word.clicked.connect(signal)
        self.setAccessibleName("status line")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        look.changed.connect(self._measure)
        self._measure()

    def set_left(self, pairs: Sequence[tuple[str, str]]) -> None:
        """Take what the pointer or the selection is at: labels, which may be empty, and values with their units."""
        if tuple(pairs) != self._pairs:
            self._pairs = tuple(pairs)
            self._say()
            self.update()

    def set_right(self, bars: str | None, unit: str | None, kind: str | None, saved: str) -> None:
        """Take what stands at the right; None and "" are left out.

        Parameters
        ----------
        bars : str or None
            What drawn bars and bands reach: "2 sd".
        unit, kind : str or None
            Depth unit, "m" or "ft", and kind, "MD", "TVD" or "elevation".
        saved : str
            When the survey was saved: "10:42".
        """
        self._bars.setText("" if bars is None else f"bars and bands {bars}")
        self._bars.setAccessibleName(f"bars and bands reach {bars}: switch")
        self._unit.setText("" if unit is None else UNITS.get(unit, unit) + ("," if kind else ""))
        self._unit.setAccessibleName(f"depths in {UNITS.get(unit or '', unit)}: switch")
        self._kind.setText(kind or "")
        self._kind.setAccessibleName(f"depths are {kind}: switch")
        for word in (self._bars, self._unit, self._kind):
            word.setVisible(bool(word.text()))
        self._saved = f"saved {saved}" if saved else ""
        self._say()
        self._lay()
        self.update()

    def set_progress(self, share: float | None, phrase: str) -> None:
        """Take the state of long work: the share done, 0 to 1 (None: not known), and what it does; "" ends it."""
        self._share, self._phrase = share if phrase else None, phrase
        self._stop.setVisible(bool(phrase))
        self._say()
        self._lay()
        self.update()

    def _say(self) -> None:
        told = [f"{label} {value}".strip() for label, value in self._pairs]
        told += [words for words in (self._phrase, self._saved) if words]
        self.setAccessibleDescription(", ".join(told))

    def sizeHint(self) -> QSize:
        return QSize(400, self._look.theme.px(HEIGHT))

    def _measure(self) -> None:
        self.setFixedHeight(self._look.theme.px(HEIGHT))
        self._lay()
        self.updateGeometry()
        self.update()

    @property
    def _baseline(self) -> int:
        return middle_baseline(self._look.theme, "small", self.height())

    def _lay(self) -> None:
        """Place the words from the right, and note which texts are painted between them."""
        theme, baseline = self._look.theme, self._baseline
        gap = theme.px(WORD_GAP)
        x = float(self.width() - MARGIN)
        self._shown = []
        if self._saved:
            x -= text_width(theme, "small", self._saved)
            self._shown.append((x, self._saved, "muted"))
            x -= gap
        for word, after in ((self._kind, theme.px(UNIT_GAP)), (self._unit, gap), (self._bars, gap)):
            if word.text():
                x -= text_width(theme, "small", word.text())
                word.stand_at(x=x, baseline=baseline)
                x -= after
        if self._phrase:
            x -= gap + text_width(theme, "small", self._stop.text())
            self._stop.stand_at(x=x, baseline=baseline)
            x -= gap
            x -= min(text_width(theme, "small", self._phrase), PHRASE_SHARE * self.width())
            self._shown.append((x, self._phrase, "ink"))
            x -= gap
        self._left_end = x - gap

    _left_end = 0.0

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._lay()

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            hairline_across(painter, 0, self.width(), 0, theme.colour("rule"))
            if self._share is not None:
                done = min(max(self._share, 0.0), 1.0) * self.width()
                hairline_across(painter, 0, done, 0, theme.colour("accent"), LINE)
            for x, words, role in self._shown:
                right = self.width() - MARGIN
                if words == self._phrase:
                    right = self._stop.x() + WORD_PAD - theme.px(WORD_GAP)
                draw_text(
                    painter,
                    theme,
                    words,
                    x=x,
                    baseline=self._baseline,
                    face="small",
                    role=role,
                    room=(x, right + 1),
                )
            self._draw_pairs(painter)

    def fitting(self) -> int:
        """Return how many pairs have room; no number is shortened, so that what does not fit is left out whole."""
        theme, x = self._look.theme, float(MARGIN)
        widths = [self._width(label, value) for label, value in self._pairs]
        for index, width in enumerate(widths):
            more = text_width(theme, "small", ELLIPSIS) + LABEL_GAP if index + 1 < len(widths) else 0.0
            if x + width + more > self._left_end:
                return index
            x += width + theme.px(PAIR_GAP)
        return len(widths)

    def _width(self, label: str, value: str) -> float:
        theme = self._look.theme
        before = text_width(theme, "small", label) + theme.px(LABEL_GAP) if label else 0.0
        return before + text_width(theme, "small", value)

    def _draw_pairs(self, painter: QPainter) -> None:
        theme, x = self._look.theme, float(MARGIN)
        count = self.fitting()
        for label, value in self._pairs[:count]:
            for words, role, after in ((label, "muted", LABEL_GAP), (value, "ink", PAIR_GAP)):
                if words:
                    box = draw_text(
                        painter, theme, words, x=x, baseline=self._baseline, face="small", role=role
                    )
                    x = box.right() + theme.px(after)
        if count < len(self._pairs) and self._left_end > MARGIN:
            x = x - theme.px(PAIR_GAP) + LABEL_GAP if count else x
            draw_text(painter, theme, ELLIPSIS, x=x, baseline=self._baseline, face="small", role="muted")

    def hint_at(self, x: float) -> str:
        """Return what hovering tells: all pairs where some have no room, the phrase of long work in full."""
        if x > self._left_end:
            return self._phrase
        if self.fitting() == len(self._pairs):
            return ""
        return "\n".join(f"{label} {value}".strip() for label, value in self._pairs)
