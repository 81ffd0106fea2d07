"""The sample surveys, reduced, against the truth they were made from.

The truth comes from another forward computation (`sample_surveys/make_samples.py`), so this is a check of
the whole chain: times, tide, calibration, drift, jump, path and the shell form, and of the honesty of
the errors.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce

SAMPLES = Path(__file__).parents[2] / "sample_surveys"
SURVEYS = ("tolly_bank_well", "quernlow_shaft")


def true_rows(survey: str, kind: str) -> dict[tuple[str, str], float]:
    """Values of one kind in truth.csv by name and second name."""
    lines = (SAMPLES / survey / "truth.csv").read_text(encoding="utf-8").splitlines()
    rows = csv.DictReader(line for line in lines if not line.startswith("#"))
    return {(row["name"], row["to"]): float(row["value"]) for row in rows if row["kind"] == kind}


@pytest.fixture(scope="module", params=SURVEYS)
def reduced(request: pytest.FixtureRequest):
    """Name and results of a sample survey."""
    return request.param, reduce(Case(survey=read_survey(SAMPLES / request.param)))


def test_sample_densities_are_true_within_their_errors(reduced) -> None:
    survey, results = reduced
    intervals = results.intervals
    truth = true_rows(survey, "interval")
    pairs = list(zip(intervals.from_station, intervals.to_station, strict=True))
    assert pairs == list(truth)
    true = 1000.0 * np.array([truth[pair] for pair in pairs])
    away = np.abs(intervals.density.values - true) / intervals.density_sd.values
    # Of normal errors 68 % lie within one sd; both samples are one draw each, and not the best.
    assert np.mean(away < 1.0) >= 0.6
    assert np.max(away) < 4.0
    # Errors that are too large are no honest errors either.
    assert np.sqrt(np.mean(away**2)) > 0.5


def test_sample_density_errors_are_useful(reduced) -> None:
    _, results = reduced
    sd = results.intervals.density_sd.values
    assert np.all(sd > 0.3) and np.all(sd < 12.0)  # kg/m3


def test_well_gravity_is_true_at_every_station() -> None:
    results = reduce(Case(survey=read_survey(SAMPLES / "tolly_bank_well")))
    truth = true_rows("tolly_bank_well", "station")
    stations = results.stations
    assert set(stations.label) == {name for name, _ in truth}
    true = 1e-5 * np.array([truth[label, ""] for label in stations.label])
    assert np.max(np.abs(stations.gravity.values - true) / stations.gravity_sd.values) < 4.0


@pytest.mark.parametrize("survey", SURVEYS)
def test_sample_drift_and_jump_are_found(survey: str) -> None:
    results = reduce(Case(survey=read_survey(SAMPLES / survey)))
    readings, drift = results.survey.readings, results.readings.estimates.drift.values
    jump = true_rows(survey, "tare")
    for (run, _), rate in true_rows(survey, "drift_rate").items():
        rows = np.flatnonzero(readings.use & (readings.run.code == readings.run.names.index(run)))
        hours = (results.readings.utc.values[rows[-1]] - results.readings.utc.values[rows[0]]) / 3600.0
        true = rate * hours + jump.get((run, ""), 0.0)
        # Base returns at both ends, each good to about 5 microgal, and a little from the stops between.
        assert drift[rows[-1]] / 1e-5 == pytest.approx(true, abs=0.02)


def test_well_log_and_gravity_part_only_where_the_hole_caved() -> None:
    intervals = reduce(Case(survey=read_survey(SAMPLES / "tolly_bank_well"))).intervals
    less_log = dict(zip(intervals.from_station, intervals.density_less_log.values, strict=True))
    assert 60.0 < less_log.pop("TB-31") < 130.0
    assert 5.0 < less_log.pop("TB-30") < 45.0  # its lowest metres are caved too
    assert max(abs(value) for value in less_log.values()) < 25.0
    assert np.all(intervals.log_coverage.values > 0.98)
