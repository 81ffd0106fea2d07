"""Window, command line and Python, cell by cell, on both samples and the real shaft.

The tables are those that `plumbwell reduce` writes; what has no column there is worked out again from those that have.
"""

from __future__ import annotations

import csv
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from PySide6.QtCore import Qt

import plumbwell
from driven_desk import Driven, wait_until
from plumbwell.cli import main
from plumbwell.desk.ledger.table import LedgerColumn
from plumbwell.desk.stages import states
from reduced_surveys import MINE, SHAFT, WELL

SURVEYS = pytest.mark.parametrize("folder", [WELL, MINE, SHAFT], ids=lambda folder: folder.name)
FOOT = 0.3048
EPOCH = datetime.fromisoformat("2000-01-01T00:00:00+00:00")

READINGS = {
    "calibrated": "calibrated [mGal]", "tide": "tide [mGal]", "tilt": "tilt [mGal]",
    "pressure_effect": "pressure_effect [mGal]", "to_station": "to_station [mGal]",
    "drift": "drift [mGal]", "visit_effect": "visit_effect [mGal]", "residual": "residual [mGal]",
    "standardised_residual": "standardised_residual", "redundancy": "redundancy",
}  # fmt: skip
STATIONS = {
    "station": "station", "depth": "depth [m]", "tvd": "tvd [m]", "elevation": "elevation [m]", "visits": "visits",
    "gravity": "gravity [mGal]", "normal_gravity": "normal_gravity [mGal]", "free_air": "free_air [mGal]",
    "shell": "shell [mGal]", "anomaly": "anomaly [mGal]",
}  # fmt: skip
INTERVALS = {
    "from_station": "from_station", "to_station": "to_station", "top": "top [m]", "base": "base [m]",
    "thickness": "thickness [m]", "gradient": "gradient [mGal/m]", "density": "density [g/cm3]",
    "density_common_sd": "density_common_sd [g/cm3]", "density_slab": "density_slab [g/cm3]",
    "log_density": "log_density [g/cm3]", "log_coverage": "log_coverage",
    "density_less_log": "density_less_log [g/cm3]",
}  # fmt: skip
SDS = {"anomaly": "gravity_sd [mGal]", "density": "density_sd [g/cm3]",
       "density_less_log": "density_sd [g/cm3]"}  # fmt: skip
CLOSED = 3e-6
"""mGal by which a residual as written may take up what the other cells of its row lost in rounding."""


class Tables:
    """The tables that the command line writes of a folder, and those that Python gives of it."""

    def __init__(self, folder: Path, out: Path) -> None:
        assert main(["reduce", str(folder), "--out", str(out), "--quiet"]) in (0, 3)
        self.results = plumbwell.reduce(plumbwell.read_survey(folder))
        self.written: dict[str, dict[str, list[str]]] = {}
        self.frames = plumbwell.frames(self.results)
        for name in self.frames:
            with (out / f"{name}.csv").open(encoding="utf-8", newline="") as file:
                heads, *rows = list(csv.reader(file))
            self.written[name] = {head: [row[n] for row in rows] for n, head in enumerate(heads)}

    def numbers(self, name: str, heading: str) -> np.ndarray:
        """A written column as numbers, NaN for an empty cell."""
        return np.array([float(cell) if cell else np.nan for cell in self.written[name][heading]])


@pytest.fixture(scope="module")
def tables_of(tmp_path_factory):
    """The tables of a folder, each worked out once."""
    made: dict[Path, Tables] = {}

    def give(folder: Path) -> Tables:
        if folder not in made:
            made[folder] = Tables(folder, tmp_path_factory.mktemp("out") / "tables")
        return made[folder]

    return give


def ledger_of(window: Driven, stage: str) -> dict[str, LedgerColumn]:
    """The columns of a stage's ledger by key."""
    window.stage(stage)
    table = window.work.ledger.table
    assert table is not None and table.stage == stage
    return {one.key: one for one in table.columns}


def alike(values: Any, tables: Tables, name: str, heading: str, *, microgal: bool = False) -> None:
    """A column of the window is that of the file to its 12 digits, and that of Python to the last bit."""
    written, exact = tables.written[name][heading], tables.frames[name][heading].to_numpy()
    if isinstance(values, tuple):
        assert list(values) == written == exact.tolist()
        return
    np.testing.assert_array_equal(values, exact * 1000.0 if microgal else exact.astype(float), err_msg=heading)
    if "residual [" in heading:
        factor = 1000.0 if microgal else 1.0
        np.testing.assert_allclose(
            np.asarray(values) / factor, tables.numbers(name, heading), rtol=0, atol=CLOSED, err_msg=heading
        )
    elif microgal:
        np.testing.assert_allclose(np.asarray(values) / 1000.0, tables.numbers(name, heading), rtol=6e-12, atol=0)
    else:
        cells = ["" if np.isnan(value) else f"{value + 0.0:.12g}" for value in values]
        assert cells == written, heading


