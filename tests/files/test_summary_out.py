"""summary.json: the keys of the contract, units in mGal and hours, null for what is not known."""

import csv
import json
from dataclasses import replace
from datetime import datetime
from hashlib import sha256

import numpy as np
import pytest

from plumbwell import __version__
from plumbwell.files.summary import summary, summary_text
from plumbwell.study.case import Case
from plumbwell.study.finding import Finding
from plumbwell.study.reduce import reduce
from plumbwell.study.tables import TABLES
from plumbwell.survey.recipe import KEYS
from reduced_surveys import WELL, reduced

ONE_PASS = """\
format = "plumbwell-survey/1"
[site]
name = "One pass"
latitude = 50.0
longitude = 10.0
ground_elevation = 100.0
[data]
readings = "readings.csv"
"""


def test_keys_are_those_of_the_contract(shaft):
    told = json.loads(summary_text(shaft, outputs=["stations.csv"]))
    assert list(told) == [
        "format", "program_version", "survey", "recipe", "counts", "free_air_gradient", "drift", "tares", "outliers",
        "scale_factors", "variance_components", "chi_square", "absolute", "findings", "inputs", "outputs", "cautions",
        "notes", "timing",
    ]  # fmt: skip
    assert told["format"] == "plumbwell-summary/1" and told["program_version"] == __version__
    assert set(told["recipe"]) == set(KEYS)
    assert told["recipe"]["free_air"] == {"gradient": 0.3086, "sd": 0.0004}
    assert told["recipe"]["reference_density"] == 2.67 and told["recipe"]["visit_gap"] == 15.0
    assert told["free_air_gradient"] == 0.3086 and told["absolute"] is False
    assert told["survey"]["latitude"] == 50.6 and told["survey"]["ground_elevation"] == 428.75
    assert set(told["drift"][0]) == {"run", "order", "t0", "coefficients", "dof"}
    assert set(told["drift"][0]["coefficients"][0]) == {"power", "value", "sd", "unit"}
    assert set(told["variance_components"]) == {"reading", "reading_scale", "reseating", "walk", "dof"}
    assert set(told["chi_square"]) == {"value", "dof", "p"}


def test_rows_that_were_read_are_used_excluded_or_refused(well):
    counts = summary(well, outputs=[])["counts"]
    assert counts == {"read": 376, "used": 375, "excluded": 1, "refused": 0}


def test_inputs_are_named_with_the_digest_of_their_bytes(well):
    inputs = {one["name"]: one["sha256"] for one in summary(well, outputs=[])["inputs"]}
    assert {"survey.toml", "readings.csv", "ties.csv", "calibration_A.csv", "open_hole.las"} <= set(inputs)
    for name, digest in inputs.items():
        assert sha256((WELL / name).read_bytes()).hexdigest() == digest


@pytest.mark.parametrize("name", ["shaft", "well"])
@pytest.mark.parametrize("order", [1, 3])
def test_drift_and_tares_give_the_drift_column_of_the_readings(name, order, request):
    results = request.getfixturevalue(name)
    results = reduce(Case(survey=results.survey), recipe=replace(results.recipe, drift_order=order))
    told = summary(results, outputs=[])
    used = np.array(TABLES["readings_reduced"].column("used").values(results)) == "yes"
    drift = TABLES["readings_reduced"].column("drift").values(results)
    run = np.array(results.survey.readings.run.as_list())
    epoch = datetime.fromisoformat("2000-01-01T00:00:00+00:00")

    def seconds(text):
        return (datetime.fromisoformat(text) - epoch).total_seconds()

    assert [one["run"] for one in told["drift"]] == (["2", "1", "3"] if name == "shaft" else ["1", "2", "3"])
    for one in told["drift"]:
        rows = np.flatnonzero(used & (run == one["run"]))
        hours = (results.readings.utc.values[rows] - seconds(one["t0"])) / 3600.0
        assert hours.min() == pytest.approx(0.0, abs=1e-6)
        assert [(c["power"], c["unit"]) for c in one["coefficients"]] == [
            (1, "mGal/h"), (2, "mGal/h^2"), (3, "mGal/h^3")
        ][:order]  # fmt: skip
        by_hand = sum(c["value"] * hours ** c["power"] for c in one["coefficients"])
        for tare in told["tares"]["applied"]:
            if tare["run"] == one["run"]:
                by_hand = by_hand + np.where(
                    results.readings.utc.values[rows] >= seconds(tare["time"]), tare["size"], 0.0
                )
        assert drift[rows] == pytest.approx(by_hand, abs=1e-8)
        assert all(c["sd"] > 0.0 for c in one["coefficients"])
    assert len(told["tares"]["applied"]) == (0 if name == "shaft" else 1)


def test_the_sample_well_finds_the_drift_and_tare_that_were_put_in(well):
    with (WELL / "truth.csv").open(encoding="utf-8") as file:
        truth = list(csv.DictReader(line for line in file if not line.startswith("#")))
    told = summary(well, outputs=[])
    rates = {row["name"]: float(row["value"]) for row in truth if row["kind"] == "drift_rate"}
    for one in told["drift"]:
        rate = one["coefficients"][0]
        assert abs(rate["value"] - rates[one["run"]]) < 4.0 * rate["sd"]
    assert told["absolute"] is True


def test_variance_components_and_chi_square_are_in_mgal_and_fit(shaft):
    told = summary(shaft, outputs=[])
    parts = told["variance_components"]
    assert parts["reading"] == 0.002, "no visit has two readings: the floor holds"
    assert 0.005 < parts["reseating"] < 0.015 and parts["dof"] == 19 and parts["walk"] == 0.0
    # With the re-seating noise estimated from them the visits' squares sum to about their freedom.
    assert told["chi_square"]["dof"] == 19
    assert told["chi_square"]["value"] == pytest.approx(19.0, rel=0.2)
    assert 0.2 < told["chi_square"]["p"] < 0.8


def test_reading_noise_is_told_where_visits_repeat_readings(well):
    assert 0.001 < summary(well, outputs=[])["variance_components"]["reading"] < 0.006


def test_what_one_pass_cannot_tell_is_what_the_instrument_states(tmp_path):
    (tmp_path / "survey.toml").write_text(ONE_PASS, "utf-8")
    rows = [f"2026-05-04T0{hour}:00:00Z,{30.0 * hour},{3000 + 3.1 * hour:.3f}" for hour in range(1, 5)]
    (tmp_path / "readings.csv").write_text("\n".join(["time,depth [m],reading [mGal]", *rows]) + "\n", "utf-8")
    text = summary_text(reduced(tmp_path), outputs=[])
    told = json.loads(text, parse_constant=lambda word: pytest.fail(word))
    assert told["chi_square"] == {"value": None, "dof": 0, "p": None}
    assert told["variance_components"] == {
        "reading": 0.002, "reading_scale": None, "reseating": 0.003, "walk": None, "dof": 0
    }  # fmt: skip


def test_findings_stand_with_their_five_parts_and_cautions_are_there(shaft):
    finding = Finding(code="c", severity="look", place="p", text="t", mend="m", stations=(1,))
    told = json.loads(summary_text(shaft, outputs=[], notes=["a note"], findings=[finding]))
    assert told["findings"] == [{"code": "c", "severity": "look", "place": "p", "text": "t", "mend": "m"}]
    assert told["notes"] == ["a note"]
    assert any("qualified person must judge" in one for one in told["cautions"])
    assert any("other masses could explain it" in one for one in told["cautions"])
