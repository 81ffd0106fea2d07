"""Surveys of the checkout, reduced; and the values of a column of their tables."""

from pathlib import Path

from plumbwell.files.folder import read_survey
from plumbwell.study.case import Case
from plumbwell.study.reduce import reduce
from plumbwell.study.tables import TABLES

CHECKOUT = Path(__file__).resolve().parents[2]
SHAFT = CHECKOUT / "tests" / "data" / "reiche_zeche_shaft"
WELL = CHECKOUT / "sample_surveys" / "tolly_bank_well"
MINE = CHECKOUT / "sample_surveys" / "quernlow_shaft"


def reduced(folder):
    return reduce(Case(survey=read_survey(folder)))


def column(results, table, name):
    return TABLES[table].column(name).values(results)
