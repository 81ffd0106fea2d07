"""The history: undo, redo, going anywhere, branches, hashes, and what a changed survey makes of it."""

import dataclasses
from dataclasses import replace

import numpy as np
import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study import history as module
from plumbwell.study.acts import ActRefused, AddTare, Exclude, Include, NamePoint, SetRecipe
from plumbwell.study.history import History
from plumbwell.study.kept import Kept
from plumbwell.study.reduce import reduce
from plumbwell.survey.errors import DossierError
from reduced_surveys import MINE, column


@pytest.fixture(scope="module")
def mine():
    """The sample shaft."""
    return read_survey(MINE)


def begun():
    return History.begun("00", who="anna", when=0.0)


def grown(history, survey, *acts):
    for act in acts:
        history = history.with_act(act, survey=survey, who="anna", when=float(len(history.points)))
    return history


def out(*rows):
    return Exclude(rows=rows, reason="pump")


def setting(key, value):
    return SetRecipe(name="as surveyed", key=key, value=value)


def test_a_case_is_what_the_acts_from_the_root_on_make_of_the_survey(mine):
    history = grown(begun(), mine, out(3), setting("depth_sd", 0.2))
    case = history.case(mine)
    assert [one.row for one in case.overlay.rows] == [3] and case.chosen.depth_sd == 0.2
    assert history.case_at(1, mine).chosen.depth_sd == mine.recipe.depth_sd
    assert history.case_at(0, mine).overlay.rows == ()
    assert case.survey is mine


def test_undo_and_redo_walk_along_the_line_and_give_the_very_same_cases(mine):
    history = grown(begun(), mine, out(3), out(4), out(5))
    cases = [history.case_at(number, mine) for number in range(4)]
    back = history.undo().undo()
    assert back.cursor == 1 and back.can_undo and back.can_redo
    assert back.case(mine) is cases[1]
    assert back.redo().redo() == history
    assert back.redo().redo().case(mine) is cases[3]
    assert back.undo().undo().undo().cursor == 0
    assert not back.undo().can_undo and not history.can_redo
    assert history.redo() is history


def test_an_act_after_undo_makes_a_branch_and_nothing_is_cut_off(mine):
    history = grown(begun(), mine, out(3), out(4), out(5)).undo().undo()
    branch = grown(history, mine, setting("depth_sd", 0.2))
    assert branch.point.parent == 1 and len(branch.points) == 5
    assert [one.number for one in branch.children(1)] == [2, 4]
    assert [one.number for one in branch.line()] == [0, 1, 4]
    there = branch.go_to(2)
    assert [one.number for one in there.line()] == [0, 1, 2, 3]
    assert there.redo().cursor == 3
    assert [one.row for one in there.redo().case(mine).overlay.rows] == [3, 4, 5]


def test_redo_goes_on_along_the_line_that_was_walked_last_not_the_latest_branch(mine):
    history = grown(begun(), mine, out(3), out(4))
    history = grown(history.go_to(1), mine, out(5))
    walked = history.go_to(2).undo().undo()
    assert walked.redo().redo().cursor == 2
    assert walked.go_to(0).redo().redo().cursor == 2
    assert history.undo().redo().cursor == 3


def test_going_to_no_point_is_an_error():
    with pytest.raises(IndexError):
        begun().go_to(1)


def test_exclusion_and_undo_give_the_first_numbers_back_to_the_last_bit(mine):
    kept, history = Kept(), begun()
    first = reduce(history.case(mine), kept=kept)
    history = grown(history, mine, out(3, 4, 20))
    other = reduce(history.case(mine), kept=kept)
    again = reduce(history.undo().case(mine), kept=kept)
    fresh = reduce(history.undo().case(mine))
    name = "density"
    assert not np.array_equal(column(first, "intervals", name), column(other, "intervals", name))
    for table, heading in (
        ("intervals", name), ("intervals", "density_sd"), ("stations", "gravity"),
        ("readings_reduced", "residual"),
    ):  # fmt: skip
        for result in (again, fresh):
            np.testing.assert_array_equal(column(first, table, heading), column(result, table, heading))
    assert again.intervals.densities is first.intervals.densities


