"""A folder of outputs that is never half written: files are finished aside, then moved into place together.

Aside is a hidden folder beside the target, or in it where nothing beside it will do. When moving fails midway,
what stood in the target before is put back. Only files of our own that an earlier run wrote are ever replaced
or removed.
"""

from __future__ import annotations

import json
import os
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path

from plumbwell.files.paths import UnfitFile, plain_bytes
from plumbwell.files.stops import held
from plumbwell.survey.errors import PlumbwellError, shown

SUMMARY = "summary.json"
OUTPUTS = "outputs"
SUMMARY_FORMAT = "plumbwell-summary/1"
SURVEY = "survey.toml"
DAY = 86400.0
FORMER = "before"
INSIDE = ".plumbwell.part-"
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
        When it is a file, the top of a file system, the survey folder, inside the survey folder, another
        survey folder, or holds files that have the names of outputs and are not ours.
    """
    name = shown(target)
    try:
        folder = target.resolve()
        base = None if survey is None else survey.resolve()
        is_folder, is_there = folder.is_dir(), folder.exists()
        holds_survey = (folder / SURVEY).exists()
    except (OSError, ValueError, RuntimeError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise UnfitTarget(f'The output folder "{name}" cannot be opened: {reason}.') from None
    if is_there and not is_folder:
        raise UnfitTarget(f'"{name}" is a file; name a folder for the outputs.')
    if folder == folder.parent:
        raise UnfitTarget(f'"{name}" is the top of the file system; name a folder of its own for the outputs.')
    if base is not None:
        base = base.parent if base.is_file() else base
        if folder == base or base in folder.parents:
            where = "is the survey folder itself" if folder == base else "lies inside the survey folder"
            raise UnfitTarget(
                f'The output folder "{name}" {where}. Nothing is written there, so that what was measured '
                "stays as it is; name a folder outside it."
            )
    if holds_survey:
        raise UnfitTarget(f'The folder "{name}" holds a survey.toml; name a folder that holds no survey.')
    if taken := others_files(folder):
        which, them = ("a file", "it") if len(taken) == 1 else ("files", "them")
        raise UnfitTarget(
            f'The folder "{name}" holds {which} named like outputs that no earlier run is known to have written '
            f"(its {SUMMARY} does not list {them}): {', '.join(taken)}. Nothing is overwritten: name another "
            f"folder, or move {them} elsewhere."
        )
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
        When the disk refuses; the target is then as it was, and the error names it.
    """
    with held() as stops:
        made: list[Path] = []
        aside = None
        try:
            aside = _hidden_folder(target, made)
            with stops.let_through():
                yield aside
            _move(aside, target)
        except BaseException as error:
            if aside is not None:
                _remove(aside)
            for folder in reversed(made):
                with suppress(OSError):
                    folder.rmdir()
            if isinstance(error, OSError) and error.errno is not None:
                raise OSError(error.errno, error.strerror, _as_asked(error.filename, target)) from error
            raise
        _remove(aside)


def _as_asked(name: object, target: Path) -> str:
    """The file of an error as the person knows it: in the target, not in the hidden folder."""
    if not isinstance(name, str | os.PathLike):
        return str(target)
    path, hidden = Path(name), (INSIDE, _beside(target))
    if path.name.startswith(hidden):
        return str(target)
    return str(target / path.name if path.parent.name.startswith(hidden) else path)


def _beside(target: Path) -> str:
    return f".{target.name}.part-"


def write_texts(folder: Path, texts: Mapping[str, str]) -> None:
    """Write texts as UTF-8 files of the given names into a folder."""
    for name, text in texts.items():
        (folder / name).write_text(text, encoding="utf-8", newline="")


def _make_folder(folder: Path, made: list[Path]) -> None:
    """Make a folder with its parents; the ones that were missing go to `made`, from the outermost on."""
    for one in (*reversed(folder.parents), folder):
        if not one.is_dir():
            one.mkdir(exist_ok=True)
            made.append(one)


def _hidden_folder(target: Path, made: list[Path]) -> Path:
    """A new folder that nobody else uses, from which files can be moved into the target.

    It lies beside the target. Where that cannot be (the parent is not ours to write to, the target is a mount
    of its own, its name is too long to be lengthened) it lies inside, and the target is made for it.
    """
    _clear_left_overs(target.parent, _beside(target))
    _clear_left_overs(target, INSIDE)
    _make_folder(target.parent, made)
    with suppress(OSError):
        aside = _new_folder(target.parent, _beside(target))
        if not target.exists() or _can_move(aside, target):
            return aside
        aside.rmdir()
    _make_folder(target, made)
    return _new_folder(target, INSIDE)


def _new_folder(parent: Path, stem: str) -> Path:
    number = 0
    while True:
        folder = parent / f"{stem}{os.getpid()}-{number}"
        try:
            folder.mkdir(mode=0o700)
        except FileExistsError:
            number += 1
            continue
        return folder


def _can_move(folder: Path, target: Path) -> bool:
    """Whether the system moves things from here into the target: tried with the empty folder, there and back."""
    probe = target / f"{INSIDE}{os.getpid()}-{folder.name.rpartition('-')[2]}"
    try:
        os.rename(folder, probe)
    except OSError:
        return False
    os.rename(probe, folder)
    return True


def _clear_left_overs(parent: Path, stem: str) -> None:
    """Remove hidden folders of runs that were killed: at once where the process is gone, else after a day."""
    with suppress(OSError):
        for other in parent.iterdir():
            if other.name.startswith(stem) and other.is_dir() and not other.is_symlink():
                process = other.name[len(stem) :].partition("-")[0]
                if not _may_live(process) or time.time() - other.stat().st_mtime > DAY:
                    _remove(other)


def _may_live(process: str) -> bool:
    """Whether the process of a number may still be at work; where the system cannot be asked, it may."""
    if os.name != "posix" or not process.isascii() or not process.isdigit():
        return True
    try:
        os.kill(int(process), 0)
    except (ProcessLookupError, OverflowError):
        return False
    except OSError:
        return True
    return True


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


def others_files(folder: Path) -> list[str]:
    """Names of what stands in a folder under the name of an output without being ours, in their order."""
    ours = outputs_of(folder)
    return sorted(name for name in EVER_WRITTEN if name not in ours and os.path.lexists(folder / name))


def outputs_of(folder: Path) -> list[str]:
    """Names of the files that the last run wrote into a folder, as its summary.json lists them."""
    try:
        told = json.loads(
            plain_bytes(folder / SUMMARY, largest=LARGEST_SUMMARY, longest_line=LARGEST_SUMMARY)
        )
    except (UnfitFile, OSError, ValueError, RecursionError):
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
        "stations.csv", "intervals.csv", "layers.csv", "readings_reduced.csv", "repeats.csv", "visits.csv",
        "alternatives.csv",
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
