"""The arithmetic of a reduction in bare numpy, without columns, laws, checks or docket: the floor for its speed.

Calibration table, tide from knots, tilt, pressure, drift by projecting out the stations, station means and
variances, minimum curvature, closed normal gravity and its change with height, shell densities and their errors.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.earth.ellipsoid import WGS84, mean_curvature
from plumbwell.earth.normal_gravity import SYSTEMS, height_change
from plumbwell.earth.tide import rigid_tide
from plumbwell.study.case import Case

FOUR_PI_G = 4.0 * np.pi * 6.67430e-11
KNOT = 1800.0


@dataclass
class BareSurvey:
    """A survey as plain arrays, with the tide at its knots."""

    time: np.ndarray
    counter: np.ndarray
    tilt: tuple[np.ndarray, np.ndarray]
    pressure: np.ndarray
    station: np.ndarray
    run: np.ndarray
    visit: np.ndarray
    depth: np.ndarray
    table: tuple[np.ndarray, np.ndarray]
    path: tuple[np.ndarray, np.ndarray, np.ndarray]
    knots: np.ndarray
    latitude: float
    ground: float


def bare_survey(case: Case) -> BareSurvey:
    """The arrays of a made survey."""
    survey = case.survey
    readings, site = survey.readings, survey.site
    station = readings.station.code
    code, first = np.unique(station, return_index=True)
    time = readings.time.values
    changes = np.concatenate([[False], (np.diff(station) != 0) | (np.diff(readings.run.code) != 0)])
    knots = np.arange(np.floor(time.min() / KNOT) - 1, np.ceil(time.max() / KNOT) + 3)
    calibration = survey.instruments[0].calibration
    return BareSurvey(
        time=time, counter=readings.reading.values, tilt=(readings.tilt_x.values, readings.tilt_y.values),
        pressure=readings.pressure.values, station=station, run=readings.run.code, visit=np.cumsum(changes),
        depth=readings.depth.values[first],
        table=(calibration.counter.values, calibration.gravity.values),
        path=(survey.path.depth.values, survey.path.inclination.values, survey.path.azimuth.values),
        knots=rigid_tide(
            knots * KNOT, latitude=site.latitude, longitude=site.longitude, height=site.ground_elevation
        ),
        latitude=site.latitude, ground=site.ground_elevation,
    )  # fmt: skip


def curvature(path: tuple[np.ndarray, np.ndarray, np.ndarray], at: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Vertical depth and north by minimum curvature, m."""
    depth, inclination, azimuth = path
    tangent = np.column_stack([np.cos(inclination), np.sin(inclination) * np.cos(azimuth)])
    sine2 = np.sin(np.diff(inclination) / 2) ** 2
    sine2 += np.sin(inclination[1:]) * np.sin(inclination[:-1]) * np.sin(np.diff(azimuth) / 2) ** 2
    turn = 2 * np.arcsin(np.sqrt(sine2))
    ratio = np.where(turn > 1e-9, np.tan(turn / 2) / np.where(turn > 1e-9, turn / 2, 1.0), 1.0)
    step = (np.diff(depth) * ratio / 2)[:, None] * (tangent[1:] + tangent[:-1])
    place = np.vstack([[0.0, 0.0], np.cumsum(step, axis=0)])
    piece = np.clip(np.searchsorted(depth, at) - 1, 0, len(turn) - 1)
    share = (at - depth[piece]) / (depth[piece + 1] - depth[piece])
    angle = turn[piece]
    safe = np.where(angle > 1e-9, angle, 1.0)
    sine = np.sin(safe)
    first = np.where(angle > 1e-9, np.sin((1 - share) * safe) / sine, 1 - share)
    second = np.where(angle > 1e-9, np.sin(share * safe) / sine, share)
    part = share * angle
    half = np.where(part > 1e-9, np.tan(part / 2) / np.where(part > 1e-9, part / 2, 1.0), 1.0)
    there = first[:, None] * tangent[piece] + second[:, None] * tangent[piece + 1]
    moved = ((at - depth[piece]) * half / 2)[:, None] * (tangent[piece] + there)
    return (place[piece] + moved).T


