"""What was found about a panel's weak points, in sentences."""

import math

from panelkit.records import Fragility, LearningPoint, RunSummary, StandIn, Subgroup
from panelkit.report.outcome_words import words_of
from panelkit.report.wording import (
    NOT_ESTIMATED,
    interval,
    printable,
    shorten,
    three_figures,
)

__all__ = [
    "added_value_words",
    "event_words",
    "fatal_losses",
    "fragility_caption",
    "how_words",
    "is_rising",
    "learning_caption",
    "learning_words",
    "low_subgroups",
    "measure_words",
    "signed",
    "signed_interval",
    "statistic_words",
    "subgroup_caption",
    "subgroup_label",
]

LONGEST_IN_SENTENCE = 40
EVENTS = {
    "lost-refitted": "lost, the rest refitted",
    "lost-imputed": "lost, its mean put in",
}
HOW = {"maker": "next choice of the maker", "companion": "closest companion"}
STATISTICS = {
    "spearman": "rank correlation (Spearman)",
    "epsilon-squared": "share of rank variance between groups",
}
NET_BENEFIT = "net-benefit-at-"


def signed(value: float, places: int = 3) -> str:
    """Return a difference with its sign, or that it is not estimated.

    A difference that rounds to zero has no sign.
    """
    if not math.isfinite(value):
        return NOT_ESTIMATED
    rounded = round(value, places)
    return f"{rounded:+.{places}f}" if rounded else f"{0.0:.{places}f}"


def signed_interval(low: float, high: float) -> str:
    """Return an interval of a difference in words."""
    if not (math.isfinite(low) and math.isfinite(high)):
        return interval(low, high)
    return f"{signed(low)} to {signed(high)}"


def event_words(event: str) -> str:
    """Return what happened to a marker."""
    return EVENTS.get(event, event.replace("-", " "))


def how_words(row: StandIn) -> str:
    """Return how a stand-in was found."""
    return HOW.get(row.how, row.how)


def statistic_words(code: str) -> str:
    """Return a statistic's name."""
    return STATISTICS.get(code, code.replace("-", " "))


def _short(name: str) -> str:
    return shorten(printable(name), LONGEST_IN_SENTENCE)


def fatal_losses(summary: RunSummary) -> list[Fragility]:
    """Return losses of one marker after which no skill is left or told from none.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    list of Fragility
        Rows whose loss is shown and whose interval reaches down to no skill; at most
        one a marker.
    """
    found: dict[str, Fragility] = {}
    for row in summary.aftermath.fragility:
        before = row.metric + row.loss
        shown = row.loss_low > 0.0 and before - row.loss_high <= summary.no_skill
        if row.marker and row.loss > 0.0 and (shown or row.metric <= summary.no_skill):
            found.setdefault(row.marker, row)
    return list(found.values())


def fragility_caption(summary: RunSummary) -> str:
    """Return what the picture of lost markers shows."""
    rows = [row for row in summary.aftermath.fragility if row.marker]
    if not rows:
        return "No marker was taken away."
    worst = max(rows, key=lambda row: row.loss)
    shown = {row.marker for row in rows if row.loss_low > 0.0}
    markers = {row.marker for row in rows}
    if fatal_losses(summary):
        found = (
            f"Without {_short(worst.marker)} no skill is left that these data could "
            f"show: the loss is {three_figures(worst.loss)} "
            f"({signed_interval(worst.loss_low, worst.loss_high)})."
        )
    elif not shown:
        found = (
            f"No single marker's loss is told apart from none by these data; the "
            f"largest is {signed(worst.loss)} "
            f"({signed_interval(worst.loss_low, worst.loss_high)}), without "
            f"{_short(worst.marker)} ({event_words(worst.event)})."
        )
    else:
        found = (
            f"The gravest loss is {signed(worst.loss)} "
            f"({signed_interval(worst.loss_low, worst.loss_high)}), without "
            f"{_short(worst.marker)} ({event_words(worst.event)}); it is shown for "
            f"{len(shown)} of {len(markers)} markers."
        )
    return (
        f"{found} Each fold's own panel lost the marker in the same role (first "
        "choice, second choice, ...): a loss belongs to the role that the named "
        "marker fills. Thin bars are intervals of the paired loss."
    )


def is_rising(curve: tuple[LearningPoint, ...]) -> bool:
    """Return whether accuracy was still rising at the end of the learning curve.

    All people are shown to reach more than some smaller share (the interval of the
    paired gain lies above 0), and gained over the largest such share as well.
    """
    thin = [point for point in curve if math.isfinite(point.gain)]
    return bool(thin) and thin[-1].gain > 0 and any(p.gain_low > 0 for p in thin)


