"""The stage line: a line of travel with a node a stage, its name, and its one figure of merit.

The node's shape tells the state, the plumb line hangs from the stage in front. Lengths in px.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QPointF
from PySide6.QtGui import QPainter, QPainterPath

from plumbwell.plates.lettering import ELLIPSIS, draw_text, elided, text_width
from plumbwell.plates.painting import (
    MARK_SIZE,
    dotted_across,
    draw_mark,
    fill_shape,
    hairline_across,
    hairline_down,
    polygon,
    rectangle,
    stroke_shape,
    whole,
)
from plumbwell.plates.theme import Theme

IN_ORDER, LOOK, ERROR, RESTING = "in_order", "look", "error", "resting"
COMPUTING, WAITING, NOT_STARTED = "computing", "waiting", "not_started"
STATE_WORDS = {
    IN_ORDER: "in order",
    LOOK: "wants a look",
    ERROR: "cannot go on",
    RESTING: "rests on little, wants a look",
    COMPUTING: "computing",
    WAITING: "waiting",
    NOT_STARTED: "not started",
}
# States that are shown by a mark, also beside the figure of the stage in front; a result that rests on few degrees
# of freedom or on a prior is never shown as in order.
MARKS = {LOOK: "look", RESTING: "look", ERROR: "error"}
ROLES = {"look": "amber", "error": "brick"}

LINE_AT = 16
MARGIN, FIRST_NODE, LINE_GAP = 16, 6, 8
TEXT_LEFT, TEXT_GAP = 11, 10
BOB_WIDTH, BOB_HEIGHT = 7, 10
NODE_MARK = 11


@dataclass(frozen=True, slots=True, kw_only=True)
class StageState:
    """A stage as its line shows it.

    Parameters
    ----------
    key : str
        Its name inside the program.
    number : int
        Ctrl and this number goes to it.
    name, figure : str
        Its name, and its figure of merit in words.
    state : str
        "in_order", "look" (wants a look), "error" (cannot go on), "computing", "waiting", "not_started", or "resting"
        (rests on few degrees of freedom or a prior: shown as wanting a look).
    current : bool
        It is in front.
    hint : str
        The finding or reason, for the tool tip.
    """

    key: str
    number: int
    name: str
    figure: str
    state: str
    current: bool = False
    hint: str = ""

    def __post_init__(self) -> None:
        if self.state not in STATE_WORDS:
            raise ValueError(f"state {self.state!r} is none of {', '.join(STATE_WORDS)}")

    @property
    def mark(self) -> str | None:
        """The mark of a state that wants attention."""
        return MARKS.get(self.state)

    @property
    def spoken(self) -> str:
        """What the line shows of it, in words."""
        words = [self.name, self.figure] if self.figure else [self.name]
        if STATE_WORDS[self.state] != self.figure:
            words.append(STATE_WORDS[self.state])
        if self.current:
            words.append("in front")
        return ", ".join([*words, f"Ctrl+{self.number}"])


@dataclass(frozen=True, slots=True, kw_only=True)
class StagePlace:
    """Where a stage stands: px column of its node, left and right limit of its texts, left limit of its figure."""

    node: int
    left: float
    right: float
    figure_left: float


def stage_height(theme: Theme) -> int:
    """Return the height of the stage line with the rule beneath it in px: 66 at scale 1."""
    return LINE_AT + theme.px(50)


def name_baseline(theme: Theme) -> int:
    """Return the baseline of the stages' names."""
    return LINE_AT + theme.px(22)


def figure_baseline(theme: Theme) -> int:
    """Return the baseline of the stages' figures."""
    return LINE_AT + theme.px(38)


def stage_places(stages: Sequence[StageState], width: float) -> list[StagePlace]:
    """Return the places of stages in a width: equal parts between margins of 16 px."""
    part = (width - 2 * MARGIN) / max(len(stages), 1)
    places = []
    for index, stage in enumerate(stages):
        node = whole(MARGIN + FIRST_NODE + index * part)
        left = node + TEXT_LEFT
        # In front, the plumb bob hangs where the mark would be: it stands beside the figure.
        aside = MARK_SIZE + 5 if stage.current and stage.mark else 0.0
        last = index == len(stages) - 1
        right = width - MARGIN if last else MARGIN + FIRST_NODE + (index + 1) * part - TEXT_GAP
        places.append(StagePlace(node=node, left=left, right=max(right, left), figure_left=left + aside))
    return places


