"""The sections and header lines of a LAS file (CWLS LAS 2.0, September 1992, with its later notes).

A header line is cut at its first dot, the first space after that dot, and its last colon
(the rule of the 2014 update, which reads every line of the 1992 text).
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from plumbwell.files.collected import Collected
from plumbwell.survey.errors import shown

_SECTION = re.compile(r"[\s\"']*~\s*(\w)?")


@dataclass(frozen=True, slots=True)
class HeaderLine:
    """A header line `MNEM.UNIT DATA : DESCRIPTION` with its physical line."""

    mnemonic: str
    unit: str
    value: str
    description: str
    line: int


@dataclass(slots=True)
class Sections:
    """The sections of a LAS file: header lines by the section's letter, other text, and the data lines.

    Parameters
    ----------
    headers : dict
        Letter to header lines, for V, W, C and P.
    other : list of str
    data : list of (int, str)
        Physical line and text of each data line.
    """

    headers: dict[str, list[HeaderLine]] = field(default_factory=dict)
    other: list[str] = field(default_factory=list)
    data: list[tuple[int, str]] = field(default_factory=list)
    data_line: int | None = None

    def value(self, section: str, mnemonic: str) -> HeaderLine | None:
        """The first header line of a mnemonic in a section, without regard to case."""
        return next((one for one in self.headers.get(section, ()) if one.mnemonic.upper() == mnemonic), None)


def header_line(text: str, line: int) -> HeaderLine:
    """A header line cut into its four parts; parts that are not there are empty."""
    before, colon, description = text.rpartition(":")
    if not colon:
        before, description = text, ""
    mnemonic, dot, rest = before.partition(".")
    if not dot:
        mnemonic, _, value = before.strip().partition(" ")
        return HeaderLine(mnemonic.strip(), "", value.strip(), description.strip(), line)
    unit, _, value = rest.replace("\t", " ").partition(" ")
    return HeaderLine(mnemonic.strip(), unit.strip(), value.strip(), description.strip(), line)


def sections_of(lines: list[str], *, file: str, collected: Collected) -> Sections:
    """The sections of a LAS file; a line before all sections or a section after the data is a problem."""
    sections = Sections()
    letter: str | None = None
    comments_in_data: list[int] = []
    for number, text in enumerate(lines, start=1):
        stripped = text.strip()
        if not stripped:
            continue
        if stripped.lstrip("\"'").startswith("~"):
            match = _SECTION.match(text)
            new = (match[1] or "").upper() if match else ""
            if letter == "A":
                collected.problem(
                    file,
                    number,
                    None,
                    found=f"a section after the data: {shown(stripped)}",
                    expected="the data section last",
                    mend="move the section before ~A, or remove it",
                )
                break
            letter = new
            if letter == "A":
                sections.data_line = number
            elif letter not in "VWCPO":
                collected.note(
                    "las_section_unknown",
                    "note",
                    f"{file}, row {number}",
                    f"the section {shown(stripped)} is not read",
                    "nothing",
                )
            else:
                sections.headers.setdefault(letter, [])
            continue
        if stripped.startswith("#"):
            if letter == "A":
                comments_in_data.append(number)
            continue
        if letter == "A":
            sections.data.append((number, text))
        elif letter == "O":
            sections.other.append(text)
        elif letter is None:
            collected.problem(
                file,
                number,
                None,
                found=f"text before the first section: {shown(stripped)}",
                expected="a LAS file, which begins with ~V",
                mend="check that this is a LAS 2.0 file",
            )
            break
        elif letter in "VWCP":
            sections.headers[letter].append(header_line(text, number))
    if comments_in_data:
        collected.note(
            "las_comment_in_data",
            "note",
            f"{file}, row {comments_in_data[0]}",
            f"{len(comments_in_data)} lines of the data begin with # and are left out",
            "remove them",
        )
    return sections
