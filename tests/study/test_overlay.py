"""What lies on top of a survey changes what counts, and never a raw cell."""

from dataclasses import fields

import numpy as np

from made_surveys import Row, made_case
from plumbwell.study.kept import Kept
from plumbwell.study.overlay import EMPTY, Overlay, RowNote, RowUse, laid_over
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Tare

UGAL = 1e-8


def rows():
    """Two stations read in turn, the last row out of use."""
    found = [
        Row(time=600.0 * n, reading=4000e-5 + which * 2e-5 + n * UGAL, depth=100.0 + 20.0 * which, station="AB"[which])
        for n, which in enumerate([0, 1] * 6)
    ]
    return [*found, Row(time=9000.0, reading=4001e-5, depth=100.0, station="A", use=False)]


def test_an_empty_overlay_is_nothing_and_gives_the_very_survey():
    survey = made_case(rows()).survey
    assert not EMPTY
    assert laid_over(survey, EMPTY) is survey
    assert Overlay(notes=(RowNote(0, "x"),)).without_notes == EMPTY


def test_overlays_compare_by_value():
    one = Overlay(rows=(RowUse(3, False, "wind"),), tares=(Tare(run="1", time=5.0),))
    assert one == Overlay(rows=(RowUse(3, False, "wind"),), tares=(Tare(run="1", time=5.0),))
    assert one != Overlay(rows=(RowUse(3, False, "rain"),), tares=(Tare(run="1", time=5.0),))
    assert hash(one) == hash(Overlay(rows=one.rows, tares=one.tares))


def test_use_notes_and_tares_lie_on_top_and_all_else_is_the_same_object():
    survey = made_case(rows(), tares=(Tare(run="1", time=700.0), Tare(run="1", time=1900.0))).survey
    added = Tare(run="1", time=3100.0, size=5 * UGAL)
    overlay = Overlay(
        rows=(RowUse(2, False, "wind"), RowUse(12, True, "good after all")),
        notes=(RowNote(4, "gusts"),),
        tares=(added,),
        dropped_tares=(("1", 700.0),),
    )
    laid = laid_over(survey, overlay)
    assert np.flatnonzero(laid.readings.use != survey.readings.use).tolist() == [2, 12]
    assert not laid.readings.use[2] and laid.readings.use[12]
    assert laid.readings.note[4] == "gusts" and laid.readings.note[3] == ""
    assert laid.tares == (Tare(run="1", time=1900.0), added)
    for one in fields(survey.readings):
        if one.name not in ("use", "note"):
            assert getattr(laid.readings, one.name) is getattr(survey.readings, one.name), one.name
    for one in fields(survey):
        if one.name not in ("readings", "tares"):
            assert getattr(laid, one.name) is getattr(survey, one.name), one.name
    assert survey.readings.use[2] and not laid.readings.use.flags.writeable


def test_rows_changed_again_replace_what_stood_there_and_stay_in_order():
    overlay = EMPTY.with_rows({5: RowUse(5, False, "a"), 2: RowUse(2, False, "b")})
    assert [one.row for one in overlay.rows] == [2, 5]
    assert overlay.with_rows({5: RowUse(5, False, "c")}).rows[1].reason == "c"
    assert overlay.with_rows({2: None, 5: None}) == EMPTY
    assert EMPTY.with_notes({1: RowNote(1, "x")}).with_notes({1: None}) == EMPTY


def test_results_hold_the_survey_as_it_is_with_the_overlay():
    case = made_case(rows())
    overlay = Overlay(rows=(RowUse(3, False, "wind"),), notes=(RowNote(3, "gust"),))
    results = reduce(type(case)(survey=case.survey, overlay=overlay))
    assert not results.survey.readings.use[3]
    assert results.survey.readings.note[3] == "gust"
    assert results.stations.visits.sum() == reduce(case).stations.visits.sum() - 1


def test_a_note_changes_nothing_that_was_worked_out_and_an_exclusion_keeps_what_asks_only_for_cells():
    kept, case = Kept(), made_case(rows(), tide="ephemeris")
    plain = reduce(case, kept=kept)
    noted = reduce(type(case)(survey=case.survey, overlay=Overlay(notes=(RowNote(3, "gust"),))), kept=kept)
    assert noted.readings.estimates is plain.readings.estimates
    assert noted.survey.readings.note[3] == "gust" and plain.survey.readings.note[3] == ""
    without = reduce(type(case)(survey=case.survey, overlay=Overlay(rows=(RowUse(3, False, "wind"),))), kept=kept)
    assert without.readings.tide is plain.readings.tide
    assert without.readings.calibrated is plain.readings.calibrated
    assert without.readings.estimates is not plain.readings.estimates
