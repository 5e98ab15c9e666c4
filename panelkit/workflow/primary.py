"""The primary rule of a study applied to what was learnt."""

import numpy as np

from panelkit.config import Study
from panelkit.costing import (
    Everyone,
    HonestAccuracy,
    Primary,
    Selected,
    apply_rule,
    choose_for_everyone,
)
from panelkit.workflow.check import CheckedStudy
from panelkit.workflow.procedure import primary_rule

__all__ = ["primary_of"]


def primary_of(
    plan: Study,
    known: CheckedStudy,
    selected: Selected,
    everyone: Everyone,
    accuracy: HonestAccuracy,
) -> Primary:
    """Return what the primary rule chose in every training set and on all samples.

    Parameters
    ----------
    plan : Study
        Names the rule, or leaves it to the default.
    known : CheckedStudy
        Cohort, prices, procedure, folds.
    selected : Selected
        Panels learnt on all samples.
    everyone : Everyone
        What the inner folds of all samples say.
    accuracy : HonestAccuracy
        What the inner folds of each training set say.

    Returns
    -------
    Primary
        For the headline and the choice.

    Raises
    ------
    InputDataError
        A price that is needed is missing.
    """
    rule, pricer = primary_rule(plan), known.pricer
    features, procedure = known.cohort.features, known.procedure
    fold_costs = panel_costs = None
    if pricer is not None and rule.needs_prices:
        fold_costs = np.array(
            [
                [
                    [pricer.lowest(features[row[row >= 0]]) for row in repeat]
                    for repeat in panels.members
                ]
                for panels in accuracy.members
            ]
        )
        panel_costs = np.array(
            [pricer.lowest(features[panel]) for panel in selected.panels]
        )
    predictions, chosen = apply_rule(
        rule, procedure, accuracy, known.draws.folds, fold_costs
    )
    taken = choose_for_everyone(rule, procedure, everyone, panel_costs)
    declared = plan.choice.primary is not None
    return Primary(rule, declared, predictions, chosen, taken)
