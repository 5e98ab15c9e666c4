"""What a reader of the first screen has to worry about, the gravest first."""

import math

from panelkit.records import Finding, RunSummary
from panelkit.report.outcome_words import words_of
from panelkit.report.picks import SLOPE_FLOOR, chosen_row, primary_rule
from panelkit.report.table_worries import worries_of_tables
from panelkit.report.wording import three_figures
from panelkit.report.worry import Worry

__all__ = ["worries_of"]

NO_PANEL = "first rule"
RANK = {
    NO_PANEL: 0,
    "accuracy": 1,
    "random panels": 2,
    "handling": 3,
    "calibration": 4,
    "fragility": 5,
    "comparators": 6,
    "subgroups": 7,
    "people": 8,
}
"""Worries of the run itself in the order in which they undermine the answer."""


def worries_of(summary: RunSummary) -> tuple[Worry, ...]:
    """Return what stands against the answer.

    Parameters
    ----------
    summary : RunSummary
        A finished run.

    Returns
    -------
    tuple of Worry
        Findings that stop, what the run itself shows (no panel, predicted chances
        that are too extreme, an undeclared rule), findings that warn.
    """
    stops = [_of_finding(item) for item in summary.findings.of("stop")]
    warnings = [_of_finding(item) for item in summary.findings.of("warning")]
    own = [*_of_run(summary), *worries_of_tables(summary)]
    own.sort(key=lambda worry: RANK.get(worry.where, len(RANK)))
    return (*stops, *own, *warnings)


def _of_finding(item: Finding) -> Worry:
    return Worry(item.severity, item.where, item.message, item.next_step)


def _of_run(summary: RunSummary) -> list[Worry]:
    found = []
    row, predicted = chosen_row(summary), words_of(summary.metric).predicted
    if row is None and primary_rule(summary) is not None:
        found.append(
            Worry(
                "warning",
                NO_PANEL,
                f"No panel meets the first rule. {_nearest(summary)}".rstrip(),
                "Read what the rule says and what the other rules chose",
            )
        )
    found += _of_headline(summary)
    if row is not None and math.isfinite(row.slope) and 0.0 < row.slope < SLOPE_FLOOR:
        found.append(
            Worry(
                "warning",
                "calibration",
                f"{predicted.capitalize()} are far too extreme: the out-of-fold "
                f"calibration slope at the chosen panel is "
                f"{three_figures(row.slope)}, and 1 would be right.",
                f"Do not use {predicted} before they are recalibrated on new samples",
            )
        )
    if not summary.choice.headline.declared:
        found.append(
            Worry(
                "warning",
                "choice",
                "The study file declares no primary rule: the result is exploratory.",
                "Declare a primary rule in the study file before the next cohort",
            )
        )
    if not summary.shortlist.picked.any():
        found.append(
            Worry(
                "warning",
                "shortlist",
                "The shortlist is empty: no marker of any panel is error-controlled.",
                "Treat every marker as a candidate",
            )
        )
    return found


def _of_headline(summary: RunSummary) -> list[Worry]:
    """Return what the headline and the chosen row themselves give to worry about."""
    headline, row = summary.choice.headline, chosen_row(summary)
    found = []
    if summary.doubt:
        found.append(
            Worry(
                "warning",
                "accuracy",
                summary.doubt,
                "Do not build a panel on this outcome and cohort",
            )
        )
    if not math.isfinite(headline.metric_low):
        found.append(
            Worry(
                "warning",
                "accuracy",
                "The headline has no interval: too few people of a class, or scores "
                "that separate everybody.",
                "Look for a feature that holds the outcome itself, or add people",
            )
        )
    if row is None:
        return found
    if row.slope <= 0.0:
        found.append(
            Worry(
                "warning",
                "calibration",
                "Out of fold, scores at the chosen size do not point the right way "
                f"(calibration slope {three_figures(row.slope)}).",
                "Read this as no usable signal",
            )
        )
    if not math.isfinite(row.slope):
        found.append(
            Worry(
                "warning",
                "calibration",
                "The calibration slope could not be estimated at the chosen size.",
                f"Do not use {words_of(summary.metric).predicted}",
            )
        )
    sizes = [each.size for each in summary.frontier.rows]
    best = max(summary.frontier.rows, key=lambda each: each.metric)
    if len(set(sizes)) > 1 and best.size == max(sizes):
        found.append(
            Worry(
                "warning",
                "panels",
                f"The most accurate panel of the curve has {best.size} markers, the "
                "largest size offered.",
                "Offer larger sizes to see where the curve ends",
            )
        )
    return found


def _nearest(summary: RunSummary) -> str:
    rule = primary_rule(summary)
    return "" if rule is None else rule.sentence
