"""Positions of Moon and Sun in the frame that turns with the Earth, from UTC.

Geocentric, x toward Greenwich, y toward 90 degrees east, z north; geometric (no light-time), UT1 = UTC
and no motion of the pole, which together cost at most 0.013 uGal of tide (0.9 s of clock).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

GM_MOON = 4.902800118e12
"""m3 s-2 (DE440: Park et al. 2021, Astron. J. 161, 105)."""

GM_SUN = 1.32712440041279419e20
"""m3 s-2 (DE440: Park et al. 2021)."""

ASTRONOMICAL_UNIT = 149_597_870_700.0
"""m (IAU 2012, resolution B2), exact."""

MOON_SHARE = 1.0 / (1.0 + 81.300568)
"""Mass of the Moon over that of Earth and Moon together (DE440: Park et al. 2021)."""

_EPOCH_JD = 2451544.5
_DAY = 86400.0
_TT_LESS_TAI = 32.184
_EPOCH = np.datetime64("2000-01-01T00:00:00", "s")
# The years the two theories of the Earth's motion are made for: the short one and the long one.
_YEARS = {False: (1000, 3000), True: (1900, 2100)}


def terrestrial_less_utc(utc_seconds: ArrayLike) -> NDArray[np.float64]:
    """TT - UTC in seconds, from the table of leap seconds.

    Parameters
    ----------
    utc_seconds : (n,) array_like
        Seconds since 2000-01-01T00:00:00Z, every day having 86 400 of them.

    Returns
    -------
    (n,), s
        After the end of the table the last value; before 1960 the first; from 1960 to 1972 without the slow
        rates of that time, which is at most some seconds (below 0.01 uGal of tide).
    """
    import erfa

    table = erfa.leap_seconds.get()
    month = (table["year"].astype(int) - 1970) * 12 + table["month"].astype(int) - 1
    starts = month.astype("datetime64[M]").astype("datetime64[s]") - _EPOCH
    step = np.searchsorted(starts.astype(float), utc_seconds, side="right") - 1
    return table["tai_utc"][np.maximum(step, 0)] + _TT_LESS_TAI


def moon_and_sun(
    utc_seconds: ArrayLike, *, full: bool = False
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Geocentric positions of Moon and Sun in the Earth-fixed frame, m.

    Parameters
    ----------
    utc_seconds : (n,) array_like
        Seconds since 2000-01-01T00:00:00Z without leap seconds.
    full : bool
        With the whole IAU 2006/2000A rotation and the long theory of the Earth's motion: some twenty times
        slower, for checks.

    Returns
    -------
    moon, sun : (n, 3), m

    Raises
    ------
    ValueError
        A time that is no number, or outside the years 1000 to 2999 (1900 to 2099 when `full`).

    Notes
    -----
    The Moon is the series of Meeus (1998) after Chapront-Touze & Chapront; the Sun is the Earth-Moon
    barycentre of Simon et al. (1994, Astron. Astrophys. 282, 663-683), seen from the other side and shifted
    by the Moon's pull on the Earth. The frame turns by the Earth rotation angle about the celestial
    intermediate pole (IAU 2000B nutation, which is slow enough to be taken once a day).
    """
    import erfa

    utc_seconds = np.asarray(utc_seconds, dtype=float)
    first, last = _YEARS[full]
    begin, end = ((np.datetime64(f"{year}-01-01", "s") - _EPOCH).astype(float) for year in (first, last))
    if not ((utc_seconds >= begin) & (utc_seconds < end)).all():
        raise ValueError(
            f"times must be numbers within the years {first} to {last - 1} to place Moon and Sun"
        )
    ut_day = utc_seconds / _DAY
    tt_day = ut_day + terrestrial_less_utc(utc_seconds) / _DAY
    moon = erfa.moon98(_EPOCH_JD, tt_day)["p"]
    if full:
        sun = -erfa.epv00(_EPOCH_JD, tt_day)[0]["p"]
        to_pole = erfa.c2i06a(_EPOCH_JD, tt_day)
    else:
        sun = MOON_SHARE * moon - erfa.plan94(_EPOCH_JD, tt_day, 3)["p"]
        to_pole = _to_pole(tt_day)
    turned = erfa.rz(erfa.era00(_EPOCH_JD, ut_day), to_pole)
    return ASTRONOMICAL_UNIT * erfa.rxp(turned, moon), ASTRONOMICAL_UNIT * erfa.rxp(turned, sun)


def _to_pole(tt_day: NDArray[np.float64]) -> NDArray[np.float64]:
    """Celestial-to-intermediate matrices, linear between midnights: off by less than 0.01 arcsec."""
    import erfa

    before = np.floor(tt_day)
    nights = np.unique((before, before + 1.0))
    matrices = erfa.c2i00b(_EPOCH_JD, nights)
    at = np.searchsorted(nights, before)
    share = np.asarray(tt_day - before)[..., None, None]
    return matrices[at] + share * (matrices[at + 1] - matrices[at])
