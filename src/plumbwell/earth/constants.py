"""Physical constants and units of gravity, SI, each with its source.

Values that define an ellipsoid stand in `ellipsoid`, those of the Moon and the Sun in `moon_sun`.
"""

from __future__ import annotations

from math import pi

G = 6.67430e-11
"""Newtonian constant of gravitation, m3 kg-1 s-2: CODATA 2018, unchanged in CODATA 2022."""

TWO_PI_G = 2.0 * pi * G
"""Attraction of an endless slab per thickness and density, m3 kg-1 s-2 (Bouguer plate)."""

FOUR_PI_G = 4.0 * pi * G
"""Change of the vertical gradient per density, m3 kg-1 s-2 (Poisson's equation)."""

STANDARD_GRAVITY = 9.80665
"""Conventional standard acceleration of free fall, m s-2: 3rd CGPM (1901), exact."""

MILLIGAL = 1e-5
"""One milligal, m s-2, exact."""

MICROGAL = 1e-8
"""One microgal, m s-2, exact."""

EOTVOS = 1e-9
"""One eotvos, s-2, exact."""

GRAM_PER_CM3 = 1000.0
"""1 g/cm3 in kg m-3, exact."""
