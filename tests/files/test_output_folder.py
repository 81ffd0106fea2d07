"""The output folder: all files or none, whatever the disk does; the survey folder is never written to."""

import errno
import os
import subprocess
import sys
import time
from pathlib import Path

import pytest

from plumbwell.files import output_folder as module
from plumbwell.files.output_folder import UnfitTarget, check_target, output_folder, outputs_of, write_texts

OLD = {"stations.csv": "old stations", "layers.csv": "old layers", "notes.txt": "a person's own"}
NEW = {"stations.csv": "new stations", "intervals.csv": "new intervals"}


def summary(names):
    listed = ", ".join(f'"{name}"' for name in names)
    return f'{{"format": "plumbwell-summary/1", "outputs": [{listed}]}}'


@pytest.fixture
def target(tmp_path):
    """A folder with the outputs of an earlier run and a file of somebody's own."""
    folder = tmp_path / "out"
    folder.mkdir()
    write_texts(folder, {**OLD, "summary.json": summary(["stations.csv", "layers.csv", "summary.json"])})
    return folder


def content(folder):
    return {one.relative_to(folder).as_posix(): one.read_text("utf-8") for one in folder.rglob("*") if one.is_file()}


def write_new(target):
    with output_folder(target) as aside:
        write_texts(aside, {**NEW, "summary.json": summary([*NEW, "summary.json"])})


def test_new_files_replace_old_ones_and_others_stay(target, tmp_path):
    write_new(target)
    assert content(target) == {
        **NEW,
        "notes.txt": "a person's own",
        "summary.json": summary([*NEW, "summary.json"]),
    }
    assert os.listdir(tmp_path) == ["out"]


def test_a_table_of_ours_that_no_summary_lists_stays(target):
    (target / "summary.json").unlink()
    write_new(target)
    assert (target / "layers.csv").read_text() == "old layers"


@pytest.mark.parametrize(
    "text",
    [
        "",
        "[1]",
        '{"format": "other", "outputs": ["layers.csv"]}',
        '{"format": "plumbwell-summary/1", "outputs": 3}',
        '{"format": "plumbwell-summary/1", "outputs": ["../evil", "notes.txt", 5]}',
        "[" * 100_000,
    ],
)
def test_a_strange_summary_removes_nothing(target, text):
    (target / "summary.json").write_text(text)
    assert outputs_of(target) == []


def test_the_folder_is_made_with_its_parents(tmp_path):
    write_new(tmp_path / "a" / "b" / "out")
    assert content(tmp_path / "a" / "b" / "out").keys() == {*NEW, "summary.json"}


class Fails:
    """A function that fails at its n-th call and counts them."""

    def __init__(self, real, nth, error):
        self.real, self.nth, self.error, self.calls = real, nth, error, 0

    def __call__(self, *args, **kwargs):
        self.calls += 1
        if self.calls == self.nth:
            raise self.error
        return self.real(*args, **kwargs)


def full():
    return OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))


@pytest.mark.parametrize(
    ("what", "error"),
    [
        ("replace", full),
        ("fsync", full),
        ("replace", KeyboardInterrupt),
        ("fsync", KeyboardInterrupt),
        ("link", KeyboardInterrupt),
    ],
)
def test_whichever_step_fails_nothing_is_half_done(target, tmp_path, monkeypatch, what, error):
    before = content(target)
    nth, reached_the_end = 0, False
    while not reached_the_end:
        nth += 1
        fails = Fails(getattr(os, what), nth, error())
        with monkeypatch.context() as patch:
            patch.setattr(module.os, what, fails)
            try:
                write_new(target)
            except (OSError, KeyboardInterrupt):
                assert content(target) == before, f"{what} {nth}"
            else:
                reached_the_end = fails.calls < nth or content(target) != before
        assert os.listdir(tmp_path) == ["out"]
    assert nth > 1
    assert content(target)["stations.csv"] == "new stations"


def test_a_failing_write_leaves_the_target_as_it_was(target, tmp_path, monkeypatch):
    before = content(target)
    real = Path.write_text
    for nth in (1, 2, 3):
        fails = Fails(real, nth, full())
        with monkeypatch.context() as patch:
            patch.setattr(Path, "write_text", lambda path, *args, to=fails, **named: to(path, *args, **named))
            with pytest.raises(OSError, match="No space left"):
                write_new(target)
        assert content(target) == before
        assert os.listdir(tmp_path) == ["out"]


def test_a_failure_in_a_new_folder_leaves_no_folder(tmp_path):
    with pytest.raises(RuntimeError), output_folder(tmp_path / "a" / "b" / "out") as aside:
        write_texts(aside, NEW)
        raise RuntimeError("midway")
    assert os.listdir(tmp_path) == []


def test_without_links_the_former_files_are_copied(target, monkeypatch):
    def no_links(*_):
        raise OSError(errno.EPERM, "no links here")

    before = content(target)
    monkeypatch.setattr(module.os, "link", no_links)
    with monkeypatch.context() as patch:
        patch.setattr(module.os, "replace", Fails(os.replace, 2, full()))
        with pytest.raises(OSError, match="No space left"):
            write_new(target)
    assert content(target) == before


def test_left_overs_of_killed_runs_go_at_once_and_those_of_running_ones_after_a_day(target, tmp_path):
    process = subprocess.Popen([sys.executable, "-c", ""])
    process.wait()
    alive = os.getppid()
    dead, inside = tmp_path / f".out.part-{process.pid}-0", target / f".plumbwell.part-{process.pid}-3"
    young, old = tmp_path / f".out.part-{alive}-0", tmp_path / f".out.part-{alive}-1"
    other, strange = tmp_path / f".outer.part-{process.pid}-0", tmp_path / ".out.part-mine"
    for folder in (dead, inside, old, young, other, strange):
        folder.mkdir()
        (folder / "stations.csv").write_text("half")
    for folder in (old, other):
        os.utime(folder, (time.time() - 2 * 86400,) * 2)
    write_new(target)
    assert not dead.exists() and not inside.exists() and not old.exists()
    assert young.exists() and other.exists() and strange.exists()


