"""The primary rule applied inside every training set: the nested figure."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.honest_accuracy import Everyone, HonestAccuracy
from panelkit.costing.procedure import Procedure
from panelkit.costing.rules import Curve, Pick, Rule, pick
from panelkit.records import FoldPlan, OutOfFold, TunedChoice

__all__ = ["PRIMARY", "Primary", "apply_rule", "choose_for_everyone", "curve_of_folds"]

PRIMARY = "primary-rule"


@dataclass(frozen=True, slots=True, eq=False)
class Primary:
    """The primary rule and what it did, nested and on all samples.

    Attributes
    ----------
    rule : Rule
        The rule of the headline.
    declared : bool
        Whether the study file declares it.
    predictions : OutOfFold
        By what it chose inside each training set.
    chosen : TunedChoice
        What it chose there.
    taken : Pick
        Panel that it takes when all samples teach.
    """

    rule: Rule
    declared: bool
    predictions: OutOfFold
    chosen: TunedChoice
    taken: Pick


def curve_of_folds(
    procedure: Procedure,
    metric: NDArray[np.float64],
    cost: NDArray[np.float64] | None = None,
) -> Curve:
    """Return the curve of inner folds, (n_inner, n_panels), with costs if known."""
    sizes = np.array([size for _maker, size in procedure.kinds], np.float64)
    return Curve(
        metric=metric,
        size=sizes,
        cost=np.full(len(sizes), np.nan) if cost is None else cost,
        test_to_train=1.0 / (len(metric) - 1),
    )


def apply_rule(
    rule: Rule,
    procedure: Procedure,
    accuracy: HonestAccuracy,
    folds: FoldPlan,
    cost: NDArray[np.float64] | None = None,
) -> tuple[OutOfFold, TunedChoice]:
    """Let the rule choose maker and size anew inside every training set.

    Parameters
    ----------
    rule : Rule
        The primary rule.
    procedure : Procedure
        Makers and sizes.
    accuracy : HonestAccuracy
        Inner figures, and the predictions from which the chosen ones are taken.
    folds : FoldPlan
        Who was tested when.
    cost : ndarray of shape (n_panels, n_repeats, n_folds), optional
        What each fold's panels cost; NaN where unknown.

    Returns
    -------
    predictions : OutOfFold
        By the chosen maker and size: their accuracy counts the choosing.
    chosen : TunedChoice
        What was chosen.
    """
    grid = (folds.n_repeats, folds.n_folds)
    predicted = np.full_like(accuracy.panels[0].predicted, np.nan)
    maker, size = np.empty((2, *grid), np.int64)
    met = np.empty(grid, np.bool_)
    for repeat, fold in np.ndindex(*grid):
        own = None if cost is None else cost[:, repeat, fold]
        curve = curve_of_folds(procedure, accuracy.inner_metric[repeat, fold], own)
        taken = pick(rule, curve)
        test = folds.split(repeat, fold)[1]
        panel = accuracy.panels[taken.row].predicted
        predicted[repeat][..., test] = panel[repeat][..., test]
        maker[repeat, fold] = taken.row // len(procedure.sizes)
        size[repeat, fold] = procedure.kinds[taken.row][1]
        met[repeat, fold] = taken.met
    return OutOfFold(PRIMARY, 0, predicted), TunedChoice(maker, size, met)


def choose_for_everyone(
    rule: Rule,
    procedure: Procedure,
    everyone: Everyone,
    cost: NDArray[np.float64] | None = None,
) -> Pick:
    """Return what the rule takes when all samples teach.

    Parameters
    ----------
    rule : Rule
        The primary rule.
    procedure : Procedure
        Makers and sizes.
    everyone : Everyone
        What the inner folds of all samples say.
    cost : ndarray of shape (n_panels,), optional
        What the printed panels cost; NaN where unknown.

    Returns
    -------
    Pick
        Position among the panels, makers first.
    """
    return pick(rule, curve_of_folds(procedure, everyone.metric, cost))
