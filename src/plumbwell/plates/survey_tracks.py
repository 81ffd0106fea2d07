"""The tracks of a survey's plate: gravity, what is left over, density with log, difference.

Turns the values of a plate into tracks with their value scales; paints nothing.
"""

from __future__ import annotations

from plumbwell.plates.numbers import column_decimals
from plumbwell.plates.plate import DENSITY_UNIT, SurveyPlate
from plumbwell.plates.track import Point, Step, Track, value_range

ANYTHING = (float("-inf"), float("inf"))
PLAUSIBLE_DENSITY = (1.0, 3.6)
PLAUSIBLE_DIFFERENCE = (-0.4, 0.4)
LOG_TAIL = 0.02
MOST_STRETCH = 1.4


def _station_track(plate: SurveyPlate, *, anomaly: bool, weight: float) -> Track | None:
    points = []
    for station in sorted(plate.stations, key=lambda station: station.depth):
        value, sd = (
            (station.anomaly, station.anomaly_sd) if anomaly else (station.gravity, station.gravity_sd)
        )
        if value is not None:
            points.append(Point(depth=station.depth, value=value, sd=sd, part=station.part))
    if not points:
        return None
    values, sds = [point.value for point in points], [point.sd for point in points]
    low, high = value_range(values, sds, least_span=0.02, plausible=ANYTHING)
    return Track(
        title=plate.anomaly_label if anomaly else plate.gravity_label,
        unit=plate.gravity_unit,
        low=low,
        high=high,
        weight=weight,
        points=tuple(points),
        decimals=column_decimals(sds, default=3),
        signed=anomaly,
    )


def _density_range(plate: SurveyPlate, steps: tuple[Step, ...]) -> tuple[float, float] | None:
    """Return ends of the density scale: with the whole log in view unless that stretches the scale much.

    Then the least and greatest 2 % of the log have no say, and what leaves the scale gets a wedge.
    """
    top, base = plate.depth_range
    log = sorted(
        value
        for depth, value in zip(plate.log_depths, plate.log_values, strict=True)
        if value is not None and top <= depth <= base
    )
    if not (steps or log):
        return None
    tail = int(LOG_TAIL * len(log))
    ranges = []
    for kept in (log, log[tail : len(log) - tail]):
        values = [step.value for step in steps] + kept[:1] + kept[-1:]
        sds = [step.sd for step in steps] + [None] * len(kept[:1] + kept[-1:])
        ranges.append(value_range(values, sds, least_span=0.2, plausible=PLAUSIBLE_DENSITY))
    whole, usual = ranges
    return whole if whole[1] - whole[0] <= MOST_STRETCH * (usual[1] - usual[0]) else usual


def _density_track(plate: SurveyPlate) -> Track | None:
    steps = tuple(
        Step(top=interval.top, base=interval.base, value=interval.density, sd=interval.sd)
        for interval in plate.intervals
        if interval.density is not None
    )
    ends = _density_range(plate, steps)
    if ends is None:
        return None
    log = any(value is not None for value in plate.log_values)
    named = bool(steps) and log
    return Track(
        title="density",
        unit=DENSITY_UNIT,
        low=ends[0],
        high=ends[1],
        weight=2.0,
        steps=steps,
        line_depths=plate.log_depths,
        line_values=plate.log_values,
        decimals=column_decimals([step.sd for step in steps], default=3),
        step_name="gravity" if named else "",
        line_name="log" if log else "",
    )


def _difference_track(plate: SurveyPlate) -> Track | None:
    steps = tuple(
        Step(top=interval.top, base=interval.base, value=interval.difference, sd=interval.difference_sd)
        for interval in plate.intervals
        if interval.difference is not None
    )
    if not steps:
        return None
    sds = [step.sd for step in steps]
    low, high = value_range(
        [step.value for step in steps] + [0.0], [*sds, None], least_span=0.1, plausible=PLAUSIBLE_DIFFERENCE
    )
    return Track(
        title="difference",
        unit=DENSITY_UNIT,
        low=low,
        high=high,
        steps=steps,
        decimals=column_decimals(sds, default=3),
        signed=True,
    )


def survey_tracks(plate: SurveyPlate, *, wide: bool) -> list[Track]:
    """Return the tracks of a plate that have something to show, in their order from the left.

    Parameters
    ----------
    plate : SurveyPlate
    wide : bool
        There is room for gravity beside what is left over; without it gravity stands only where nothing is
        known to be left over.
    """
    gravity = _station_track(plate, anomaly=False, weight=0.75)
    anomaly = _station_track(plate, anomaly=True, weight=1.0)
    first = [gravity, anomaly] if wide or anomaly is None else [anomaly]
    tracks = [*first, _density_track(plate), _difference_track(plate)]
    return [track for track in tracks if track is not None]
