"""Acts: what each does to a case, the sentence that tells it, what is refused, and the way to data and back."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.acts import (
    KINDS,
    ActRefused,
    AddRecipe,
    AddTare,
    ChooseRecipe,
    DropTare,
    Exclude,
    Include,
    NamePoint,
    Note,
    SetRecipe,
    act_from_data,
)
from plumbwell.study.case import AS_SURVEYED, Case, NamedRecipe
from plumbwell.study.overlay import EMPTY, RowUse, laid_over
from plumbwell.study.reduce import reduce
from plumbwell.survey.errors import DossierError
from plumbwell.survey.instrument import Tare
from plumbwell.survey.recipe import Recipe

TOML = """\
format = "plumbwell-survey/1"
[site]
name = "Hollow Fell 1"
latitude = 54.5
longitude = -3.0
ground_elevation = 180.0
[[tare]]
run = "2"
time = "2026-05-04T12:10:00Z"
size = 0.012
[data]
readings = "readings.csv"
[recipe]
drift_order = 1
"""
READINGS = """\
time,run,station,depth [m],reading [mGal],reading_sd [mGal],use,note
2026-05-04T09:13:20Z,1,S12,100.0,4000.010,0.004,,
2026-05-04T09:14:30Z,1,S12,100.0,4000.013,0.004,,
2026-05-04T09:15:40Z,1,S12,100.0,4000.011,0.004,,windy
2026-05-04T09:40:00Z,1,S13,120.0,4001.900,0.004,,
2026-05-04T10:05:00Z,1,S12,100.0,4000.020,0.004,,
2026-05-04T11:00:00Z,2,S12,100.0,4000.120,0.004,,
2026-05-04T11:30:00Z,2,S13,120.0,4002.011,0.004,,
2026-05-04T12:30:00Z,2,S12,100.0,4000.145,0.004,,
2026-05-05T00:10:00Z,2,S12,100.0,4000.150,0.004,no,
2026-05-05T00:20:00Z,2,S12,100.0,-999.25,0.004,no,
2026-05-05T00:30:00Z,2,S12,100.0,4000.150,abc,no,
2026-05-05T00:40:00Z,2,S99,,4000.150,0.004,no,
,2,S12,100.0,4000.150,0.004,no,
2026-05-05T00:50:00Z,2,S12,100.0,4000.150,-1,no,
"""

@pytest.fixture
def case(tmp_path: Path) -> Case:
    """A small survey from a folder."""
    (tmp_path / "survey.toml").write_text(TOML, "utf-8")
    (tmp_path / "readings.csv").write_text(READINGS, "utf-8")
    return Case(survey=read_survey(tmp_path))


def at(case, row):
    return float(case.survey.readings.time.values[row])


def refused(act, case):
    """What is said of an act that the case cannot take."""
    with pytest.raises(ActRefused) as caught:
        act.apply(case)
    return str(caught.value)


def test_readings_are_left_out_for_a_reason(case):
    act = Exclude(rows=(2, 0, 1, 1), reason=" pump started ")
    after = act.apply(case)
    assert act.rows == (0, 1, 2)
    assert after.overlay.rows == tuple(RowUse(row, False, "pump started") for row in (0, 1, 2))
    assert act.sentence(case) == "Left out 3 readings of station S12, 09:13 to 09:15 UTC on 4 May 2026: pump started"
    assert case.overlay == EMPTY and after.survey is case.survey


def test_rows_that_are_out_already_keep_their_reason(case):
    first = Exclude(rows=(0,), reason="pump").apply(case)
    both = Exclude(rows=np.array([0, 3]), reason="wind")
    assert both.sentence(first) == "Left out 1 reading of station S13, 09:40 UTC on 4 May 2026: wind"
    assert [one.reason for one in both.apply(first).overlay.rows] == ["pump", "wind"]
    assert refused(Exclude(rows=(0,), reason="wind"), first) == "This reading is left out already."
    assert refused(Exclude(rows=(0, 8), reason="wind"), first) == "These readings are left out already."


def test_taken_in_again_a_reading_is_as_if_nothing_had_been_done_to_it(case):
    out = Exclude(rows=(0, 3), reason="pump").apply(case)
    back = Include(rows=(0, 3))
    assert back.sentence(out) == "Took 2 readings of stations S12 and S13, 09:13 to 09:40 UTC on 4 May 2026 into use"
    assert back.apply(out).overlay == EMPTY
    assert refused(back, case) == "These readings are in use already."


def test_a_reading_that_the_folder_leaves_out_is_taken_in_and_left_out_again(case):
    inside = Include(rows=(8,), reason="the lamp was the cause").apply(case)
    assert inside.overlay.rows == (RowUse(8, True, "the lamp was the cause"),)
    assert laid_over(inside.survey, inside.overlay).readings.use[8]
    out = Exclude(rows=(8,), reason="no, the lift").apply(inside)
    assert out.overlay.rows == (RowUse(8, False, "no, the lift"),)


@pytest.mark.parametrize(
    ("row", "why"),
    [
        (9, 'Row 11 of readings.csv cannot be used: its reading [mGal] is "-999.25", the mark of a missing value.'),
        (10, 'Row 12 of readings.csv cannot be used: its reading_sd [mGal] is "abc", which cannot be read.'),
        (11, "Row 13 of readings.csv cannot be used: it has neither a depth nor a station with a surveyed place."),
        (12, "Row 14 of readings.csv cannot be used: it has no time."),
        (13, "Row 15 of readings.csv cannot be used: its reading_sd [mGal] is not above zero."),
    ],
)
def test_a_row_that_holds_no_reading_is_not_taken_in(case, row, why):
    assert refused(Include(rows=(8, row)), case) == why


def test_what_an_exclusion_needs(case):
    assert refused(Exclude(rows=(0,), reason="  "), case) == (
        "Say why the readings are left out: the reason stands beside them ever after."
    )
    assert refused(Exclude(rows=(), reason="x"), case) == "No reading was chosen."
    assert refused(Exclude(rows=(14,), reason="x"), case) == "There is no such reading: readings.csv has 14 readings."
    assert refused(Exclude(rows=(-1,), reason="x"), case) == "There is no such reading: readings.csv has 14 readings."
    assert refused(Exclude(rows=range(8), reason="x"), case) == (
        "No reading would be left in use: nothing could be reduced."
    )
    assert refused(Exclude(rows=(0,), reason="one\ntwo"), case) == (
        "A reason stands on one line, without control characters."
    )


def test_a_note_replaces_the_folders_and_can_take_it_away(case):
    assert Note(rows=(0,), text="lamp, \"loud\"").apply(case).overlay.notes[0].text == 'lamp, "loud"'
    emptied = Note(rows=(2,), text="").apply(case)
    assert laid_over(emptied.survey, emptied.overlay).readings.note[2] == ""
    assert Note(rows=(2,), text="windy").apply(emptied).overlay == EMPTY
    assert refused(Note(rows=(2,), text="windy"), case) == "The note stands there already."
    assert refused(Note(rows=(0,), text=""), case) == "There is no note to take away."
    assert Note(rows=(2,), text="calm").sentence(case) == (
        "Noted beside 1 reading of station S12, 09:15 UTC on 4 May 2026: calm"
    )
    assert "at most 2000 characters; this one has 2001" in refused(Note(rows=(0,), text="x" * 2001), case)


def test_a_setting_is_changed_and_put_back(case):
    act = SetRecipe(name=AS_SURVEYED, key="drift_order", value=2)
    after = act.apply(case)
    assert after.chosen.drift_order == 2 and after.changed_keys() == ("drift_order",)
    assert act.sentence(case) == "Drift order: 1 → 2"
    assert case.chosen.drift_order == 1 and case.changed_keys() == ()
    back = SetRecipe(name=AS_SURVEYED, key="drift_order", value=None)
    assert back.sentence(after) == "Drift order: 2 → 1, as surveyed"
    assert back.apply(after).chosen == case.chosen and back.apply(after).recipe is None
    assert refused(act, after) == "Drift order is 2 already."


@pytest.mark.parametrize(
    ("key", "value", "told"),
    [
        ("reference_density", 2.4, "Reference density: 2.67 g/cm³ → 2.4 g/cm³"),
        ("free_air", {"gradient": 0.309, "sd": 0.0003}, "Free-air gradient: normal → 0.309 ± 0.0003 mGal/m"),
        ("pressure_admittance", -0.35, "Pressure admittance: \u22120.3 µGal/hPa → \u22120.35 µGal/hPa"),
        ("noise", "as_given", "Noise: estimate → as given"),
        ("visit_gap", 7, "Visit gap: 15 min → 7 min"),
        ("datum_station", "S13", "Datum station: the highest station → S13"),
    ],
)
def test_settings_are_told_in_the_units_of_people(case, key, value, told):
    act = SetRecipe(name=AS_SURVEYED, key=key, value=value)
    assert act.sentence(case) == told
    assert act.apply(case).changed_keys() == (key,)


@pytest.mark.parametrize(
    ("key", "value", "why"),
    [
        ("drift_order", 4, 'Drift order cannot be 4. It may be "auto", 0, 1, 2 or 3.'),
        ("drift_order", True, 'Drift order cannot be True. It may be "auto", 0, 1, 2 or 3.'),
        ("depth_sd", -1, "Sd of depths cannot be \u22121 m. It may be a number in m from 0 to 100."),
        ("depth_sd", float("nan"), "Sd of depths cannot be nan m. It may be a number in m from 0 to 100."),
        ("layers", "smooth", 'Layers cannot be smooth in this version of the program. It may be "plain" or "none".'),
        ("reference_density", "markers", 'The reference density cannot be "markers": no marker has a density.'),
        ("reference_density", "log", 'The reference density cannot be "log": the survey has no density log.'),
        ("layer_boundaries", "markers", 'The layer boundaries cannot be "markers": the survey has no markers.'),
        ("tide", "table", 'The tide cannot be "table": the survey has no tide table.'),
        ("datum_station", "S14", 'There is no station "S14"; the survey has "S12", "S13" and "S99".'),
        ("drift_ordr", 2, 'There is no setting "drift_ordr"; "drift_order" is near.'),
    ],
)  # fmt: skip
def test_wrong_values_are_refused_with_what_may_stand(case, key, value, why):
    assert refused(SetRecipe(name=AS_SURVEYED, key=key, value=value), case) == why


def test_recipes_are_made_chosen_and_changed_apart(case):
    made = AddRecipe(name=" calm drift ", based_on=AS_SURVEYED)
    two = made.apply(case)
    assert two.recipe_names == (AS_SURVEYED, "calm drift") and two.chosen_name == AS_SURVEYED
    assert made.sentence(case) == 'Made the recipe "calm drift" from "as surveyed"'
    changed = SetRecipe(name="calm drift", key="drift_order", value=0)
    assert changed.sentence(two) == 'Drift order of "calm drift": 1 → 0'
    two = changed.apply(two)
    assert two.chosen.drift_order == 1 and two.recipe_named("calm drift").drift_order == 0
    chosen = ChooseRecipe(name="calm drift")
    assert chosen.sentence(two) == 'Recipe in force: "as surveyed" → "calm drift"'
    two = chosen.apply(two)
    assert two.chosen.drift_order == 0 and two.changed_keys() == ("drift_order",)
    assert refused(chosen, two) == 'The recipe "calm drift" is in force already.'
    assert refused(AddRecipe(name="Calm Drift", based_on=AS_SURVEYED), two) == (
        'There is a recipe "Calm Drift" already.'
    )
    assert refused(AddRecipe(name="", based_on=AS_SURVEYED), two) == "Give the recipe a name."
    assert refused(ChooseRecipe(name="x"), two) == 'There is no recipe "x"; there are "as surveyed" and "calm drift".'
    assert refused(SetRecipe(name="x", key="noise", value="as_given"), case) == (
        'There is no recipe "x"; there is "as surveyed".'
    )


def test_a_case_with_a_recipe_of_its_own_is_changed_from_there(case):
    own = Case(survey=case.survey, recipe=replace(case.survey.recipe, depth_sd=0.1))
    assert own.chosen.depth_sd == 0.1 and own.changed_keys() == ("depth_sd",)
    after = SetRecipe(name=AS_SURVEYED, key="noise", value="as_given").apply(own)
    assert (after.chosen.depth_sd, after.chosen.noise) == (0.1, "as_given")
    assert own.with_recipe("b", Recipe()).recipes == (NamedRecipe("b", Recipe()),)


def test_a_tare_is_taken_into_account_and_left_out_again(case):
    time = at(case, 6) - 60.0 * 3
    act = AddTare(run="2", time=time, size=1.23456789e-7, size_sd=2e-8)
    after = act.apply(case)
    (tare,) = after.overlay.tares
    assert (tare.run, tare.time) == ("2", time)
    assert tare.size == pytest.approx(1.23456789e-7, rel=1e-12)
    assert act.sentence(case) == (
        "Took a tare in run 2 at 11:27 UTC on 4 May 2026 into account, +0.0123456789 mGal with an sd of 0.002 mGal"
    )
    assert reduce(after).network.adjustment.basis.tares == (case.survey.tares[0], tare)
    assert refused(act, after) == "There is a tare in run 2 at 11:27 UTC on 4 May 2026 already."
    drop = DropTare(run="2", time=time)
    assert drop.sentence(after) == "Left the tare in run 2 at 11:27 UTC on 4 May 2026 out of account"
    assert drop.apply(after).overlay == EMPTY
    assert refused(drop, case) == "There is no tare in run 2 at 11:27 UTC on 4 May 2026."


def test_a_tare_of_the_folder_is_left_out_and_taken_back(case):
    (stated,) = case.survey.tares
    without = DropTare(run="2", time=stated.time).apply(case)
    assert without.overlay.dropped_tares == (("2", stated.time),)
    assert laid_over(without.survey, without.overlay).tares == ()
    assert "There is no tare" in refused(DropTare(run="2", time=stated.time), without)
    assert AddTare(run="2", time=stated.time, size=stated.size).apply(without).overlay == EMPTY
    other = AddTare(run="2", time=stated.time).apply(without)
    assert laid_over(other.survey, other.overlay).tares == (Tare(run="2", time=stated.time),)


@pytest.mark.parametrize(
    ("changed", "why"),
    [
        ({"run": "7"}, 'There is no run "7"; the readings have 1 and 2.'),
        ({"size_sd": 1e-8}, "Give the size that the sd belongs to, or leave both out."),
        ({"size": 1e-7, "size_sd": 0.0}, "The sd of a tare is above zero; a size without sd is held as it is."),
        ({"size": float("inf")}, "Time, size and sd of a tare are plain numbers."),
        ({"time": float("nan")}, "Time, size and sd of a tare are plain numbers."),
        (
            {"run": "1"},
            "A tare in run 1 at 11:27 UTC on 4 May 2026 would have no effect: the used readings of the run go from "
            "2026-05-04 09:13:20 UTC to 2026-05-04 10:05:00 UTC.",
        ),
    ],
)
def test_tares_that_cannot_be(case, changed, why):
    plain = {"run": "2", "time": at(case, 6) - 180.0}
    assert refused(AddTare(**{**plain, **changed}), case) == why


def test_naming_a_point_changes_nothing(case):
    act = NamePoint(name="before the tares")
    assert act.apply(case) is case
    assert act.sentence(case) == 'Named this point "before the tares"'
    assert refused(NamePoint(name=" "), case) == "Give the point a name."


def test_readings_without_labels_are_told_by_depth_and_over_midnight_by_both_days(case):
    readings = case.survey.readings
    bare = replace(readings, station=replace(readings.station, code=np.full(len(readings), -1)))
    other = Case(survey=replace(case.survey, readings=bare))
    assert Exclude(rows=(0, 3), reason="x").sentence(other) == (
        "Left out 2 readings between 100.00 and 120.00 m, 09:13 to 09:40 UTC on 4 May 2026: x"
    )
    assert "12:30 UTC on 4 May 2026 to 00:10 UTC on 5 May 2026" in Note(rows=(7, 8), text="x").sentence(case)


ACTS = [
    Exclude(rows=(0, 1, 2, 7, 9), reason="pump, \"loud\" – ‘so’"),
    Include(rows=(3,)),
    Note(rows=(4, 5), text=""),
    SetRecipe(name=AS_SURVEYED, key="drift_order", value=2),
    SetRecipe(name=AS_SURVEYED, key="depth_sd", value=0.1 + 0.2),
    SetRecipe(name=AS_SURVEYED, key="free_air", value={"gradient": 0.3, "sd": 1e-4}),
    SetRecipe(name=AS_SURVEYED, key="tide", value=None),
    ChooseRecipe(name="b"),
    AddRecipe(name="b", based_on=AS_SURVEYED),
    AddTare(run="2", time=831211920.123456),
    AddTare(run="2", time=831211920.0, size=-1.5e-7, size_sd=2e-8),
    DropTare(run="2", time=831211920.0),
    NamePoint(name="α"),
]


@pytest.mark.parametrize("act", ACTS, ids=lambda one: one.kind)
def test_every_act_comes_back_from_its_data(act):
    data = json.loads(json.dumps(act.to_data(), allow_nan=False))
    assert act_from_data(data) == act
    assert act_from_data(data).to_data() == act.to_data()
    assert data["version"] == 1


def test_all_kinds_are_tried_here():
    assert {one.kind for one in ACTS} == set(KINDS)


def test_rows_are_stored_as_ranges():
    assert ACTS[0].to_data()["rows"] == [[0, 2], [7, 7], [9, 9]]


GOOD = {"act": "exclude", "version": 1, "rows": [[0, 2]], "reason": "x"}


@pytest.mark.parametrize(
    "data",
    [
        None,
        [],
        {},
        {**GOOD, "act": "erase"},
        {**GOOD, "act": ["exclude"]},
        {**GOOD, "version": 2},
        {**GOOD, "version": True},
        {**GOOD, "more": 1},
        {key: value for key, value in GOOD.items() if key != "reason"},
        {**GOOD, "reason": 5},
        {**GOOD, "reason": " x"},
        {**GOOD, "reason": "\ud800"},
        {**GOOD, "rows": []},
        {**GOOD, "rows": [[0, 2], [3, 4]]},
        {**GOOD, "rows": [[2, 0]]},
        {**GOOD, "rows": [[-1, 0]]},
        {**GOOD, "rows": [[0, 1e3]]},
        {**GOOD, "rows": [[0, True]]},
        {**GOOD, "rows": [[0, 10**12]]},
        {"act": "drop_tare", "version": 1, "run": "2", "time": float("nan")},
        {"act": "drop_tare", "version": 1, "run": "2", "time": 10**400},
        {"act": "drop_tare", "version": 1, "run": "2", "time": None},
        {"act": "set_recipe", "version": 1, "name": "a", "key": "tide", "value": [1]},
        {"act": "set_recipe", "version": 1, "name": "a", "key": "tide", "value": {"gradient": "x"}},
    ],
)
def test_data_that_no_act_has_written_are_refused(data):
    with pytest.raises(DossierError):
        act_from_data(data)
