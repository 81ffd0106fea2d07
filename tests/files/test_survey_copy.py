"""A survey folder that states what lies on top of another: the same numbers, and all else as it was written."""

import os
import tomllib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from plumbwell.files import survey_copy as module
from plumbwell.files.folder import read_survey
from plumbwell.files.output_folder import UnfitTarget
from plumbwell.files.readings_edits import cell_spans, edited_readings
from plumbwell.files.survey_copy import CopyRefused, write_survey_copy
from plumbwell.files.survey_toml_edits import exact_number, exact_time
from plumbwell.files.tables_out import csv_texts
from plumbwell.files.times import times_of
from plumbwell.study.acts import AddRecipe, AddTare, ChooseRecipe, DropTare, Exclude, Include, Note, SetRecipe
from plumbwell.study.case import AS_SURVEYED, Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.recipe import KEYS, Recipe
from reduced_surveys import MINE, SHAFT, WELL
from small_folder import TOML

HEAD = "# gravity, by hand\n\n"
READINGS = (
    "time,run,station,depth [ft],reading [mGal],use,note\n"
    '2026-05-04T09:00:00Z,1,A,100.0,4000.010,,"windy, ""very"""\n'
    "2026-05-04T09:20:00Z,1, B ,120.0,4001.900,yes,\n"
    "# the lamp was changed here\n"
    '2026-05-04T09:40:00Z,1,"A",100.0,4000.020,YES ,\n'
    "2026-05-04T10:00:00Z,1,B,120.0,4001.930,no,knocked\n"
    "2026-05-04T10:20:00Z,1,A,100.0,4000.060,,\n"
    "2026-05-04T10:40:00Z,1,B,120.0,4001.951,,\n"
)
BARE = "\n".join(
    ",".join(line.split(",")[:5]) for line in READINGS.replace(',"windy, ""very"""', ",").split("\n")
).replace("no,knocked", "")
TARES = (
    '\n[[tare]]  # the knock\nrun = "1"\ntime = "2026-05-04T09:50:00Z"  # by the log\n'
    '\n# seen only later\n[[tare]]\nrun = "1"\ntime = "2026-05-04T10:10:00Z"\nsize = 0.01\n\n# how it is worked\n'
)


def written(folder: Path, toml: str = TOML, readings: str | bytes = READINGS, **tables: str) -> Path:
    folder.mkdir(exist_ok=True)
    (folder / "survey.toml").write_bytes(toml.encode())
    (folder / "readings.csv").write_bytes(readings if isinstance(readings, bytes) else readings.encode())
    for name, text in tables.items():
        (folder / f"{name}.csv").write_text(text, "utf-8")
    return folder


def acted(folder: Path, *acts) -> Case:
    case = Case(survey=read_survey(folder))
    for act in acts:
        case = act.apply(case)
    return case


def setting(key, value, name=AS_SURVEYED):
    return SetRecipe(name=name, key=key, value=value)


def tables(results) -> dict[str, str]:
    """All output tables as text, without the readings' own cells."""
    texts = csv_texts(results)
    del texts["readings_reduced.csv"]
    return texts


def assert_same_numbers(one: Case, folder: Path) -> None:
    """A case and a survey folder reduce to the same bits."""
    wanted, found = reduce(one), reduce(read_survey(folder))
    assert tables(found) == tables(wanted)
    for part, name in (("stations", "gravity"), ("intervals", "density"), ("intervals", "density_sd")):
        pair = [getattr(getattr(each, part), name).values for each in (wanted, found)]
        np.testing.assert_array_equal(*pair)
    for name in ("residual", "drift", "run_bias", "visit_effect"):
        pair = [getattr(each.readings.estimates, name).values for each in (wanted, found)]
        np.testing.assert_array_equal(*pair)


def differing(one: Path, other: Path) -> dict[str, list[tuple[str, str]]]:
    """For each file that differs the pairs of lines that do; a missing line is empty."""
    found = {}
    names = {path.relative_to(folder).as_posix() for folder in (one, other) for path in folder.rglob("*.*")}
    for name in sorted(names):
        before, after = ((folder / name).read_bytes().decode().split("\n") for folder in (one, other))
        if before != after:
            length = max(len(before), len(after))
            before, after = (lines + [""] * (length - len(lines)) for lines in (before, after))
            found[name] = [pair for pair in zip(before, after, strict=True) if pair[0] != pair[1]]
    return found


