"""Units of headings and logs: our own table first, pint only for short plain labels, nothing hostile."""

from __future__ import annotations

import math

import pytest

from plumbwell.survey.units import LABELS, unit


def test_feet_are_exact() -> None:
    assert unit("ft", "m").factor == 0.3048
    assert unit("ftUS", "m").factor == 1200.0 / 3937.0


@pytest.mark.parametrize(
    ("label", "dimension", "factor"),
    [
        ("mGal", "m/s2", 1e-5),
        ("mgal", "m/s2", 1e-5),
        ("MGAL", "m/s2", 1e-5),
        ("µGal", "m/s2", 1e-8),
        ("μGal", "m/s2", 1e-8),
        ("nm/s²", "m/s2", 1e-9),
        ("M", "m", 1.0),
        ("g/cm³", "kg/m3", 1000.0),
        ("G/C3", "kg/m3", 1000.0),
        ("lb/ft3", "kg/m3", 0.45359237 / 0.3048**3),
        ("E", "s-2", 1e-9),
        ("hPa", "Pa", 100.0),
        ("mbar", "Pa", 100.0),
        ("arcsec", "rad", math.pi / 648000.0),
        ("counts", "counts", 1.0),
    ],
)
def test_label_of_our_own_table(label: str, dimension: str, factor: float) -> None:
    assert unit(label, dimension).factor == pytest.approx(factor, rel=1e-15)


def test_temperatures_have_an_offset() -> None:
    celsius, fahrenheit = unit("°C", "K"), unit("degF", "K")
    assert 21.0 * celsius.factor + celsius.offset == pytest.approx(294.15, abs=1e-12)
    assert 212.0 * fahrenheit.factor + fahrenheit.offset == pytest.approx(373.15, abs=1e-10)


def test_a_label_that_only_the_general_library_knows() -> None:
    assert unit("fathom", "m").factor == pytest.approx(1.8288, rel=1e-5)
    assert unit("psi", "Pa").factor == pytest.approx(6894.757, rel=1e-6)


@pytest.mark.parametrize(
    ("label", "dimension"),
    [
        ("gal", "m"),
        ("mGal", "m"),
        ("m", "m/s2"),
        ("percent", "rad"),
        ("kg", "m"),
        ("", "m"),
        ("bananas", "m"),
    ],
)
def test_label_of_another_dimension_is_refused_with_those_that_serve(label: str, dimension: str) -> None:
    with pytest.raises(ValueError) as caught:
        unit(label, dimension)
    assert str(caught.value) == "one of " + ", ".join(LABELS[dimension])


@pytest.mark.parametrize(
    "label", ["10**10**10", "m**999999999", "((((((m))))))", "m" * 100_000, "9" * 39, "__import__('os')"]
)
def test_hostile_labels_are_refused_at_once(label: str) -> None:
    with pytest.raises(ValueError):
        unit(label, "m")
