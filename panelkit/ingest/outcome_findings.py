"""How an outcome that is not binary was read, said in figures."""

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.wording import counted, figure, quoted
from panelkit.records import Cohort, Finding, Outcome

__all__ = ["check_outcome"]

FEW_VALUES = 5
"""A number with so few different values may be a code."""


def check_outcome(cohort: Cohort) -> list[Finding]:
    """Return how the outcome was read, for kinds other than binary.

    Parameters
    ----------
    cohort : Cohort
        The cohort.

    Returns
    -------
    list of Finding
        Class sizes, events and follow-up, range of numbers; subjects whose samples
        have different outcomes; a horizon beyond the follow-up.
    """
    outcome = cohort.outcome
    if outcome is None or outcome.kind == "binary":
        return []
    where = f"samples, column {outcome.column!r}"
    if outcome.kind == "classes":
        findings = _classes(outcome, where)
    elif outcome.kind == "number":
        findings = _number(outcome, where)
    else:
        findings = _survival(outcome, where)
    return findings + _subjects(cohort, outcome)


def _classes(outcome: Outcome, where: str) -> list[Finding]:
    names, codes = outcome.groups
    sizes = np.bincount(codes, minlength=len(names))
    listed = ", ".join(f"{n!r} {k}" for n, k in zip(names, sizes, strict=True))
    return [
        Finding(
            code="class-sizes",
            severity="info",
            where=where,
            message=f"{len(codes)} samples in {len(names)} classes: {listed}",
            next_step="Check that these are the numbers expected.",
        )
    ]


def _number(outcome: Outcome, where: str) -> list[Finding]:
    low, middle, high = np.quantile(outcome.values, [0.0, 0.5, 1.0])
    unit = f" {outcome.unit}" if outcome.unit else ""
    findings = [
        Finding(
            code="outcome-range",
            severity="info",
            where=where,
            message=f"{len(outcome.values)} samples from {figure(low)} to "
            f"{figure(high)}{unit}, median {figure(middle)}",
            next_step="Check that these are the numbers and the unit expected.",
        )
    ]
    different = np.unique(outcome.values)
    if len(different) <= FEW_VALUES:
        findings.append(
            Finding(
                code="outcome-few-values",
                severity="warning",
                where=where,
                message=f"the outcome is read as a number, but has "
                f"{len(different)} different values only: "
                f"{quoted(map(figure, different))}",
                next_step="Name positive, or classes, if these are codes.",
            )
        )
    return findings


def _survival(outcome: Outcome, where: str) -> list[Finding]:
    assert outcome.event is not None  # of this kind
    time, event = outcome.values, outcome.event
    unit = f" {outcome.unit}" if outcome.unit else ""
    follow_up = _median_follow_up(time, event)
    middle = "not reached" if follow_up is None else f"{figure(follow_up)}{unit}"
    findings = [
        Finding(
            code="events",
            severity="info",
            where=where,
            message=f"{len(time)} samples: {event.sum()} with the event (code "
            f"{outcome.event_codes[0]!r} of {outcome.event_column!r}), "
            f"{(~event).sum()} censored ({outcome.event_codes[1]!r}); times from "
            f"{figure(time.min())} to {figure(time.max())}{unit}, median follow-up "
            f"{middle}",
            next_step="Check that these are the numbers and the unit expected.",
        )
    ]
    if outcome.horizon is not None and outcome.horizon > time.max():
        findings.append(
            Finding(
                code="horizon-beyond-follow-up",
                severity="warning",
                where=where,
                message=f"nobody was followed up to the horizon of "
                f"{figure(outcome.horizon)}{unit} (the longest time is "
                f"{figure(time.max())})",
                next_step="Name an earlier horizon, or check the unit.",
            )
        )
    return findings


def _median_follow_up(
    time: NDArray[np.float64], event: NDArray[np.bool_]
) -> float | None:
    """Return the median follow-up, None when it is not reached.

    The product-limit estimate with events and censoring exchanged; of equal times
    events come first, so that who had one is not at risk of being censored.

    References
    ----------
    Kaplan & Meier 1958, J Am Stat Assoc 53:457; Schemper & Smith 1996, Control Clin
    Trials 17:343.
    """
    share = 1.0
    for moment in np.unique(time[~event]):
        ended = int(((time == moment) & ~event).sum())
        at_risk = int((time > moment).sum()) + ended
        share *= 1.0 - ended / at_risk
        if share <= 0.5:
            return float(moment)
    return None


def _subjects(cohort: Cohort, outcome: Outcome) -> list[Finding]:
    """Return the subjects whose samples do not agree on the outcome."""
    design = cohort.design
    pairs = np.column_stack(
        [
            outcome.values,
            np.zeros(len(outcome.values)) if outcome.event is None else outcome.event,
        ]
    )
    apart = [
        design.subject_ids[code]
        for code in range(design.n_subjects)
        if len(np.unique(pairs[design.subject == code], axis=0)) > 1
    ]
    if not apart:
        return []
    return [
        Finding(
            code="subject-with-several-outcomes",
            severity="warning" if outcome.kind == "number" else "stop",
            where="samples, subject",
            message=f"{counted(len(apart), 'subject has', 'subjects have')} samples "
            f"with different outcomes: {quoted(apart)}",
            next_step="Correct the outcome or the subjects, or keep one sample of each "
            "subject.",
        )
    ]
