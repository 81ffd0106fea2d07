"""A step of layers: as asked for, and refused where it makes more than can be meant."""

from dataclasses import replace

import pytest

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.survey.errors import SurveyError


@pytest.fixture
def shaft(checkout):
    return read_survey(checkout / "sample_surveys" / "quernlow_shaft")


def test_a_step_that_makes_too_many_layers_is_refused_by_key_and_count(shaft):
    results = reduce(Case(survey=shaft))
    pairs = results.intervals.densities.pairs
    elevation = results.stations.located.positions.elevation.values
    height = float(elevation[pairs.top].max() - elevation[pairs.base].min())
    fine = replace(shaft.recipe, layer_boundaries=height / 5000.5)
    with pytest.raises(SurveyError) as caught:
        reduce(Case(survey=shaft), recipe=fine)
    assert str(caught.value).startswith("layer_boundaries = ") and "at most 5000" in str(caught.value)
    assert str(caught.value).endswith("or more.")


def test_as_many_layers_as_allowed_are_made(shaft):
    results = reduce(Case(survey=shaft), recipe=replace(shaft.recipe, layer_boundaries=0.5))
    assert results.layers is not None and 100 < len(results.layers.density) <= 5000
