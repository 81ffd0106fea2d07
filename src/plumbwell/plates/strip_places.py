"""Where the parts of a core strip lie: its columns, the marks of its findings, chosen spans, the grip.

What paints the strip and what answers the mouse take their places from here. Lengths in px; depths grow downward.
Only the column of depth numbers grows with the text: bar, marks and core keep their size, so that names keep room.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from plumbwell.plates.axis import Frame
from plumbwell.plates.lettering import text_width
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import whole
from plumbwell.plates.plate import PlateFinding, PlateInterval
from plumbwell.plates.theme import Theme

NUMBERS_RIGHT, BAR_LEFT, FINDINGS_MIDDLE = 33, 38, 48
TICKS_LEFT, CORE_LEFT, NAMES_LEFT = 53, 60, 131
CORE_WIDTH = 56
UNKNOWN_DENSITY = 2.2
SLIVER = 1.5
MARK_GAP = 10.0
# The grip: how far its lines are felt, and where its vertical and its blocks stand from the right edge.
REACH = 5.0
BLOCK_WIDTH, BLOCK_HEIGHT = 5, 10
GRIP_RIGHT = 1
TOP, BASE, MOVE = "top", "base", "move"
GRAVITY = {"error": 0, "look": 1, "note": 2}


@dataclass(frozen=True, slots=True, kw_only=True)
class StripColumns:
    """The px columns of a strip: right edge of numbers, left edges of the rest, middle of the findings."""

    numbers_right: float
    bar: float
    findings: float
    ticks: float
    core: float
    names: float


def number_inset(theme: Theme, frame: Frame) -> float:
    """Return how far the strip is moved right so that its depths have room: none up to four figures at scale 1."""
    widest = max(
        text_width(theme, "small", number(frame.number_of(depth), 0)) for depth in (frame.depth_top, frame.depth_base)
    )
    return float(max(whole(widest) + 2, theme.px(NUMBERS_RIGHT)) - NUMBERS_RIGHT)


def strip_columns(theme: Theme, frame: Frame) -> StripColumns:
    """Return the columns of a strip in a frame whose depths are those of the whole hole."""
    left = frame.left + number_inset(theme, frame)
    return StripColumns(
        numbers_right=left + NUMBERS_RIGHT,
        bar=left + BAR_LEFT,
        findings=left + FINDINGS_MIDDLE,
        ticks=left + TICKS_LEFT,
        core=left + CORE_LEFT,
        names=left + NAMES_LEFT,
    )


def core_width(density: float) -> float:
    """Return how far the core stands out at a density in g/cm3, in px: from 6.1 at 1.6 to 63.1 at 3.2.

    Notes
    -----
    56 (0.30 + 0.70 (rho - 1.9) / 1.1), with rho held to 1.6 to 3.2.
    """
    held = min(max(density, 1.6), 3.2)
    return CORE_WIDTH * (0.30 + 0.70 * (held - 1.9) / 1.1)


def interval_width(interval: PlateInterval) -> float:
    """Return the width of the core in an interval, in whole px; a middling one where no density is known."""
    return float(whole(core_width(UNKNOWN_DENSITY if interval.density is None else interval.density)))


class Tops:
    """Px rows of tops among intervals: a station is seldom read just at a top.

    One a px from it stands for it, so that no sliver is left between.
    """

    def __init__(self, intervals: Sequence[PlateInterval], frame: Frame) -> None:
        self._frame = frame
        self._intervals = intervals
        self._tops = [interval.top for interval in intervals]
        self._bases = [interval.base for interval in intervals]
        self._edges = sorted({*self._tops, *self._bases})

    def at(self, depth: float) -> tuple[int, list[PlateInterval]]:
        """Return the px row of a top and the intervals that meet there."""
        place = bisect_left(self._edges, depth)
        near = self._edges[max(place - 1, 0) : place + 1]
        y = self._frame.y(depth)
        nearest = min(near, key=lambda edge: abs(self._frame.y(edge) - y), default=depth)
        at = nearest if abs(self._frame.y(nearest) - y) <= SLIVER else depth
        # Intervals are in order of depth and do not overlap.
        first, last = bisect_left(self._bases, at - 1e-6), bisect_right(self._tops, at + 1e-6)
        return whole(self._frame.y(at)), list(self._intervals[first:last])


@dataclass(frozen=True, slots=True, kw_only=True)
class FindingMark:
    """A mark beside the core: its px row, the finding it shows and the less grave ones it stands for."""

    y: float
    finding: int
    others: tuple[int, ...] = ()


def finding_marks(findings: Sequence[PlateFinding], frame: Frame) -> list[FindingMark]:
    """Return the marks of findings that have a depth; where marks would overlap, the gravest stands for all."""
    shown: list[tuple[float, list[int]]] = []
    order = sorted(range(len(findings)), key=lambda index: GRAVITY[findings[index].severity])
    for index in order:
        depth = findings[index].depth
        if depth is None or not frame.depth_top <= depth <= frame.depth_base:
            continue
        y = frame.y(depth)
        near = min(shown, key=lambda mark: abs(mark[0] - y), default=None)
        if near is not None and abs(near[0] - y) < MARK_GAP:
            near[1].append(index)
        else:
            shown.append((y, [index]))
    return [FindingMark(y=y, finding=indices[0], others=tuple(indices[1:])) for y, indices in shown]


def chosen_rows(frame: Frame, spans: Iterable[tuple[float, float]]) -> list[tuple[int, int]]:
    """Return the px rows of chosen depths, downward: touching spans are one, those outside the frame are left out."""
    rows: list[tuple[int, int]] = []
    for top, base in sorted(spans):
        if base < frame.depth_top or top > frame.depth_base:
            continue
        upper, lower = (whole(min(max(frame.y(depth), frame.top), frame.base)) for depth in (top, base))
        # A station between two chosen intervals, or another a px away, is part of their band.
        if rows and upper <= rows[-1][1]:
            rows[-1] = (rows[-1][0], max(rows[-1][1], lower))
        else:
            rows.append((upper, lower))
    return rows


def depth_at(frame: Frame, y: float) -> float:
    """Return the depth of a px row, held to the depths of the frame."""
    share = (y - frame.top) / (frame.base - frame.top)
    depth = frame.depth_top + share * (frame.depth_base - frame.depth_top)
    return min(max(depth, frame.depth_top), frame.depth_base)


def grip_rows(frame: Frame, window: tuple[float, float]) -> tuple[int, int]:
    """Return the px rows of the grip's lines: a window that reaches beyond the hole ends at the strip's ends."""
    upper, lower = (whole(min(max(frame.y(depth), frame.top), frame.base)) for depth in window)
    return upper, lower


def grip_right(frame: Frame) -> float:
    """Return the right edge of the grip's blocks."""
    return frame.right - GRIP_RIGHT


def grip_part(
    frame: Frame, columns: StripColumns, window: tuple[float, float], *, x: float, y: float
) -> str | None:
    """Return the part of the grip at a point: a line that resizes ("top", "base"), what moves it ("move"), or None.

    The lines are felt a few px to both sides, inward never so far that a small window could not be moved.
    """
    upper, lower = grip_rows(frame, window)
    if x < columns.bar - 4:
        return None
    inward = min(REACH, (lower - upper) / 4)
    above, below = y - upper, lower - y
    felt = [(abs(off), part) for off, part in ((above, TOP), (below, BASE)) if -REACH <= off <= inward]
    if felt:
        return min(felt)[1]
    return MOVE if x >= columns.names - 4 and above > 0 and below > 0 else None
