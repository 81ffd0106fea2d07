"""Limits by chance against closed forms of Student's t and against the normal distribution."""

from math import inf, pi, sqrt, tan

import pytest
from scipy import stats

from plumbwell.reduction.chance import chi_square_chance, student_limit


def test_limits_of_students_t_are_those_of_its_closed_forms():
    for chance in (0.2, 0.05, 0.01, 1e-5):
        # One degree of freedom is Cauchy's distribution; two have an algebraic one, with p = 1 - chance / 2.
        assert student_limit(chance, freedom=1) == pytest.approx(tan(pi * (0.5 - chance / 2)), rel=1e-9)
        p = 1.0 - chance / 2
        assert student_limit(chance, freedom=2) == pytest.approx((2 * p - 1) / sqrt(2 * p * (1 - p)), rel=1e-9)


@pytest.mark.parametrize("freedom", [3, 4, 5, 12, 250, 37503.0])
def test_chance_beyond_a_limit_is_the_one_asked_for(freedom):
    for chance in (0.05, 1e-3, 1e-6):
        assert 2.0 * stats.t.sf(student_limit(chance, freedom=freedom), freedom) == pytest.approx(chance, rel=1e-7)


def test_a_known_sd_has_the_limits_of_the_normal_distribution():
    assert student_limit(0.05, freedom=inf) == pytest.approx(1.959963984540054, rel=1e-12)
    assert student_limit(0.05, freedom=1e7) == pytest.approx(student_limit(0.05, freedom=inf), rel=1e-6)


@pytest.mark.parametrize(("chance", "freedom"), [(0.05, 0), (0.05, -1), (0.0, 5), (1.0, 5), (0.05, float("nan"))])
def test_no_limit_without_freedom_or_chance(chance, freedom):
    with pytest.raises(ValueError, match="no limit of Student's t"):
        student_limit(chance, freedom=freedom)


def test_chance_of_a_chi_square():
    assert chi_square_chance(12.0, freedom=5) == pytest.approx(stats.chi2.sf(12.0, 5), rel=1e-12)
