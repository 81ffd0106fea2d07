"""Map coordinates: what a coordinate reference system says of a position.

The one place where a map projection is computed; everything inside is latitude and longitude in rad.
"""

from __future__ import annotations

import math


def geodetic_position(system: str, *, easting: float, northing: float) -> tuple[float, float]:
    """Latitude and longitude (rad, WGS84) of map coordinates in m.

    Parameters
    ----------
    system : str
        Name of a coordinate reference system, e.g. "EPSG:32630".
    easting, northing : float
        m in that system, east first whatever the order of its axes.

    Raises
    ------
    ValueError
        When the system is not known, or the coordinates lie outside it.
    """
    from pyproj import Transformer
    from pyproj.exceptions import ProjError

    try:
        transformer = Transformer.from_crs(system, "EPSG:4326", always_xy=True)
        longitude, latitude = transformer.transform(easting, northing, errcheck=True)
    except ProjError as error:
        raise ValueError(str(error)) from error
    return math.radians(latitude), math.radians(longitude)


def apart(*, latitude: float, longitude: float, other_latitude: float, other_longitude: float) -> float:
    """Distance of two positions (rad) on the ellipsoid WGS84, m."""
    from pyproj import Geod

    _, _, distance = Geod(ellps="WGS84").inv(longitude, latitude, other_longitude, other_latitude, radians=True)
    return float(distance)