def refusing(real, refuses):
    """A function of the system that refuses some paths."""

    def call(path, *args, **kwargs):
        refuses(Path(path), *args)
        return real(path, *args, **kwargs)

    return call


def not_beside(path, *_):
    if ".part-" in path.name and not path.name.startswith(".plumbwell"):
        raise PermissionError(errno.EACCES, "Permission denied", str(path))


def across_mounts(path, to, *_):
    if path.parent != Path(to).parent and not path.parent.name.startswith(".plumbwell"):
        raise OSError(errno.EXDEV, "Invalid cross-device link", str(path))


def where_it_is(target):
    with output_folder(target) as aside:
        write_texts(aside, NEW)
        return aside.parent


@pytest.mark.parametrize("what", ["mkdir", "mount"])
def test_where_nothing_can_stand_beside_the_target_the_hidden_folder_is_inside(target, tmp_path, monkeypatch, what):
    if what == "mkdir":
        monkeypatch.setattr(module.os, "mkdir", refusing(os.mkdir, not_beside))
    else:
        monkeypatch.setattr(module.os, "rename", refusing(os.rename, across_mounts))
        monkeypatch.setattr(module.os, "replace", refusing(os.replace, across_mounts))
    assert where_it_is(target) == target
    assert content(target)["stations.csv"] == "new stations"
    assert os.listdir(tmp_path) == ["out"]
    assert not [name for name in os.listdir(target) if name.startswith(".")]


def test_a_name_that_cannot_be_lengthened_serves_and_leaves_nothing_when_it_fails(tmp_path):
    target = tmp_path / ("n" * 250)
    with pytest.raises(RuntimeError), output_folder(target):
        raise RuntimeError("midway")
    assert os.listdir(tmp_path) == []
    assert where_it_is(target) == target
    assert sorted(os.listdir(target)) == sorted(NEW)


def test_an_error_names_the_target_and_not_the_hidden_folder(target):
    with pytest.raises(FileNotFoundError) as caught, output_folder(target) as aside:
        (aside / "figure.svg").read_text()
    assert caught.value.filename == str(target / "figure.svg")
    with pytest.raises(OSError, match="name too long") as caught, output_folder(target / ("x" * 300)):
        pass
    assert caught.value.filename == str(target / ("x" * 300))


@pytest.mark.parametrize("kind", ["file", "folder", "dangling link"])
def test_a_persons_own_file_with_the_name_of_an_output_is_never_overwritten(target, kind):
    own = target / "intervals.csv"
    if kind == "file":
        own.write_text("mine")
    elif kind == "folder":
        own.mkdir()
    else:
        own.symlink_to(target / "nowhere")
    with pytest.raises(UnfitTarget, match="holds a file named like outputs .*: intervals.csv. Nothing is overwritten"):
        check_target(target, survey=None)
    (target / "summary.json").write_text('{"mine": true}')
    with pytest.raises(UnfitTarget, match="files .*: intervals.csv, layers.csv, stations.csv, summary.json. "):
        check_target(target, survey=None)


def test_a_folder_with_our_own_outputs_serves_again(target):
    assert check_target(target, survey=None) == target


@pytest.mark.parametrize("kind", ["pipe", "device", "huge"])
def test_a_summary_that_never_ends_is_not_ours_and_does_not_hang(target, kind):
    summary = target / "summary.json"
    summary.unlink()
    if kind == "pipe":
        if not hasattr(os, "mkfifo"):
            pytest.skip("no pipes with names here")
        os.mkfifo(summary)
    elif kind == "device":
        summary.symlink_to("/dev/zero")
    else:
        with open(summary, "wb") as file:
            file.truncate(module.LARGEST_SUMMARY + 1)
    assert outputs_of(target) == []
    with pytest.raises(UnfitTarget, match="summary.json"):
        check_target(target, survey=None)


def test_the_top_of_the_file_system_is_refused():
    with pytest.raises(UnfitTarget, match="top of the file system"):
        check_target(Path(Path.cwd().anchor), survey=None)


def test_two_runs_at_once_do_not_share_a_hidden_folder(target):
    with output_folder(target) as one, output_folder(target) as other:
        assert one != other


def test_the_survey_folder_and_what_lies_in_it_are_refused(tmp_path):
    survey = tmp_path / "survey"
    (survey / "in").mkdir(parents=True)
    (survey / "survey.toml").write_text("")
    for target, word in (
        (survey, "is the survey folder"),
        (survey / "in" / "x", "lies inside the survey folder"),
    ):
        for named in (survey, survey / "survey.toml"):
            with pytest.raises(UnfitTarget, match=word):
                check_target(target, survey=named)
    link = tmp_path / "link"
    link.symlink_to(survey / "in", target_is_directory=True)
    with pytest.raises(UnfitTarget, match="lies inside the survey folder"):
        check_target(link / "out", survey=survey)
    assert check_target(tmp_path / "out", survey=survey) == tmp_path / "out"


def test_a_file_and_another_survey_are_refused(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(UnfitTarget, match='file" is a file; name a folder'):
        check_target(tmp_path / "file", survey=None)
    (tmp_path / "survey.toml").write_text("")
    with pytest.raises(UnfitTarget, match="holds a survey.toml"):
        check_target(tmp_path, survey=None)
    with pytest.raises(UnfitTarget, match="cannot be opened"):
        check_target(Path("a\0b"), survey=None)
