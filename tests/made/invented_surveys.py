"""Small invented surveys, written as folders and worked through."""

import random
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.study.results import Results

DEPTHS = {"A": 20.0, "B": 70.0, "C": 120.0, "D": 170.0, "E": 220.0}
LOOP = "ABCDCBADBCA"
START = datetime(2026, 5, 4, 8, 0, tzinfo=UTC)
SLOPE = 0.3086 - 0.08387 * 2.4
"""mGal/m, in rock of 2.4 g/cm3."""

TOML = """format = "plumbwell-survey/1"

[site]
name = "Invented"
latitude = 47.0
longitude = 9.0
ground_elevation = 500.0
{site}

[instrument.M]
{instrument}

{tables}

[data]
readings = "readings.csv"
time_zone = "UTC"
{data}

[recipe]
{recipe}
"""


class Invented:
    """Readings of an invented shaft: a loop of visits with three readings each, drift 0.02 mGal/h."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.chance = random.Random(11)

    def visits(
        self, stops: str = LOOP, *, run: str = "1", start: float = 0.0, readings: int = 3, quiet: float = 1.0
    ) -> list[dict[str, str]]:
        """Rows of a run that stops at these stations, ten minutes apart; `start` in hours."""
        rows = []
        for number, label in enumerate(stops):
            seat = self.chance.gauss(0.0, 0.003 * quiet)
            for turn in range(readings):
                hours = start + (10.0 * number + turn) / 60.0
                value = 4000.0 + SLOPE * DEPTHS[label] + 0.02 * hours + seat + self.chance.gauss(0.0, 0.003 * quiet)
                rows.append(
                    {
                        "time": f"{START + timedelta(hours=hours):%Y-%m-%dT%H:%M:%SZ}",
                        "run": run,
                        "station": label,
                        "depth [m]": f"{DEPTHS[label]}",
                        "reading [mGal]": f"{value:.4f}",
                    }
                )
        return rows

    def survey(self, rows: list[dict[str, str]] | None = None, **more: Any) -> Results:
        """The survey written to the folder (see `written`), read and reduced."""
        return reduce(Case(survey=read_survey(self.written(rows, **more))))

    def written(
        self,
        rows: list[dict[str, str]] | None = None,
        *,
        site: str = "",
        instrument: str = 'applied = ["tide"]',
        tables: str = "",
        data: str = "",
        recipe: str = 'tide = "none"',
        files: dict[str, str] | None = None,
    ) -> Path:
        """The folder, with the survey in it."""
        rows = self.visits() if rows is None else rows
        heads = list(dict.fromkeys(key for row in rows for key in row))
        lines = [",".join(heads), *(",".join(row.get(key, "") for key in heads) for row in rows)]
        text = TOML.format(site=site, instrument=instrument, tables=tables, data=data, recipe=recipe)
        for name, content in {
            "readings.csv": "\n".join(lines) + "\n",
            "survey.toml": text,
            **(files or {}),
        }.items():
            (self.folder / name).write_text(content, encoding="utf-8")
        return self.folder
