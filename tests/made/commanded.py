"""A survey folder reduced by the command line, and what must hold for every one of them."""

import csv
import io
import json
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from plumbwell.cli import main

Rows = list[dict[str, str]]


@dataclass(frozen=True, kw_only=True)
class Commanded:
    """What the command gave: status, what it printed, and its tables as texts."""

    status: int
    out: str
    err: str
    stations: Rows
    intervals: Rows
    readings: Rows
    repeats: Rows
    layers: Rows
    summary: dict[str, Any]

    def gravity(self) -> dict[str, str]:
        """Cells of gravity by station."""
        return {row["station"]: row["gravity [mGal]"] for row in self.stations}

    def densities(self) -> dict[str, str]:
        """Cells of density by interval."""
        return {f"{row['from_station']}~{row['to_station']}": row["density [g/cm3]"] for row in self.intervals}

    def found(self, code: str) -> list[dict[str, str]]:
        """The findings of one code."""
        return [one for one in self.summary["findings"] if one["code"] == code]

    def errors(self) -> set[str]:
        """Codes of the error-grade findings."""
        return {one["code"] for one in self.summary["findings"] if one["severity"] == "error"}


class Command:
    """`plumbwell reduce` in this process."""

    def __init__(self, out: Path, printed: pytest.CaptureFixture[str]) -> None:
        self.folder, self.printed = out, printed

    def refused(self, survey: Path) -> str:
        """What is printed of a survey whose input is wrong; nothing is written."""
        self.printed.readouterr()
        assert main(["reduce", str(survey), "--out", str(self.folder)]) == 1
        out, err = self.printed.readouterr()
        assert out == "" and "Traceback" not in err and not self.folder.exists()
        return err

    def __call__(self, survey: Path) -> Commanded:
        """The survey reduced; what holds for every survey is asserted here."""
        self.printed.readouterr()
        status = main(["reduce", str(survey), "--out", str(self.folder)])
        out, err = self.printed.readouterr()
        assert "Traceback" not in out + err
        texts = {one.name: one.read_text("utf-8") for one in self.folder.iterdir() if one.suffix in (".csv", ".json")}
        tables = {name: list(csv.DictReader(io.StringIO(text))) for name, text in texts.items() if name[-4:] == ".csv"}
        summary = json.loads(texts["summary.json"], parse_constant=_no_number)
        done = Commanded(
            status=status, out=out, err=err, stations=tables["stations.csv"], intervals=tables["intervals.csv"],
            readings=tables["readings_reduced.csv"], repeats=tables["repeats.csv"],
            layers=tables.get("layers.csv", []), summary=summary,
        )  # fmt: skip
        assert status == (3 if done.errors() else 0)
        for name, rows in tables.items():
            for row in rows:
                for heading, cell in row.items():
                    assert not re.fullmatch(r"[+-]?(nan|inf|infinity)", cell or "", re.IGNORECASE), (name, heading, row)
        _check_stations(done)
        _check_intervals(done)
        return done


def _no_number(word: str) -> float:
    raise AssertionError(f"{word} in summary.json")


def _check_stations(done: Commanded) -> None:
    """Gravity with an sd above 0 wherever a used reading stands and it is not the datum; else empty."""
    absolute = done.summary["absolute"]
    for row in done.stations:
        gravity, sd = row["gravity [mGal]"], row["gravity_sd [mGal]"]
        assert sd == "" or float(sd) > 0.0, row
        if gravity == "":
            assert sd == "" and row["anomaly [mGal]"] == "" and row["flags"], row
        elif sd == "":
            # The datum of its part.
            assert not absolute and float(gravity) == 0.0 and float(row["anomaly [mGal]"]) == 0.0, row


def _check_intervals(done: Commanded) -> None:
    """A density has an sd above 0; where there is none, neither sd nor slab form nor anything of it stands."""
    for row in done.intervals:
        of_density = [row[f"{name} [g/cm3]"] for name in ("density", "density_sd", "density_common_sd", "density_slab")]
        if of_density[0] == "":
            assert of_density == [""] * 4 and row["flags"], row
        else:
            assert float(of_density[1]) > 0.0 and float(of_density[2]) >= 0.0 and of_density[3], row
            assert int(row["dof"]) > 0
    for row in done.layers:
        assert (row["density [g/cm3]"] == "") == (row["density_sd [g/cm3]"] == ""), row
        assert row["density_sd [g/cm3]"] == "" or float(row["density_sd [g/cm3]"]) > 0.0, row
