"""What else could have been done: each row against the results in force and against a folder changed by hand."""

import re
import shutil
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import plumbwell
from made_surveys import HOUR, MICROGAL, MILLIGAL, Row, loop, made_case
from plumbwell.files.summary import summary
from plumbwell.study.act import ActRefused
from plumbwell.study.acts import AddTare, DropTare, SetRecipe
from plumbwell.study.alternatives import alternatives
from plumbwell.study.case import Case
from plumbwell.study.kept import Kept
from plumbwell.study.reduce import reduce
from plumbwell.survey.instrument import Instrument, Run
from simulated_surveys import EVERY_FIFTH, EXACT_DEPTHS, QUIET, simulated

SAMPLES = Path(__file__).resolve().parents[2] / "sample_surveys"
WELL, SHAFT = SAMPLES / "tolly_bank_well", SAMPLES / "quernlow_shaft"
UGAL = MICROGAL
JUMP = replace(QUIET, tares=1)


def by_key(rows):
    found = {one.key: one for one in rows}
    assert len(found) == len(rows), "keys are told apart"
    return found


@pytest.mark.parametrize("folder", [WELL, SHAFT])
def test_the_row_in_force_is_what_the_results_say(folder):
    results = plumbwell.reduce(plumbwell.read_survey(folder))
    told = summary(results, outputs=[], notes=[])
    row = alternatives(results)[0]
    assert (row.key, row.acts, row.edits, row.problem) == ("in_force", (), (), "")
    assert row.freedom == told["chi_square"]["dof"]
    assert row.squares == pytest.approx(told["chi_square"]["value"], rel=1e-11)
    assert row.squares_chance == pytest.approx(told["chi_square"]["p"], rel=1e-11)
    assert row.reseating_sd / MILLIGAL == pytest.approx(told["variance_components"]["reseating"], rel=1e-11)
    assert row.reading_sd / MILLIGAL == pytest.approx(told["variance_components"]["reading"], rel=1e-11)
    assert row.orders == tuple((one["run"], one["order"]) for one in told["drift"])
    assert row.tares == len(told["tares"]["applied"])
    assert row.likelihood == results.network.adjustment.likelihood
    assert (row.gain, row.largest_change, row.most_sds, row.rms_change) == (0.0, 0.0, 0.0, 0.0)
    assert np.isnan(row.f)


def edited(folder, target, row):
    """A copy of the folder whose survey.toml is edited as the row says."""
    shutil.copytree(folder, target)
    path = target / "survey.toml"
    text = path.read_text(encoding="utf-8")
    for edit in row.edits:
        if edit == "[[run]] drift_order of each as in orders":
            for run, order in row.orders:
                text, found = re.subn(rf'(\[\[run\]\]\nname = "{run}"\n)', rf"\1drift_order = {order}\n", text)
                assert found == 1
        elif edit.startswith("[recipe] "):
            text = text.replace("[recipe]\n", f"[recipe]\n{edit.removeprefix('[recipe] ')}\n")
        elif edit.startswith("[[tare]] "):
            text += "\n[[tare]]\n" + edit.removeprefix("[[tare]] ").replace(", time", "\ntime") + "\n"
        else:
            assert edit.startswith("no [[tare]] "), edit
            text, found = re.subn(r"\[\[tare\]\][^\n]*\n(?:[^\n\[]+\n)+", "", text)
            assert found == 1
    path.write_text(text, encoding="utf-8")
    return target


def agrees(row, results, base):
    """Assert that the row says what these results say."""
    fit = results.network.adjustment
    assert row.freedom == fit.reseating.freedom
    assert row.orders == tuple(
        (results.survey.readings.run.names[run], fit.orders[run]) for run in fit.visits.run_order.tolist()
    )
    assert row.likelihood == pytest.approx(fit.likelihood, rel=1e-9)
    assert row.reseating_sd == pytest.approx(np.sqrt(np.mean(fit.reseating.variance)), rel=1e-9)
    assert row.reading_sd == pytest.approx(np.median(fit.noise.sd), rel=1e-9)
    moved = results.intervals.density.values - base.intervals.density.values
    # Of densities near 2500 kg/m3.
    assert row.rms_change == pytest.approx(np.sqrt(np.mean(moved**2)), rel=1e-9, abs=1e-9 * 2500.0)
    worst = int(np.argmax(np.abs(moved)))
    assert row.largest_change == pytest.approx(moved[worst], rel=1e-9, abs=1e-9 * 2500.0)
    if row.largest_change:
        assert row.largest_change_at == base.intervals.label(worst)
        ratio = moved / base.intervals.density_sd.values
        assert row.largest_change_sds == pytest.approx(ratio[worst], rel=1e-6, abs=1e-9)
        assert row.most_sds == pytest.approx(np.abs(ratio).max(), rel=1e-6, abs=1e-9)


