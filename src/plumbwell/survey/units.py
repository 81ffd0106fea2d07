"""Units of the borders: what a label in a heading or a log means in SI.

Our own table comes first, without regard to case, because a general unit library reads `mgal` as
a milligallon and does not know `g/cm3` or `E`; only a label that the table does not hold goes to
pint, and only when it is short and plain.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from math import pi

FOOT = 0.3048
SURVEY_FOOT = 1200.0 / 3937.0
POUND = 0.45359237
ZERO_CELSIUS = 273.15
ZERO_FAHRENHEIT = ZERO_CELSIUS - 32.0 * 5.0 / 9.0
MAXIMUM_LABEL = 40

# Labels by dimension, the dimension named by its SI unit; each label with its factor and offset:
# SI value = factor x written value + offset. The first spellings are those shown in messages.
LABELS: dict[str, dict[str, tuple[float, float]]] = {
    "m": {
        "m": (1.0, 0.0),
        "cm": (0.01, 0.0),
        "mm": (0.001, 0.0),
        "km": (1000.0, 0.0),
        "ft": (FOOT, 0.0),
        "ftUS": (SURVEY_FOOT, 0.0),
        "in": (FOOT / 12.0, 0.0),
    },
    "m/s2": {
        "mGal": (1e-5, 0.0),
        "uGal": (1e-8, 0.0),
        "Gal": (1e-2, 0.0),
        "m/s2": (1.0, 0.0),
        "um/s2": (1e-6, 0.0),
        "nm/s2": (1e-9, 0.0),
    },
    "kg/m3": {
        "g/cm3": (1000.0, 0.0),
        "g/cc": (1000.0, 0.0),
        "kg/m3": (1.0, 0.0),
        "t/m3": (1000.0, 0.0),
        "lb/ft3": (POUND / FOOT**3, 0.0),
    },
    "s-2": {
        "E": (1e-9, 0.0),
        "mGal/m": (1e-5, 0.0),
        "uGal/m": (1e-8, 0.0),
        "mGal/ft": (1e-5 / FOOT, 0.0),
        "s-2": (1.0, 0.0),
        "1/s2": (1.0, 0.0),
    },
    "Pa": {
        "hPa": (100.0, 0.0),
        "mbar": (100.0, 0.0),
        "kPa": (1000.0, 0.0),
        "Pa": (1.0, 0.0),
        "bar": (1e5, 0.0),
    },
    "K": {
        "degC": (1.0, ZERO_CELSIUS),
        "degF": (5.0 / 9.0, ZERO_FAHRENHEIT),
        "K": (1.0, 0.0),
        "mK": (1e-3, 0.0),
    },
    "rad": {
        "deg": (pi / 180.0, 0.0),
        "arcmin": (pi / 180.0 / 60.0, 0.0),
        "arcsec": (pi / 180.0 / 3600.0, 0.0),
        "rad": (1.0, 0.0),
        "mrad": (1e-3, 0.0),
        "urad": (1e-6, 0.0),
        "gon": (pi / 200.0, 0.0),
    },
    "s": {"s": (1.0, 0.0), "min": (60.0, 0.0), "h": (3600.0, 0.0)},
    "counts": {"counts": (1.0, 0.0)},
}

# Other spellings of the labels above.
SPELLINGS: dict[str, str] = {
    "meter": "m",
    "metre": "m",
    "meters": "m",
    "metres": "m",
    "feet": "ft",
    "foot": "ft",
    "usft": "ftUS",
    "ftus": "ftUS",
    "us-ft": "ftUS",
    "inch": "in",
    "inches": "in",
    "milligal": "mGal",
    "microgal": "uGal",
    "m/s/s": "m/s2",
    "ms-2": "m/s2",
    "nms-2": "nm/s2",
    "gm/cc": "g/cc",
    "g/cm-3": "g/cm3",
    "g/c3": "g/cm3",
    "k/m3": "kg/m3",
    "lb/f3": "lb/ft3",
    "eotvos": "E",
    "eu": "E",
    "millibar": "mbar",
    "celsius": "degC",
    "fahrenheit": "degF",
    "kelvin": "K",
    "degree": "deg",
    "degrees": "deg",
    "sec": "s",
    "second": "s",
    "seconds": "s",
    "minute": "min",
    "minutes": "min",
    "hour": "h",
    "hours": "h",
    "count": "counts",
}

_CHARACTERS = str.maketrans(
    {"\u00b5": "u", "\u03bc": "u", "\u00b2": "2", "\u00b3": "3", "^": None, " ": None}
)
# What may go to pint: letters with small powers, joined by * / or a blank; never a number that stands alone.
_PLAIN = re.compile(
    r"[A-Za-z\u00b5\u03bc\u00b0]+(?:(?:\*\*|\^)?-?[1-4])?"
    r"(?:[ */]+[A-Za-z\u00b5\u03bc\u00b0]+(?:(?:\*\*|\^)?-?[1-4])?){0,4}"
)


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit of a written number: SI value = factor times written value + offset.

    Parameters
    ----------
    label : str
        As shown to people.
    factor, offset : float
    dimension : str
        The SI unit of the dimension, e.g. "m/s2"; "counts" for counter values.
    """

    label: str
    factor: float
    offset: float
    dimension: str


