"""Numbers as people read them: decimals that follow the standard deviation, true minus, spaced thousands.

A standard deviation in print is one standard deviation. A trailing unit never stands here; it stands in the
head of the column or axis.
"""

from __future__ import annotations

from collections.abc import Iterable
from math import floor, isfinite, log10

MINUS = "\u2212"
NO_BREAK_SPACE = "\u00a0"
NO_VALUE = "\u2014"
PLUS_MINUS = "\u00b1"
MOST_DECIMALS = 6


def sd_decimals(sd: float) -> int:
    """Return the decimals a standard deviation bears: two figures when its first is 1 or 2, else one.

    Parameters
    ----------
    sd : float
        Standard deviation, more than 0, in the unit it will be printed in.

    Returns
    -------
    int
        0 to 6.
    """
    # Rounding may carry: 0.0297 rounds to 0.030, whose first figure is 3 and bears one figure.
    figures = 2
    mantissa, exponent = f"{sd:.1e}".split("e")
    if mantissa[0] not in "12":
        figures = 1
        mantissa, exponent = f"{sd:.0e}".split("e")
        if mantissa[0] == "1":
            figures = 2
    return min(max(figures - 1 - int(exponent), 0), MOST_DECIMALS)


def column_decimals(sds: Iterable[float | None], *, default: int) -> int:
    """Return the one number of decimals of a column of values.

    That of the smallest standard deviation, at most one more than the largest would ask. Standard deviations
    that are missing, zero or not finite have no say; `default` when none is left.
    """
    known = [sd for sd in sds if sd is not None and isfinite(sd) and sd > 0]
    if not known:
        return default
    return min(sd_decimals(min(known)), sd_decimals(max(known)) + 1)


def number(value: float | None, decimals: int, *, signed: bool = False) -> str:
    """Return a value with its decimals, as people read it.

    Parameters
    ----------
    value : float or None
        None and what is not finite give an em dash.
    decimals : int
        Places after the point.
    signed : bool
        A plus before positive values: for differences, effects, residuals. Rounded to zero there is no sign.

    Returns
    -------
    str
        With a true minus (U+2212) and no-break spaces between thousands from 1 000 on.
    """
    if value is None or not isfinite(value):
        return NO_VALUE
    text = f"{abs(value):,.{decimals}f}".replace(",", NO_BREAK_SPACE)
    if not text.strip("0.\u00a0"):
        return text
    if value < 0:
        return MINUS + text
    return "+" + text if signed else text


def constant(value: float, decimals: int) -> str:
    """Return a constant with a no-break space after every third decimal too, as in 0.083 872."""
    whole, _, places = number(value, decimals).partition(".")
    if not places:
        return whole
    groups = [places[start : start + 3] for start in range(0, len(places), 3)]
    return whole + "." + NO_BREAK_SPACE.join(groups)


def sd_text(sd: float | None, decimals: int) -> str:
    """Return the "± 0.012" that follows a value, or nothing where there is no standard deviation."""
    if sd is None or not isfinite(sd):
        return ""
    return f"{PLUS_MINUS}{NO_BREAK_SPACE}{number(sd, decimals)}"


def with_sd(
    value: float | None, sd: float | None, *, decimals: int | None = None, signed: bool = False
) -> str:
    """Return a value and its standard deviation, as "2.431 ± 0.012"; decimals follow the deviation."""
    if decimals is None:
        decimals = column_decimals([sd], default=3)
    text = number(value, decimals, signed=signed)
    after = sd_text(sd, decimals)
    return f"{text}{NO_BREAK_SPACE}{after}" if after and text != NO_VALUE else text


def step_decimals(step: float) -> int:
    """Return the decimals that tell multiples of a step of 1, 2 or 5 x 10^n apart."""
    return max(0, -floor(log10(step) + 1e-9))


def counted(count: int, noun: str) -> str:
    """Return a count and its noun, as "1 station" or "1 440 stations"."""
    return f"{number(float(count), 0)} {noun if count == 1 else noun + 's'}"