@pytest.mark.parametrize("folder", [WELL, SHAFT])
def test_each_row_is_the_reduction_of_the_folder_edited_by_hand(folder, tmp_path):
    survey = plumbwell.read_survey(folder)
    base = plumbwell.reduce(survey)
    rows = alternatives(survey, results=base)
    keys = [one.key for one in rows]
    if folder == WELL:
        assert keys == [
            "in_force", "order_higher:1", "order_higher:2", "order_higher:3", "orders_higher", "walk_on",
            "tare_out:2@2026-05-13T09:19:00Z", "tares_out_walk_on",
        ]  # fmt: skip
    for number, row in enumerate(rows[1:]):
        assert not row.problem
        assert row.edits and (row.acts is None) == row.edits[0].startswith("[[run]]")
        agrees(row, plumbwell.reduce(plumbwell.read_survey(edited(folder, tmp_path / str(number), row))), base)


def test_acts_of_a_row_give_the_row():
    case = simulated(JUMP, 2).case
    base = reduce(case)
    rows = by_key(alternatives(case, results=base))
    tried = [row for row in rows.values() if row.acts]
    assert {AddTare, SetRecipe} <= {type(act) for row in tried for act in row.acts}
    for row in tried:
        changed = case
        for act in row.acts:
            changed = act.apply(changed)
        agrees(row, reduce(changed), base)


def test_a_jump_gains_most_as_a_tare_and_less_as_a_walk():
    for seed in range(1, 7):
        one = simulated(JUMP, seed)
        rows = by_key(alternatives(one.case))
        (taken,) = (row for key, row in rows.items() if key.startswith("tare_in:"))
        walk, both = rows["walk_on"], rows["tares_in_walk_on"]
        plain = [row for key, row in rows.items() if key.startswith("order")] + [walk]
        assert taken.tares == 1 and taken.gain > max(row.gain for row in plain) + 5.0
        assert walk.gain >= 0.0 or walk.walk == 0.0
        # Beside the tare nothing is left for a walk: what it costs is more than what it gains.
        assert taken.bic < min(row.bic for row in plain) - 10.0
        assert taken.bic <= both.bic + 1e-6
        assert (taken.run, taken.acts) == ("0", (AddTare(run="0", time=taken.time),))


def test_a_listed_tare_left_out_loses_what_it_gains():
    one = simulated(JUMP, 3, list_tares=True)
    rows = by_key(alternatives(one.case))
    (out,) = (row for key, row in rows.items() if key.startswith("tare_out:"))
    assert out.acts == (DropTare(run="0", time=one.tares[0].time),)
    assert out.tares == 0 and out.gain < -5.0
    assert rows["tares_out_walk_on"].gain < -2.0 and rows["tares_out_walk_on"].tares == 0


def test_found_tares_in_force_are_left_out_one_by_one():
    case = simulated(replace(QUIET, tares=2), 2, recipe=replace(EXACT_DEPTHS, tares="proposed")).case
    base = reduce(case)
    assert base.network.proposed_applied and len(base.network.proposed) == 2
    rows = by_key(alternatives(case, results=base))
    out = [row for key, row in rows.items() if key.startswith("tare_out:")]
    assert [row.tares for row in out] == [1, 1] and rows["tares_out"].tares == 0
    assert all(row.acts[0] == SetRecipe(name="as surveyed", key="tares", value="listed") for row in out)
    assert not any(key.startswith("tare_in") for key in rows)
    # The same fit with the jumps listed: taking one out of it is what the row says.
    first, second = (AddTare(run=row.run, time=row.time) for row in out)
    alone = SetRecipe(name="as surveyed", key="tares", value="listed").apply(second.apply(case))
    agrees(out[0], reduce(alone), base)
    assert first != second


METER = Instrument(name="A", reading_floor=2 * UGAL, reseating_sd=4 * UGAL)
DEPTH = {name: 60.0 * number for number, name in enumerate("ABCDEF")}
GRAVITY = {name: 8e-7 * depth for name, depth in DEPTH.items()}


def bent(size, *, seed=1, hours=6.5, **more):
    """A loop whose drift leaves its chord by `size` at half time."""
    length = hours * HOUR
    drift = (0.02 * MILLIGAL / HOUR - 4.0 * size / length, 4.0 * size / length**2)
    return loop(
        np.random.default_rng(seed), "ABCADEAFCAEBA", depth=DEPTH, gravity=GRAVITY, drift=drift, counts=(3,), **more
    )


