"""What the free-air gradient and a measured one in its place promise."""

import numpy as np
import pytest

from plumbwell.earth.free_air import bruns_gradient, measured_gradient_excess
from plumbwell.earth.normal_gravity import gradient_at_height, gravity_at_height


def test_bruns_grows_with_the_gravity_that_is_there():
    values = bruns_gradient("WGS84", latitude=np.full(2, 0.7), gravity=np.array([9.80, 9.81]))
    assert values.shape == (2,)
    assert values[1] - values[0] == pytest.approx(2 * 0.01 / 6.3725e6, rel=1e-3)


def test_bruns_names_an_unknown_system():
    with pytest.raises(ValueError, match="unknown normal gravity system 'mars'"):
        bruns_gradient("mars", latitude=0.0, gravity=3.7)


def test_measured_excess_is_zero_at_the_collar_and_grows_downward():
    heights = np.array([300.0, 200.0, -700.0])
    excess = measured_gradient_excess(heights, collar_height=300.0, measured=3.10e-6, normal=3.08e-6)
    np.testing.assert_allclose(excess, [0.0, 2e-6, 2e-5], rtol=1e-9)


def test_normal_gravity_with_the_excess_has_the_measured_gradient_at_the_collar():
    normal = float(gradient_at_height("WGS84", latitude=0.8, height=300.0))
    heights = np.array([301.0, 299.0])
    gravity = gravity_at_height("WGS84", latitude=0.8, height=heights) + measured_gradient_excess(
        heights, collar_height=300.0, measured=3.15e-6, normal=normal
    )
    assert (gravity[1] - gravity[0]) / 2.0 == pytest.approx(3.15e-6, rel=1e-8)
