"""What the panels cost that the primary rule chose in the training sets."""

import numpy as np

from panelkit.costing import HonestAccuracy, PanelPricer, Primary
from panelkit.records import Cohort, CostOfFolds

__all__ = ["costs_of_folds"]


def costs_of_folds(
    cohort: Cohort,
    accuracy: HonestAccuracy,
    primary: Primary,
    pricer: PanelPricer | None,
) -> CostOfFolds | None:
    """Return median and range of the programme cost over the training sets.

    Parameters
    ----------
    cohort : Cohort
        Feature ids.
    accuracy : HonestAccuracy
        Panels of every fold.
    primary : Primary
        What was chosen in each.
    pricer : PanelPricer or None
        None: nothing is priced.

    Returns
    -------
    CostOfFolds or None
        None where no chosen panel has a cost.

    Raises
    ------
    InputDataError
        A price that is needed is missing.
    """
    if pricer is None:
        return None
    makers = list(dict.fromkeys(panels.maker for panels in accuracy.members))
    found = {(panels.maker, panels.size): panels for panels in accuracy.members}
    totals, chosen = [], primary.chosen
    for repeat, fold in np.ndindex(*chosen.size.shape):
        maker, size = makers[chosen.maker[repeat, fold]], chosen.size[repeat, fold]
        members = found[maker, int(size)].members[repeat, fold]
        costs = pricer.costs([str(cohort.features[j]) for j in members if j >= 0])
        totals += [costs[0].total] if costs else []
    if not totals:
        return None
    ranked = sorted(totals)
    return CostOfFolds(
        ranked[(len(ranked) - 1) // 2],
        ranked[0],
        ranked[-1],
        len(ranked),
        int(chosen.size.size),
    )
