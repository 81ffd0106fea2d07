"""Where the parts of a plate lie: its size, its lines of text, the ledger and findings it has room for.

Lengths in px. Paints nothing.
"""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.plates.axis import axis_width, head_height
from plumbwell.plates.findings_list import SetFinding, findings_count, findings_heights, set_findings
from plumbwell.plates.ledger_excerpt import (
    LEAST_ROW_HEIGHT,
    ROW_HEIGHT,
    Excerpt,
    column_widths,
    interval_excerpt,
    station_excerpt,
)
from plumbwell.plates.lettering import text_width, wrapped
from plumbwell.plates.plate import SurveyPlate
from plumbwell.plates.strip import strip_room
from plumbwell.plates.theme import Theme

WIDTH, LEAST_HEIGHT, GREATEST_HEIGHT = 1440, 900, 1440
MARGIN = 16
TITLE_HEIGHT = 72
FAN_WIDTH = 60
LINE = 18
REMARK_GAP = 28.0
LEDGER_WIDTH, LEAST_TRACKS = 560.0, 520.0
FINDINGS_ABOVE, FINDINGS_RIGHT = 24, 16


def scale_remark(theme: Theme) -> str:
    """Return in words how far drawn bars and bands reach."""
    return f"bars and bands {theme.reach_words}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Layout:
    """Where the parts of a plate lie, in px."""

    width: int
    height: int
    head_height: int
    caution: tuple[str, ...]
    remarks: tuple[tuple[str, ...], ...]
    strip_right: float
    body_top: int
    body_base: int
    foot_top: int
    excerpt: Excerpt | None
    row_height: int
    columns: tuple[float, ...]
    findings: tuple[SetFinding, ...]

    @property
    def head_top(self) -> int:
        """Return the upper edge of the heads."""
        return self.body_top - self.head_height

    @property
    def ledger_left(self) -> float:
        """Return the left edge of the ledger."""
        return self.strip_right + 16

    @property
    def ledger_right(self) -> float:
        """Return the right edge of the ledger."""
        return self.ledger_left + sum(self.columns)

    @property
    def findings_top(self) -> int:
        """Return the upper edge of the findings under the ledger's last row."""
        return self.body_top + (self.excerpt.rows * self.row_height if self.excerpt else 0) + FINDINGS_ABOVE


def _remark_lines(theme: Theme, remarks: tuple[str, ...], width: float) -> list[tuple[str, ...]]:
    """Return remarks set in lines, in their order; one too long for a line is broken."""
    room = width - text_width(theme, "small", scale_remark(theme)) - REMARK_GAP
    pieces = [piece for remark in remarks for piece in wrapped(theme, "small", remark, room)]
    lines: list[tuple[str, ...]] = []
    used = 0.0
    for piece in pieces:
        needed = text_width(theme, "small", piece)
        if lines and used + REMARK_GAP + needed <= room:
            lines[-1] = (*lines[-1], piece)
            used += REMARK_GAP + needed
        else:
            lines.append((piece,))
            used = needed
    return lines or [()]


def _columns(excerpt: Excerpt, theme: Theme, row_height: int, left: float) -> tuple[float, ...]:
    """Return the widths of a ledger's columns: the natural ones, and a little more where there is room."""
    widths = column_widths(excerpt, theme, row_height)
    tracks_left = WIDTH - MARGIN - LEAST_TRACKS - axis_width(theme) - FAN_WIDTH
    spare = max(min(LEDGER_WIDTH, tracks_left - left) - sum(widths), 0.0)
    return tuple(float(int(width + min(spare / len(widths), 14.0))) for width in widths)


def _layout(plate: SurveyPlate, theme: Theme, notes: tuple[str, ...], height: int | None) -> Layout:
    """Return the layout of a plate with these notes at its foot."""
    inner = WIDTH - 2 * MARGIN
    caution = tuple(wrapped(theme, "text", plate.caution, inner)) if plate.caution else ()
    remarks = _remark_lines(theme, notes, inner)
    above = TITLE_HEIGHT + (len(caution) * 20 + 20 if caution else 0) + head_height(theme) + 8
    below = len(remarks) * LINE + 26
    excerpt = interval_excerpt(plate) if plate.intervals else station_excerpt(plate)
    most = (height or GREATEST_HEIGHT) - above - below
    row_height = min(ROW_HEIGHT, most // max(excerpt.rows, 1))
    shown = excerpt if excerpt.rows and row_height >= LEAST_ROW_HEIGHT else None
    strip_right = strip_room(theme, plate)
    columns = _columns(shown, theme, row_height, strip_right + 16) if shown else ()
    told = set_findings(plate.findings, theme, width=sum(columns) - FINDINGS_RIGHT) if shown else []
    if height is None:
        rows_height = excerpt.rows * row_height if shown else 0
        findings_height = FINDINGS_ABOVE + findings_heights(told)[1] if told else 0
        height = min(max(above + rows_height + findings_height + below, LEAST_HEIGHT), GREATEST_HEIGHT)
        if shown is None and excerpt.rows:
            height = 1200
    return Layout(
        width=WIDTH,
        height=height,
        head_height=head_height(theme),
        caution=caution,
        remarks=tuple(remarks),
        strip_right=strip_right,
        body_top=above,
        body_base=height - below,
        foot_top=height - below + 8,
        excerpt=shown,
        row_height=row_height,
        columns=columns,
        findings=tuple(told),
    )


def plate_layout(plate: SurveyPlate, theme: Theme, *, height: int | None = None) -> Layout:
    """Return the layout of a plate: its size, its lines of text and the ledger it has room for.

    Rows are 24 px high and the plate grows with them, and with the findings under them, up to 1440 px; then
    rows get lower, to 14 px; beyond that the ledger and fan are left out and the tracks take their room.
    Where not even one finding has room under the ledger, the foot tells how many there are.

    Parameters
    ----------
    height : int, optional
        Height of the plate where it is given from outside.
    """
    layout = _layout(plate, theme, plate.remarks, height)
    hidden = any(finding.words for finding in plate.findings) and not (
        layout.findings
        and layout.findings_top + findings_heights(layout.findings)[0] <= layout.body_base
    )
    if not hidden:
        return layout
    return _layout(plate, theme, (findings_count(plate.findings), *plate.remarks), height)
