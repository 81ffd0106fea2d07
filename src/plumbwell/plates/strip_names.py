"""Names of tops beside the core strip: pushed apart, led to their boundary, shortened to the strip's width.

Lengths in px. Names are italic: a formation name is somebody's reading of the hole.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtGui import QPainter

from plumbwell.plates.axis import Frame
from plumbwell.plates.lettering import draw_text, elided, text_height
from plumbwell.plates.painting import hairline_across, smooth_line
from plumbwell.plates.plate import PlateInterval
from plumbwell.plates.strip_places import StripColumns, Tops, interval_width
from plumbwell.plates.theme import Theme

NAME_SPACING, NAME_BELOW = 16, 9
# A name that has less room than this tells nothing.
LEAST_ROOM = 28


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedName:
    """A name with its depth and place: middle row, and its leader from the core, with a kink where it was pushed."""

    words: str
    depth: float
    row: float
    boundary: int
    start: float
    kink: float | None


def spread_names(wanted: Sequence[float], *, spacing: float, top: float, base: float) -> list[float]:
    """Return rows near the wanted ones, in their order, at least `spacing` apart and inside top and base.

    Where the names do not all fit, they are evenly spread. Neighbours that would collide share the shift:
    each group of them keeps its mean.
    """
    if not wanted:
        return []
    if (len(wanted) - 1) * spacing > base - top:
        step = (base - top) / (len(wanted) - 1)
        return [top + index * step for index in range(len(wanted))]
    groups: list[tuple[float, int]] = []
    for row in wanted:
        centre, count = row, 1
        while groups:
            above_centre, above_count = groups[-1]
            if (
                centre - (count - 1) * spacing / 2 - (above_centre + (above_count - 1) * spacing / 2)
                >= spacing
            ):
                break
            groups.pop()
            # Mean of the wanted rows of both groups, each taken about its own middle.
            centre = (centre * count + above_centre * above_count) / (count + above_count)
            count += above_count
        half = (count - 1) * spacing / 2
        centre = min(max(centre, top + half), base - half)
        groups.append((centre, count))
    rows = [
        centre + (index - (count - 1) / 2) * spacing for centre, count in groups for index in range(count)
    ]
    for index in range(len(rows) - 2, -1, -1):
        rows[index] = min(rows[index], rows[index + 1] - spacing)
    return rows


def placed_names(
    frame: Frame,
    theme: Theme,
    columns: StripColumns,
    *,
    markers: Sequence[tuple[str, float]],
    intervals: Sequence[PlateInterval],
) -> list[PlacedName]:
    """Return the names of tops where they find room."""
    shown = list(markers)
    spacing, below = theme.px(NAME_SPACING), theme.px(NAME_BELOW)
    most = int((frame.base - frame.top) // spacing)
    if len(shown) > most > 0:
        # More names than lines: every so many-th top is named, all keep their boundary in the core.
        shown = [shown[index * len(shown) // most] for index in range(most)]
    cap = text_height(theme, "name")
    rows = spread_names(
        [frame.y(depth) + below for _, depth in shown],
        spacing=spacing,
        top=frame.top + cap / 2,
        base=frame.base - cap / 2,
    )
    tops = Tops(intervals, frame)
    # Leaders slant right of the widest core, so that none crosses the free edge.
    core_right = columns.core + max((interval_width(interval) for interval in intervals), default=0.0)
    places = []
    for (words, depth), row in zip(shown, rows, strict=True):
        boundary, meeting = tops.at(depth)
        widest = max((interval_width(interval) for interval in meeting), default=0.0)
        pushed = abs(row - frame.y(depth) - below) >= 0.5
        places.append(
            PlacedName(
                words=words,
                depth=depth,
                row=row,
                boundary=boundary,
                start=columns.core + widest + 4,
                kink=core_right + 6 if pushed else None,
            )
        )
    return places


def shown_name(theme: Theme, columns: StripColumns, name: PlacedName, right: float) -> str:
    """Return a name as far as it has room up to `right`: shortened, or nothing in a very narrow strip."""
    room = right - columns.names
    return elided(theme, "name", name.words, room) if room >= theme.px(LEAST_ROOM) else ""


def draw_leader(painter: QPainter, theme: Theme, columns: StripColumns, name: PlacedName) -> None:
    """Draw the leader from the core to a name."""
    end, strong = columns.names - 4, theme.colour("strong")
    hairline_across(painter, name.start, end if name.kink is None else name.kink, name.boundary, strong)
    if name.kink is not None:
        smooth_line(painter, ((name.kink, name.boundary + 0.5), (end + 1, name.row)), strong, 1)


def draw_name(
    painter: QPainter,
    theme: Theme,
    columns: StripColumns,
    name: PlacedName,
    *,
    right: float,
    window: tuple[float, float] | None,
    crossed: Sequence[float] = (),
) -> None:
    """Draw a name where it has room; outside the depth window it is muted.

    It clears the ground behind it where a line, whose px row is in `crossed`, would strike it through.
    """
    if not shown_name(theme, columns, name, right):
        return
    cap = text_height(theme, "name")
    inside = window is None or window[0] <= name.depth <= window[1]
    draw_text(
        painter,
        theme,
        name.words,
        x=columns.names,
        baseline=name.row + cap / 2,
        face="name",
        role="ink" if inside else "muted",
        room=(columns.names, right),
        knock_out=any(-cap / 2 - 2 <= row - name.row <= cap for row in crossed),
    )
