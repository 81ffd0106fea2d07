"""Invented networks of any number of runs: out and back over twelve stations each, the base at both ends and amid."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

from plumbwell.study.case import Case

# The maker of surveys that the tests share; these files are run by hand, where nobody else says where it is.
sys.path.insert(0, str(Path(__file__).parents[1] / "made"))
from made_surveys import Row, made_case  # noqa: E402
from plumbwell.survey.instrument import Instrument, Tare  # noqa: E402

UGAL, MGAL, HOUR = 1e-8, 1e-5, 3600.0
STOPS_A_RUN, READINGS_A_RUN = 27, 60
METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=3 * UGAL)


def rows_of(readings: int, *, gross: float = 0.0, seed: int = 5) -> tuple[list[Row], list[Tare], np.ndarray]:
    """Rows, listed tares and true gravity: a tenth as many stations as readings, each read in two runs or so.

    Every fifth run jumps by 50 uGal; a share `gross` of the readings is off by 50 to 300 uGal.
    """
    chance = np.random.default_rng(seed)
    runs = max(readings // READINGS_A_RUN, 1)
    stations = max(readings // 10, STOPS_A_RUN)
    step = max((stations - 12) / max(runs - 1, 1), 0.0)
    gravity = np.concatenate([[0.0], np.cumsum(chance.uniform(0.1, 0.2, stations + 14))]) * MGAL
    rows, tares = [], []
    for run in range(runs):
        first = round(run * step)
        there = list(range(first + 1, first + 13))
        stops = [0, *there, 0, *there[::-1], 0]
        count = np.full(STOPS_A_RUN, 2)
        count[chance.choice(STOPS_A_RUN, READINGS_A_RUN - 2 * STOPS_A_RUN, replace=False)] += 1
        start, bias, rate = run * 8.0 * HOUR, chance.normal() * MGAL, chance.normal() * 0.01 * MGAL / HOUR
        jump = int(chance.integers(3, 24)) if run % 5 == 0 else STOPS_A_RUN
        if jump < STOPS_A_RUN:
            tares.append(Tare(run=f"r{run}", time=start + jump * 600.0))
        for stop, station in enumerate(stops):
            effect = 3 * UGAL * chance.standard_normal() + (50 * UGAL if stop >= jump else 0.0)
            for turn in range(int(count[stop])):
                time = start + stop * 600.0 + turn * 60.0
                value = gravity[station] + bias + rate * (time - start) + effect + 3 * UGAL * chance.standard_normal()
                if chance.random() < gross:
                    value += chance.choice([-1.0, 1.0]) * chance.uniform(50.0, 300.0) * UGAL
                rows.append(
                    Row(time=time, reading=value, depth=10.0 + 1.5 * station, station=f"S{station:05d}", run=f"r{run}")
                )
    return rows, tares, gravity


def network_case(readings: int, *, gross: float = 0.0, **recipe: object) -> Case:
    """A network of about so many readings."""
    rows, tares, _ = rows_of(readings, gross=gross)
    return made_case(rows, instruments=(METER,), tares=tuple(tares), **recipe)


def write_folder(folder: Path, readings: int, *, gross: float, recipe: str) -> None:
    """The same as a survey folder."""
    from datetime import UTC, datetime, timedelta

    rows, tares, _ = rows_of(readings, gross=gross)
    begin = datetime(2026, 1, 1, tzinfo=UTC)

    def at(time: float) -> str:
        return (begin + timedelta(seconds=float(time))).strftime("%Y-%m-%dT%H:%M:%SZ")

    lines = ["time,run,station,depth [m],reading [mGal]"]
    lines += [
        f"{at(row.time)},{row.run},{row.station},{row.depth:.2f},{3000.0 + row.reading / MGAL:.4f}" for row in rows
    ]
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "readings.csv").write_text("\n".join(lines) + "\n", "utf-8")
    jumps = "".join(f'[[tare]]\nrun = "{one.run}"\ntime = "{at(one.time)}"\n' for one in tares)
    (folder / "survey.toml").write_text(
        'format = "plumbwell-survey/1"\n[site]\nname = "Invented network"\nlatitude = 50.0\nlongitude = 8.0\n'
        "ground_elevation = 500.0\n[instrument.A]\nreading_floor = 0.002\nreseating_sd = 0.003\n"
        f'{jumps}[data]\nreadings = "readings.csv"\n[recipe]\ntide = "none"\n{recipe}\n',
        "utf-8",
    )
