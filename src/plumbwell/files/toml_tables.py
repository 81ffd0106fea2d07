"""Tables of a TOML file whose keys are asked for one by one, each checked for kind and range.

What is wrong becomes a problem with the physical line of the key; a key that nobody asked for is
told with the nearest known one. NaN, infinities and numbers beyond float64 are refused.
"""

from __future__ import annotations

import math
import re
import tomllib
from collections.abc import Iterable
from difflib import get_close_matches
from typing import Any

from plumbwell.files.collected import Collected
from plumbwell.files.label_texts import MAXIMUM_LABEL, unfit_label
from plumbwell.files.paths import UnfitFile, text_of
from plumbwell.files.text_table import physical_lines
from plumbwell.survey.errors import shown

_HEADER = re.compile(r"\s*(\[\[?)\s*([^\[\]#]+?)\s*\]\]?\s*(?:#.*)?")
_KEY = re.compile(
    r"\s*((?:[A-Za-z0-9_\-]+|\"[^\"]*\"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_\-]+|\"[^\"]*\"|'[^']*'))*)\s*="
)
_PART = re.compile(r"\"([^\"]*)\"|'([^']*)'|([^\s.\"']+)")
MISSPELT = 0.8
"""Likeness (Ratcliff and Metzener 1988) from which an unknown key is a known one misspelt."""

_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)")

Lines = dict[tuple[str, ...], int]


def parse_toml(data: bytes, *, file: str, collected: Collected) -> tuple[dict[str, Any], Lines] | None:
    """The contents of a TOML file and the physical line of each key; None with a problem when unreadable."""
    try:
        text = text_of(data)
    except UnfitFile as unfit:
        collected.problem(file, unfit.row, None, found=unfit.found, expected=unfit.expected, mend=unfit.mend)
        return None
    text = "\n".join(physical_lines(text)) + "\n"
    try:
        return tomllib.loads(text), key_lines(text)
    except tomllib.TOMLDecodeError as error:
        message = str(error)
        place = _PLACE.search(message)
        row = int(place[1]) if place and place[1] else text.count("\n")
        column = f"column {place[2]}" if place and place[2] else None
        said = _PLACE.sub("", message)
        collected.problem(
            file,
            row,
            column,
            found=f"text that is not TOML ({shown(said)})",
            expected='lines such as key = 1.0, key = "text", [table]',
            mend="correct that line; texts stand in quotes, and each key stands once in its table",
        )
    except RecursionError:
        collected.problem(
            file,
            None,
            None,
            found="values nested too deeply",
            expected="plain tables",
            mend="remove the nested brackets",
        )
    except ValueError:
        collected.problem(
            file,
            None,
            None,
            found="a number too long to read",
            expected="numbers of usual length",
            mend="look for a number of thousands of digits, or a date that does not exist",
        )
    return None


def key_lines(text: str) -> Lines:
    """Physical line of every table and key, as far as a look at the lines can tell.

    Keys of the result are paths such as ("site", "latitude") or, for the second [[run]],
    ("run", "1", "name").
    """
    lines: Lines = {}
    counts: dict[str, int] = {}
    table: tuple[str, ...] = ()
    for number, line in enumerate(text.split("\n"), start=1):
        if match := _HEADER.fullmatch(line):
            table = _parts(match[2])
            if match[1] == "[[" and table:
                counts[table[0]] = counts.get(table[0], -1) + 1
                table = (table[0], str(counts[table[0]]))
            lines.setdefault(table, number)
        elif match := _KEY.match(line):
            lines.setdefault(table + _parts(match[1]), number)
    return lines


def _parts(dotted: str) -> tuple[str, ...]:
    return tuple(a or b or c for a, b, c in _PART.findall(dotted))


