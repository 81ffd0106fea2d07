"""Which depth is shown, and in which unit: measured depth, vertical depth or elevation, in metres or feet.

Inside the plates depth always grows downward. Elevation is therefore held as its negative and written with its own
sign; `DepthScale.number_of` is the one place that turns it.
"""

from __future__ import annotations

from dataclasses import dataclass

METRE, FOOT = "m", "ft"
MD, TVD, ELEVATION = "MD", "TVD", "elevation"
FACTORS = {METRE: 1.0, FOOT: 0.3048}


@dataclass(frozen=True, slots=True, kw_only=True)
class DepthScale:
    """Depth kind and unit of what is shown.

    Parameters
    ----------
    kind : str
        "MD", "TVD" or "elevation".
    unit : str
        "m" or "ft" (0.3048 m exactly).
    """

    kind: str = MD
    unit: str = METRE

    @property
    def factor(self) -> float:
        """Metres in one unit."""
        return FACTORS[self.unit]

    @property
    def upward(self) -> bool:
        """Whether the written numbers grow upward."""
        return self.kind == ELEVATION

    @property
    def label(self) -> str:
        """The kind as it stands over the depth axis."""
        return self.kind

    def number_of(self, downward: float) -> float:
        """The number that is written for a depth that grows downward, both in `unit`."""
        return -downward if self.upward else downward