def bare_chain(one: BareSurvey, *, tide_factor: float, depth_sd: float, reference: float) -> tuple[np.ndarray, ...]:
    """Gravity, its variance, shell densities and their sds."""
    value = np.interp(one.counter, *one.table)
    steps = one.time / KNOT
    cell = np.floor(steps)
    at = (cell - cell.min()).astype(int) + 1
    s = steps - cell
    tide = (
        -s * (s - 1) * (s - 2) / 6 * one.knots[at - 1] + (s * s - 1) * (s - 2) / 2 * one.knots[at]
        - s * (s + 1) * (s - 2) / 2 * one.knots[at + 1] + s * (s * s - 1) / 6 * one.knots[at + 2]
    )  # fmt: skip
    tilt = 9.8 * (1.0 - np.cos(one.tilt[0]) * np.cos(one.tilt[1]))
    standard = 101325.0 * (1.0 - 0.0065 * one.ground / 288.15) ** 5.2559
    value = value + tide_factor * tide + tilt + 0.3e-10 * (one.pressure - standard)
    visit = one.visit
    count = np.bincount(visit)
    mean = np.bincount(visit, value) / count
    first = np.concatenate([[0], np.cumsum(count)[:-1]])
    station, run = one.station[first], one.run[first]
    weight = 1.0 / ((2e-8) ** 2 / count + (4e-8) ** 2)
    n_runs = run.max() + 1
    time = np.bincount(visit, one.time) / count
    start = np.array([time[run == k].min() for k in range(n_runs)])
    length = np.array([time[run == k].max() for k in range(n_runs)]) - start
    border = np.zeros((len(mean), 2 * n_runs))
    border[np.arange(len(mean)), run] = 1.0
    border[np.arange(len(mean)), n_runs + run] = (time - start[run]) / length[run]
    border = border[:, 1:]
    total = np.bincount(station, weight)
    by_station = np.zeros((len(total), border.shape[1]))
    np.add.at(by_station, station, weight[:, None] * border)
    projected = border - (by_station / total[:, None])[station]
    inverse = np.linalg.inv(projected.T @ (weight[:, None] * projected))
    drift = inverse @ (projected.T @ (weight * mean))
    gravity = np.bincount(station, weight * (mean - border @ drift)) / total
    residual = mean - border @ drift - gravity[station]
    value = residual @ (weight * residual)
    spread = by_station / total[:, None]
    variance = 1.0 / total + np.einsum("sq,qr,sr->s", spread, inverse, spread)
    tvd, north = curvature(one.path, one.depth)
    latitude = one.latitude + north / 6.37e6
    sine2 = np.sin(latitude) ** 2
    system = SYSTEMS["WGS84"]
    normal = system.gamma_e * (1 + system.k * sine2) / np.sqrt(1 - system.e2 * sine2)
    height = one.ground - tvd
    change = height_change("WGS84", latitude=latitude, height=height)
    radius = 1.0 / mean_curvature(one.latitude, WGS84) + height
    ground = radius - height + one.ground
    shell = -FOUR_PI_G * reference * (ground**3 - radius**3) / (3.0 * radius**2)
    anomaly = gravity - normal - change - shell
    delta = anomaly - anomaly[0] + shell
    order = np.argsort(tvd)
    d, r, v = delta[order], radius[order], variance[order]
    cubes = r[:-1] ** 3 - r[1:] ** 3
    density = 3.0 * (d[:-1] * r[:-1] ** 2 - d[1:] * r[1:] ** 2) / (FOUR_PI_G * cubes)
    slope = np.diff(d) / np.diff(r)
    by = 3.0 * r[:-1] ** 2 / (FOUR_PI_G * cubes)
    sd = np.abs(by) * np.sqrt(v[:-1] + v[1:] + 2.0 * (depth_sd * slope) ** 2)
    return gravity, variance, density, sd, residual, value
