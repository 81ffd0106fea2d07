"""What the docket says of gravity that does not change with depth, falls, or belongs to no such rock."""

import pytest

from plumbwell.earth.constants import FOUR_PI_G

FREE_AIR = 0.3086
BY_DENSITY = FOUR_PI_G * 1e8
"""mGal/m a g/cm3."""


def of_rock(invented, density, *, scale=1.0, depth=1.0, stops="ABCDCBADBCA"):
    """Readings of rock of this density; `scale` on gravity, `depth` on the depths that are written."""
    rows = invented.visits(stops)
    for row in rows:
        at = float(row["depth [m]"])
        # The rows stand for 2.4 g/cm3.
        value = float(row["reading [mGal]"]) + (2.4 - density) * BY_DENSITY * at
        row["reading [mGal]"] = f"{4000.0 + (value - 4000.0) * scale:.4f}"
        row["depth [m]"] = f"{at * depth:.3f}"
    return rows


def plausible(results):
    kinds = {"gravity_constant", "gravity_falls", "density_far_from_expected"}
    return [one for one in results.findings if one.code in kinds]


MARKERS = "marker,depth [m],density [g/cm3]\nTop,0.0,{density}\n"


def marked(invented, rows, density, **more):
    return invented.survey(
        rows, data='markers = "markers.csv"', files={"markers.csv": MARKERS.format(density=density)}, **more
    )


def test_a_dead_meter_is_told(invented):
    rows = invented.visits()
    for row in rows:
        row["reading [mGal]"] = "4000.000"
    (one,) = plausible(invented.survey(rows))
    assert (one.code, one.severity, one.intervals) == ("gravity_constant", "look", (0, 1, 2))
    assert one.text.startswith("Gravity does not change with depth: it spans ")
    assert "over 150.0 m, and rock of 2.67 g/cm³ would change it by 12." in one.text
    assert one.text.endswith("Densities near 3.68 g/cm³ then say nothing.")


def test_readings_a_thousand_times_too_small_do_not_change_either(invented):
    (one,) = plausible(invented.survey(of_rock(invented, 2.4, scale=1e-3)))
    assert one.code == "gravity_constant"


def test_a_span_within_its_noise_is_no_change(invented):
    rows = of_rock(invented, 3.5)
    for number, row in enumerate(rows):
        row["reading [mGal]"] = f"{float(row['reading [mGal]']) + (1.1 if number % 7 < 3 else -1.1):.4f}"
    (one,) = plausible(invented.survey(rows))
    assert one.code == "gravity_constant"


def test_a_lost_sign_makes_gravity_fall(invented):
    (one,) = plausible(invented.survey(of_rock(invented, 2.4, scale=-1.0)))
    assert (one.code, one.severity, one.intervals) == ("gravity_falls", "look", (0, 1, 2))
    assert one.text.startswith("Gravity falls downward in 3 of 3 intervals, by 16.")


def test_one_interval_in_which_gravity_falls_is_a_body_of_ore(invented):
    rows = of_rock(invented, 2.4)
    for row in rows:
        if row["station"] in "CD":
            row["reading [mGal]"] = f"{float(row['reading [mGal]']) - 7.0:.4f}"
    results = invented.survey(rows)
    assert float(results.intervals.density.values[1]) > 3900.0 and not plausible(results)


@pytest.mark.parametrize("density", [2.1, 2.4, 2.95, 3.4])
def test_salt_anhydrite_and_ore_are_silent_beside_a_stated_reference(invented, density):
    recipe = 'tide = "none"\nreference_density = 2.67'
    assert not plausible(invented.survey(of_rock(invented, density), recipe=recipe))
    assert not plausible(marked(invented, of_rock(invented, density), round(density, 1)))


def test_a_deep_shaft_of_2_09_beside_a_reference_of_2_5_is_silent(invented):
    recipe = 'tide = "none"\nreference_density = 2.5'
    assert not plausible(invented.survey(of_rock(invented, 2.09), recipe=recipe))


def test_an_unstated_reference_accuses_nothing(invented):
    assert not plausible(invented.survey(of_rock(invented, 1.5)))


def test_feet_written_as_metres_are_found_by_the_markers(invented):
    (one,) = plausible(marked(invented, of_rock(invented, 2.1, depth=1.0 / 0.3048), 2.1))
    assert (one.code, one.severity, one.intervals) == ("density_far_from_expected", "look", (0, 1, 2))
    # 3.680 - (3.680 - 2.1) x 0.3048 = 3.198
    assert one.text.startswith("The median density of the 3 intervals is 3.20 g/cm³, 1.10 g/cm³ above that of the ")
    assert one.text.endswith("If the depths are feet, written as metres, it is 2.10 g/cm³, which fits.")


@pytest.mark.parametrize(
    "recipe", ['tide = "none"', 'tide = "none"\nreference_density = 2.75'], ids=["nothing stated", "stated"]
)
def test_feet_written_as_metres_are_noted_where_nothing_stated_finds_them(invented, recipe):
    results = invented.survey(of_rock(invented, 2.7, depth=1.0 / 0.3048), recipe=recipe)
    assert not plausible(results)
    (one,) = (one for one in results.findings if one.code == "density_as_of_feet")
    assert (one.severity, one.intervals) == ("note", (0, 1, 2))
    # 3.680 - (3.680 - 2.7) x 0.3048 = 3.381
    assert one.text.startswith("The median density of the 3 intervals is 3.38 g/cm³, and little rock but ore ")
    assert one.text.endswith("If the depths are feet, written as metres, it is 2.70 g/cm³.")


def test_ore_that_is_stated_is_not_taken_for_feet(invented):
    ore = of_rock(invented, 3.4)
    stated = invented.survey(ore, recipe='tide = "none"\nreference_density = 3.3')
    for results in (stated, marked(invented, ore, 3.4), invented.survey(of_rock(invented, 2.95))):
        assert "density_as_of_feet" not in {one.code for one in results.findings}


def test_metres_written_as_feet_are_found_by_the_stated_reference(invented):
    recipe = 'tide = "none"\nreference_density = 2.4'
    (one,) = plausible(invented.survey(of_rock(invented, 2.4, depth=0.3048), recipe=recipe))
    # 3.680 - (3.680 - 2.4)/0.3048 = -0.519
    assert "is \u22120.52 g/cm³, 2.92 g/cm³ below the stated reference_density, 2.40 g/cm³" in one.text
    assert one.text.endswith("If the depths are metres, written as feet, it is 2.40 g/cm³, which fits.")


def test_metres_written_as_feet_are_told_where_the_markers_name_other_rock_at_the_false_depths(invented):
    # 3.680 - (3.680 - 2.4)/0.3048 = -0.519, no rock; 2.40 is half a g/cm3 from the 1.90 of the markers there.
    (one,) = plausible(marked(invented, of_rock(invented, 2.4, depth=0.3048), 1.9))
    assert one.text.endswith(
        "If the depths are metres, written as feet, it is 2.40 g/cm³, a density of rock: other rock is then expected "
        "there."
    )


def test_what_no_foot_explains_says_so(invented):
    (one,) = plausible(marked(invented, of_rock(invented, 2.7), 1.9))
    assert "0.80 g/cm³ above that of the markers" in one.text and "do not explain it (" in one.text


def test_markers_as_far_as_rock_may_be_are_silent(invented):
    assert not plausible(marked(invented, of_rock(invented, 2.7), 2.15))
    assert plausible(marked(invented, of_rock(invented, 2.7), 2.05))
