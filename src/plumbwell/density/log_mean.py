"""Mean of a density log over intervals, by vertical thickness between sensor depths.

The log's depth is brought to the survey's datum; between samples the density is straight (trapezoid),
steps at the ends of an interval count in part. What a log does not cover is told, never filled.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from plumbwell.reduction.positions import WellPath
from plumbwell.reduction.reference_rock import covered_steps, log_depth
from plumbwell.survey.column import Array, Column, Index, Input, Law, Setting, computed, frozen, frozen_index
from plumbwell.survey.log import DensityLog
from plumbwell.survey.site import Site

ROUNDING = 1e-9
"""Coverages nearer than this are equal."""


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LogIntegral:
    """A log summed along the hole, so that any interval's mean is a difference of two sums.

    Parameters
    ----------
    path : WellPath
    depth, tvd : (m,), m
        Of the samples, from the survey's depth datum.
    density : (m,), kg/m3
    covered : (m - 1,), 1 or 0
        Whether each step counts.
    thickness, mass : (m,), m and kg/m2
        Covered vertical thickness, and density times it, from the first sample to each.
    minimum_coverage : float
    """

    path: WellPath
    depth: Array
    tvd: Array
    density: Array
    covered: Array
    thickness: Array
    mass: Array
    minimum_coverage: float

    def sums_to(self, depth: Any) -> tuple[Any, Any]:
        """Covered thickness (m) and mass (kg/m2) from the first sample to measured depths."""
        depth = np.clip(depth, self.depth[0], self.depth[-1])
        step = np.clip(np.searchsorted(self.depth, depth, side="right") - 1, 0, len(self.depth) - 2)
        length = self.depth[step + 1] - self.depth[step]
        share = np.where(length > 0.0, (depth - self.depth[step]) / np.where(length > 0.0, length, 1.0), 0.0)
        counts = self.covered[step] > 0.0
        upper = self.density[step]
        mean = np.where(counts, upper + share / 2 * (self.density[step + 1] - upper), 0.0)
        part = np.where(counts, np.abs(self.path.at(depth)[0] - self.tvd[step]), 0.0)
        return self.thickness[step] + part, self.mass[step] + mean * part


def log_integral(log: DensityLog, *, path: WellPath, site: Site) -> LogIntegral | None:
    """A log summed along the hole; None when it has fewer than two samples.

    Parameters
    ----------
    log : DensityLog
    path : WellPath
    site : Site
    """
    if len(log.depth) < 2:
        return None
    depth, density = log_depth(log, site), log.density.values
    covered = covered_steps(log)
    tvd = path.at(depth)[0]
    thickness = np.where(covered, np.abs(np.diff(tvd)), 0.0)
    mass = np.where(covered, (density[:-1] + density[1:]) / 2 * thickness, 0.0)
    return LogIntegral(
        path=path,
        depth=frozen(depth),
        tvd=frozen(tvd),
        density=frozen(density),
        covered=frozen(covered),
        thickness=frozen(np.append(0.0, np.cumsum(thickness))),
        mass=frozen(np.append(0.0, np.cumsum(mass))),
        minimum_coverage=log.minimum_coverage,
    )


def _means(
    integral: LogIntegral | None, *, path: WellPath, top_depth: Any, base_depth: Any
) -> tuple[Array, Array]:
    top_depth, base_depth = np.asarray(top_depth, dtype=np.float64), np.asarray(base_depth, dtype=np.float64)
    whole = np.abs(path.at(base_depth)[0] - path.at(top_depth)[0])
    coverage = np.where(whole > 0.0, 0.0, np.nan)
    mean = np.full(whole.shape, np.nan)
    if integral is None:
        return mean, coverage
    top_thickness, top_mass = integral.sums_to(top_depth)
    base_thickness, base_mass = integral.sums_to(base_depth)
    thickness = base_thickness - top_thickness
    reached = (whole > 0.0) & (thickness != 0.0)
    coverage = np.where(reached, np.minimum(np.abs(thickness) / np.where(reached, whole, 1.0), 1.0), coverage)
    enough = reached & (coverage >= integral.minimum_coverage - ROUNDING)
    mean = np.where(enough, (base_mass - top_mass) / np.where(enough, thickness, 1.0), np.nan)
    return mean, coverage


def log_means(
    log: DensityLog, *, top_depth: Any, base_depth: Any, path: WellPath, site: Site
) -> tuple[Array, Array]:
    """Mean density of a log over intervals (kg/m3), and the share of each that the log covers.

    Parameters
    ----------
    log : DensityLog
    top_depth, base_depth : float or (n,), m
        Measured depth of the sensor at both ends, from the survey's datum; NaN off the path.
    path : WellPath
    site : Site

    Returns
    -------
    mean : (n,), kg/m3
        NaN where the coverage is under the log's `minimum_coverage`.
    coverage : (n,), 0 to 1
        NaN where the interval has no vertical thickness on the path.

    Notes
    -----
    Mean = integral of rho dz over integral of dz, both over the covered steps; a step wider than three
    times the log's median step, or with a missing value at an end, is not covered.
    """
    return _means(
        log_integral(log, path=path, site=site), path=path, top_depth=top_depth, base_depth=base_depth
    )


def _best_means(
    integrals: tuple[LogIntegral | None, ...], *, path: WellPath, top_depth: Any, base_depth: Any
) -> tuple[Array, Array, Index]:
    means = [_means(one, path=path, top_depth=top_depth, base_depth=base_depth) for one in integrals]
    mean, coverage = (
        means[0] if means else _means(None, path=path, top_depth=top_depth, base_depth=base_depth)
    )
    which = np.where(coverage > 0.0, 0, -1)
    for number, (other, reach) in enumerate(means[1:], start=1):
        better = reach > coverage + ROUNDING
        mean, coverage = np.where(better, other, mean), np.where(better, reach, coverage)
        which = np.where(better, number, which)
    return mean, coverage, which.astype(np.intp)


def combined_log_means(
    logs: tuple[DensityLog, ...], *, top_depth: Any, base_depth: Any, path: WellPath, site: Site
) -> tuple[Array, Array, Index]:
    """As `log_means`, by the log that covers most of each interval, the first of equals.

    Returns
    -------
    mean, coverage : (n,)
    which : (n,) int
        Number of the log that served, -1 where none reaches.
    """
    integrals = log_integrals(logs, path, site)
    return _best_means(integrals, path=path, top_depth=top_depth, base_depth=base_depth)


LOG_DENSITY = Law(
    "mean log density",
    "integral of log density dz / covered thickness; empty under the least coverage",
    "trapezoid rule by vertical thickness",
    lambda top_depth, base_depth, logs, path: _best_means(
        logs, path=path, top_depth=top_depth, base_depth=base_depth
    )[0],
)
LOG_COVERAGE = Law(
    "log coverage",
    "covered thickness / thickness of the interval",
    "definition",
    lambda top_depth, base_depth, logs, path: _best_means(
        logs, path=path, top_depth=top_depth, base_depth=base_depth
    )[1],
)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class LogMeans:
    """What the logs say about each interval, (n,) each.

    Parameters
    ----------
    density : Column, kg/m3
        NaN under the least coverage.
    coverage : Column
    which : (n,) int array
        Number of the log that served, -1 where none reaches.
    """

    density: Column
    coverage: Column
    which: Index


def log_integrals(logs: tuple[DensityLog, ...], path: WellPath, site: Site) -> tuple[LogIntegral | None, ...]:
    """All logs summed along the hole."""
    return tuple(log_integral(log, path=path, site=site) for log in logs)


def log_mean_columns(
    logs: tuple[DensityLog, ...],
    integrals: tuple[LogIntegral | None, ...],
    *,
    sensor_depth: Column,
    upper: Index,
    lower: Index,
    path: WellPath,
) -> LogMeans:
    """Mean log densities of intervals as columns.

    Parameters
    ----------
    logs : tuple of DensityLog
    integrals : tuple of LogIntegral or None
        From `log_integrals`.
    sensor_depth : Column, m
        Of the stations, from the survey's datum; NaN off the path.
    upper, lower : (n,) int arrays
        Rows of that column at top and base of each interval.
    path : WellPath
    """
    inputs = (
        Input("top_depth", sensor_depth, frozen_index(upper)),
        Input("base_depth", sensor_depth, frozen_index(lower)),
        Input("logs", Setting(key="logs", value=integrals, origin=", ".join(log.file for log in logs))),
        Input("path", Setting(key="path", value=path)),
    )
    _, _, which = _best_means(
        integrals, path=path, top_depth=inputs[0].values(), base_depth=inputs[1].values()
    )
    return LogMeans(
        density=computed("log_density", "kg/m3", LOG_DENSITY, *inputs),
        coverage=computed("log_coverage", "", LOG_COVERAGE, *inputs),
        which=frozen_index(which),
    )
