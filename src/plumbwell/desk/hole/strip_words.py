"""What the core strip says in words: its description for those who hear it, and what hovering over it tells."""

from __future__ import annotations

from collections.abc import Sequence

from plumbwell.plates.numbers import counted, number, with_sd
from plumbwell.plates.plate import DENSITY_UNIT, PlateInterval, SurveyPlate
from plumbwell.plates.strip_places import FindingMark

ROUND_FROM = 100.0  # units of depth of the whole hole from which the words do without decimals


def _number(plate: SurveyPlate, depth: float, upward: bool, decimals: int | None = None) -> str:
    low, high = plate.depth_range
    if decimals is None:
        decimals = 0 if high - low >= ROUND_FROM else 1
    return number(0.0 - depth if upward else depth, decimals)


def _span(plate: SurveyPlate, top: float, base: float, upward: bool) -> str:
    first, last = (_number(plate, depth, upward) for depth in (top, base))
    return f"{first} {plate.depth_unit}" if first == last else f"{first} to {last} {plate.depth_unit}"


def hole_words(plate: SurveyPlate, *, upward: bool) -> str:
    """Return what the hole is: its intervals or stations, its depths and its densities."""
    what = counted(len(plate.intervals), "interval") if plate.intervals else counted(len(plate.stations), "station")
    words = f"{what} {_span(plate, *plate.depth_range, upward)} {plate.depth_label}"
    known = [interval.density for interval in plate.intervals if interval.density is not None]
    return f"{words}, {number(min(known), 2)} to {number(max(known), 2)} {DENSITY_UNIT}" if known else words


def described(
    plate: SurveyPlate,
    hole: str,
    *,
    upward: bool,
    window: tuple[float, float],
    selected: Sequence[tuple[float, float]],
    stale: bool,
) -> str:
    """Return what a strip shows, in one sentence that begins with the words for the hole."""
    parts = [hole, f"window {_span(plate, *window, upward)}"]
    if selected:
        top, base = min(top for top, _ in selected), max(base for _, base in selected)
        parts.append(f"chosen {_span(plate, top, base, upward)}")
    if plate.findings:
        parts.append(counted(len(plate.findings), "finding"))
    if stale:
        parts.append("computing")
    return "; ".join(parts)


def finding_words(plate: SurveyPlate, mark: FindingMark) -> str:
    """Return the words of a mark's finding and of those that it stands for, one a line."""
    return "\n".join(plate.findings[index].words for index in (mark.finding, *mark.others))


def depth_words(plate: SurveyPlate, depth: float, *, upward: bool) -> str:
    """Return what lies at a depth: the layer, and the interval with its density."""
    lines = []
    above = [name for name, top in plate.names_in_view if top <= depth]
    if above:
        lines.append(above[-1])
    inside = next((one for one in plate.intervals if one.top <= depth <= one.base), None)
    if inside is not None:
        lines.append(_interval_words(plate, inside, upward))
    return "\n".join(lines)


def _interval_words(plate: SurveyPlate, interval: PlateInterval, upward: bool) -> str:
    first, last = (_number(plate, depth, upward, 1) for depth in (interval.top, interval.base))
    words = f"interval {interval.number}, {first} to {last} {plate.depth_unit} {plate.depth_label}"
    if interval.density is None:
        return f"{words}: density unknown"
    return f"{words}: {with_sd(interval.density, interval.sd)} {DENSITY_UNIT}"
