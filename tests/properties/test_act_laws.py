"""What holds for any sequence of acts: undone and redone nothing is lost, and stored and replayed all is the same."""

import json
import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from plumbwell.files.folder import read_survey
from plumbwell.files.keeper import Keeper
from plumbwell.files.survey_copy import told_notes, write_survey_copy
from plumbwell.study.acts import (
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
from plumbwell.study.case import AS_SURVEYED
from plumbwell.study.history import History, act_text
from plumbwell.study.overlay import laid_over
from plumbwell.study.reduce import reduce
from plumbwell.survey.errors import SurveyError
from small_folder import TOML

FEW = settings(max_examples=20)
MINUTES = range(0, 121, 10)


def line(minute):
    """A row of the readings: A and B in turn, two of them out of use, one with a note in quotes."""
    which = minute // 10 % 2
    reading = 4000.01 + 1.9 * which + minute * 1e-3
    use, note = "no" if minute in (30, 90) else "", '"a, b"' if minute == 20 else ""
    clock = f"{9 + minute // 60:02d}:{minute % 60:02d}:{minute % 7:02d}"
    return f"2026-05-04T{clock}Z,{1 + minute // 70},{'AB'[which]},{100 + 20 * which},{reading:.3f},{use},{note}\r\n"


HEADER = "time,run,station,depth [ft],reading [mGal],use,note\r\n"
READINGS = '# by hand, "quoted"\r\n' + HEADER + "".join(map(line, MINUTES))
TARES = """\
# knocks
[[tare]]
run = "1"
time = "2026-05-04T09:35:00Z"

[[tare]]
run = "2"
time = "2026-05-04T10:35:00Z"
"""
ROWS = st.lists(st.integers(0, len(MINUTES) - 1), min_size=1, max_size=5).map(tuple)
TEXTS = st.text(st.characters(exclude_categories=("Cc", "Cs", "Zl", "Zp", "Cf")), max_size=12)
NAMES = st.sampled_from([AS_SURVEYED, AS_SURVEYED, "b", "c"])
# Those of the folder's tares, and others in, before and after the runs.
TIMES = st.sampled_from([831202500.0, 831206100.0, *(831200100.25 + 60.0 * minute for minute in range(-5, 130, 15))])
SDS = st.one_of(st.none(), st.floats(1e-9, 1e-7))
GRADIENTS = st.builds(lambda value, sd: {"gradient": value, "sd": sd}, st.floats(0.2, 0.4), st.floats(0, 0.01))
SIZES = st.one_of(st.none(), st.floats(-1e-6, 1e-6))
SETTINGS = st.one_of(
    st.tuples(st.just("drift_order"), st.sampled_from(["auto", 0, 1, 2, 5, None])),
    st.tuples(st.just("depth_sd"), st.one_of(st.none(), st.floats(0.0, 1.0))),
    st.tuples(st.just("pressure_admittance"), st.floats(-1.0, 1.0)),
    st.tuples(st.just("noise"), st.sampled_from(["estimate", "as_given", None])),
    st.tuples(st.just("free_air"), GRADIENTS),
    st.tuples(st.just("datum_station"), st.sampled_from(["A", "B", "C", None])),
)  # fmt: skip
ACTS = st.one_of(
    st.builds(Exclude, rows=ROWS, reason=TEXTS),
    st.builds(Include, rows=ROWS, reason=TEXTS),
    st.builds(Note, rows=ROWS, text=TEXTS),
    st.builds(lambda name, pair: SetRecipe(name=name, key=pair[0], value=pair[1]), NAMES, SETTINGS),
    st.builds(AddRecipe, name=st.sampled_from(["b", "c"]), based_on=NAMES),
    st.builds(ChooseRecipe, name=NAMES),
    st.builds(AddTare, run=st.sampled_from("12"), time=TIMES, size=SIZES, size_sd=SDS),
    st.builds(DropTare, run=st.sampled_from("12"), time=TIMES),
    st.builds(NamePoint, name=TEXTS),
)  # fmt: skip
STEPS = st.lists(st.one_of(ACTS, ACTS, st.sampled_from(["undo", "redo"]), st.integers(0, 30)), max_size=25)


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """A survey folder with everything that acts can change."""
    place = tmp_path_factory.mktemp("laws")
    (place / "survey.toml").write_text(TOML + TARES, "utf-8")
    (place / "readings.csv").write_bytes(READINGS.encode())
    return place


@pytest.fixture(scope="module")
def survey(folder):
    """That folder, read."""
    return read_survey(folder)


def begun():
    return History.begun("00", who="anna", when=0.0)


def stepped(history, step, survey):
    """The history after a step; a refused act is no step."""
    if step == "undo":
        return history.undo()
    if step == "redo":
        return history.redo()
    if isinstance(step, int):
        return history.go_to(step % len(history.points))
    try:
        return history.with_act(step, survey=survey, who="anna", when=float(len(history.points)))
    except ActRefused as refused:
        assert str(refused).endswith(".")
        return history


def walked(steps, survey):
    history = begun()
    for step in steps:
        history = stepped(history, step, survey)
    return history


def value(case):
    """What acts have made of a case."""
    return case.overlay, case.recipe, case.recipes, case.chosen_name


@given(steps=STEPS)
def test_undo_then_redo_is_identity(survey, steps):
    history = walked(steps, survey)
    if history.can_undo:
        again = history.undo().redo()
        assert again == history
        assert again.case(survey) is history.case(survey)
    if history.can_redo:
        assert history.redo().undo() == history


@given(steps=STEPS)
def test_nothing_is_ever_cut_off_and_every_point_stays_what_it_was(survey, steps):
    history, seen = begun(), {}
    for step in steps:
        after = stepped(history, step, survey)
        assert after.points[: len(history.points)] == history.points
        seen[after.cursor] = value(after.case(survey))
        assert after.cursor in [point.number for point in after.line()]
        history = after
    for number, what in seen.items():
        assert value(history.go_to(number).case(survey)) == what
    history.verify()


@given(steps=STEPS)
def test_replayed_from_its_text_a_history_gives_an_equal_case(survey, steps):
    history = walked(steps, survey)
    points = tuple(
        replace(one, act=None if one.act is None else act_from_data(json.loads(act_text(one.act))))
        for one in history.points
    )
    fresh = History(of=history.of, points=points, cursor=history.cursor, tip=history.tip)
    assert fresh == history
    fresh.verify()
    assert value(fresh.case(survey)) == value(history.case(survey))
    for number in range(len(points)):
        assert fresh.sentence(number, survey) == history.sentence(number, survey)


@given(steps=STEPS)
def test_an_overlay_is_in_order_and_says_each_row_once(survey, steps):
    overlay = walked(steps, survey).case(survey).overlay
    for entries in (overlay.rows, overlay.notes):
        rows = [one.row for one in entries]
        assert rows == sorted(set(rows))
    for one in overlay.rows:
        assert one.use != survey.readings.use[one.row] or one.reason
    assert laid_over(survey, overlay).readings.use.any()


@FEW
@given(steps=STEPS)
def test_kept_and_opened_again_everything_is_there(survey, folder, steps):
    with tempfile.TemporaryDirectory() as home:
        with Keeper.open(folder, survey, home=Path(home), who="anna") as keeper:
            for step in steps:
                after = stepped(keeper.history, step, survey)
                if after != keeper.history:
                    keeper.keep(after)
            history = keeper.history
        with Keeper.open(folder, survey, home=Path(home), who="ben") as again:
            assert len(history.points) == 1 and not history.can_redo or again.history == history
            assert value(again.history.case(survey)) == value(history.case(survey))


@FEW
@given(steps=STEPS)
def test_a_copy_reduces_to_the_same_bits(survey, folder, steps):
    case = walked(steps, survey).case(survey)
    with tempfile.TemporaryDirectory() as place:
        copied = read_survey(write_survey_copy(case, folder, Path(place) / "copy"))
    assert copied.recipe == case.chosen
    assert all(copied.readings.note[row] == text for row, text in told_notes(case).items())
    try:
        wanted = reduce(case)
    except SurveyError:
        with pytest.raises(SurveyError):
            reduce(copied)
        return
    found = reduce(copied)
    for one, other in (
        (wanted.stations.gravity, found.stations.gravity),
        (wanted.intervals.density, found.intervals.density),
        (wanted.intervals.density_sd, found.intervals.density_sd),
        (wanted.readings.estimates.residual, found.readings.estimates.residual),
    ):
        np.testing.assert_array_equal(one.values, other.values)
