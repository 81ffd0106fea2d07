"""What the docket says of tide, air pressure and tilt, and of what an instrument has applied itself."""

import re
from datetime import UTC, datetime, timedelta
from math import radians
from pathlib import Path

import numpy as np
import pytest

from plumbwell.earth.tide import permanent_part, tide_correction
from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.docket.corrections import rounding_of
from plumbwell.study.reduce import reduce

SHAFT = Path(__file__).resolve().parents[2] / "data" / "reiche_zeche_shaft"
EPOCH = datetime(2000, 1, 1, tzinfo=UTC)
OURS = 'tide = "ephemeris"'


def with_tide(rows, *, hours=0.0, factor=1.16, digits=3, more=0.0):
    """Rows whose instrument has added a tide, computed for times so many hours later than they say."""
    times = [datetime.fromisoformat(row["time"].replace("Z", "+00:00")) + timedelta(hours=hours) for row in rows]
    seconds = np.array([(time - EPOCH).total_seconds() for time in times])
    place = {"latitude": radians(47.0), "longitude": radians(9.0), "height": 500.0}
    for row, tide in zip(rows, tide_correction(seconds, factor=factor, **place) / 1e-5 + more, strict=True):
        row["tide_in_reading [mGal]"] = f"{tide:.{digits}f}"
    return rows


def of_tide(results):
    """Codes of what is told of the instrument's tide."""
    return [one.code for one in results.findings if one.code in ("tide_hour", "tide_disagrees")]


def shaft_with_times_moved(folder, hours):
    """The real shaft survey with all its times so many hours later."""
    for file in SHAFT.iterdir():
        text = file.read_text("utf-8")
        if file.name == "readings.csv":

            def later(found):
                moved = datetime.fromisoformat(found[1]) + timedelta(hours=hours)
                return f"{moved:%Y-%m-%dT%H:%M:%S}Z,"

            text = re.sub(r"^(\S+)Z,", later, text, flags=re.MULTILINE)
        (folder / file.name).write_text(text, encoding="utf-8")
    return reduce(Case(survey=read_survey(folder)))


def test_the_real_shaft_agrees_with_our_tide(graver):
    results = reduce(Case(survey=read_survey(SHAFT)))
    assert not of_tide(results)
    assert graver(results) == []


@pytest.mark.parametrize(
    ("hours", "words", "ahead"),
    [
        (1, "The times look one hour late: ", "3600"),
        (2, "The times look 2 hours late: ", "7200"),
        (-1, "The times look one hour early: ", "-3600"),
        (-2, "The times look 2 hours early: ", "-7200"),
    ],
)
def test_the_real_shaft_with_its_times_moved_is_told_the_hour(tmp_path, found, hours, words, ahead):
    results = shaft_with_times_moved(tmp_path, hours)
    (one,) = found(results, "tide_hour")
    assert one.severity == "look" and one.text.startswith(words)
    assert "and by 0.6 µGal when ours is taken" in one.text
    assert f"clock_ahead = {ahead} " in one.mend


@pytest.mark.parametrize(
    "innocent",
    [{"digits": 3}, {"digits": 2}, {"factor": 1.2}, {"factor": 1.14}, {"factor": 1.2, "digits": 2}],
    ids=str,
)
def test_rounding_and_another_factor_are_no_disagreement(invented, innocent):
    rows = with_tide(invented.visits(LONG_DAY), **innocent)
    assert not of_tide(invented.survey(rows, recipe=OURS))


LONG_DAY = "ABCD" * 12


def test_a_tide_that_no_hour_explains_is_told_with_its_size(invented, found):
    results = invented.survey(with_tide(invented.visits(LONG_DAY), more=0.050), recipe=OURS)
    (one,) = found(results, "tide_disagrees")
    assert one.severity == "look"
    assert one.text.startswith("The instrument's own tide and ours differ by 50.0 µGal (rms of 144 readings; ")
    steady = abs(1.16 * float(permanent_part(radians(47.0)))) / 1e-8
    assert f"A steady {steady:.1f} µGal would be the permanent tide" in one.mend


def test_a_turned_sign_is_suspected(invented, found):
    rows = with_tide(invented.visits(LONG_DAY), factor=-1.16)
    (one,) = found(invented.survey(rows, recipe=OURS), "tide_disagrees")
    assert "about twice the tide itself: its sign may be turned" in one.text


@pytest.mark.parametrize(
    ("values", "step"),
    [([0.01, -0.03], 1e-7), ([0.012, -0.03], 1e-8), ([0.0123], 1e-9), ([0.01234], 0.0), ([0.0], 0.0)],
)
def test_the_last_digit_of_a_tide_column_is_seen(values, step):
    assert rounding_of(np.array(values) * 1e-5) == step


def test_a_tide_that_is_not_given_is_the_instruments(invented, found):
    (one,) = found(invented.survey(recipe=OURS), "tide_of_instrument")
    assert one.severity == "note" and one.place == "instrument M"
    assert one.text.startswith("33 readings hold the tide correction of the instrument (M) itself")


