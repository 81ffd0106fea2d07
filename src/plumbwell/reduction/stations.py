"""Which station each reading belongs to: by label first, then by depth.

Labelled rows found their stations (earliest used row); then rows without a label, all runs together
in time order, join the nearest station on the path within `same_place`, else found one. Rows that are
out of use join stations and never found one.
"""

from __future__ import annotations

from bisect import bisect_left, insort
from dataclasses import dataclass

import numpy as np

from plumbwell.survey.column import (
    Array,
    Column,
    Index,
    Input,
    Law,
    computed,
    constant_column,
    frozen,
    frozen_index,
)
from plumbwell.survey.instrument import Run
from plumbwell.survey.places import Places, Ties
from plumbwell.survey.readings import Readings

NOWHERE = (np.nan, np.nan, np.nan)  # east, north, elevation of a station on the path
ABOVE_ROUNDING = 1e-9  # m; depths come as decimal fractions, whose differences carry rounding


@dataclass(frozen=True, slots=True, kw_only=True)
class SecondPlace:
    """Rows of one label that lie beyond `same_place` of its station: label, the new label, depths in m, row."""

    label: str
    second: str
    depth: float
    second_depth: float
    row: int


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Placement:
    """Stations and the rows that belong to them.

    Parameters
    ----------
    label, role : tuple of str, one a station
    mark_depth, sensor_depth : (s,) array
        Measured depth of mark and sensor, m; NaN for surveyed places.
    east, north, elevation : (s,) array
        Surveyed position of the sensor, m; NaN on the path.
    elevation_sd : (s,) array
        m; NaN: the recipe's depth_sd.
    founder : (s,) int array
        Row that founded each station, -1 for a station that only a tie names.
    station : (n,) int array
        Station of each row, -1 for rows that belong to none.
    row_depth : (n,) array
        Sensor depth of each row, m; for surveyed places the sensor's depth below its station's sensor.
    off_station : (n,) array
        Row's sensor depth less its station's, m along the hole; 0 for rows without a station.
    second_places : tuple of SecondPlace
    unplaced_ties : tuple of str
        Ties at stations that no used row and no place puts anywhere.
    """

    label: tuple[str, ...]
    role: tuple[str, ...]
    mark_depth: Array
    sensor_depth: Array
    east: Array
    north: Array
    elevation: Array
    elevation_sd: Array
    founder: Index
    station: Index
    row_depth: Array
    off_station: Array
    second_places: tuple[SecondPlace, ...]
    unplaced_ties: tuple[str, ...]


class _Stations:
    """Stations while they are being founded."""

    def __init__(self) -> None:
        self.label: list[str] = []
        self.role: list[str] = []
        self.values: list[tuple[float, ...]] = []
        self.founder: list[int] = []
        self.taken: set[str] = set()

    def found(self, label: str, role: str, founder: int, *values: float) -> int:
        """A new station with mark depth, sensor depth, east, north, elevation and its sd; the label gets a letter
        where it is taken."""
        suffix, name = 0, label
        while name in self.taken:
            suffix += 1
            name = label + _letter(suffix)
        self.taken.add(name)
        self.label.append(name)
        self.role.append(role)
        self.values.append(values)
        self.founder.append(founder)
        return len(self.label) - 1


def _letter(number: int) -> str:
    """b, c ... z, then z2, z3 ... for a second, third ... station at one label."""
    return chr(ord("a") + number) if number < 26 else f"z{number - 24}"


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class RowDepths:
    """Depths of every row, (n,): of the mark and of the sensor, m; `above` is the sensor above its mark, m."""

    mark: Column
    sensor: Column
    above: Array


MARK_DEPTH = Law(
    "depth of the mark",
    "depth, or that of the place where none is given, + depth shift of the run",
    "definition",
    lambda depth, place_depth, depth_shift: np.where(np.isnan(depth), place_depth, depth) + depth_shift,
)
SENSOR_DEPTH = Law(
    "depth of the sensor",
    "depth of the mark - sensor offset",
    "definition",
    lambda mark, sensor_offset: mark - np.nan_to_num(sensor_offset),
)


