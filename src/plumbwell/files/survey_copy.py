"""A survey folder that states what a person has laid on top of another: exclusions, notes, tares, recipe.

Everything else is copied byte for byte. The copy is written aside, read back and compared before it gets its name,
so that it reduces to the same numbers, and is never half written.
"""

from __future__ import annotations

import hashlib
import os
import re
import shutil
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import fields, replace
from pathlib import Path

import numpy as np

from plumbwell.files.collected import Collected
from plumbwell.files.folder import read_survey
from plumbwell.files.output_folder import UnfitTarget
from plumbwell.files.paths import MEBIBYTE, UnfitFile, inside, plain_bytes
from plumbwell.files.readings_edits import edited_readings
from plumbwell.files.stops import held
from plumbwell.files.survey_toml import FILE, read_statements
from plumbwell.files.survey_toml_edits import edited_survey_toml
from plumbwell.study.case import Case
from plumbwell.study.kept import alike
from plumbwell.study.overlay import laid_over
from plumbwell.survey.errors import InputError, PlumbwellError, shown
from plumbwell.survey.readings import Readings
from plumbwell.survey.survey import Survey

ASIDE = ".plumbwell.copy-"
NOT_COMPARED = {"readings", "recipe", "recipe_given", "notes", "files"}
LONGEST_PATH = 300
DAY = 86400.0


class CopyRefused(PlumbwellError):
    """A survey folder that cannot be written; the text says why, and nothing was written."""


def write_survey_copy(case: Case, source: str | os.PathLike[str], target: str | os.PathLike[str]) -> Path:
    """Write a case as a survey folder of its own.

    Parameters
    ----------
    case : Case
        Its overlay and its recipe in force become part of what the folder states.
    source : path-like
        The survey folder that the case was read from, or its survey.toml; nothing is written there.
    target : path-like
        A new folder, or an empty one.

    Returns
    -------
    Path
        The target, resolved.

    Raises
    ------
    UnfitTarget
        When the target cannot serve.
    CopyRefused
        When the source has changed since it was read, or the copy would not say the same.
    OSError
        When the disk refuses.
    """
    folder = Path(source).resolve()
    folder = folder.parent if folder.is_file() else folder
    place = _check_target(Path(target), folder)
    texts = _edited(case, _read_again(case.survey, folder))
    with _whole_folder(place) as aside:
        for name, path in _files(case.survey, folder).items():
            copy = aside.joinpath(*_parts(name))
            copy.parent.mkdir(parents=True, exist_ok=True)
            if name in texts:
                copy.write_bytes(texts[name])
            else:
                shutil.copyfile(path, copy)
        _check_same(case, aside)
    return place


