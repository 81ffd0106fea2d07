"""Where the sensor stood: measured depth to vertical depth, offsets, elevation, latitude and longitude.

Minimum curvature between the points of the path, vertical above the first, straight on beyond the
last. Inclination is measured from the local plumb line, so the summed vertical depth is already a
difference of height above the level surface: no drop for the Earth's curvature is added. East and
north count from the collar, vertical depth from the depth datum.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from plumbwell.earth.ellipsoid import WGS84, principal_radii
from plumbwell.survey.column import Array, Column, Input, Law, Setting, computed, frozen
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.places import Path
from plumbwell.survey.site import Site

BEYOND_PATH = 0.05
"""m; a sensor deeper than this below the last path point stands on the straight continuation."""

MINIMUM_CURVATURE = "minimum curvature; Taylor & Mason 1972, SPE 3362; Zaremba 1973, SPE 3664"


def dogleg(*, inclination_1: Array, azimuth_1: Array, inclination_2: Array, azimuth_2: Array) -> Array:
    """Angle between two directions of a hole, rad, precise also where it is tiny.

    Parameters
    ----------
    inclination_1, azimuth_1, inclination_2, azimuth_2 : (m,), rad

    Notes
    -----
    sin2(beta/2) = sin2((I2 - I1)/2) + sin I1 sin I2 sin2((A2 - A1)/2); the usual cosine form loses
    half of its digits at small angles.
    """
    square = (
        np.sin((inclination_2 - inclination_1) / 2) ** 2
        + np.sin(inclination_1) * np.sin(inclination_2) * np.sin((azimuth_2 - azimuth_1) / 2) ** 2
    )
    return 2.0 * np.arcsin(np.sqrt(np.clip(square, 0.0, 1.0)))


def _sine_ratio(share: Any, angle: Any) -> Any:
    """sin(share angle)/sin(angle), and its limit `share` where the angle is zero."""
    straight = angle == 0.0
    return np.where(straight, share, np.sin(share * angle) / np.where(straight, 1.0, np.sin(angle)))


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class WellPath:
    """The hole as a chain of circular arcs, m points; m = 0 is a vertical hole.

    Parameters
    ----------
    depth : (m,), m
        Measured depth of the points, rising.
    place : (m, 3), m
        Vertical depth below the datum, east, north of the points.
    tangent : (m, 3)
        Unit vectors down the hole: vertical, east, north.
    turn : (m,), rad
        Angle of the arc from each point to the next; 0 for the last, which goes straight on.
    length : (m,), m
        Length of the arc from each point to the next; 1 for the last.
    """

    depth: Array
    place: Array
    tangent: Array
    turn: Array
    length: Array

    @property
    def last_depth(self) -> float:
        """Measured depth of the last point, m; infinity for a hole without a path."""
        return float(self.depth[-1]) if len(self.depth) else np.inf

    def at(self, depth: Any) -> tuple[Any, Any, Any, Any]:
        """Vertical depth, east, north (m) and cosine of inclination at measured depths.

        Parameters
        ----------
        depth : float or (n,), m
            From the survey's datum, down the hole; NaN gives NaN.

        Returns
        -------
        tvd, east, north, cos_inclination : as depth

        Notes
        -----
        On an arc of angle b and length s, at the share f of it, with tangents t1 and t2 at its ends
        (Taylor & Mason 1972; here in products of sines, stable for b -> 0):
        place = 2 s sin(f b/2)/b [sin((2 - f) b/2) t1 + sin(f b/2) t2]/sin b,
        tangent = [sin((1 - f) b) t1 + sin(f b) t2]/sin b.
        """
        depth = np.asarray(depth, dtype=np.float64)
        nothing = np.where(np.isnan(depth), np.nan, 0.0)
        if not len(self.depth):
            return depth + 0.0, nothing, nothing + 0.0, nothing + 1.0
        arc = np.clip(np.searchsorted(self.depth, depth, side="right") - 1, 0, len(self.depth) - 1)
        above = depth < self.depth[0]
        share = (depth - self.depth[arc]) / self.length[arc]
        turn = self.turn[arc]
        end = np.minimum(arc + 1, len(self.depth) - 1)
        chord = self.length[arc] * share * np.sinc(share * turn / (2.0 * np.pi))
        first = chord * _sine_ratio(1.0 - share / 2.0, turn)
        second = chord * _sine_ratio(share / 2.0, turn)
        tvd, east, north = (
            place[arc] + first * tangent[arc] + second * tangent[end]
            for place, tangent in zip(self.place.T, self.tangent.T, strict=True)
        )
        fall = self.tangent[:, 0]
        cosine = _sine_ratio(1.0 - share, turn) * fall[arc] + _sine_ratio(share, turn) * fall[end]
        return (
            np.where(above, depth, tvd),
            np.where(above, 0.0, east),
            np.where(above, 0.0, north),
            np.where(above, 1.0, np.clip(cosine, -1.0, 1.0)),
        )


def well_path(path: Path | None, *, north_correction: float) -> WellPath:
    """The hole's path worked out from its deviation survey.

    Parameters
    ----------
    path : Path or None
        None: a vertical hole.
    north_correction : float, rad
        Added to the azimuths to make them true.

    Raises
    ------
    SurveyError
        When the hole turns back on itself between two points, so that no one arc joins them.

    Notes
    -----
    Step of minimum curvature, RF = (2/b) tan(b/2): dTVD = (ds/2)(cos I1 + cos I2) RF,
    dE = (ds/2)(sin I1 sin A1 + sin I2 sin A2) RF, dN with cos A.
    """
    if path is None or len(path.depth) == 0:
        none = frozen(np.empty(0))
        return WellPath(
            depth=none,
            place=frozen(np.empty((0, 3))),
            tangent=frozen(np.empty((0, 3))),
            turn=none,
            length=none,
        )
    depth, inclination = path.depth.values, path.inclination.values
    # Straight down or up there is no azimuth: a missing one there changes nothing.
    missing = np.isnan(path.azimuth.values) & (np.abs(np.sin(inclination)) < 1e-12)
    azimuth = np.where(missing, 0.0, path.azimuth.values) + north_correction
    turn = dogleg(
        inclination_1=inclination[:-1],
        azimuth_1=azimuth[:-1],
        inclination_2=inclination[1:],
        azimuth_2=azimuth[1:],
    )
    if np.any(turn > np.pi - 1e-6):
        row = int(np.argmax(turn))
        raise SurveyError(
            f"the path turns back on itself between {depth[row]:g} and {depth[row + 1]:g} m of depth;"
            " put a point between them or mend the inclinations"
        )
    tangent = np.column_stack(
        [np.cos(inclination), np.sin(inclination) * np.sin(azimuth), np.sin(inclination) * np.cos(azimuth)]
    )
    length = np.diff(depth)
    straight = turn == 0.0
    ratio = np.where(straight, 1.0, np.tan(turn / 2) / np.where(straight, 1.0, turn / 2))
    step = (length * ratio / 2)[:, None] * (tangent[:-1] + tangent[1:])
    start = np.array([[depth[0], 0.0, 0.0]])
    return WellPath(
        depth=frozen(depth),
        place=frozen(np.cumsum(np.vstack([start, step]), axis=0)),
        tangent=frozen(tangent),
        turn=frozen(np.append(turn, 0.0)),
        length=frozen(np.append(length, 1.0)),
    )


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Positions:
    """Where each sensor stood, (n,) each.

    Parameters
    ----------
    tvd : Column
        m below the depth datum.
    elevation : Column
        m above sea level.
    east, north : Column
        m from the collar.
    latitude, longitude : Column
        Geodetic, rad.
    cos_inclination : Column
        Change of vertical depth with measured depth; 1 at surveyed places.
    extrapolated : (n,) bool array
        True where the path ends more than 0.05 m above the sensor.
    """

    tvd: Column
    elevation: Column
    east: Column
    north: Column
    latitude: Column
    longitude: Column
    cos_inclination: Column
    extrapolated: NDArray[np.bool_]


def _surveyed_or(surveyed: Any, other: Any) -> Any:
    return np.where(np.isnan(surveyed), other, surveyed)


TVD = Law(
    "vertical depth",
    "TVD of the path at the sensor depth; at a surveyed place: datum elevation - elevation",
    MINIMUM_CURVATURE,
    lambda sensor_depth, surveyed_elevation, path, datum_elevation: _surveyed_or(
        datum_elevation - np.asarray(surveyed_elevation), path.at(sensor_depth)[0]
    ),
)
ELEVATION = Law(
    "elevation",
    "datum elevation - TVD; at a surveyed place as surveyed",
    "definition",
    lambda tvd, surveyed_elevation, datum_elevation: _surveyed_or(surveyed_elevation, datum_elevation - tvd),
)
EAST = Law(
    "east of the collar",
    "east of the path at the sensor depth; at a surveyed place as surveyed",
    MINIMUM_CURVATURE,
    lambda sensor_depth, surveyed_east, path: _surveyed_or(surveyed_east, path.at(sensor_depth)[1]),
)
NORTH = Law(
    "north of the collar",
    "north of the path at the sensor depth; at a surveyed place as surveyed",
    MINIMUM_CURVATURE,
    lambda sensor_depth, surveyed_north, path: _surveyed_or(surveyed_north, path.at(sensor_depth)[2]),
)
COS_INCLINATION = Law(
    "cosine of inclination",
    "cos I of the arc at the sensor depth; 1 at a surveyed place",
    MINIMUM_CURVATURE,
    lambda sensor_depth, surveyed_elevation, path: np.where(
        np.isnan(surveyed_elevation), path.at(sensor_depth)[3], 1.0
    ),
)
LATITUDE = Law(
    "latitude",
    "latitude of the collar + north/(M + h)",
    "M radius of the meridian at the collar, h its ellipsoidal height; Heiskanen & Moritz 1967",
    lambda north, collar_latitude, meridian_radius: collar_latitude + north / meridian_radius,
)
LONGITUDE = Law(
    "longitude",
    "longitude of the collar + east/((N + h) cos latitude)",
    "N radius of the prime vertical at the collar, h its ellipsoidal height; Heiskanen & Moritz 1967",
    lambda east, collar_longitude, parallel_radius: collar_longitude + east / parallel_radius,
)


def positions(
    *, sensor_depth: Column, east: Column, north: Column, elevation: Column, path: WellPath, site: Site
) -> Positions:
    """Positions of sensors on the path and at surveyed places.

    Parameters
    ----------
    sensor_depth : Column, (n,), m
        Measured depth of the sensor from the datum; not used at surveyed places.
    east, north, elevation : Column, (n,), m
        As surveyed; NaN where the sensor is on the path.
    path : WellPath
    site : Site
    """
    on_path = Setting(key="path", value=path, origin="path.csv" if len(path.depth) else "vertical hole")
    datum = Setting(
        key="datum_elevation",
        value=site.datum_elevation,
        unit="m",
        origin="survey.toml, collar_elevation + depth_datum_height",
    )
    depth_input, path_input = Input("sensor_depth", sensor_depth), Input("path", on_path)
    datum_input, surveyed = Input("datum_elevation", datum), Input("surveyed_elevation", elevation)
    tvd = computed("tvd", "m", TVD, depth_input, surveyed, path_input, datum_input)
    column_east = computed("east", "m", EAST, depth_input, Input("surveyed_east", east), path_input)
    column_north = computed("north", "m", NORTH, depth_input, Input("surveyed_north", north), path_input)
    meridian, vertical = principal_radii(site.latitude, WGS84)
    collar_height = site.collar_elevation + site.geoid_height
    of_site = "survey.toml, [site]"
    latitude = computed(
        "latitude",
        "rad",
        LATITUDE,
        Input("north", column_north),
        Input("collar_latitude", Setting(key="latitude", value=site.latitude, unit="rad", origin=of_site)),
        Input(
            "meridian_radius", Setting(key="meridian_radius", value=float(meridian) + collar_height, unit="m")
        ),
    )
    parallel = (float(vertical) + collar_height) * np.cos(site.latitude)
    longitude = computed(
        "longitude",
        "rad",
        LONGITUDE,
        Input("east", column_east),
        Input("collar_longitude", Setting(key="longitude", value=site.longitude, unit="rad", origin=of_site)),
        Input("parallel_radius", Setting(key="parallel_radius", value=float(parallel), unit="m")),
    )
    extrapolated = np.isnan(elevation.values) & (sensor_depth.values > path.last_depth + BEYOND_PATH)
    extrapolated.flags.writeable = False
    return Positions(
        tvd=tvd,
        elevation=computed("elevation", "m", ELEVATION, Input("tvd", tvd), surveyed, datum_input),
        east=column_east,
        north=column_north,
        latitude=latitude,
        longitude=longitude,
        cos_inclination=computed("cos_inclination", "", COS_INCLINATION, depth_input, surveyed, path_input),
        extrapolated=extrapolated,
    )
