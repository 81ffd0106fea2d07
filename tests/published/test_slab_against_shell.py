"""The exact shell form of interval density on a spherical Earth, and what the flat form makes of it.

Newton 1687, book I, props. 70 and 71: a shell pulls as a point from outside and not at all inside. Gravity
at both ends of an interval is recomputed here from that alone, in 40 digits.
"""

import mpmath as mp
import numpy as np
import pytest

from plumbwell.earth.constants import FOUR_PI_G, MILLIGAL, G
from plumbwell.earth.shells import interval_density, shell_term, slab_density

RADIUS = 6_371_000
GM = "3.986004418e14"


def recomputed(density, thickness):
    """Gravity at the surface and at the base of the interval, m s-2, and both less the vacuum field."""
    with mp.workdps(40):
        gm, top = mp.mpf(GM), mp.mpf(RADIUS)
        base = top - thickness
        shell = 4 * mp.pi * mp.mpf(str(G)) * density * (top**3 - base**3) / 3
        g_top, g_base = gm / top**2, (gm - shell) / base**2
        return float(g_top), float(g_base), float(g_base - g_top), float(-shell / base**2)


@pytest.mark.parametrize("density", [2500, 2670])
@pytest.mark.parametrize("thickness", [1, 10, 100, 1000, 5000])
def test_shell_form_is_exact(density, thickness):
    g_top, g_base, difference, base_anomaly = recomputed(density, thickness)
    ends = {"top_radius": float(RADIUS), "base_radius": float(RADIUS - thickness)}
    assert interval_density(top_anomaly=0.0, base_anomaly=base_anomaly, **ends) == pytest.approx(
        density, rel=1e-13
    )
    # Total gravity does as well: the field of a point carries no density. 9.8 m s-2 holds fewer digits.
    assert interval_density(top_anomaly=g_top, base_anomaly=g_base, **ends) == pytest.approx(
        density, abs=5e-3 / thickness
    )


@pytest.mark.parametrize("thickness", [1, 100, 5000])
def test_shell_term_is_what_the_shell_takes_away(thickness):
    *_, base_anomaly = recomputed(2670, thickness)
    value = shell_term(
        -float(thickness), ground_height=0.0, radius=float(RADIUS), tops=[0.0], densities=[2670.0]
    )
    assert value == pytest.approx(base_anomaly, rel=1e-13)


def test_flat_form_with_the_gradient_at_the_top_is_low_by_half_a_kilogram_per_kilometre():
    _, _, difference, _ = recomputed(2670, 1000)
    surface = 2 * float(GM) / RADIUS**3
    flat = slab_density(gradient=difference / 1000, free_air_gradient=surface)
    assert flat == pytest.approx(2669.5536, abs=1e-4)


def test_shell_pulls_more_than_the_slab_by_thickness_over_radius():
    thickness = np.array([1.0, 10.0, 100.0, 1000.0, 5000.0])
    shell = -shell_term(-thickness, ground_height=0.0, radius=float(RADIUS), tops=[0.0], densities=[2670.0])
    excess = shell / (FOUR_PI_G * 2670.0 * thickness) - 1
    np.testing.assert_allclose(excess, thickness / RADIUS, rtol=2e-3)
    assert shell[3] / MILLIGAL == pytest.approx(223.9726690, abs=1e-7)


def test_an_anomaly_wrong_by_100_milligal_throughout_moves_densities_by_less_than_half_a_kilogram():
    """What a survey without an absolute tie may be wrong by."""
    *_, base_anomaly = recomputed(2670, 100)
    ends = {"top_radius": float(RADIUS), "base_radius": float(RADIUS - 100)}
    right = interval_density(top_anomaly=0.0, base_anomaly=base_anomaly, **ends)
    wrong = interval_density(top_anomaly=1e-3, base_anomaly=base_anomaly + 1e-3, **ends)
    assert wrong - right == pytest.approx(2e-3 / (FOUR_PI_G * RADIUS), rel=1e-4)
    assert 0.3 < wrong - right < 0.5
