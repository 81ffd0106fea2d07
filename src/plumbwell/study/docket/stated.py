"""Findings about what is stated: by the folder, by the recipe, and by the readers of the files."""

from __future__ import annotations

from collections.abc import Iterator

from plumbwell.study.docket.wording import MILLIGAL, amount
from plumbwell.study.finding import Finding
from plumbwell.study.results import Results
from plumbwell.survey.recipe import UNAVAILABLE, available_of, is_unavailable


def masses_left(results: Results) -> Iterator[Finding]:
    """What the folder names and this version does not take into account."""
    for what, where in results.survey.not_applied:
        text = f"{what.capitalize()} ({where}) not applied by this version: densities hold their effect."
        mend = "Take the effect out elsewhere, or tell it with the densities."
        if what == "gradients":
            text = f"Gradients ({where}) not applied by this version: densities rest on gravity alone."
            mend = "Nothing; the densities from gravity stand without them."
        yield Finding(code="not_applied", severity="error", place=f"survey.toml, {where}", text=text, mend=mend)


def recipe_left(results: Results) -> Iterator[Finding]:
    """Settings of a recipe that this version cannot do."""
    for key in UNAVAILABLE:
        value = getattr(results.recipe, key)
        if is_unavailable(key, value):
            yield Finding(
                code="recipe_not_applied",
                severity="error",
                place=f"recipe, {key}",
                text=f"{key} = {value!r} was asked for, which this version cannot do: it was left aside.",
                mend=f"Write {available_of(key)}.",
            )


def measured_gradient(results: Results) -> Iterator[Finding]:
    """A measured free-air gradient in place of the normal one."""
    choice = results.choice
    if choice.measured is None:
        return
    unit = MILLIGAL
    measured, sd = choice.measured
    yield Finding(
        code="measured_gradient",
        severity="note",
        place="recipe, free_air",
        text=f"The free-air gradient is the measured one, {amount(measured / unit, 4)} ± "
        f"{amount(sd / unit, 4)} mGal/m: {amount((measured - choice.normal) / unit, 4, signed=True)} mGal/m "
        "beside the normal one at the collar, and this excess is held constant with depth.",
        mend="See that terrain, openings and bodies were taken out of the measured gradient; else they count twice.",
    )


def notes_of_readers(results: Results) -> Iterator[Finding]:
    """What was seen while the files were read."""
    for one in results.survey.notes:
        if one.code == "equal_times":
            continue  # The network tells of those that are still in use, with their rows.
        yield Finding(code=one.code, severity=one.severity, place=one.place, text=one.text, mend=one.mend)
