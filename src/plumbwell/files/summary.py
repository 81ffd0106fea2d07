"""summary.json: what a reduction rests on and what it found; mGal and hours throughout.

What is not known is null, never NaN. Two runs on the same folder differ in `timing` alone.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Sequence
from math import degrees
from typing import Any

import numpy as np

from plumbwell import __version__
from plumbwell.earth.constants import MILLIGAL
from plumbwell.files.output_folder import OUTPUTS, SUMMARY_FORMAT
from plumbwell.files.times import iso
from plumbwell.reduction.chance import chi_square_chance
from plumbwell.reduction.drift_basis import DriftUnknown
from plumbwell.study.cautions import CAUTIONS
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.study.visit_table import tares_in_force
from plumbwell.survey.recipe import as_written

HOUR = 3600.0


def summary_text(
    results: Results,
    *,
    outputs: Sequence[str],
    notes: Iterable[str] = (),
    findings: Sequence[Finding] | None = None,
) -> str:
    """Text of summary.json.

    Parameters
    ----------
    results : Results
    outputs : sequence of str
        Names of all files that the run writes.
    notes : iterable of str
        What a reader of the outputs has to be told.
    findings : sequence of Finding or None
        None: those of the results.
    """
    told = summary(results, outputs=outputs, notes=notes, findings=findings)
    return json.dumps(told, indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def summary(
    results: Results,
    *,
    outputs: Sequence[str],
    notes: Iterable[str] = (),
    findings: Sequence[Finding] | None = None,
) -> dict[str, Any]:
    """What summary.json holds; see `summary_text`."""
    docket = results.findings if findings is None else findings
    return {
        "format": SUMMARY_FORMAT,
        "program_version": __version__,
        "survey": _survey(results),
        "recipe": as_written(results.recipe),
        "counts": counts(results),
        "free_air_gradient": _number(results.choice.gradient, MILLIGAL),
        "drift": drift(results),
        "tares": {"applied": tares(results), "proposed": proposed_tares(results)},
        "outliers": outliers(results),
        "scale_factors": [
            {"instrument": one.instrument, "scale": _number(one.scale), "sd": _number(one.sd) if one.told else None}
            for one in results.network.scales
        ],
        "variance_components": variance_components(results),
        "chi_square": _chi_square(results),
        "absolute": results.absolute,
        "findings": [
            {
                "code": one.code,
                "severity": one.severity,
                "place": one.place,
                "text": one.text,
                "mend": one.mend,
            }
            for one in docket
        ],
        "inputs": [{"name": one.name, "sha256": one.sha256} for one in results.survey.files],
        OUTPUTS: list(outputs),
        "cautions": list(CAUTIONS),
        "notes": list(notes),
        "timing": {part: round(seconds, 6) for part, seconds in results.timing.items()},
    }


def _number(value: float | None, unit: float = 1.0) -> float | None:
    """A number in a written unit with 12 significant digits, None where it is not known."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{value / unit:.12g}") + 0.0


def _survey(results: Results) -> dict[str, Any]:
    site = results.survey.site
    return {
        "name": site.name,
        "latitude": _number(degrees(site.latitude)),
        "longitude": _number(degrees(site.longitude)),
        "ground_elevation": site.ground_elevation,
        "collar_elevation": site.collar_elevation,
        "depth_datum_height": site.depth_datum_height,
        "geoid_height": site.geoid_height,
        "water_depth": site.water_depth,
        "far_elevation": site.far_elevation,
        "north": site.north,
        "north_correction": _number(degrees(site.north_correction)),
        **dict(site.carried),
    }


def counts(results: Results) -> dict[str, int]:
    """Rows of the readings: read = used + excluded (`use = no`) + refused (of use, and at no station)."""
    readings, used = results.survey.readings, len(results.network.visits.rows)
    excluded = int(np.count_nonzero(~readings.use))
    return {
        "read": len(readings),
        "used": used,
        "excluded": excluded,
        "refused": len(readings) - used - excluded,
    }


