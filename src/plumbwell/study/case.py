"""A case: one survey with the recipe by which it is worked through."""

from __future__ import annotations

from dataclasses import dataclass

from plumbwell.survey.recipe import Recipe
from plumbwell.survey.survey import Survey


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Case:
    """What a reduction starts from.

    Parameters
    ----------
    survey : Survey
    recipe : Recipe or None
        None: the recipe that the survey folder states.
    """

    survey: Survey
    recipe: Recipe | None = None

    @property
    def chosen(self) -> Recipe:
        """The recipe in force."""
        return self.survey.recipe if self.recipe is None else self.recipe
