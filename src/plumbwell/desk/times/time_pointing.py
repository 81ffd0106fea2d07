"""What the pointer is at in plots against time, and what a brushed range holds: points, rows and tares.

Places in px of the layout. Rows below 0 stand for no row of the ledger; they are seen but never chosen.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np

from plumbwell.plates.time_curves import panel_columns, panel_pairs, point_places
from plumbwell.plates.time_frame import TimeLayout
from plumbwell.plates.time_plot import Floats, Indexes, TareMark, TimePlot, run_spans
from plumbwell.plates.time_words import TAG_HEIGHT, TAG_WIDTH, drawn_tares


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class PlacedRows:
    """All rows in order of time, run after run, each once; (n,) each.

    Parameters
    ----------
    rows : int array
        Rows of the ledger.
    runs : int array
        Their run.
    times : float array
        Where a plot shows them.
    """

    rows: Indexes
    runs: Indexes
    times: Floats

    def __len__(self) -> int:
        return len(self.rows)

    def place_of(self, row: int) -> int | None:
        """Return the place of a row in the order of time."""
        found = np.flatnonzero(self.rows == row)
        return int(found[0]) if len(found) else None

    def among(self, rows: Collection[int]) -> tuple[int, ...]:
        """Return those of some rows that are shown, in order of time."""
        wanted = np.fromiter(rows, dtype=np.intp, count=len(rows))
        return tuple(self.rows[np.isin(self.rows, wanted)].tolist())


def nearest_row(plots: Sequence[TimePlot], layout: TimeLayout, *, x: float, y: float, reach: float) -> int | None:
    """Return the row of the point nearest to a place, at most `reach` px away."""
    best, found = reach * reach, None
    for plot, frame in zip(plots, layout.frames, strict=True):
        if not frame.scale.top - reach <= y <= frame.scale.base + reach:
            continue
        for panel, run in panel_pairs(layout, plot):
            if not panel.left - reach <= x <= panel.right + reach:
                continue
            columns, rows, inside = point_places(panel, run, frame.scale)
            inside = inside[run.points.rows[inside] >= 0]
            if not len(inside):
                continue
            away = (columns[inside] - x) ** 2 + (rows[inside] - y) ** 2
            nearest = int(np.argmin(away))
            if float(away[nearest]) <= best:
                best, found = float(away[nearest]), int(run.points.rows[inside[nearest]])
    return found


def rows_between(plots: Sequence[TimePlot], layout: TimeLayout, left: float, right: float) -> tuple[int, ...]:
    """Return the rows whose time lies between two px columns in any plot, in order of time, each once."""
    found: dict[int, float] = {}
    for plot in plots:
        for panel, run in panel_pairs(layout, plot):
            columns = panel_columns(panel, run.points.times)
            inside = np.flatnonzero(
                (columns >= max(left, panel.left)) & (columns <= min(right, panel.right)) & (run.points.rows >= 0)
            )
            for row, column in zip(run.points.rows[inside].tolist(), columns[inside].tolist(), strict=True):
                found.setdefault(row, column)
    return tuple(sorted(found, key=lambda row: found[row]))


def rows_in_time(plots: Sequence[TimePlot]) -> PlacedRows:
    """Return all rows in order of time, run after run."""
    order = {span.run_index: rank for rank, span in enumerate(run_spans(plots))}
    panels = [run for plot in plots for run in plot.panels if run.run_index in order]
    none = np.zeros(0)
    rows = np.concatenate([none.astype(np.intp), *(run.points.rows for run in panels)])
    times = np.concatenate([none, *(run.points.times for run in panels)])
    runs = np.repeat([run.run_index for run in panels], [len(run.points) for run in panels]).astype(np.intp)
    known = np.flatnonzero((rows >= 0) & np.isfinite(times))
    _, first = np.unique(rows[known], return_index=True)
    kept = known[first]
    rank = np.array([order[run] for run in runs[kept].tolist()], dtype=np.intp)
    kept = kept[np.lexsort((times[kept], rank))]
    return PlacedRows(rows=rows[kept], runs=runs[kept], times=times[kept])


def tare_at(plots: Sequence[TimePlot], layout: TimeLayout, *, x: float, y: float) -> TareMark | None:
    """Return the tare whose tag a place lies on, or 3 px beside it."""
    if not layout.top - 3 <= y <= layout.top + TAG_HEIGHT + 3:
        return None
    near = [(abs(column - x), tare) for tare, _, column in drawn_tares(plots, layout)]
    near = [pair for pair in near if pair[0] <= TAG_WIDTH / 2 + 3]
    return min(near, key=lambda pair: pair[0])[1] if near else None


def tares_in_time(plots: Sequence[TimePlot]) -> tuple[tuple[int, TareMark], ...]:
    """Return run and tare of all tares in order of time, each once."""
    found: dict[int, tuple[int, TareMark]] = {}
    for plot in plots:
        for run in plot.panels:
            for tare in run.tares:
                found.setdefault(tare.key, (run.run_index, tare))
    return tuple(sorted(found.values(), key=lambda pair: pair[1].time))


def before_row(placed: PlacedRows, row: int) -> tuple[int, float] | None:
    """Return run and time midway between a row and the one before it in its run, where a tare may lie."""
    place = placed.place_of(row)
    if not place or placed.runs[place - 1] != placed.runs[place]:
        return None
    return int(placed.runs[place]), float(placed.times[place - 1] + placed.times[place]) / 2