def ledgers_agree(window: Driven, tables: Tables) -> int:
    """Every column of the ledgers of Readings, Reduction and Density stands in the tables; returns how many."""
    window.desk.do("depth MD")
    readings = ledger_of(window, states.READINGS)
    raw = readings_by_hand(window, readings, tables)
    for key, column in readings.items():
        if key in READINGS:
            microgal = column.unit == "µGal"
            assert column.heading == (
                READINGS[key].replace("mGal", "uGal") if microgal else READINGS[key]
            )
            alike(column.values, tables, "readings_reduced", READINGS[key], microgal=microgal)
        else:
            assert key in raw or key.startswith("raw "), key
            if key.startswith("raw "):
                assert list(column.values) == tables.written["readings_reduced"][column.heading]
    compared = len(readings)
    md = window.work.shown.scale.kind == "MD"
    for stage, name, columns, derived in (
        (states.REDUCTION, "stations", STATIONS, {"latitude"}),
        (states.DENSITY, "intervals", INTERVALS, {"ratio"}),
    ):
        ledger = ledger_of(window, stage)
        assert set(ledger) == set(columns) | derived
        for key, heading in columns.items():
            column = ledger[key]
            if key in ("depth", "top", "base") and not md:
                heading = {"depth": "tvd [m]"}.get(key, f"{key}_tvd [m]")
                assert column.heading == f"{key}_tvd [m]"
            else:
                assert column.heading == heading
            alike(column.values, tables, name, heading)
            if key in SDS:
                alike(column.sds, tables, name, SDS[key])
            else:
                assert column.sds is None, key
        derived_columns(ledger, tables, stage)
        compared += len(ledger)
    return compared


def readings_by_hand(window: Driven, ledger: dict[str, LedgerColumn], tables: Tables) -> set[str]:
    """What a row of the ledger shows of the file itself; returns the keys that were looked at."""
    written = tables.written["readings_reduced"]
    times = [(datetime.fromisoformat(text) - EPOCH).total_seconds() for text in written["time"]]
    np.testing.assert_allclose(ledger["time"].values, times, rtol=0, atol=1e-6)
    assert list(ledger["run"].values) == written["run"]
    assert list(ledger["station"].values) == written["station"]
    unit = "counts" if "reading [counts]" in written else "mGal"
    assert ledger["reading"].heading == f"reading [{unit}]"
    np.testing.assert_allclose(
        ledger["reading"].values, tables.numbers("readings_reduced", f"reading [{unit}]"), rtol=1e-15, atol=0
    )
    if "depth" in ledger:
        np.testing.assert_allclose(
            ledger["depth"].values, tables.numbers("readings_reduced", "depth [m]"), rtol=1e-15, atol=0
        )
    use = written.get("use", ["yes"] * len(times))
    assert window.work.ledger.table.excluded.tolist() == [one == "no" for one in use]
    notes = written.get("note", [""] * len(times))
    assert [text.strip() for text in ledger["note"].values] == [text.strip() for text in notes]
    return {"time", "run", "station", "reading", "depth", "note", "instrument", "reading_sd"}


def derived_columns(ledger: dict[str, LedgerColumn], tables: Tables, stage: str) -> None:
    """The columns that stand in no file, from those that do."""
    if stage == states.REDUCTION:
        normal = tables.numbers("stations", "normal_gravity [mGal]")
        first = tables.written["stations"]["role"].index("column")
        np.testing.assert_allclose(ledger["latitude"].values, normal - normal[first], rtol=0, atol=1e-6)
    else:
        ratio = tables.numbers("intervals", "density_less_log [g/cm3]") / tables.numbers(
            "intervals", "density_sd [g/cm3]"
        )
        np.testing.assert_allclose(ledger["ratio"].values, ratio, rtol=1e-8, atol=1e-8)
        assert ledger["ratio"].amber_from == 3.0


