"""The command line: `plumbwell` and `plumbwell open` show the window; `reduce`, `check` and `new` do without.

Exit status: 0 done; 1 the input is wrong or the disk refuses; 2 wrong usage; 3 done as far as possible, with
an error-grade finding; 130 stopped by Ctrl-C, 143 by the system. What cannot be printed changes none of these.
Rooms are loaded when a command needs them, so that help and version cost nothing.
"""

from __future__ import annotations

import os
import sys

from plumbwell import __version__

TYPE_CHECKING = False  # the module `typing` is not worth loading for a name
if TYPE_CHECKING:
    import argparse
    from collections.abc import Callable, Iterable, Sequence

    from plumbwell.files.stops import Stops
    from plumbwell.study.results import Results

DONE, INPUT_WRONG, USAGE_WRONG, DONE_WITH_ERRORS, SIGNALLED = 0, 1, 2, 3, 128
INTERRUPT = 2  # number of the signal of Ctrl-C
DEBUG = "PLUMBWELL_DEBUG"
MOST_LINES = 20
"""Lines of findings that `reduce` prints; `check` prints all."""


def parser() -> argparse.ArgumentParser:
    """The parser of the whole command line."""
    import argparse

    top = argparse.ArgumentParser(
        prog="plumbwell",
        description="Gravity surveyed below ground, turned into rock density with honest errors.",
        epilog="A survey is a folder of plain files; `plumbwell new DIR` writes one to start from. "
        f"{DEBUG}=1 in the environment shows where an unforeseen error arose.",
    )
    top.add_argument("--version", action="version", version=f"plumbwell {__version__}")
    top.set_defaults(act=_open, folder=None)
    commands = top.add_subparsers(dest="command", metavar="COMMAND")
    window = commands.add_parser(
        "open",
        help="open the window on a survey folder; without a command it opens on the doors",
        description="Open the window on a survey folder. Nothing is written into the survey folder: what is left out, "
        "noted or set in the window is kept in your own data folder, and lies on top of what was measured.",
    )
    window.add_argument("folder", metavar="FOLDER", nargs="?", help="the survey folder, or its survey.toml")
    window.set_defaults(act=_open)
    reduce = commands.add_parser(
        "reduce",
        help="reduce a survey folder and write tables, summary, LAS file and figure",
        description="Reduce a survey folder and write tables, summary, LAS file and figure. Nothing is "
        "written into the survey folder. Files that an earlier run wrote into DIR (its summary.json lists them) "
        "are replaced, or removed where this run has no such table; other files in DIR stay, and where one of "
        "them has the name of an output the run is refused. Exit status: 0 done, 1 the input is wrong, "
        "2 wrong usage, 3 done with an error among the findings.",
    )
    reduce.add_argument("folder", metavar="FOLDER", help="the survey folder")
    reduce.add_argument("--out", metavar="DIR", required=True, help="folder for the outputs, made if missing")
    reduce.add_argument(
        "--alternatives",
        action="store_true",
        help="write alternatives.csv too: what else could have been done with drift, tares and noise, each with its "
        "likelihood, tests, and how the densities would move; takes a reduction for each",
    )
    reduce.add_argument("--quiet", action="store_true", help="print errors only")
    reduce.set_defaults(act=_reduce)
    check = commands.add_parser(
        "check",
        help="read and reduce a survey folder and print what wants a person's eye",
        description="Read and reduce a survey folder and print all its findings, each with what can be done about "
        "it; nothing is written. Exit status as that of reduce.",
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
    if argv is None:
        _stand_in_for_closed_streams()
    try:
        arguments = parser().parse_args(argv)
        from plumbwell.files.stops import Stopped, Stops

        with Stops(for_good=argv is None) as stops:
            try:
                return _act(arguments, stops)
            except Exception:
                # A library may turn the stop that interrupted it into an error of its own.
                if stops.number is not None:
                    raise Stopped(stops.number) from None
                raise
    except SystemExit as stop:
        _flush()
        return stop.code if isinstance(stop.code, int) else USAGE_WRONG
    except KeyboardInterrupt as stop:
        from plumbwell.files.terminal import say

        say("\nStopped. Nothing was left half written.", sys.stderr)
        return SIGNALLED + getattr(stop, "number", INTERRUPT)


def _act(arguments: argparse.Namespace, stops: Stops) -> int:
    """Do what one command asks; the exit status."""
    act: Callable[[argparse.Namespace, Stops], int] = arguments.act
    try:
        for name, text in (("FOLDER", arguments.folder), ("DIR", getattr(arguments, "out", "."))):
            if text is not None and not text.strip():
                from plumbwell.files.terminal import say

                name = "DIR" if arguments.command == "new" else name
                say(f"The name of {name} is empty; name a folder.", sys.stderr)
                return USAGE_WRONG
        return act(arguments, stops)
    except Exception as error:
        if os.environ.get(DEBUG) or stops.number is not None:
            raise
        return _failed(error, writes=arguments.command != "check")


def _failed(error: Exception, *, writes: bool) -> int:
    """Say what went wrong in a sentence of its own kind; the exit status."""
    from plumbwell.files.output_folder import UnfitTarget
    from plumbwell.files.terminal import counted, say, visible, wrapped
    from plumbwell.survey.errors import InputError, PlumbwellError, SurveyError

    if isinstance(error, InputError):
        lines = [f"The survey cannot be read: {counted(len(error.problems), 'problem')}."]
        for one in error.blocks:
            place = (one.file, f"row {one.row}" if one.row is not None else None, one.column)
            lines += ["", visible(", ".join(part for part in place if part is not None))]
            lines += wrapped(one.found, "  found:    ")
            lines += wrapped(one.expected, "  expected: ")
            lines += wrapped(one.mend, "  to mend:  ")
        say("\n".join(lines), sys.stderr)
        return INPUT_WRONG
    if isinstance(error, PlumbwellError):
        lead = "The survey cannot be reduced: " if isinstance(error, SurveyError) else ""
        say("\n".join(wrapped(lead + str(error).rstrip(".") + ".")), sys.stderr)
        return USAGE_WRONG if isinstance(error, UnfitTarget) else INPUT_WRONG
    if isinstance(error, OSError):
        what = error.strerror or str(error)
        where = f"{error.filename}: " if error.filename is not None else ""
        text = f"The files could not be {'written or read' if writes else 'read'}: {where}{what}."
        if writes:
            text += " What stood there before is unchanged."
    elif isinstance(error, MemoryError):
        text = "There is not enough memory for this survey. Nothing was left half written."
    else:
        text = (
            f"An unforeseen error stopped the work ({type(error).__name__}: {error}); this is a fault of "
            f"the program. Run again with {DEBUG}=1 in the environment to see where, and report it with "
            "that text."
        )
    say("\n".join(wrapped(text)), sys.stderr)
    return INPUT_WRONG


def _open(arguments: argparse.Namespace, stops: Stops) -> int:
    from pathlib import Path

    from plumbwell.files.stops import held
    from plumbwell.files.terminal import say
    from plumbwell.files.user_folders import data_folder

    missing = no_display()
    if missing is not None:
        say(missing, sys.stderr)
        return USAGE_WRONG
    with held():
        try:
            from plumbwell.desk.start import load_qt, run

            load_qt()
        except (ImportError, OSError) as error:
            say(f"The window cannot be shown, because a library is missing: {error}. `plumbwell reduce` works "
                "without it.", sys.stderr)  # fmt: skip
            return INPUT_WRONG
    return run(None if arguments.folder is None else Path(arguments.folder), data_folder())


def no_display() -> str | None:
    """Why no window can be shown here, in a sentence; None where one can."""
    if sys.platform != "linux" or any(
        os.environ.get(name) for name in ("QT_QPA_PLATFORM", "DISPLAY", "WAYLAND_DISPLAY")
    ):
        return None
    return (
        "There is no display here (neither DISPLAY nor WAYLAND_DISPLAY is set), so no window can be shown. "
        "`plumbwell reduce FOLDER --out DIR` does the same work without one."
    )


def _reduce(arguments: argparse.Namespace, stops: Stops) -> int:
    from pathlib import Path

    from plumbwell.files.stops import held

    with held():
        from plumbwell.files.folder import read_survey
        from plumbwell.files.output_folder import check_target
        from plumbwell.files.report_lines import docket_lines
        from plumbwell.files.terminal import ProgressLine, say
        from plumbwell.plates.outputs import write_outputs
        from plumbwell.study.alternatives import alternatives
        from plumbwell.study.case import Case
        from plumbwell.study.kept import Kept
        from plumbwell.study.reduce import reduce

    target = check_target(Path(arguments.out), survey=Path(arguments.folder))
    line = ProgressLine(stops, quiet=arguments.quiet)
    try:
        line.tell(0.0, "reading the files")
        survey = read_survey(arguments.folder)
        case, kept = Case(survey=survey), Kept()
        results = reduce(case, kept=kept, progress=line.tell)
        others = alternatives(case, results=results, kept=kept, progress=line.tell) if arguments.alternatives else ()
        written = write_outputs(
            results, target, alternatives=others, progress=lambda _, what: line.tell(1.0, what),
            before_moving=stops.raise_noted,
        )
    finally:
        line.clear()
    results = written.results
    graver = [one for one in results.findings if one.severity == "error"]
    if not arguments.quiet:
        _report(results, arguments, written.names, written.notes)
    elif graver:
        say("\n".join(docket_lines(graver)), sys.stderr)
    return DONE_WITH_ERRORS if graver else DONE


def _check(arguments: argparse.Namespace, stops: Stops) -> int:
    from plumbwell.files.stops import held

    with held():
        from plumbwell.files.folder import read_survey
        from plumbwell.files.report_lines import content_lines, docket_lines
        from plumbwell.files.terminal import say
        from plumbwell.study.case import Case
        from plumbwell.study.reduce import reduce

    results = reduce(Case(survey=read_survey(arguments.folder)))
    say("\n".join([*content_lines(results), "", *docket_lines(results.findings)]))
    return DONE_WITH_ERRORS if any(one.severity == "error" for one in results.findings) else DONE


def _new(arguments: argparse.Namespace, stops: Stops) -> int:
    from pathlib import Path

    from plumbwell.files.new_survey import write_new_survey
    from plumbwell.files.terminal import called, quoted, say, wrapped

    folder = Path(arguments.folder)
    names = write_new_survey(folder)
    out = str(folder if folder.name not in ("", "..") else folder.resolve()) + "-results"
    say("\n".join(wrapped(f"Wrote {', '.join(names)} to {arguments.folder}. All numbers in it are invented.")))
    say("Next, as it stands or with your own numbers in their place:")
    say(f"  {called()} check {quoted(arguments.folder)}")
    say(f"  {called()} reduce {quoted(arguments.folder)} --out {quoted(out)}")
    return DONE


def _report(results: Results, arguments: argparse.Namespace, names: Sequence[str], notes: Iterable[str]) -> None:
    """Say what came out, what was written, what was found, and what the result is worth."""
    from plumbwell.files.report_lines import content_lines, count_line, density_lines, docket_lines
    from plumbwell.files.terminal import called, quoted, say, wrapped
    from plumbwell.study.cautions import GENERAL

    lines = [*content_lines(results), *density_lines(results), ""]
    lines += wrapped(f"{len(names)} files in {arguments.out}: {', '.join(names)}.")
    for note in notes:
        lines += wrapped(f"Note: {note}.")
    lines.append("")
    check = f"{called()} check {quoted(arguments.folder)}"
    worst = [one for one in results.findings if one.severity != "note"]
    if worst:
        lines += [*docket_lines(results.findings, of=worst, most=MOST_LINES), ""]
    else:
        lines += wrapped(count_line(results.findings))
    if results.findings:
        lines += ["See all findings, with what can be done, in summary.json or with:", f"  {check}"]
    say("\n".join([*lines, "", *wrapped(GENERAL)]))


def _flush() -> None:
    """Send on what the parser printed."""
    try:
        if sys.stdout is not None:
            sys.stdout.flush()
    except (OSError, ValueError) as error:
        from plumbwell.files.terminal import lost

        lost(sys.stdout, error)


def _stand_in_for_closed_streams() -> None:
    """Open standard streams that were closed on nothing, so that no file of ours gets their number."""
    for name, mode in (("stdin", "r"), ("stdout", "w"), ("stderr", "w")):
        if getattr(sys, name) is None:
            setattr(sys, name, open(os.devnull, mode, encoding="utf-8"))