def learning_words(summary: RunSummary) -> str:
    """Return whether more people would help, as far as the learning curve says."""
    curve = summary.aftermath.learning_curve
    thin = [point for point in curve if math.isfinite(point.gain)]
    if not thin:
        return "More people: not judged, no smaller share could be learnt from."
    near, everyone = thin[-1], curve[-1]
    people = f"{near.n_subjects:.0f} to {everyone.n_subjects:.0f}"
    spread = signed_interval(near.gain_low, near.gain_high)
    if is_rising(curve):
        seen = max(
            (point for point in thin if point.gain_low > 0.0),
            key=lambda point: point.share,
        )
        last = ""
        if seen is not near:
            last = f"; over the last step ({people}) it rose by {signed(near.gain)}"
        return (
            "More people would probably bring more: from "
            f"{seen.n_subjects:.0f} to {everyone.n_subjects:.0f} training subjects "
            f"accuracy rose by {signed(seen.gain)} "
            f"({signed_interval(seen.gain_low, seen.gain_high)}){last}."
        )
    if near.gain <= 0.0:
        return (
            "More people of the same kind were not shown to help: from "
            f"{people} training subjects accuracy moved by {signed(near.gain)} "
            f"({spread})."
        )
    return (
        "These data do not tell whether more people would help: from "
        f"{people} training subjects accuracy moved by {signed(near.gain)} ({spread})."
    )


def learning_caption(summary: RunSummary) -> str:
    """Return what the learning curve shows."""
    return (
        f"{learning_words(summary)} The same rule learnt and chose again with "
        f"{100 * summary.aftermath.learning_curve[0].share:.0f} % of the training "
        "subjects and more, on the folds of the first repeat alone; the "
        "last point may differ from the headline, which averages all repeats."
    )


def subgroup_label(row: Subgroup) -> str:
    """Return a group's name for a picture or a sentence."""
    return f"{row.column} = {row.group}"


def low_subgroups(summary: RunSummary) -> list[Subgroup]:
    """Return the groups whose interval lies below the headline."""
    headline = summary.choice.headline.metric
    return [row for row in summary.aftermath.subgroups if row.metric_high < headline]


def subgroup_caption(summary: RunSummary) -> str:
    """Return what the picture of subgroups shows."""
    rows = summary.aftermath.subgroups
    judged = [row for row in rows if math.isfinite(row.metric)]
    low = low_subgroups(summary)
    if not judged:
        found = f"None of {len(rows)} groups is large enough for a figure."
    elif low:
        worst = min(low, key=lambda row: row.metric)
        found = (
            f"{len(low)} of {len(judged)} groups {'lies' if len(low) == 1 else 'lie'} "
            f"below the headline with the whole interval; the lowest is "
            f"{_short(subgroup_label(worst))} at {three_figures(worst.metric)}."
        )
    else:
        worst = min(judged, key=lambda row: row.metric)
        found = (
            f"No group's interval lies below the headline; the lowest of "
            f"{len(judged)} figures is {three_figures(worst.metric)} "
            f"({_short(subgroup_label(worst))})."
        )
    small = len(rows) - len(judged)
    few = f" {small} more are too small for a figure." if small and judged else ""
    return (
        f"{found}{few} Among many groups some lie low by chance; intervals are not "
        "widened for their number."
    )


def measure_words(measure: str, metric: str, metric_words: str) -> str:
    """Return a measure of added value in words, and which direction is better."""
    if measure == metric:
        return f"{metric_words} (higher is better)"
    if measure.startswith(NET_BENEFIT):
        threshold = measure.removeprefix(NET_BENEFIT)
        return f"net benefit, acting from a chance of {threshold} (higher is better)"
    if measure == "loss":
        return f"{words_of(metric).loss} (lower is better)"
    return {"brier": "Brier score (lower is better)"}.get(measure, measure)


def added_value_words(summary: RunSummary) -> str:
    """Return what the panel adds to the covariates, by loss first."""
    rows = summary.aftermath.added_value
    if not rows:
        return "The study names no covariates: nothing to add to."
    row = rows[0]
    name = words_of(summary.metric).loss
    figures = (
        f"{name} {three_figures(row.covariates)} with the covariates alone, "
        f"{three_figures(row.with_panel)} with the panel as well; gain "
        f"{signed(row.gain)}, interval {signed_interval(row.gain_low, row.gain_high)}"
    )
    if row.gain_low > 0.0:
        return f"The panel adds to the covariates ({figures})."
    if row.gain_high < 0.0:
        return f"The panel makes predictions from the covariates worse ({figures})."
    return f"It is not shown that the panel adds to the covariates ({figures})."