def drift(results: Results) -> list[dict[str, Any]]:
    """Drift of each run with used readings, in time order: sum of value x (t - t0)^power, t in hours."""
    fit, names = results.network.adjustment, results.survey.readings.run.names
    told = []
    for run in results.network.visits.run_order.tolist():
        hours = float(fit.basis.length[run]) / HOUR
        order = fit.orders[run]
        coefficients = []
        for power in range(1, order + 1):
            unknown = DriftUnknown(kind="drift", run=run, power=power)
            value, sd = fit.unknown(unknown)
            if results.network.open.moves(unknown):
                value, sd = math.nan, math.nan
            unit = MILLIGAL * hours**power
            coefficients.append(
                {
                    "power": power,
                    "value": _number(value, unit),
                    "sd": _number(sd, unit) if unknown in fit.design.position else None,
                    "unit": "mGal/h" if power == 1 else f"mGal/h^{power}",
                }
            )
        if order == 0 and fit.basis.rate[run] != 0.0:
            rate = _number(float(fit.basis.rate[run]), MILLIGAL / HOUR)
            coefficients.append({"power": 1, "value": rate, "sd": None, "unit": "mGal/h"})
        told.append(
            {
                "run": names[run],
                "order": order,
                "t0": iso(float(fit.basis.start[run])),
                "coefficients": coefficients,
                "dof": fit.reseating.freedom,
            }
        )
    return told


def tares(results: Results) -> list[dict[str, Any]]:
    """The tares that were taken out, in time order; sd None for one that is held at its stated size."""
    names = results.survey.readings.run.names
    return [
        {
            "run": names[one.run],
            "time": iso(one.tare.time),
            "size": _number(one.size, MILLIGAL),
            "sd": _number(one.sd, MILLIGAL),
        }
        for one in tares_in_force(results)
    ]


def proposed_tares(results: Results) -> list[dict[str, Any]]:
    """The tares that the readings show and nobody listed, in time order, whether they are taken out or not."""
    names = results.survey.readings.run.names
    return [
        {
            "run": names[one.run],
            "time": iso(one.time),
            "gap_from": iso(one.gap_from),
            "gap_to": iso(one.gap_to),
            "size": _number(one.size, MILLIGAL),
            "sd": _number(one.sd, MILLIGAL),
            "gain": _number(one.gain),
            "p": _number(one.p),
            "stops_between": one.visits_between,
            "applied": results.network.proposed_applied,
        }
        for one in results.network.proposed
    ]


def outliers(results: Results) -> list[dict[str, Any]]:
    """The readings that do not fit, in the order of the file: where each stands and what it is off by."""
    found, readings = results.network.judgement, results.survey.readings
    return [
        {
            "row": int(readings.raw.lines[row]),
            "run": readings.run.names[int(readings.run.code[row])],
            "time": iso(float(results.readings.utc.values[row])),
            "error": _number(error, MILLIGAL),
            "ratio": _number(ratio),
            "undecided": bool(alike),
        }
        for row, error, ratio, alike in zip(
            found.rows.tolist(), found.error.tolist(), found.ratio.tolist(), found.alike.tolist(), strict=True
        )
    ]


def variance_components(results: Results) -> dict[str, Any]:
    """Noise that the weights rest on, as sds in mGal, whether estimated or as the instrument states.

    `reading` is the median sd of a single reading, `reading_scale` the factor on stated sds, `reseating` the
    root of the visits' mean re-seating variance, `walk` the strength of the drift's random walk in mGal/h^1.5,
    None where none was tried; `dof` 0 says that the survey could not tell the noise.
    """
    fit = results.network.adjustment
    noise, seat = fit.noise, fit.reseating
    tried = fit.walk_tried or results.network.walk_not_needed
    strength = fit.walk.strength if fit.walk is not None else (0.0 if tried else None)
    return {
        "reading": _number(float(np.median(noise.sd)), MILLIGAL),
        "reading_scale": _number(noise.scale),
        "reseating": _number(math.sqrt(float(np.mean(seat.variance))), MILLIGAL),
        "walk": _number(strength, MILLIGAL / HOUR**1.5),
        "dof": seat.freedom,
    }


def _chi_square(results: Results) -> dict[str, Any]:
    """Weighted sum of squares of the visits' residuals; None for what no degree of freedom checks."""
    fit = results.network.adjustment
    freedom = fit.reseating.freedom
    if freedom < 1:
        return {"value": None, "dof": freedom, "p": None}
    value = fit.misfit
    return {"value": _number(value), "dof": freedom, "p": _number(chi_square_chance(value, freedom=freedom))}
