"""What plots against time show, in words: for a screen reader, and for the tool tips of runs and tares."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from plumbwell.desk.times.time_pointing import tares_in_time
from plumbwell.plates.numbers import counted
from plumbwell.plates.time_axis import Panel, RunSpan, clock, day
from plumbwell.plates.time_plot import TareMark, TimePlot, run_spans

TARES_TOLD = 3


def told(
    plots: Sequence[TimePlot],
    chosen: Sequence[int],
    *,
    count: int,
    noun: str,
    named: Callable[[int], str] | None = None,
    taken: int | None = None,
    stale: bool = False,
    panels: Sequence[Panel] = (),
) -> str:
    """Return a sentence of what is shown: "3 runs, 60 visits, run 2 has a tare at 11:42, visit 33 chosen".

    Parameters
    ----------
    plots : sequence of TimePlot
    chosen : sequence of int
        Chosen rows that are shown.
    count : int
        How many rows there are.
    noun : str
        What a row is.
    named : callable, optional
        Gives a row in words.
    taken : int, optional
        Key of the tare that the keys move.
    stale : bool
        New values are awaited.
    panels : sequence of Panel
        What is in view where that is not everything.
    """
    spans = run_spans(plots)
    parts = [counted(len(spans), "run"), counted(count, noun)]
    left_out = sum(int(np.count_nonzero(run.points.excluded)) for run in plots[0].panels) if plots else 0
    if left_out:
        parts.append(f"{left_out} left out")
    names = {span.run_index: span.name for span in spans}
    tares = tares_in_time(plots)
    parts += [f"{names[run]} has a tare at {clock(tare.time)}" for run, tare in tares[:TARES_TOLD]]
    if len(tares) > TARES_TOLD:
        parts.append(f"{len(tares) - TARES_TOLD} more tares")
    parts += [f"tare at {clock(tare.time)} taken" for _, tare in tares if tare.key == taken]
    if len(chosen) == 1:
        parts.append(f"{named(chosen[0]) if named else f'{noun} {chosen[0] + 1}'} chosen")
    elif chosen:
        parts.append(f"{counted(len(chosen), noun)} chosen")
    if panels:
        first, last = panels[0], panels[-1]
        parts.append(f"in view from {day(first.first)} {clock(first.first)} to {day(last.last)} {clock(last.last)}")
    if stale:
        parts.append("computing")
    return ", ".join(parts)


def run_sentence(plots: Sequence[TimePlot], span: RunSpan, noun: str) -> str:
    """Return what a run is: its name, its times, how many points, and the slope of its drift."""
    begin = f"{day(span.first, year=True)} {clock(span.first)}"
    end = clock(span.last) if day(span.first) == day(span.last) else f"{day(span.last, year=True)} {clock(span.last)}"
    parts = [f"{span.name}, {begin} to {end} UTC"]
    for run in (run for plot in plots[:1] for run in plot.panels if run.run_index == span.run_index):
        parts.append(counted(int(np.count_nonzero(run.points.rows >= 0)), noun))
        if run.rate_words:
            parts.append(f"drift {run.rate_words}")
    return ", ".join(parts)


def tare_sentence(tare: TareMark, *, movable: bool) -> str:
    """Return what a tare is, and how it is moved where it can be."""
    words = f"{tare.words}, {day(tare.time)} {clock(tare.time, seconds=True)}"
    return f"{words}\nDrag it, or press T and then Left, Right or Delete." if movable else words