def visits_by_hand(tables: Tables) -> list[list[int]]:
    """Rows of each stop, from the written table alone: runs by their first reading, stops in order of time."""
    written, gap = tables.written["readings_reduced"], tables.results.recipe.visit_gap
    time = [datetime.fromisoformat(text).timestamp() for text in written["time"]]
    of_run = {run: [row for row, one in enumerate(written["run"]) if one == run] for run in set(written["run"])}
    runs = sorted(of_run, key=lambda run: min(time[row] for row in of_run[run]))
    stops: list[list[int]] = []
    for run in runs:
        before = None
        for row in sorted(of_run[run], key=time.__getitem__):
            station, used = written["station"][row], written["used"][row] == "yes"
            stays = before is not None and before[0] == station and time[row] - before[1] <= gap
            if used and stays and before[2]:
                stops[-1].append(row)
            elif used:
                stops.append([row])
            if used or (before is not None and before[0] == station):
                before = (station, time[row], used or (stays and before[2]))
    return stops


def drift_by_hand(window: Driven, tables: Tables) -> int:
    """The Drift ledger from readings_reduced.csv and repeats.csv: visits are plain means, for readings weigh alike.

    Returns how many visits were worked out.
    """
    ledger = ledger_of(window, states.DRIFT)
    assert set(ledger) == {
        "time", "run", "station", "role", "depth", "readings", "less_tide", "residual", "ratio",
    }  # fmt: skip
    written, stops = tables.written["readings_reduced"], visits_by_hand(tables)
    times = [[(datetime.fromisoformat(written["time"][row]) - EPOCH).total_seconds() for row in one] for one in stops]
    np.testing.assert_allclose(ledger["time"].values, [np.mean(one) for one in times], rtol=0, atol=1e-6)
    assert list(ledger["run"].values) == [written["run"][one[0]] for one in stops]
    labels = [written["station"][one[0]] for one in stops]
    assert list(ledger["station"].values) == labels
    assert ledger["readings"].values.tolist() == [float(len(one)) for one in stops]
    roles = dict(zip(tables.written["stations"]["station"], tables.written["stations"]["role"], strict=True))
    assert list(ledger["role"].values) == [roles[one] for one in labels]
    heading = "depth [m]" if window.work.shown.scale.kind == "MD" else "tvd [m]"
    depths = dict(zip(tables.written["stations"]["station"], tables.numbers("stations", heading), strict=True))
    np.testing.assert_allclose(ledger["depth"].values, [depths[one] for one in labels], rtol=1e-11, atol=1e-9)

    def of(heading: str) -> np.ndarray:
        return tables.numbers("readings_reduced", heading)

    left = of("residual [mGal]") + of("visit_effect [mGal]")
    residual = np.array([left[one].mean() for one in stops]) * 1000.0
    drift = np.array([of("drift [mGal]")[one].mean() for one in stops]) * 1000.0
    assert ledger["less_tide"].heading == "less_tide [uGal]" and ledger["residual"].heading == "residual [uGal]"
    np.testing.assert_allclose(ledger["less_tide"].values, drift + residual, rtol=0, atol=CLOSED * 1e3)
    shown = np.asarray(ledger["residual"].values)
    checked = np.isfinite(shown)
    np.testing.assert_allclose(shown[checked], residual[checked], rtol=0, atol=CLOSED * 1e3)
    assert np.abs(residual[~checked]).max(initial=0.0) < CLOSED * 1e3
    sds = np.asarray(ledger["residual"].sds)
    assert np.isfinite(sds).tolist() == checked.tolist()
    np.testing.assert_allclose(ledger["ratio"].values[checked], shown[checked] / sds[checked], rtol=1e-12)
    visit = {(run, one[0]): n for n, (run, one) in enumerate(zip(ledger["run"].values, times, strict=True))}
    repeats = tables.written["repeats"]
    assert len(repeats["station"]) > 3
    for n, difference in enumerate(tables.numbers("repeats", "difference [mGal]")):
        earlier, later = (
            visit[
                repeats[f"run_{which}"][n],
                (datetime.fromisoformat(repeats[f"time_{which}"][n]) - EPOCH).total_seconds(),
            ]
            for which in (1, 2)
        )
        assert labels[earlier] == labels[later] == repeats["station"][n]
        assert shown[later] - shown[earlier] == pytest.approx(difference * 1000.0, abs=1e-6)
    return len(stops)


@SURVEYS
def test_ledgers_are_the_tables_of_command_line_and_python(driven, tables_of, folder):
    window = driven()
    window.open(folder)
    assert ledgers_agree(window, tables_of(folder)) > 30


