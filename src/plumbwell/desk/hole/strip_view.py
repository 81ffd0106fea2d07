"""What the core strip shows: the survey's name, the core with the depth window and the selection, the key of tones.

Paints with the painters of the plates; what does not change with the window is kept as a picture. Depths grow
downward, in the unit of the plate. What mouse and keyboard do stands in `strip.py`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QRectF, QSize, Qt
from PySide6.QtGui import QPainter, QPaintEvent, QPixmap
from PySide6.QtWidgets import QSizePolicy, QWidget

from plumbwell.desk.hole.strip_window import Window, WindowLimits, window_limits
from plumbwell.desk.hole.strip_words import depth_words, described, finding_words, hole_words
from plumbwell.desk.look import Look
from plumbwell.desk.parts.hints import Hints
from plumbwell.desk.parts.words import draw_focus
from plumbwell.plates.axis import Frame
from plumbwell.plates.lettering import draw_text, elided, text_width
from plumbwell.plates.painting import hairline_across, painting
from plumbwell.plates.plate import SurveyPlate
from plumbwell.plates.stage_line import stage_height
from plumbwell.plates.strip import (
    STRIP_WIDTH,
    draw_bar,
    draw_core,
    draw_depths,
    draw_empty_strip,
    draw_findings,
    draw_framed_names,
    draw_selection,
    draw_tone_key,
    key_height,
    names_right,
    strip_room,
)
from plumbwell.plates.strip_names import PlacedName, draw_leader, placed_names, shown_name
from plumbwell.plates.strip_places import (
    FindingMark,
    StripColumns,
    depth_at,
    finding_marks,
    grip_part,
    strip_columns,
)
from plumbwell.plates.theme import Theme

LEAST_WIDTH, MOST_WIDTH = 168, 320
MARGIN = 16
KEY_MARGIN, MOST_KEY = 40, 240
TITLE_BASELINE, SUBTITLE_BASELINE = 28, 46
NOTHING = ("No survey", "nothing open")
MARK_REACH = 6.0
BRUSH, FINDING = "brush", "finding"


def title_face(theme: Theme, title: str, room: float) -> str:
    """Return the face of the survey's name: the heading, or the smaller one where only that has room."""
    return "heading" if text_width(theme, "heading", title) <= room else "emphasis"


def shorter_parts(theme: Theme, words: str, room: float) -> str:
    """Return words in parts without the parts between the first and the last where they have no room otherwise."""
    parts = words.split(", ")
    while len(parts) > 2 and text_width(theme, "small", ", ".join(parts)) > room:
        del parts[-2]
    return ", ".join(parts)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Still:
    """What stays while the window moves: a picture of bar, core and leaders, and the places of names and marks."""

    picture: QPixmap
    columns: StripColumns
    names: list[PlacedName]
    marks: list[FindingMark]


