"""What a survey's plate shows, as plain values in the units of people.

Depths in `depth_unit`, gravity in `gravity_unit`, densities in g/cm3; plain floats, strings and
tuples, no arrays but in the log. Standard deviations are one standard deviation; drawn bars and bands reach
`Theme.reach` of them.
"""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.plates.log_curve import LogCurve

SEVERITIES = ("note", "look", "error")
DENSITY_UNIT = "g/cm\u00b3"


@dataclass(frozen=True, slots=True, kw_only=True)
class PlateInterval:
    """One interval and its density.

    Parameters
    ----------
    number : int
        As counted in the survey's tables.
    top, base : float
        Depths, top less than base.
    density, sd : float or None
        Density and its own standard deviation; None where unknown.
    common_sd : float or None
        Standard deviation of what all intervals share; not part of `sd`.
    slab : float or None
        Density by the slab form.
    log : float or None
        Mean log density over the interval.
    difference, difference_sd, ratio : float or None
        Density less log, its standard deviation, and their ratio.
    flagged : bool
        Wants a look.
    from_prior : bool
        The density rests on the prior alone.
    """

    number: int
    top: float
    base: float
    density: float | None = None
    sd: float | None = None
    common_sd: float | None = None
    slab: float | None = None
    log: float | None = None
    difference: float | None = None
    difference_sd: float | None = None
    ratio: float | None = None
    flagged: bool = False
    from_prior: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class PlateStation:
    """One station: its label, depth (above ground negative), gravity and what is left of it.

    Gravity of stations with unlike `part` has no common level: no observation joins them.
    """

    label: str
    depth: float
    gravity: float | None = None
    gravity_sd: float | None = None
    anomaly: float | None = None
    anomaly_sd: float | None = None
    part: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class PlateFinding:
    """One finding: severity "note", "look" or "error", its depth if it has one, and words for the plate."""

    severity: str
    depth: float | None = None
    words: str = ""

    def __post_init__(self) -> None:
        if self.severity not in SEVERITIES:
            raise ValueError(f"severity {self.severity!r} is none of {', '.join(SEVERITIES)}")


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class SurveyPlate:
    """Everything that the plate of one reduced survey shows.

    Parameters
    ----------
    title, subtitle : str
        Name of the survey; what it is in a few words ("60 stations in 1 440 m").
    depth_label, depth_unit : str
        What depth is ("depth", "MD", "TVD", "chainage") and its unit ("m", "ft").
    intervals : tuple of PlateInterval
        In order of depth; they may leave gaps and must not overlap.
    stations : tuple of PlateStation
        In any order.
    markers : tuple of (str, float)
        Names of tops and their depths.
    log : LogCurve or None
        The density log.
    openings, waters : tuple of (float, float)
        Depths from and to where the hole or drift lies in a void or in water.
    findings : tuple of PlateFinding
    remarks : tuple of str
        For the foot of the plate: recipe in words, datum, F, reference, program version.
    caution : str or None
        A caution in the text size, framed by rules.
    gravity_label, gravity_unit, anomaly_label : str
        Titles of the gravity tracks; gravity without an absolute tie is labelled as such by the caller.
    """

    title: str
    subtitle: str = ""
    depth_label: str = "depth"
    depth_unit: str = "m"
    intervals: tuple[PlateInterval, ...] = ()
    stations: tuple[PlateStation, ...] = ()
    markers: tuple[tuple[str, float], ...] = ()
    log: LogCurve | None = None
    openings: tuple[tuple[float, float], ...] = ()
    waters: tuple[tuple[float, float], ...] = ()
    findings: tuple[PlateFinding, ...] = ()
    remarks: tuple[str, ...] = ()
    caution: str | None = None
    gravity_label: str = "gravity"
    gravity_unit: str = "mGal"
    anomaly_label: str = "left over"

    @property
    def depth_range(self) -> tuple[float, float]:
        """Return the least and greatest depth measured: of stations and intervals, never of equal length."""
        depths = [station.depth for station in self.stations]
        depths += [edge for interval in self.intervals for edge in (interval.top, interval.base)]
        if not depths:
            depths = [depth for _, depth in self.markers] or [0.0]
        low, high = min(depths), max(depths)
        return (low, high) if high > low else (low - 5.0, high + 5.0)

    @property
    def names_in_view(self) -> tuple[tuple[str, float], ...]:
        """Return names and tops of the layers in the depth range, in order of depth.

        The layer that the range begins in has its name at the beginning of the range.
        """
        low, high = self.depth_range
        ordered = sorted(self.markers, key=lambda marker: marker[1])
        above = [name for name, depth in ordered if depth < low][-1:]
        inside = [(name, depth) for name, depth in ordered if low <= depth <= high]
        if above and not (inside and inside[0][1] == low):
            inside.insert(0, (above[0], low))
        return tuple(inside)

    @property
    def has_density(self) -> bool:
        """Return whether any interval has a density."""
        return any(interval.density is not None for interval in self.intervals)

    @property
    def has_log(self) -> bool:
        """Return whether there is a log value anywhere."""
        return (self.log is not None and self.log.known) or any(
            interval.log is not None for interval in self.intervals
        )