def test_a_case_without_acts_is_copied_byte_for_byte(tmp_path):
    source = written(tmp_path / "a", TOML + TARES)
    (source / "sub").mkdir()
    target = write_survey_copy(acted(source), source, tmp_path / "new" / "b")
    assert target == (tmp_path / "new" / "b").resolve()
    assert differing(source, target) == {}
    assert os.listdir(tmp_path / "new") == ["b"]


@pytest.mark.parametrize("folder", [SHAFT, WELL, MINE], ids=lambda one: one.name)
def test_the_samples_and_the_real_shaft_reduce_to_the_same_bits(folder, tmp_path):
    survey = read_survey(folder)
    mine = np.sort(survey.readings.time.values[survey.readings.run.code == 0])
    out = np.flatnonzero(~survey.readings.use).tolist()
    acts = [
        Exclude(rows=(2, 5, 6, 17), reason='pump, "loud"'),
        *([Include(rows=out[:1], reason="only the winch")] if out else []),
        Note(rows=(0, 5), text="warm; dry"),
        AddTare(run=survey.readings.run.names[0], time=float(mine[8]), size=1.7e-8 / 3, size_sd=1e-8 / 3),
        AddTare(run=survey.readings.run.names[0], time=float(mine[4]) + 0.123),
        setting("depth_sd", 1 / 30),
        setting("free_air", {"gradient": 0.3086 / 1.001, "sd": 0.0003}),
        setting("pressure_admittance", -1 / 3),
        AddRecipe(name="series", based_on=AS_SURVEYED),
        setting("height_form", "series", "series"),
        ChooseRecipe(name="series"),
    ]
    case = acted(folder, *acts)
    target = write_survey_copy(case, folder, tmp_path / "copy")
    assert_same_numbers(case, target)
    assert set(differing(folder, target)) == {"readings.csv", "survey.toml"}
    assert {one.name for one in folder.iterdir()} == {one.name for one in target.iterdir()}


def test_only_cells_of_use_and_note_change(tmp_path):
    source = written(tmp_path / "a", readings=HEAD + READINGS)
    taken = (Exclude(rows=(0, 2), reason='lift, "up"'), Include(rows=(3,), reason="held"))
    case = acted(source, *taken, Note(rows=(1,), text="calm"))
    target = write_survey_copy(case, source, tmp_path / "b")
    assert differing(source, target) == {
        "readings.csv": [
            (
                '2026-05-04T09:00:00Z,1,A,100.0,4000.010,,"windy, ""very"""',
                '2026-05-04T09:00:00Z,1,A,100.0,4000.010,no,"windy, ""very""; lift, ""up"""',
            ),
            ("2026-05-04T09:20:00Z,1, B ,120.0,4001.900,yes,", "2026-05-04T09:20:00Z,1, B ,120.0,4001.900,yes,calm"),
            (
                '2026-05-04T09:40:00Z,1,"A",100.0,4000.020,YES ,',
                '2026-05-04T09:40:00Z,1,"A",100.0,4000.020,no,"lift, ""up"""',
            ),
            (
                "2026-05-04T10:00:00Z,1,B,120.0,4001.930,no,knocked",
                "2026-05-04T10:00:00Z,1,B,120.0,4001.930,yes,knocked; held",
            ),
        ]
    }
    assert_same_numbers(case, target)


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("mark", [b"", b"\xef\xbb\xbf"])
def test_columns_that_are_missing_are_added_and_line_ends_stay(tmp_path, end, mark):
    readings = mark + (HEAD + BARE).replace("\n", end).encode()
    source = written(tmp_path / "a", readings=readings)
    case = acted(source, Exclude(rows=(2,), reason="lift"))
    target = write_survey_copy(case, source, tmp_path / "b")
    data = (target / "readings.csv").read_bytes()
    assert data.startswith(mark + f"# gravity, by hand{end}{end}time,run,".encode())
    lines = data.decode("utf-8-sig").split(end)
    assert lines[2] == "time,run,station,depth [ft],reading [mGal],use,note"
    assert lines[3] == "2026-05-04T09:00:00Z,1,A,100.0,4000.010,,"
    assert lines[5] == "# the lamp was changed here"
    assert lines[6] == '2026-05-04T09:40:00Z,1,"A",100.0,4000.020,no,lift'
    assert_same_numbers(case, target)


