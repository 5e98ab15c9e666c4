"""The frontier: every maker and size with its honest accuracy and its price."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.honest_accuracy import HonestAccuracy
from panelkit.costing.panel_prices import PanelPricer
from panelkit.costing.rules import DECIMALS
from panelkit.costing.tasks import Task
from panelkit.metrics import CrossValidated, corrected_se, naive_se
from panelkit.records import FoldPlan, Frontier, FrontierRow, OutOfFold

__all__ = ["Judge", "build_frontier", "panel_name"]


def panel_name(maker: str, size: int) -> str:
    """Return the name of a row of the frontier."""
    return f"{maker}-{size}"


@dataclass(frozen=True, slots=True, eq=False)
class Judge:
    """What out-of-fold predictions are judged by.

    Attributes
    ----------
    task : Task
        Outcome and metric.
    subjects : ndarray of shape (n_samples,), int64
        Subject codes.
    weights : ndarray of shape (n_samples,)
        Observation weights: every subject counts once.
    folds : FoldPlan
        Outer folds.
    confidence : float
        Of intervals.
    """

    task: Task
    subjects: NDArray[np.int64]
    weights: NDArray[np.float64]
    folds: FoldPlan
    confidence: float

    @property
    def test_to_train(self) -> float:
        """Ratio of test to training samples."""
        return 1.0 / (self.folds.n_folds - 1)

    def metric(self, predictions: OutOfFold) -> CrossValidated:
        """Return the task's metric within test folds with its interval."""
        return self.task.cross_validated(
            predictions.predicted,
            self.folds,
            self.subjects,
            self.weights,
            self.confidence,
        )

    def slope(self, predictions: OutOfFold) -> float:
        """Return the out-of-fold calibration slope, mean over repeats; NaN if none."""
        slopes = [self.task.slope(row, self.weights) for row in predictions.predicted]
        return float(np.mean(slopes))


def build_frontier(
    accuracy: HonestAccuracy,
    judge: Judge,
    panels: Sequence[NDArray[np.int64]],
    features: NDArray[np.object_],
    pricer: PanelPricer | None,
) -> tuple[Frontier, NDArray[np.float64]]:
    """Return the frontier and the metric of each row in each fold.

    Parameters
    ----------
    accuracy : HonestAccuracy
        Out-of-fold predictions.
    judge : Judge
        Outcome, subjects, folds.
    panels : sequence of ndarray of int64
        Panels learnt on all rows, in the order of ``accuracy.panels``.
    features : ndarray of shape (n_features,), object
        Feature ids.
    pricer : PanelPricer or None
        None: nothing is priced.

    Returns
    -------
    frontier : Frontier
        A row a maker and size.
    per_fold : ndarray of shape (n_folds in all, n_rows)
        The metric within test folds.
    """
    rows, folds = [], []
    for predictions, panel in zip(accuracy.panels, panels, strict=True):
        found = judge.metric(predictions)
        markers = tuple(str(features[j]) for j in panel)
        costs = pricer.costs(markers) if pricer is not None else ()
        cheapest = costs[0] if costs else None
        folds.append(found.per_fold.ravel())
        rows.append(
            FrontierRow(
                panel=panel_name(predictions.maker, predictions.size),
                maker=predictions.maker,
                size=predictions.size,
                markers=markers,
                metric_of="procedure",
                metric=found.mean,
                metric_low=found.low,
                metric_high=found.high,
                metric_se_naive=naive_se(found.per_fold),
                metric_se_corrected=corrected_se(found.per_fold, judge.test_to_train),
                slope=judge.slope(predictions),
                cost_total=cheapest.total if cheapest else None,
                cost_per_result=cheapest.cost_per_result if cheapest else None,
                cost_total_high=cheapest.total_high if cheapest else None,
                platform=cheapest.platform if cheapest else "",
                on_frontier=False,
            )
        )
    return Frontier(_mark(rows, pricer is not None)), np.array(folds).T


def _mark(rows: list[FrontierRow], priced: bool) -> tuple[FrontierRow, ...]:
    """Mark the rows that no other row dominates.

    By cost and accuracy where panels are priced, else by size and accuracy; accuracy
    is compared after rounding, so that two machines agree.
    """

    def effort(row: FrontierRow) -> Decimal | None:
        return row.cost_total if priced else Decimal(row.size)

    def dominates(a: FrontierRow, b: FrontierRow) -> bool:
        less, more = effort(a), effort(b)
        if less is None or more is None:
            return False
        gain, loss = round(a.metric, DECIMALS), round(b.metric, DECIMALS)
        return less <= more and gain >= loss and (less < more or gain > loss)

    return tuple(
        replace(
            row,
            on_frontier=effort(row) is not None
            and not any(dominates(other, row) for other in rows),
        )
        for row in rows
    )
