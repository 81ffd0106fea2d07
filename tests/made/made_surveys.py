"""Surveys made from plain rows in memory, for tests that need many small ones."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from plumbwell.study.case import Case
from plumbwell.survey.column import constant_column, frozen_index, labels
from plumbwell.survey.instrument import Instrument, Run, Tare
from plumbwell.survey.places import Places, Ties
from plumbwell.survey.readings import RawTable, Readings
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.site import Site
from plumbwell.survey.survey import Survey

MILLIGAL = 1e-5
MICROGAL = 1e-8
HOUR = 3600.0
SITE = Site(
    name="made", latitude=0.9, longitude=0.2, ground_elevation=100.0, collar_elevation=100.0, geoid_height=40.0
)
# Without tide, so that the rows themselves are what the network sees.
STILL = Recipe(tide="none", reference_density=2600.0)


@dataclass(frozen=True, kw_only=True)
class Row:
    """One reading: time in s, reading and its sd in m/s2, depth in m."""

    time: float
    reading: float
    depth: float = np.nan
    station: str | None = None
    run: str = "1"
    instrument: str = "A"
    visit: str | None = None
    reading_sd: float = np.nan
    sensor_offset: float = np.nan
    use: bool = True


def made_readings_of(rows: list[Row]) -> Readings:
    """The rows as readings."""
    number = len(rows)

    def column(key: str, unit: str):
        return constant_column(key, unit, [getattr(row, key) for row in rows])

    def optional(key: str, unit: str):
        one = column(key, unit)
        return None if np.isnan(one.values).all() else one

    use = np.array([row.use for row in rows], dtype=bool)
    use.flags.writeable = False
    return Readings(
        raw=RawTable(file="readings.csv", headings=(), cells=(), lines=frozen_index(np.arange(2, number + 2))),
        time=column("time", "s"),
        run=labels([row.run for row in rows]),
        instrument=labels([row.instrument for row in rows]),
        station=labels([row.station for row in rows]),
        visit=labels([row.visit for row in rows]),
        depth=column("depth", "m"),
        reading=column("reading", "m/s2"),
        reading_sd=optional("reading_sd", "m/s2"),
        sensor_offset=optional("sensor_offset", "m"),
        use=use,
        note=("",) * number,
    )


def made_ties(ties: dict[str, tuple[float, float]]) -> Ties | None:
    """Ties from label -> (gravity, sd), m/s2."""
    if not ties:
        return None
    return Ties(
        station=tuple(ties),
        gravity=constant_column("gravity", "m/s2", [one[0] for one in ties.values()]),
        gravity_sd=constant_column("gravity_sd", "m/s2", [one[1] for one in ties.values()]),
    )


def made_places(places: dict[str, dict[str, Any]]) -> Places | None:
    """Places from label -> what is known of it; `role` is "column" unless given."""
    if not places:
        return None

    def column(key: str):
        return constant_column(key, "m", [one.get(key, np.nan) for one in places.values()])

    return Places(
        station=tuple(places),
        depth=column("depth"),
        east=column("east"),
        north=column("north"),
        elevation=column("elevation"),
        elevation_sd=column("elevation_sd"),
        role=tuple(one.get("role", "column") for one in places.values()),
        note=("",) * len(places),
    )


def made_case(
    rows: list[Row],
    *,
    instruments: tuple[Instrument, ...] = (Instrument(name="A"),),
    runs: tuple[Run, ...] = (),
    tares: tuple[Tare, ...] = (),
    ties: dict[str, tuple[float, float]] | None = None,
    places: dict[str, dict[str, Any]] | None = None,
    site: Site = SITE,
    recipe: Recipe = STILL,
    **changed: Any,
) -> Case:
    """A case; `changed` are keys of the recipe."""
    survey = Survey(
        site=site,
        instruments=instruments,
        runs=runs,
        tares=tares,
        readings=made_readings_of(rows),
        ties=made_ties(ties or {}),
        places=made_places(places or {}),
        recipe=replace(recipe, **changed),
    )
    return Case(survey=survey)


def loop(
    chance: np.random.Generator,
    stops: str,
    *,
    depth: dict[str, float],
    gravity: dict[str, float],
    run: str = "1",
    start: float = 0.0,
    drift: tuple[float, ...] = (0.02 * MILLIGAL / HOUR,),
    bias: float = 0.0,
    reading_noise: float = 3 * MICROGAL,
    reseating: float = 4 * MICROGAL,
    counts: tuple[int, ...] = (3,),
    pause: float = 1800.0,
    instrument: str = "A",
    reading_sd: tuple[float, ...] = (),
) -> list[Row]:
    """Rows of one run that stops at the stations named by the letters of `stops`.

    `drift` holds the coefficients of the powers of time since the start, from the first on; `counts` and
    `reading_sd` are drawn from.
    """
    rows, time = [], start
    for stop in stops:
        effect = reseating * chance.standard_normal()
        for _ in range(int(chance.choice(counts))):
            past = time - start
            sd = float(chance.choice(reading_sd)) if reading_sd else np.nan
            noise = (reading_noise if np.isnan(sd) else sd) * chance.standard_normal()
            drifted = bias + sum(c * past ** (p + 1) for p, c in enumerate(drift))
            rows.append(
                Row(
                    time=time,
                    reading=gravity[stop] + drifted + effect + noise,
                    depth=depth[stop],
                    station=stop,
                    run=run,
                    instrument=instrument,
                    reading_sd=sd,
                )
            )
            time += 60.0
        time += pause
    return rows