def shown_figure(theme: Theme, stage: StageState, place: StagePlace) -> str:
    """Return a stage's figure as far as it has room: what does not fit goes clause by clause, no number is cut.

    Of a stage that wants a look the last clause, the count of its findings, stays longest.
    """
    room = place.right - place.figure_left
    clauses = stage.figure.split(", ")
    if stage.state in ("look", "error"):
        for count in range(len(clauses) - 1, 0, -1):
            words = ", ".join([*clauses[:count], clauses[-1]])
            if text_width(theme, "small", words) <= room:
                return words
        clauses = clauses[-1:]
    for count in range(len(clauses), 0, -1):
        words = ", ".join(clauses[:count]) + (ELLIPSIS if count < len(clauses) else "")
        if text_width(theme, "small", words) <= room:
            return words
    return elided(theme, "small", stage.figure, room)


def _disc(x: float, y: float, radius: float) -> QPainterPath:
    path = QPainterPath()
    path.addEllipse(QPointF(x, y), radius, radius)
    return path


def _draw_node(painter: QPainter, stage: StageState, place: StagePlace, theme: Theme) -> None:
    x, y = place.node + 0.5, LINE_AT + 0.5
    if stage.current:
        base = stage_height(theme) - 1
        fill_shape(painter, _disc(x, y, 5.5), theme.colour("accent"))
        hairline_down(painter, place.node, y, base - BOB_HEIGHT, theme.colour("accent"))
        half, top = BOB_WIDTH / 2, base - BOB_HEIGHT
        fill_shape(painter, polygon((x - half, top), (x + half, top), (x, base)), theme.colour("accent"))
    elif stage.mark == "look":
        half = NODE_MARK / 2
        shape = polygon((x, y - half), (x + half, y + half - 1), (x - half, y + half - 1))
        fill_shape(painter, shape, theme.colour("amber"))
    elif stage.mark == "error":
        shape = rectangle(x - 4.5, y - 4.5, x + 4.5, y + 4.5)
        fill_shape(painter, shape, theme.colour("brick"))
    elif stage.state in (COMPUTING, WAITING):
        stroke_shape(painter, _disc(x, y, 4.5), theme.colour("ink"), 1.6, (1.6, 1.15))
    elif stage.state == NOT_STARTED:
        stroke_shape(painter, _disc(x, y, 3.5), theme.colour("strong"), 1.4)
    else:
        fill_shape(painter, _disc(x, y, 3.5), theme.colour("ink"))


def _draw_words(painter: QPainter, stage: StageState, place: StagePlace, theme: Theme) -> None:
    idle = stage.state == NOT_STARTED
    draw_text(
        painter,
        theme,
        stage.name,
        x=place.left,
        baseline=name_baseline(theme),
        face="emphasis" if stage.current else "text",
        role="accent" if stage.current else "muted" if idle else "ink",
        room=(place.left, place.right),
    )
    baseline = figure_baseline(theme)
    if place.figure_left > place.left and stage.mark:
        draw_mark(painter, theme, stage.mark, x=place.left + MARK_SIZE / 2, y=baseline - theme.px(5))
    draw_text(
        painter,
        theme,
        shown_figure(theme, stage, place),
        x=place.figure_left,
        baseline=baseline,
        face="small",
        role=ROLES[stage.mark] if stage.mark else "muted",
        room=(place.figure_left, place.right),
    )


def draw_stage_line(painter: QPainter, stages: Sequence[StageState], theme: Theme, width: float) -> None:
    """Draw the stage line, from its upper edge at 0 px to the rule beneath it.

    Parameters
    ----------
    painter : QPainter
    stages : sequence of StageState
        In their order.
    theme : Theme
    width : float
        In px; the rule goes over the whole of it.
    """
    places = stage_places(stages, width)
    hairline_across(painter, 0, width, stage_height(theme) - 1, theme.colour("rule"))
    for index, stage in enumerate(stages):
        if index:
            left, right = places[index - 1].node + LINE_GAP, places[index].node - LINE_GAP + 1
            if stage.state == NOT_STARTED:
                dotted_across(painter, left, right, LINE_AT, theme.colour("strong"))
            else:
                hairline_across(painter, left, right, LINE_AT, theme.colour("strong"))
        _draw_node(painter, stage, places[index], theme)
        _draw_words(painter, stage, places[index], theme)
