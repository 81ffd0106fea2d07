"""What the status line tells at its left: where the pointer or the selection is, in all depths, and the value there."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from plumbwell.desk.shown import Shown
from plumbwell.desk.stages import states
from plumbwell.plates.numbers import column_decimals, counted, number, with_sd
from plumbwell.plates.time_axis import clock, days

if TYPE_CHECKING:
    from plumbwell.desk.views import Views

Pairs = list[tuple[str, str]]


def status_words(work: Views, *, chosen: tuple[int, ...], waiting: str) -> Pairs:
    """Pairs of a small label and a value; the label is empty where the value says it all.

    Parameters
    ----------
    work : Views
    chosen : tuple of int
        The chosen rows of the ledger in front.
    waiting : str
        What is told while there is no result.
    """
    shown = work.shown
    if shown is None:
        return [("", waiting)]
    selection = work.selection
    if work.stage in (states.READINGS, states.DRIFT):
        rows = (selection.row,) if selection.row is not None else chosen
        return _of_row(shown, work.stage, rows)
    depth = selection.depth
    if depth is None:
        spans = shown.spans(selection.level, selection.rows)
        if not spans:
            return []
        if len(selection.rows) > 1:
            return _of_several(shown, selection.level, len(selection.rows), spans)
        depth = (spans[0][0] + spans[-1][1]) / 2
    return _at_depth(shown, depth)


def _of_several(shown: Shown, level: str, count: int, spans: Sequence[tuple[float, float]]) -> Pairs:
    """How many rows are chosen, and from where to where they reach."""
    first, last = (number(shown.scale.number_of(depth), 1) for depth in (spans[0][0], spans[-1][1]))
    return [("", f"{counted(count, level)} chosen"), ("", f"{first} to {last} {shown.unit_label()}")]


def _at_depth(shown: Shown, depth: float) -> Pairs:
    plate, scale = shown.plate, shown.scale
    pairs: Pairs = []
    place = shown.depths.place_at(shown.results, depth)
    if place is not None:
        md, tvd = place
        if np.isfinite(md):
            pairs.append(("", f"{number(md / scale.factor, 1)} {scale.unit} MD"))
        pairs.append(("", f"{number(tvd / scale.factor, 1)} {scale.unit} TVD"))
        elevation = (shown.depths.datum_elevation - tvd) / scale.factor
        pairs.append(("", f"{number(elevation, 1)} {scale.unit} elevation"))
    else:
        pairs.append(("", f"{number(scale.number_of(depth), 1)} {shown.unit_label()}"))
    for interval in plate.intervals:
        if interval.top <= depth <= interval.base and interval.density is not None:
            decimals = column_decimals([one.sd for one in plate.intervals], default=3)
            pairs.append(("density", f"{with_sd(interval.density, interval.sd, decimals=decimals)} g/cm³"))
            break
    above = [name for name, top in plate.names_in_view if top <= depth]
    if above:
        pairs.append(("", above[-1]))
    return pairs


def _moment(time: float) -> str:
    """A time as people write it: day, time of day, UTC."""
    return f"{days(time, time, year=True)} {clock(time, seconds=True)} UTC"


def _of_row(shown: Shown, stage: str, rows: tuple[int, ...]) -> Pairs:
    if not rows:
        return []
    results, row = shown.results, rows[0]
    readings, placement = results.survey.readings, results.stations.located.placement
    if stage == states.DRIFT:
        network = results.network.visits
        visits = shown.visits
        time, run, station = float(visits.time[row]), int(network.run[row]), int(network.station[row])
        residual, sd = visits.residual[row] * 1e8, visits.residual_sd[row] * 1e8
        found = (
            ("residual", f"{with_sd(float(residual), float(sd), decimals=1, signed=True)} µGal")
            if np.isfinite(sd)
            else ("", "nothing checks this visit")
        )
        named = ("visit", str(row + 1))
    else:
        time, run = float(readings.time.values[row]), int(readings.run.code[row])
        station = int(placement.station[row])
        residual = results.readings.estimates.residual.values[row] * 1e8
        found = ("residual", f"{number(float(residual), 1, signed=True)} µGal")
        named = ("row", str(row + 1))
    pairs: Pairs = [("", _moment(time)), ("run", readings.run.names[run]), named]
    if station >= 0:
        depth = shown.depths.stations[station]
        pairs.append(("station", results.stations.label[station]))
        if np.isfinite(depth):
            pairs.append(("", f"{number(shown.scale.number_of(float(depth)), 1)} {shown.unit_label()}"))
    pairs.append(found)
    if len(rows) > 1:
        pairs.append(("", f"{len(rows)} rows chosen"))
    return pairs
