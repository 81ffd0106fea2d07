"""Tracks side by side: their widths, heads, and the grid that runs through all of them.

Grid lines and markers run across all tracks and the gaps between them, so they are painted once.
"""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtGui import QPainter

from plumbwell.plates.axis import Frame, head_height, title_baseline, unit_baseline, value_ticks
from plumbwell.plates.lettering import draw_text, text_width
from plumbwell.plates.numbers import number
from plumbwell.plates.painting import hairline_across, hairline_down
from plumbwell.plates.shapes import dots_across
from plumbwell.plates.theme import Theme
from plumbwell.plates.track import Track

GAP = 12
AFTER_TITLE = 5
WIDEST_TITLE = 190
BASE_WORDS = "+\u00a0"
BASE_ROOM = 26
"""Px beside what the numbers count from that are left to the curve."""


def track_gap(theme: Theme) -> int:
    """Return the px between two tracks: 12, grown with the text."""
    return theme.px(GAP)


def least_widths(theme: Theme, tracks: Sequence[Track]) -> list[float]:
    """Return the width in px at which each track has room for its title, and for what its numbers count from.

    A very long title has no say."""
    return [
        max(
            min(
                text_width(theme, "emphasis", track.title)
                + text_width(theme, "small", track.unit)
                + theme.px(AFTER_TITLE + 3),
                theme.px(WIDEST_TITLE),
            ),
            text_width(theme, "small", base_words(track)) + theme.px(BASE_ROOM) if track.counted_from else 0.0,
        )
        for track in tracks
    ]


def track_widths(theme: Theme, tracks: Sequence[Track], total: float) -> list[float]:
    """Return the width of each track: by weight, but wide enough for its title unless that is very long.

    Parameters
    ----------
    theme : Theme
    tracks : sequence of Track
    total : float
        Width of all together in px, gaps not counted; where it is too little for the titles, all have less.
    """
    least = least_widths(theme, tracks)
    if sum(least) > total:
        return [width * max(total, 1.0) / sum(least) for width in least]
    held: set[int] = set()
    while True:
        free = [index for index in range(len(tracks)) if index not in held]
        part = (total - sum(least[index] for index in held)) / max(
            sum(tracks[index].weight for index in free), 1e-9
        )
        narrow = {index for index in free if tracks[index].weight * part < least[index]}
        if not narrow:
            return [
                least[index] if index in held else tracks[index].weight * part for index in range(len(tracks))
            ]
        held |= narrow


def track_frames(theme: Theme, tracks: Sequence[Track], frame: Frame) -> list[Frame]:
    """Return the frame of each track: side by side in a frame, on whole px, with gaps between."""
    gap = track_gap(theme)
    frames, left = [], frame.left
    for width in track_widths(theme, tracks, frame.right - frame.left - gap * (len(tracks) - 1)):
        right = left + width
        frames.append(frame.across(float(int(left)), float(int(right))))
        left = right + gap
    return frames


def names_track(tracks: Sequence[Track]) -> int:
    """Return the number of the track in which the names of layers stand: that of the greatest weight."""
    return max(range(len(tracks)), key=lambda index: tracks[index].weight)


def draw_grid(
    painter: QPainter,
    frame: Frame,
    theme: Theme,
    *,
    depths: Sequence[float],
    markers: Sequence[float],
    ground: bool,
) -> None:
    """Draw grid lines at numbered depths and dotted marker lines across a frame; with `ground` one at 0."""
    for depth in depths:
        if frame.depth_top < depth < frame.depth_base:
            hairline_across(
                painter, frame.left, frame.right, frame.y(depth), theme.colour("hair"), theme.hairline
            )
    for depth in markers:
        if frame.depth_top < depth < frame.depth_base:
            dots = dots_across(frame.left, frame.right, frame.y(depth))
            painter.fillPath(dots, theme.colour("strong"))
    if ground and frame.depth_top < 0 < frame.depth_base:
        hairline_across(
            painter, frame.left, frame.right, frame.y(0.0), theme.colour("strong"), theme.hairline
        )


def base_words(track: Track) -> str:
    """Return what the tick numbers of a track count from, as "+ 981 400"; empty where that is 0."""
    return f"{BASE_WORDS}{number(track.counted_from, 0)}" if track.counted_from else ""


def base_in_head(theme: Theme, track: Track, frame: Frame) -> bool:
    """Return whether the head of a track has room for what its numbers count from, after title and unit."""
    words = f"{track.unit} {base_words(track)}"
    title = text_width(theme, "emphasis", track.title) + theme.px(AFTER_TITLE)
    return bool(track.counted_from) and title + text_width(theme, "small", words) <= frame.right - frame.left


def draw_track_head(painter: QPainter, track: Track, frame: Frame, theme: Theme) -> None:
    """Draw a track's title, unit, tick numbers and ticks above its frame, and its value grid inside it.

    The ink line under the head is drawn once for the whole plate, so that it is continuous.
    """
    unit = f"{track.unit} {base_words(track)}" if base_in_head(theme, track, frame) else track.unit
    head, gap = frame.top - head_height(theme), theme.px(AFTER_TITLE)
    baseline = head + title_baseline(theme)
    unit_width = text_width(theme, "small", unit)
    box = draw_text(
        painter,
        theme,
        track.title,
        x=frame.left,
        baseline=baseline,
        face="emphasis",
        room=(frame.left, frame.right - unit_width - gap),
    )
    draw_text(
        painter,
        theme,
        unit,
        x=box.right() + gap,
        baseline=baseline,
        face="small",
        role="muted",
        # Half a px more than it needs, so that no rounding shortens it.
        room=(box.right() + gap, max(frame.right + 0.5, box.right() + gap)),
    )
    width = frame.right - frame.left
    ticks = value_ticks(
        theme, track.low, track.high, left=frame.left, width=width, counted_from=track.counted_from
    )
    for tick, words, middle in ticks:
        x = track.x(tick, frame)
        draw_text(
            painter,
            theme,
            words,
            x=middle,
            baseline=head + unit_baseline(theme),
            face="small",
            role="muted",
            align="middle",
        )
        hairline_down(painter, x, frame.top - 5, frame.top - 1, theme.colour("ink"))
        zero = track.signed and tick == 0
        hairline_down(
            painter, x, frame.top, frame.base, theme.colour("strong" if zero else "hair"), theme.hairline
        )
