"""Reference density as layers, from a density log or from markers.

Layers are tops (elevations, descending) with the density from each top down to the next; the first
top is the ground, the last layer goes down without limit. A log's depth is brought to the survey's
datum here, and the steps of a log that count as covered are told from its gaps.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from plumbwell.reduction.positions import WellPath
from plumbwell.survey.column import Array, frozen
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.log import DensityLog
from plumbwell.survey.places import Markers
from plumbwell.survey.site import Site

WIDEST_STEP = 3.0
"""Steps wider than this many median steps of a log are gaps."""

END_THICKNESS = 50.0
"""m; beyond an end of a log its mean over this much rock stands for what is not logged."""

MOST_CUTS = 1000
"""A gap is bridged straight by no more layers than this."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LogFacts:
    """What a reference density by log rests on where the log says nothing.

    Parameters
    ----------
    top, base : float, m
        Elevations of the first and the last density of the log.
    above, below : float, kg/m3
        Densities taken from the ground to `top`, and under `base`.
    gaps : tuple of (float, float), m
        Elevations of top and base of the gaps that were bridged straight.
    dropped : int
        Densities left out since the path does not go down there.
    """

    top: float
    base: float
    above: float
    below: float
    gaps: tuple[tuple[float, float], ...]
    dropped: int


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class ReferenceLayers:
    """Reference density by layers, (m,) each.

    Parameters
    ----------
    tops : (m,), m above sea level, strictly descending
        The first is the ground.
    density : (m,), kg/m3
        From each top down to the next; the last goes on without limit.
    facts : LogFacts or None
        None for markers.
    """

    tops: Array
    density: Array
    facts: LogFacts | None = None


def log_depth(log: DensityLog, site: Site) -> Array:
    """Depths of a log's samples from the survey's depth datum, m.

    Notes
    -----
    survey depth = log depth + depth_shift + depth_datum_height - datum_height of the log.
    """
    return log.depth.values + (log.depth_shift + site.depth_datum_height - log.datum_height)


def covered_steps(log: DensityLog) -> NDArray[np.bool_]:
    """True for each step between samples of a log that has densities at both ends and is no gap.

    Returns
    -------
    (n - 1,) bool array
        A step wider than three times the log's median step is a gap.
    """
    step = np.diff(log.depth.values)
    known = np.isfinite(log.density.values)
    narrow = step <= WIDEST_STEP * np.median(step) * (1.0 + 1e-9) if len(step) else step > 0.0
    return known[:-1] & known[1:] & narrow


def _end_mean(*, top: Array, base: Array, density: Array) -> float:
    """Mean density of the 50 m that start at the first top, by thickness; of layers from there on."""
    thickness = np.minimum(np.abs(top[0] - base), END_THICKNESS) - np.minimum(
        np.abs(top[0] - top), END_THICKNESS
    )
    return float(thickness @ density / thickness.sum())


