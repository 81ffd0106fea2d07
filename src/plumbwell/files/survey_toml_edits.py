"""survey.toml with some keys of the recipe and some tares changed; comments, order and style stay.

A tare that no longer counts is turned into a comment, so that what was once listed can still be read.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from datetime import date
from typing import Any

import tomlkit
from tomlkit.exceptions import TOMLKitError
from tomlkit.items import AoT, Array, Comment, Table, Whitespace

from plumbwell.earth.constants import MILLIGAL
from plumbwell.files.paths import text_of
from plumbwell.files.readings_edits import BOM
from plumbwell.files.text_table import physical_lines
from plumbwell.files.times import EPOCH_DAY, times_of
from plumbwell.files.toml_tables import key_lines
from plumbwell.survey.instrument import Tare
from plumbwell.survey.recipe import KEYS

DIGITS = (12, 15, 16, 17)
FINEST = 9
"""Decimals of a second that a time may state."""


def edited_survey_toml(
    data: bytes, *, recipe: dict[str, Any], tares: Iterable[Tare] = (), dropped: Iterable[int] = ()
) -> bytes:
    """The bytes of a survey.toml with some of its statements changed.

    Parameters
    ----------
    data : bytes
        Of a survey.toml that can be read.
    recipe : dict
        Values by key of the recipe as the program holds them (SI); None takes the key away.
    tares : iterable of Tare
        Added as `[[tare]]`.
    dropped : iterable of int
        Which of the `[[tare]]` no longer count, by their order.

    Raises
    ------
    ValueError
        When the file cannot be edited, or a value cannot be written so that it is read back as it is.
    """
    bom = BOM if data.startswith(BOM) else b""
    text = text_of(data)
    end = "\r\n" if "\r\n" in text else "\n" if "\n" in text else "\r" if "\r" in text else "\n"
    text = "\n".join(physical_lines(text)) + "\n"
    blank = text.endswith("\n\n")
    text, left = _commented_out(text, sorted(dropped))
    try:
        document = tomlkit.parse(text)
        _drop(document, left)
        for key, value in recipe.items():
            _set_recipe(document, key, value)
        for tare in tares:
            _add_tare(document, tare)
        text = tomlkit.dumps(document)
    except TOMLKitError as error:
        raise ValueError(f"survey.toml cannot be edited: {error}") from None
    if not blank:
        text = text.rstrip("\n") + "\n"
    return bom + text.replace("\n", end).encode("utf-8")


def _commented_out(text: str, dropped: list[int]) -> tuple[str, list[int]]:
    """The text with the [[tare]] tables of some numbers as comments; the numbers that are no such tables."""
    if not dropped:
        return text, []
    lines, at = text.split("\n"), key_lines(text)
    left = []
    for number in dropped:
        own = [line for place, line in at.items() if place[:2] == ("tare", str(number))]
        if not lines or ("tare", str(number)) not in at:
            left.append(number)
            continue
        for line in range(min(own), max(own) + 1):
            lines[line - 1] = f"# {lines[line - 1]}"
    return "\n".join(lines), left


def _drop(document: tomlkit.TOMLDocument, numbers: list[int]) -> None:
    """Take tares out of an array of inline tables."""
    for number in sorted(numbers, reverse=True):
        del document["tare"][number]  # type: ignore[union-attr,arg-type]


def _set_recipe(document: tomlkit.TOMLDocument, key: str, value: Any) -> None:
    if "recipe" not in document:
        document["recipe"] = tomlkit.table()
    recipe: Any = document["recipe"]
    written = _written(key, value)
    if key in recipe and (written is None or isinstance(recipe[key], Table)):
        del recipe[key]
    if written is None:
        return
    if key in recipe or not isinstance(recipe, Table):
        recipe[key] = written
        return
    behind = _taken_off(recipe)
    recipe[key] = written
    for item in behind:
        recipe.add(item)


def _taken_off(table: Table) -> list[Any]:
    """The comments and blank lines behind the last key of a table, taken off it: they speak of what follows."""
    body, behind = table.value.body, []
    while body and body[-1][0] is None:
        behind.append(body.pop()[1])
    return [item for item in behind[::-1] if isinstance(item, Comment | Whitespace)]


def _add_tare(document: tomlkit.TOMLDocument, tare: Tare) -> None:
    there: Any = document.get("tare")
    if isinstance(there, Array):
        there.append(_with_statements(tomlkit.inline_table(), tare))
        return
    table = _with_statements(tomlkit.table(), tare)
    if isinstance(there, AoT):
        for item in _taken_off(there[-1]) or [tomlkit.nl()]:
            table.add(item)
        there[-1].add(tomlkit.nl())
        there.append(table)
        return
    tables = tomlkit.aot()
    tables.append(table)
    document.append("tare", tables)


def _with_statements(table: Any, tare: Tare) -> Any:
    """A table, of either form, with what is stated about a tare."""
    table["run"], table["time"] = tare.run, exact_time(tare.time)
    for key, value in (("size", tare.size), ("size_sd", tare.size_sd)):
        if value is not None:
            table[key] = exact_number(value, MILLIGAL)
    return table


def _written(key: str, value: Any) -> Any:
    """A value of the recipe as survey.toml writes it; None for none."""
    factor = KEYS[key].factor
    if isinstance(value, tuple):
        table = tomlkit.inline_table()
        table.update({"gradient": exact_number(value[0], MILLIGAL), "sd": exact_number(value[1], MILLIGAL)})
        return table
    return exact_number(value, factor) if isinstance(value, float) and factor is not None else value


def exact_number(value: float, factor: float) -> float:
    """The shortest number whose product with a factor is a value, to the last bit.

    Raises
    ------
    ValueError
        When there is none: the value was never a number times the factor.
    """
    for digits in DIGITS:
        number = float(f"{value / factor:.{digits}g}")
        if number * factor == value:
            return number
    raise ValueError(f"no number gives {value!r} when it is multiplied by {factor!r}")


def exact_time(seconds: float) -> str:
    """A time, UTC s since 2000-01-01, as the shortest text that is read back as it is.

    A time finer than a nanosecond is written as the nanosecond before it: the reading at which a jump begins is
    then still the same.
    """
    whole = math.floor(seconds)
    days, second = divmod(whole, 86400)
    moment = date.fromordinal(EPOCH_DAY + days).isoformat()
    start = f"{moment}T{second // 3600:02d}:{second // 60 % 60:02d}:{second % 60:02d}"
    for digits in range(FINEST + 1):
        part = f"{seconds - whole:.{digits}f}"
        text = f"{start}{part[1:]}Z"
        if part[0] == "0" and times_of([text]).values[0] == seconds:
            return text
    return f"{start}.{math.floor((seconds - whole) * 10**FINEST):0{FINEST}d}Z"
