"""The density tones: lightness falls with density for everyone; equal steps look alike where rock is common.

Lightness J' and differences in CAM02-UCS: CIECAM02 (CIE 159:2004) with the uniform space of Luo, M. R.,
Cui, G. and Li, C., 2006; sRGB viewing conditions (64 lux, grey surround of 20 %). Full colour deficiencies
simulated after Machado, G. M., Oliveira, M. M. and Fernandes, L. A. F., 2009, severity 1.0.
"""

import numpy as np
import pytest

from plumbwell.plates.theme import TONE_STOPS, beyond_scale, tone_hex, tone_table

# The stops as the design prints them.
PRINTED_STOPS = (
    "#f8f0da #f1e6c9 #ebdcb8 #e2d1aa #d7c29a #c9b189 #b9a17c #a99375 #998670 #887b6e "
    "#78706b #6a6769 #5c5f66 #4f5662 #434f5f #38475a #2f3e54 #26354c #1d2c43"
).split()

DEFICIENCIES = {
    "normal": np.eye(3),
    "red": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "green": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
    "blue": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]]
    ),
}


def linear_rgb(colours):
    channels = np.array([[int(c[start : start + 2], 16) for start in (1, 3, 5)] for c in colours]) / 255
    return np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)


def cam02_ucs(linear):
    """Return J', a', b' of linear sRGB, shape (n, 3)."""
    to_xyz = np.array(
        [
            [0.4124564, 0.3575761, 0.1804375],
            [0.2126729, 0.7151522, 0.0721750],
            [0.0193339, 0.1191920, 0.9503041],
        ]
    )
    cat02 = np.array([[0.7328, 0.4296, -0.1624], [-0.7036, 1.6975, 0.0061], [0.0030, 0.0136, 0.9834]])
    pointer = np.array([[0.38971, 0.68898, -0.07868], [-0.22981, 1.18340, 0.04641], [0.0, 0.0, 1.0]])
    adapting, background, surround, chromatic, induction = 64 / np.pi / 5, 20.0, 0.69, 1.0, 1.0
    white = 100 * to_xyz.sum(axis=1)
    degree = induction * (1 - np.exp(-(adapting + 42) / 92) / 3.6)
    k = 1 / (5 * adapting + 1)
    level = 0.2 * k**4 * 5 * adapting + 0.1 * (1 - k**4) ** 2 * (5 * adapting) ** (1 / 3)
    n = background / white[1]
    brightness = chromatic_induction = 0.725 * (1 / n) ** 0.2
    z = 1.48 + np.sqrt(n)

    def response(xyz):
        cone = xyz @ cat02.T
        adapted = cone * (white[1] * degree / (white @ cat02.T) + 1 - degree)
        eye = adapted @ np.linalg.inv(cat02).T @ pointer.T
        power = (level * np.abs(eye) / 100) ** 0.42
        return np.sign(eye) * 400 * power / (power + 27.13) + 0.1

    def achromatic(r):
        return (2 * r[..., 0] + r[..., 1] + r[..., 2] / 20 - 0.305) * brightness

    r = response(100 * linear @ to_xyz.T)
    a = r[:, 0] - 12 * r[:, 1] / 11 + r[:, 2] / 11
    b = (r[:, 0] + r[:, 1] - 2 * r[:, 2]) / 9
    hue = np.arctan2(b, a)
    lightness = 100 * (achromatic(r) / achromatic(response(white))) ** (surround * z)
    eccentricity = (np.cos(hue + 2) + 3.8) / 4
    t = 50000 / 13 * chromatic * chromatic_induction * eccentricity * np.hypot(a, b)
    t = t / (r[:, 0] + r[:, 1] + 1.05 * r[:, 2])
    chroma = t**0.9 * np.sqrt(lightness / 100) * (1.64 - 0.29**n) ** 0.73
    colourfulness = np.log1p(0.0228 * chroma * level**0.25) / 0.0228
    ucs = 1.7 * lightness / (1 + 0.007 * lightness)
    return np.column_stack([ucs, colourfulness * np.cos(hue), colourfulness * np.sin(hue)])


def test_the_stops_are_the_colours_of_the_design():
    assert tuple(tone_hex(1.6 + 0.1 * index) for index in range(19)) == tuple(PRINTED_STOPS)
    assert len(TONE_STOPS) == 19
    assert len(tone_table()) == 1801


@pytest.mark.parametrize("vision", sorted(DEFICIENCIES))
def test_lightness_falls_with_density_for_every_eye(vision):
    linear = np.clip(
        linear_rgb([tone_hex(1.6 + 0.1 * index) for index in range(19)]) @ DEFICIENCIES[vision].T, 0, 1
    )
    lightness = cam02_ucs(linear)[:, 0]
    assert np.all(np.diff(lightness) < -2.5)


def test_lightness_spans_the_scale():
    lightness = cam02_ucs(linear_rgb([tone_hex(1.6), tone_hex(3.4)]))[:, 0]
    assert lightness == pytest.approx([95.7, 19.9], abs=0.15)


def test_equal_steps_look_equal_where_rock_is_common():
    densities = [1.6 + 0.05 * index for index in range(37)]
    places = cam02_ucs(linear_rgb([tone_hex(density) for density in densities]))
    steps = np.linalg.norm(np.diff(places, axis=0), axis=1)
    common = [step for step, density in zip(steps, densities, strict=False) if 1.999 <= density < 2.899]
    # Rounding to sRGB bytes moves a colour by up to a quarter of such a step.
    assert min(common) > 2.25
    assert max(common) < 3.35
    assert min(steps) > 1.6


def test_between_stops_the_tone_lies_between_them():
    lightness = cam02_ucs(linear_rgb([tone_hex(2.4), tone_hex(2.45), tone_hex(2.5)]))[:, 0]
    assert lightness[0] > lightness[1] > lightness[2]


def test_beyond_the_scale_the_end_tone_stays_and_is_hatched():
    assert tone_hex(1.1) == PRINTED_STOPS[0]
    assert tone_hex(4.9) == PRINTED_STOPS[-1]
    assert [beyond_scale(density) for density in (1.59, 1.6, 3.4, 3.41)] == [True, False, False, True]
