"""Invented surveys of many short runs, for networks whose border is solved in bands, and how to make it so."""

from dataclasses import dataclass, field

import numpy as np
import pytest

from made_surveys import HOUR, MICROGAL, MILLIGAL, Row
from plumbwell.reduction import banded, design
from plumbwell.survey.instrument import Instrument, Tare

RUNS = 36
METER = Instrument(
    name="A", reading_floor=2 * MICROGAL, reseating_sd=4 * MICROGAL, drift_rate_sd=0.05 * MILLIGAL / HOUR,
    station_floor=2.5 * MICROGAL,
)  # fmt: skip
WAYS = ("chain", "base", "shuffled", "two parts", "ties", "tares", "base, ties and tares")


@dataclass
class ManyRuns:
    """Rows and statements of one survey; `parts` the numbers of its stations by network part, `tied` which are."""

    rows: list[Row]
    parts: list[list[str]]
    tied: list[bool]
    tares: tuple[Tare, ...] = ()
    ties: dict[str, tuple[float, float]] = field(default_factory=dict)


def depth_of(station: int) -> float:
    """Depth of a station, m; one after the other from the top down."""
    return 25.0 * station + 3.0 * (station % 4)


def label_of(station: int) -> str:
    """Label of a station."""
    return f"S{station:03d}"


def stops_of(way: str, number: int) -> tuple[int, ...]:
    """Stations of one run, in the order in which they are read."""
    level = int(np.random.default_rng(8).permutation(RUNS)[number]) if way == "shuffled" else number
    if way == "two parts":
        first = 100 * (number % 2) + number // 2
        return (first, first + 1, first + 2, first)
    if way.startswith("base"):
        return (0, level + 1, level + 2, 0, level + 1)
    return (level, level + 1, level + 2, level, level + 1)


def many_runs(way: str, *, runs: int = RUNS, seed: int = 1) -> ManyRuns:
    """A survey of many runs, each of which shares stations with few others, or with all at one base."""
    chance = np.random.default_rng(seed)
    rows: list[Row] = []
    stations: set[int] = set()
    for number in range(runs):
        time, rate, bias = 86400.0 * number, 0.03 * chance.standard_normal(), chance.standard_normal()
        for station in stops_of(way, number):
            stations.add(station)
            effect = 4.0 * chance.standard_normal()
            for _ in range(int(chance.choice([1, 2]))):
                value = 9.0 * depth_of(station) + 1e3 * bias + rate * (time % 86400.0) / 36.0
                rows.append(
                    Row(
                        time=time, reading=(value + effect + 2.0 * chance.standard_normal()) * MICROGAL,
                        depth=depth_of(station), station=label_of(station), run=f"{number:03d}",
                    )
                )
                time += 60.0
            time += 900.0 + 300.0 * chance.random()
    names = [label_of(one) for one in sorted(stations)]
    if way == "two parts":
        return ManyRuns(
            rows=rows, parts=[[one for one in names if one < "S100"], [one for one in names if one >= "S100"]],
            tied=[False, False],
        )
    ties, tares = {}, ()
    if "ties" in way:
        level = 9.81 * 1e-2  # any level does, and a low one is not rounded
        ties = {
            label_of(one): (level + 9.0 * depth_of(one) * MICROGAL + off * MICROGAL, 5 * MICROGAL)
            for one, off in ((0, 4.0), (RUNS // 2, -3.0), (RUNS, 6.0))
        }
    if "tares" in way:
        starts = {row.run: row.time for row in reversed(rows)}
        of_run = {run: sorted({row.time for row in rows if row.run == run}) for run in starts}
        # Before the last stop of one run, after the first of another, and one whose size is nearly known.
        third = next(t for a, t in zip(of_run["020"], of_run["020"][1:], strict=False) if t - a > 600.0)
        tares = (
            Tare(run="007", time=of_run["007"][-1] - 600.0),
            Tare(run="020", time=third, size=5 * MICROGAL, size_sd=8 * MICROGAL),
            Tare(run="025", time=of_run["025"][-1] - 600.0),
        )
    return ManyRuns(rows=rows, parts=[names], tied=[bool(ties)], tares=tares, ties=ties)


def in_bands(patch: pytest.MonkeyPatch) -> None:
    """Let every border of some dozen unknowns be solved in many blocks."""
    for module in (banded, design):
        patch.setattr(module, "ONE_BLOCK", 20)
    patch.setattr(banded, "LEAST_BLOCK", 6)
    patch.setattr(design, "NEAR", 0)