@SURVEYS
def test_visits_and_residuals_can_be_worked_out_from_the_written_tables(driven, tables_of, folder):
    window = driven()
    window.open(folder)
    tables = tables_of(folder)
    assert drift_by_hand(window, tables) > len(tables.written["stations"]["station"])


def steps_of(track: Any) -> list[tuple[float, float, float, float | None]]:
    return [(one.top, one.base, one.value, one.sd) for one in track.steps]


@SURVEYS
def test_strip_and_tracks_hold_the_numbers_of_the_tables(driven, tables_of, folder):
    tables = tables_of(folder)
    window = driven()
    window.open(folder)
    density = ledger_of(window, states.DENSITY)
    tracks = {one.title: one for one in window.tracks}
    top, base, value = (np.asarray(density[key].values) for key in ("top", "base", "density"))
    wanted = list(zip(top, base, value, density["density"].sds, strict=True))
    assert steps_of(tracks["density"]) == wanted
    assert window.strip_densities == value.tolist()
    assert [(one.top, one.base) for one in window.work.strip._plate.intervals] == [one[:2] for one in wanted]
    logged = np.isfinite(tables.numbers("intervals", "density_less_log [g/cm3]"))
    if logged.any():
        difference = density["density_less_log"]
        assert steps_of(tracks["difference"]) == [
            (top[n], base[n], difference.values[n], difference.sds[n]) for n in np.flatnonzero(logged)
        ]
    else:
        assert "difference" not in tracks
    stations = ledger_of(window, states.REDUCTION)
    column = np.array([one == "column" for one in tables.written["stations"]["role"]])
    depth = np.asarray(stations["depth"].values)[column]
    gravity = next(track for title, track in tracks.items() if "gravity" in title)
    left = next(track for title, track in tracks.items() if title in ("left over", "anomaly"))
    for track, key in ((gravity, "gravity"), (left, "anomaly")):
        assert [one.depth for one in track.points] == depth.tolist()
        assert [one.value for one in track.points] == np.asarray(stations[key].values)[column].tolist()
        sds = [one.sd if one.sd is not None else np.nan for one in track.points]
        np.testing.assert_array_equal(sds, np.asarray(stations["anomaly"].sds)[column])
    tracks = {one.title: one for one in window.tracks}
    curves = {one.name: one for one in tracks["large terms"].lines}
    for name, key in (("free air", "free_air"), ("shells", "shell")):
        assert [one.value for one in curves[name].points] == np.asarray(stations[key].values)[column].tolist()
    if "latitude" in tracks:
        shown = [one.value for one in tracks["latitude"].points]
        assert shown == np.asarray(stations["latitude"].values)[column].tolist()
    bars = {one.depth: one for one in tracks["sd"].bars}
    sd = np.asarray(stations["anomaly"].sds)[column] * 1000.0
    assert sorted(bars) == sorted(depth[np.isfinite(sd)].tolist())
    for at, whole in zip(depth.tolist(), sd.tolist(), strict=True):
        if np.isfinite(whole):
            assert bars[at].sd == pytest.approx(whole, rel=1e-9) and sum(bars[at].shares) == pytest.approx(1.0)


@SURVEYS
def test_plots_against_time_hold_the_numbers_of_the_ledgers(driven, folder):
    window = driven()
    window.open(folder)
    ledger = ledger_of(window, states.READINGS)
    excluded = window.work.ledger.table.excluded
    readings, residuals = window.work.times._plots
    for plot, key in ((readings, "reading"), (residuals, "residual")):
        assert plot.unit == ledger[key].unit
        seen = []
        for panel in plot.panels:
            rows = panel.points.rows
            np.testing.assert_array_equal(panel.points.times, ledger["time"].values[rows])
            np.testing.assert_allclose(panel.points.values, ledger[key].values[rows], rtol=1e-12)
            assert panel.points.excluded.tolist() == excluded[rows].tolist()
            assert {f"run {ledger['run'].values[row]}" for row in rows} == {panel.name}
            seen += rows.tolist()
        known = np.isfinite(ledger[key].values)
        assert set(np.flatnonzero(known)) <= set(seen) and len(seen) == len(set(seen))
    ledger = ledger_of(window, states.DRIFT)
    main_plot, left = window.work.times._plots
    assert main_plot.unit == left.unit == "µGal"
    seen = []
    for panel in main_plot.panels:
        points = panel.points
        inside = points.rows >= 0
        rows = points.rows[inside]
        np.testing.assert_array_equal(points.times[inside], ledger["time"].values[rows])
        np.testing.assert_array_equal(points.values[inside], ledger["less_tide"].values[rows])
        assert points.excluded.tolist() == (~inside).tolist()
        stations = [ledger["station"].values[row] for row in rows]
        every = list(ledger["station"].values)
        assert points.repeated[inside].tolist() == [every.count(one) > 1 for one in stations]
        for link in panel.links:
            first, second = (every[points.rows[one]] for one in (link.first, link.second))
            assert first == second
        seen += rows.tolist()
    assert sorted(seen) == list(range(len(ledger["time"].values)))
    shown = []
    for panel in left.panels:
        rows = panel.points.rows
        np.testing.assert_array_equal(panel.points.values, ledger["residual"].values[rows])
        np.testing.assert_array_equal(panel.points.sds, ledger["residual"].sds[rows])
        shown += rows.tolist()
    assert sorted(shown) == [
        row for row, sd in enumerate(ledger["residual"].sds) if np.isfinite(sd)
        and list(ledger["station"].values).count(ledger["station"].values[row]) > 1
    ]  # fmt: skip


