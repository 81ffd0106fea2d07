"""Figures of the stage line are those of summary and tables, and no stage is in order that rests on little."""

from __future__ import annotations

import ast
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy import stats

from made_surveys import loop, made_case
from plumbwell.desk.stages import states
from plumbwell.files.summary import summary
from plumbwell.study.case import Case
from plumbwell.study.finding import Finding
from plumbwell.study.overlay import Overlay, RowUse
from plumbwell.study.reduce import reduce
from plumbwell.study.visit_table import visit_table
from plumbwell.survey.instrument import Instrument
from reduced_surveys import CHECKOUT, column

UGAL = 1e-8
DEPTH = {name: 80.0 * number for number, name in enumerate("ABCDEF")}
GRAVITY = {name: 0.09e-5 * depth for name, depth in DEPTH.items()}


def stage(results, key: str, **options: Any):
    given = {"current": states.DENSITY, "working": False, "written": "", **options}
    found = {one.key: one for one in states.stage_states(results.survey, results, **given)}
    return found[key]


def texts_of(node: ast.expr) -> set[str]:
    """Texts that an expression can be: a constant, or either side of a choice."""
    if isinstance(node, ast.Constant):
        return {node.value}
    return texts_of(node.body) | texts_of(node.orelse) if isinstance(node, ast.IfExp) else set()


def codes_in_sources() -> set[str]:
    """Codes of all findings and notes that the program can tell."""
    found: set[str] = set()
    for path in (CHECKOUT / "src" / "plumbwell").rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if not isinstance(node, ast.Call):
                continue
            name = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
            if name == "note" and len(node.args) >= 4:
                found |= texts_of(node.args[0])
            elif name in ("Finding", "ReadingNote", "note"):
                found |= {text for one in node.keywords if one.arg == "code" for text in texts_of(one.value)}
    return found


def test_every_kind_of_finding_has_a_stage_decided_on_purpose():
    found = codes_in_sources()
    assert len(found) > 80 and {"tide_of_instrument", "las_null", "no_repeat", "figure_not_drawn"} <= found
    assert found == set(states.STAGE_OF_CODE)


def test_no_kind_stands_at_two_stages():
    lists = (
        states.READINGS_CODES, states.DRIFT_CODES, states.REDUCTION_CODES, states.DENSITY_CODES,
        states.HANDOVER_CODES,
    )  # fmt: skip
    assert sum(map(len, lists)) == len(states.STAGE_OF_CODE)


def test_a_setting_left_aside_is_judged_where_it_would_act():
    def left(key: str) -> Finding:
        return Finding(code="recipe_not_applied", severity="error", place=f"recipe, {key}", text="t", mend="m")

    assert states.stage_of(left("layers")) == states.DENSITY
    assert states.stage_of(left("drift_walk")) == states.stage_of(left("outliers")) == states.DRIFT


@pytest.mark.parametrize("name", ["well", "shaft"])
def test_figures_are_those_of_summary_and_tables(name, request):
    results = request.getfixturevalue(name)
    told = summary(results, outputs=())
    quiet = replace(results, findings=())
    chi = told["chi_square"]
    words = f"χ² {chi['value'] / chi['dof']:.2f}, {chi['dof']} dof"
    tares = len(told["tares"]["applied"])
    assert stage(quiet, states.DRIFT).figure == words + (f", {tares} tare" if tares else "")
    counts = told["counts"]
    out = counts["read"] - counts["used"]
    assert stage(quiet, states.READINGS).figure == f"{counts['read']} readings" + (f", {out} out" if out else "")
    sd = column(results, "stations", "gravity_sd")
    assert stage(quiet, states.REDUCTION).figure == f"± {np.nanmedian(sd) * 1000.0:.0f} µGal"
    sd = np.median(column(results, "intervals", "density_sd"))
    shown = stage(quiet, states.DENSITY).figure.removeprefix("± ")
    assert float(shown) == round(sd, len(shown.partition(".")[2])) and len(shown.strip("0.")) in (1, 2)


def test_a_reading_left_out_is_counted(well):
    case = Case(survey=well.survey, overlay=Overlay(rows=(RowUse(4, False, "bump"), RowUse(5, False, "bump"))))
    results = reduce(case)
    before = np.count_nonzero(well.network.visits.of_row < 0)
    assert f", {before + 2} out" in stage(results, states.READINGS).figure


