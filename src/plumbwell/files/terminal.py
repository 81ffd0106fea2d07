"""The terminal: texts in narrow lines, printed in the characters that it knows, and the line that says how far.

A text that cannot be printed never stops the work, whose outcome is in the files and in the exit status.
"""

from __future__ import annotations

import os
import sys
from contextlib import suppress
from textwrap import wrap
from typing import TextIO

from plumbwell.files.stops import Stops
from plumbwell.survey.errors import shown

WIDTH = 80

# What a terminal that knows only some characters shows instead of ours.
PLAIN = str.maketrans({
    "\u2212": "-", "\u2013": "-", "\u2014": "-", "\u00b5": "u", "\u03bc": "u", "\u2026": "...", "\u00b1": "+-",
    "\u00b2": "2", "\u00b3": "3", "\u00d7": "x", "\u00b0": "deg", "\u2018": "'", "\u2019": "'", "\u201c": '"',
    "\u201d": '"', "\u00b7": "*", "\u2264": "<=", "\u2265": ">=", "\u00a0": " ", "\u2009": " ", "\u202f": " ",
})  # fmt: skip
HARMLESS = "\n\u00a0\u2009\u202f"  # line end, and blanks that do not break


def wrapped(text: str, first: str = "", others: str | None = None) -> list[str]:
    """A text in lines of up to 80 characters, with an indent."""
    indent = " " * len(first) if others is None else others
    made = wrap(visible(text), WIDTH, initial_indent=first, subsequent_indent=indent, break_on_hyphens=False)
    return made or [first]


def visible(text: str) -> str:
    """A text whose control characters are escaped, so that a terminal shows them and obeys none."""
    if text.isprintable():
        return text
    return "".join(one if one.isprintable() or one in HARMLESS else shown(one) for one in text)


def say(text: str, stream: TextIO | None = None) -> None:
    """Print a text; characters that the terminal does not know are replaced by plain ones.

    Where it cannot be printed the work goes on: its outcome is in the files and in the exit status.
    """
    stream = sys.stdout if stream is None else stream
    if stream is None:
        return
    encoding = getattr(stream, "encoding", None) or "utf-8"
    text = visible(text)
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        text = text.translate(PLAIN).encode(encoding, "backslashreplace").decode(encoding)
    try:
        stream.write(text + "\n")
        stream.flush()
    except (OSError, ValueError) as error:
        lost(stream, error)


def lost(stream: TextIO, error: Exception) -> None:
    """Let what a stream still holds, and what is yet to come, lead nowhere; say so unless its reader left."""
    with suppress(OSError, ValueError):
        handle = os.open(os.devnull, os.O_WRONLY)
        os.dup2(handle, stream.fileno())
        os.close(handle)
    if stream is not sys.stderr and not isinstance(error, BrokenPipeError):
        reason = getattr(error, "strerror", None) or str(error)
        say(f"The text could not be printed: {reason}.", sys.stderr)


def counted(number: int, noun: str) -> str:
    """A number with its noun: 1 station, 2 stations."""
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"


def called() -> str:
    """The command as it was called, to be typed again."""
    script = sys.argv[0]
    folder, name = os.path.split(script)
    if name == "__main__.py" and os.path.basename(folder) == "plumbwell":
        return f"{_typed(sys.executable)} -m plumbwell"
    return _typed(script) if name.startswith("plumbwell") else "plumbwell"


def _typed(program: str) -> str:
    """A program by its name alone where that finds it, else by its path."""
    name = os.path.basename(program)
    for folder in os.environ.get("PATH", "").split(os.pathsep):
        found = os.path.join(folder, name)
        if os.path.exists(found):
            return quoted(program) if os.path.normcase(found) != os.path.normcase(program) else name
    return quoted(program)


def quoted(path: str) -> str:
    """A path as a shell takes it for one word that is no option."""
    if path.startswith("-"):
        path = os.path.join(os.curdir, path)
    if os.name == "nt":
        return f'"{path}"' if " " in path else path
    from shlex import quote

    return quote(path)


class ProgressLine:
    """One line on the terminal that says how far the work is; nothing where stderr is no terminal."""

    def __init__(self, stops: Stops, *, quiet: bool) -> None:
        self._stops = stops
        self._shows = not quiet and sys.stderr is not None and sys.stderr.isatty()
        self._long = 0

    def tell(self, share: float, what: str) -> None:
        """Rewrite the line."""
        self._stops.raise_noted()
        text = f"{share:4.0%}  {what}"
        self._show("\r" + text.ljust(self._long))
        self._long = len(text)

    def clear(self) -> None:
        """Wipe the line."""
        if self._long:
            self._show("\r" + " " * self._long + "\r")
            self._long = 0

    def _show(self, text: str) -> None:
        if self._shows:
            try:
                sys.stderr.write(text)
                sys.stderr.flush()
            except (OSError, ValueError):
                self._shows = False
