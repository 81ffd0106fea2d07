"""The data section of a LAS file as one row of texts an index value, wrapped or not.

The count of values decides; where it does not fit the curves, the physical line is named.
"""

from __future__ import annotations

import re

from plumbwell.files.collected import Collected
from plumbwell.files.las_header import Sections
from plumbwell.survey.errors import shown

RUN_TOGETHER = re.compile(r"([+-]?\d+(?:\.\d*)?)(-\d+(?:\.\d*)?)")
_DECIMAL_COMMA = re.compile(r"[+-]?\d+,\d+")

Row = tuple[int, list[str]]


def even_columns(sections: Sections, width: int) -> tuple[list[int], list[tuple[str, ...]]] | None:
    """Physical lines and columns of data whose every line holds a value a curve, parted by blanks; else None.

    A long log is read so without a list a row.
    """
    lines, texts = [line for line, _ in sections.data], [text for _, text in sections.data]
    joined = "\n".join(texts)
    if "," in joined or any(len(text.split()) != width for text in texts):
        return None
    cells = joined.split()
    return lines, [tuple(cells[place::width]) for place in range(width)]


def rows_of(
    sections: Sections, width: int, *, wrap: bool, file: str, collected: Collected
) -> list[Row] | None:
    """The values of each index value, as texts; None with a problem where the counts do not fit."""
    rows: list[Row]
    if any("," in text for _, text in sections.data):
        rows = _comma_rows(sections.data, width, file, collected)
        if not rows:
            return None
    else:
        rows = [(line, text.split()) for line, text in sections.data]
    wrong = next((row for row in rows if len(row[1]) != width), None)
    if wrong is None:
        if wrap and width > 1:
            collected.note(
                "las_wrap",
                "look",
                file,
                "the header says WRAP YES, but each depth has one line; it is read so",
                "write WRAP. NO",
            )
        return rows
    unwrapped, broken = _unwrapped(rows, width)
    if broken is None and (wrap or width > 2):
        if not wrap:
            collected.note(
                "las_wrap",
                "look",
                file,
                "the header says WRAP NO, but the values of a depth run over several lines; it is read so",
                "write WRAP. YES",
            )
        return unwrapped
    if wrap and broken is not None:
        collected.problem(
            file,
            broken,
            None,
            found="values that do not fit the number of curves, here or just before",
            expected=f"the index alone on a line, then {width - 1} values",
            mend="the file may be damaged: export the log anew",
        )
        return None
    for line, cells in rows:
        if len(cells) == width:
            continue
        mend = "correct the row; a missing value is written as the null value"
        if len(cells) < width and (
            cut := next((m for cell in cells if (m := RUN_TOGETHER.fullmatch(cell))), None)
        ):
            mend = f"part the values that run together, perhaps {cut[1]} and {cut[2]}"
        collected.problem(
            file,
            line,
            None,
            found=f"{len(cells)} value{'s' if len(cells) != 1 else ''}",
            expected=f"{width}, one for each curve",
            mend=mend,
        )
        if collected.full(file):
            break
    return None


def _comma_rows(data: list[tuple[int, str]], width: int, file: str, collected: Collected) -> list[Row]:
    """Rows whose values are parted by commas, when all counts fit; decimal commas are a problem."""
    line, text = next(one for one in data if "," in one[1])
    blank = text.split()
    if any(_DECIMAL_COMMA.fullmatch(cell) for cell in blank) and len(blank) == width:
        collected.problem(
            file,
            line,
            None,
            found=f"decimal commas: {shown(text.strip())}",
            expected="points as decimal marks",
            mend="export the log with points",
        )
        return []
    rows = [(number, [cell.strip() for cell in one.split(",")]) for number, one in data]
    wrong = next((row for row in rows if len(row[1]) != width), None)
    if wrong is not None:
        collected.problem(
            file,
            wrong[0],
            None,
            found=f"{len(wrong[1])} values parted by commas",
            expected=f"{width}, one for each curve, parted by blanks",
            mend="export the log as LAS 2.0 with blanks between the values",
        )
        return []
    collected.note(
        "las_commas",
        "look",
        file,
        "the values are parted by commas, which LAS 2.0 does not allow; their count fits",
        "export the log with blanks",
    )
    return rows


def _unwrapped(rows: list[Row], width: int) -> tuple[list[Row], int | None]:
    """Rows of a wrapped file, and the line at which the counts break (None: they fit)."""
    whole: list[Row] = []
    at = 0
    while at < len(rows):
        line, cells = rows[at]
        if len(cells) != 1:
            return whole, line
        gathered = list(cells)
        at += 1
        while len(gathered) < width and at < len(rows):
            gathered += rows[at][1]
            at += 1
        if len(gathered) != width:
            return whole, rows[at - 1][0]
        whole.append((line, gathered))
    return whole, None
