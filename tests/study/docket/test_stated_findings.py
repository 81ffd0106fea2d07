"""What the docket says of what is stated and left aside, and of what the readers saw; its order and its "
"flags."""

from dataclasses import replace

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.docket.kinds import MOST, docket, flags_of
from plumbwell.study.docket.wording import amount, counted, gravity, listed
from plumbwell.study.finding import Finding
from plumbwell.study.reduce import reduce

OPENINGS = "name,shape\nshaft,cylinder\n"


def test_openings_that_are_not_applied_are_an_error(invented, found):
    results = invented.survey(data='openings = "openings.csv"', files={"openings.csv": OPENINGS})
    (one,) = found(results, "not_applied")
    assert one.severity == "error" and one.place == "survey.toml, [data] openings"
    assert one.text == "Openings ([data] openings) not applied by this version: densities hold their effect."


def test_each_thing_left_aside_has_a_finding_of_its_own(invented, found):
    results = invented.survey(
        site="water_depth = 12.0", data='openings = "openings.csv"', files={"openings.csv": OPENINGS}
    )
    assert [one.place for one in found(results, "not_applied")] == [
        "survey.toml, [data] openings",
        "survey.toml, [site] water_depth",
    ]


def test_a_recipe_that_this_version_cannot_do_is_an_error(invented, found):
    results = invented.survey()
    asked = replace(results.recipe, layers="smooth")
    (one,) = found(reduce(Case(survey=results.survey), recipe=asked), "recipe_not_applied")
    assert one.severity == "error" and one.place == "recipe, layers" and one.mend == 'Write "plain" or "none".'
    assert not found(results, "recipe_not_applied")


def test_a_measured_gradient_tells_its_excess(invented, found):
    results = invented.survey(recipe='tide = "none"\nfree_air = { gradient = 0.3100, sd = 0.0004 }')
    (one,) = found(results, "measured_gradient")
    excess = (0.3100e-5 - results.choice.normal) / 1e-5
    assert one.severity == "note" and 0.0010 < excess < 0.0020
    assert f"0.3100 ± 0.0004 mGal/m: +{excess:.4f} mGal/m beside the normal one" in one.text
    assert not found(invented.survey(), "measured_gradient")


def test_what_the_readers_saw_is_passed_on(invented, found):
    results = invented.survey(tables='[[run]]\nname = "7"\n')
    (one,) = found(results, "run_without_readings")
    assert one.severity == "look" and one.text == 'the run "7" has no readings'


def test_errors_come_first_and_stations_from_the_top_down(invented):
    rows = invented.visits()
    for row in rows[21:24]:
        row["depth [m]"] = "90.0"
    results = invented.survey(rows, site="depth_datum_height = 25.0")
    ranks = [("error", "look", "note").index(one.severity) for one in results.findings]
    assert ranks == sorted(ranks) and ranks[0] == 0
    for severity in ("error", "look", "note"):
        tops = [
            min(one.stations, default=-1) for one in results.findings if one.severity == severity and not one.intervals
        ]
        assert tops == sorted(tops)


def test_the_docket_is_the_same_each_time(invented):
    results = invented.survey()
    assert docket(results) == results.findings


def test_findings_beyond_eight_of_a_kind_are_gathered(invented, found):
    rows = invented.visits("A")
    for number in range(12):
        rows += invented.visits("AB", run=str(number + 2), start=1.0 + number)
    results = invented.survey(rows)
    told = found(results, "no_repeat")
    assert len(told) == MOST
    assert told[-1].text.startswith("6 more of this kind: run 8, run 9, ") and told[-1].stations == (0, 1)


def test_flags_name_every_finding_of_a_row_once():
    def one(code, **where):
        return Finding(code=code, severity="look", place="", text="", mend="", **where)

    findings = (one("a", intervals=(0, 2)), one("b", intervals=(2,), stations=(1,)), one("a", intervals=(2,)))
    assert flags_of(findings, 3, "intervals") == ["a", "", "a;b"]
    assert flags_of(findings, 2, "stations") == ["", "b"]
    assert flags_of(findings, 2, "rows") == ["", ""]


@pytest.mark.parametrize(
    ("value", "text"),
    [(41e-8, "41.0 µGal"), (-39e-8, "\u221239.0 µGal"), (999.9e-8, "999.9 µGal"), (1e-5, "1.000 mGal")],
)
def test_gravity_in_words(value, text):
    assert gravity(value) == text


def test_numbers_and_lists_in_words():
    assert amount(-1204.64, 1) == "\u22121\u00a0204.6"
    assert amount(3.0, 1, signed=True) == "+3.0"
    assert counted(1, "station") == "1 station" and counted(3, "density", "densities") == "3 densities"
    assert listed(["A"]) == "A" and listed(["A", "B"]) == "A and B"
    assert listed(list("ABCDEFGH"), 3) == "A, B, C and 5 more"


def test_every_finding_of_every_test_survey_can_be_acted_on(invented):
    results = invented.survey(invented.visits("ABCD"), instrument="applied = []")
    for one in results.findings:
        assert one.code.islower() and " " not in one.code
        assert one.place and one.text.endswith(".") and one.mend.endswith(".")
    assert read_survey(invented.folder).not_applied == ()