def test_a_tide_that_is_given_in_part_mixes_two(invented, found):
    rows = with_tide(invented.visits())
    rows[5]["tide_in_reading [mGal]"] = ""
    results = invented.survey(rows, recipe=OURS)
    (one,) = found(results, "tide_partly_given")
    assert one.severity == "look" and one.rows == (5,)
    assert not found(results, "tide_of_instrument")


def test_a_tide_that_is_given_everywhere_tells_nothing(invented, found):
    results = invented.survey(with_tide(invented.visits()), recipe=OURS)
    assert not found(results, "tide_of_instrument") and not found(results, "tide_partly_given")


def test_no_tide_at_all_wants_a_look(invented, found):
    results = invented.survey(instrument="applied = []")
    (one,) = found(results, "no_tide")
    assert one.severity == "look" and "33 readings hold no correction of the instrument" in one.text


def test_no_tide_is_right_where_the_instrument_has_it(invented, found):
    assert not found(invented.survey(), "no_tide")


def test_the_permanent_tide_is_told_with_its_sign(invented, found):
    (one,) = found(invented.survey(instrument="applied = []", recipe=OURS), "permanent_tide")
    size = 1.16 * float(permanent_part(radians(47.0))) / 1e-8
    assert size < -10.0 and f"\u2212{-size:.1f} µGal on every reading" in one.text
    assert not found(invented.survey(), "permanent_tide")


def with_pressure(rows, pressure):
    """Rows with a pressure in hPa, which may depend on the station's depth."""
    for row in rows:
        row["pressure [hPa]"] = f"{pressure(float(row['depth [m]'])):.2f}"
    return rows


def test_a_gauge_in_fluid_is_not_applied(invented, found):
    results = invented.survey(with_pressure(invented.visits(), lambda depth: 955.0 + 9.8 * depth))
    (one,) = found(results, "pressure_not_air")
    assert one.severity == "error" and "hPa from the standard of that height (row " in one.text
    assert one.place == "run 1, instrument M"
    assert not np.any(results.readings.pressure_effect.values)


def test_the_air_of_a_drift_is_not_applied(invented, found):
    results = invented.survey(with_pressure(invented.visits(), lambda depth: 950.0 + 0.12 * depth))
    (one,) = found(results, "pressure_not_air")
    assert "rise by 0.120 hPa per m of depth beside the standard, more than 0.02" in one.text


def test_the_pressure_of_the_open_air_is_applied(invented, found):
    results = invented.survey(with_pressure(invented.visits(), lambda depth: 960.0 + 0.01 * depth))
    assert not [one for one in results.findings if one.code.startswith("pressure")]
    assert np.all(results.readings.pressure_effect.values != 0.0)


def test_pressures_given_in_part_want_a_look(invented, found):
    rows = with_pressure(invented.visits(), lambda depth: 940.0)
    rows[4]["pressure [hPa]"] = ""
    (one,) = found(invented.survey(rows), "pressure_partly_given")
    assert one.severity == "look" and one.rows == (4,) and one.place == "run 1; readings.csv, row 6"


def test_tilts_given_in_part_count_as_level_and_are_told(invented, found):
    rows = [{**row, "tilt_x [arcsec]": "30", "tilt_y [arcsec]": "0"} for row in invented.visits()]
    assert not found(invented.survey(rows), "tilt_partly_given")
    rows[7]["tilt_x [arcsec]"] = ""
    (one,) = found(invented.survey(rows), "tilt_partly_given")
    # 980 700 mGal (1 - cos 30") = 10.4 uGal.
    assert one.rows == (7,) and "corrected by up to 10.4 µGal" in one.text


def test_tilts_that_the_instrument_applied_need_not_be_given(invented, found):
    rows = [{**row, "tilt_x [arcsec]": "30"} for row in invented.visits()]
    rows[7]["tilt_x [arcsec]"] = ""
    results = invented.survey(rows, instrument='applied = ["tide", "tilt"]')
    assert not found(results, "tilt_partly_given")


def test_drift_and_temperature_in_the_reading_are_told(invented, found):
    results = invented.survey(instrument='applied = ["tide", "drift", "temperature"]')
    (one,) = found(results, "applied_by_instrument")
    assert one.severity == "note" and "its own corrections for drift and temperature" in one.text
    assert not found(invented.survey(), "applied_by_instrument")


def test_a_loading_table_that_goes_with_no_tide_is_told(invented, found):
    hours = [f"2026-05-04T{hour:02d}:00:00Z,0.0{hour % 3}" for hour in range(6, 14)]
    files = {"loading.csv": "\n".join(["time,tide [mGal]", *hours]) + "\n"}
    data = 'ocean_loading = "loading.csv"'
    (one,) = found(invented.survey(data=data, files=files), "loading_unused")
    assert one.severity == "look" and 'since tide = "none"' in one.text
    (one,) = found(invented.survey(data=data, files=files, recipe=OURS), "loading_unused")
    assert "holds its instrument's own tide" in one.text
    ours = invented.survey(data=data, files=files, recipe=OURS, instrument="applied = []")
    assert not found(ours, "loading_unused") and found(ours, "permanent_tide")
    assert not found(invented.survey(recipe=OURS), "permanent_tide")  # no reading gets a tide of ours
