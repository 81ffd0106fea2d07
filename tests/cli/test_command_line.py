"""The command line as a person meets it: what it prints, what it writes, which status it ends with."""

import csv
import errno
import hashlib
import json
import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

import plumbwell.study.reduce
from plumbwell.cli import main

CHECKOUT = Path(__file__).resolve().parents[2]
SHAFT = CHECKOUT / "tests" / "data" / "reiche_zeche_shaft"
WELL = CHECKOUT / "sample_surveys" / "tolly_bank_well"
TABLES = {
    "stations.csv", "intervals.csv", "layers.csv", "readings_reduced.csv", "repeats.csv", "visits.csv", "reduced.las",
    "density_covariance.csv", "common_covariance.csv", "station_covariance.csv", "summary.json",
}  # fmt: skip
FIGURES = {"figure.svg", "figure.png"}


@pytest.fixture
def plain_figures(monkeypatch):
    """Figures are texts, so that a test need not draw."""

    def write_figures(results, folder):
        for name in FIGURES:
            (folder / name).write_text(results.survey.site.name)

    monkeypatch.setattr("plumbwell.plates.figure_of.write_figures", write_figures)


@pytest.fixture
def survey(tmp_path):
    """A copy of a survey folder that a test may spoil."""
    return Path(shutil.copytree(SHAFT, tmp_path / "survey"))


def files_of(folder):
    """Content of all files below a folder, by name."""
    return {one.relative_to(folder).as_posix(): one.read_bytes() for one in folder.rglob("*") if one.is_file()}