def reference_layers_from_log(log: DensityLog, path: WellPath, site: Site) -> ReferenceLayers:
    """Reference density by a log: constant between samples (mean of the two), gaps bridged straight.

    Parameters
    ----------
    log : DensityLog
    path : WellPath
    site : Site

    Raises
    ------
    SurveyError
        When the log holds no density.

    Notes
    -----
    Beyond its ends the log's mean over the 50 m next to that end is taken (of what is covered there; of
    the bridged part when nothing is). A gap is cut into steps of the log's median step. Where the path
    climbs, only the samples that are deeper than all before count (from the other end in a hole that
    climbs as a whole).
    """
    depth = log_depth(log, site)
    known = np.flatnonzero(np.isfinite(log.density.values))
    if not len(known):
        raise SurveyError(f"the log {log.file} holds no density; a reference density by log needs one")
    pieces = np.ones(len(known) - 1, dtype=np.intp)
    whole = pieces == 1
    if len(pieces):
        whole = (np.diff(known) == 1) & covered_steps(log)[known[:-1]]
        parts = np.ceil(np.diff(depth[known]) / np.median(np.diff(depth)) - 1e-6)
        pieces = np.where(whole, 1, np.clip(parts, 1, MOST_CUTS)).astype(np.intp)
    # Nodes: every sample, and the cuts within gaps; `bridged` marks the layer above each node but the first.
    first = np.repeat(np.arange(len(pieces)), pieces)
    share = (np.arange(len(first)) - np.repeat(np.cumsum(pieces) - pieces, pieces)) / pieces[first]
    position = np.append(first + share, len(pieces))
    node_depth = np.interp(position, np.arange(len(known)), depth[known])
    node_density = np.interp(position, np.arange(len(known)), log.density.values[known])
    bridged = np.append(False, ~whole[first])
    tvd = path.at(node_depth)[0]
    if tvd[-1] < tvd[0]:
        tvd, node_density, bridged = tvd[::-1], node_density[::-1], np.append(False, bridged[:0:-1])
    deeper = np.append(True, tvd[1:] > np.maximum.accumulate(tvd)[:-1])
    tvd, node_density, bridged = tvd[deeper], node_density[deeper], bridged[deeper]
    elevation = site.datum_elevation - tvd
    density = (node_density[:-1] + node_density[1:]) / 2
    if len(density):
        good = ~bridged[1:] if not bridged[1:].all() else np.ones(len(density), dtype=bool)
        top, base = elevation[:-1][good], elevation[1:][good]
        above = _end_mean(top=top, base=base, density=density[good])
        below = _end_mean(top=base[::-1], base=top[::-1], density=density[good][::-1])
    else:
        above = below = float(node_density[0])
    edge = np.diff(np.concatenate([[False], bridged[1:], [False]]).astype(np.int8))
    gaps = zip(elevation[np.flatnonzero(edge == 1)], elevation[np.flatnonzero(edge == -1)], strict=True)
    facts = LogFacts(
        top=float(elevation[0]),
        base=float(elevation[-1]),
        above=above,
        below=below,
        gaps=tuple((float(upper), float(lower)) for upper, lower in gaps),
        dropped=int(np.sum(~deeper)),
    )
    tops = np.concatenate([[np.inf], elevation])
    return _from_ground(tops, np.concatenate([[above], density, [below]]), site.ground_elevation, facts)


def reference_layers_from_markers(markers: Markers, path: WellPath, site: Site) -> ReferenceLayers:
    """Reference density by markers: from each marker with a density down to the next.

    Parameters
    ----------
    markers : Markers
        Above the first the first's density is taken; markers without density are passed over.
    path : WellPath
    site : Site

    Raises
    ------
    SurveyError
        When no marker has a density.
    """
    known = np.isfinite(markers.density.values) & np.isfinite(markers.depth.values)
    if not known.any():
        raise SurveyError('reference_density = "markers" needs a density beside at least one marker')
    elevation = site.datum_elevation - path.at(markers.depth.values[known])[0]
    density = markers.density.values[known]
    order = np.argsort(-elevation, kind="stable")
    elevation, density = elevation[order], density[order]
    # Of markers at one elevation the last stands: nothing lies between them.
    last = np.append(elevation[1:] < elevation[:-1], True)
    tops = np.concatenate([[np.inf], elevation[last]])
    return _from_ground(tops, np.concatenate([density[:1], density[last]]), site.ground_elevation, None)


def _from_ground(tops: Array, density: Array, ground: float, facts: LogFacts | None) -> ReferenceLayers:
    """Layers cut off at the ground: there is no reference rock above it. The first top is infinite."""
    start = int(np.searchsorted(-tops, -ground, side="right")) - 1
    tops, density = np.append(ground, tops[start + 1 :]), density[start:]
    return ReferenceLayers(tops=frozen(tops), density=frozen(density), facts=facts)


def reference_rock(
    wanted: str | float,
    markers: Markers | None,
    logs: tuple[DensityLog, ...],
    path: WellPath,
    site: Site,
) -> ReferenceLayers:
    """The reference density that the recipe asks for, as layers.

    Parameters
    ----------
    wanted : float, "markers" or "log"
        kg/m3 for a constant density; "log" takes the first log.
    markers, logs, path, site
        As measured; `path` worked out.

    Raises
    ------
    SurveyError
        When markers or log are asked for and there is none with a density.
    """
    if wanted == "markers":
        if markers is None:
            raise SurveyError(
                'reference_density = "markers" needs a markers file with densities: name one in [data]'
            )
        return reference_layers_from_markers(markers, path, site)
    if wanted == "log":
        if not logs:
            raise SurveyError('reference_density = "log" needs a density log: name one as [[log]]')
        return reference_layers_from_log(logs[0], path, site)
    return ReferenceLayers(tops=frozen([site.ground_elevation]), density=frozen([float(wanted)]))
