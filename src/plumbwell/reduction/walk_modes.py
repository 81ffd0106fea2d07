"""The integrated random walk as a sum of modes: smooth curves of time with independent coefficients.

A rate that wanders as a random walk from 0 makes a drift w with w(0) = 0 and w'(0) = 0 whose covariance is the Green
function of the fourth derivative, clamped at the start and free at the end. Its Karhunen-Loeve modes are therefore
those of a clamped beam, and their sds fall with the square of the wave number: a score of modes per run stands for the
walk at any number of readings, and the border of the network stays banded.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from plumbwell.survey.column import Array

LEAST_MODES, MOST_MODES = 4, 96
MOST_PRODUCTS = 4e6
"""Products of two unknowns of one visit that are held at a time."""


@lru_cache(maxsize=4)
def wave_numbers(count: int) -> Array:
    """The first roots of cos(b) cosh(b) = -1, (count,)."""
    b = (np.arange(1, count + 1) - 0.5) * np.pi
    for _ in range(8):
        off = np.cos(b) + 1.0 / np.cosh(b)
        b = b + off / (np.sin(b) + np.sinh(b) / np.cosh(b) ** 2)
    roots: Array = b.astype(np.float64)
    roots.flags.writeable = False
    return roots


def mode_sds(count: int) -> Array:
    """Sd of each mode's coefficient for a walk of strength 1 over a time of 1, (count,)."""
    return wave_numbers(count) ** -2.0


def walk_modes(time: Array, count: int) -> Array:
    """Modes of the walk at times from 0 to 1, (n, count); 0 before, straight on after.

    Notes
    -----
    cosh bx - cos bx - e (sinh bx - sin bx) with e = (cosh b + cos b)/(sinh b + sin b), of mean square 1, written in
    falling exponentials alone (Karhunen 1947; Loeve 1978; the beam's modes e.g. in Blevins 1979).
    """
    b = wave_numbers(count)
    x = np.clip(time, 0.0, 1.0)[:, None]
    small = np.exp(-b)
    whole = 1.0 - small**2 + 2.0 * small * np.sin(b)
    rising = (np.sin(b) - np.cos(b) - small) / whole  # (1 - e)/2 times exp(b)
    e = 1.0 - 2.0 * rising * small
    grown, fallen = rising * np.exp(b * (x - 1.0)), 0.5 * (1.0 + e) * np.exp(-b * x)
    value = grown + fallen - np.cos(b * x) + e * np.sin(b * x)
    after = np.maximum(time - 1.0, 0.0)[:, None]
    if after.any():
        value = value + after * b * (rising - 0.5 * (1.0 + e) * small + np.sin(b) + e * np.cos(b))
    return value


def modes_for(wander: float, rows: int) -> int:
    """How many modes a walk needs whose end sd is so many times the sd of a visit.

    `rows` counts visits, and for each station the square of its runs: that many squares of the modes are held.

    What is left out has a variance of at most 4/(3 pi^4) (m - 1/2)^-3 of the strength squared at any time, the walk's
    end one of 1/3: modes are taken until what is left out is under a fiftieth of a visit's sd. Very many rows get
    no more than may be held, and no fewer than leave out a fiftieth of the wander.
    """
    left = 4.0 / np.pi**4 * (50.0 * wander) ** 2
    most = np.clip(np.sqrt(MOST_PRODUCTS / max(rows, 1)) - 4.0, LEAST_MODES, MOST_MODES)
    return int(np.clip(np.ceil(left ** (1.0 / 3.0) + 0.5), LEAST_MODES, most))
