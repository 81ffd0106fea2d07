"""Ctrl-C, a request to end, and a terminal that takes no text: nothing half done, no traceback, the right status."""

import io
import os
import shutil
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from plumbwell.cli import main
from plumbwell.files.report_lines import docket_lines
from plumbwell.files.terminal import say
from plumbwell.study.finding import Finding
from plumbwell.survey.errors import SurveyError

CHECKOUT = Path(__file__).resolve().parents[2]
SHAFT = CHECKOUT / "tests" / "data" / "reiche_zeche_shaft"
POSIX = pytest.mark.skipif(os.name != "posix", reason="signals and streams of POSIX systems")

# Runs the command line as the process does, and sends itself a signal when a module is looked for, or a function
# of the outputs is called.
STOPPING = """
import os, sys, importlib
number, place, *sys.argv[1:] = int(sys.argv[1]), sys.argv[2], *sys.argv[3:]
sent = []
def send():
    if not sent:
        sent.append(True)
        os.kill(os.getpid(), number)
class Finder:
    def find_spec(self, name, path=None, target=None):
        if name == place:
            send()
if ":" in place:
    module, function = place.split(":")
    found = importlib.import_module(module)
    owner, _, name = function.rpartition(".")
    owner = getattr(found, owner) if owner else found
    real = getattr(owner, name)
    def stopped(*args, **kwargs):
        send()
        return real(*args, **kwargs)
    setattr(owner, name, stopped)
else:
    sys.meta_path.insert(0, Finder())
from plumbwell.cli import main
status = main()
send()  # whatever comes in the last moments is ignored
sys.exit(status)
"""
PLACES = [
    "plumbwell.files.folder",
    "numpy._core.multiarray",
    "scipy.special",
    "PySide6.QtGui",
    "plumbwell.plates.figure_of",
    "plumbwell.files.folder:read_survey",
    "plumbwell.files.tables_out:csv_texts",
    "plumbwell.files.output_folder:write_texts",
    "plumbwell.files.output_folder:_new_folder",
    "plumbwell.files.output_folder:_move",
    "plumbwell.files.output_folder:_remove",
    "plumbwell.plates.figure_of:write_svg",
    "plumbwell.plates.figure:draw_figure",
]


def environment():
    base = {name: value for name, value in os.environ.items() if name != "PYTHONUNBUFFERED"}
    return {**base, "PYTHONPATH": str(CHECKOUT / "src")}


def stopped_at(place, number, *words):
    return subprocess.run(
        [sys.executable, "-c", STOPPING, str(int(number)), place, *map(str, words)],
        env=environment(),
        capture_output=True,
        text=True,
        check=False,
        timeout=120,
    )


@POSIX
@pytest.mark.parametrize("place", PLACES)
def test_ctrl_c_at_any_moment_leaves_all_or_nothing_and_no_traceback(place, tmp_path):
    done = stopped_at(place, signal.SIGINT, "reduce", SHAFT, "--out", tmp_path / "a" / "out")
    assert done.returncode == 130, done.stderr
    assert done.stderr == "\nStopped. Nothing was left half written.\n" and done.stdout == ""
    if place.endswith((":_move", ":_remove")):
        assert os.listdir(tmp_path / "a") == ["out"] and len(os.listdir(tmp_path / "a" / "out")) == 13
    else:
        assert os.listdir(tmp_path) == []


@POSIX
@pytest.mark.parametrize("place", ["PySide6.QtGui", "plumbwell.files.output_folder:write_texts"])
def test_a_request_to_end_is_as_good_as_ctrl_c(place, tmp_path):
    done = stopped_at(place, signal.SIGTERM, "reduce", SHAFT, "--out", tmp_path / "out")
    assert (done.returncode, done.stdout) == (143, "")
    assert "Traceback" not in done.stderr and os.listdir(tmp_path) == []


@POSIX
def test_a_stop_after_the_work_changes_nothing(tmp_path):
    done = stopped_at("no.such.module", signal.SIGINT, "reduce", SHAFT, "--out", tmp_path / "out")
    assert done.returncode == 0 and done.stderr == ""
    assert len(os.listdir(tmp_path / "out")) == 13