def test_an_empty_last_column_gives_way(tmp_path):
    source = written(tmp_path / "a", readings="".join(f"{line},\n" for line in BARE.splitlines()))
    case = acted(source, Exclude(rows=(2,), reason="lift"))
    text = (write_survey_copy(case, source, tmp_path / "b") / "readings.csv").read_text()
    assert text.startswith("time,run,station,depth [ft],reading [mGal],use,note\n")
    assert '\n2026-05-04T09:40:00Z,1,"A",100.0,4000.020,no,lift\n' in text
    assert_same_numbers(case, tmp_path / "b")


def test_a_note_in_the_first_column_never_turns_its_row_into_a_comment(tmp_path):
    rows = [line.split(",") for line in BARE.splitlines() if not line.startswith("#")]
    text = "".join(f"{'' if number else 'note'},{','.join(row)}\n" for number, row in enumerate(rows))
    source = written(tmp_path / "a", readings=text)
    case = acted(source, Note(rows=(1,), text="# one"))
    target = write_survey_copy(case, source, tmp_path / "b")
    assert read_survey(target).readings.note[1] == "# one"


def test_the_recipe_is_changed_where_it_stands_and_comments_stay(tmp_path):
    recipe = '[recipe]      # ours\ndepth_sd = 0.05   # taped\n# noise = "estimate"\n\n[rock]\nmatrix = 2.7\n'
    toml = TOML + TARES + recipe
    source = written(tmp_path / "a", toml)
    case = acted(source, setting("depth_sd", 0.1), setting("drift_order", 2), setting("noise", "as_given"))
    target = write_survey_copy(case, source, tmp_path / "b")
    text = (target / "survey.toml").read_text()
    assert text == toml.replace(
        "depth_sd = 0.05   # taped\n", 'depth_sd = 0.1   # taped\ndrift_order = 2\nnoise = "as_given"\n'
    )
    assert_same_numbers(case, target)


@pytest.mark.parametrize(
    "recipe",
    [
        "",
        "[recipe]\n# nothing yet\n",
        '[recipe]\nnoise = "estimate"\n[recipe.free_air]\ngradient = 0.31\nsd = 0.001\n',
        "[recipe]\nfree_air = { gradient = 0.31, sd = 0.001 } # measured",
        '["recipe"]\n"noise" = \'estimate\'\r\n',
    ],
)
def test_all_ways_to_write_a_recipe_can_be_edited(tmp_path, recipe):
    source = written(tmp_path / "a", TOML + recipe)
    survey = read_survey(source)
    acts = [setting("noise", "as_given"), setting("depth_sd", 0.2), setting("layer_boundaries", 2.5)]
    if survey.recipe.free_air != "normal":
        acts.append(setting("free_air", "normal"))
    case = acted(source, *acts)
    target = write_survey_copy(case, source, tmp_path / "b")
    assert read_survey(target).recipe == case.chosen
    assert_same_numbers(case, target)


@pytest.mark.parametrize("recipe", ['recipe = { noise = "estimate" }\n', 'recipe.noise = "estimate"\n'])
def test_a_recipe_in_one_line_can_be_edited(tmp_path, recipe):
    source = written(tmp_path / "a", recipe + TOML)
    case = acted(source, setting("noise", "as_given"), setting("depth_sd", 0.2))
    assert read_survey(write_survey_copy(case, source, tmp_path / "b")).recipe == case.chosen


def test_a_recipe_given_in_python_may_take_a_key_away(tmp_path):
    source = written(tmp_path / "a", TOML + '[recipe]\ndatum_station = "A"\n')
    survey = read_survey(source)
    case = Case(survey=survey, recipe=replace(survey.recipe, datum_station=None))
    target = write_survey_copy(case, source, tmp_path / "b")
    assert "datum_station" not in tomllib.loads((target / "survey.toml").read_text())["recipe"]
    assert_same_numbers(case, target)


