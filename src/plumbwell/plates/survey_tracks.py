"""The tracks of a survey's plate: gravity, what is left over, density with log, difference; effects and errors.

Turns values in the units of people into tracks with their value scales, for figure and window alike; paints nothing.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil, floor, log10, sqrt
from statistics import median

import numpy as np

from plumbwell.plates.numbers import column_decimals
from plumbwell.plates.plate import DENSITY_UNIT, SurveyPlate
from plumbwell.plates.track import EffectCurve, OriginBar, Point, Step, Track, value_range

ANYTHING = (float("-inf"), float("inf"))
PLAUSIBLE_DENSITY = (1.0, 3.6)
PLAUSIBLE_DIFFERENCE = (-0.4, 0.4)
LOG_TAIL = 0.02
MOST_STRETCH = 1.4
# Dashes of the curves of one track, in their order: solid, dashed, dotted, dash and dot.
CURVE_DASHES = ((), (6.0, 3.0), (1.5, 2.5), (7.0, 2.5, 1.5, 2.5))
FILLS = 4
OTHERS = "others"
MOST_USUAL, BAR_ROOM = 3.0, 1.2
LONG_NUMBERS = 1e4
"""From here on the numbers of a scale are too long for its ticks, and count from a round one."""


def _station_track(plate: SurveyPlate, *, anomaly: bool, weight: float, bars: float) -> Track | None:
    points = []
    for station in sorted(plate.stations, key=lambda station: station.depth):
        value, sd = (
            (station.anomaly, station.anomaly_sd) if anomaly else (station.gravity, station.gravity_sd)
        )
        if value is not None:
            points.append(Point(depth=station.depth, value=value, sd=sd, part=station.part))
    return point_track(
        points,
        title=plate.anomaly_label if anomaly else plate.gravity_label,
        unit=plate.gravity_unit,
        weight=weight,
        signed=anomaly,
        narrow=False,
        bars=bars,
    )


def round_below(low: float, high: float) -> float:
    """Return what the numbers of a scale count from: 0, or a round number below where they would be long."""
    if low < LONG_NUMBERS:
        return 0.0
    unit = 10.0 ** max(ceil(log10(high - low)), 2)
    return unit * floor(low / unit)


def point_track(
    points: Sequence[Point],
    *,
    title: str,
    unit: str,
    weight: float = 1.0,
    signed: bool = False,
    narrow: bool = True,
    bars: float = 2,
    least_span: float = 0.02,
) -> Track | None:
    """Return a track of one value a station, joined within each part; None without any point.

    Parameters
    ----------
    points : sequence of Point
        In order of depth.
    title, unit : str
    weight : float
    signed, narrow : bool
    bars : float
        Standard deviations that bars reach to each side; the scale holds them.
    least_span : float
        The value scale is at least this long.
    """
    if not points:
        return None
    values, sds = [point.value for point in points], [point.sd for point in points]
    low, high = value_range(values, sds, least_span=least_span, plausible=ANYTHING, bars=bars)
    return Track(
        title=title,
        unit=unit,
        low=low,
        high=high,
        weight=weight,
        points=tuple(points),
        decimals=column_decimals(sds, default=3),
        signed=signed,
        narrow=narrow,
        counted_from=round_below(low, high),
    )


def _density_steps(plate: SurveyPlate | None) -> tuple[Step, ...]:
    return tuple(
        Step(top=interval.top, base=interval.base, value=interval.density, sd=interval.sd)
        for interval in (plate.intervals if plate is not None else ())
        if interval.density is not None
    )


def _difference_steps(plate: SurveyPlate | None) -> tuple[Step, ...]:
    return tuple(
        Step(top=interval.top, base=interval.base, value=interval.difference, sd=interval.difference_sd)
        for interval in (plate.intervals if plate is not None else ())
        if interval.difference is not None
    )


def _density_range(
    plate: SurveyPlate, steps: tuple[Step, ...], beside: tuple[Step, ...], bars: float
) -> tuple[float, float] | None:
    """Return ends of the density scale: with the whole log in view unless that stretches the scale much.

    Then the least and greatest 2 % of the log have no say, and what leaves the scale gets a wedge.
    """
    log: list[float] = []
    if plate.log is not None:
        first, last = plate.log.span(*plate.depth_range)
        value = plate.log.value[first:last]
        log = np.sort(value[np.isfinite(value)]).tolist()
    if not (steps or log):
        return None
    tail = int(LOG_TAIL * len(log))
    ranges = []
    for kept in (log, log[tail : len(log) - tail]):
        others = [step.value for step in beside] + kept[:1] + kept[-1:]
        values = [step.value for step in steps] + others
        sds = [step.sd for step in steps] + [None] * len(others)
        ranges.append(value_range(values, sds, least_span=0.2, plausible=PLAUSIBLE_DENSITY, bars=bars))
    whole, usual = ranges
    return whole if whole[1] - whole[0] <= MOST_STRETCH * (usual[1] - usual[0]) else usual


def _density_track(plate: SurveyPlate, beside: SurveyPlate | None, bars: float, beside_name: str) -> Track | None:
    steps, others = _density_steps(plate), _density_steps(beside)
    ends = _density_range(plate, steps, others, bars)
    if ends is None:
        return None
    log = plate.log is not None and plate.log.known
    return Track(
        title="density",
        unit=DENSITY_UNIT,
        low=ends[0],
        high=ends[1],
        weight=2.0,
        steps=steps,
        beside=others,
        line=plate.log,
        decimals=column_decimals([step.sd for step in steps], default=3),
        step_name="gravity" if steps and log else "",
        beside_name=beside_name if others else "",
        line_name="log" if log else "",
    )


def _difference_track(plate: SurveyPlate, beside: SurveyPlate | None, bars: float) -> Track | None:
    steps, others = _difference_steps(plate), _difference_steps(beside)
    if not steps:
        return None
    sds = [step.sd for step in steps]
    free = [0.0, *(step.value for step in others)]
    low, high = value_range(
        [step.value for step in steps] + free,
        [*sds, *[None] * len(free)],
        least_span=0.1,
        plausible=PLAUSIBLE_DIFFERENCE,
        bars=bars,
    )
    return Track(
        title="difference",
        unit=DENSITY_UNIT,
        low=low,
        high=high,
        steps=steps,
        beside=others,
        decimals=column_decimals(sds, default=3),
        signed=True,
    )


def survey_tracks(
    plate: SurveyPlate,
    *,
    wide: bool,
    bars: float = 2,
    beside: SurveyPlate | None = None,
    beside_name: str = "",
) -> list[Track]:
    """Return the tracks of a plate that have something to show, in their order from the left.

    Parameters
    ----------
    plate : SurveyPlate
    wide : bool
        There is room for gravity beside what is left over; without it gravity stands only where nothing is
        known to be left over.
    bars : float
        Standard deviations that bars and bands reach to each side; the scales hold them.
    beside : SurveyPlate, optional
        The same survey by a second recipe: its steps are dashed.
    beside_name : str
        Name of that recipe, written at its densities.
    """
    gravity = _station_track(plate, anomaly=False, weight=0.75, bars=bars)
    anomaly = _station_track(plate, anomaly=True, weight=1.0, bars=bars)
    first = [gravity, anomaly] if wide or anomaly is None else [anomaly]
    tracks = [
        *first,
        _density_track(plate, beside, bars, beside_name),
        _difference_track(plate, beside, bars),
    ]
    return [track for track in tracks if track is not None]


Values = Sequence[float | None]


def _points(depths: Sequence[float], values: Values, sds: Values | None, parts: Sequence[int] | None) -> list[Point]:
    """Return the points of the stations that have a value, in order of depth."""
    rows = zip(depths, values, sds or [None] * len(depths), parts or [0] * len(depths), strict=True)
    known = [Point(depth=z, value=v, sd=sd, part=part) for z, v, sd, part in rows if v is not None]
    return sorted(known, key=lambda point: point.depth)


def large_terms_track(
    depths: Sequence[float],
    terms: Sequence[tuple[str, Values]],
    *,
    parts: Sequence[int] | None = None,
    title: str = "large terms",
    unit: str = "mGal",
    decimals: int = 3,
    weight: float = 1.0,
) -> Track | None:
    """Return one track with a named curve for each effect: the first solid, the others dashed; None without any.

    Parameters
    ----------
    depths : sequence of float
        Of the stations.
    terms : sequence of (str, sequence of float or None)
        Name of each effect and its value at each station, None where it has none.
    parts : sequence of int, optional
        Part of each station; only stations of one part are joined.
    title, unit : str
    decimals : int
        Of the values written in the track.
    weight : float
    """
    curves = []
    for number, (name, values) in enumerate(terms):
        points = _points(depths, values, None, parts)
        if points:
            dashes = CURVE_DASHES[number % len(CURVE_DASHES)]
            curves.append(EffectCurve(name=name, points=tuple(points), dashes=dashes))
    if not curves:
        return None
    values = [point.value for curve in curves for point in curve.points] + [0.0]
    ends = min(values), max(values)
    low, high = value_range(ends, [None, None], least_span=0.02, plausible=ANYTHING)
    return Track(
        title=title,
        unit=unit,
        low=low,
        high=high,
        weight=weight,
        lines=tuple(curves),
        decimals=decimals,
        signed=True,
        narrow=False,
    )


def origin_track(
    depths: Sequence[float],
    origins: Sequence[tuple[str, Values]],
    *,
    title: str = "sd",
    unit: str = "\u00b5Gal, by origin",
    decimals: int = 1,
    weight: float = 1.1,
) -> Track | None:
    """Return a track of stacked bars: the standard deviation of each station, shared by variance among its origins.

    The origin with the largest variance in the whole survey comes first. There are four fills: from the fourth on,
    origins are one, "others".

    Parameters
    ----------
    depths : sequence of float
        Of the stations.
    origins : sequence of (str, sequence of float or None)
        Name of each origin and its standard deviation at each station, in `unit`.
    title, unit : str
    decimals : int
    weight : float
    """
    variances = {name: [(sd or 0.0) ** 2 for sd in sds] for name, sds in origins}
    ordered = sorted((name for name in variances if sum(variances[name]) > 0), key=lambda name: -sum(variances[name]))
    if not ordered:
        return None
    if len(ordered) > FILLS:
        rest = ordered[FILLS - 1 :]
        variances[OTHERS] = [sum(row) for row in zip(*(variances[name] for name in rest), strict=True)]
        ordered = [*ordered[: FILLS - 1], OTHERS]
    bars = []
    for depth, *row in sorted(zip(depths, *(variances[name] for name in ordered), strict=True)):
        total = sum(row)
        if total > 0:
            bars.append(OriginBar(depth=depth, sd=sqrt(total), shares=tuple(part / total for part in row)))
    lengths = [bar.sd for bar in bars]
    usual = MOST_USUAL * median(lengths)
    # Beside the longest bar the crosshair has room for its number.
    high = BAR_ROOM * max(length for length in lengths if length <= usual)
    return Track(
        title=title,
        unit=unit,
        low=0.0,
        high=high,
        weight=weight,
        bars=tuple(bars),
        origins=tuple(ordered),
        decimals=decimals,
    )


def effect_tracks(
    depths: Sequence[float],
    *,
    large: Sequence[tuple[str, Values]] = (),
    small: Sequence[tuple[str, Values, Values | None]] = (),
    left_over: Values = (),
    left_over_sd: Values | None = None,
    origins: Sequence[tuple[str, Values]] = (),
    parts: Sequence[int] | None = None,
    left_over_label: str = "left over",
    unit: str = "mGal",
    sd_unit: str = "\u00b5Gal",
    bars: float = 2,
) -> list[Track]:
    """Return the tracks of the Reduction stage that have something to show: effects, left over, sd by origin.

    All sequences have one value a station, in the order of `depths`; None where a station has none.

    Parameters
    ----------
    depths : sequence of float
        Of the stations, downward, in any order.
    large : sequence of (str, values)
        Effects that share one track with a named curve each, as free air, shells, normal gravity; in `unit`.
    small : sequence of (str, values, sds or None)
        Effects that have a track of their own, as terrain; in `unit`.
    left_over, left_over_sd : values
        What is left over and its standard deviation; in `unit`.
    origins : sequence of (str, values)
        Standard deviation by origin; in `sd_unit`.
    parts : sequence of int, optional
        Part of each station: gravity of unlike parts has no common level and is not joined.
    left_over_label, unit, sd_unit : str
    bars : float
        Standard deviations that bars reach to each side.
    """
    tracks = [large_terms_track(depths, large, parts=parts, unit=unit)]
    for name, values, sds in small:
        points = _points(depths, values, sds, parts)
        tracks.append(
            point_track(points, title=name, unit=unit, weight=0.75, signed=True, narrow=False, bars=bars)
        )
    if left_over:
        points = _points(depths, left_over, left_over_sd, parts)
        tracks.append(
            point_track(points, title=left_over_label, unit=unit, weight=1.4, signed=True, bars=bars)
        )
    tracks.append(origin_track(depths, origins, unit=f"{sd_unit}, by origin"))
    return [track for track in tracks if track is not None]
