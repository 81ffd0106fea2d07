"""The thread drawn through all views: what is chosen, pointed at and in view, shown by each in its own way.

The selection is the one truth. Views say what the person does; here it becomes the selection, and the selection is
handed to every view. Ledger and tracks show the same depths: either may lead, the other follows.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import QObject

from plumbwell.desk.selection import Selection
from plumbwell.desk.stages import states
from plumbwell.desk.stages.tray_views import neighbour_view, settle_view, settled_visit

if TYPE_CHECKING:
    from plumbwell.desk.shown import Shown
    from plumbwell.desk.views import Views

LEVELS = {
    states.READINGS: "reading", states.DRIFT: "visit", states.REDUCTION: "station", states.DENSITY: "interval",
}  # fmt: skip
"""What a row of a stage's ledger is."""

FANS = {states.REDUCTION: "station", states.DENSITY: "interval"}
"""Stages in order of depth, and what their fan joins."""

TIMED = (states.READINGS, states.DRIFT)
FILE = "file"
EDGE = 0.1
"""Share of the window that stays between its edge and what was brought into view."""

MOST_SAID = 5


class Following(QObject):
    """Keeps the views of a workspace in step.

    Parameters
    ----------
    work : Views
    selection : Selection
    """

    def __init__(self, work: Views, selection: Selection) -> None:
        super().__init__(work)
        self._work, self._selection = work, selection
        self._leading = False
        self._neighbours: tuple[int, ...] = ()
        self._connect()

    def _connect(self) -> None:
        work, selection = self._work, self._selection
        work.ledger.rows_chosen.connect(lambda rows: selection.choose(self.level, rows))
        work.ledger.row_hovered.connect(self._point_at_row)
        work.ledger.moved.connect(self.ledger_moved)
        work.fan.row_chosen.connect(lambda row: selection.choose(self.level, (row,)))
        work.fan.row_hovered.connect(self._point_at_row)
        work.strip.window_wanted.connect(selection.show)
        work.strip.range_brushed.connect(self._brush)
        work.strip.depth_chosen.connect(self._choose_at)
        work.tracks.window_wanted.connect(selection.show)
        work.tracks.range_brushed.connect(self._brush)
        work.tracks.point_chosen.connect(self._choose_at)
        work.tracks.depth_hovered.connect(self._point_at_depth)
        work.tracks.walked.connect(self._walk)
        work.times.rows_chosen.connect(
            lambda rows: selection.choose(self.level, [row for row in rows if row >= 0])
        )
        work.times.row_hovered.connect(lambda row: self._point_at_row(-1 if row is None else row))
        work.times.walked.connect(self._walk)
        work.settle.rows_chosen.connect(lambda rows: selection.choose("reading", rows))
        work.settle.walked.connect(lambda row: selection.choose("reading", (row,)))
        work.neighbours.chosen.connect(self._choose_neighbour)
        selection.chosen.connect(self.show_chosen)
        selection.pointed.connect(self._show_pointed)
        selection.window_moved.connect(self.show_window)

    @property
    def level(self) -> str:
        """What a row of the ledger in front is."""
        return LEVELS.get(self._work.stage, FILE)

    @property
    def _shown(self) -> Shown | None:
        return self._work.shown

    @property
    def _deep(self) -> bool:
        """Whether the ledger in front stands in order of depth beside tracks."""
        return self._shown is not None and self._work.stage in FANS and self._work.ledger.in_depth_order()

    # -- from the views --------------------------------------------------------------------------------------

    def _point_at_row(self, row: int) -> None:
        depth = None
        if self._shown is not None and row >= 0 and self.level != FILE:
            spans = self._shown.spans(self.level, (row,))
            depth = (spans[0][0] + spans[0][1]) / 2 if spans else None
        self._selection.point(depth=depth, row=row if row >= 0 else None)

    def _point_at_depth(self, depth: float | None) -> None:
        row = None
        if depth is not None and self._shown is not None and self._work.stage in FANS:
            row = self._shown.row_at(self.level, depth)
        self._selection.point(depth=depth, row=row)

    def _choose_at(self, depth: float, extend: bool) -> None:
        if self._shown is None or self.level == FILE:
            return
        row = self._shown.row_at(self.level, depth)
        if row is None:
            return
        found: Sequence[int] = (row,)
        if self._work.stage in TIMED:
            found = self._shown.converted("station", self._shown.stations_of(self.level, (row,)), self.level)
        before = self.chosen_here() if extend else ()
        self._selection.choose(self.level, (*before, *found))

    def _brush(self, top: float, base: float) -> None:
        if self._shown is not None and self.level != FILE:
            self._selection.choose(self.level, self._shown.rows_between(self.level, top, base))

    def _walk(self, step: int) -> None:
        self._work.ledger.walk(step)

    def _choose_neighbour(self, place: int) -> None:
        if 0 <= place < len(self._neighbours):
            self._selection.choose("interval", (self._neighbours[place],))

    def ledger_moved(self) -> None:
        """The ledger shows other rows: the depth window goes to their depths."""
        depths = self._work.ledger.visible_depths() if self._deep and not self._leading else None
        if depths is not None:
            # Where the table ends: of a single station the whole is more than its own depth.
            table = self._work.ledger.table
            low, high = float(np.nanmin(table.top)), float(np.nanmax(table.base))
            padded = self._selection.padded()
            self._leading = True
            try:
                self._selection.show(
                    padded[0] if depths[0] <= low else depths[0], padded[1] if depths[1] >= high else depths[1]
                )
            finally:
                self._leading = False
        self.show_fan()

    # -- to the views ----------------------------------------------------------------------------------------

    def chosen_here(self) -> tuple[int, ...]:
        """The chosen rows of the ledger in front."""
        selection = self._selection
        if self.level == FILE:
            return ()
        if self._shown is None:
            return selection.rows if selection.level == self.level else ()
        return self._shown.converted(selection.level, selection.rows, self.level)

    def show_chosen(self) -> None:
        """Light up what is chosen in every view."""
        selection, work, shown = self._selection, self._work, self._shown
        here = self.chosen_here()
        work.ledger.choose_rows(here)
        spans = [] if shown is None else shown.spans(selection.level, selection.rows)
        lit = [] if shown is None else shown.lit(selection.level, selection.rows)
        if spans and work.stage in FANS:
            self._bring_into_view(spans)
        work.strip.set_selection(spans)
        work.tracks.set_selection(spans, lit, said=_said(self.level, here))
        work.times.set_selection(here if work.stage in TIMED else ())
        self.show_fan()
        if shown is not None and work.stage in TIMED:
            work.settle.set_visit(settle_view(shown, settled_visit(shown, selection)))
            work.settle.set_selection(selection.rows if selection.level == "reading" else ())
        if shown is not None and work.stage == states.DENSITY:
            self._show_neighbours(shown, here)
        work.pointed.emit()

    def _show_neighbours(self, shown: Shown, here: Sequence[int]) -> None:
        if here:
            self._neighbours = neighbour_view(self._work.neighbours, shown, here[-1])
        else:
            self._neighbours = ()
            self._work.neighbours.set_empty()

    def _bring_into_view(self, spans: Sequence[tuple[float, float]]) -> None:
        """Move the window so that what was chosen is in view."""
        top, base = min(span[0] for span in spans), max(span[1] for span in spans)
        low, high = self._selection.window
        if top >= low and base <= high:
            return
        length = high - low
        if base - top > length:
            self._selection.show(top, base)
        elif top < low:
            self._selection.show(top - EDGE * length, top + (1 - EDGE) * length)
        else:
            self._selection.show(base - (1 - EDGE) * length, base + EDGE * length)

    def _show_pointed(self) -> None:
        selection, work = self._selection, self._work
        work.ledger.set_hovered(-1 if selection.row is None else selection.row)
        if work.stage in FANS:
            work.tracks.set_crosshair(selection.depth)
        elif work.stage in TIMED:
            work.times.set_hovered(selection.row)
        work.pointed.emit()

    def show_window(self) -> None:
        """Show the depth window in strip, tracks, fan and ledger."""
        work = self._work
        top, base = self._selection.window
        work.strip.set_window(top, base)
        work.tracks.set_window(top, base)
        work.fan.set_window(top, base)
        if self._deep and not self._leading:
            self._leading = True
            try:
                work.ledger.show_depths(top, base)
            finally:
                self._leading = False
        self.show_fan()

    def show_fan(self) -> None:
        """Let the rows in view flow into their depths."""
        work = self._work
        kind = FANS.get(work.stage)
        if self._shown is None:
            work.fan.set_rows(None, ())
        elif kind is not None:
            work.fan.set_rows(
                kind if work.ledger.in_depth_order() else None, work.ledger.fan_rows(), self.chosen_here()
            )


def _said(level: str, rows: Sequence[int]) -> str:
    """The chosen rows in words, for those who hear them; empty where none is chosen or there are many."""
    if not 0 < len(rows) <= MOST_SAID:
        return ""
    names = ", ".join(str(row + 1) for row in rows)
    return f"{level} {names}" if len(rows) == 1 else f"{level}s {names}"