def test_a_dropped_tare_becomes_a_comment_and_an_added_one_a_table(tmp_path):
    toml = TOML + TARES + "[recipe]\ndepth_sd = 0.05\n"
    source = written(tmp_path / "a", toml)
    first, second = read_survey(source).tares
    case = acted(source, DropTare(run="1", time=first.time), AddTare(run="1", time=second.time + 300.0, size=3e-8))
    target = write_survey_copy(case, source, tmp_path / "b")
    text = (target / "survey.toml").read_text()
    assert text == toml.replace(
        '[[tare]]  # the knock\nrun = "1"\ntime = "2026-05-04T09:50:00Z"  # by the log\n',
        '# [[tare]]  # the knock\n# run = "1"\n# time = "2026-05-04T09:50:00Z"  # by the log\n',
    ).replace(
        "size = 0.01\n\n# how it is worked\n",
        'size = 0.01\n\n[[tare]]\nrun = "1"\ntime = "2026-05-04T10:15:00Z"\nsize = 0.003\n\n# how it is worked\n',
    )
    assert read_survey(target).tares[0] == second
    assert_same_numbers(case, target)
    both = acted(source, *(DropTare(run="1", time=one.time) for one in (first, second)))
    assert read_survey(write_survey_copy(both, source, tmp_path / "c")).tares == ()


def test_tares_in_one_line_are_edited_too(tmp_path):
    lines = 'tare = [{run = "1", time = "2026-05-04T09:50:00Z"}, {run = "1", time = "2026-05-04T10:10:00Z"}]\n'
    source = written(tmp_path / "a", lines + TOML)
    first, second = read_survey(source).tares
    case = acted(source, DropTare(run="1", time=first.time), AddTare(run="1", time=second.time - 60.0))
    target = write_survey_copy(case, source, tmp_path / "b")
    assert [one.time for one in read_survey(target).tares] == [second.time, second.time - 60.0]
    assert_same_numbers(case, target)


def test_line_ends_of_survey_toml_stay(tmp_path):
    source = written(tmp_path / "a", (TOML + TARES).replace("\n", "\r\n"))
    case = acted(source, setting("depth_sd", 0.2), AddTare(run="1", time=read_survey(source).tares[0].time + 60.0))
    data = (write_survey_copy(case, source, tmp_path / "b") / "survey.toml").read_bytes()
    assert data.count(b"\n") == data.count(b"\r\n") > 20
    assert_same_numbers(case, tmp_path / "b")


def test_counts_feet_tables_in_subfolders_and_files_beside_go_along(tmp_path):
    toml = TOML.replace('"readings.csv"', '"field/day one.csv"\npath = "./path.csv"\nopenings = "field/voids.csv"')
    toml += '[instrument.A]\ncalibration = "field/table.csv"\n'
    source = written(tmp_path / "a", toml)
    (source / "field").mkdir()
    readings = READINGS.replace("[mGal]", "[counts]").replace(",4000.", ",1500.").replace(",4001.", ",1502.")
    (source / "readings.csv").rename(source / "field" / "day one.csv")
    (source / "field" / "day one.csv").write_text(readings)
    (source / "field" / "table.csv").write_text("counter [counts],gravity [mGal]\n1400,3000\n1600,3201\n")
    (source / "field" / "voids.csv").write_text("name,shape\n")
    (source / "path.csv").write_text("depth [ft],inclination [deg],azimuth [deg]\n0,0,0\n400,3,90\n")
    (source / "photo.jpg").write_bytes(bytes(range(256)))
    (source / ".hidden").write_text("x")
    case = acted(source, Exclude(rows=(1,), reason="lift"), Include(rows=(3,)))
    target = write_survey_copy(case, source, tmp_path / "b")
    assert set(differing(source / "field", target / "field")) == {"day one.csv"}
    assert (target / "photo.jpg").read_bytes() == bytes(range(256))
    assert (target / "field" / "voids.csv").exists() and not (target / ".hidden").exists()
    assert_same_numbers(case, target)


def test_a_copy_of_a_copy_says_each_reason_once(tmp_path):
    source = written(tmp_path / "a")
    first = write_survey_copy(acted(source, Exclude(rows=(0,), reason="lift")), source, tmp_path / "b")
    case = acted(first, Include(rows=(0,)), Exclude(rows=(0, 1), reason="lift"))
    second = write_survey_copy(case, first, tmp_path / "c")
    assert read_survey(second).readings.note[:2] == ('windy, "very"; lift', "lift")


@pytest.mark.parametrize(
    ("name", "told"),
    [
        ("a", "is the survey folder itself or lies inside it"),
        ("a/in/it", "is the survey folder itself or lies inside it"),
        ("full", "is there already and not empty; name a new folder, nothing is overwritten."),
        ("file", "is a file; name a new folder"),
        ("file/below", "cannot be"),
    ],
)
def test_targets_that_cannot_serve(tmp_path, name, told):
    source = written(tmp_path / "a")
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "x").write_text("x")
    (tmp_path / "file").write_text("x")
    with pytest.raises((UnfitTarget, OSError)) as caught:
        write_survey_copy(acted(source), source, tmp_path / name)
    if isinstance(caught.value, UnfitTarget):
        assert told in str(caught.value)
    assert sorted(os.listdir(tmp_path)) == ["a", "file", "full"]
    assert sorted(os.listdir(source)) == ["readings.csv", "survey.toml"]


