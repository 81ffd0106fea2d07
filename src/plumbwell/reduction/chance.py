"""How likely a misfit is by chance alone, and how far chance alone reaches."""

from __future__ import annotations

from math import inf


def chi_square_chance(value: float, *, freedom: int) -> float:
    """Probability of a chi-square at least as large as the value, 0 to 1.

    Parameters
    ----------
    value : float
        Weighted sum of squares.
    freedom : int
        Its degrees of freedom, at least 1.
    """
    from scipy.special import chdtrc

    return float(chdtrc(freedom, value))


def f_chance(value: float, *, steps: int, freedom: int) -> float:
    """Probability of Fisher's F at least as large as the value, 0 to 1.

    Parameters
    ----------
    value : float
        Ratio of what a step explains, over its degrees of freedom, to what is left over its own.
    steps, freedom : int
        Degrees of freedom of both, at least 1.
    """
    from scipy.special import fdtrc

    return float(fdtrc(steps, freedom, value))


def student_limit(chance: float, *, freedom: float) -> float:
    """Ratio to its sd that a Student's t exceeds, to either side, with the given chance.

    Parameters
    ----------
    chance : float
        Of both sides together, 0 to 1; 0.05 gives the limit of 95 % confidence.
    freedom : float
        Degrees of freedom of the sd, above 0; infinity where the sd is known: the normal distribution.

    Raises
    ------
    ValueError
        There is no degree of freedom, or the chance lies outside.
    """
    from scipy.special import ndtri, stdtrit

    if not (0.0 < chance < 1.0 and freedom > 0.0):
        raise ValueError(f"no limit of Student's t with a chance of {chance} and {freedom} degrees of freedom")
    return float(-ndtri(chance / 2.0) if freedom == inf else -stdtrit(freedom, chance / 2.0))
