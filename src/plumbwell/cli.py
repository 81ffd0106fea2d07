"""The command line: `plumbwell reduce`, `plumbwell check`, `plumbwell new`.

Exit status: 0 done; 1 the input is wrong or the disk refuses; 2 wrong usage; 3 done as far as possible, with
an error-grade finding; 130 stopped by the user. Rooms are loaded when a command needs them, so that help and
version cost nothing.
"""

from __future__ import annotations

import argparse
import os
import sys

from plumbwell import __version__

TYPE_CHECKING = False  # the module `typing` is not worth loading for a name
if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Sequence
    from pathlib import Path
    from typing import TextIO

    from plumbwell.study.finding import Finding
    from plumbwell.study.results import Results

DONE, INPUT_WRONG, USAGE_WRONG, DONE_WITH_ERRORS, STOPPED = 0, 1, 2, 3, 130
WIDTH = 80
DEBUG = "PLUMBWELL_DEBUG"
HEADS = {"error": "Errors", "look": "Wants a look", "note": "Notes"}
COUNTED = {"error": ("error", "errors"), "look": ("to look at", "to look at"), "note": ("note", "notes")}
MOST_SHOWN = 3
# What a terminal that knows only some characters shows instead of ours.
PLAIN = str.maketrans({"\u2212": "-", "\u2013": "-", "\u2014": "-", "\u00b5": "u", "\u03bc": "u", "\u2026": "..."})


