"""Known parts of station gravity: normal gravity, its change with height, reference rock; and what is left.

Heights are above the ellipsoid (elevation plus geoid height). The anomaly is gravity less all known parts;
without a tie it is the difference from its own value at the datum station.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from plumbwell.earth.ellipsoid import mean_curvature, principal_radii
from plumbwell.earth.free_air import measured_gradient_excess
from plumbwell.earth.normal_gravity import (
    gradient_at_height,
    gravity_at_height,
    gravity_on_ellipsoid,
    height_change,
    normal_system,
)
from plumbwell.earth.shells import shell_term
from plumbwell.reduction.positions import Positions
from plumbwell.reduction.reference_rock import ReferenceLayers
from plumbwell.survey.column import Array, Column, Index, Input, Law, Setting, computed, constant_column, frozen_index
from plumbwell.survey.site import Site


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class FreeAirChoice:
    """Which normal gravity is taken out.

    Parameters
    ----------
    system, form : str
    measured : tuple of (float, float) or None
        Measured gradient and its sd, s-2; None: the normal one.
    normal : float
        Gradient of the chosen system and form at the collar, s-2.
    radius : float
        R0 = 1/J at the collar's latitude, m.
    """

    system: str
    form: str
    measured: tuple[float, float] | None
    normal: float
    radius: float

    @property
    def gradient(self) -> float:
        """The one F of the slab form, s-2."""
        return self.normal if self.measured is None else self.measured[0]


def free_air_choice(
    site: Site, *, system: str, form: str, free_air: str | tuple[float, float]
) -> FreeAirChoice:
    """The free-air choice of a survey, its gradient at latitude and ellipsoidal height of the collar."""
    height = site.collar_elevation + site.geoid_height
    normal = float(gradient_at_height(system, latitude=site.latitude, height=height, form=form))
    return FreeAirChoice(
        system=system,
        form=form,
        measured=None if isinstance(free_air, str) else free_air,
        normal=normal,
        radius=1.0 / float(mean_curvature(site.latitude, normal_system(system).ellipsoid)),
    )


def _free_air(
    latitude: Any, elevation: Any, geoid_height: float, collar_elevation: float, choice: FreeAirChoice
) -> Any:
    height = np.asarray(elevation) + geoid_height
    change = height_change(choice.system, latitude=latitude, height=height, form=choice.form)
    if choice.measured is None:
        return change
    excess = measured_gradient_excess(
        elevation, collar_height=collar_elevation, measured=choice.measured[0], normal=choice.normal
    )
    return change + excess


def _free_air_gradient(latitude: Any, elevation: Any, geoid_height: float, choice: FreeAirChoice) -> Any:
    height = np.asarray(elevation) + geoid_height
    gradient = gradient_at_height(choice.system, latitude=latitude, height=height, form=choice.form)
    return gradient if choice.measured is None else gradient + (choice.measured[0] - choice.normal)


NORMAL_GRAVITY = Law(
    "normal gravity on the ellipsoid",
    "gamma_e (1 + k sin2 phi)/sqrt(1 - e2 sin2 phi); for 1930 the printed formula",
    "Somigliana 1929; NIMA TR8350.2; Moritz 2000; Cassinis 1930",
    lambda latitude, system: gravity_on_ellipsoid(system, latitude=latitude),
)
AT_STATION = Law(
    "normal gravity at the station",
    "gamma(phi, h)",
    "Heiskanen & Moritz 1967, ch. 2 and 6; Li & Goetze 2001, Geophysics 66, 1660-1668",
    lambda latitude, elevation, geoid_height, system, form: gravity_at_height(
        system, latitude=latitude, height=np.asarray(elevation) + geoid_height, form=form
    ),
)
FREE_AIR = Law(
    "free-air change",
    "gamma(phi, h) - gamma(phi, 0) - (F_measured - F)(h - h_collar)",
    "Heiskanen & Moritz 1967, ch. 2 and 6; Li & Goetze 2001, Geophysics 66, 1660-1668",
    _free_air,
)
FREE_AIR_GRADIENT = Law(
    "free-air gradient at the station", "-d gamma/dh", "Heiskanen & Moritz 1967, ch. 2", _free_air_gradient
)
SHELL = Law(
    "reference rock",
    "-(4 pi G/r2) x integral from r to the ground of rho0 r'2 dr'",
    "shell theorem; Heiskanen & Moritz 1967, ch. 1",
    lambda elevation, ground_elevation, geoid_height, radius, layers: shell_term(
        np.asarray(elevation) + geoid_height,
        ground_height=ground_elevation + geoid_height,
        radius=radius,
        tops=layers.tops + geoid_height,
        densities=layers.density,
    ),
)
LEFT_OVER = Law(
    "gravity less known parts",
    "gravity - normal gravity - free air - shell",
    "definition",
    lambda gravity, normal_gravity, free_air, shell: gravity - normal_gravity - free_air - shell,
)
ANOMALY = Law(
    "anomaly",
    "gravity less known parts, less its value at the datum station where no tie fixes gravity",
    "definition",
    lambda left_over, at_datum, tied: left_over - np.where(np.asarray(tied) > 0.0, 0.0, at_datum),
)
DISTURBANCE = Law(
    "gravity less normal gravity at height and known masses",
    "anomaly + shell",
    "definition",
    lambda anomaly, shell: anomaly + shell,
)
RADIUS = Law(
    "radius",
    "R0 + elevation + geoid height, R0 = 1/J at the collar",
    "Heiskanen & Moritz 1967, ch. 2 (mean curvature J)",
    lambda elevation, geoid_height, radius: radius + np.asarray(elevation) + geoid_height,
)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class KnownParts:
    """Parts of gravity that depend on position only, (s,) each: m/s2, gradient s-2, radius m."""

    normal_gravity: Column
    free_air: Column
    free_air_gradient: Column
    shell: Column
    radius: Column


def _geoid(site: Site) -> Input:
    return Input("geoid_height", Setting(key="geoid_height", value=site.geoid_height, unit="m", origin="survey.toml"))


def normal_gravity(positions: Positions, choice: FreeAirChoice) -> Column:
    """Normal gravity on the ellipsoid at every station, m/s2."""
    system = Setting(key="normal_gravity", value=choice.system, origin="recipe")
    return computed(
        "normal_gravity", "m/s2", NORMAL_GRAVITY, Input("latitude", positions.latitude), Input("system", system)
    )


def normal_at_station(positions: Positions, site: Site, *, system: str, form: str) -> Column:
    """Normal gravity at every station, m/s2: what a tilted meter there reads too little of."""
    return computed(
        "normal_at_station", "m/s2", AT_STATION, Input("latitude", positions.latitude),
        Input("elevation", positions.elevation), _geoid(site),
        Input("system", Setting(key="normal_gravity", value=system, origin="recipe")),
        Input("form", Setting(key="height_form", value=form, origin="recipe")),
    )


def northward_pull(system: str, *, latitude: Array, height: float) -> Array:
    """Increase of normal gravity per m to the north, (s,), s-2: 0.8145 sin 2 phi mGal/km.

    Parameters
    ----------
    system : str
    latitude : (s,) array
        rad.
    height : float
        Of the hole, m: the length of an arc of latitude grows with it.
    """
    step = 1e-5
    upper, lower = (gravity_on_ellipsoid(system, latitude=latitude + way * step) for way in (1, -1))
    meridian, _ = principal_radii(latitude, normal_system(system).ellipsoid)
    return (upper - lower) / (2.0 * step) / (meridian + height)


def reference_shell(positions: Positions, site: Site, choice: FreeAirChoice, layers: ReferenceLayers) -> Column:
    """Shell term of the reference rock at every station, m/s2."""
    ground = Setting(key="ground_elevation", value=site.ground_elevation, unit="m", origin="survey.toml")
    return computed(
        "shell", "m/s2", SHELL, Input("elevation", positions.elevation), Input("ground_elevation", ground),
        _geoid(site), Input("radius", Setting(key="R0", value=choice.radius, unit="m")),
        Input("layers", Setting(key="reference_density", value=layers, origin="recipe")),
    )


def known_parts(
    positions: Positions, site: Site, choice: FreeAirChoice, *, normal: Column, shell: Column
) -> KnownParts:
    """The known parts of gravity at every station, with normal gravity and shell term worked out before."""
    geoid = _geoid(site)
    chosen = Input("choice", Setting(key="normal_gravity", value=choice, origin="recipe"))
    radius = Input("radius", Setting(key="R0", value=choice.radius, unit="m"))
    latitude, elevation = Input("latitude", positions.latitude), Input("elevation", positions.elevation)
    collar = Setting(key="collar_elevation", value=site.collar_elevation, unit="m", origin="survey.toml")
    return KnownParts(
        normal_gravity=normal,
        free_air=computed(
            "free_air", "m/s2", FREE_AIR, latitude, elevation, geoid, Input("collar_elevation", collar), chosen
        ),
        free_air_gradient=computed(
            "free_air_gradient", "1/s2", FREE_AIR_GRADIENT, latitude, elevation, geoid, chosen
        ),
        shell=shell,
        radius=computed("radius", "m", RADIUS, elevation, geoid, radius),
    )


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Anomalies:
    """What is left of gravity, (s,) each, m/s2: `left_over` unreferred, `anomaly`, and `disturbance`."""

    left_over: Column
    anomaly: Column
    disturbance: Column


def anomalies(gravity: Column, parts: KnownParts, datum: Index) -> Anomalies:
    """The anomalies of all stations; `datum` (s,) is each station's datum station, -1 where tied."""
    shell = Input("shell", parts.shell)
    left_over = computed(
        "left_over", "m/s2", LEFT_OVER, Input("gravity", gravity), Input("normal_gravity", parts.normal_gravity),
        Input("free_air", parts.free_air), shell,
    )
    at = frozen_index(np.where(datum >= 0, datum, np.arange(len(datum))))
    tied = constant_column("tied", "", datum < 0)
    anomaly = computed(
        "anomaly", "m/s2", ANOMALY, Input("left_over", left_over), Input("at_datum", left_over, at), Input("tied", tied)
    )
    return Anomalies(
        left_over=left_over,
        anomaly=anomaly,
        disturbance=computed("disturbance", "m/s2", DISTURBANCE, Input("anomaly", anomaly), shell),
    )
