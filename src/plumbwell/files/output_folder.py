"""A folder of outputs that is never half written: files are finished aside, then moved into place together.

Aside is a hidden folder beside the target, on the same file system. When moving fails midway, what stood in
the target before is put back. Only files of our own that an earlier run wrote are ever removed.
"""

from __future__ import annotations

import json
import os
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path

from plumbwell.survey.errors import PlumbwellError, shown

SUMMARY = "summary.json"
OUTPUTS = "outputs"
SUMMARY_FORMAT = "plumbwell-summary/1"
SURVEY = "survey.toml"
DAY = 86400.0
FORMER = "before"
LARGEST_SUMMARY = 64 * 1024 * 1024


class UnfitTarget(PlumbwellError):
    """The output folder that was named cannot serve; the text says why and what would."""


def check_target(target: Path, *, survey: Path | None) -> Path:
    """The resolved output folder, when it may serve as one.

    Parameters
    ----------
    target : Path
        Made when it is missing.
    survey : Path or None
        Folder of the survey or its survey.toml; nothing is ever written there.

    Raises
    ------
    UnfitTarget
        When it is a file, the survey folder, inside the survey folder, or another survey folder.
    """
    name = shown(target)
    try:
        folder = target.resolve()
        is_folder, is_there = folder.is_dir(), folder.exists()
        holds_survey = (folder / SURVEY).exists()
    except (OSError, ValueError, RuntimeError) as error:
        raise UnfitTarget(f'The output folder "{name}" cannot be opened: {error}.') from None
    if is_there and not is_folder:
        raise UnfitTarget(f'"{name}" is a file; name a folder for the outputs.')
    if survey is not None:
        base = survey.resolve()
        base = base.parent if base.is_file() else base
        if folder == base or base in folder.parents:
            where = "is the survey folder itself" if folder == base else "lies inside the survey folder"
            raise UnfitTarget(
                f'The output folder "{name}" {where}. Nothing is written there, so that what was measured '
                "stays as it is; name a folder outside it."
            )
    if holds_survey:
        raise UnfitTarget(f'The folder "{name}" holds a survey.toml; name a folder that holds no survey.')
    return folder


@contextmanager
def output_folder(target: Path) -> Iterator[Path]:
    """A hidden folder to write into; its files are moved into the target when the block ends well.

    Parameters
    ----------
    target : Path
        As `check_target` gives it. It is made when it is missing; other files in it stay.

    Raises
    ------
    OSError
        When the disk refuses; the target is then as it was.
    """
    made = _made_folders(target.parent)
    aside = _hidden_folder(target)
    try:
        yield aside
        _move(aside, target)
    except BaseException:
        _remove(aside)
        for folder in reversed(made):
            with suppress(OSError):
                folder.rmdir()
        raise
    _remove(aside)


def write_texts(folder: Path, texts: Mapping[str, str]) -> None:
    """Write texts as UTF-8 files of the given names into a folder."""
    for name, text in texts.items():
        (folder / name).write_text(text, encoding="utf-8", newline="")


def _made_folders(folder: Path) -> list[Path]:
    """Make a folder with its parents; the ones that were missing, from the outermost on."""
    missing = [one for one in (folder, *folder.parents) if not one.exists()][::-1]
    folder.mkdir(parents=True, exist_ok=True)
    return missing


def _hidden_folder(target: Path) -> Path:
    """A new folder beside the target that nobody else uses; left-overs of killed runs go after a day."""
    stem = f".{target.name}.part-"
    with suppress(OSError):
        for other in target.parent.glob(f"{_escaped(stem)}*"):
            if other.is_dir() and time.time() - other.stat().st_mtime > DAY:
                _remove(other)
    number = 0
    while True:
        aside = target.parent / f"{stem}{os.getpid()}-{number}"
        try:
            aside.mkdir(mode=0o700)
        except FileExistsError:
            number += 1
            continue
        return aside


def _escaped(text: str) -> str:
    return "".join(f"[{one}]" if one in "*?[" else one for one in text)


def _move(aside: Path, target: Path) -> None:
    """Move every file of one folder into another, all or none."""
    names = sorted(one.name for one in aside.iterdir())
    # The summary speaks for the others, so it comes last.
    names.sort(key=lambda name: name == SUMMARY)
    for name in names:
        _synced(aside / name)
    former = aside / FORMER
    former.mkdir()
    fresh = not target.exists()
    moved: list[str] = []
    try:
        target.mkdir(exist_ok=True)
        stale = [name for name in outputs_of(target) if name not in names]
        for name in (*names, *stale):
            _kept(target / name, former / name)
        for name in names:
            moved.append(name)
            os.replace(aside / name, target / name)
        for name in stale:
            moved.append(name)
            (target / name).unlink(missing_ok=True)
        _synced(target)
    except BaseException:
        for name in moved:
            _put_back(former / name, target / name)
        if fresh:
            with suppress(OSError):
                target.rmdir()
        raise


def _kept(path: Path, former: Path) -> None:
    """Hold on to a file that is about to be replaced: a second name for it, else a copy."""
    if not path.is_file():
        return
    try:
        os.link(path, former)
    except OSError:
        former.write_bytes(path.read_bytes())


def _put_back(former: Path, path: Path) -> None:
    with suppress(OSError):
        if former.exists():
            os.replace(former, path)
        else:
            path.unlink(missing_ok=True)


def outputs_of(folder: Path) -> list[str]:
    """Names of the files that the last run wrote into a folder, as its summary.json lists them."""
    summary = folder / SUMMARY
    try:
        if summary.stat().st_size > LARGEST_SUMMARY:
            return []
        told = json.loads(summary.read_bytes())
    except (OSError, ValueError, RecursionError):
        return []
    if (
        not isinstance(told, dict)
        or told.get("format") != SUMMARY_FORMAT
        or not isinstance(told.get(OUTPUTS), list)
    ):
        return []
    return [
        name
        for name in told[OUTPUTS]
        if isinstance(name, str) and name in EVER_WRITTEN and (folder / name).is_file()
    ]


EVER_WRITTEN = frozenset(
    {
        "stations.csv", "intervals.csv", "layers.csv", "readings_reduced.csv", "repeats.csv",
        "density_covariance.csv", "common_covariance.csv", "station_covariance.csv", "gradients_reduced.csv",
        "reduced.las", "figure.svg", "figure.png", SUMMARY,
    }
)  # fmt: skip
"""What a run may write; nothing else is removed, whatever a summary says."""


def _synced(path: Path) -> None:
    """Make sure that a file or folder is on the disk; folders cannot be asked that everywhere."""
    if path.is_dir():
        with suppress(OSError):
            handle = os.open(path, os.O_RDONLY)
            try:
                os.fsync(handle)
            finally:
                os.close(handle)
        return
    with open(path, "rb+") as file:
        os.fsync(file.fileno())


def _remove(folder: Path) -> None:
    """Remove a folder of our own with the files in it; what cannot be removed is left."""
    with suppress(OSError):
        for one in list(folder.iterdir()):
            if one.is_dir() and not one.is_symlink():
                _remove(one)
            else:
                one.unlink(missing_ok=True)
        folder.rmdir()
