"""What the docket says of ties that contradict one another, and of ties in another unit."""

import pytest

from plumbwell.study.docket.ties import misclosures

SLOPE = 0.3086 - 0.08387 * 2.4
"""mGal/m, of the invented shaft."""

LEVEL = 980_700.0
"""mGal, near normal gravity at the invented shaft."""


def tied(invented, rows=None, *, noise="estimate", **gravity):
    """The survey with ties at stations, each so much beside what fits (mGal), sd 0.02 mGal."""
    depth = {"A": 20.0, "B": 70.0, "C": 120.0, "D": 170.0}
    lines = [f"{name},{LEVEL + SLOPE * depth[name] + beside:.4f},0.02" for name, beside in gravity.items()]
    text = "station,gravity [mGal],gravity_sd [mGal]\n" + "\n".join(lines) + "\n"
    recipe = f'tide = "none"\nnoise = "{noise}"'
    return invented.survey(rows, data='ties = "ties.csv"', recipe=recipe, files={"ties.csv": text})


def test_two_ties_that_contradict_one_another_are_accused_and_no_visit_is(invented, found):
    results = tied(invented, A=0.0, D=1.0)
    (one,) = found(results, "ties_disagree")
    assert one.severity == "look" and one.place == "ties.csv" and one.stations == (0, 3)
    assert one.text.startswith("The two ties, A and D, disagree by 1.0") or one.text.startswith(
        "The two ties, A and D, disagree by 99"
    )
    assert "visits and readings are not tested until the ties agree" in one.text
    assert not found(results, "visit_disagrees") and not found(results, "reading_disagrees")


def test_the_misclosure_is_what_is_left_without_the_tie(invented):
    rows = invented.visits()
    both, alone = (tied(invented, rows, noise="as_given", **ties) for ties in ({"A": 0.0, "D": 1.0}, {"A": 0.0}))
    size, ratio = misclosures(both)
    missing = float(both.network.ties.value[1]) - float(alone.stations.gravity.values[3])
    assert float(size[1]) == pytest.approx(missing, rel=1e-6)
    assert float(size[0]) == pytest.approx(-float(size[1]), rel=1e-6)
    assert abs(float(ratio[0])) == pytest.approx(abs(float(ratio[1])), rel=1e-6)


def test_of_three_ties_the_one_that_does_not_fit_stands_first(invented, found):
    (one,) = found(tied(invented, A=0.0, B=0.5, D=0.0), "ties_disagree")
    assert one.text.startswith("The tie at B has ") and " more than the other ties and the readings give" in one.text


def test_ties_that_agree_within_their_errors_are_silent_and_visits_are_tested(invented, found):
    rows = invented.visits()
    for row in rows[12:15]:
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + 0.5:.4f}"
    results = tied(invented, rows, A=0.0, D=0.05)
    assert not found(results, "ties_disagree") and found(results, "visit_disagrees")


def test_a_tie_alone_contradicts_nothing(invented, found):
    results = tied(invented, A=0.0)
    assert not found(results, "ties_disagree") and not found(results, "tie_far_from_normal")


def test_a_tie_in_another_unit_is_far_from_normal_gravity(invented, found):
    results = invented.survey(
        data='ties = "ties.csv"',
        recipe='tide = "none"\nreference_density = 2.4',
        files={"ties.csv": "station,gravity [mGal],gravity_sd [mGal]\nA,9.807,0.01\n"},
    )
    (one,) = found(results, "tie_far_from_normal")
    assert one.severity == "look" and one.place == "ties.csv, A" and one.stations == (0,)
    assert one.text.startswith("The tie at A is 9.807 mGal, and normal gravity there 980")
    # The densities follow from the tie: they are not blamed on feet.
    assert not found(results, "density_far_from_expected")


def test_a_tie_hundreds_of_milligals_off_is_a_mountain(invented, found):
    assert not found(tied(invented, A=-800.0), "tie_far_from_normal")