@POSIX
def test_a_stop_that_a_library_turns_into_its_own_error_is_still_a_stop(monkeypatch, tmp_path, capsys):
    def library(*args, **kwargs):
        try:
            os.kill(os.getpid(), signal.SIGINT)
        except KeyboardInterrupt:
            raise ImportError("could not be loaded") from None

    monkeypatch.setattr("plumbwell.study.reduce.reduce", library)
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out")]) == 130
    assert capsys.readouterr().err == "\nStopped. Nothing was left half written.\n"
    assert os.listdir(tmp_path) == []


@POSIX
def test_a_stop_that_a_callback_swallows_is_met_at_the_next_step(monkeypatch, tmp_path, capsys):
    class Callback:
        def __del__(self):
            os.kill(os.getpid(), signal.SIGINT)

    def loses_it(*args, **kwargs):
        thing = Callback()
        del thing
        return {}

    monkeypatch.setattr("plumbwell.plates.outputs.csv_texts", loses_it)
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path / "out")]) == 130
    assert capsys.readouterr().err == "\nStopped. Nothing was left half written.\n"
    assert os.listdir(tmp_path) == []


@POSIX
def test_handlers_that_stood_before_are_put_back(capsys):
    before = signal.getsignal(signal.SIGINT), signal.getsignal(signal.SIGTERM), sys.unraisablehook
    assert main(["check", str(SHAFT)]) == 0
    assert (signal.getsignal(signal.SIGINT), signal.getsignal(signal.SIGTERM), sys.unraisablehook) == before


@POSIX
@pytest.mark.parametrize(
    ("streams", "heard"),
    [
        (">&-", ""),
        ("2>&- >&-", ""),
        ("> /dev/full", "The text could not be printed: No space left on device.\n"),
        ("> /dev/full 2> /dev/full", ""),
        ("| true", ""),
        ("| head -1 > /dev/null", ""),
    ],
)
def test_what_cannot_be_printed_changes_neither_files_nor_status(streams, heard, tmp_path):
    if "/dev/full" in streams and not os.path.exists("/dev/full"):
        pytest.skip("this system has no /dev/full, a disk that is always full")
    line = f'"{sys.executable}" -m plumbwell reduce "{SHAFT}" --out "{tmp_path}/out" {streams}'
    if "|" in streams:
        line = line.replace(" |", "; echo $? >&2; } |").join(["{ ", ""])
        heard = "0\n"
    done = subprocess.run(
        ["sh", "-c", line], env=environment(), capture_output=True, text=True, check=False, timeout=120
    )
    assert done.returncode == 0 and done.stderr == heard
    assert len(os.listdir(tmp_path / "out")) == 13
    assert (tmp_path / "out" / "stations.csv").read_text("utf-8").startswith("station,")


@POSIX
@pytest.mark.parametrize("words", ["--help", "--version", "new made"])
def test_help_and_new_bear_a_full_disk_behind_the_terminal(words, tmp_path):
    if not os.path.exists("/dev/full"):
        pytest.skip("this system has no /dev/full, a disk that is always full")
    done = subprocess.run(
        ["sh", "-c", f'"{sys.executable}" -m plumbwell {words} > /dev/full'],
        env=environment(), cwd=tmp_path, capture_output=True, text=True, check=False, timeout=60,
    )  # fmt: skip
    assert done.returncode == 0
    assert done.stderr == "The text could not be printed: No space left on device.\n"


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["reduce", str(SHAFT), "--out", ""], "The name of DIR is empty; name a folder."),
        (["reduce", "", "--out", "x"], "The name of FOLDER is empty; name a folder."),
        (["check", " "], "The name of FOLDER is empty; name a folder."),
        (["new", ""], "The name of DIR is empty; name a folder."),
        (["reduce", str(SHAFT), "--out", os.path.abspath(os.sep)], "is the top of the file system"),
    ],
)
def test_no_name_and_the_top_of_the_file_system_are_wrong_usage(words, said, capsys):
    assert main(words) == 2
    out, err = capsys.readouterr()
    assert out == "" and said in " ".join(err.split())


def test_a_persons_own_files_are_named_and_kept(tmp_path, capsys):
    (tmp_path / "figure.png").write_text("my picture")
    (tmp_path / "stations.csv").write_text("my stations")
    assert main(["reduce", str(SHAFT), "--out", str(tmp_path)]) == 2
    text = " ".join(capsys.readouterr().err.split())
    assert "figure.png, stations.csv. Nothing is overwritten: name another folder, or move them" in text
    assert (tmp_path / "stations.csv").read_text() == "my stations"
    assert sorted(os.listdir(tmp_path)) == ["figure.png", "stations.csv"]


