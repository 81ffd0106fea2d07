"""Colours by role, and the tone of a density.

Roles are read from ``resources/themes``; code names roles only. The density scale is the same in every theme
and every survey: sand for light rock, through stone grey, to slate for heavy rock. Densities in g/cm3.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from math import floor, inf
from types import MappingProxyType

from PySide6.QtGui import QColor

from plumbwell.reduction.chance import student_limit
from plumbwell.resources import resource

TONE_LIGHTEST, TONE_HEAVIEST = 1.6, 3.4
THEMES = ("light", "dark", "print")
CONFIDENCE = 95
"""Per cent; the choice of bars that are limits of confidence."""

# OKLab (L, a, b), one stop each 0.1 g/cm3 from 1.6 to 3.4.
TONE_STOPS = (
    (0.9550, 0.0000, 0.0300),
    (0.9260, 0.0010, 0.0402),
    (0.8968, 0.0021, 0.0500),
    (0.8646, 0.0035, 0.0550),
    (0.8228, 0.0061, 0.0580),
    (0.7718, 0.0093, 0.0599),
    (0.7221, 0.0113, 0.0573),
    (0.6757, 0.0127, 0.0479),
    (0.6312, 0.0127, 0.0371),
    (0.5904, 0.0105, 0.0235),
    (0.5514, 0.0075, 0.0101),
    (0.5172, 0.0036, -0.0014),
    (0.4866, -0.0005, -0.0115),
    (0.4526, -0.0041, -0.0213),
    (0.4224, -0.0072, -0.0297),
    (0.3933, -0.0094, -0.0366),
    (0.3612, -0.0100, -0.0411),
    (0.3273, -0.0100, -0.0437),
    (0.2920, -0.0100, -0.0460),
)


def _srgb_from_oklab(lightness: float, a: float, b: float) -> str:
    """Return the hex colour of an OKLab triple, clipped to sRGB."""
    long = (lightness + 0.3963377774 * a + 0.2158037573 * b) ** 3
    medium = (lightness - 0.1055613458 * a - 0.0638541728 * b) ** 3
    short = (lightness - 0.0894841775 * a - 1.2914855480 * b) ** 3
    linear = (
        4.0767416621 * long - 3.3077115913 * medium + 0.2309699292 * short,
        -1.2684380046 * long + 2.6097574011 * medium - 0.3413193965 * short,
        -0.0041960863 * long - 0.7034186147 * medium + 1.7076147010 * short,
    )
    bytes_ = []
    for channel in linear:
        channel = min(max(channel, 0.0), 1.0)
        encoded = 12.92 * channel if channel <= 0.0031308 else 1.055 * channel ** (1 / 2.4) - 0.055
        bytes_.append(round(255 * encoded))
    return "#{:02x}{:02x}{:02x}".format(*bytes_)


@cache
def tone_table() -> tuple[str, ...]:
    """Return the 1801 tones from 1.600 to 3.400 g/cm3, one each 0.001 g/cm3, as hex colours.

    Notes
    -----
    Linear in OKLab between the stops, then sRGB. OKLab after Ottosson, B., 2020, A perceptual color space for
    image processing.
    """
    table = []
    for index in range(1801):
        stop, rest = divmod(index, 100)
        if stop == len(TONE_STOPS) - 1:
            stop, rest = stop - 1, 100
        part = rest / 100.0
        low, high = TONE_STOPS[stop], TONE_STOPS[stop + 1]
        table.append(_srgb_from_oklab(*(x + part * (y - x) for x, y in zip(low, high, strict=True))))
    return tuple(table)


def tone_hex(density: float) -> str:
    """Return the tone of a density in g/cm3 as a hex colour; the end tones go on beyond both ends."""
    index = round((density - TONE_LIGHTEST) * 1000)
    return tone_table()[min(max(index, 0), 1800)]


def beyond_scale(density: float) -> bool:
    """Return whether a density in g/cm3 lies outside the tone scale and is to be hatched."""
    return not TONE_LIGHTEST <= density <= TONE_HEAVIEST


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Theme:
    """Colours by role, text scale and line weights of one look.

    Parameters
    ----------
    name : str
        "light", "dark" or "print".
    roles : Mapping of str to str
        Role name to hex colour.
    text_scale : float
        Factor on the three text sizes.
    sizes : tuple of int
        Heading, text and small size in px before scaling.
    hairline, step : float
        Width of hairlines and of gravity-derived steps in px.
    bars : int
        What drawn bars and bands reach to each side: 1 or 2 standard deviations, or 95, the limits of 95 % confidence.
    freedom : int or None
        Degrees of freedom of the standard deviations drawn; None where they are not known: the normal distribution.
    """

    name: str
    roles: Mapping[str, str]
    text_scale: float = 1.0
    sizes: tuple[int, int, int] = (19, 14, 13)
    hairline: float = 1.0
    step: float = 1.6
    bars: int = 2
    freedom: int | None = None

    @property
    def reach(self) -> float:
        """Standard deviations that bars and bands reach to each side: 1, 2, or the limit of Student's t."""
        if self.bars != CONFIDENCE:
            return float(self.bars)
        return student_limit(1.0 - CONFIDENCE / 100.0, freedom=inf if self.freedom is None else self.freedom)

    @property
    def reach_words(self) -> str:
        """How far bars and bands reach, in words: "2 sd", "95 % (t, 12 dof)"."""
        if self.bars != CONFIDENCE:
            return f"{self.bars} sd"
        return f"{CONFIDENCE} %" + ("" if self.freedom is None else f" (t, {self.freedom} dof)")

    def px(self, length: float) -> int:
        """Return a length of the unscaled design, in px, grown with the text and whole."""
        return floor(length * self.text_scale + 0.5)

    def colour(self, role: str, alpha: int = 255) -> QColor:
        """Return the colour of a role, with `alpha` from 0 (clear) to 255."""
        colour = QColor(self.roles[role])
        colour.setAlpha(alpha)
        return colour

    def tone(self, density: float) -> QColor:
        """Return the tone of a density in g/cm3."""
        return QColor(tone_hex(density))


@cache
def theme_named(name: str, text_scale: float = 1.0) -> Theme:
    """Return the theme "light", "dark" or "print" with its colours from ``resources/themes``.

    Raises
    ------
    ValueError
        There is no theme of this name.
    """
    if name not in THEMES:
        raise ValueError(f"no theme {name!r}; there are {', '.join(THEMES)}")
    roles = json.loads(resource(f"themes/{name}.json").read_text(encoding="utf-8"))
    return Theme(name=name, roles=MappingProxyType(roles), text_scale=text_scale)