def row_depths(readings: Readings, runs: tuple[Run, ...], places: Places | None) -> RowDepths:
    """Depths of mark and sensor of each row; NaN for rows at surveyed places.

    Sensor depth = depth + depth_shift of the run - sensor_offset. A row without a depth takes that of its place.
    """
    n = len(readings)
    given, place_depth = readings.depth, np.full(n, np.nan)
    if places is not None:
        of_place = dict(zip(places.station, places.depth.values.tolist(), strict=True))
        names = readings.station.names
        code = readings.station.code
        place_depth = np.array([*(of_place.get(name, np.nan) for name in names), np.nan])[code]
        surveyed = np.array([*(name in of_place and np.isnan(of_place[name]) for name in names), False])[code]
        if surveyed.any():
            given = constant_column("depth", "m", np.where(surveyed, np.nan, given.values))
    shift = np.zeros(len(readings.run.names))
    for run in runs:
        if run.name in readings.run.names:
            shift[readings.run.names.index(run.name)] = run.depth_shift
    offset = readings.sensor_offset
    if offset is None:
        offset = constant_column("sensor_offset", "m", np.zeros(n))
    mark = computed(
        "mark_depth", "m", MARK_DEPTH, Input("depth", given),
        Input("place_depth", constant_column("place_depth", "m", place_depth)),
        Input("depth_shift", constant_column("depth_shift", "m", shift[readings.run.code])),
    )
    return RowDepths(
        mark=mark,
        sensor=computed("sensor_depth", "m", SENSOR_DEPTH, Input("mark", mark), Input("sensor_offset", offset)),
        above=frozen(np.nan_to_num(offset.values)),
    )


