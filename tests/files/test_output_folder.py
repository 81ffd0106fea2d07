"""The output folder: all files or none, whatever the disk does; the survey folder is never written to."""

import errno
import os
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


def test_left_overs_of_killed_runs_go_after_a_day_and_others_stay(target, tmp_path):
    old, young, other = (tmp_path / name for name in (".out.part-1-0", ".out.part-2-0", ".outer.part-3-0"))
    for folder in (old, young, other):
        folder.mkdir()
        (folder / "stations.csv").write_text("half")
    for folder in (old, other):
        os.utime(folder, (time.time() - 2 * 86400,) * 2)
    write_new(target)
    assert not old.exists() and young.exists() and other.exists()


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
