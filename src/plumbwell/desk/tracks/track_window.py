"""Where the depth window of the tracks may lie: panned, zoomed about a depth, held near the measured range.

Depths grow downward, in the unit of the depth axis. No Qt.
"""

from __future__ import annotations

from plumbwell.plates.depth_scale import FOOT

Window = tuple[float, float]
LEAST_METRES, LEAST_FEET = 0.5, 1.6
# Air above and below the measured range when all of it is shown, as a part of its length.
AIR = 0.012


def least_length(unit: str) -> float:
    """Return the shortest window in a unit: 0.5 m or 1.6 ft."""
    return LEAST_FEET if unit == FOOT else LEAST_METRES


def held(window: Window, measured: Window, unit: str) -> Window:
    """Return a window kept near the measured range.

    It reaches beyond the range by at most half its own length and half the length of the range, and is never shorter
    than 0.5 m or 1.6 ft.
    """
    span = max(measured[1] - measured[0], least_length(unit))
    length = min(max(window[1] - window[0], least_length(unit)), 2 * span)
    over = min(length, span) / 2
    middle = (window[0] + window[1]) / 2
    low, high = measured[0] - over + length / 2, measured[1] + over - length / 2
    middle = min(max(middle, low), high) if low <= high else (measured[0] + measured[1]) / 2
    return middle - length / 2, middle + length / 2


def zoomed(window: Window, factor: float, depth: float, measured: Window, unit: str) -> Window:
    """Return a window `factor` times as long with one depth at the same place of it, held near the measured range."""
    top, base = window
    span = max(measured[1] - measured[0], least_length(unit))
    length = min(max((base - top) * factor, least_length(unit)), 2 * span)
    upper = depth - (depth - top) / (base - top) * length
    return held((upper, upper + length), measured, unit)


def whole_window(measured: Window, unit: str) -> Window:
    """Return the window that shows the whole measured range with a little air."""
    air = AIR * (measured[1] - measured[0])
    return held((measured[0] - air, measured[1] + air), measured, unit)
