"""Long curves made fit for painting: cut at the frame's edges, and thinned to what px can show.

No painter is asked to clip, since an SVG of the small profile knows no clipping. Points are (x, y) in px.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from math import isfinite
from typing import TYPE_CHECKING

from plumbwell.plates.axis import Frame

if TYPE_CHECKING:
    from plumbwell.plates.track import Track

Place = tuple[float, float]


def _cut_segment(start: Place, end: Place, frame: Frame) -> tuple[Place, Place] | None:
    """Return the part of a segment inside the frame, or None.

    Liang, Y.-D. and Barsky, B. A., 1984, A new concept and method for line clipping.
    """
    (x0, y0), (dx, dy) = start, (end[0] - start[0], end[1] - start[1])
    enter, leave = 0.0, 1.0
    for delta, room in (
        (-dx, x0 - frame.left),
        (dx, frame.right - x0),
        (-dy, y0 - frame.top),
        (dy, frame.base - y0),
    ):
        if delta == 0:
            if room < 0:
                return None
        elif delta < 0:
            enter = max(enter, room / delta)
        else:
            leave = min(leave, room / delta)
    if enter > leave:
        return None
    return (x0 + enter * dx, y0 + enter * dy), (x0 + leave * dx, y0 + leave * dy)


def inside_pieces(places: Sequence[Place], frame: Frame) -> list[list[Place]]:
    """Return the pieces of a line that lie inside a frame, cut at its edges."""
    pieces: list[list[Place]] = []
    for start, end in zip(places, places[1:], strict=False):
        part = _cut_segment(start, end, frame)
        if part is None:
            continue
        if pieces and pieces[-1][-1] == part[0]:
            pieces[-1].append(part[1])
        else:
            pieces.append([*part])
    return pieces


@lru_cache(maxsize=8)
def thinned_pieces(
    depths: tuple[float, ...], values: tuple[float | None, ...], track: Track, frame: Frame
) -> tuple[tuple[Place, ...], ...]:
    """Return a log as lines in px: broken at its gaps, and with at most four places in each half px row.

    Of the samples that share half a px the first, least, greatest and last are kept, in their order, so no
    spike is lost. The last few logs are kept: one plate asks for the same pieces several times.
    """
    pieces: list[tuple[Place, ...]] = []
    piece: list[Place] = []
    bin_places: list[Place] = []
    bin_row: int | None = None

    def close_bin() -> None:
        if len(bin_places) > 4:
            order = range(len(bin_places))
            least = min(order, key=lambda index: bin_places[index][0])
            greatest = max(order, key=lambda index: bin_places[index][0])
            kept = sorted({0, least, greatest, len(bin_places) - 1})
            piece.extend(bin_places[index] for index in kept)
        else:
            piece.extend(bin_places)
        bin_places.clear()

    for depth, value in zip(depths, values, strict=True):
        if value is None or not isfinite(depth):
            close_bin()
            if len(piece) > 1:
                pieces.append(tuple(piece))
            piece = []
            bin_row = None
            continue
        place = (track.x(value, frame), frame.y(depth))
        row = int(place[1] * 2)
        if row != bin_row:
            close_bin()
            bin_row = row
        bin_places.append(place)
    close_bin()
    if len(piece) > 1:
        pieces.append(tuple(piece))
    return tuple(pieces)