def test_an_empty_folder_serves_and_keeps_its_place(tmp_path):
    source = written(tmp_path / "a")
    (tmp_path / "b").mkdir()
    write_survey_copy(acted(source), source / "survey.toml", tmp_path / "b")
    assert differing(source, tmp_path / "b") == {}
    assert (tmp_path / "b").stat().st_mode == source.stat().st_mode


def test_a_source_that_has_changed_since_is_not_copied(tmp_path):
    source = written(tmp_path / "a")
    case = acted(source, Exclude(rows=(0,), reason="lift"))
    (source / "readings.csv").write_text(READINGS.replace("4000.010", "4000.011"))
    with pytest.raises(CopyRefused, match="^readings.csv has changed since the survey was read. Open the survey again"):
        write_survey_copy(case, source, tmp_path / "b")
    (source / "readings.csv").unlink()
    with pytest.raises(CopyRefused, match="^readings.csv cannot be copied: found no such file."):
        write_survey_copy(case, source, tmp_path / "b")
    assert os.listdir(tmp_path) == ["a"]


def test_a_copy_that_would_not_say_the_same_is_not_written(tmp_path, monkeypatch):
    source = written(tmp_path / "a")
    case = acted(source, Exclude(rows=(0,), reason="lift"))
    monkeypatch.setattr(module, "edited_readings", lambda data, **_: data)
    with pytest.raises(CopyRefused, match=r"^The copy would not say the same \(readings, use, readings, note\)"):
        write_survey_copy(case, source, tmp_path / "b")
    monkeypatch.setattr(module, "edited_readings", lambda data, **_: data.replace(b"4000.010", b"x"))
    with pytest.raises(CopyRefused, match="^The survey cannot be written as a folder that can be read: readings.csv"):
        write_survey_copy(case, source, tmp_path / "b")
    assert os.listdir(tmp_path) == ["a"]


def test_a_disk_that_refuses_leaves_nothing_behind(tmp_path, monkeypatch):
    source = written(tmp_path / "a")
    case = acted(source, Exclude(rows=(0,), reason="lift"))

    def refuse(*_):
        raise OSError(28, "No space left on device")

    for name in ("rename", "fsync"):
        with monkeypatch.context() as patch:
            patch.setattr(module.os, name, refuse)
            with pytest.raises(OSError, match="No space left"):
                write_survey_copy(case, source, tmp_path / "b")
        assert os.listdir(tmp_path) == ["a"]


def test_cells_are_found_between_commas_and_quotes():
    line = ' a ,"b, ""c""" , ,"",d'
    assert [line[start:end] for start, end in cell_spans(line)] == [" a ", '"b, ""c""" ', " ", '""', "d"]
    assert edited_readings(b"time,reading [mGal]\n1,2\n3,4", uses={1: "no"}, notes={}) == (
        b"time,reading [mGal],use\n1,2,\n3,4,no"
    )


def test_every_setting_is_written_so_that_it_is_read_back():
    chance = np.random.default_rng(5)
    for key in KEYS.values():
        if key.factor is None:
            continue
        for number in (*chance.uniform(0.0, 10.0, 200).tolist(), 0.0, 1 / 3, 50.0):
            value = number * key.factor
            assert exact_number(value, key.factor) * key.factor == value
    assert exact_number(Recipe().datum_sd, KEYS["datum_sd"].factor) == 50.0
    assert exact_number(0.03, 1.0) == 0.03


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (831211920.0, "2026-05-04T12:12:00Z"),
        (831211920.25, "2026-05-04T12:12:00.25Z"),
        (831211920.3, "2026-05-04T12:12:00.3Z"),
        (-0.5, "1999-12-31T23:59:59.5Z"),
        (86399.9999999, "2000-01-01T23:59:59.9999999Z"),
    ],
)
def test_times_are_written_as_short_as_they_are_read_back(seconds, text):
    assert exact_time(seconds) == text
    assert times_of([text]).values[0] == seconds
