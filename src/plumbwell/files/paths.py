"""Files named inside a survey folder: where they may lie, and their bytes within limits.

A name from a file is data: it never leads outside the folder, never to anything but a plain file,
and never makes the program read without end.
"""

from __future__ import annotations

import hashlib
import os
import re
import stat
from pathlib import Path

from plumbwell.files.collected import Collected
from plumbwell.survey.errors import shown
from plumbwell.survey.survey import InputFile

MEBIBYTE = 1 << 20
MAXIMUM_FILE = 256 * MEBIBYTE
MAXIMUM_LINE = MEBIBYTE

MISSING_MEND = "put the file there, or correct or remove its name"

_LINE_END = re.compile(rb"[\r\n]")
_RESERVED = re.compile(r"(?i)(con|prn|aux|nul|com[1-9]|lpt[1-9])(\..*)?")
_BEGINNINGS = (
    (b"PK\x03\x04", "a ZIP archive (perhaps a spreadsheet)"),
    (b"%PDF", "a PDF document"),
    (b"\xd0\xcf\x11\xe0", "an old spreadsheet or document file"),
    (b"\x1f\x8b", "a gzip archive"),
    (b"SQLite format 3", "a database"),
    (b"\x89PNG", "a picture"),
    (b"II*\x00", "a TIFF picture"),
    (b"MM\x00*", "a TIFF picture"),
)


class UnfitFile(Exception):
    """A file that cannot be taken; carries found, expected and mend."""

    def __init__(self, found: str, expected: str, mend: str, row: int | None = None) -> None:
        super().__init__(found)
        self.found, self.expected, self.mend, self.row = found, expected, mend, row


def inside(folder: Path, name: str) -> Path:
    """The path of a plain file that a survey folder names, resolved.

    Parameters
    ----------
    folder : Path
        Resolved survey folder.
    name : str
        As written; `/` or `\\` between parts.

    Raises
    ------
    UnfitFile
        When the name is absolute, leads out of the folder (also through a link), or is no plain file.
    """
    outside = UnfitFile(
        f'"{shown(name)}"',
        "a path that stays inside the survey folder",
        "copy the file into the survey folder and write its name without drive, leading slash or ..",
    )
    if not name.strip():
        raise UnfitFile(
            "an empty file name",
            "the name of a file in the survey folder",
            "write the name, or remove the key",
        )
    parts = re.split(r"[/\\]", name)
    if "\0" in name or name[0] in "/\\~" or ":" in name or ".." in parts:
        raise outside
    if any(_RESERVED.fullmatch(part) or part != part.rstrip(" .") and part != "." for part in parts):
        raise UnfitFile(
            f'"{shown(name)}"',
            "a file name that every system can hold",
            "rename the file: no name such as CON or NUL, no dot or blank at the end",
        )
    path = folder.joinpath(*parts)
    linked_out = UnfitFile(
        f'"{shown(name)}", a link that leads out of the survey folder',
        "a file that lies inside the survey folder",
        "copy the file itself into the survey folder, in place of the link",
    )
    try:
        real = path.resolve(strict=True)
        mode = real.stat().st_mode
    except FileNotFoundError:
        if path.is_symlink() and not path.resolve().is_relative_to(folder):
            raise linked_out from None
        raise UnfitFile(
            "no such file", f'the file "{shown(name)}" in the survey folder', _nearest(path)
        ) from None
    except (OSError, RuntimeError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "a link that leads to itself"
        raise UnfitFile(
            f'"{shown(name)}", which cannot be opened ({reason})',
            "a plain file that can be read",
            "check the name and the rights of the file",
        ) from None
    if not real.is_relative_to(folder):
        raise linked_out
    if not stat.S_ISREG(mode):
        raise _not_plain(mode, "a link to " if path.is_symlink() else "")
    return real


def _not_plain(mode: int, link: str = "") -> UnfitFile:
    kind = "a folder" if stat.S_ISDIR(mode) else "a pipe, socket or device"
    if not link and not stat.S_ISDIR(mode):
        kind = f"not a plain file ({kind})"
    return UnfitFile(f"{link}{kind}", "a plain file", "name a file that holds the data")


def _nearest(path: Path) -> str:
    """How to mend a missing file: the names in its folder that differ only by case, else the usual words."""
    try:
        alike = sorted(one for one in os.listdir(path.parent) if one.lower() == path.name.lower())
    except OSError:
        alike = []
    if alike:
        return f'the folder holds "{shown(alike[0])}": write the name exactly so'
    return MISSING_MEND


def plain_bytes(path: Path, *, largest: int = MAXIMUM_FILE, longest_line: int = MAXIMUM_LINE) -> bytes:
    """The bytes of a plain file of text, within limits of size and of line length.

    Raises
    ------
    UnfitFile
        When it is no plain file, cannot be read, is larger than `largest`, or has a line longer than
        `longest_line` (found without reading on), or is plainly no text.
    """
    try:
        # O_NONBLOCK: opening a pipe must not wait for a writer
        handle = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0))
    except OSError as error:
        raise UnfitFile(
            f"a file that cannot be opened ({error.strerror})",
            "a file that can be read",
            "check that it exists and that you may read it",
        ) from None
    with os.fdopen(handle, "rb") as stream:
        status = os.fstat(stream.fileno())
        if not stat.S_ISREG(status.st_mode):
            raise _not_plain(status.st_mode)
        if status.st_size > largest:
            raise UnfitFile(
                f"{status.st_size / MEBIBYTE:.1f} MiB",
                f"a file of at most {largest / MEBIBYTE:.0f} MiB",
                "cut the file into smaller ones, or thin the rows",
            )
        blocks: list[bytes] = []
        size, since, line = 0, 0, 1
        while block := stream.read(MEBIBYTE):
            if not blocks:
                _refuse_other_kinds(block)
            size += len(block)
            first = _LINE_END.search(block)
            if since + (first.start() if first else len(block)) > longest_line:
                raise UnfitFile(
                    f"a line longer than {longest_line / MEBIBYTE:.0f} MiB",
                    "one row a line",
                    "check that the file is a table with line ends",
                    row=line,
                )
            if first:
                since = len(block) - max(block.rfind(b"\n"), block.rfind(b"\r")) - 1
                line += block.count(b"\n") or block.count(b"\r")
            else:
                since += len(block)
            if size > largest:
                raise UnfitFile(
                    f"more than {largest / MEBIBYTE:.0f} MiB",
                    f"a file of at most {largest / MEBIBYTE:.0f} MiB",
                    "cut the file into smaller ones, or thin the rows",
                )
            blocks.append(block)
    return b"".join(blocks)


