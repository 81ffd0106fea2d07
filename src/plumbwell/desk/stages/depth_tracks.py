"""The tracks of Reduction and Density, made from the plate and the results in the units of people."""

from __future__ import annotations

import numpy as np

from plumbwell.desk.shown import Shown
from plumbwell.desk.stages.columns import along_hole, values_of
from plumbwell.plates.survey_tracks import effect_tracks, survey_tracks
from plumbwell.plates.track import Track
from plumbwell.survey.column import Array

MICROGAL = 1e-8
SEEN = 5e-4
"""mGal: a change of normal gravity along the hole that the ledger's decimals show."""


def density_tracks(shown: Shown, bars: float) -> list[Track]:
    """Gravity, what is left over, density with log, difference; bars reach so many sd."""
    return survey_tracks(shown.plate, wide=True, bars=bars)


def reduction_tracks(shown: Shown, bars: float) -> list[Track]:
    """Each effect on gravity, what is left over, and the sd of gravity by origin."""
    results = shown.results
    at = np.flatnonzero(shown.depths.column)

    def known(values: Array) -> list[float | None]:
        return [float(one) if np.isfinite(one) else None for one in values[at]]

    def stations(name: str) -> list[float | None]:
        return known(values_of(results, "stations", name))

    along = along_hole(results)
    gravity = results.network.gravity
    told = np.where(np.isfinite(results.stations.gravity.values), 1.0, np.nan)
    origins = [
        (name, known(told * np.sqrt(spread.variance()) / MICROGAL))
        for name, spread in (("reading", gravity.reading), ("drift", gravity.drift), ("tare", gravity.tare))
    ]
    origins.append(("tie", known(told * np.sqrt(np.sum(gravity.ties**2, axis=1)) / MICROGAL)))
    sd: list[float | None] = [one or None for one in stations("gravity_sd")]
    latitude = [("latitude", known(along), None)] if at.size and np.ptp(along[at]) > SEEN else []
    return effect_tracks(
        shown.depths.stations[at].tolist(),
        large=[("free air", stations("free_air")), ("shells", stations("shell"))],
        small=latitude,
        left_over=stations("anomaly"),
        left_over_sd=sd,
        origins=origins,
        parts=results.network.parts.of_station[at].tolist(),
        left_over_label=shown.plate.anomaly_label,
        bars=bars,
    )