def test_f_of_an_order_is_that_of_its_own_test():
    case = made_case(bent(40 * UGAL), instruments=(METER,))
    base = reduce(case)
    first, second = base.network.adjustment.tests
    assert (first.higher, first.taken, second.higher, second.taken) == (2, True, 3, False)
    rows = by_key(alternatives(case, results=base))
    # Re-seating noise is estimated to a millionth, from where the search of each begins. A step that plainly explains
    # nothing is told with the weights of the lower order: with some thirty degrees of freedom within some per cent.
    for key, test, room in (("order_lower:1", first, 2e-6), ("order_higher:1", second, 0.05)):
        row = rows[key]
        assert row.f == pytest.approx(test.f, rel=room)
        assert (row.f_steps, row.f_freedom) == test.freedom
        assert row.f_chance == pytest.approx(test.p, rel=10.0 * room)
    assert rows["order_lower:1"].gain < -5.0 < rows["order_higher:1"].gain
    # A single run is all runs: the recipe's order is its own.
    assert rows["order_lower:1"].acts[0] == SetRecipe(name="as surveyed", key="drift_order", value=1)
    assert "orders_higher" not in rows


def test_orders_of_other_runs_are_held():
    rows = bent(60 * UGAL) + bent(60 * UGAL, seed=2, run="2", start=86400.0)
    found = by_key(alternatives(made_case(rows, instruments=(METER,))))
    assert found["in_force"].orders == (("1", 2), ("2", 2))
    assert found["order_lower:1"].orders == (("1", 1), ("2", 2))
    assert found["order_lower:1"].acts is None
    assert found["orders_higher"].orders == (("1", 3), ("2", 3))
    assert found["orders_higher"].f_steps == 2
    assert found["orders_higher"].acts[0] == SetRecipe(name="as surveyed", key="drift_order", value=3)


def test_a_given_order_is_no_order_that_is_chosen():
    rows = bent(0.0) + bent(0.0, seed=2, run="2", start=86400.0) + bent(0.0, seed=3, run="3", start=2 * 86400.0)
    case = made_case(rows, instruments=(METER,), runs=(Run(name="2", drift_order=2),))
    found = by_key(alternatives(case))
    assert found["orders_higher"].orders == (("1", 2), ("2", 2), ("3", 2))
    assert found["order_lower:2"].orders == (("1", 1), ("2", 1), ("3", 1))
    assert "order_lower:1" not in found


def test_an_order_that_nothing_determines_is_no_alternative():
    """There and back once leaves no parabola apart from stations read once; two visits hold no parabola at all."""
    rows = [Row(time=600.0 * n, reading=1e-6 * n, depth=10.0 * d, station=s) for n, (s, d) in enumerate(
        [("A", 0), ("B", 1), ("C", 2), ("D", 3), ("A", 0)]
    )]  # fmt: skip
    found = by_key(alternatives(made_case(rows)))
    assert not any(key.startswith("order") for key in found)
    assert found["in_force"].freedom == 0 and np.isnan(found["in_force"].squares)
    assert np.isnan(found["in_force"].gain)


def test_readings_that_do_not_fit_are_other_data():
    case = simulated(replace(EVERY_FIFTH, readings=3, gross_share=0.03), 1).case
    base = reduce(case)
    assert len(base.network.outlier_rows)
    rows = by_key(alternatives(case, results=base))
    for value in ("downweight", "exclude"):
        row = rows[f"outliers_{value}"]
        assert np.isnan([row.gain, row.bic, row.f]).all()
        assert row.acts == (SetRecipe(name="as surveyed", key="outliers", value=value),)
        assert row.reseating_sd < rows["in_force"].reseating_sd or row.reading_sd < rows["in_force"].reading_sd
        assert row.rms_change > 0.0
    assert "outliers_flag" not in rows


def test_a_walk_in_force_is_left_off():
    case = simulated(replace(QUIET, wander=40e-8), 1).case
    base = reduce(case)
    assert base.network.adjustment.walk is not None
    rows = by_key(alternatives(case, results=base))
    assert rows["in_force"].walk > 0.0 and rows["walk_off"].walk == 0.0
    fit = base.network.adjustment
    off = reduce(case, recipe=replace(case.chosen, drift_walk="off")).network.adjustment
    assert rows["walk_off"].orders == rows["in_force"].orders
    # Of the same fixed unknowns: both likelihoods say how much better the walk is.
    assert rows["walk_off"].gain == pytest.approx(off.likelihood - fit.likelihood, rel=1e-6)
    assert rows["walk_off"].gain < -2.0
    assert "walk_on" not in rows
    assert all(row.walk > 0.0 for key, row in rows.items() if key.startswith("order"))


def test_what_cannot_be_worked_out_says_why(monkeypatch):
    def refuse(self, case):
        raise ActRefused("Not this one.")

    case = simulated(QUIET, 1).case
    monkeypatch.setattr(SetRecipe, "apply", refuse)
    row = by_key(alternatives(case))["walk_on"]
    assert row.problem == "Not this one." and np.isnan(row.squares) and row.acts


def test_what_was_worked_out_before_changes_no_number():
    case = Case(survey=plumbwell.read_survey(SHAFT))
    kept = Kept()
    reduce(case, kept=kept)
    assert repr(alternatives(case, kept=kept)) == repr(alternatives(case))
