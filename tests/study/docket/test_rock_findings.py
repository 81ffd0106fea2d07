"""What the docket says of densities, logs and the reference rock."""

LOG = '[[log]]\nfile = "log.csv"\ndensity = "density"\n'


def log(top, base, *, gap=None):
    """A density log of 2.4 g/cm3, a sample a metre, with or without a gap."""
    rows = [z for z in range(top, base + 1) if gap is None or not gap[0] < z < gap[1]]
    return {"log.csv": "depth [m],density [g/cm3]\n" + "".join(f"{z},2.400\n" for z in rows)}


def test_a_density_that_no_rock_has_is_told_with_its_interval(invented, found):
    rows = invented.visits()
    for row in rows:
        if row["station"] == "D":
            row["depth [m]"] = "135.0"
    results = invented.survey(rows)
    (one,) = found(results, "density_outside")
    assert one.severity == "look" and one.intervals == (2,) and one.place == "C to D, 120.0 m to 135.0 m"
    # 50 m of rock of 2.4 g/cm3 squeezed into 15 m: (0.3086 - 0.1073 x 50/15)/0.08387 = -0.585 g/cm3.
    assert one.text.startswith("The density is \u22120.58 g/cm³ ± 0.0") or one.text.startswith(
        "The density is \u22120.59"
    )


def test_a_light_density_within_its_error_is_not_accused(invented, found):
    rows = invented.visits()
    for row in rows:
        if row["station"] == "D":
            row["depth [m]"] = "135.0"
    results = invented.survey(rows, recipe='tide = "none"\ndepth_sd = 12.0')
    assert float(results.intervals.density.values[2]) < 0.0
    assert not found(results, "density_outside")


def test_intervals_that_the_log_does_not_reach_are_named_with_their_metres(invented, found):
    results = invented.survey(tables=LOG, files=log(60, 180))
    (one,) = found(results, "log_uncovered")
    assert one.severity == "note" and one.intervals == (0,)
    assert one.text.startswith(
        "1 interval has no log density, since the log leaves 40.0 m of them uncovered: A to B (40.0 m)"
    )


def test_a_log_over_all_stations_leaves_nothing_open(invented, found):
    assert not found(invented.survey(tables=LOG, files=log(0, 180)), "log_uncovered")
    assert not found(invented.survey(), "log_uncovered")


def test_a_reference_by_log_tells_its_ends_and_gaps(invented, found):
    recipe = 'tide = "none"\nreference_density = "log"'
    results = invented.survey(tables=LOG, files=log(30, 150, gap=(80, 95)), recipe=recipe)
    (ends,) = found(results, "reference_beyond_log")
    assert ends.severity == "note" and "2.400 g/cm³ above it (30.0 m up to the ground)" in ends.text
    assert "2.400 g/cm³ below it (20.0 m down to the lowest station)" in ends.text
    (gaps,) = found(results, "reference_gaps")
    assert gaps.text.startswith("1 gap of the log is bridged straight") and "widest of 15.0 m" in gaps.text


def test_a_reference_by_a_log_from_the_ground_to_the_bottom_tells_nothing(invented, found):
    recipe = 'tide = "none"\nreference_density = "log"'
    results = invented.survey(tables=LOG, files=log(0, 180), recipe=recipe)
    assert not [one for one in results.findings if one.code.startswith("reference_")]


def test_most_intervals_far_from_the_log_want_a_look(invented, found):
    rows = invented.visits("ABCDEDCBAECA")
    heavy = {"log.csv": log(0, 230)["log.csv"].replace("2.400", "2.900")}
    results = invented.survey(rows, tables=LOG, files=heavy)
    (one,) = found(results, "log_disagrees")
    assert one.severity == "look" and one.intervals == (0, 1, 2, 3)
    assert one.text.startswith(
        "4 of 4 intervals differ from the log by more than 0.3 g/cm³ and 10 sd, in the median by \u22120.5"
    )


def test_a_log_that_fits_or_differs_a_little_is_silent(invented, found):
    rows = invented.visits("ABCDEDCBAECA")
    for text in ("2.400", "2.650"):
        other = {"log.csv": log(0, 230)["log.csv"].replace("2.400", text)}
        assert not found(invented.survey(rows, tables=LOG, files=other), "log_disagrees")


def test_three_intervals_are_too_few_to_accuse_a_log(invented, found):
    heavy = {"log.csv": log(0, 180)["log.csv"].replace("2.400", "2.900")}
    assert not found(invented.survey(tables=LOG, files=heavy), "log_disagrees")


def test_intervals_without_one_density_are_an_error(invented, found):
    rows = [{key: cell for key, cell in row.items() if key != "depth [m]"} for row in invented.visits()]
    places = "station,east [m],north [m],elevation [m]\nA,0,0,480\nB,300,0,479\nC,600,0,478\nD,900,0,{low}\n"
    results = invented.survey(rows, data='places = "places.csv"', files={"places.csv": places.format(low=477)})
    (one,) = found(results, "no_density")
    assert one.severity == "error" and one.intervals == (0, 1, 2)
    assert one.text == (
        "None of the 3 intervals has a density: the stations stand side by side, not under one another. Nothing is "
        "told of the rock."
    )
    results = invented.survey(rows, data='places = "places.csv"', files={"places.csv": places.format(low=400)})
    assert not found(results, "no_density")


def test_layers_within_one_interval_cannot_be_told_apart(invented, found):
    recipe = 'tide = "none"\nlayer_boundaries = {}'
    (one,) = found(invented.survey(recipe=recipe.format("1.0")), "layers_untold")
    assert one.severity == "note" and "layers have no density" in one.text
    assert not found(invented.survey(recipe=recipe.format('"stations"')), "layers_untold")
