"""The site of a survey: where the hole or shaft starts, and from what its depths and heights count."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """Where a survey was made. Compares by value.

    Parameters
    ----------
    name : str
    latitude, longitude : float
        Geodetic, WGS84, rad; north and east positive; of the collar.
    ground_elevation : float
        Ground above the collar, m above sea level. Rock shells count from it.
    collar_elevation : float
        Where hole or shaft starts, m above sea level. Path and depth datum count from it.
    depth_datum_height : float
        Zero of measured depth above the collar, m.
    geoid_height : float
        Ellipsoidal height = elevation + geoid height, m.
    water_depth : float
        Water above the ground at the collar, m.
    far_elevation : float or None
        Land beyond the terrain grids, m above sea level.
    north : str
        Of azimuths: "true", "grid" or "magnetic".
    north_correction : float
        Added to azimuths, rad.
    carried : tuple of (str, str)
        Keys that are only carried to every output: vertical datum, horizontal system, easting, northing.
    """

    name: str
    latitude: float
    longitude: float
    ground_elevation: float
    collar_elevation: float
    depth_datum_height: float = 0.0
    geoid_height: float = 0.0
    water_depth: float = 0.0
    far_elevation: float | None = None
    north: str = "true"
    north_correction: float = 0.0
    carried: tuple[tuple[str, str], ...] = ()

    @property
    def datum_elevation(self) -> float:
        """Elevation of the zero of measured depth, m above sea level."""
        return self.collar_elevation + self.depth_datum_height
