"""How likely a misfit is by chance alone."""

from __future__ import annotations


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