def test_a_refused_act_leaves_the_history_as_it_was(mine):
    history = grown(begun(), mine, out(3))
    with pytest.raises(ActRefused):
        grown(history, mine, out(3))
    assert len(history.points) == 2


def test_two_continuations_of_one_history_do_not_mix(mine):
    history = begun()
    one, other = grown(history, mine, out(3)), grown(history, mine, out(4))
    assert [row.row for row in one.case(mine).overlay.rows] == [3]
    assert [row.row for row in other.case(mine).overlay.rows] == [4]


def test_points_carry_who_when_and_a_name(mine):
    history = grown(begun(), mine, out(3), NamePoint(name="calm"))
    assert (history.point.who, history.point.when, history.point.name) == ("anna", 2.0, "calm")
    assert history.points[1].name == ""
    assert history.case(mine) is history.case_at(1, mine)


def test_the_history_tells_what_was_done(mine):
    history = grown(begun(), mine, out(3), setting("depth_sd", 0.2))
    history = grown(history.undo(), mine, setting("depth_sd", 0.3))
    told = [history.sentence(point.number, mine) for point in history.points]
    assert told[0] == "The survey as it was read"
    assert told[1].startswith("Left out 1 reading of station L01")
    assert told[2:] == ["Sd of depths: 0.01 m → 0.2 m", "Sd of depths: 0.01 m → 0.3 m"]


def test_more_cases_than_are_held_are_worked_out_anew(mine, monkeypatch):
    monkeypatch.setattr(module, "HELD", 3)
    history = grown(begun(), mine, *(out(row) for row in range(12)))
    for number in (0, 5, 12, 1):
        assert [one.row for one in history.case_at(number, mine).overlay.rows] == list(range(number))


def test_the_chain_of_hashes_shows_every_change(mine):
    history = grown(begun(), mine, out(3), out(4), NamePoint(name="calm"))
    history.verify()
    for number, changed in (
        (0, {"who": "ben"}),
        (1, {"act": out(5)}),
        (1, {"when": 99.0}),
        (2, {"parent": 0}),
        (2, {"parent": None}),
        (3, {"act": None}),
        (3, {"number": 7}),
        (3, {"hash": "0" * 64}),
    ):
        points = list(history.points)
        points[number] = replace(points[number], **changed)
        with pytest.raises(DossierError, match=f"damaged at its point {number}"):
            dataclasses.replace(history, points=tuple(points)).verify()
    with pytest.raises(DossierError, match="point 0"):
        dataclasses.replace(history, of="01").verify()


def test_equal_acts_of_different_people_have_different_hashes(mine):
    one = begun().with_act(out(3), survey=mine, who="anna", when=1.0)
    other = begun().with_act(out(3), survey=mine, who="ben", when=1.0)
    assert one.point.hash != other.point.hash and one != other


def test_acts_that_a_changed_survey_cannot_take_are_left_and_told(mine):
    time = float(np.sort(mine.readings.time.values)[40])
    history = grown(begun(), mine, out(3), AddTare(run="1", time=time), out(4))
    names = ("x", *mine.readings.run.names[1:])
    renamed = replace(mine, readings=replace(mine.readings, run=replace(mine.readings.run, names=names)))
    standing, told = history.standing(renamed)
    assert standing.cursor == 1 and standing.points == history.points and standing.tip == 3
    assert told is not None
    assert told.startswith("An act of 1 January 2000, 00:00 UTC, cannot be applied any more: Took a tare in run 1 at")
    assert told.endswith(
        'into account. There is no run "1"; the readings have x and 2. This act and the 1 after it stay in the history'
        "; the survey is shown as it was before."
    )
    with pytest.raises(ActRefused):
        standing.redo().case(renamed)
    further = grown(standing, renamed, out(5))
    assert len(further.points) == 5 and further.point.parent == 1
    assert history.standing(mine) == (history, None)


def test_a_reading_taken_in_again_is_told_by_what_stood_before(mine):
    history = grown(begun(), mine, out(3), Include(rows=(3,)))
    assert history.case(mine).overlay == begun().case(mine).overlay
    assert history.sentence(2, mine).startswith("Took 1 reading of station L01")
