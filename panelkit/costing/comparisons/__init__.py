"""What else could be done with the same data, learnt on the same folds."""

from collections.abc import Sequence

from panelkit.costing.comparisons.contract import Comparison, FoldWork, LearntToo
from panelkit.costing.comparisons.dense import lasso_on_all, ridge_on_all
from panelkit.costing.comparisons.plain_columns import (
    control_features,
    covariates_alone,
    covariates_with_panels,
    nuisance_alone,
)
from panelkit.costing.comparisons.random_panels import (
    FROM_ALL,
    FROM_CANDIDATES,
    RandomPanels,
)
from panelkit.costing.data import ProcedureData

__all__ = [
    "FROM_ALL",
    "FROM_CANDIDATES",
    "Comparison",
    "FoldWork",
    "LearntToo",
    "RandomPanels",
    "comparisons_for",
]


def comparisons_for(data: ProcedureData, random: RandomPanels) -> Sequence[Comparison]:
    """Return the comparisons that the data allow.

    Parameters
    ----------
    data : ProcedureData
        Covariates, nuisance columns and control features where there are any.
    random : RandomPanels
        Drawn for this study.

    Returns
    -------
    sequence of Comparison
        Ridge and lasso on everything, random panels, and the columns that are there.
    """
    found: list[Comparison] = [ridge_on_all, lasso_on_all, random]
    if len(data.covariates):
        found += [covariates_alone, covariates_with_panels]
    if len(data.nuisance):
        found.append(nuisance_alone)
    if len(data.controls):
        found.append(control_features)
    return found
