"""What the docket says of places and depths: each kind where it is due, and a near miss."""

PATH = "depth [m],inclination [deg],azimuth [deg]\n0,0,0\n{last},0,0\n"
PLACES = (
    "station,east [m],north [m],elevation [m],elevation_sd [m],role\n"
    "A,0,0,480,0.01,column\nB,{east},0,430,0.01,column\nC,{east},0,380,0.01,column\nD,{east},0,330,0.01,column\n"
)


def surveyed(invented, east):
    """A survey whose four stations are surveyed places, B to D so far east of A."""
    rows = [{key: cell for key, cell in row.items() if key != "depth [m]"} for row in invented.visits()]
    return invented.survey(rows, data='places = "places.csv"', files={"places.csv": PLACES.format(east=east)})


def test_one_label_at_two_places_is_an_error_with_its_row(invented, found):
    rows = invented.visits()
    for row in rows[21:24]:
        row["depth [m]"] = "90.0"
    results = invented.survey(rows)
    (one,) = found(results, "label_twice")
    label = rows[21]["station"]
    assert one.severity == "error" and one.place == f"{label}; readings.csv, row 23" and one.rows == (21,)
    assert f'The label "{label}" stands at two places, ' in one.text and "90.00 m (first in row 23)" in one.text
    assert one.text.endswith(f'"{label}b".')
    assert {results.stations.label[number] for number in one.stations} == {label, f"{label}b"}


def test_one_label_within_same_place_is_one_station(invented, found):
    rows = invented.visits()
    for row in rows[21:24]:
        row["depth [m]"] = f"{float(row['depth [m]']) + 0.2:.2f}"
    assert not found(invented.survey(rows), "label_twice")


def test_stations_beyond_the_path_are_told(invented, found):
    results = invented.survey(data='path = "path.csv"', files={"path.csv": PATH.format(last=119.9)})
    (one,) = found(results, "path_extrapolated")
    assert one.severity == "note" and one.stations == (2, 3)
    assert one.text.startswith("The path ends at 119.9 m; beyond, the hole is taken straight on for 2 stations")
    assert "(C and D, down to 170.0 m)" in one.text
    assert not found(results, "path_assumed")


def test_a_path_to_the_last_station_is_long_enough(invented, found):
    results = invented.survey(data='path = "path.csv"', files={"path.csv": PATH.format(last=170.0)})
    assert not found(results, "path_extrapolated")


def test_without_a_path_the_hole_is_vertical_and_that_is_told(invented, found):
    assert [one.severity for one in found(invented.survey(), "path_assumed")] == ["note"]
    assert not found(surveyed(invented, 0.0), "path_assumed")


def test_close_stations_are_merged_and_named(invented, found):
    rows = invented.visits()
    for row in rows:
        if row["station"] == "B":
            row["depth [m]"] = "20.4"
    results = invented.survey(rows)
    (one,) = found(results, "close_stations")
    assert one.severity == "note" and one.stations == (0, 1) and "less than 0.50 m (min_thickness)" in one.text
    assert one.text.endswith(": A for B.") or one.text.endswith(": B for A.")


def test_stations_just_thick_enough_make_an_interval(invented, found):
    rows = invented.visits()
    for row in rows:
        if row["station"] == "B":
            row["depth [m]"] = "20.5"
    results = invented.survey(rows)
    assert not found(results, "close_stations") and len(results.intervals) == 3


def test_an_interval_across_the_ground_says_how_much_is_air(invented, found):
    results = invented.survey(site="depth_datum_height = 25.0")
    (one,) = found(results, "crosses_ground")
    assert one.severity == "look" and one.intervals == (0,) and one.place == "A to B, 20.0 m to 70.0 m"
    assert one.text.startswith("5.00 m of the 50.00 m between these stations lie above the ground")


def test_a_station_on_the_ground_crosses_nothing(invented, found):
    assert not found(invented.survey(site="depth_datum_height = 20.0"), "crosses_ground")


def test_stations_far_apart_sideways_get_no_density(invented, found):
    results = surveyed(invented, 251.0)
    (one,) = found(results, "far_apart")
    assert one.severity == "look" and one.intervals == (0,)
    assert one.place == "A to B, elevation 480.0 m to elevation 430.0 m"
    assert one.text.startswith("The two stations stand 251.0 m apart sideways and 50.0 m in height, more than 5 to 1")


def test_stations_five_times_as_far_aside_still_get_one(invented, found):
    assert not found(surveyed(invented, 249.0), "far_apart")


def test_the_depth_error_is_assumed_until_it_is_written(invented, found):
    (one,) = found(invented.survey(), "depth_error_assumed")
    assert one.severity == "note" and one.text.startswith(
        "The depth error of 4 stations is assumed, not stated: 0.030 m"
    )
    assert not found(invented.survey(recipe='tide = "none"\ndepth_sd = 0.03'), "depth_error_assumed")
    assert not found(surveyed(invented, 0.0), "depth_error_assumed")
