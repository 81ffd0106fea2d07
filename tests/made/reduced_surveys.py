"""Surveys of the checkout, reduced; the values of a column of their tables; and what their residuals must spread by."""

from pathlib import Path

import numpy as np

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


def residual_covariance(results):
    """Covariance of the residuals of visits, m2/s4: V - A (A^T V^-1 A + priors)^-1 A^T with full matrices, no station
    eliminated."""
    solution = results.network.adjustment.solution
    design, n = solution.design, len(solution.weight)
    whole = np.zeros((n, design.n_stations + design.size))
    whole[np.arange(n), design.station] = 1.0
    np.add.at(whole, (design.entry_visit, design.n_stations + design.entry_unknown), design.entry_value)
    normal = whole.T @ (solution.weight[:, None] * whole)
    np.add.at(normal, (solution.ties.station, solution.ties.station), solution.ties.weight)
    priors = np.zeros((len(design.priors), design.size))
    np.add.at(priors, (design.priors.row, design.priors.unknown), design.priors.factor)
    priors /= design.priors.sd[:, None]
    normal[design.n_stations :, design.n_stations :] += priors.T @ priors
    scale = 1.0 / np.sqrt(np.diagonal(normal))
    inverse = scale[:, None] * np.linalg.inv(normal * np.outer(scale, scale)) * scale
    return np.diag(1.0 / solution.weight) - whole @ inverse @ whole.T
