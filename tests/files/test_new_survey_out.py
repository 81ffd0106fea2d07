"""The template survey: it reduces as it stands, says nothing above note, and explains every recipe key."""

import os
import re
import tomllib

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.files.new_survey import FILES, write_new_survey
from plumbwell.files.output_folder import UnfitTarget
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.recipe import KEYS, UNAVAILABLE, from_written


def test_it_reduces_as_it_stands_and_nothing_is_above_note(tmp_path):
    assert write_new_survey(tmp_path / "mine") == tuple(FILES)
    assert sorted(os.listdir(tmp_path)) == ["mine"]
    results = reduce(Case(survey=read_survey(tmp_path / "mine")))
    assert [one for one in results.findings if one.severity != "note"] == []
    assert len(results.stations) == 13 and len(results.intervals) == 11
    density = results.intervals.density.values
    assert ((density > 1900.0) & (density < 2600.0)).all()
    assert (results.intervals.density_sd.values < 10.0).all()
    assert not results.survey.readings.use.all(), "it shows how a reading is put out of use"


def test_every_file_says_that_it_is_explained_or_invented():
    assert "INVENTED" in FILES["survey.toml"]
    for text in FILES.values():
        assert text.startswith("#") and text.endswith("\n") and text.isascii()


def test_recipe_keys_that_are_shown_exist_and_their_values_may_stand():
    shown = dict(re.findall(r"^#? ?(\w+) = (.+?)(?:\s+#.*)?$", FILES["survey.toml"].split("[recipe]")[1], re.M))
    assert set(shown) == set(KEYS) - {"terrain_tolerance", "out_of_table", *UNAVAILABLE} | {"layers", "drift_walk"}
    for key, text in shown.items():
        from_written(key, tomllib.loads(f"value = {text}")["value"])


def test_commented_keys_of_the_recipe_show_the_defaults(tmp_path):
    write_new_survey(tmp_path / "mine")
    text = (tmp_path / "mine" / "survey.toml").read_text("utf-8")
    head, recipe = text.split("[recipe]")
    opened = re.sub(r"^# (\w+ = )", r"\1", recipe, flags=re.M).replace('datum_station = "D1"', "")
    plain = read_survey(tmp_path / "mine").recipe
    (tmp_path / "mine" / "survey.toml").write_text(head + "[recipe]" + opened, "utf-8")
    assert read_survey(tmp_path / "mine").recipe == plain


def test_an_empty_folder_serves_and_a_full_one_is_refused_untouched(tmp_path):
    empty, full = tmp_path / "empty", tmp_path / "full"
    empty.mkdir()
    full.mkdir()
    (full / "thing").write_text("mine")
    write_new_survey(empty)
    assert sorted(os.listdir(empty)) == sorted(FILES)
    with pytest.raises(UnfitTarget, match='full" is there already and not empty'):
        write_new_survey(full)
    with pytest.raises(UnfitTarget, match='thing" is a file; name a new folder, nothing is overwritten'):
        write_new_survey(full / "thing")
    assert os.listdir(full) == ["thing"]


@pytest.mark.parametrize("walk", ["auto", "off"])
def test_what_it_says_of_the_drift_walk_is_so(tmp_path, walk):
    write_new_survey(tmp_path / "mine")
    toml = tmp_path / "mine" / "survey.toml"
    toml.write_text(toml.read_text("utf-8").replace('# drift_walk = "auto"', f'drift_walk = "{walk}"'), "utf-8")
    codes = [one.code for one in reduce(Case(survey=read_survey(tmp_path / "mine"))).findings]
    assert codes.count("drift_walk_untested") == (walk == "auto")


def test_a_place_outranks_the_depth_of_a_reading_as_it_says(tmp_path):
    write_new_survey(tmp_path / "mine")
    before = reduce(Case(survey=read_survey(tmp_path / "mine"))).stations.located.positions.elevation.values
    readings = tmp_path / "mine" / "readings.csv"
    readings.write_text(readings.read_text("utf-8").replace(",PAD,,", ",PAD,77,"), "utf-8")
    after = reduce(Case(survey=read_survey(tmp_path / "mine"))).stations.located.positions.elevation.values
    assert (before == after).all()


def test_the_commented_counter_instrument_works_when_it_is_opened(tmp_path):
    write_new_survey(tmp_path / "mine")
    toml, readings = tmp_path / "mine" / "survey.toml", tmp_path / "mine" / "readings.csv"
    text = toml.read_text("utf-8")
    rows = re.findall(r"^# +#   (counter .*|\d+,[\d.]+)$", text, re.M)
    (tmp_path / "mine" / "calibration_B.csv").write_text("\n".join(rows) + "\n", "utf-8")
    opened = re.sub(r"^# (\[instrument\.B\]|calibration = )", r"\1", text, flags=re.M)
    opened = opened.replace('# kind = "gravimeter"\ncal', 'kind = "gravimeter"\ncal').replace(
        'instrument = "A"', 'instrument = "B"'
    )
    toml.write_text(opened, "utf-8")
    readings.write_text(
        re.sub(r",31(\d\d)\.(\d{3}),1", r",30\1.\2,1", readings.read_text("utf-8")).replace(
            "reading [mGal],pressure", "reading [counts],pressure"
        ),
        "utf-8",
    )
    results = reduce(Case(survey=read_survey(tmp_path / "mine")))
    assert len(results.intervals) == 11
    rise = results.stations.gravity.values[-1] - results.stations.gravity.values[1]
    assert rise / 1e-5 == pytest.approx(1.0545 * 36.325, abs=0.05)


def test_words_of_the_trade_are_explained_and_clocks_are_told():
    toml, text = FILES["survey.toml"], " ".join(" ".join(FILES.values()).replace("#", " ").split())
    told = ("tare: a sudden jump", "(re-seating)", "a visit is a series", "datum: the station", "depth datum, the")
    assert [words for words in told if words not in text] == []
    assert "summer time included" in text and "+02:00" in toml
    assert 'act only with reference_density = "markers"' in text