def _key(label: str) -> str:
    key = label.strip().translate(_CHARACTERS)
    if "\u00b0" in key:
        key = key.replace("\u00b0", "deg")
    return key.lower()


_TABLE: dict[str, dict[str, str]] = {
    dimension: {_key(label): label for label in table} for dimension, table in LABELS.items()
}


def known_labels(*dimensions: str) -> str:
    """The labels that our own table holds for some dimensions, in words for a message."""
    return ", ".join(label for dimension in dimensions for label in LABELS[dimension])


def dimension_of(label: str) -> str | None:
    """The dimension (its SI unit) that our own table gives a label, or None when it does not hold it."""
    key = _key(label)
    key = _key(SPELLINGS.get(key, key))
    return next((dimension for dimension, table in _TABLE.items() if key in table), None)


def unit(label: str, dimension: str) -> Unit:
    """The unit that a label means for a quantity of a given dimension.

    Parameters
    ----------
    label : str
        As written between square brackets.
    dimension : str
        SI unit of the dimension: one of the keys of `LABELS`.

    Raises
    ------
    ValueError
        When the label is unknown or of another dimension; the text lists the labels that serve.
    """
    table = _TABLE[dimension]
    key = _key(label)
    key = _key(SPELLINGS.get(key, key))
    if key in table:
        shown_label = table[key]
        factor, offset = LABELS[dimension][shown_label]
        return Unit(shown_label, factor, offset, dimension)
    # a label that the table holds for something else never goes to pint, which may see another meaning
    # (and an angle is a bare number to it, so that percent would pass)
    if dimension_of(label) is None and dimension not in ("counts", "rad"):
        factor_found = _by_pint(label.strip(), dimension)
        if factor_found is not None:
            return Unit(label.strip(), factor_found, 0.0, dimension)
    raise ValueError(f"one of {known_labels(dimension)}")


@lru_cache(maxsize=256)
def _by_pint(label: str, dimension: str) -> float | None:
    """Factor to SI of a label that our table does not hold, None when it is no unit of that dimension.

    The label is checked against a narrow grammar first: powers of numbers or very long texts,
    which would hang the general parser, never reach it.
    """
    if len(label) > MAXIMUM_LABEL or not _PLAIN.fullmatch(label):
        return None
    import pint

    registry = pint.get_application_registry()
    try:
        quantity = registry.Quantity(1.0, registry.parse_units(label))
        wanted = registry.parse_units(
            {"m/s2": "m/s**2", "kg/m3": "kg/m**3", "s-2": "1/s**2", "K": "delta_degC"}.get(
                dimension, dimension
            )
        )
        factor = float(quantity.to(wanted).magnitude)
    except (
        Exception
    ):  # pint raises many kinds, its parser's own among them; all mean: not a unit of this dimension
        return None
    return factor if 0.0 < factor < float("inf") else None
