"""A log as a plate shows it: samples in order of depth, with gaps, quick to cut to a depth window.

Depths and values in the units of people. The longest logs have a million samples, so nothing here walks over
samples one by one; what a painter needs of them is gathered in `plumbwell.plates.polyline`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from plumbwell.survey.column import Array, Index, frozen, frozen_index


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LogCurve:
    """A log.

    Parameters
    ----------
    depth : (n,) array
        Depths of the samples, finite and ascending; equal ones are allowed.
    value : (n,) array
        Values; NaN makes a gap.
    runs : (k, 2) array
        Made here: first and past-the-last sample of each stretch without a gap.
    low, high : float
        Made here: least and greatest value, NaN where there is none.

    Raises
    ------
    ValueError
        Depths and values are not equally many, or depths are not ascending.
    """

    depth: Array
    value: Array
    runs: Index = field(init=False, repr=False)
    low: float = field(init=False)
    high: float = field(init=False)

    def __post_init__(self) -> None:
        depth, value = frozen(self.depth), frozen(self.value)
        if depth.ndim != 1 or depth.shape != value.shape:
            raise ValueError(f"{depth.shape} depths for {value.shape} values of a log")
        if not np.isfinite(depth).all() or (np.diff(depth) < 0).any():
            raise ValueError("depths of a log are finite and ascending")
        known = np.isfinite(value)
        edges = np.flatnonzero(np.diff(np.concatenate([[False], known, [False]])))
        made = {
            "depth": depth,
            "value": value,
            "runs": frozen_index(edges.reshape(-1, 2)),
            "low": float(np.nanmin(value)) if known.any() else float("nan"),
            "high": float(np.nanmax(value)) if known.any() else float("nan"),
        }
        for name, content in made.items():
            object.__setattr__(self, name, content)

    @classmethod
    def of(cls, depths: Sequence[float] | Array, values: Sequence[float | None] | Array) -> LogCurve:
        """Return the log of samples in any order; None and NaN are gaps.

        A sample without a depth leaves a gap where it stood.
        """
        depth = np.array(depths, dtype=np.float64)
        value = np.array(values, dtype=np.float64)  # None becomes NaN
        value[~np.isfinite(value)] = np.nan
        placed = np.isfinite(depth)
        if not placed.all():
            value = np.where(placed, value, np.nan)
            before = np.maximum.accumulate(np.where(placed, np.arange(len(depth)), -1))
            depth, value = depth[before][before >= 0], value[before >= 0]
        if (np.diff(depth) < 0).any():
            order = np.argsort(depth, kind="stable")
            depth, value = depth[order], value[order]
        return cls(depth=depth, value=value)

    @property
    def known(self) -> bool:
        """Return whether there is a value anywhere."""
        return bool(len(self.runs))

    def span(self, top: float, base: float) -> tuple[int, int]:
        """Return the first sample at or below a depth, and the one past the last at or above another."""
        return (
            int(np.searchsorted(self.depth, top, side="left")),
            int(np.searchsorted(self.depth, base, side="right")),
        )

    def runs_between(self, first: int, last: int) -> list[tuple[int, int]]:
        """Return the stretches without a gap, cut to the samples from `first` to before `last`."""
        if first >= last:
            return []
        some = self.runs[
            np.searchsorted(self.runs[:, 1], first, side="right") : np.searchsorted(self.runs[:, 0], last)
        ]
        return [(max(begin, first), min(end, last)) for begin, end in some.tolist()]

    def at(self, depth: float) -> float | None:
        """Return the value at a depth, linear between its neighbours; None in a gap and outside the log."""
        below = int(np.searchsorted(self.depth, depth, side="left"))
        if below == len(self.depth):
            return None
        if self.depth[below] == depth:
            value = float(self.value[below])
        elif below == 0:
            return None
        else:
            (z0, z1), (v0, v1) = self.depth[below - 1 : below + 1], self.value[below - 1 : below + 1]
            value = float(v0 + (depth - z0) / (z1 - z0) * (v1 - v0))
        return value if np.isfinite(value) else None
