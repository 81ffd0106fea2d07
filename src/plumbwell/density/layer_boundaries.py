"""Where layers part: at markers, at stations, or at a step of vertical depth, within first and last station."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from plumbwell.density.interval import Pairs
from plumbwell.reduction.located import Located
from plumbwell.reduction.positions import WellPath
from plumbwell.survey.column import Array
from plumbwell.survey.errors import SurveyError
from plumbwell.survey.places import Markers
from plumbwell.survey.site import Site

NEAR = 1e-6  # m; boundaries nearer to one another than this are one
MOST_LAYERS = 5000  # that a step may make
SEARCH_STEP = 1.0  # m of measured depth between the points in which a vertical depth is looked up


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Boundaries:
    """Layer boundaries from the top down: elevation m above sea level, measured depth m (NaN where unknown)."""

    elevation: Array
    depth: Array


def layer_boundaries(
    manner: str | float, pairs: Pairs, located: Located, markers: Markers | None, path: WellPath, site: Site
) -> Boundaries | None:
    """The boundaries that the recipe asks for; None when there is no interval.

    Parameters
    ----------
    manner : str or float
        "auto" (markers if any lies inside, else stations), "stations", "markers", or a step in m of vertical
        depth counted from the depth datum.
    pairs : Pairs
    located : Located
    markers : Markers or None
    path : WellPath
    site : Site

    Raises
    ------
    SurveyError
        When a step makes more than 5000 layers.
    """
    if len(pairs.top) == 0:
        return None
    used = np.unique(np.concatenate([pairs.top, pairs.base]))
    elevation = located.positions.elevation.values[used]
    stations = Boundaries(elevation=elevation, depth=located.mark_depth.values[used])
    ends = (float(elevation.max()), float(elevation.min()))
    inner = Boundaries(elevation=np.zeros(0), depth=np.zeros(0))
    if isinstance(manner, float):
        datum = site.datum_elevation
        if (count := (ends[0] - ends[1]) / manner) > MOST_LAYERS:
            raise SurveyError(
                f"layer_boundaries = {manner:g} m in [recipe] makes {count:.0f} layers between the first "
                f"and the last station; at most {MOST_LAYERS} are made: write a step of "
                f"{np.ceil((ends[0] - ends[1]) / MOST_LAYERS * 10.0) / 10.0:.1f} m or more."
            )
        first, last = (datum - ends[0]) / manner, (datum - ends[1]) / manner
        tvd = np.arange(np.ceil(first), np.floor(last) + 1.0) * manner
        inner = Boundaries(elevation=datum - tvd, depth=_depth_of(tvd, path, ends, site))
    elif manner in ("auto", "markers") and markers is not None:
        depth = markers.depth.values
        inner = Boundaries(elevation=site.datum_elevation - path.at(depth)[0], depth=depth)
    inside = (inner.elevation < ends[0] - NEAR) & (inner.elevation > ends[1] + NEAR)
    if manner == "stations" or (manner == "auto" and not inside.any()):
        chosen = stations
    else:
        order = np.argsort(-elevation, kind="stable")
        top, base = order[0], order[-1]
        chosen = Boundaries(
            elevation=np.concatenate([[ends[0]], inner.elevation[inside], [ends[1]]]),
            depth=np.concatenate([[stations.depth[top]], inner.depth[inside], [stations.depth[base]]]),
        )
    order = np.argsort(-chosen.elevation, kind="stable")
    apart = np.concatenate([[True], -np.diff(chosen.elevation[order]) > NEAR])
    return Boundaries(elevation=chosen.elevation[order][apart], depth=chosen.depth[order][apart])


def _depth_of(tvd: Array, path: WellPath, ends: tuple[float, float], site: Site) -> Array:
    """Measured depths of vertical depths; NaN where the hole passes a depth twice."""
    if not len(path.depth):
        return tvd
    deepest = max(path.last_depth, float(tvd.max(initial=0.0))) + abs(site.datum_elevation - ends[1])
    depth = np.arange(0.0, deepest + SEARCH_STEP, SEARCH_STEP)
    along = path.at(depth)[0]
    if np.any(np.diff(along) <= 0.0):
        return np.full(len(tvd), np.nan)
    return np.interp(tvd, along, depth)
