"""Which panel is taken: every rule side by side, the primary first."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.frontier import Judge
from panelkit.costing.honest_accuracy import HonestAccuracy
from panelkit.costing.tuning import DECIMALS, within_one_se
from panelkit.metrics import corrected_se, naive_se
from panelkit.records import Choice, Frontier, FrontierRow, Headline, RuleChoice

__all__ = ["choose"]

PRIMARY = "smallest-within-one-se"
SMALLEST_ON_CURVE = "smallest-within-one-se-on-curve"
CHEAPEST_ON_CURVE = "cheapest-within-one-se-on-curve"


def choose(
    frontier: Frontier,
    per_fold: NDArray[np.float64],
    accuracy: HonestAccuracy,
    judge: Judge,
    *,
    taken: int,
    declared: bool,
) -> tuple[Choice, Frontier]:
    """Return the headline with every rule's choice, and the frontier marked by it.

    The primary rule's panel is chosen by inner folds of all samples, exactly as every
    training set chose its own: the headline is the accuracy of that. The other rules
    read the curve of the outer folds, so their figures are too good.

    Parameters
    ----------
    frontier : Frontier
        All rows.
    per_fold : ndarray of shape (n_folds in all, n_rows)
        Their areas within test folds.
    accuracy : HonestAccuracy
        For the nested figure of the primary rule.
    judge : Judge
        Outcome, subjects, folds.
    taken : int
        Row that the primary rule takes on all samples.
    declared : bool
        Whether the study file declares the primary rule.

    Returns
    -------
    choice : Choice
        Headline and rules.
    frontier : Frontier
        With `chosen_by` filled in.

    References
    ----------
    Breiman, Friedman, Olshen & Stone 1984, section 3.4.3; Nadeau & Bengio 2003.
    """
    near = within_one_se(per_fold, judge.test_to_train)
    best = int(np.nanmean(per_fold, axis=0).round(DECIMALS).argmax())
    rows = [row for row, within in zip(frontier.rows, near, strict=True) if within]
    picks = {PRIMARY: frontier.rows[taken], SMALLEST_ON_CURVE: min(rows, key=_by_size)}
    priced = [row for row in rows if row.cost_total is not None]
    if priced:
        picks[CHEAPEST_ON_CURVE] = min(priced, key=_by_cost)
    rules = [
        _rule(rule, row, frontier.rows[best], per_fold, frontier, judge)
        for rule, row in picks.items()
    ]
    marked = tuple(
        replace(
            row,
            chosen_by=";".join(rule for rule, pick in picks.items() if pick is row),
        )
        for row in frontier.rows
    )
    return Choice(_headline(accuracy, judge, declared), rules), Frontier(marked)


def _by_size(row: FrontierRow) -> tuple[float, float, float]:
    cost = float("inf") if row.cost_total is None else float(row.cost_total)
    return row.size, -round(row.metric, DECIMALS), cost


def _by_cost(row: FrontierRow) -> tuple[float, float, float]:
    return float(row.cost_total or 0), row.size, -round(row.metric, DECIMALS)


def _rule(
    rule: str,
    row: FrontierRow,
    best: FrontierRow,
    per_fold: NDArray[np.float64],
    frontier: Frontier,
    judge: Judge,
) -> RuleChoice:
    position = {each.panel: k for k, each in enumerate(frontier.rows)}
    difference = per_fold[:, position[best.panel]] - per_fold[:, position[row.panel]]
    gap = float(np.nanmean(difference))
    se = corrected_se(difference, judge.test_to_train)
    figures = {
        "metric": row.metric,
        "best_metric": best.metric,
        "difference_to_best": gap,
        "difference_se_corrected": 0.0 if np.isnan(se) else se,
        "difference_se_naive": float(np.nan_to_num(naive_se(difference))),
        "size": float(row.size),
    }
    markers = "1 marker" if row.size == 1 else f"{row.size} markers"
    figure = f"area under the ROC curve {row.metric:.3f}"
    if rule == PRIMARY:
        lead = (
            "In inner folds of all samples the smallest panel within one standard "
            f"error of the best has {markers} (maker {row.maker}). On the curve of the "
            f"outer folds that maker at that size has an {figure}; expect the "
            "headline, which counts the choosing."
        )
    else:
        kind = "smallest" if rule == SMALLEST_ON_CURVE else "cheapest"
        lead = (
            f"The {kind} panel within one standard error of the best of the curve has "
            f"{markers} (maker {row.maker}, {figure}). It is picked from the curve, so "
            "that figure is too good."
        )
    return RuleChoice(
        rule=rule,
        primary=rule == PRIMARY,
        panel=row.panel,
        figures=figures,
        sentence=f"{lead} {_against_best(row, best, frontier, gap, figures)}",
    )


def _against_best(
    row: FrontierRow,
    best: FrontierRow,
    frontier: Frontier,
    gap: float,
    figures: dict[str, float],
) -> str:
    """Return how the row stands to the most accurate one of the curve."""
    largest = max(each.size for each in frontier.rows)
    if row is best:
        if row.size == largest:
            return (
                "It is the most accurate and the largest offered: more were not tried."
            )
        return (
            "It is the most accurate of the curve: more markers were not shown to help."
        )
    edge = " It is the largest size offered." if best.size == largest else ""
    return (
        f"The most accurate of the curve, {best.panel}, stands at {best.metric:.3f}, "
        f"{gap:.3f} apart (standard error {figures['difference_se_corrected']:.3f}, "
        f"corrected for overlapping training sets).{edge} Within one standard error is "
        "no proof of equal accuracy."
    )


def _interval(low: float, high: float, confidence: float) -> str:
    if np.isnan(low) or np.isnan(high):
        return "no interval could be estimated"
    return f"{100 * confidence:g} % interval {low:.3f} to {high:.3f}"


def _headline(accuracy: HonestAccuracy, judge: Judge, declared: bool) -> Headline:
    area = judge.area(accuracy.primary)
    sizes = accuracy.chosen.size
    spread = _interval(area.low, area.high, judge.confidence)
    sentence = (
        "Letting the rule choose maker and size anew inside every training set gives "
        f"an area under the ROC curve of {area.mean:.3f} ({spread}) on people whom the "
        "training had not "
        f"seen. {_chosen_sizes(sizes)}"
    )
    if not declared:
        sentence = "Exploratory: the study file declares no primary rule. " + sentence
    return Headline(
        metric_of=(
            f"the whole procedure with the rule {PRIMARY}, not of the printed panel"
        ),
        metric=area.mean,
        metric_low=area.low,
        metric_high=area.high,
        declared=declared,
        sentence=sentence,
    )


def _chosen_sizes(sizes: NDArray[np.int64]) -> str:
    """Return which sizes the training sets chose, in words."""
    low, high = int(sizes.min()), int(sizes.max())
    if low == high:
        what = "1 marker" if low == 1 else f"{low} markers"
        return f"All {sizes.size} training sets chose {what}."
    return (
        f"The {sizes.size} training sets chose {low} to {high} markers, "
        f"{float(np.median(sizes)):g} at the median."
    )