def test_the_next_steps_after_new_work_as_they_are_printed(tmp_path):
    name = "-my survey" if os.name == "posix" else "my survey"
    done = subprocess.run(
        [sys.executable, "-m", "plumbwell", "new", "--", name],
        env=environment(), cwd=tmp_path, capture_output=True, text=True, check=True,
    )  # fmt: skip
    check, reduce = (line.strip() for line in done.stdout.splitlines() if line.startswith("  "))
    assert " -m plumbwell check " in check and " -m plumbwell reduce " in reduce
    for line in (check, reduce):
        assert subprocess.run(line, shell=True, env=environment(), cwd=tmp_path, capture_output=True).returncode == 0
    assert sorted(os.listdir(tmp_path)) == [name, name + "-results"]


def test_new_in_the_working_folder_names_results_beside_it(tmp_path, monkeypatch, capsys):
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    assert main(["new", "."]) == 0
    assert f"plumbwell reduce . --out {tmp_path / 'here'}-results" in capsys.readouterr().out


def test_characters_that_the_terminal_does_not_know_are_told_in_plain_ones():
    told = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    say("\u221236 \u00b5Gal, 0 \u00b1 50, g/cm\u00b3, m\u00b2, 2 \u00d7 3, 1\u20132, \u2026, \u00dcberf\u00e4lle", told)
    say("1\u00a0200 m", told)
    assert told.buffer.getvalue() == b"-36 uGal, 0 +- 50, g/cm3, m2, 2 x 3, 1-2, ..., \\xdcberf\\xe4lle\n1 200 m\n"


def finding(number, severity="look", mend="Look at it."):
    return Finding(code="kind", severity=severity, place=f"S{number}", text=f"Text {number}.", mend=mend)


def test_many_findings_stay_short_in_reduce_and_whole_in_check():
    many = [finding(number) for number in range(100)] + [finding(100, "error", "Mend it."), finding(101, "note")]
    whole, short = docket_lines(many), docket_lines(many, of=many[:-1], most=20)
    assert whole[0] == short[0] == "Findings: 1 error, 100 to look at, 1 note."
    assert all(f"    Text {number}." in whole for number in range(102))
    assert whole.count("    to mend: Look at it.") == 2 and whole.count("    to mend: Mend it.") == 1
    assert len(short) <= 21 and short[2:6] == ["Errors", "  S100 (kind)", "    Text 100.", "    to mend: Mend it."]
    told = sum("Text" in line for line in short)
    assert short[-1] == f"  and {101 - told} more"


def test_a_survey_without_intervals_says_that_it_has_no_density(tmp_path, capsys):
    survey = Path(shutil.copytree(SHAFT, tmp_path / "survey"))
    readings = (survey / "readings.csv").read_text("utf-8").splitlines()
    head = next(number for number, line in enumerate(readings) if line.startswith("time,"))
    place = readings[head].split(",").index("station")
    kept = [line for line in readings[head + 1 :] if line.split(",")[place] == readings[head + 1].split(",")[place]]
    (survey / "readings.csv").write_text("\n".join([*readings[: head + 1], *kept]) + "\n", "utf-8")
    assert main(["reduce", str(survey), "--out", str(tmp_path / "out")]) == 3
    out = capsys.readouterr().out
    assert "No density could be computed." in out and "Errors" in out and len(out.splitlines()) <= 45


def test_a_survey_error_is_told_as_a_sentence(monkeypatch, capsys):
    def cannot(*args, **kwargs):
        raise SurveyError("reference_density is wanting")

    monkeypatch.setattr("plumbwell.study.reduce.reduce", cannot)
    assert main(["check", str(SHAFT)]) == 1
    assert capsys.readouterr().err == "The survey cannot be reduced: reference_density is wanting.\n"


def test_control_characters_reach_no_terminal(tmp_path, capsys):
    assert main(["check", str(tmp_path / "no\x1b[31mwhere\u202e")]) == 1
    err = capsys.readouterr().err
    assert "\x1b" not in err and "\u202e" not in err