def _check_target(target: Path, source: Path) -> Path:
    """The resolved target, when it may serve as one."""
    name = shown(target, LONGEST_PATH)
    try:
        place = target.resolve()
        is_there, is_folder = place.exists(), place.is_dir()
        taken = is_folder and any(place.iterdir())
    except (OSError, ValueError, RuntimeError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise UnfitTarget(f'The folder "{name}" cannot be opened: {reason}.') from None
    if place == source or source in place.parents:
        raise UnfitTarget(
            f'The folder "{name}" is the survey folder itself or lies inside it. Nothing is written there, so that '
            "what was measured stays as it is; name a folder outside it."
        )
    if is_there and not is_folder:
        raise UnfitTarget(f'"{name}" is a file; name a new folder, nothing is overwritten.')
    if taken:
        raise UnfitTarget(f'"{name}" is there already and not empty; name a new folder, nothing is overwritten.')
    return place


def _parts(name: str) -> list[str]:
    """The parts of a name as survey.toml writes it."""
    return re.split(r"[/\\]", name)


def _read_again(survey: Survey, folder: Path) -> dict[str, bytes]:
    """The bytes of survey.toml and of the readings, when all files are what they were when the survey was read."""
    data: dict[str, bytes] = {}
    if not survey.files:
        raise CopyRefused("Only a survey that was read from a folder can be copied.")
    for file in survey.files:
        try:
            found = plain_bytes(inside(folder, file.name), longest_line=256 * MEBIBYTE)
        except UnfitFile as unfit:
            raise CopyRefused(f"{shown(file.name)} cannot be copied: found {unfit.found}.") from None
        if hashlib.sha256(found).hexdigest() != file.sha256:
            raise CopyRefused(f"{shown(file.name)} has changed since the survey was read. Open the survey again first.")
        if file.name == FILE or shown(file.name) == survey.readings.raw.file:
            data[file.name] = found
    return data


def _edited(case: Case, data: dict[str, bytes]) -> dict[str, bytes]:
    """The files that state what lies on top, by name; those that state nothing of it are left out."""
    survey, overlay = case.survey, case.overlay
    texts: dict[str, bytes] = {}
    uses = {one.row: "yes" if one.use else "no" for one in overlay.rows if one.use != survey.readings.use[one.row]}
    notes = told_notes(case)
    dropped = [
        number for number, one in enumerate(survey.tares) if (one.run, one.time) in set(overlay.dropped_tares)
    ]
    recipe = {key: getattr(case.chosen, key) for key in case.changed_keys()}
    try:
        for name, found in data.items():
            if name == FILE:
                if recipe or dropped or overlay.tares:
                    texts[name] = edited_survey_toml(found, recipe=recipe, tares=overlay.tares, dropped=dropped)
            elif uses or notes:
                texts[name] = edited_readings(found, uses=uses, notes=notes)
    except ValueError as error:
        raise CopyRefused(f"The survey cannot be written as a folder: {error}.") from None
    return texts


def told_notes(case: Case) -> dict[int, str]:
    """The notes that the copy states and the folder does not, by row: a person's notes and reasons, joined."""
    stated = case.survey.readings.note
    told = {one.row: one.text for one in case.overlay.notes}
    for one in case.overlay.rows:
        note = told.get(one.row, stated[one.row])
        if one.reason and one.reason not in note.split("; "):
            told[one.row] = f"{note}; {one.reason}" if note else one.reason
    return {row: text for row, text in told.items() if text != stated[row]}


def _files(survey: Survey, folder: Path) -> dict[str, Path]:
    """All files that belong into the copy: those that the survey names, and what lies beside its survey.toml."""
    names = [file.name for file in survey.files]
    statements = read_statements(plain_bytes(inside(folder, FILE)), Collected())
    if statements is not None:
        names += [file.name for file in statements.unread]
    try:
        files = {name: inside(folder, name) for name in names}
    except UnfitFile as unfit:
        raise CopyRefused(f"A file of the survey cannot be copied: found {unfit.found}.") from None
    own = {folder.joinpath(*_parts(name)) for name in names}
    for path in sorted(folder.iterdir()):
        if path not in own and path.is_file() and not path.is_symlink() and not path.name.startswith("."):
            files[path.name] = path
    return files


def _check_same(case: Case, copy: Path) -> None:
    """Read a copy back and refuse it when it does not say what the case does."""
    wanted = laid_over(case.survey, case.overlay)
    try:
        found = read_survey(copy)
    except InputError as error:
        raise CopyRefused(f"The survey cannot be written as a folder that can be read: {error}") from None
    differs = [
        one.name
        for one in fields(Survey)
        if one.name not in NOT_COMPARED and not alike(getattr(found, one.name), getattr(wanted, one.name))
    ]
    if found.recipe != case.chosen:
        differs.append("recipe")
    notes = list(case.survey.readings.note)
    for row, text in told_notes(case).items():
        notes[row] = text
    expected = replace(wanted.readings, note=tuple(notes), raw=found.readings.raw)
    differs += [
        f"readings, {one.name}"
        for one in fields(Readings)
        if not alike(getattr(found.readings, one.name), getattr(expected, one.name))
    ]
    if not np.array_equal(found.readings.raw.lines, case.survey.readings.raw.lines):
        differs.append("readings, rows")
    if differs:
        raise CopyRefused(f"The copy would not say the same ({', '.join(differs)}), so it was not written.")


@contextmanager
def _whole_folder(target: Path) -> Iterator[Path]:
    """A hidden folder beside the target to write into; it becomes the target at once when the block ends well."""
    with held() as stops:
        aside = None
        try:
            target.parent.mkdir(parents=True, exist_ok=True)
            _clear_left_overs(target.parent)
            aside = _new_folder(target.parent)
            with stops.let_through():
                yield aside
            for path in (*aside.rglob("*"), aside):
                _sync(path)
            if os.name != "posix" and target.exists():
                target.rmdir()
            os.rename(aside, target)
        except BaseException as error:
            if aside is not None:
                shutil.rmtree(aside, ignore_errors=True)
            if isinstance(error, OSError) and error.errno is not None:
                raise OSError(error.errno, error.strerror, str(target)) from error
            raise
        _sync(target.parent)


def _new_folder(parent: Path) -> Path:
    number = 0
    while True:
        folder = parent / f"{ASIDE}{os.getpid()}-{number}"
        try:
            folder.mkdir()
        except FileExistsError:
            number += 1
            continue
        return folder


def _clear_left_overs(parent: Path) -> None:
    """Remove hidden folders that killed runs of the program left more than a day ago."""
    with suppress(OSError):
        for other in parent.iterdir():
            if other.name.startswith(ASIDE) and other.is_dir() and not other.is_symlink():
                if time.time() - other.stat().st_mtime > DAY:
                    shutil.rmtree(other, ignore_errors=True)


def _sync(path: Path) -> None:
    """Make sure that a file or folder is on the disk; folders cannot be asked that everywhere."""
    if path.is_dir():
        if os.name == "posix":
            with suppress(OSError):
                _sync_open(os.open(path, os.O_RDONLY))
        return
    _sync_open(os.open(path, os.O_RDWR))


def _sync_open(handle: int) -> None:
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
