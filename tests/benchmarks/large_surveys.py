"""Surveys of any size with everything that the chain takes out: table, tide, tilt, pressure, path."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import numpy as np

from plumbwell.study.case import Case
from plumbwell.survey.column import constant_column
from plumbwell.survey.instrument import Calibration, Instrument
from plumbwell.survey.places import Path as WellTrace
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.site import Site
from plumbwell.survey.survey import Survey

# The maker of surveys that the tests share; these files are run by hand, where nobody else says where it is.
sys.path.insert(0, str(Path(__file__).parents[1] / "made"))
from made_surveys import Row, made_readings_of  # noqa: E402

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
SITE = Site(name="large", latitude=0.95, longitude=-0.05, ground_elevation=210.0, collar_elevation=210.0)
START = 8.3e8  # s since 2000-01-01: spring of 2026


def large_case(n_readings: int, n_stations: int, **recipe: object) -> Case:
    """Four runs that go down the hole stop by stop, back to the top station after every fourth stop."""
    chance = np.random.default_rng(7)
    depth = 50.0 + np.cumsum(chance.uniform(8.0, 22.0, n_stations))
    gravity = 0.09 * MGAL * depth
    # A fifth of the visits are at the top station, the others go round the stations.
    runs, per_visit = 4, 4 if n_readings < 10 * n_stations else 8
    stops = np.arange(n_readings // per_visit)
    station = np.where(stops % 5 == 4, 0, (stops - stops // 5) % n_stations)
    rows = []
    for stop, at in zip(stops.tolist(), station.tolist(), strict=True):
        run = stop * runs // len(stops)
        effect = 4 * UGAL * chance.standard_normal()
        for again in range(per_visit):
            hours = (stop * 0.12 + again / 60.0) * min(1.0, 1000.0 / len(stops))
            value = gravity[at] + effect + 0.02 * MGAL * hours + 3 * UGAL * chance.standard_normal()
            rows.append(
                Row(
                    time=START + run * 4320.0 + hours * HOUR, reading=(value / MGAL + 1500.0) / 1.003,
                    depth=float(depth[at]), station=f"S{at:05d}", run=str(run + 1),
                )
            )  # fmt: skip
    readings = made_readings_of(rows)
    n = len(rows)
    readings = replace(
        readings,
        reading=constant_column("reading", "counts", readings.reading.values),
        tilt_x=constant_column("tilt_x", "rad", chance.normal(0.0, 3e-5, n)),
        tilt_y=constant_column("tilt_y", "rad", chance.normal(0.0, 3e-5, n)),
        pressure=constant_column("pressure", "Pa", 98900.0 + 200.0 * np.sin(np.arange(n) / 60.0)),
    )
    counter = np.arange(0.0, 20000.0, 100.0)
    table = Calibration(
        counter=constant_column("counter", "counts", counter),
        gravity=constant_column("gravity", "m/s2", 1.003 * MGAL * counter + 1e-12 * counter**2),
    )
    deepest = float(depth[-1]) + 100.0
    stations_of_path = np.linspace(0.0, deepest, 60)
    trace = WellTrace(
        depth=constant_column("depth", "m", stations_of_path),
        inclination=constant_column("inclination", "rad", np.linspace(0.0, 0.5, 60)),
        azimuth=constant_column("azimuth", "rad", np.linspace(0.3, 0.6, 60)),
    )
    meter = Instrument(name="A", calibration=table, reading_floor=2 * UGAL, reseating_sd=4 * UGAL)
    return Case(
        survey=Survey(
            site=SITE, instruments=(meter,), readings=readings, path=trace, recipe=replace(Recipe(), **recipe)
        )
    )
