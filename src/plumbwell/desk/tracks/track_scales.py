"""Value scales of tracks that a person zoomed, kept while new values of the same track arrive. No Qt."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from plumbwell.plates.track import Track

# How far a scale may be stretched or cut, against the track's own.
MOST_STRETCH, LEAST_PART = 100.0, 1e-4


class ValueScales:
    """Ends of the value scale of tracks by title and unit, where they are not the tracks' own."""

    def __init__(self) -> None:
        self._ends: dict[tuple[str, str], tuple[float, float]] = {}
        self._own: dict[tuple[str, str], float] = {}

    def applied(self, tracks: Sequence[Track]) -> list[Track]:
        """Return tracks with their zoomed scales, where they have any."""
        found = []
        for track in tracks:
            key = (track.title, track.unit)
            self._own[key] = track.high - track.low
            ends = self._ends.get(key)
            found.append(track if ends is None else replace(track, low=ends[0], high=ends[1]))
        return found

    def zoom(self, track: Track, factor: float, value: float) -> None:
        """Make a track's scale `factor` times as long, with one value at the same place."""
        key = (track.title, track.unit)
        own = self._own.get(key, track.high - track.low)
        length = min(max((track.high - track.low) * factor, LEAST_PART * own), MOST_STRETCH * own)
        low = value - (value - track.low) / (track.high - track.low) * length
        self._ends[key] = (low, low + length)

    def fit(self, title: str | None = None) -> None:
        """Give the tracks of a title, or all, their own scale back."""
        self._ends = {} if title is None else {key: ends for key, ends in self._ends.items() if key[0] != title}
