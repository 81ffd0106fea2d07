"""An invented survey for plates: layers, stations, a log with a washed-out stretch and a gap."""

import math
import random

import pytest

from plumbwell.plates.log_curve import LogCurve
from plumbwell.plates.plate import PlateFinding, PlateInterval, PlateStation, SurveyPlate
from plumbwell.plates.theme import theme_named

LAYERS = (
    ("Hask Gravel", 0.0, 1.95),
    ("Oster Chalk", 0.175, 2.24),
    ("Marrow Shale", 0.461, 2.51),
    ("Corran Salt", 0.533, 2.16),
    ("Kett Anhydrite", 0.588, 2.93),
    ("Vane Marble", 0.825, 2.70),
)


def _density(part):
    return [density for _, top, density in LAYERS if top <= part][-1]


def make_plate(intervals, *, span=1440.0, log=True, log_samples=1500, markers=True, **changes):
    """Return a plate with so many intervals of uneven thickness."""
    chance = random.Random(7)
    parts = [0.0]
    for _ in range(intervals):
        parts.append(parts[-1] + chance.uniform(0.6, 1.4))
    edges = [round(part / parts[-1] * span, 1) for part in parts]
    log_depths = [span * (0.02 + 0.95 * index / log_samples) for index in range(log_samples)] if log else []
    log_values = [
        None
        if 0.75 < z / span < 0.77
        else _density(z / span) + chance.gauss(0, 0.012) - 0.3 * (0.54 < z / span < 0.55)
        for z in log_depths
    ]
    rows, stations = (
        [],
        [PlateStation(label="1", depth=0.0, gravity=60.0, gravity_sd=0.003, anomaly=0.0, anomaly_sd=0.006)],
    )
    gravity = 60.0
    for number, (top, base) in enumerate(zip(edges, edges[1:], strict=False), start=1):
        density = _density((top + base) / 2 / span) + chance.gauss(0, 0.006)
        inside = [
            value
            for z, value in zip(log_depths, log_values, strict=True)
            if top <= z < base and value is not None
        ]
        mean = sum(inside) / len(inside) if inside else None
        sd = 0.009 * chance.uniform(0.8, 1.3)
        difference = None if mean is None else density - mean
        difference_sd = None if mean is None else math.hypot(sd, 0.005)
        ratio = None if mean is None else difference / difference_sd
        rows.append(
            PlateInterval(
                number=number,
                top=top,
                base=base,
                density=density,
                sd=sd,
                common_sd=0.0012,
                slab=density - 0.0006,
                log=mean,
                difference=difference,
                difference_sd=difference_sd,
                ratio=ratio,
                flagged=ratio is not None and abs(ratio) >= 3,
            )
        )
        gravity += (0.3085 - 0.0839 * density) * (base - top)
        stations.append(
            PlateStation(
                label=str(number + 1),
                depth=base,
                gravity=gravity,
                gravity_sd=0.003,
                anomaly=0.3 * math.sin(5 * base / span),
                anomaly_sd=0.006,
            )
        )
    values = {
        "title": "Tolmire 4",
        "subtitle": f"{intervals + 1} stations, invented",
        "depth_label": "MD",
        "intervals": tuple(rows),
        "stations": tuple(stations),
        "markers": tuple((name, top * span) for name, top, _ in LAYERS) if markers else (),
        "log": LogCurve.of(log_depths, log_values) if log else None,
        "findings": (
            PlateFinding(
                severity="look", depth=0.54 * span, words="Lighter in the log: the caliper shows a wide hole."
            ),
            PlateFinding(severity="note", words="The deviation survey ends above the last station."),
        ),
        "remarks": ("recipe as surveyed", "datum station 1, absolute", "33 degrees of freedom", "Plumbwell"),
    }
    return SurveyPlate(**{**values, **changes})


@pytest.fixture(scope="session")
def invented_plate():
    """The maker of invented plates."""
    return make_plate


@pytest.fixture
def invented(qapp, invented_plate):
    """The maker of invented plates, with the application that drawing needs."""
    return invented_plate


@pytest.fixture(params=["light", "dark", "print"])
def any_theme(request):
    """Each theme in turn."""
    return theme_named(request.param)


@pytest.fixture
def light():
    """The light theme."""
    return theme_named("light")