@SURVEYS
@pytest.mark.parametrize("unit", ["m", "ft"])
@pytest.mark.parametrize("kind", ["MD", "TVD", "elevation"])
def test_depths_of_every_kind_and_unit_are_those_of_the_stations(driven, tables_of, folder, kind, unit):
    tables = tables_of(folder)
    window = driven()
    window.open(folder)
    window.desk.do(f"depth {kind}")
    window.desk.do(f"unit {unit}")
    window.settle()
    marks = tables.numbers("stations", "depth [m]")
    column = np.array([one == "column" for one in tables.written["stations"]["role"]])
    if kind == "MD" and np.isnan(marks[column]).any():
        kind = "TVD"
    heading = {"MD": "depth [m]", "TVD": "tvd [m]", "elevation": "elevation [m]"}[kind]
    factor = FOOT if unit == "ft" else 1.0
    wanted = tables.numbers("stations", heading) / factor
    ledger = ledger_of(window, states.REDUCTION)
    shown = ledger["depth"]
    assert shown.unit == f"{unit} {kind}"
    assert shown.heading == {"MD": f"depth [{unit}]"}.get(kind, f"depth_{kind.lower()} [{unit}]")
    np.testing.assert_allclose(shown.values, wanted, rtol=1e-11, atol=1e-8)
    table = window.work.ledger.table
    np.testing.assert_allclose(
        table.top[column], -wanted[column] if kind == "elevation" else wanted[column], rtol=1e-11, atol=1e-8
    )
    assert np.isnan(table.top[~column]).all()
    places = dict(zip(tables.written["stations"]["station"], wanted, strict=True))
    ledger = ledger_of(window, states.DENSITY)
    for key, end in (("top", "from_station"), ("base", "to_station")):
        ends = [places[one] for one in ledger[end].values]
        np.testing.assert_allclose(ledger[key].values, ends, rtol=1e-11, atol=1e-8)
    table = window.work.ledger.table
    assert (table.base > table.top).all()
    track = next(one for one in window.tracks if one.title == "density")
    assert [(one.top, one.base) for one in track.steps] == list(
        zip(table.top.tolist(), table.base.tolist(), strict=True)
    )


def exclude(window: Driven, row: int, reason: str) -> None:
    window.stage(states.READINGS)
    window.work.selection.choose("reading", (row,))
    window.key(window.work.ledger, Qt.Key.Key_Space)
    window.answer(reason)
    window.wait()


@SURVEYS
def test_after_an_exclusion_and_a_setting_the_window_is_the_reduced_copy(driven, tmp_path, folder):
    window = driven()
    window.open(folder)
    exclude(window, 9, "a lorry went by")
    window.work.recipe.key_changed.emit("reference_density", 2.5)
    window.wait()
    window.work.recipe.key_changed.emit("depth_sd", 0.02)
    window.wait()
    window.stage(states.HANDOVER)
    window.work.handover.copy_wanted.emit(str(tmp_path / "copy"))
    wait_until(lambda: (tmp_path / "copy" / "survey.toml").exists() and "copy" in window.desk.notice.words)
    tables = Tables(tmp_path / "copy", tmp_path / "out")
    assert tables.written["readings_reduced"]["use"][9] == "no"
    assert "a lorry went by" in tables.written["readings_reduced"]["note"][9]
    assert tables.results.recipe.reference_density == pytest.approx(2500.0)
    window.stage(states.READINGS)
    # Raw columns that the copy has beyond the survey are its own use and note.
    ledgers_agree(window, tables)
    drift_by_hand(window, tables)