def placement(
    readings: Readings,
    depths: RowDepths,
    places: Places | None,
    ties: Ties | None,
    *,
    utc: Array,
    same_place: float,
) -> Placement:
    """The station of every row, and what is known of each station's place.

    Parameters
    ----------
    readings, places, ties
        As measured.
    depths : RowDepths
    utc : (n,) array
        UTC of each row, s since 2000-01-01.
    same_place : float
        Rows whose sensor depths differ by up to this are one station, m.
    """
    mark, depth, above = depths.mark.values, depths.sensor.values, depths.above
    order = np.argsort(utc, kind="stable")
    used = readings.use
    station = np.full(len(readings), -1, dtype=np.intp)
    near = same_place + ABOVE_ROUNDING
    stations = _Stations()
    seconds: list[SecondPlace] = []
    place_of = {} if places is None else {name: row for row, name in enumerate(places.station)}

    def surveyed(row: int) -> tuple[float, float, float, float]:
        assert places is not None
        return (
            float(places.east.values[row]),
            float(places.north.values[row]),
            float(places.elevation.values[row]),
            float(places.elevation_sd.values[row]),
        )

    # A label that is given is taken, so that a second place never borrows the name of another station.
    names, code_of = readings.station.names, readings.station.code
    labelled = order[code_of[order] >= 0]
    stations.taken.update(names)
    lowered = depth.copy()
    on_path = {} if places is None else dict(zip(places.station, np.isfinite(places.depth.values), strict=True))
    surveyed_code = np.array([not on_path.get(name, True) for name in names], dtype=bool)
    # A row that has neither depth nor place belongs nowhere.
    active = labelled[used[labelled]]
    active = active[~np.isnan(depth[active]) | surveyed_code[code_of[active]]]
    founder = np.full(len(names), -1)
    founder[code_of[active[::-1]]] = active[::-1]
    labelled = labelled[founder[code_of[labelled]] >= 0]
    beyond = np.abs(depth[labelled] - depth[founder[code_of[labelled]]]) > near
    scattered = {*code_of[labelled[beyond & used[labelled]]].tolist()}
    number_of = np.full(len(names), -1)
    seen, at_first = np.unique(code_of[labelled], return_index=True)
    for code in seen[np.argsort(at_first)].tolist():
        name, first = names[code], int(founder[code])
        place = place_of.get(name)
        role = "column" if place is None else places.role[place]  # type: ignore[union-attr]
        stations.taken.discard(name)
        if surveyed_code[code]:
            east, north, elevation, sd = surveyed(place_of[name])
            number_of[code] = stations.found(
                name, role, first, np.nan, np.nan, east, north, elevation + above[first], sd
            )
            rows = labelled[code_of[labelled] == code]
            lowered[rows] = above[first] - above[rows]
            continue
        sd = np.nan if place is None else surveyed(place)[3]
        number_of[code] = number = stations.found(name, role, first, mark[first], depth[first], *NOWHERE, sd)
        if code not in scattered:
            continue
        founded = [(number, float(depth[first]))]
        left = active[code_of[active] == code]
        while (left := left[np.abs(depth[left] - founded[-1][1]) > near]).size:
            first = int(left[0])
            number = stations.found(name, role, first, mark[first], depth[first], *NOWHERE, sd)
            founded.append((number, float(depth[first])))
            seconds.append(
                SecondPlace(
                    label=name,
                    second=stations.label[number],
                    depth=founded[0][1],
                    second_depth=founded[-1][1],
                    row=first,
                )
            )
        for row in labelled[beyond & (code_of[labelled] == code)].tolist():
            station[row] = next((one for one, at in founded[1:] if abs(depth[row] - at) <= near), -1)
    lost = np.isnan(depth[labelled]) & used[labelled] & ~surveyed_code[code_of[labelled]]
    joins = labelled[~beyond & ~lost]
    station[joins] = number_of[code_of[joins]]
    unplaced: list[str] = []
    if ties is not None:
        for name in ties.station:
            if name in stations.label:
                continue
            place = place_of.get(name)
            if place is None:
                unplaced.append(name)
                continue
            assert places is not None
            at = float(places.depth.values[place])
            stations.taken.discard(name)
            number = stations.found(name, places.role[place], -1, at, at, *surveyed(place))
            if name in names:
                # Rows of that label are all out of use: they join where they can.
                rows = np.flatnonzero(code_of == names.index(name))
                rows = rows[~(np.abs(depth[rows] - at) > near)]
                station[rows] = number
                if np.isnan(at):
                    lowered[rows] = -above[rows]
    _join_by_depth(stations, station, readings, order=order, mark=mark, depth=depth, near=near)
    values = np.array(stations.values, dtype=float).reshape(len(stations.label), 6)
    on_path = ~np.isnan(values[:, 1])
    off = np.zeros(len(readings))
    member = station >= 0
    reference = np.where(on_path, values[:, 1], 0.0)
    off[member] = np.nan_to_num(lowered[member] - reference[station[member]])
    off[np.abs(off) < ABOVE_ROUNDING] = 0.0
    return Placement(
        label=tuple(stations.label),
        role=tuple(stations.role),
        mark_depth=frozen(values[:, 0]),
        sensor_depth=frozen(values[:, 1]),
        east=frozen(values[:, 2]),
        north=frozen(values[:, 3]),
        elevation=frozen(values[:, 4]),
        elevation_sd=frozen(values[:, 5]),
        founder=frozen_index(stations.founder),
        station=frozen_index(station),
        row_depth=frozen(lowered),
        off_station=frozen(off),
        second_places=tuple(seconds),
        unplaced_ties=tuple(unplaced),
    )


def _join_by_depth(
    stations: _Stations,
    station: Index,
    readings: Readings,
    *,
    order: Index,
    mark: Array,
    depth: Array,
    near: float,
) -> None:
    """Rows without a label join the nearest station on the path within `near`, or found one."""
    bare = order[(readings.station.code[order] < 0) & ~np.isnan(depth[order])]
    if bare.size == 0:
        return
    standing = sorted((values[1], number) for number, values in enumerate(stations.values) if not np.isnan(values[1]))
    known: dict[float, int] = {}

    def nearest(at: float) -> int:
        best, distance = -1, np.inf
        place = bisect_left(standing, (at, -1))
        for other, number in standing[max(place - 1, 0) : place + 1]:
            if abs(other - at) <= near and abs(other - at) < distance - ABOVE_ROUNDING:
                best, distance = number, abs(other - at)
        return best

    active = readings.use[bare]
    for row in bare[active].tolist():
        at = float(depth[row])
        number = known.get(at, -1)
        if number < 0:
            number = nearest(at)
            if number < 0:
                number = stations.found(
                    f"{mark[row]:.2f}", "column", row, mark[row], at, *NOWHERE, np.nan
                )
                insort(standing, (at, number))
                known.clear()
            known[at] = number
        station[row] = number
    for row in bare[~active].tolist():
        station[row] = nearest(float(depth[row]))
