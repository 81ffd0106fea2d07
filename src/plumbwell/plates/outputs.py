"""Everything that a reduction hands over, written into one folder: tables, LAS, figures, summary.

Command line and window call it alike. It stands here, right of the files, because figures are among the outputs;
the drawing libraries are loaded only when they are drawn.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from plumbwell.files.output_folder import SUMMARY, output_folder, write_texts
from plumbwell.files.reduced_las import reduced_las
from plumbwell.files.stops import held
from plumbwell.files.summary import summary_text
from plumbwell.files.tables_out import alternatives_text, csv_notes, csv_texts
from plumbwell.study.alternative_columns import FILE
from plumbwell.study.alternatives import Alternative
from plumbwell.study.finding import Finding
from plumbwell.study.reduce import quiet
from plumbwell.study.results import Results


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Written:
    """What was written.

    Parameters
    ----------
    folder : Path
    names : tuple of str
        Files, the summary last.
    notes : tuple of str
        What was not written, and why.
    results : Results
        With a finding more where the figures could not be drawn.
    """

    folder: Path
    names: tuple[str, ...]
    notes: tuple[str, ...]
    results: Results


def write_outputs(
    results: Results,
    target: Path,
    *,
    alternatives: Sequence[Alternative] = (),
    progress: Callable[[float, str], None] = quiet,
    before_moving: Callable[[], None] = lambda: None,
) -> Written:
    """Write all outputs of a reduction aside and move them into their folder together.

    Parameters
    ----------
    results : Results
    target : Path
        As `output_folder.check_target` gives it.
    alternatives : sequence of Alternative
        What else could have been done, where it was asked for; none: that table is not written.
    progress : callable
        Called with the share done (0 to 1) and what is being done; it may raise to stop the work, and nothing is
        then written.
    before_moving : callable
        Called when all is written aside, before anything is moved.

    Raises
    ------
    OSError
        The disk refuses; the target is as it was.
    """
    progress(0.0, "writing tables")
    texts, notes = csv_texts(results), csv_notes(results)
    if alternatives:
        texts[FILE] = alternatives_text(alternatives)
    progress(0.4, "writing the LAS file")
    las = reduced_las(results)
    if las is None:
        notes.append("reduced.las is not written: no interval reaches over two half metres of depth")
    else:
        texts["reduced.las"] = las
    with output_folder(target) as aside:
        write_texts(aside, texts)
        progress(0.5, "drawing the figure")
        # The drawing library ends the process when a stop meets it while it is loaded or at work.
        with held():
            results = _with_figures(results, aside)
        progress(0.9, "writing the summary")
        names = sorted(one.name for one in aside.iterdir())
        write_texts(aside, {SUMMARY: summary_text(results, outputs=[*names, SUMMARY], notes=notes)})
        before_moving()
    return Written(folder=target, names=(*names, SUMMARY), notes=tuple(notes), results=results)


def _with_figures(results: Results, folder: Path) -> Results:
    """Draw the figures; where the drawing libraries are missing, a finding says so."""
    try:
        from plumbwell.plates.figure_of import write_figures
    except (ImportError, OSError) as error:
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