class TomlTable:
    """One table of a TOML file, its keys asked for one by one.

    Parameters
    ----------
    values : dict
    title : str
        The table for messages: "[site]", "[[run]]".
    path : tuple of str
        Where the table stands, as in `key_lines`.
    """

    def __init__(
        self,
        values: dict[str, Any],
        title: str,
        path: tuple[str, ...],
        *,
        file: str,
        lines: Lines,
        collected: Collected,
    ) -> None:
        self.values, self.title, self.path = values, title, path
        self.file, self.lines, self.collected = file, lines, collected
        self.asked: set[str] = set()

    def row(self, key: str | None = None) -> int | None:
        """Physical line of a key, else of the table's first line, else None."""
        if key is not None:
            for place in ((*self.path, key), (*self.path, key, "0")):
                if place in self.lines:
                    return self.lines[place]
        return self.lines.get(self.path)

    def place(self, key: str) -> str:
        """A key with its table, as a problem names its column."""
        return f"{self.title} {key}".strip()

    def problem(self, key: str, *, found: str, expected: str, mend: str) -> None:
        """Report what is wrong with a key."""
        self.collected.problem(
            self.file, self.row(key), self.place(key), found=found, expected=expected, mend=mend
        )

    def wrong(self, key: str, expected: str, mend: str = "correct the value") -> None:
        """Report a value of the wrong kind or out of range."""
        self.problem(key, found=written(self.values[key]), expected=expected, mend=mend)

    def missing(self, key: str, expected: str, mend: str) -> None:
        """Report a required key that is not there."""
        self.problem(key, found="no such key", expected=expected, mend=mend)

    def has(self, key: str) -> bool:
        """True when the key is written; it then counts as asked for."""
        self.asked.add(key)
        return key in self.values

    def number(
        self,
        key: str,
        default: float | None = None,
        *,
        unit: str = "",
        least: float = -math.inf,
        most: float = math.inf,
        above: bool = False,
        mend: str = "correct the value",
    ) -> float | None:
        """A finite number within limits, in the written unit; the default when it is missing or wrong."""
        if not self.has(key):
            return default
        value = self.values[key]
        number = finite(value)
        if number is None or number < least or number > most or (above and number == least):
            expected = "a number" + (f" in {unit}" if unit else "")
            if math.isfinite(least) and math.isfinite(most):
                expected += f" above {least:g}, at most {most:g}" if above else f" from {least:g} to {most:g}"
            elif math.isfinite(least):
                expected += f" above {least:g}" if above else f" of {least:g} or more"
            self.wrong(key, expected, mend)
            return default
        return number

    def text(
        self,
        key: str,
        default: str | None = None,
        *,
        choices: tuple[str, ...] = (),
        longest: int = MAXIMUM_LABEL,
    ) -> str | None:
        """A text, not empty, one of the choices if there are any; the default when missing or wrong.

        A text with control characters, or of more than `longest` characters, is a problem.
        """
        if not self.has(key):
            return default
        value = self.values[key]
        words = " or ".join(f'"{choice}"' for choice in choices)
        if not isinstance(value, str) or not value.strip() or (choices and value not in choices):
            self.wrong(key, words or "a text in quotes")
            return default
        if choices:
            return value
        if (wrong := unfit_label(value.strip(), longest)) is not None:
            self.problem(key, found=wrong.found, expected=wrong.expected, mend=wrong.mend)
            return default
        return value.strip()

    def texts(self, key: str, *, choices: tuple[str, ...] = ()) -> tuple[str, ...]:
        """A list of texts; empty when it is missing or wrong."""
        if not self.has(key):
            return ()
        value = self.values[key]
        if not isinstance(value, list) or not all(
            isinstance(one, str) and one.strip() and (not choices or one in choices) for one in value
        ):
            words = ", ".join(f'"{choice}"' for choice in choices)
            self.wrong(key, "a list of any of " + words if choices else 'a list of texts: ["one", "two"]')
            return ()
        return tuple(value)

    def tables(self, key: str) -> list[TomlTable]:
        """The tables of an array [[key]]; empty when there are none."""
        if not self.has(key):
            return []
        value = self.values[key]
        if not isinstance(value, list) or not all(isinstance(one, dict) for one in value):
            self.problem(
                key,
                found=written(value),
                expected=f"tables that begin with [[{key}]]",
                mend=f"write [[{key}]] over its keys",
            )
            return []
        return [self._under(one, f"[[{key}]]", (key, str(number))) for number, one in enumerate(value)]

    def table(self, key: str) -> TomlTable:
        """The table [key]; an empty one when it is missing or wrong."""
        value = self.values[key] if self.has(key) else {}
        if not isinstance(value, dict):
            self.problem(
                key,
                found=written(value),
                expected=f"a table that begins with [{key}]",
                mend=f"write [{key}] over its keys",
            )
            value = {}
        return self._under(value, f"[{shown('.'.join((*self.path, key)))}]", (*self.path, key))

    def _under(self, values: dict[str, Any], title: str, path: tuple[str, ...]) -> TomlTable:
        return TomlTable(values, title, path, file=self.file, lines=self.lines, collected=self.collected)

    def tell_unknown(self, also: Iterable[str] = ()) -> None:
        """Tell of every key or table that nobody asked for; one that is spelt nearly like a known one is a problem."""
        known = sorted(self.asked | set(also))
        for key, value in self.values.items():
            if key in known:
                continue
            title = self._title_of(key, value)
            what = f'the key "{shown(key)}"' + (f" in {self.title}" if self.title else " outside any table")
            if title is not None:
                what = f"the table {title}"
            if near := get_close_matches(key.lower(), known, n=1, cutoff=MISSPELT):
                self.problem(
                    key,
                    found=f"{what}, which is not known",
                    expected=f'"{near[0]}", if that is meant' if title is None else f"[{near[0]}], if that is meant",
                    mend="correct its spelling, or remove it, since it would have no effect",
                )
                continue
            place = self.file if self.row(key) is None else f"{self.file}, row {self.row(key)}"
            self.collected.note(
                "unknown_key",
                "look",
                f"{place}, {shown(self.place(key))}",
                f"{what} is not known and has no effect",
                "remove it, or correct its spelling",
            )

    def _title_of(self, key: str, value: Any) -> str | None:
        """A table's title as it is written, [a.b] or [[a]]; None for a plain key."""
        dotted = shown(".".join((*self.path, key)))
        if isinstance(value, dict):
            return f"[{dotted}]"
        tables = isinstance(value, list) and bool(value) and all(isinstance(one, dict) for one in value)
        return f"[[{dotted}]]" if tables else None


def finite(value: Any) -> float | None:
    """A TOML value as a finite float, or None when it is none."""
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return None
    try:
        number = float(value)
    except OverflowError:
        return None
    return number if math.isfinite(number) else None


def written(value: Any) -> str:
    """A value as it may stand in a message, near to how TOML writes it."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f'"{shown(value)}"'
    if isinstance(value, int) and abs(value) > 10**30:
        return "a whole number of more than 30 digits"
    if isinstance(value, list):
        return shown("[" + ", ".join(written(one) for one in value[:20]) + "]")
    if isinstance(value, dict):
        return shown(
            "{ " + ", ".join(f"{key} = {written(one)}" for key, one in list(value.items())[:20]) + " }"
        )
    return shown(value)
