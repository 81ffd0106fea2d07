"""The spherical cap of land surveys against LaFehr's closed form and what others print of it.

LaFehr 1991, An exact solution for the gravity curvature (Bullard B) correction, Geophysics 56, 1179-1184: the
closed form with mu and lambda, and its cap of 166.735 km on 6371 km.
Talwani 1998, Errors in the total Bouguer reduction, Geophysics 63, 1125-1130: the slab of 0.1118 h mGal of
older tables belongs to G = 6.6635e-11, and G = 6.67e-11 gives 0.111897 h.
Whitman 1991, Geophysics 56, 1980-1985: the correction stays within about 1.5 mGal below 4 km.
"""

from math import cos, log, pi, sin, sqrt

import mpmath as mp
import numpy as np
import pytest

from plumbwell.earth.constants import MICROGAL, MILLIGAL, TWO_PI_G, G
from plumbwell.earth.shells import bullard_b, spherical_cap

ARC, SPHERE, ROCK = 166_735.0, 6_371_000.0, 2670.0


def lafehr(height):
    """Bullard B, m s-2, as printed: 2 pi G rho (mu h - lambda R)."""
    r = SPHERE + height
    alpha = ARC / SPHERE
    eta, delta = height / r, SPHERE / r
    f, kappa = cos(alpha), sin(alpha) ** 2
    q = sqrt((f - delta) ** 2 + kappa)
    d = 3 * f * f - 2
    p = -6 * f * f * sin(alpha / 2) + 4 * sin(alpha / 2) ** 3
    m = -3 * kappa * f
    n = 2 * (sin(alpha / 2) - sin(alpha / 2) ** 2)
    mu = eta * eta / 3 - eta
    curve = ((d + f * delta + delta * delta) * q + p + m * log(n / (f - delta + q))) / 3
    return TWO_PI_G * ROCK * (mu * height - curve * r)


@pytest.mark.parametrize("height", [100.0, 500.0, 1000.0, 2000.0, 4000.0, 8000.0])
def test_bullard_b_is_lafehr_1991(height):
    """The printed form subtracts numbers of the size of the Earth: its own rounding is 0.01 uGal."""
    value = bullard_b(height=height, density=ROCK)
    assert abs(value - lafehr(height)) < 0.02 * MICROGAL


def test_slab_of_the_older_tables_after_talwani_1998():
    per_metre = TWO_PI_G * ROCK / MILLIGAL
    assert abs(per_metre / G * 6.6635e-11 - 0.1118) < 5e-5
    assert abs(per_metre / G * 6.67e-11 - 0.111897) <= 5e-7


def test_bullard_b_below_four_kilometres_after_whitman_1991():
    heights = np.linspace(1.0, 4000.0, 400)
    values = bullard_b(height=heights, density=ROCK) / MILLIGAL
    assert 1.45 < values.max() < 1.55
    assert values.min() > 0


def test_bullard_b_vanishes_near_4150_metres_and_is_largest_near_2074():
    """Recomputed: zero and maximum of the closed form with G of CODATA 2018."""
    assert abs(bullard_b(height=4149.80889, density=ROCK)) < 1e-4 * MICROGAL
    near = bullard_b(height=np.array([2073.0, 2074.14, 2075.3]), density=ROCK)
    assert near[1] > near[0] and near[1] > near[2]


def recomputed(rock_height, station_height, arc):
    """Downward attraction by quadrature over radius of the exact integral over angle, 20 digits."""
    with mp.workdps(25):
        r = mp.mpf(SPHERE) + station_height
        c = mp.cos(mp.mpf(arc) / SPHERE)

        def ring(s):
            # Integral of sin(t) (r - s cos t)/l^3 dt = -d/dr [(l - |r - s|)/(r s)]
            l_edge = mp.sqrt(r * r + s * s - 2 * r * s * c)
            near = mp.sign(r - s)
            return s * s * ((l_edge - abs(r - s)) / (r * r * s) - ((r - s * c) / l_edge - near) / (r * s))

        faces = sorted(
            {mp.mpf(SPHERE), min(max(r, SPHERE), SPHERE + rock_height), mp.mpf(SPHERE) + rock_height}
        )
        return float(2 * mp.pi * mp.mpf(str(G)) * ROCK * mp.quad(ring, faces))


@pytest.mark.parametrize(
    ("rock", "station", "arc"),
    [
        (1000.0, 1000.0, ARC),
        (1000.0, 3000.0, ARC),
        (1000.0, 400.0, ARC),
        (1000.0, 0.0, ARC),
        (1000.0, -2000.0, ARC),
        (3000.0, 3000.0, 2000.0),
        (500.0, 100.0, 5e6),
        (1.0, 1.0, ARC),
    ],
)
def test_cap_above_on_inside_and_under_recomputed(rock, station, arc):
    value = spherical_cap(height_of_rock=rock, station_height=station, density=ROCK, arc=arc)
    assert value == pytest.approx(recomputed(rock, station, arc), rel=1e-8, abs=1e-4 * MICROGAL)


def test_half_a_turn_makes_a_whole_shell():
    """Newton: outside as a point at the centre, nothing inside."""
    volume = 4 / 3 * pi * ((SPHERE + 1000.0) ** 3 - SPHERE**3)
    outside = spherical_cap(height_of_rock=1000.0, station_height=5000.0, density=ROCK, arc=pi * SPHERE)
    inside = spherical_cap(height_of_rock=1000.0, station_height=-5000.0, density=ROCK, arc=pi * SPHERE)
    assert outside == pytest.approx(G * ROCK * volume / (SPHERE + 5000.0) ** 2, rel=1e-10)
    assert abs(inside) < 1e-4 * MICROGAL
