"""readings.csv: the timed readings of a survey, checked row by row.

Rows stay in the order of the file and nothing is left out; rows with `use = no` may hold cells
that cannot be read.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from plumbwell.files.collected import Collected, first_rows
from plumbwell.files.known_columns import Known, Matched, match_columns, measured, refuse_unfit, report_bad, texts
from plumbwell.files.number_cells import BadCell
from plumbwell.files.statements import Statements
from plumbwell.files.text_table import TextTable, plain_name
from plumbwell.files.times import EXPECTED, Times, times_of
from plumbwell.survey.column import Column, Labels, frozen, labels
from plumbwell.survey.errors import shown
from plumbwell.survey.readings import Readings

COLUMNS = (
    Known("time", required=True),
    Known("run"),
    Known("instrument"),
    Known("station"),
    Known("visit"),
    Known("depth", ("m",)),
    Known("reading", ("m/s2", "counts"), required=True),
    Known("reading_sd", ("m/s2",)),
    Known("tide_in_reading", ("m/s2",)),
    Known("sensor_offset", ("m",)),
    Known("pressure", ("Pa",)),
    Known("tilt_x", ("rad",)),
    Known("tilt_y", ("rad",)),
    Known("temperature", ("K",)),
    Known("use"),
    Known("note"),
)
# Optional columns; True for those whose values stand above zero.
OPTIONAL = {
    "reading_sd": True,
    "tide_in_reading": False,
    "sensor_offset": False,
    "pressure": True,
    "tilt_x": False,
    "tilt_y": False,
    "temperature": False,
}
DEFAULT_RUN = "1"


def read_readings(table: TextTable, statements: Statements, collected: Collected) -> Readings | None:
    """The readings of a table, or None when a required column is missing or a heading is wrong."""
    matched = match_columns(table, COLUMNS, collected)
    use = _use(matched, collected)
    for name in ("run", "instrument", "station", "visit"):
        refuse_unfit(matched, name, collected, use=use)
    run = labels([text or DEFAULT_RUN for text in texts(matched, "run")])
    instrument = _instruments(matched, run, use, statements, collected)
    time = read_times(matched, statements, collected, use=use) if matched.has("time") else None
    reading = measured(matched, "reading", collected, use=use, required=True)
    depth = measured(matched, "depth", collected, use=use)
    optional = {
        name: measured(matched, name, collected, use=use, least=0.0 if positive else -np.inf, above=positive)
        for name, positive in OPTIONAL.items()
        if matched.has(name)
    }
    if time is None or not matched.has("reading") or matched.unusable:
        return None
    station = labels(texts(matched, "station"))
    _tell_labels(table, station, collected)
    _tell_instruments(table, run, instrument, use, collected)
    _tell_order(table, time, run, use, collected)
    use.flags.writeable = False
    return Readings(
        raw=table.raw,
        time=time,
        run=run,
        instrument=instrument,
        station=station,
        visit=labels(texts(matched, "visit")),
        depth=depth,
        reading=reading,
        use=use,
        note=matched.cells("note"),
        **optional,
    )


def _use(matched: Matched, collected: Collected) -> NDArray[np.bool_]:
    """True for the rows that are used; a cell that is neither yes, no nor empty is a problem."""
    cells = matched.cells("use")
    use = np.ones(len(cells), dtype=bool)
    for row, cell in enumerate(cells):
        word = cell.lower()
        if word == "no":
            use[row] = False
        elif word not in ("", "yes"):
            collected.problem(
                matched.table.file,
                int(matched.table.lines[row]),
                matched.heading("use"),
                found=f'"{shown(cell)}"',
                expected="yes or no",
                mend="write yes, no, or leave the cell empty (yes)",
            )
    return use


def _instruments(
    matched: Matched, run: Labels, use: NDArray[np.bool_], statements: Statements, collected: Collected
) -> Labels:
    """The instrument of each row: the row's, else its run's, else the only one."""
    named = texts(matched, "instrument")
    of_run = {one.name: one.instrument for one in statements.runs if one.instrument}
    described = [one.name for one in statements.instruments]
    if not statements.instruments_written:
        # without a table every label is an instrument with the usual settings
        described = list(dict.fromkeys([*(text for text in named if text), *of_run.values()])) or described
    only = described[0] if len(described) == 1 else None
    rows = [text or of_run.get(label or "") or only for text, label in zip(named, run.as_list(), strict=True)]
    table, known = matched.table, set(described)
    names = ", ".join(f'"{shown(name)}"' for name in described)
    for row, name in enumerate(rows):
        if name in known or not use[row]:
            continue
        line = int(table.lines[row])
        if name is None:
            collected.problem(
                table.file,
                line,
                "instrument",
                found="no instrument, and the survey has several",
                expected=f"one of {names}",
                mend="fill the column instrument, or state instrument in the [[run]] of survey.toml",
            )
        else:
            collected.problem(
                table.file,
                line,
                "instrument",
                found=f'"{shown(name)}"',
                expected=f"one of {names}",
                mend=f"correct the label, or describe it in [instrument.{shown(name)}] of survey.toml",
            )
        if collected.full(table.file):
            break
    return labels([name or described[0] for name in rows])


def read_times(
    matched: Matched, statements: Statements, collected: Collected, *, use: NDArray[np.bool_] | None = None
) -> Column:
    """The column `time` as UTC seconds since 2000-01-01; what is wrong or worth telling is collected."""
    table = matched.table
    cells = matched.cells("time")
    counted = np.ones(len(cells), dtype=bool) if use is None else use
    times = times_of(cells, local=statements.zone)
    bad = times.bad + [
        BadCell(row, "an empty cell", "write the time of the reading")
        for row in np.flatnonzero(counted).tolist()
        if cells[row] == ""
    ]
    report_bad(matched, "time", bad, EXPECTED, counted, collected)
    _tell_times(table, times, collected)
    return Column(key="time", unit="s", values=frozen(times.values), origin=matched.origin("time"))


def _tell_times(table: TextTable, times: Times, collected: Collected) -> None:
    for rows, what in ((times.leap, "a leap second, 23:59:60,"), (times.midnight, "24:00:00")):
        if rows:
            lines = [int(table.lines[row]) for row in rows]
            collected.note(
                "time_next_day",
                "note",
                f"{table.file}, {first_rows(lines)}",
                f"{what} is taken as 00:00:00 of the next day",
                "nothing, if that is meant",
            )
    if len(times.offsets) > 1:
        written = ", ".join(f"{offset / 3600:+g} h" for offset in sorted(times.offsets))
        collected.note(
            "time_offset_changes",
            "note",
            table.file,
            f"times are written with different offsets from UTC ({written})",
            "nothing, if the clock was changed; all are brought to UTC",
        )
    if times.to_minutes:
        collected.note(
            "time_to_minutes",
            "look",
            table.file,
            f"{times.to_minutes} times state no seconds; tide and drift are taken at the full minute",
            "write the seconds, where the instrument gave them",
        )


def _tell_instruments(
    table: TextTable, run: Labels, instrument: Labels, use: NDArray[np.bool_], collected: Collected
) -> None:
    """A run with readings of two instruments is told: it has one bias and one drift."""
    for code, name in enumerate(run.names):
        used = np.unique(instrument.code[use & (run.code == code)])
        if len(used) > 1:
            names = ", ".join(f'"{shown(instrument.names[one])}"' for one in used.tolist())
            collected.note(
                "run_two_instruments",
                "look",
                table.file,
                f'the run "{shown(name)}" has readings of several instruments ({names})',
                "give the readings of each instrument a run of their own",
            )


def _tell_labels(table: TextTable, station: Labels, collected: Collected) -> None:
    """Station labels that differ only by case or blanks, or hold characters that cannot be seen, are told."""
    seen: dict[str, str] = {}
    for name in station.names:
        if not name.isprintable():
            collected.note(
                "label_unprintable",
                "look",
                table.file,
                f'the station "{shown(name)}" has characters that cannot be seen',
                "write the label anew",
            )
        first = seen.setdefault(plain_name(name), name)
        if first != name:
            collected.note(
                "labels_alike",
                "look",
                table.file,
                f'the stations "{shown(first)}" and "{shown(name)}" differ only by case or blanks and count as two',
                "write them alike, if they are the same place",
            )


def _tell_order(
    table: TextTable, time: Column, run: Labels, use: NDArray[np.bool_], collected: Collected
) -> None:
    """Times that run back within a run, and equal times within a run, are told."""
    rows = np.flatnonzero(use & ~np.isnan(time.values))
    rows = rows[np.argsort(run.code[rows], kind="stable")]
    same_run = run.code[rows][1:] == run.code[rows][:-1]
    back = rows[1:][same_run & (np.diff(time.values[rows]) < 0.0)]
    if len(back):
        lines = sorted(int(table.lines[row]) for row in back)
        collected.note(
            "times_run_back",
            "look",
            f"{table.file}, {first_rows(lines)}",
            "the time is earlier than in the row before of the same run; rows are taken in order of time",
            "check the dates, and whether the clock was set during the run",
        )
    rows = rows[np.lexsort((time.values[rows], run.code[rows]))]
    same_run = run.code[rows][1:] == run.code[rows][:-1]
    equal = rows[1:][same_run & (np.diff(time.values[rows]) == 0.0)]
    if len(equal):
        lines = sorted(int(table.lines[row]) for row in equal)
        collected.note(
            "equal_times",
            "look",
            f"{table.file}, {first_rows(lines)}",
            "the run has another reading at the very same time; both are kept",
            "check whether a row was copied, or the times are cut to minutes",
        )
