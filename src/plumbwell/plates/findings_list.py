"""The findings of a survey in words, as they stand on a plate under a short ledger.

Each has its mark and its words; what does not fit is counted, never dropped in silence.
"""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtGui import QPainter

from plumbwell.plates.lettering import draw_text, wrapped
from plumbwell.plates.numbers import counted, number
from plumbwell.plates.painting import draw_mark, hairline_across
from plumbwell.plates.plate import PlateFinding
from plumbwell.plates.theme import Theme

GRAVEST_FIRST = ("error", "look", "note")
LINE, BETWEEN, HEAD = 20, 12, 30
WORDS_LEFT = 22

SetFinding = tuple[PlateFinding, list[str]]


def set_findings(findings: Sequence[PlateFinding], theme: Theme, *, width: float) -> list[SetFinding]:
    """Return findings that have words, gravest first and then by depth, with their lines in a width in px."""
    told = sorted(
        (finding for finding in findings if finding.words),
        key=lambda finding: (GRAVEST_FIRST.index(finding.severity), finding.depth or 0.0),
    )
    return [(finding, wrapped(theme, "text", finding.words, width - WORDS_LEFT)) for finding in told]


def findings_heights(told: Sequence[SetFinding]) -> tuple[int, int]:
    """Return the least height in px at which a list tells one finding, and the height that tells all."""
    if not told:
        return 0, 0
    whole = HEAD + sum(len(lines) * LINE + BETWEEN for _, lines in told)
    first = HEAD + len(told[0][1]) * LINE + BETWEEN
    return first + (LINE if len(told) > 1 else 0), whole


def findings_count(findings: Sequence[PlateFinding]) -> str:
    """Return how many findings have words, and how many of them are errors, in words."""
    told = [finding.severity for finding in findings if finding.words]
    errors = told.count("error")
    words = counted(len(told), "finding")
    return f"{words}, {counted(errors, 'error')}" if errors else words


def draw_findings_list(
    painter: QPainter,
    told: Sequence[SetFinding],
    theme: Theme,
    *,
    left: float,
    top: float,
    right: float,
    base: float,
) -> None:
    """Draw findings, as set in lines, between four edges in px.

    Nothing is drawn where there is no room for one finding.
    """
    if not told or top + findings_heights(told)[0] > base:
        return
    box = draw_text(painter, theme, "Findings", x=left, baseline=top + 16, face="emphasis")
    count = number(float(len(told)), 0)
    draw_text(painter, theme, count, x=box.right() + 6, baseline=top + 16, face="small", role="muted")
    y = top + HEAD
    for index, (finding, lines) in enumerate(told):
        rest = len(told) - index
        # The last line of the room is kept for the count of what is left, unless this finding is the last.
        if y + len(lines) * LINE + BETWEEN + (LINE if rest > 1 else 0) > base:
            more = f"{number(float(rest), 0)} more"
            draw_text(painter, theme, more, x=left + WORDS_LEFT, baseline=y + 14, role="muted")
            return
        draw_mark(painter, theme, finding.severity, x=left + 11, y=y + 9.5)
        for line in lines:
            draw_text(painter, theme, line, x=left + WORDS_LEFT, baseline=y + 14, room=(left, right))
            y += LINE
        hairline_across(painter, left, right, y + BETWEEN / 2 - 1, theme.colour("hair"), theme.hairline)
        y += BETWEEN