def _refuse_other_kinds(block: bytes) -> None:
    start = block[:512].lstrip(b"\xef\xbb\xbf \t\r\n")
    kind = next((what for mark, what in _BEGINNINGS if start.startswith(mark)), None)
    if kind is None and re.match(rb"(?i)<!doctype html|<html|<\?xml", start):
        kind = (
            "a web page (perhaps a login page saved in its place)"
            if b"html" in start.lower()
            else "an XML document"
        )
    if kind is not None:
        raise UnfitFile(
            kind, "a plain text file, UTF-8", "export the table as CSV, UTF-8, and name that file"
        )


def text_of(data: bytes) -> str:
    """Bytes of a UTF-8 file as text, without a byte-order mark.

    Raises
    ------
    UnfitFile
        When the bytes are another encoding, which the message names, or hold a NUL byte.
    """
    wrong = None
    if data.startswith((b"\xff\xfe\x00\x00", b"\x00\x00\xfe\xff")):
        wrong = "UTF-32 (it begins with its byte-order mark)"
    elif data.startswith((b"\xff\xfe", b"\xfe\xff")):
        order = "little" if data[0] == 0xFF else "big"
        wrong = f"UTF-16, {order} endian (it begins with its byte-order mark)"
    elif data.startswith(b"+/v"):
        wrong = "UTF-7"
    elif (sample := data[:4096]).count(0) > len(sample) // 4:
        order = "little" if sample[1::2].count(0) > sample[0::2].count(0) else "big"
        wrong = f"UTF-16, {order} endian (every second byte is NUL)"
    if wrong is not None:
        raise UnfitFile(
            f"a file encoded in {wrong}", "UTF-8", 'save the file again with the encoding "UTF-8"'
        )
    nul = data.find(b"\0")
    if nul >= 0:
        raise UnfitFile(
            f"a NUL byte (byte offset {nul})",
            "text",
            "the file may be damaged: export it anew",
            row=line_of(data, nul),
        )
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        likely = _likely(data[error.start : error.start + 4096])
        raise UnfitFile(
            f"a byte that is not UTF-8 (0x{data[error.start]:02x} at byte offset {error.start}; {likely})",
            "UTF-8",
            'save the file again with the encoding "UTF-8"',
            row=line_of(data, error.start),
        ) from None
    return text.removeprefix("\ufeff")


def _likely(data: bytes) -> str:
    """What bytes that are not UTF-8 most likely are, in words."""
    if any(0x80 <= byte < 0xA0 for byte in data):
        return "perhaps Windows-1252"
    return "perhaps ISO 8859-1 (Latin-1) or Windows-1252"


def line_of(data: bytes, offset: int) -> int:
    """Physical line on which a byte stands, the first line being 1."""
    before = data[:offset].replace(b"\r\n", b"\n")
    return before.count(b"\n") + before.count(b"\r") + 1


def named_bytes(
    folder: Path, name: str, *, key: str, row: int | None, collected: Collected, **limits: int
) -> bytes | None:
    """The bytes of a file that survey.toml names, its SHA-256 kept; None with a problem when it is unfit.

    Parameters
    ----------
    folder : Path
        Resolved survey folder.
    name, key, row
        The name, the key of survey.toml that holds it, and the line on which the key stands.
    """
    try:
        path = inside(folder, name)
    except UnfitFile as unfit:
        collected.problem(
            "survey.toml", row, key, found=unfit.found, expected=unfit.expected, mend=unfit.mend
        )
        return None
    try:
        data = plain_bytes(path, **limits)
    except UnfitFile as unfit:
        collected.problem(
            shown(name), unfit.row, None, found=unfit.found, expected=unfit.expected, mend=unfit.mend
        )
        return None
    collected.files[name] = InputFile(name=name, sha256=hashlib.sha256(data).hexdigest())
    return data