class StripView(QWidget):
    """The core strip as it is shown.

    Parameters
    ----------
    look : Look
    parent : QWidget, optional
    """

    def __init__(self, look: Look, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        Hints(self, lambda at: self.hint_at(at.x(), at.y()))
        self._look = look
        self._plate: SurveyPlate | None = None
        self._upward = False
        self._hole = ""
        self._range: Window = (0.0, 1.0)
        self._has_key = True
        self._window: Window = (0.0, 1.0)
        self._selected: tuple[Window, ...] = ()
        self._brushed: Window | None = None
        self._is_stale = False
        self._framed = False
        self._still: _Still | None = None
        self.setMinimumWidth(LEAST_WIDTH)
        self.setMaximumWidth(MOST_WIDTH)
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Expanding)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("core strip")
        look.changed.connect(self._measure)
        self._say()

    # What is shown.

    def set_plate(self, plate: SurveyPlate, *, upward: bool = False) -> None:
        """Take another survey, or the same anew; with `upward` its depths are elevations turned downward."""
        self._plate, self._upward = plate, upward
        self._hole = hole_words(plate, upward=upward)
        self._range, self._has_key = plate.depth_range, plate.has_density
        self._measure()

    def set_nothing(self) -> None:
        """Show that no survey is open."""
        self._plate = None
        self._range, self._has_key = (0.0, 1.0), True
        self._upward = False
        self._selected = ()
        self._brushed = None
        self._measure()

    def set_window(self, top: float, base: float) -> None:
        """Take the depths in view in ledger and tracks; they may reach beyond the hole."""
        if (top, base) != self._window:
            self._window = (top, base)
            self._say()
            self._update_hole()

    def set_selection(self, spans: Sequence[Window]) -> None:
        """Take the chosen depths, from and to; equal for a station."""
        self._selected = tuple(spans)
        self._say()
        self._update_hole()

    def set_stale(self, stale: bool) -> None:
        """Show the core at half strength while newer densities are on their way, or whole again."""
        if stale != self._is_stale:
            self._is_stale = stale
            self._measure()

    def _update_hole(self) -> None:
        """Have the strip painted again without the name above and the key below it."""
        frame = self.frame()
        self.update(0, int(frame.top) - 8, self.width(), int(frame.base - frame.top) + 16)

    def _measure(self) -> None:
        self._still = None
        self._say()
        self.updateGeometry()
        self.update()

    def _say(self) -> None:
        if self._plate is None:
            self.setAccessibleDescription("no survey, nothing open")
            return
        self.setAccessibleDescription(
            described(
                self._plate,
                self._hole,
                upward=self._upward,
                window=self._window,
                selected=self._selected,
                stale=self._is_stale,
            )
        )

    def sizeHint(self) -> QSize:
        theme = self._look.theme
        width = STRIP_WIDTH if self._plate is None else strip_room(theme, self._plate, upward=self._upward)
        return QSize(int(width), stage_height(theme) + key_height(theme) + theme.px(400))

    def minimumSizeHint(self) -> QSize:
        theme = self._look.theme
        return QSize(LEAST_WIDTH, stage_height(theme) + key_height(theme) + theme.px(100))

    # Where things lie.

    @property
    def _key_top(self) -> int:
        return self.height() - key_height(self._look.theme) + 4

    def frame(self) -> Frame:
        """The strip's frame in the widget: px and depths of the whole hole."""
        theme = self._look.theme
        low, high = self._range
        top = stage_height(theme)
        base = self._key_top - 8 if self._has_key else self.height() - 14
        return Frame(
            left=0,
            top=top,
            right=self.width(),
            # The frame keeps a height while the widget has none yet.
            base=max(base, top + 20),
            depth_top=low,
            depth_base=high,
            upward=self._upward,
        )

    def _limits(self) -> WindowLimits:
        return window_limits(self._range, "m" if self._plate is None else self._plate.depth_unit)

    def _kept(self, plate: SurveyPlate, frame: Frame) -> _Still:
        """Return what stays, made anew when survey, look or size are others."""
        ratio = self.devicePixelRatioF()
        size = self.size() * ratio
        if self._still is None or self._still.picture.size() != size:
            theme = self._look.theme
            columns = strip_columns(theme, frame)
            picture = QPixmap(size)
            picture.setDevicePixelRatio(ratio)
            picture.fill(theme.colour("ground"))
            with painting(picture) as painter:
                draw_bar(painter, frame, theme, columns)
                draw_core(painter, plate, frame, theme, columns, stale=self._is_stale)
                names = placed_names(
                    frame, theme, columns, markers=plate.names_in_view, intervals=plate.intervals
                )
                for name in names:
                    draw_leader(painter, theme, columns, name)
            marks = finding_marks(plate.findings, frame)
            self._still = _Still(picture=picture, columns=columns, names=names, marks=marks)
        return self._still

    def mark_at(self, x: float, y: float) -> FindingMark | None:
        """Return the mark of findings at a point."""
        if self._plate is None:
            return None
        still = self._kept(self._plate, self.frame())
        near = (mark for mark in still.marks if abs(mark.y - y) <= MARK_REACH)
        if abs(x - still.columns.findings) > MARK_REACH:
            return None
        return min(near, key=lambda mark: abs(mark.y - y), default=None)

    def part_at(self, x: float, y: float) -> str | None:
        """Return what a point holds: "finding", "top", "base", "move", "brush" (the core), or None."""
        if self._plate is None:
            return None
        frame = self.frame()
        columns = self._kept(self._plate, frame).columns
        if self.mark_at(x, y) is not None:
            return FINDING
        part = grip_part(frame, columns, self._window, x=x, y=y)
        if part is None and columns.ticks - 1 <= x < columns.names - 4 and frame.top <= y <= frame.base:
            return BRUSH
        return part

    # Painting.

    def paintEvent(self, event: QPaintEvent) -> None:
        theme = self._look.theme
        with painting(self) as painter:
            painter.fillRect(self.rect(), theme.colour("ground"))
            frame = self.frame()
            if self._plate is None:
                self._draw_title(painter, *NOTHING, role="muted")
                draw_empty_strip(painter, frame, theme)
            else:
                self._draw_survey(painter, self._plate, frame)
                self._draw_title(painter, self._plate.title, self._plate.subtitle, role="ink")
            if self._has_key and event.rect().bottom() > frame.base + 8:
                width = min(self.width() - KEY_MARGIN, theme.px(MOST_KEY))
                draw_tone_key(painter, theme, left=MARGIN + 1, top=self._key_top, width=width)
            if self._framed and self.hasFocus():
                draw_focus(painter, theme, QRectF(1, frame.top - 8, self.width() - 2, frame.base - frame.top + 16))

    def _draw_title(self, painter: QPainter, title: str, subtitle: str, *, role: str) -> None:
        theme = self._look.theme
        room = (MARGIN, self.width() - 8)
        # A long name stands smaller before it is shortened.
        heading = title_face(theme, title, room[1] - room[0])
        for words, down, face, colour in (
            (title, TITLE_BASELINE, heading, role),
            (shorter_parts(theme, subtitle, room[1] - room[0]), SUBTITLE_BASELINE, "small", "muted"),
        ):
            draw_text(
                painter, theme, words, x=MARGIN, baseline=theme.px(down), face=face, role=colour, room=room
            )

    def _draw_survey(self, painter: QPainter, plate: SurveyPlate, frame: Frame) -> None:
        theme, still = self._look.theme, self._kept(plate, frame)
        painter.drawPixmap(0, 0, still.picture)
        draw_depths(painter, frame, theme, still.columns)
        draw_framed_names(painter, frame, theme, still.columns, still.names, self._window)
        draw_findings(painter, plate.findings, still.marks, theme, still.columns)
        draw_selection(painter, frame, theme, still.columns, self._selected)
        for depth in self._brushed or ():
            left, right = still.columns.ticks, still.columns.names - 4
            hairline_across(painter, left, right, frame.y(depth), theme.colour("accent"))

    # What hovering tells.

    def hint_at(self, x: float, y: float) -> str:
        """Return what hovering over a point tells: a finding's words, a name that was shortened, rock at a depth."""
        plate, theme = self._plate, self._look.theme
        if plate is None:
            return ""
        if y < theme.px(SUBTITLE_BASELINE) + theme.px(6):
            room = self.width() - 8 - MARGIN
            texts = ((title_face(theme, plate.title, room), plate.title), ("small", plate.subtitle))
            short = any(elided(theme, face, words, room) != words for face, words in texts)
            return f"{plate.title}\n{plate.subtitle}" if short else ""
        frame = self.frame()
        still = self._kept(plate, frame)
        mark = self.mark_at(x, y)
        if mark is not None:
            return finding_words(plate, mark)
        if not frame.top <= y <= frame.base or x < still.columns.ticks:
            return ""
        if x < still.columns.names:
            return depth_words(plate, depth_at(frame, y), upward=self._upward)
        right = names_right(frame, self._window)
        near = min(still.names, key=lambda name: abs(name.row - y), default=None)
        if near is None or abs(near.row - y) > theme.px(8):
            return ""
        return near.words if shown_name(theme, still.columns, near, right) != near.words else ""
