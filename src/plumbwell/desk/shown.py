"""One reduced survey as the window shows it: depths in the scale in force, the plate, and which rows belong together.

Made anew for every result and every change of the depth scale; holds no Qt object.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from plumbwell.plates.depth_scale import DepthScale
from plumbwell.plates.figure_of import survey_plate
from plumbwell.plates.hole_depths import HoleDepths, hole_depths
from plumbwell.plates.plate import SurveyPlate
from plumbwell.study.case import Case
from plumbwell.study.results import Results
from plumbwell.study.visit_table import VisitTable, visit_table
from plumbwell.survey.column import Array, Index

READING, VISIT, STATION, INTERVAL = "reading", "visit", "station", "interval"


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Shown:
    """A reduced survey in the depth scale of the window.

    Parameters
    ----------
    case : Case
        What it was reduced from.
    results : Results
    depths : HoleDepths
    plate : SurveyPlate
    visits : VisitTable
    """

    case: Case
    results: Results
    depths: HoleDepths
    plate: SurveyPlate
    visits: VisitTable

    @property
    def scale(self) -> DepthScale:
        """The depth scale in force."""
        return self.depths.scale

    @property
    def station_of_row(self) -> Index:
        """Station of each reading, -1 for none."""
        return self.results.stations.located.placement.station

    @property
    def interval_edges(self) -> tuple[Array, Array]:
        """Depths of top and base of every interval, as the plate has them."""
        pairs = self.results.intervals.densities.pairs
        return self.depths.stations[pairs.top], self.depths.stations[pairs.base]

    def unit_label(self) -> str:
        """Unit and kind of depths under a column's name: "m MD"."""
        return f"{self.scale.unit} {self.scale.label}"

    def numbers_of(self, depth: Array) -> Array:
        """Depths as they are written: elevations with their own sign."""
        return -depth if self.scale.upward else depth

    def stations_of(self, level: str, rows: Iterable[int]) -> tuple[int, ...]:
        """Stations that rows of a level belong to, from the top down."""
        at = np.array(list(rows), dtype=np.intp)
        if level == STATION:
            found = at
        elif level == VISIT:
            found = self.results.network.visits.station[at]
        elif level == READING:
            found = self.station_of_row[at]
        elif level == INTERVAL:
            pairs = self.results.intervals.densities.pairs
            found = np.concatenate([pairs.top[at], pairs.base[at]])
        else:
            found = at[:0]
        return tuple(np.unique(found[found >= 0]).tolist())

    def converted(self, level: str, rows: Sequence[int], wanted: str) -> tuple[int, ...]:
        """The rows of another level that belong to chosen rows.

        A station stands for the intervals between chosen stations, or else for those that it ends; an interval for
        its two stations; a station for all its visits and readings.
        """
        if level == wanted or not rows:
            return tuple(rows)
        visits = self.results.network.visits
        if (level, wanted) == (READING, VISIT):
            found = visits.of_row[np.array(rows, dtype=np.intp)]
            return tuple(np.unique(found[found >= 0]).tolist())
        if (level, wanted) == (VISIT, READING):
            return tuple(np.flatnonzero(np.isin(visits.of_row, rows)).tolist())
        stations = self.stations_of(level, rows)
        if wanted == STATION:
            return stations
        if wanted == VISIT:
            return tuple(np.flatnonzero(np.isin(visits.station, stations)).tolist())
        if wanted == READING:
            return tuple(np.flatnonzero(np.isin(self.station_of_row, stations)).tolist())
        if wanted == INTERVAL:
            pairs = self.results.intervals.densities.pairs
            ends = np.isin(pairs.top, stations).astype(int) + np.isin(pairs.base, stations)
            return tuple(np.flatnonzero(ends == 2 if (ends == 2).any() else ends > 0).tolist())
        return ()

    def spans(self, level: str, rows: Sequence[int]) -> list[tuple[float, float]]:
        """Depths from and to of chosen rows: an interval's top and base, a station's depth twice."""
        if level == INTERVAL:
            top, base = self.interval_edges
            return [(float(top[row]), float(base[row])) for row in rows if np.isfinite(top[row] + base[row])]
        return [(depth, depth) for depth in self.lit(level, rows)]

    def lit(self, level: str, rows: Sequence[int]) -> list[float]:
        """Depths of the stations that chosen rows light up."""
        stations = [one for one in self.stations_of(level, rows) if self.depths.column[one]]
        return self.depths.stations[np.array(stations, dtype=np.intp)].tolist()

    def rows_between(self, wanted: str, top: float, base: float) -> tuple[int, ...]:
        """Rows of a level within depths: intervals that reach into them, stations that stand in them."""
        if wanted == INTERVAL:
            upper, lower = self.interval_edges
            return tuple(np.flatnonzero((lower > top) & (upper < base)).tolist())
        inside = self.depths.column & (self.depths.stations >= top) & (self.depths.stations <= base)
        return self.converted(STATION, np.flatnonzero(inside).tolist(), wanted)

    def row_at(self, wanted: str, depth: float) -> int | None:
        """The row of a level at a depth: the interval around it, or the nearest station."""
        if wanted == INTERVAL:
            upper, lower = self.interval_edges
            inside = np.flatnonzero((upper <= depth) & (depth <= lower))
            return int(inside[0]) if inside.size else None
        at = np.flatnonzero(self.depths.column)
        if not at.size:
            return None
        nearest = int(at[np.argmin(np.abs(self.depths.stations[at] - depth))])
        rows = self.converted(STATION, (nearest,), wanted)
        return rows[0] if rows else None


def carried(before: Shown, after: Shown, level: str, rows: Sequence[int]) -> tuple[int, ...]:
    """The rows of a new result that chosen rows of the one before stand for.

    Stations are known by their labels, visits by their readings, intervals by their stations, or else by the depths
    that they reach over; what is no longer there falls out.

    Parameters
    ----------
    before, after : Shown
        Of the same survey, in the same depth scale.
    level : str
        What the rows are.
    rows : sequence of int
        Of `before`.
    """
    if level == STATION:
        return _stations_again(before, after, rows)
    if level == VISIT:
        return after.converted(READING, before.converted(VISIT, rows, READING), VISIT)
    if level == INTERVAL:
        old, new = before.results.intervals.densities.pairs, after.results.intervals.densities.pairs
        place = {label: station for station, label in enumerate(after.results.stations.label)}
        at = {pair: row for row, pair in enumerate(zip(new.top.tolist(), new.base.tolist(), strict=True))}
        labels = before.results.stations.label
        found: list[int] = []
        for row in rows:
            pair = (place.get(labels[old.top[row]], -1), place.get(labels[old.base[row]], -1))
            if pair in at:
                found.append(at[pair])
            else:
                for top, base in before.spans(INTERVAL, (row,)):
                    found += after.rows_between(INTERVAL, top, base)
        return tuple(dict.fromkeys(found))
    return tuple(rows)


def _stations_again(before: Shown, after: Shown, rows: Sequence[int]) -> tuple[int, ...]:
    place = {label: station for station, label in enumerate(after.results.stations.label)}
    labels = before.results.stations.label
    return tuple(place[labels[row]] for row in rows if labels[row] in place)


def shown(case: Case, results: Results, scale: DepthScale) -> Shown:
    """A result as the window shows it in a depth scale."""
    depths = hole_depths(results, scale)
    plate = survey_plate(results, depths)
    return Shown(case=case, results=results, depths=depths, plate=plate, visits=visit_table(results))
