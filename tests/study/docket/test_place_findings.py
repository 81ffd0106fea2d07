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
    assert one.severity == "look" and one.stations == (2, 3)
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


def both(invented, *, east=0.0, row_depth="120.0", place="{east},0,380,"):
    """C has a depth in its rows and a row in places.csv."""
    rows = invented.visits()
    for row in rows:
        if row["station"] == "C":
            row["depth [m]"] = row_depth
    text = "station,east [m],north [m],elevation [m],depth [m]\nC," + place.format(east=east) + "\n"
    return invented.survey(rows, data='places = "places.csv"', files={"places.csv": text})


def test_a_depth_and_a_surveyed_place_that_disagree_are_two_places(invented, found):
    results = both(invented, place="0,0,395,")
    (one,) = found(results, "label_twice")
    assert one.severity == "error" and one.stations == (results.stations.label.index("C"),)
    assert one.place.startswith("C; readings.csv, rows 8, 9, 10") and len(one.rows) == 9
    assert one.text == (
        '"C" stands at two places: the readings give depth 120.00 m (elevation 380.00 m), places.csv elevation '
        "395.00 m, 15.00 m apart in height, more than same_place, 0.25 m; the place is taken."
    )
    assert float(results.stations.located.positions.elevation.values[one.stations[0]]) == 395.0


def test_a_depth_and_a_surveyed_place_that_agree_are_silent(invented, found):
    assert not found(both(invented, place="0,0,380.25,"), "label_twice")
    assert not found(both(invented, row_depth="", place="0,0,395,"), "label_twice")


def test_a_depth_that_places_give_otherwise_is_told(invented, found):
    results = both(invented, place=",,,110.0")
    (one,) = found(results, "label_twice")
    assert "the readings give depth 120.00 m (elevation 380.00 m), places.csv depth 110.00 m" in one.text
    assert one.text.endswith("the depth of the readings is taken.")
    assert 120.0 in results.stations.located.mark_depth.values.tolist()
    assert not found(both(invented, place=",,,120.2"), "label_twice")


def test_places_kilometres_aside_may_be_map_coordinates(invented, found):
    (one,) = found(both(invented, place="452310,5210000,380,"), "place_far")
    assert one.severity == "look" and one.text.startswith(
        "1 place lies more than 5 km from the collar sideways (C; up to 5\u00a0229.6 km)"
    )
    assert not found(both(invented, place="4900,0,380,"), "place_far")


def test_negative_depths_put_the_column_above_the_ground(invented, found):
    rows = [{**row, "depth [m]": f"-{row['depth [m]']}"} for row in invented.visits()]
    results = invented.survey(rows)
    (one,) = found(results, "above_ground")
    assert one.severity == "look" and one.text == (
        "4 of 4 stations of the column stand above the ground, up to 170.0 m. Depths are negative, and depth counts "
        "downward."
    )
    assert not found(results, "gravity_falls")


def test_a_tower_and_a_rig_floor_are_not_accused(invented, found):
    assert not found(invented.survey(site="depth_datum_height = 21.0"), "above_ground")
    # One of four stations more than 20 m up is no tower.
    assert found(invented.survey(site="depth_datum_height = 41.0"), "above_ground")


def test_one_interval_far_thicker_than_the_others_may_be_a_typing_error(invented, found):
    (one,) = found(invented.survey(deep(invented, 1700.0)), "interval_thick")
    assert one.severity == "look" and one.place == "D to E, 170.0 m to 1\u00a0700.0 m"
    assert one.text.startswith("1\u00a0530.0 m lie between these stations, and 50.0 m in the median")
    assert not found(invented.survey(deep(invented, 600.0)), "interval_thick")


def deep(invented, depth):
    """A loop, and three readings of a fifth station, E, at some depth."""
    rows = invented.visits("ABCDABCDABCDAB")
    later = [{**row, "time": row["time"].replace("T08", "T12")} for row in rows[:3]]
    return rows + [{**row, "station": "E", "depth [m]": f"{depth}"} for row in later]


def test_a_station_far_beyond_the_path_wants_a_look(invented, found):
    def severity(last):
        results = invented.survey(data='path = "path.csv"', files={"path.csv": PATH.format(last=last)})
        return [one.severity for one in found(results, "path_extrapolated")]

    assert severity(149.0) == ["look"]
    assert severity(151.0) == ["note"]
