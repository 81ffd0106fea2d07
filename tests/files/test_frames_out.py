"""Data frames hold what the CSV files hold, at full precision."""

import io
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from plumbwell.files.frames import alternatives_frame, frame, frames
from plumbwell.files.tables_out import alternatives_text, csv_texts
from plumbwell.study.alternatives import alternatives


def test_frames_have_the_headings_and_values_of_the_files(shaft):
    texts = csv_texts(shaft)
    tables = frames(shaft)
    assert list(tables) == ["stations", "intervals", "layers", "readings_reduced", "repeats", "visits"]
    for name, table in tables.items():
        back = pd.read_csv(io.StringIO(texts[f"{name}.csv"]), keep_default_na=False, dtype=str)
        assert list(table.columns) == list(back.columns)
        assert len(table) == len(back)
        for heading in table.columns:
            if table[heading].dtype == np.float64:
                written = pd.to_numeric(back[heading], errors="coerce")
                back_again = pytest.approx(written.to_numpy(), rel=1e-11, abs=1e-7, nan_ok=True)
                assert table[heading].to_numpy() == back_again


def test_densities_are_numbers_to_work_with(shaft):
    intervals = frame(shaft, "intervals")
    assert intervals["density [g/cm3]"].between(2.0, 3.0).all()
    assert intervals["log_density [g/cm3]"].isna().all()
    assert intervals["from_station"].tolist() == ["P3", "P2", "P1"]


def test_times_are_timestamps_in_utc_and_raw_cells_stay_texts(shaft):
    repeats = frame(shaft, "repeats")
    assert repeats["time_1"].iloc[0] == pd.Timestamp("2026-02-17T07:33:55Z")
    apart = (repeats["time_2"] - repeats["time_1"]).dt.total_seconds() / 3600.0
    assert apart.to_numpy() == pytest.approx(repeats["hours_between"].to_numpy())
    assert frame(shaft, "readings_reduced")["depth [m]"].iloc[3] == "0.0"


def test_a_table_that_is_not_there_is_refused_with_those_that_are(shaft):
    with pytest.raises(ValueError, match="no table 'layer' in these results; there are stations, intervals, "):
        frame(shaft, "layer")


def test_alternatives_are_a_frame_with_the_headings_of_the_file(shaft):
    rows = alternatives(shaft)
    table = alternatives_frame(rows)
    back = pd.read_csv(io.StringIO(alternatives_text(rows)))
    assert list(table.columns) == list(back.columns) and len(table) == len(back) == len(rows)
    written = back["log_likelihood"].to_numpy()
    assert table["log_likelihood"].to_numpy() == pytest.approx(written, rel=1e-11, nan_ok=True)
    assert table["time"].isna().all() and str(table["time"].dtype).endswith("UTC]")
    timed = alternatives_frame([replace(rows[0], time=86400.0)])
    assert timed["time"].iloc[0] == pd.Timestamp("2000-01-02T00:00:00Z")
