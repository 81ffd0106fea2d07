"""repeats.csv and visits.csv against what a person works out from the other written tables, column by column."""

import csv
import io
from datetime import datetime, timedelta
from itertools import pairwise
from math import sqrt

import numpy as np
import pytest

from plumbwell.files.tables_out import csv_texts
from reduced_surveys import MINE, SHAFT, WELL, reduced, residual_covariance

# Absolute gravity is written to 1e-6 mGal: a run bias errs by half of that, and a reading's other numbers by less.
ROUNDING = 1e-6
CORRECTED = ("calibrated", "tide", "tilt", "to_station")


@pytest.fixture(scope="module", params=[SHAFT, WELL, MINE], ids=lambda folder: folder.name)
def survey(request):
    """Results, and the rows of each table."""
    results = reduced(request.param)
    return results, {name: list(csv.DictReader(io.StringIO(text))) for name, text in csv_texts(results).items()}


def run_order(rows):
    """Names of the runs by their first used reading."""
    return list(dict.fromkeys(row["run"] for row in rows))


def stays(tables):
    """Used readings by visit, told by run, station and pauses over 15 minutes, in time order within runs."""
    rows = [row for row in tables["readings_reduced.csv"] if row["used"] == "yes"]
    rows.sort(key=lambda row: datetime.fromisoformat(row["time"]))
    found = []
    for run in run_order(rows):
        before = None
        for row in (row for row in rows if row["run"] == run):
            time = datetime.fromisoformat(row["time"])
            key = (row["station"], row.get("visit"))
            if before is None or before[0] != key or time - before[1] > timedelta(minutes=15):
                found.append([])
            found[-1].append(row)
            before = (key, time)
    return found


def mean(rows, *, plus, less):
    """Mean of some columns less others; all readings of these surveys weigh alike within a visit."""
    return float(np.mean([sum(float(row[f"{one} [mGal]"]) for one in plus)
                          - sum(float(row[f"{one} [mGal]"]) for one in less) for row in rows]))  # fmt: skip


def first(rows):
    return datetime.fromisoformat(rows[0]["time"])


def numbers(rows, heading):
    return np.array([float(row[heading]) if row[heading] else np.nan for row in rows])


def test_repeats_are_the_pairs_of_visits_that_follow_one_another_at_a_station(survey):
    _, tables = survey
    top_down = [row["station"] for row in tables["stations.csv"]]
    expected = []
    for station in top_down:
        own = sorted((one for one in stays(tables) if one[0]["station"] == station), key=first)
        expected += [(station, *pair) for pair in pairwise(own)]
    repeats = tables["repeats.csv"]
    assert len(repeats) == len(expected) > 5
    for row, (station, one, two) in zip(repeats, expected, strict=True):
        assert list(row) == [
            "station", "run_1", "time_1", "run_2", "time_2", "difference [mGal]", "difference_sd [mGal]",
            "standardised", "hours_between",
        ]  # fmt: skip
        assert (row["station"], row["run_1"], row["run_2"]) == (station, one[0]["run"], two[0]["run"])
        assert datetime.fromisoformat(row["time_1"]) == first(one) and row["time_1"].endswith("Z")
        assert datetime.fromisoformat(row["time_2"]) == first(two)
        known = ("pressure_effect", "run_bias", "drift")
        by_hand = mean(two, plus=CORRECTED, less=known) - mean(one, plus=CORRECTED, less=known)
        assert float(row["difference [mGal]"]) == pytest.approx(by_hand, abs=ROUNDING)
        hours = (first(two) - first(one)) / timedelta(hours=1)
        assert float(row["hours_between"]) == pytest.approx(hours, rel=1e-11)


def test_visits_are_the_used_stays_with_their_level_and_what_drift_leaves(survey):
    _, tables = survey
    gravity = {row["station"]: float(row["gravity [mGal]"] or 0.0) for row in tables["stations.csv"]}
    counts = {row["station"]: int(row["visits"]) for row in tables["stations.csv"]}
    visits, expected = tables["visits.csv"], stays(tables)
    assert {name: sum(row["station"] == name for row in visits) for name in counts} == counts
    for row, rows in zip(visits, expected, strict=True):
        assert (row["run"], row["station"]) == (rows[0]["run"], rows[0]["station"])
        assert datetime.fromisoformat(row["time"]) == first(rows) and row["time"].endswith("Z")
        assert row["readings"] == str(len(rows))
        level = mean(rows, plus=CORRECTED, less=("pressure_effect", "run_bias")) - gravity[row["station"]]
        assert float(row["level [mGal]"]) == pytest.approx(level, abs=2 * ROUNDING)
        left = level - mean(rows, plus=("drift",), less=())
        assert float(row["residual [mGal]"]) == pytest.approx(left, abs=2 * ROUNDING)
        assert left == pytest.approx(mean(rows, plus=("visit_effect", "residual"), less=()), abs=2 * ROUNDING)


def test_sd_and_redundancy_of_visits_are_those_of_the_whole_covariance(survey):
    results, tables = survey
    visits = tables["visits.csv"]
    sd = numbers(visits, "level_sd [mGal]")
    noise = results.network.adjustment
    by_hand = [
        sqrt(noise.noise.sd[0] ** 2 / int(row["readings"]) + noise.reseating.variance[0]) / 1e-5 for row in visits
    ]
    np.testing.assert_allclose(sd, by_hand, rtol=1e-9)
    variance = np.diagonal(residual_covariance(results)) / 1e-10
    checked = variance > 1e-6 * sd**2
    np.testing.assert_allclose(numbers(visits, "residual_sd [mGal]")[checked], np.sqrt(variance[checked]), rtol=1e-5)
    assert np.isnan(numbers(visits, "residual_sd [mGal]")[~checked]).all()
    np.testing.assert_allclose(numbers(visits, "redundancy"), np.where(checked, variance / sd**2, 0.0), atol=1e-6)
    ratio = numbers(visits, "residual [mGal]") / np.where(checked, np.sqrt(np.abs(variance)), np.nan)
    np.testing.assert_allclose(numbers(visits, "standardised"), ratio, rtol=1e-5, atol=1e-9)
    # What all visits are checked by together are the degrees of freedom; priors of drift add next to nothing.
    freedom = noise.reseating.freedom
    assert freedom - 0.01 < np.sum(numbers(visits, "redundancy")) < freedom + len(results.survey.runs) + 1


def test_creep_is_the_first_reading_less_the_later_half_and_short_visits_cannot_tell(survey):
    _, tables = survey
    for row, rows in zip(tables["visits.csv"], stays(tables), strict=True):
        if len(rows) < 3:
            assert row["creep [mGal]"] == row["creep_sd [mGal]"] == row["leave_out"] == ""
            continue
        freed = [mean([one], plus=CORRECTED, less=("pressure_effect", "drift")) for one in rows]
        late = freed[len(freed) // 2 :]
        assert float(row["creep [mGal]"]) == pytest.approx(freed[0] - np.mean(late), abs=ROUNDING)
        assert 0.0 < float(row["creep_sd [mGal]"]) < 0.02
        # Nobody wrote a creep into the samples.
        assert row["leave_out"] == "0"
