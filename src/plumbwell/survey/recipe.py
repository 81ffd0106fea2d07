"""The recipe: all settings that turn readings into results, each described once.

`KEYS` is the one description of every key of `[recipe]` (default, unit, values, what it does,
source); reading, checking, writing and the recipe form use it. Values inside are SI.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields, replace
from difflib import get_close_matches
from typing import Any

from plumbwell.earth.constants import GRAM_PER_CM3, MILLIGAL


@dataclass(frozen=True, slots=True, kw_only=True)
class Recipe:
    """All settings of a reduction. Holds scalars and tuples only and compares by value; SI units.

    `free_air` is "normal" or a tuple (gradient, sd) in s-2; `reference_density` kg/m3, "markers" or
    "log"; `drift_walk` "auto", "off", "on" or a strength in m/s2/s^1.5; `layer_boundaries` a word or
    a step in m; `datum_station` None means the highest station of the column.
    """

    normal_gravity: str = "WGS84"
    height_form: str = "closed"
    free_air: str | tuple[float, float] = "normal"
    gradient_sd: float = 0.0005 * MILLIGAL
    reference_density: str | float = 2.67 * GRAM_PER_CM3
    tide: str = "ephemeris"
    tide_factor: float = 1.16
    pressure_admittance: float = -0.3e-8 / 100.0
    drift_order: str | int = "auto"
    drift_walk: str | float = "auto"
    tares: str = "listed"
    outliers: str = "flag"
    noise: str = "estimate"
    depth_sd: float = 0.03
    depth_scale_sd: float = 0.0
    datum_station: str | None = None
    datum_sd: float = 50.0 * MILLIGAL
    same_place: float = 0.25
    min_thickness: float = 0.5
    visit_gap: float = 15.0 * 60.0
    out_of_table: str = "error"
    scale_factor: str = "given"
    layers: str = "plain"
    layer_boundaries: str | float = "auto"
    terrain_tolerance: float = 1e-8


@dataclass(frozen=True, slots=True, kw_only=True)
class RecipeKey:
    """What one key of the recipe means.

    Parameters
    ----------
    key, label : str
    words : tuple
        Words (and whole numbers) that may stand as its value.
    unit : str
        Unit in which a number is written; "" for none.
    factor : float or None
        SI value of one unit; None when no free number may stand.
    least, most : float
        Limits of a number, in the written unit; `above` when the least itself is refused.
    what, source : str
        What it does, and the published source or "common practice".
    """

    key: str
    label: str
    words: tuple[str | int, ...] = ()
    unit: str = ""
    factor: float | None = None
    least: float = -math.inf
    most: float = math.inf
    above: bool = False
    what: str
    source: str


KEYS: dict[str, RecipeKey] = {
    one.key: one
    for one in (
        RecipeKey(
            key="normal_gravity", label="Normal gravity", words=("WGS84", "GRS80", "GRS67", "1930"),
            what="the system of normal gravity that is taken out", source="NIMA TR8350.2; Moritz 2000; Cassinis 1930",
        ),
        RecipeKey(
            key="height_form", label="Height form", words=("closed", "series"),
            what="normal gravity at height: closed form, or the second-order series of older surveys",
            source="Heiskanen & Moritz 1967; Li & Goetze 2001; Hinze et al. 2005",
        ),
        RecipeKey(
            key="free_air", label="Free-air gradient", words=("normal",), unit="mGal/m",
            what='"normal", or a measured gradient with its sd: { gradient = 0.3072, sd = 0.0004 }',
            source="Heiskanen & Moritz 1967 (Bruns)",
        ),
        RecipeKey(
            key="gradient_sd", label="Sd of the normal gradient", unit="mGal/m", factor=MILLIGAL, least=0.0, most=0.01,
            what="sd of the normal gradient as a model of the local one; common to all intervals",
            source="common practice",
        ),
        RecipeKey(
            key="reference_density", label="Reference density", words=("markers", "log"), unit="g/cm3",
            factor=GRAM_PER_CM3, least=0.0, most=10.0,
            what="density of the rock shells between the ground and a station", source="common practice",
        ),
        RecipeKey(
            key="tide", label="Tide", words=("ephemeris", "longman", "table", "none"),
            what="where the tide correction comes from", source="positions by ERFA; Longman 1959",
        ),
        RecipeKey(
            key="tide_factor", label="Gravimetric factor", factor=1.0, least=0.0, most=3.0,
            what="factor on the rigid-earth tide", source="common practice, 1.16",
        ),
        RecipeKey(
            key="pressure_admittance", label="Pressure admittance", unit="uGal/hPa", factor=1e-8 / 100.0,
            least=-5.0, most=5.0, what="gravity per hPa of air pressure over the standard atmosphere",
            source="IAG 1983, resolution 9",
        ),
        RecipeKey(
            key="drift_order", label="Drift order", words=("auto", 0, 1, 2, 3),
            what="order of the drift polynomial of each run; auto raises it by an F test",
            source="F test at 1 %, common practice",
        ),
        RecipeKey(
            key="drift_walk", label="Drift walk", words=("auto", "off", "on"), unit="mGal/h^1.5",
            factor=MILLIGAL / 3600.0**1.5, least=0.0, most=10.0, above=True,
            what="slow wander of the drift beyond its polynomial", source="integrated random walk",
        ),
        RecipeKey(
            key="tares", label="Tares", words=("listed", "proposed"),
            what="which jumps are taken out: only those listed, or found ones too", source="common practice",
        ),
        RecipeKey(
            key="outliers", label="Outliers", words=("flag", "downweight", "exclude"),
            what="what happens to readings that do not fit", source="Baarda 1968",
        ),
        RecipeKey(
            key="noise", label="Noise", words=("estimate", "as_given"),
            what="reading and re-seating noise: estimated from the survey, or as the instrument states",
            source="restricted maximum likelihood, Patterson & Thompson 1971",
        ),
        RecipeKey(
            key="depth_sd", label="Sd of depths", unit="m", factor=1.0, least=0.0, most=100.0,
            what="sd of a station's stated depth, independent between stations", source="common practice",
        ),
        RecipeKey(
            key="depth_scale_sd", label="Sd of the depth scale", factor=1.0, least=0.0, most=0.1,
            what="relative sd of the depth scale, common to all intervals", source="common practice",
        ),
        RecipeKey(
            key="datum_station", label="Datum station",
            what="the station at which relative gravity is zero; the highest of the column when not given",
            source="common practice",
        ),
        RecipeKey(
            key="datum_sd", label="Sd of the datum", unit="mGal", factor=MILLIGAL, least=0.0,
            what="sd of the unknown absolute level, used only without a tie", source="common practice",
        ),
        RecipeKey(
            key="same_place", label="Same place within", unit="m", factor=1.0, least=0.0, most=100.0,
            what="rows whose depths differ by up to this are one station", source="common practice",
        ),
        RecipeKey(
            key="min_thickness", label="Least thickness", unit="m", factor=1.0, least=0.0, most=1000.0, above=True,
            what="stations nearer than this make no interval", source="common practice",
        ),
        RecipeKey(
            key="visit_gap", label="Visit gap", unit="min", factor=60.0, least=0.0,
            what="a longer pause ends a visit", source="common practice",
        ),
        RecipeKey(
            key="out_of_table", label="Counter outside the table", words=("error", "extend"),
            what="a counter value beyond the calibration table: refused, or the end slope goes on",
            source="common practice",
        ),
        RecipeKey(
            key="scale_factor", label="Scale factor", words=("given", "estimate"),
            what="the instrument's scale: as given, or estimated from two or more ties", source="common practice",
        ),
        RecipeKey(
            key="layers", label="Layers", words=("plain", "smooth", "blocky", "none"),
            what="manner of the layered density profile", source="generalised least squares",
        ),
        RecipeKey(
            key="layer_boundaries", label="Layer boundaries", words=("auto", "stations", "markers"), unit="m",
            factor=1.0, least=0.1,
            what="where layers part: markers if any, else stations; or a step in m", source="common practice",
        ),
        RecipeKey(
            key="terrain_tolerance", label="Terrain tolerance", unit="uGal", factor=1e-8, least=0.0, above=True,
            what="largest error allowed in the terrain effect", source="common practice",
        ),
    )
}

DEFAULT = Recipe()

# Values that the contract of the recipe knows and this version cannot do; `float` stands for any number.
UNAVAILABLE: dict[str, tuple[str | type, ...]] = {
    "layers": ("smooth", "blocky"),
}


def is_unavailable(key: str, value: Any) -> bool:
    """True for a written value of a key that this version cannot do."""
    refused = UNAVAILABLE.get(key, ())
    return value in refused or (float in refused and _number(value) is not None)


def available_of(key: str) -> str:
    """What this version can do for a key of `UNAVAILABLE`, in words."""
    words = [f'"{word}"' for word in KEYS[key].words if word not in UNAVAILABLE[key]]
    return " or ".join(words)


def nearest_key(key: str) -> str | None:
    """The recipe key whose spelling is nearest to a word, or None when none is near."""
    near = get_close_matches(key, KEYS, n=1, cutoff=0.5)
    return near[0] if near else None


def expected_of(key: str) -> str:
    """What may stand as the value of a key, in words."""
    one = KEYS[key]
    if key == "datum_station":
        return "the label of a station"
    if key == "free_air":
        return '"normal" or { gradient = 0.3072, sd = 0.0004 } in mGal/m, gradient above 0 and under 1, sd 0 to 0.1'
    parts = [f'"{word}"' if isinstance(word, str) else str(word) for word in one.words]
    if one.factor is not None:
        number = "a number" + (f" in {one.unit}" if one.unit else "")
        if one.least > -math.inf:
            number += f" {'above' if one.above else 'from'} {one.least:g}"
        if one.most < math.inf:
            number += f"{', at most' if one.above else ' to'} {one.most:g}"
        parts.append(number)
    return ", ".join(parts[:-1]) + " or " + parts[-1] if len(parts) > 1 else parts[0]


def _number(value: Any) -> float | None:
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return None
    try:
        number = float(value)
    except OverflowError:
        return None
    return number if math.isfinite(number) else None


def from_written(key: str, value: Any) -> Any:
    """The SI value of a recipe key from what is written for it.

    Parameters
    ----------
    key : str
        One of `KEYS`.
    value : str, int, float or dict
        As TOML gives it, in the written unit.

    Raises
    ------
    ValueError
        When the value may not stand for that key; the text is `expected_of(key)`.
    """
    one = KEYS[key]
    if key == "datum_station":
        if isinstance(value, str) and value.strip():
            return value.strip()
        raise ValueError(expected_of(key))
    if key == "free_air" and isinstance(value, dict):
        gradient, sd = _number(value.get("gradient")), _number(value.get("sd"))
        if gradient is None or sd is None or set(value) != {"gradient", "sd"}:
            raise ValueError(expected_of(key))
        if not 0.0 < gradient < 1.0 or not 0.0 <= sd <= 0.1:
            raise ValueError(expected_of(key))
        return (gradient * MILLIGAL, sd * MILLIGAL)
    if not isinstance(value, bool) and value in one.words and not isinstance(value, float):
        return value
    number = _number(value)
    if one.factor is None or number is None:
        raise ValueError(expected_of(key))
    if number < one.least or number > one.most or (one.above and number == one.least):
        raise ValueError(expected_of(key))
    return number * one.factor


def as_written(recipe: Recipe) -> dict[str, Any]:
    """All keys of a recipe in written units, as survey.toml and summary.json hold them."""
    written: dict[str, Any] = {}
    for field in fields(recipe):
        value = getattr(recipe, field.name)
        factor = KEYS[field.name].factor
        if isinstance(value, tuple):
            value = {"gradient": value[0] / MILLIGAL, "sd": value[1] / MILLIGAL}
            value = {name: float(f"{number:.12g}") for name, number in value.items()}
        elif isinstance(value, float) and factor is not None:
            value = float(f"{value / factor:.12g}")
        written[field.name] = value
    return written


def with_written(recipe: Recipe, key: str, value: Any) -> Recipe:
    """The recipe with one key changed to a written value; raises ValueError as `from_written` does."""
    return replace(recipe, **{key: from_written(key, value)})