def run(*words, **environment):
    """The command in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "plumbwell", *map(str, words)],
        env={**os.environ, "PYTHONPATH": str(CHECKOUT / "src"), **environment},
        capture_output=True,
        check=False,
        timeout=120,
        encoding="utf-8",
    )


def spoiled(survey, old, new):
    text = (survey / "readings.csv").read_text("utf-8")
    assert old in text
    (survey / "readings.csv").write_text(text.replace(old, new, 1), "utf-8")


def test_reduce_writes_everything_and_nothing_into_the_survey(survey, tmp_path):
    before = {name: hashlib.sha256(data).hexdigest() for name, data in files_of(survey).items()}
    done = run("reduce", survey, "--out", tmp_path / "out")
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    out = files_of(tmp_path / "out")
    assert set(out) == TABLES | FIGURES
    assert out["figure.svg"].lstrip().startswith(b"<?xml") and out["figure.png"].startswith(b"\x89PNG")
    assert {name: hashlib.sha256(data).hexdigest() for name, data in files_of(survey).items()} == before
    assert sorted(os.listdir(tmp_path)) == ["out", "survey"]
    text = " ".join(done.stdout.split())
    assert "Reiche Zeche shaft: 4 stations, 3 intervals; 28 readings: all used." in text
    assert f"13 files in {tmp_path / 'out'}: " in text
    assert all(name in text for name in out)
    assert re.search(r"Findings: \d+ note", text)
    assert "3 densities from 2.327 to 2.570 g/cm3, sd (standard deviation) 0.001 to 0.002, and 0.005 " in text
    assert "plumbwell check " in text
    assert text.count("A qualified person must judge") == 1
    summary = json.loads(out["summary.json"])
    assert set(summary["outputs"]) == set(out)
    # The command to type next is not broken.
    assert max(len(line) for line in done.stdout.splitlines() if " check " not in line) <= 80


def test_two_runs_differ_in_timing_alone(tmp_path):
    for name in ("one", "two"):
        assert main(["reduce", str(WELL), "--out", str(tmp_path / name), "--quiet"]) == 0
    one, two = files_of(tmp_path / "one"), files_of(tmp_path / "two")
    told = [json.loads(folder.pop("summary.json")) for folder in (one, two)]
    assert one == two
    for summary in told:
        assert summary.pop("timing").keys() >= {"network", "densities"}
    assert told[0] == told[1]


def test_quiet_prints_nothing(plain_figures, tmp_path, capsys):
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out"), "--quiet"]) == 0
    assert capsys.readouterr() == ("", "")


def test_a_table_that_this_run_does_not_have_is_gone_and_others_stay(plain_figures, survey, tmp_path, capsys):
    out = tmp_path / "out"
    assert main(["reduce", str(survey), "--out", str(out)]) == 0
    (out / "my notes.txt").write_text("mine")
    (out / "report.pdf").write_text("mine too")
    text = (survey / "survey.toml").read_text("utf-8")
    (survey / "survey.toml").write_text(text + 'layers = "none"\n', "utf-8")
    assert main(["reduce", str(survey), "--out", str(out)]) == 0
    assert set(files_of(out)) == (TABLES | FIGURES | {"my notes.txt", "report.pdf"}) - {"layers.csv"}
    assert "layers.csv is not written" in " ".join(capsys.readouterr().out.split())


def test_alternatives_are_written_where_they_are_asked_for(plain_figures, tmp_path, capsys):
    out, rows = tmp_path / "out", []
    assert main(["reduce", str(WELL), "--out", str(out), "--alternatives", "--quiet"]) == 0
    assert set(files_of(out)) == TABLES | FIGURES | {"alternatives.csv"}
    assert "alternatives.csv" in json.loads((out / "summary.json").read_text("utf-8"))["outputs"]
    with open(out / "alternatives.csv", newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert rows[0]["key"] == "in_force" and rows[0]["gain"] == "0" and rows[0]["f"] == ""
    assert [row["tares"] for row in rows if row["key"].startswith("tare_out:")] == ["0"]
    # Without being asked for it is neither worked out nor left from before.
    assert main(["reduce", str(WELL), "--out", str(out), "--quiet"]) == 0
    assert set(files_of(out)) == TABLES | FIGURES
    assert capsys.readouterr() == ("", "")


def test_wrong_input_is_told_in_its_parts_with_status_1(survey, tmp_path, capsys):
    spoiled(survey, "4855.218", "48s5.218")
    spoiled(survey, "2026-02-17T08:40:05Z", "2026-02-30T08:40:05Z")
    for words in (["reduce", str(survey), "--out", str(tmp_path / "out")], ["check", str(survey)]):
        assert main(words) == 1
        out, err = capsys.readouterr()
        assert out == ""
        assert "The survey cannot be read: 2 problems." in err
        assert "readings.csv, row 9, reading [mGal]\n  found:    " in err and "48s5.218" in err
        assert "readings.csv, row 16, time\n" in err
        assert err.count("  expected: ") == err.count("  to mend:  ") == 2
        assert "Traceback" not in err
    assert not (tmp_path / "out").exists()


def test_a_folder_that_is_not_there_has_status_1(tmp_path, capsys):
    assert main(["check", str(tmp_path / "nowhere")]) == 1
    assert "nowhere" in capsys.readouterr().err


def test_a_survey_that_cannot_be_reduced_is_told_in_a_sentence(survey, tmp_path, capsys):
    lines = (survey / "readings.csv").read_text("utf-8").splitlines()
    head = next(number for number, line in enumerate(lines) if line.startswith("time,"))
    made = [*lines[:head], lines[head] + ",use", *(line + ",no" for line in lines[head + 1 :])]
    (survey / "readings.csv").write_text("\n".join(made) + "\n", "utf-8")
    assert main(["reduce", str(survey), "--out", str(tmp_path / "out")]) == 1
    out, err = capsys.readouterr()
    assert "no reading in use belongs to a station" in err and "Traceback" not in err and out == ""


@pytest.mark.parametrize(
    "words",
    [
        ["reduce"],
        ["reduce", "x"],
        ["reduced", "x"],
        ["check"],
        ["check", "x", "--out", "y"],
        ["new"],
        ["--what"],
    ],
)
def test_wrong_usage_has_status_2_and_shows_the_usage(words, capsys):
    assert main(words) == 2
    out, err = capsys.readouterr()
    assert err.startswith("usage: plumbwell") and out == ""


@pytest.mark.parametrize("words", [[], ["open"], ["open", "x"]])
@pytest.mark.skipif(sys.platform != "linux", reason="elsewhere a window can always be shown")
def test_without_a_display_the_window_is_refused_with_what_works_instead(words, monkeypatch, capsys):
    for name in ("QT_QPA_PLATFORM", "DISPLAY", "WAYLAND_DISPLAY"):
        monkeypatch.delenv(name, raising=False)
    assert main(words) == 2
    out, err = capsys.readouterr()
    assert "no display here" in err and "plumbwell reduce" in err.replace("\n", " ") and out == ""


@pytest.mark.parametrize(("words", "folder"), [([], None), (["open"], None), (["open", "x"], "x")])
def test_the_window_is_opened_on_the_folder_that_is_named(words, folder, monkeypatch, tmp_path):
    opened = []
    monkeypatch.setenv("PLUMBWELL_HOME", str(tmp_path))
    monkeypatch.setattr("plumbwell.desk.start.run", lambda path, home: opened.append((path, home)) or 0)
    assert main(words) == 0
    assert opened == [(None if folder is None else Path(folder), tmp_path)]


@pytest.mark.parametrize("word", ["--help", "--version"])
def test_help_and_version_have_status_0(word, capsys):
    assert main([word]) == 0
    assert "plumbwell" in capsys.readouterr().out


def test_an_output_folder_that_cannot_serve_is_wrong_usage(survey, tmp_path, capsys):
    before = files_of(survey)
    for out in (survey, survey / "out", survey / "readings.csv"):
        assert main(["reduce", str(survey), "--out", str(out)]) == 2
        text = " ".join(capsys.readouterr().err.split())
        assert "name a folder" in text
    assert files_of(survey) == before


def test_an_error_grade_finding_has_status_3_and_everything_is_written(plain_figures, survey, tmp_path, capsys):
    text = (survey / "survey.toml").read_text("utf-8")
    (survey / "survey.toml").write_text(text.replace("[recipe]", 'bodies = "bodies.csv"\n[recipe]'), "utf-8")
    (survey / "bodies.csv").write_text("name,shape\n", "utf-8")
    assert main(["check", str(survey)]) == 3
    assert "Errors\n  survey.toml" in capsys.readouterr().out
    assert main(["reduce", str(survey), "--out", str(tmp_path / "out")]) == 3
    out = capsys.readouterr().out
    assert "Errors\n  survey.toml" in out and "    to mend: " in out and "Notes" not in out
    assert set(files_of(tmp_path / "out")) == TABLES | FIGURES
    assert main(["reduce", str(survey), "--out", str(tmp_path / "out"), "--quiet"]) == 3
    out, err = capsys.readouterr()
    assert out == "" and err.startswith("Findings: 1 error.")


@pytest.mark.parametrize(
    ("message", "library"),
    [
        ("libEGL.so.1: cannot open shared object file: No such file or directory", "libEGL.so.1"),
        ("No module named 'PySide6.QtSvg'", "PySide6.QtSvg"),
        ("DLL load failed while importing QtGui", "DLL load failed while importing QtGui"),
    ],
)
def test_without_the_drawing_libraries_the_rest_is_written(monkeypatch, tmp_path, capsys, message, library):
    class Missing:
        """Finds the figures' module and fails as a missing library does."""

        def find_spec(self, name, path=None, target=None):
            if name == "plumbwell.plates.figure_of":
                raise ImportError(message)

    monkeypatch.delitem(sys.modules, "plumbwell.plates.figure_of", raising=False)
    if "plumbwell.plates" in sys.modules:
        monkeypatch.delattr("plumbwell.plates.figure_of", raising=False)
    monkeypatch.setattr(sys, "meta_path", [Missing(), *sys.meta_path])
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out")]) == 3
    assert set(files_of(tmp_path / "out")) == TABLES
    findings = json.loads((tmp_path / "out" / "summary.json").read_text("utf-8"))["findings"]
    assert findings[0]["code"] == "figure_not_drawn" and findings[0]["severity"] == "error"
    assert library in findings[0]["text"]
    text = " ".join(capsys.readouterr().out.split())
    assert "Errors figure.svg, figure.png (figure_not_drawn) The figures could not be drawn" in text


