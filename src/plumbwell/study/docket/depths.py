"""Findings about places: where stations stand, and what their depths rest on."""

from __future__ import annotations

from collections.abc import Iterator
from math import hypot

import numpy as np

from plumbwell.density.interval import SIDEWAYS
from plumbwell.reduction.positions import well_path
from plumbwell.reduction.stations import ABOVE_ROUNDING
from plumbwell.study.docket.wording import (
    LISTED,
    amount,
    counted,
    depth,
    interval,
    label,
    line,
    lines,
    listed,
    numbers,
    stations,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.column import Array
from plumbwell.survey.errors import shown

IN_AIR = 0.01
"""m; a smaller share of an interval above the ground is rounding."""

ABOVE = 2.0
"""m; the sensor of a station at the ground may stand so high."""

HIGH_ABOVE = 20.0
"""m above the ground; higher than the towers on which gravity is read."""

FAR_ASIDE = 5000.0
"""m from the collar sideways."""

THICK, THICKER = 100.0, 10.0
"""m, and times the median thickness: an interval beyond both stands out."""

BEYOND, BEYOND_SHARE = 20.0, 0.1
"""m, and share of the path, beyond which a straight extension of the path is far."""


def second_places(results: Results) -> Iterator[Finding]:
    """Labels that stand at two places."""
    placed = results.stations.located.placement
    for one in placed.second_places:
        row, name, second = line(results, one.row), shown(one.label), shown(one.second)
        yield Finding(
            code="label_twice",
            severity="error",
            place=f"{name}; {results.survey.readings.raw.file}, row {row}",
            text=f'The label "{name}" stands at two places, {amount(one.depth, 2)} m and '
            f"{amount(one.second_depth, 2)} m (first in row {row}), farther apart than same_place, "
            f'{amount(results.recipe.same_place, 2)} m: the second is a station of its own, "{second}".',
            mend="Correct the depth or the label; or raise same_place, if it is one stop.",
            stations=tuple(sorted(placed.label.index(name) for name in (one.label, one.second))),
            rows=(one.row,),
        )


def places_disagree(results: Results) -> Iterator[Finding]:
    """Rows whose depth puts a station elsewhere than places.csv does."""
    readings, places, site = results.survey.readings, results.survey.places, results.survey.site
    if places is None:
        return
    place_of = {name: row for row, name in enumerate(places.station)}
    row_of = np.array([*(place_of.get(name, -1) for name in readings.station.names), -1])
    place = row_of[readings.station.code]
    rows = np.flatnonzero((place >= 0) & readings.use & np.isfinite(readings.depth.values))
    if not rows.size:
        return
    shifts = {run.name: run.depth_shift for run in results.survey.runs}
    shift = np.array([shifts.get(name, 0.0) for name in readings.run.names])[readings.run.code]
    path = well_path(results.survey.path, north_correction=site.north_correction)

    def elevation(depth_of: Array) -> Array:
        return site.datum_elevation - path.at(depth_of + shift[rows])[0]

    stated = elevation(readings.depth.values[rows])
    on_path = np.isfinite(places.depth.values[place[rows]])
    of_place = np.where(
        on_path, elevation(places.depth.values[place[rows]]), places.elevation.values[place[rows]]
    )
    apart = np.abs(stated - of_place)
    far = apart > results.recipe.same_place + ABOVE_ROUNDING
    # A station whose rows have several depths is told already, where its place is on the path.
    told = {one.label for one in results.stations.located.placement.second_places}
    for code in np.unique(readings.station.code[rows[far]]).tolist():
        members = rows[far & (readings.station.code[rows] == code)]
        worst = int(np.flatnonzero(rows == members[0])[0])
        name, at = readings.station.names[code], int(place[members[0]])
        surveyed = not on_path[worst]
        if not surveyed and name in told:
            continue
        there = f"depth {amount(float(places.depth.values[at]), 2)} m"
        taken = "the depth of the readings is taken"
        if surveyed:
            there = f"elevation {amount(float(places.elevation.values[at]), 2)} m"
            taken = "the place is taken"
        known = results.stations.label
        yield Finding(
            code="label_twice",
            severity="error",
            place=f"{shown(name)}; {lines(results, members)}",
            text=f'"{shown(name)}" stands at two places: the readings give depth '
            f"{amount(float(readings.depth.values[members[0]]), 2)} m (elevation {amount(float(stated[worst]), 2)} m), "
            f"places.csv {there}, {amount(float(apart[worst]), 2)} m apart in height, more than same_place, "
            f"{amount(results.recipe.same_place, 2)} m; {taken}.",
            mend="Correct the one that is wrong; or leave the depth out of the rows of a surveyed place.",
            stations=(known.index(name),) if name in known else (),
            rows=numbers(members),
        )


def places_far(results: Results) -> Iterator[Finding]:
    """Surveyed places kilometres from the collar: map coordinates where distances belong."""
    places = results.survey.places
    if places is None:
        return
    away = np.hypot(places.east.values, places.north.values)
    far = np.flatnonzero(away > FAR_ASIDE)
    if far.size:
        names = listed([shown(places.station[one]) for one in far[:LISTED].tolist()] + [""] * (far.size - LISTED))
        yield Finding(
            code="place_far",
            severity="look",
            place="places.csv",
            text=f"{counted(far.size, 'place lies', 'places lie')} more than {FAR_ASIDE / 1000.0:g} km from the collar "
            f"sideways ({names}; up to {amount(float(np.max(away[far])) / 1000.0, 1)} km): map coordinates?",
            mend="Write east [m] and north [m] counted from the collar.",
        )


def mostly_above_ground(results: Results) -> bool:
    """True when more than half of the column's stations stand above the ground, or one by more than 20 m."""
    elevation = results.stations.located.positions.elevation.values
    if not elevation.size or elevation[0] <= results.survey.site.ground_elevation + ABOVE:
        return False
    above = _above_ground(results)
    most = 2 * int(np.count_nonzero(above > ABOVE)) > above.size
    return most or float(np.max(above, initial=0.0)) > HIGH_ABOVE


def _above_ground(results: Results) -> Array:
    """Heights of the column's stations over the ground, (c,), m."""
    elevation = results.stations.located.positions.elevation.values
    column = np.array([role == "column" for role in results.stations.role], dtype=bool)
    return elevation[column] - results.survey.site.ground_elevation


def above_ground(results: Results) -> Iterator[Finding]:
    """Most of a column above the ground, or a station high above it: depths with the wrong sign."""
    if not mostly_above_ground(results):
        return
    above = _above_ground(results)
    number = int(np.count_nonzero(above > ABOVE))
    mark = results.stations.located.mark_depth.values
    why = ""
    if np.any(mark < 0.0):
        why = " Depths are negative, and depth counts downward."
    yield Finding(
        code="above_ground",
        severity="look",
        place="stations",
        text=f"{number} of {counted(above.size, 'station')} of the column {'stands' if number == 1 else 'stand'} above "
        f"the ground, up to {amount(float(above.max()), 1)} m.{why}",
        mend="See the sign of the depths, the inclinations of the path, and the elevations of ground, collar and "
        "places; a tower above the ground is right so.",
    )


def one_thick(results: Results) -> Iterator[Finding]:
    """One interval far thicker than all others: a mistyped depth."""
    thickness = results.intervals.densities.thickness.values
    if thickness.size < 4:
        return
    worst = int(thickness.argmax())
    largest = float(thickness[worst])
    if largest <= THICK:
        return
    median = float(np.median(thickness))
    next_largest = float(np.partition(thickness, -2)[-2])
    if largest > THICKER * median and largest > 3.0 * next_largest:
        yield Finding(
            code="interval_thick",
            severity="look",
            place=interval(results, worst),
            text=f"{amount(largest, 1)} m lie between these stations, and {amount(median, 1)} m in the median between "
            "the others: is a depth mistyped?",
            mend="Compare the depths with the field notes; a gap that was left on purpose is right so.",
            intervals=(worst,),
        )


def path_ends(results: Results) -> Iterator[Finding]:
    """Stations beyond the last point of the path; far beyond it wants a look."""
    beyond = np.flatnonzero(results.stations.located.positions.extrapolated)
    path = results.survey.path
    if beyond.size and path is not None:
        end = float(path.depth.values[-1])
        last = float(np.max(results.stations.located.mark_depth.values[beyond]))
        far = last - end > max(BEYOND, BEYOND_SHARE * end)
        pairs = results.intervals.densities.pairs
        yield Finding(
            code="path_extrapolated",
            severity="look" if far else "note",
            place=stations(results, beyond, 3),
            text=f"The path ends at {amount(end, 1)} m; beyond, the hole is taken "
            f"straight on for {counted(beyond.size, 'station')} ({stations(results, beyond)}, down to "
            f"{depth(results, int(beyond[-1]))}).",
            mend="Bring in the deviation survey to the bottom of the hole"
            + ("; or correct the depth, if it is mistyped." if far else "."),
            stations=numbers(beyond),
            intervals=numbers(np.flatnonzero(np.isin(pairs.base, beyond) | np.isin(pairs.top, beyond))),
        )


def path_assumed(results: Results) -> Iterator[Finding]:
    """Without a deviation survey the hole is vertical."""
    if results.survey.path is None and np.isfinite(results.stations.located.sensor_depth.values).any():
        yield Finding(
            code="path_assumed",
            severity="note",
            place="path",
            text="No deviation survey is named: the hole is taken as vertical, and depth along it as vertical depth.",
            mend="Name a path in [data], if the hole is not vertical.",
        )


def close_stations(results: Results) -> Iterator[Finding]:
    """Stations too near one another for an interval."""
    close = results.intervals.densities.pairs.close
    if not close:
        return
    words = [f"{label(results, one)} for {label(results, other)}" for one, other in close]
    yield Finding(
        code="close_stations",
        severity="note",
        place=stations(results, [one for one, _ in close], 3),
        text=f"{counted(len(close), 'station lies', 'stations lie')} less than "
        f"{amount(results.recipe.min_thickness, 2)} m (min_thickness) from the one that stands in intervals "
        f"instead: {listed(words)}.",
        mend="Nothing; or correct the depths, if these are one stop.",
        stations=tuple(sorted({one for pair in close for one in pair})),
    )


def crosses_ground(results: Results) -> Iterator[Finding]:
    """Intervals partly above the ground."""
    elevation = results.stations.located.positions.elevation.values
    ground = results.survey.site.ground_elevation
    if not elevation.size or elevation[0] <= ground + IN_AIR:
        return
    pairs = results.intervals.densities.pairs
    top, base = elevation[pairs.top], elevation[pairs.base]
    for number in np.flatnonzero((top > ground + IN_AIR) & (base < ground - IN_AIR)).tolist():
        air, whole = float(top[number]) - ground, float(top[number] - base[number])
        yield Finding(
            code="crosses_ground",
            severity="look",
            place=interval(results, number),
            text=f"{amount(air, 2)} m of the {amount(whole, 2)} m between these stations lie above the "
            "ground: the density is the mean over rock and what stands above it.",
            mend="Read a station at the ground, or leave this interval out of what is told of the rock.",
            intervals=(number,),
        )


def far_apart(results: Results) -> Iterator[Finding]:
    """Neighbours that stand too far apart sideways to have rock between them, one below the other."""
    pairs = results.intervals.densities.pairs
    if pairs.joined.all():
        return
    where = results.stations.located.positions
    for number in np.flatnonzero(~pairs.joined).tolist():
        top, base = int(pairs.top[number]), int(pairs.base[number])
        east, north = (float(one.values[base] - one.values[top]) for one in (where.east, where.north))
        high = float(where.elevation.values[top] - where.elevation.values[base])
        yield Finding(
            code="far_apart",
            severity="look",
            place=interval(results, number),
            text=f"The two stations stand {amount(hypot(east, north), 1)} m apart sideways and "
            f"{amount(high, 1)} m in height, more than {SIDEWAYS:g} to 1: no density is given between them.",
            mend="Give one of them the role base in places.csv, so that the next station takes its place.",
            intervals=(number,),
        )


def depth_assumed(results: Results) -> Iterator[Finding]:
    """The sd of depths is the default, not one that was stated."""
    survey = results.survey
    if "depth_sd" in survey.recipe_given or results.recipe.depth_sd != survey.recipe.depth_sd:
        return
    stated = results.stations.located.placement.elevation_sd
    left = int(np.count_nonzero(np.isnan(stated)))
    if left:
        yield Finding(
            code="depth_error_assumed",
            severity="note",
            place="recipe, depth_sd",
            text=f"The depth error of {counted(left, 'station')} is assumed, not stated: "
            f"{amount(results.recipe.depth_sd, 3)} m (depth_sd).",
            mend="Write depth_sd, or elevation_sd in places.csv, as the depths were measured.",
        )
