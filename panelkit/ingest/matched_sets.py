"""What matched sets show: sets without a contrast, people in two of them."""

import numpy as np

from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_matched_sets"]

WHERE = "samples, matched_set"


def check_matched_sets(cohort: Cohort) -> list[Finding]:
    """Return what the matched sets of a cohort show.

    Parameters
    ----------
    cohort : Cohort
        Its design may hold matched sets.

    Returns
    -------
    list of Finding
        Samples without a set, sets that hold one class only, singletons, subjects in
        several sets.
    """
    design, outcome = cohort.design, cohort.outcome
    sets, names = design.matched_set, design.matched_set_ids
    if sets is None or names is None:
        return []
    findings = []
    alone = sets < 0
    if alone.any():
        findings.append(
            Finding(
                code="matched-set-blank",
                severity="warning",
                where=WHERE,
                message=f"{counted(int(alone.sum()), 'sample is', 'samples are')} in "
                f"no matched set: {quoted(cohort.samples[alone])}",
                next_step="Fill in the sets, or leave these samples out with keep.",
            )
        )
    if outcome is not None and outcome.kind == "binary":
        findings += _one_sided(cohort, sets, names)
    return findings + _several_sets(cohort, sets)


def _one_sided(cohort: Cohort, sets: np.ndarray, names: np.ndarray) -> list[Finding]:
    assert cohort.outcome is not None  # asked by the caller
    inside = sets >= 0
    size = np.bincount(sets[inside], minlength=len(names))
    positive = np.bincount(
        sets[inside], weights=cohort.outcome.values[inside], minlength=len(names)
    )
    lacking = (positive == 0) | (positive == size)
    if not lacking.any():
        return []
    everywhere = bool(lacking.all())
    return [
        Finding(
            code="matched-set-one-class",
            severity="stop" if everywhere else "warning",
            where=WHERE,
            message=f"{lacking.sum()} of {len(names)} matched sets do not hold both "
            f"classes, {int((size == 1).sum())} of them are one sample alone: "
            f"{quoted(names[lacking])}",
            next_step="Check the sets and what the row filters took out of them; such "
            "sets say nothing of the difference within sets.",
        )
    ]


def _several_sets(cohort: Cohort, sets: np.ndarray) -> list[Finding]:
    subject, ids = cohort.design.subject, cohort.design.subject_ids
    pairs = {(s, m) for s, m in zip(subject, sets, strict=True) if m >= 0}
    counts = np.bincount([s for s, _ in pairs], minlength=len(ids))
    if not (counts > 1).any():
        return []
    return [
        Finding(
            code="subject-in-two-sets",
            severity="warning",
            where=WHERE,
            message=f"{counted(int((counts > 1).sum()), 'subject is', 'subjects are')} "
            f"in more than one matched set: {quoted(ids[counts > 1])}; such sets stay "
            "together in folds and halves",
            next_step="Correct the sets, unless a person was chosen for several of "
            "them.",
        )
    ]