def test_chi_square_is_said_to_be_1_by_construction_with_the_largest_residual(well):
    hint = stage(well, states.DRIFT).hint
    assert "near 1 by construction" in hint
    table = visit_table(well)
    ratio = np.abs(table.residual / table.residual_sd)
    worst = int(np.nanargmax(ratio))
    assert f"farthest off is {worst + 1}:" in hint and f"{ratio[worst]:.1f} sd" in hint
    stated = reduce(Case(survey=well.survey), recipe=replace(well.recipe, noise="as_given"))
    assert "by construction" not in stage(stated, states.DRIFT).hint


def rested(stops: str, **changed: Any):
    rows = loop(np.random.default_rng(1), stops, depth=DEPTH, gravity=GRAVITY)
    return reduce(made_case(rows, instruments=(Instrument(name="A"),), **changed))


@pytest.mark.parametrize("stops", ["ABCD", "ABCDA", "ABCDCBA", "ABCDEFEDCBA"])
@pytest.mark.parametrize("noise", ["estimate", "as_given"])
def test_under_five_degrees_of_freedom_nothing_that_rests_on_them_is_in_order(stops, noise):
    results = rested(stops, noise=noise)
    assert results.network.adjustment.reseating.freedom < 5
    for findings in (results.findings, ()):
        told = replace(results, findings=findings)
        for key in (states.DRIFT, states.REDUCTION, states.DENSITY, states.HANDOVER):
            one = stage(told, key, written="written 10:42")
            assert one.state in ("look", "error", "resting"), (key, one.state)
            assert one.mark is not None and one.hint
    student = stage(replace(results, findings=()), states.DENSITY).hint
    limit = stats.t.ppf(0.975, results.intervals.dof)
    assert f"95 % lie within {limit:.2f} sd, not within two (Student's t, {results.intervals.dof} dof)" in student


def test_what_rests_on_a_stated_drift_is_not_in_order_either():
    first = loop(np.random.default_rng(1), "ABCABCABC", depth=DEPTH, gravity=GRAVITY)
    second = loop(np.random.default_rng(2), "DE", depth=DEPTH, gravity=GRAVITY, run="2", start=9e4)
    results = reduce(made_case([*first, *second], noise="estimate"))
    assert results.network.adjustment.reseating.freedom >= 5
    assert "no_repeat" in {one.code for one in results.findings}
    told = replace(results, findings=tuple(one for one in results.findings if one.code == "no_repeat"))
    assert stage(told, states.DRIFT).state == "error"
    for key in (states.REDUCTION, states.DENSITY):
        assert stage(told, key).state == "resting" and "what is stated" in stage(told, key).hint
    assert stage(told, states.HANDOVER).state == "error"


def test_a_survey_with_nothing_to_look_at_is_in_order():
    results = rested("ABCDEFEDCBABCDEFEDCBA")
    assert results.network.adjustment.reseating.freedom >= 5
    quiet = replace(results, findings=tuple(one for one in results.findings if one.severity == "note"))
    for key in states.STAGES[:-1]:
        assert stage(quiet, key).state == "in_order"
    assert stage(quiet, states.HANDOVER).state == "not_started"
    assert stage(quiet, states.HANDOVER).figure == "ready to write"
    assert stage(quiet, states.HANDOVER, written="written 10:42").state == "in_order"


def test_a_finding_marks_its_stage_and_the_handover_alone():
    results = rested("ABCDEFEDCBABCDEFEDCBA")
    look = Finding(code="gravity_falls", severity="look", place="B", text="Gravity falls.", mend="m", stations=(1,))
    told = replace(results, findings=(look,))
    found = {key: stage(told, key) for key in states.STAGES}
    assert found[states.REDUCTION].state == found[states.HANDOVER].state == "look"
    assert found[states.REDUCTION].hint == "Gravity falls." and "1 finding" in found[states.REDUCTION].figure
    assert {found[key].state for key in (states.READINGS, states.DRIFT, states.DENSITY)} == {"in_order"}
    assert found[states.HANDOVER].figure == "1 open finding"


def test_while_a_result_is_on_its_way_later_stages_say_so(well):
    assert stage(well, states.DRIFT, working=True).figure == "computing"
    assert {stage(well, key, working=True).figure for key in states.STAGES[2:]} == {"waiting"}
    assert "readings" in stage(well, states.READINGS, working=True).figure
