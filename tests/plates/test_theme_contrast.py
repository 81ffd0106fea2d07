"""Contrast of the roles: relative luminance and contrast ratio after WCAG 2.2 (W3C, 2023), 1.4.3."""

import json

import pytest

from plumbwell.plates.theme import theme_named
from plumbwell.resources import resource

TEXT_ROLES = ("ink", "muted", "accent", "amber", "brick", "log", "run_1", "run_2", "run_3")
# On ground, tint and sunk, as the design prints them; held to one in the last digit.
PRINTED = {
    "light": {
        "ink": (14.8, 12.5, 13.5),
        "muted": (5.7, 4.8, 5.2),
        "strong": (3.4, 2.8, 3.1),
        "accent": (7.0, 6.0, 6.4),
        "amber": (5.5, 4.6, 5.0),
        "brick": (6.6, 5.6, 6.0),
        "log": (7.2, 6.1, 6.6),
        "run_1": (6.4, 5.4, 5.9),
        "run_3": (5.4, 4.5, 4.9),
    },
    "dark": {
        "ink": (13.8, 9.7, 12.7),
        "muted": (6.5, 4.6, 6.0),
        "strong": (4.2, 2.9, 3.8),
        "accent": (8.5, 6.0, 7.9),
        "amber": (8.5, 6.0, 7.8),
        "brick": (7.2, 5.1, 6.6),
        "log": (7.9, 5.6, 7.3),
        "run_1": (7.9, 5.5, 7.2),
        "run_3": (9.4, 6.6, 8.6),
    },
}


def luminance(colour):
    channels = [int(colour[start : start + 2], 16) / 255 for start in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(first, second):
    lighter, darker = sorted((luminance(first), luminance(second)), reverse=True)
    return (lighter + 0.05) / (darker + 0.05)


@pytest.mark.parametrize("name", ["light", "dark", "print"])
def test_text_roles_can_be_read_on_every_ground(name):
    roles = theme_named(name).roles
    for role in TEXT_ROLES:
        for ground in ("ground", "tint", "sunk"):
            assert contrast(roles[role], roles[ground]) >= 4.5, (role, ground)
    for role in ("strong", "contour"):
        assert contrast(roles[role], roles["ground"]) >= 3, role
    assert contrast(roles["on_accent"], roles["accent"]) >= 4.5


@pytest.mark.parametrize("name", ["light", "dark"])
def test_contrasts_are_those_of_the_design(name):
    roles = theme_named(name).roles
    for role, printed in PRINTED[name].items():
        for ground, ratio in zip(("ground", "tint", "sunk"), printed, strict=True):
            assert contrast(roles[role], roles[ground]) == pytest.approx(ratio, abs=0.1), (role, ground)


def test_every_theme_has_the_same_roles():
    sets = [
        set(json.loads(resource(f"themes/{name}.json").read_text(encoding="utf-8")))
        for name in ("light", "dark", "print")
    ]
    assert sets[0] == sets[1] == sets[2]


def test_print_differs_from_light_only_in_its_grounds_and_greys():
    light, printed = theme_named("light").roles, theme_named("print").roles
    changed = {role for role in light if light[role] != printed[role]}
    assert changed == {"ground", "sunk", "tint", "hair", "muted"}
    assert {printed[role] for role in ("ground", "sunk", "tint")} == {"#FFFFFF"}


def test_an_unknown_theme_is_refused_by_name():
    with pytest.raises(ValueError, match="no theme 'sepia'; there are light, dark, print"):
        theme_named("sepia")
