"""A well log beside the survey: its density curve and what is stated about it."""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.survey.column import Column


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class DensityLog:
    """A density log, (n,) each, depth rising.

    Parameters
    ----------
    file, curve : str
    depth : Column
        Measured depth as logged, m, from the log's own datum.
    density : Column
        kg/m3, NaN where missing.
    caliper, correction : Column or None
        m and kg/m3.
    datum_height : float
        Zero of the log's depth above the collar, m.
    depth_shift : float
        Added to the log's depth, m.
    minimum_coverage : float
        Share of an interval that must be covered for a mean.
    """

    file: str
    curve: str
    depth: Column
    density: Column
    caliper: Column | None = None
    correction: Column | None = None
    datum_height: float
    depth_shift: float = 0.0
    minimum_coverage: float = 0.8
