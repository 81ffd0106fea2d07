"""A case: one survey, what a person laid on top of it, and the recipes by which it is worked through."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

from plumbwell.study.overlay import EMPTY, Overlay
from plumbwell.survey.recipe import Recipe
from plumbwell.survey.survey import Survey

AS_SURVEYED = "as surveyed"
"""Name of the recipe that the survey folder states."""


@dataclass(frozen=True, slots=True)
class NamedRecipe:
    """A recipe with the name that a person gave it."""

    name: str
    recipe: Recipe


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Case:
    """What a reduction starts from, and what acts change.

    Parameters
    ----------
    survey : Survey
        As measured and stated; no act changes it.
    recipe : Recipe or None
        The recipe "as surveyed". None: just what the survey folder states.
    overlay : Overlay
    recipes : tuple of NamedRecipe
        Further recipes, in the order in which they were made.
    chosen_name : str
        Name of the recipe in force.
    """

    survey: Survey
    recipe: Recipe | None = None
    overlay: Overlay = EMPTY
    recipes: tuple[NamedRecipe, ...] = ()
    chosen_name: str = AS_SURVEYED

    @property
    def chosen(self) -> Recipe:
        """The recipe in force."""
        return self.recipe_named(self.chosen_name)

    @property
    def recipe_names(self) -> tuple[str, ...]:
        """The names of all recipes, "as surveyed" first."""
        return (AS_SURVEYED, *(one.name for one in self.recipes))

    def recipe_named(self, name: str) -> Recipe:
        """The recipe of a name.

        Raises
        ------
        KeyError
            When there is none.
        """
        if name == AS_SURVEYED:
            return self.survey.recipe if self.recipe is None else self.recipe
        return {one.name: one.recipe for one in self.recipes}[name]

    def changed_keys(self, name: str | None = None) -> tuple[str, ...]:
        """The keys in which a recipe (None: the one in force) differs from what the survey folder states."""
        recipe, stated = self.chosen if name is None else self.recipe_named(name), self.survey.recipe
        return tuple(one.name for one in fields(Recipe) if getattr(recipe, one.name) != getattr(stated, one.name))

    def with_recipe(self, name: str, recipe: Recipe) -> Case:
        """The case with the recipe of a name changed, or added where there is none of that name."""
        if name == AS_SURVEYED:
            return replace(self, recipe=None if recipe == self.survey.recipe else recipe)
        named = NamedRecipe(name, recipe)
        if name in self.recipe_names:
            return replace(self, recipes=tuple(named if one.name == name else one for one in self.recipes))
        return replace(self, recipes=(*self.recipes, named))
