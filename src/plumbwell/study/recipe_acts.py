"""Acts on recipes: change a setting, choose the recipe in force, make another one."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any, ClassVar

from plumbwell.study.act import Act, ActRefused, check_text
from plumbwell.study.act_wording import setting_words, value_words
from plumbwell.study.admissible import unserved
from plumbwell.study.case import Case
from plumbwell.study.docket.wording import listed
from plumbwell.study.overlay import with_uses
from plumbwell.survey.errors import shown
from plumbwell.survey.recipe import KEYS, available_of, expected_of, from_written, is_unavailable, nearest_key

LONGEST_NAME = 80


def _check_recipe_name(case: Case, name: str) -> None:
    if name not in case.recipe_names:
        names = listed([f'"{shown(one)}"' for one in case.recipe_names])
        raise ActRefused(f'There is no recipe "{shown(name)}"; there {"is" if not case.recipes else "are"} {names}.')


@dataclass(frozen=True, slots=True, kw_only=True)
class SetRecipe(Act):
    """Change one key of a recipe to a value as survey.toml writes it; None puts back what the folder states."""

    name: str
    key: str
    value: Any = field(hash=False)
    kind: ClassVar[str] = "set_recipe"

    def apply(self, case: Case) -> Case:
        """The case with the changed recipe."""
        _check_recipe_name(case, self.name)
        before = case.recipe_named(self.name)
        after = replace(before, **{self.key: self._inside(case)})
        label = KEYS[self.key].label
        if after == before:
            raise ActRefused(f"{label} is {setting_words(before, self.key)} already.")
        survey = with_uses(case.survey, case.overlay)
        if (why := unserved(survey, after)) is not None:
            raise ActRefused(why)
        return case.with_recipe(self.name, after)

    def _inside(self, case: Case) -> Any:
        """The value inside, SI."""
        if self.key not in KEYS:
            near = nearest_key(self.key)
            raise ActRefused(f'There is no setting "{shown(self.key)}"' + (f'; "{near}" is near.' if near else "."))
        if self.value is None:
            return getattr(case.survey.recipe, self.key)
        label, told = KEYS[self.key].label, value_words(self.key, self.value)
        try:
            inside = from_written(self.key, self.value)
        except ValueError:
            raise ActRefused(f"{label} cannot be {told}. It may be {expected_of(self.key)}.") from None
        if is_unavailable(self.key, self.value):
            raise ActRefused(
                f"{label} cannot be {told} in this version of the program. It may be {available_of(self.key)}."
            )
        return inside

    def sentence(self, case: Case) -> str:
        """What stood there, and what does now."""
        known = self.key in KEYS and self.name in case.recipe_names
        label = KEYS[self.key].label if self.key in KEYS else shown(self.key)
        of = f' of "{shown(self.name)}"' if len(case.recipe_names) > 1 else ""
        before = f"{setting_words(case.recipe_named(self.name), self.key)} → " if known else ""
        if self.value is None:
            back = setting_words(case.survey.recipe, self.key) if known else "back"
            return f"{label}{of}: {before}{back}, as surveyed"
        after = value_words(self.key, self.value) if self.key in KEYS else shown(self.value)
        return f"{label}{of}: {before}{after}"


@dataclass(frozen=True, slots=True, kw_only=True)
class ChooseRecipe(Act):
    """Work the survey through by another of its recipes."""

    name: str
    kind: ClassVar[str] = "choose_recipe"

    def apply(self, case: Case) -> Case:
        """The case with the recipe in force."""
        _check_recipe_name(case, self.name)
        if self.name == case.chosen_name:
            raise ActRefused(f'The recipe "{shown(self.name)}" is in force already.')
        survey = with_uses(case.survey, case.overlay)
        if (why := unserved(survey, case.recipe_named(self.name))) is not None:
            raise ActRefused(why)
        return replace(case, chosen_name=self.name)

    def sentence(self, case: Case) -> str:
        """Which recipe is in force."""
        return f'Recipe in force: "{shown(case.chosen_name)}" → "{shown(self.name)}"'


@dataclass(frozen=True, slots=True, kw_only=True)
class AddRecipe(Act):
    """Make another recipe, equal to one that is there until it is changed."""

    name: str
    based_on: str
    kind: ClassVar[str] = "add_recipe"

    def __post_init__(self) -> None:
        object.__setattr__(self, "name", self.name.strip())

    def apply(self, case: Case) -> Case:
        """The case with one more recipe."""
        if not self.name:
            raise ActRefused("Give the recipe a name.")
        check_text(self.name, "The name of a recipe", longest=LONGEST_NAME)
        if self.name.casefold() in {one.casefold() for one in case.recipe_names}:
            raise ActRefused(f'There is a recipe "{shown(self.name)}" already.')
        _check_recipe_name(case, self.based_on)
        return case.with_recipe(self.name, case.recipe_named(self.based_on))

    def sentence(self, case: Case) -> str:
        """The new recipe, and from which it was made."""
        return f'Made the recipe "{shown(self.name)}" from "{shown(self.based_on)}"'
