"""What a reader of the first screen has to worry about, the gravest first."""

import math
from dataclasses import dataclass

from panelkit.records import Finding, RunSummary
from panelkit.report.picks import SLOPE_FLOOR, chosen_row, primary_rule
from panelkit.report.wording import three_figures

__all__ = ["Worry", "worries_of"]


@dataclass(frozen=True, slots=True)
class Worry:
    """One thing to worry about.

    Attributes
    ----------
    severity : {"stop", "warning"}
        As of findings.
    where : str
        What it is about.
    text : str
        What was seen, and what to do.
    next_step : str
        What to do about it.
    """

    severity: str
    where: str
    text: str
    next_step: str


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
    return (*stops, *_of_run(summary), *warnings)


def _of_finding(item: Finding) -> Worry:
    return Worry(item.severity, item.where, item.message, item.next_step)


def _of_run(summary: RunSummary) -> list[Worry]:
    found = []
    row = chosen_row(summary)
    if row is None and primary_rule(summary) is not None:
        found.append(
            Worry(
                "warning",
                "choice",
                "No panel meets the first rule.",
                "Read what the rule says and what the other rules chose",
            )
        )
    if row is not None and math.isfinite(row.slope) and row.slope < SLOPE_FLOOR:
        found.append(
            Worry(
                "warning",
                "calibration",
                f"Predicted chances are far too extreme: the out-of-fold calibration "
                f"slope at the chosen panel is {three_figures(row.slope)}, and 1 would "
                "be right.",
                "Do not read a score as a chance before it is recalibrated on new "
                "samples",
            )
        )
    if not summary.choice.headline.declared:
        found.append(
            Worry(
                "warning",
                "choice",
                "No primary rule was declared before the run, so the result is "
                "exploratory.",
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
