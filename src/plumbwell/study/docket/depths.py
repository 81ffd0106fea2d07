"""Findings about places: where stations stand, and what their depths rest on."""

from __future__ import annotations

from collections.abc import Iterator
from math import hypot

import numpy as np

from plumbwell.density.interval import SIDEWAYS
from plumbwell.study.docket.wording import (
    amount,
    counted,
    depth,
    interval,
    line,
    listed,
    numbers,
    stations,
)
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results

IN_AIR = 0.01
"""m; a smaller share of an interval above the ground is rounding."""


def second_places(results: Results) -> Iterator[Finding]:
    """Labels that stand at two places."""
    placed = results.stations.located.placement
    for one in placed.second_places:
        row = amount(line(results, one.row), 0)
        yield Finding(
            code="label_twice",
            severity="error",
            place=f"{one.label}; {results.survey.readings.raw.file}, row {row}",
            text=f'The label "{one.label}" stands at two places, {amount(one.depth, 2)} m and '
            f"{amount(one.second_depth, 2)} m (first in row {row}), farther apart than same_place, "
            f'{amount(results.recipe.same_place, 2)} m: the second is a station of its own, "{one.second}".',
            mend="Correct the depth or the label; or raise same_place, if it is one stop.",
            stations=tuple(sorted(placed.label.index(name) for name in (one.label, one.second))),
            rows=(one.row,),
        )


def path_ends(results: Results) -> Iterator[Finding]:
    """Stations beyond the last point of the path."""
    beyond = np.flatnonzero(results.stations.located.positions.extrapolated)
    path = results.survey.path
    if beyond.size and path is not None:
        yield Finding(
            code="path_extrapolated",
            severity="note",
            place=stations(results, beyond, 3),
            text=f"The path ends at {amount(float(path.depth.values[-1]), 1)} m; beyond, the hole is taken "
            f"straight on for {counted(beyond.size, 'station')} ({stations(results, beyond)}, down to "
            f"{depth(results, int(beyond[-1]))}).",
            mend="Bring in the deviation survey to the bottom of the hole.",
            stations=numbers(beyond),
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
    labels = results.stations.label
    words = [f"{labels[one]} for {labels[other]}" for one, other in close]
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
