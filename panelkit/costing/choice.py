"""Which panel is taken: every rule side by side, the primary first."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.frontier import Judge
from panelkit.costing.primary import Primary
from panelkit.costing.rules import Curve, Pick, Rule, fold_means, pick
from panelkit.metrics import corrected_se, naive_se
from panelkit.records import (
    Choice,
    Frontier,
    FrontierRow,
    Headline,
    RuleChoice,
    TunedChoice,
)

__all__ = ["choose", "curve_of"]

ON_CURVE = "-on-curve"
DEMANDS = {
    "smallest-within-one-se": "the smallest panel within one standard error of the "
    "best",
    "cheapest-within-one-se": "the cheapest panel within one standard error of the "
    "best",
    "smallest-within-margin": "the smallest panel shown to lose less than {margin:g} "
    "to the best",
    "cheapest-within-margin": "the cheapest panel shown to lose less than {margin:g} "
    "to the best",
    "best-under-budget": "the most accurate panel for at most {budget:,}",
    "cheapest-above-accuracy": "the cheapest panel with an accuracy of at least "
    "{required_accuracy:g}",
}


def curve_of(frontier: Frontier, per_fold: NDArray[np.float64], judge: Judge) -> Curve:
    """Return the curve of the outer folds, by which secondary rules choose."""
    costs = [
        np.nan if row.cost_total is None else float(row.cost_total)
        for row in frontier.rows
    ]
    return Curve(
        per_fold,
        np.array([row.size for row in frontier.rows], np.float64),
        np.array(costs),
        judge.test_to_train,
    )


def choose(
    frontier: Frontier,
    per_fold: NDArray[np.float64],
    judge: Judge,
    *,
    primary: Primary,
    secondary: Sequence[Rule],
    currency: str = "",
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
        Their metric within test folds.
    judge : Judge
        Outcome, subjects, folds.
    primary : Primary
        The rule of the headline and what it did.
    secondary : sequence of Rule
        Rules that read the curve.
    currency : str
        Of the costs; empty where nothing is priced.

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
    curve = curve_of(frontier, per_fold, judge)
    priced = not np.isnan(curve.cost).all()
    picks = {primary.rule.name: (primary.rule, primary.taken)}
    for rule in secondary:
        if priced or not rule.needs_prices:
            picks[rule.name + ON_CURVE] = (rule, pick(rule, curve))
    best = int(fold_means(per_fold).argmax())
    rules = [
        _with_panel(
            _rule(name, rule, found, best, frontier, curve, judge),
            frontier.rows[found.row],
            currency,
        )
        for name, (rule, found) in picks.items()
    ]
    marked = tuple(
        replace(
            row,
            chosen_by=";".join(
                name
                for name, (_rule, found) in picks.items()
                if found.met and found.row == position
            ),
        )
        for position, row in enumerate(frontier.rows)
    )
    return Choice(_headline(primary, judge), rules), Frontier(marked)


def _demand(rule: Rule) -> str:
    return DEMANDS[rule.name].format(
        margin=rule.margin,
        budget=rule.budget,
        required_accuracy=rule.required_accuracy,
    )


def _rule(
    name: str,
    rule: Rule,
    found: Pick,
    best_row: int,
    frontier: Frontier,
    curve: Curve,
    judge: Judge,
) -> RuleChoice:
    row, best = frontier.rows[found.row], frontier.rows[best_row]
    difference = curve.metric[:, best_row] - curve.metric[:, found.row]
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
    figure = f"{judge.task.metric_words} {row.metric:.3f}"
    demand = _demand(rule)
    nested = not name.endswith(ON_CURVE)
    if not found.met:
        lead = (
            f"No panel meets the demand: {demand}. The nearest miss has {markers} "
            f"(maker {row.maker}, {figure}{_cost_words(row)})."
        )
    elif nested:
        lead = (
            f"In inner folds of all samples {demand} has {markers} (maker "
            f"{row.maker}). On the curve of the outer folds that maker at that size "
            f"has {_article(judge)} {figure}; expect the headline, which counts the "
            "choosing."
        )
    else:
        lead = (
            f"{demand[0].upper()}{demand[1:]}, on the curve, has {markers} (maker "
            f"{row.maker}, {figure}). It is picked from the curve, so that figure is "
            "too good."
        )
    return RuleChoice(
        rule=name,
        primary=nested,
        panel=row.panel if found.met else "",
        figures=figures,
        sentence=f"{lead} {_against_best(row, best, frontier, gap, figures)}",
    )


def _with_panel(rule: RuleChoice, row: FrontierRow, currency: str) -> RuleChoice:
    """Return a choice with its markers, platform and cost, where there is one."""
    if not rule.panel:
        return rule
    priced = row.cost_total is not None
    return replace(
        rule,
        markers=row.markers,
        platform=row.platform,
        currency=currency if priced else "",
        cost_total=row.cost_total,
        cost_per_result=row.cost_per_result,
    )


def _cost_words(row: FrontierRow) -> str:
    return "" if row.cost_total is None else f", {row.cost_total:,} in all"


def _article(judge: Judge) -> str:
    return "an" if judge.task.metric_words[0] in "aeiou" else "a"


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


def _headline(primary: Primary, judge: Judge) -> Headline:
    found, chosen = judge.metric(primary.predictions), primary.chosen
    spread = _interval(found.low, found.high, judge.confidence)
    sentence = (
        "Letting the rule choose maker and size anew inside every training set gives "
        f"{_article(judge)} {judge.task.metric_words} of {found.mean:.3f} ({spread}) "
        "on people whom the training had not seen. "
        f"{_chosen_sizes(chosen.size)}{_unmet(chosen)}"
    )
    if not primary.declared:
        sentence = "Exploratory: the study file declares no primary rule. " + sentence
    return Headline(
        metric_of=(
            f"the whole procedure with the rule {primary.rule.name}, not of the "
            "printed panel"
        ),
        metric=found.mean,
        metric_low=found.low,
        metric_high=found.high,
        declared=primary.declared,
        sentence=sentence,
    )


def _unmet(chosen: TunedChoice) -> str:
    missed = int((~chosen.met).sum())
    if not missed:
        return ""
    return (
        f" In {missed} of {chosen.met.size} training sets no panel met the rule's "
        "demand and the nearest miss was taken."
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
