"""The depth window as the core strip's grip changes it: resized, moved, zoomed, held to the hole.

Depths downward in the unit of the plate. Nothing here paints or knows of the mouse.
"""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.plates.depth_scale import FACTORS
from plumbwell.plates.strip_places import TOP

Window = tuple[float, float]
LEAST_METRES, LEAST_SHARE = 2.0, 1 / 500
# Shown beyond both ends of the hole when the whole of it is in view, as a share of its length.
AIR = 0.012


@dataclass(frozen=True, slots=True, kw_only=True)
class WindowLimits:
    """How far a depth window may go: from `low` to `high`, never shorter than `least`."""

    low: float
    high: float
    least: float

    @property
    def whole(self) -> Window:
        """The window that shows the whole hole."""
        return self.low, self.high

    def resized(self, window: Window, part: str, depth: float) -> Window:
        """Return a window whose top or base was drawn to a depth."""
        top, base = window
        if part == TOP:
            return min(max(depth, self.low), base - self.least), base
        return top, max(min(depth, self.high), top + self.least)

    def moved(self, window: Window, by: float) -> Window:
        """Return a window moved downward by a length, as far as there is hole."""
        return self._held(window[0] + by, window[1] - window[0])

    def zoomed(self, window: Window, about: float, factor: float) -> Window:
        """Return a window whose length is `factor` times as much, with a depth kept in its place."""
        length = window[1] - window[0]
        share = min(max((about - window[0]) / length, 0.0), 1.0)
        wanted = min(max(length * factor, self.least), self.high - self.low)
        return self._held(window[0] + share * (length - wanted), wanted)

    def about(self, window: Window, depth: float) -> Window:
        """Return a window of the same length with a depth in its middle."""
        length = window[1] - window[0]
        return self._held(depth - length / 2, length)

    def _held(self, top: float, length: float) -> Window:
        length = min(length, self.high - self.low)
        top = min(max(top, self.low), self.high - length)
        return top, top + length


def window_limits(depth_range: Window, unit: str) -> WindowLimits:
    """Return the limits of windows in a hole: the hole and a little air, at least 2 m or a 500th of it."""
    low, high = depth_range
    length = high - low
    least = max(LEAST_METRES / FACTORS.get(unit, 1.0), LEAST_SHARE * length)
    return WindowLimits(low=low - AIR * length, high=high + AIR * length, least=min(least, length))
