"""Stand-ins and fragility of the chosen panel, from the losses by role."""

from collections.abc import Sequence
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.frontier import Judge
from panelkit.costing.panel_prices import PanelPricer
from panelkit.costing.procedure import Selected
from panelkit.costing.roles import VARIANTS, RoleLosses, closest_companion, refill
from panelkit.metrics import paired_interval
from panelkit.records import Fragility, OutOfFold, StandIn

__all__ = ["fragility_of", "stand_ins_of"]

BY_ROLE = "by role"


def _loss(
    whole: OutOfFold, changed: OutOfFold, judge: Judge
) -> tuple[float, float, float, float]:
    """Return the changed metric, and the paired loss with its interval."""
    before, after = judge.metric(whole), judge.metric(changed)
    difference = (before.per_fold - after.per_fold).ravel()
    loss, low, high = paired_interval(difference, judge.test_to_train, judge.confidence)
    return after.mean, loss, low, high


def stand_ins_of(
    losses: RoleLosses,
    whole: OutOfFold,
    panel: NDArray[np.int64],
    selected: Selected,
    features: NDArray[np.object_],
    judge: Judge,
    pricer: PanelPricer | None,
) -> tuple[StandIn, ...]:
    """Return what could replace each marker of the chosen panel.

    Parameters
    ----------
    losses : RoleLosses
        Panels of the outer folds that lost a marker.
    whole : OutOfFold
        Predictions of the maker at this size, nothing lost.
    panel : ndarray of int64
        The printed panel, first choice first.
    selected : Selected
        What was learnt on all samples.
    features : ndarray of shape (n_features,), object
        Feature ids.
    judge : Judge
        Outcome, subjects, folds.
    pricer : PanelPricer or None
        None: nothing is priced.

    Returns
    -------
    tuple of StandIn
        Two a marker: what the maker takes instead, and the closest companion.
    """
    rows = np.arange(len(judge.weights))
    found = []
    for role, feature in enumerate(panel):
        instead = refill(selected.evidence, whole.maker, panel, int(feature))
        came = instead[~np.isin(instead, panel)]
        companion, _ = closest_companion(selected.view, panel, int(feature), rows)
        for how, variant, other in (
            ("maker", "refilled", int(came[0]) if len(came) else -1),
            ("companion", "companion", companion),
        ):
            _, loss, low, high = _loss(whole, losses.predictions[variant, role], judge)
            same = losses.replaced_by[VARIANTS.index(variant), role] == other
            found.append(
                StandIn(
                    marker=str(features[feature]),
                    stand_in="" if other < 0 else str(features[other]),
                    how=how,
                    correlation=_correlation(selected, int(feature), other, rows),
                    loss=loss,
                    loss_low=low,
                    loss_high=high,
                    kind=BY_ROLE,
                    same_in_folds=float(same.mean()) if other >= 0 else 0.0,
                    saving=_saving(pricer, panel, int(feature), other, features),
                )
            )
    return tuple(found)


def _correlation(
    selected: Selected, feature: int, other: int, rows: NDArray[np.int64]
) -> float:
    if other < 0:
        return float("nan")
    both = selected.view.columns(np.array([feature, other]), rows)
    if np.ptp(both, axis=1).min() == 0.0:
        return float("nan")
    return float(np.atleast_2d(np.corrcoef(both))[0, 1])


def _saving(
    pricer: PanelPricer | None,
    panel: NDArray[np.int64],
    feature: int,
    other: int,
    features: NDArray[np.object_],
) -> Decimal | None:
    if pricer is None or other < 0:
        return None
    before = pricer.costs([str(features[j]) for j in panel])
    changed = np.where(panel == feature, other, panel)
    after = pricer.costs([str(features[j]) for j in changed])
    if not before or not after:
        return None
    return before[0].total - after[0].total


def fragility_of(
    losses: RoleLosses,
    whole: OutOfFold,
    markers: Sequence[str],
    judge: Judge,
) -> tuple[Fragility, ...]:
    """Return what the panel loses with each marker, the gravest loss first.

    Parameters
    ----------
    losses : RoleLosses
        Panels of the outer folds that lost a marker.
    whole : OutOfFold
        Predictions of the maker at this size, nothing lost.
    markers : sequence of str
        Markers of the printed panel, first choice first.
    judge : Judge
        Outcome, subjects, folds.

    Returns
    -------
    tuple of Fragility
        For each role: the rest refitted, and the marker set to its training mean.
    """
    found = []
    for event, words in (
        ("lost-refitted", "and the rest is refitted"),
        ("lost-imputed", "and stands at its training mean in a model that is kept"),
    ):
        rows = []
        for role, marker in enumerate(markers):
            metric, loss, low, high = _loss(
                whole, losses.predictions[event, role], judge
            )
            rows.append(
                Fragility(
                    event=event,
                    marker=marker,
                    level=float("nan"),
                    metric=metric,
                    loss=loss,
                    loss_low=low,
                    loss_high=high,
                    kind=BY_ROLE,
                    sentence=(
                        f"Where the marker in the role of {marker} is lost {words}, "
                        f"the {judge.task.metric_words} falls by {loss:.3f} to "
                        f"{metric:.3f}."
                    ),
                )
            )
        found += sorted(rows, key=lambda row: -row.loss)
    return tuple(found)