def test_check_prints_the_docket_by_severity_within_80_columns(capsys):
    before = files_of(SHAFT)
    assert main(["check", str(SHAFT)]) == 0
    out, err = capsys.readouterr()
    assert err == "" and "\nNotes\n" in out and "    to mend: " in out
    assert max(map(len, out.splitlines())) <= 80
    assert "(relative_gravity)" in out
    assert files_of(SHAFT) == before


def test_new_writes_a_survey_that_reduces_and_never_overwrites(plain_figures, tmp_path, capsys):
    mine = tmp_path / "mine"
    assert main(["new", str(mine)]) == 0
    out = capsys.readouterr().out
    assert "survey.toml" in out and "invented" in out and "plumbwell reduce" in out
    assert main(["check", str(mine)]) == 0
    assert "Wants a look" not in capsys.readouterr().out
    before = files_of(mine)
    assert main(["new", str(mine)]) == 2
    assert "nothing is overwritten" in " ".join(capsys.readouterr().err.split())
    assert files_of(mine) == before


def test_stopped_by_the_user_has_status_130_and_leaves_nothing(monkeypatch, tmp_path, capsys):
    def write_figures(results, folder):
        raise KeyboardInterrupt

    monkeypatch.setattr("plumbwell.plates.figure_of.write_figures", write_figures)
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out")]) == 130
    assert os.listdir(tmp_path) == []
    assert "Stopped" in capsys.readouterr().err