def parser() -> argparse.ArgumentParser:
    """The parser of the whole command line."""
    top = argparse.ArgumentParser(
        prog="plumbwell",
        description="Gravity surveyed below ground, turned into rock density with honest errors.",
        epilog="A survey is a folder of plain files; `plumbwell new DIR` writes one to start from. "
        f"{DEBUG}=1 in the environment shows where an unforeseen error arose.",
    )
    top.add_argument("--version", action="version", version=f"plumbwell {__version__}")
    commands = top.add_subparsers(dest="command", metavar="COMMAND", required=True)
    reduce = commands.add_parser(
        "reduce",
        help="reduce a survey folder and write tables, summary, LAS file and figure",
        description="Reduce a survey folder and write tables, summary, LAS file and figure. Nothing is "
        "written into the survey folder. Files that an earlier run wrote into DIR are replaced, or removed "
        "where this run has no such table; other files in DIR stay.",
    )
    reduce.add_argument("folder", metavar="FOLDER", help="the survey folder")
    reduce.add_argument("--out", metavar="DIR", required=True, help="folder for the outputs, made if missing")
    reduce.add_argument("--quiet", action="store_true", help="print errors only")
    reduce.set_defaults(act=_reduce)
    check = commands.add_parser(
        "check",
        help="read and reduce a survey folder and print what wants a person's eye",
        description="Read and reduce a survey folder and print its findings; nothing is written.",
    )
    check.add_argument("folder", metavar="FOLDER", help="the survey folder")
    check.set_defaults(act=_check)
    new = commands.add_parser(
        "new",
        help="write a commented survey folder to start from",
        description="Write a small invented survey with comments on every file and key; it reduces as it stands.",
    )
    new.add_argument("folder", metavar="DIR", help="folder to make; an existing one must be empty")
    new.set_defaults(act=_new)
    return top


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command; the exit status.

    Parameters
    ----------
    argv : sequence of str or None
        Words of the command; None: those of the process.
    """
    try:
        arguments = parser().parse_args(argv)
    except SystemExit as stop:
        return stop.code if isinstance(stop.code, int) else USAGE_WRONG
    act: Callable[[argparse.Namespace], int] = arguments.act
    try:
        status = act(arguments)
        sys.stdout.flush()
        return status
    except KeyboardInterrupt:
        _say("\nStopped. Nothing was left half written.", sys.stderr)
        return STOPPED
    except BrokenPipeError:
        # Whoever read our output has gone; the interpreter's last flush must not complain about it again.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        _say("The rest of the printed text is lost: nobody reads it any more.", sys.stderr)
        return INPUT_WRONG
    except Exception as error:
        if os.environ.get(DEBUG):
            raise
        return _failed(error)


def _failed(error: Exception) -> int:
    """Say what went wrong in a sentence of its own kind; the exit status."""
    from plumbwell.files.output_folder import UnfitTarget
    from plumbwell.survey.errors import InputError, PlumbwellError

    if isinstance(error, InputError):
        lines = [f"The survey cannot be read: {_counted(len(error.problems), 'problem')}."]
        for one in error.problems:
            place = (one.file, f"row {one.row}" if one.row is not None else None, one.column)
            lines += ["", ", ".join(part for part in place if part is not None)]
            lines += _wrapped(one.found, "  found:    ")
            lines += _wrapped(one.expected, "  expected: ")
            lines += _wrapped(one.mend, "  to mend:  ")
        _say("\n".join(lines), sys.stderr)
        return INPUT_WRONG
    if isinstance(error, PlumbwellError):
        _say("\n".join(_wrapped(str(error))), sys.stderr)
        return USAGE_WRONG if isinstance(error, UnfitTarget) else INPUT_WRONG
    if isinstance(error, OSError):
        what = error.strerror or str(error)
        where = f"{error.filename}: " if error.filename is not None else ""
        text = f"The files could not be written or read: {where}{what}. What stood there before is unchanged."
    elif isinstance(error, MemoryError):
        text = "There is not enough memory for this survey. Nothing was left half written."
    else:
        text = (
            f"An unforeseen error stopped the work ({type(error).__name__}: {error}); this is a fault of "
            f"the program. Run again with {DEBUG}=1 in the environment to see where, and report it with "
            "that text."
        )
    _say("\n".join(_wrapped(text)), sys.stderr)
    return INPUT_WRONG


def _reduce(arguments: argparse.Namespace) -> int:
    from pathlib import Path

    from plumbwell.files.folder import read_survey
    from plumbwell.files.output_folder import SUMMARY, check_target, output_folder, write_texts
    from plumbwell.files.reduced_las import reduced_las
    from plumbwell.files.summary import summary_text
    from plumbwell.files.tables_out import csv_notes, csv_texts
    from plumbwell.study.case import Case
    from plumbwell.study.reduce import reduce

    target = check_target(Path(arguments.out), survey=Path(arguments.folder))
    line = _ProgressLine(quiet=arguments.quiet)
    try:
        line.tell(0.0, "reading the files")
        survey = read_survey(arguments.folder)
        results = reduce(Case(survey=survey), progress=line.tell)
        line.tell(1.0, "writing tables")
        texts, notes = csv_texts(results), csv_notes(results)
        las = reduced_las(results)
        if las is None:
            notes.append("reduced.las is not written: no interval reaches over two half metres of depth")
        else:
            texts["reduced.las"] = las
        with output_folder(target) as aside:
            write_texts(aside, texts)
            line.tell(1.0, "drawing the figure")
            results = _with_figures(results, aside)
            names = sorted(one.name for one in aside.iterdir())
            write_texts(aside, {SUMMARY: summary_text(results, outputs=[*names, SUMMARY], notes=notes)})
    finally:
        line.clear()
    if not arguments.quiet:
        _report(results, arguments.out, [*names, SUMMARY], notes)
    graver = [one for one in results.findings if one.severity == "error"]
    if arguments.quiet and graver:
        _say("\n".join(_docket_lines(graver)), sys.stderr)
    return DONE_WITH_ERRORS if graver else DONE


def _with_figures(results: Results, folder: Path) -> Results:
    """Draw the figures; where the drawing libraries are missing, a finding says so."""
    try:
        from plumbwell.plates.figure_of import write_figures
    except (ImportError, OSError) as error:
        import re
        from dataclasses import replace

        from plumbwell.study.finding import Finding

        named = re.search(r"lib[\w.+-]+\.(?:so[\w.]*|dylib)|[\w.+-]+\.dll|(?<=No module named ')[\w.]+", str(error))
        library = named[0] if named else str(error)
        finding = Finding(
            code="figure_not_drawn",
            severity="error",
            place="figure.svg, figure.png",
            text=f"The figures could not be drawn, because the library {library} is missing; everything else "
            "is written.",
            mend=f"Install {library} by the system's own means, then run again.",
        )
        return replace(results, findings=(finding, *results.findings))
    write_figures(results, folder)
    return results


def _check(arguments: argparse.Namespace) -> int:
    from plumbwell.files.folder import read_survey
    from plumbwell.study.case import Case
    from plumbwell.study.reduce import reduce

    results = reduce(Case(survey=read_survey(arguments.folder)))
    _say("\n".join([*_content_lines(results), "", *_docket_lines(results.findings)]))
    return DONE_WITH_ERRORS if any(one.severity == "error" for one in results.findings) else DONE


def _new(arguments: argparse.Namespace) -> int:
    from pathlib import Path

    from plumbwell.files.new_survey import write_new_survey

    names = write_new_survey(Path(arguments.folder))
    _say("\n".join(_wrapped(f"Wrote {', '.join(names)} to {arguments.folder}. All numbers in it are invented.")))
    _say("\n".join(_wrapped(f"Next: plumbwell reduce {arguments.folder} --out results")))
    return DONE


def _report(results: Results, out: str, names: Sequence[str], notes: Iterable[str]) -> None:
    """Say what was written, what was found, and what the result is worth."""
    from plumbwell.study.cautions import GENERAL

    lines = [*_content_lines(results), ""]
    lines += _wrapped(f"{len(names)} files in {out}: {', '.join(names)}.")
    for note in notes:
        lines += _wrapped(f"Note: {note}.")
    lines.append("")
    findings = sorted(results.findings, key=lambda one: list(HEADS).index(one.severity))
    worst = [one for one in findings if one.severity != "note"]
    lines += _wrapped(_count_line(findings))
    for one in worst[:MOST_SHOWN]:
        lines += _wrapped(f"{one.place}: {one.text}", f"  {COUNTED[one.severity][0]}: ")
    if len(worst) > MOST_SHOWN:
        lines.append(f"  and {len(worst) - MOST_SHOWN} more, in summary.json")
    _say("\n".join([*lines, "", *_wrapped(GENERAL)]))


def _content_lines(results: Results) -> list[str]:
    from plumbwell.files.summary import counts

    rows = counts(results)
    kinds = ", ".join(f"{rows[kind]} {kind}" for kind in ("used", "excluded", "refused"))
    text = (
        f"{results.survey.site.name}: {_counted(len(results.stations), 'station')}, "
        f"{_counted(len(results.intervals), 'interval')}; {_counted(rows['read'], 'reading')}: {kinds}."
    )
    return _wrapped(text)


def _counted(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"


def _count_line(findings: Sequence[Finding]) -> str:
    parts = []
    for severity, (one, many) in COUNTED.items():
        number = sum(finding.severity == severity for finding in findings)
        if number:
            parts.append(f"{number} {one if number == 1 else many}")
    return f"Findings: {', '.join(parts)}." if parts else "No findings."


def _docket_lines(findings: Sequence[Finding]) -> list[str]:
    """The docket in words, gravest first."""
    lines = _wrapped(_count_line(findings))
    for severity, head in HEADS.items():
        members = [one for one in findings if one.severity == severity]
        if members:
            lines += ["", head]
        for one in members:
            lines += _wrapped(f"{one.place} ({one.code})", "  ", "    ")
            lines += _wrapped(one.text, "    ")
            lines += _wrapped(one.mend, "    to mend: ")
    return lines


def _wrapped(text: str, first: str = "", others: str | None = None) -> list[str]:
    """A text in lines of up to 80 characters, with an indent."""
    from textwrap import wrap

    indent = " " * len(first) if others is None else others
    return wrap(text, WIDTH, initial_indent=first, subsequent_indent=indent, break_on_hyphens=False) or [first]


def _say(text: str, stream: TextIO | None = None) -> None:
    """Print a text; characters that the terminal does not know are replaced by plain ones."""
    stream = sys.stdout if stream is None else stream
    encoding = getattr(stream, "encoding", None) or "utf-8"
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        text = text.translate(PLAIN).encode(encoding, "replace").decode(encoding)
    print(text, file=stream)


class _ProgressLine:
    """One line on the terminal that says how far the work is; nothing where stderr is no terminal."""

    def __init__(self, *, quiet: bool) -> None:
        self._shows = not quiet and sys.stderr.isatty()
        self._long = 0

    def tell(self, share: float, what: str) -> None:
        """Rewrite the line."""
        if self._shows:
            text = f"{share:4.0%}  {what}"
            sys.stderr.write("\r" + text.ljust(self._long))
            sys.stderr.flush()
            self._long = len(text)

    def clear(self) -> None:
        """Wipe the line."""
        if self._shows and self._long:
            sys.stderr.write("\r" + " " * self._long + "\r")
            sys.stderr.flush()
            self._long = 0