def test_a_full_disk_is_told_in_a_sentence_and_leaves_nothing(plain_figures, monkeypatch, tmp_path, capsys):
    def full(handle):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(os, "fsync", full)
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out")]) == 1
    text = " ".join(capsys.readouterr().err.split())
    assert "No space left on device" in text and "unchanged" in text
    assert os.listdir(tmp_path) == []


def test_a_folder_that_cannot_be_made_is_told_in_a_sentence(plain_figures, tmp_path, capsys):
    (tmp_path / "file").write_text("")
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "file" / "out")]) == 1
    text = " ".join(capsys.readouterr().err.split())
    assert "could not be written" in text and "file" in text and "Traceback" not in text
    assert os.listdir(tmp_path) == ["file"]


def test_an_unforeseen_error_is_a_sentence_that_says_how_to_see_more(monkeypatch, capsys):
    def broken(*args, **kwargs):
        raise ZeroDivisionError("by chance")

    monkeypatch.setattr(plumbwell.study.reduce, "reduce", broken)
    assert main(["check", str(SHAFT)]) == 1
    text = " ".join(capsys.readouterr().err.split())
    assert "ZeroDivisionError: by chance" in text and "PLUMBWELL_DEBUG=1" in text and "Traceback" not in text
    monkeypatch.setenv("PLUMBWELL_DEBUG", "1")
    with pytest.raises(ZeroDivisionError):
        main(["check", str(SHAFT)])


def test_a_reader_that_has_gone_is_no_traceback():
    process = subprocess.Popen(
        [sys.executable, "-c", "import time; from plumbwell.cli import main; time.sleep(0.5); "
         f"raise SystemExit(main(['check', {str(WELL)!r}]))"],
        env={**os.environ, "PYTHONPATH": str(CHECKOUT / "src")},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )  # fmt: skip
    process.stdout.close()
    err = process.stderr.read()
    process.stderr.close()
    assert process.wait(timeout=60) == 0
    assert err == b""


def test_a_terminal_that_knows_few_characters_gets_plain_ones():
    done = run("check", WELL, PYTHONIOENCODING="ascii", PYTHONUTF8="0")
    assert done.returncode == 0 and done.stderr == ""
    text = " ".join(done.stdout.split())
    assert "-36.0 uGal" in text and "?" not in text


def test_progress_is_one_line_on_a_terminal_and_wiped_at_the_end(plain_figures, monkeypatch, tmp_path, capsys):
    monkeypatch.setattr(sys.stderr, "isatty", lambda: True)
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out")]) == 0
    err = capsys.readouterr().err
    assert "\n" not in err and err.endswith("\r")
    shown = [line.strip() for line in err.split("\r") if line.strip()]
    assert shown[0] == "0%  reading the files" and "60%  network" in shown and shown[-1] == "100%  writing the summary"
