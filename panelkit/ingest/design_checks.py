"""What the design shows: classes, subjects, and sites that lie higher than others."""

import warnings
from collections import Counter

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.ingest.cells import is_missing
from panelkit.ingest.scale import ScaleGuess
from panelkit.ingest.wording import figure, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_design", "check_level_shift"]

FEW_SUBJECTS = 10
SHIFT = 0.25
MIN_LEVEL = 3
"""Levels with fewer samples say too little about their height."""
MAX_FEATURES = 20_000

Text = NDArray[np.object_]


def check_design(cohort: Cohort) -> list[Finding]:
    """Return what classes and subjects show.

    Parameters
    ----------
    cohort : Cohort
        The cohort.

    Returns
    -------
    list of Finding
        Class sizes, small classes, several samples of a subject, subjects with both
        classes.
    """
    return [*_class_sizes(cohort), *_subjects(cohort)]


def _class_sizes(cohort: Cohort) -> list[Finding]:
    outcome = cohort.outcome
    if outcome is None or outcome.kind != "binary":
        return []
    where = f"samples, column {outcome.column!r}"
    sizes = {
        name: (
            int((outcome.values == value).sum()),
            len(np.unique(cohort.design.subject[outcome.values == value])),
        )
        for name, value in ((outcome.positive, 1.0), (outcome.negative, 0.0))
    }
    listed = ", ".join(
        f"{name!r} {samples}" + (f" of {people} subjects" if people != samples else "")
        for name, (samples, people) in sizes.items()
    )
    findings = [
        Finding(
            code="class-sizes",
            severity="info",
            where=where,
            message=f"{cohort.n_samples} samples: {listed}; scores point to "
            f"{outcome.positive!r}",
            next_step="Check that these are the numbers expected.",
        )
    ]
    few = {name: people for name, (_, people) in sizes.items() if people < FEW_SUBJECTS}
    if few:
        listed = ", ".join(f"{name!r} has {people}" for name, people in few.items())
        findings.append(
            Finding(
                code="few-subjects",
                severity="warning",
                where=where,
                message=f"fewer than {FEW_SUBJECTS} subjects in a class: {listed}",
                next_step="Expect wide intervals; add subjects before a panel is "
                "locked.",
            )
        )
    return findings


def _subjects(cohort: Cohort) -> list[Finding]:
    design = cohort.design
    if design.n_subjects == cohort.n_samples:
        return []
    counts = np.bincount(design.subject)
    findings = [
        Finding(
            code="several-samples-per-subject",
            severity="info",
            where="samples, subject",
            message=f"{cohort.n_samples} samples come from {design.n_subjects} "
            f"subjects, up to {counts.max()} from one",
            next_step="Nothing; a subject stays whole in subsamples and folds, and its "
            "samples share one weight.",
        )
    ]
    if cohort.outcome is not None and cohort.outcome.kind == "binary":
        positive = np.bincount(design.subject, weights=cohort.outcome.values)
        both = (positive > 0) & (positive < counts)
        if both.any():
            findings.append(
                Finding(
                    code="subject-in-both-classes",
                    severity="stop",
                    where="samples, subject",
                    message=f"{both.sum()} of {design.n_subjects} subjects have "
                    f"samples of both classes: {quoted(design.subject_ids[both])}",
                    next_step="Correct the outcome or the subjects, or keep one sample "
                    "of each subject.",
                )
            )
    return findings


def check_level_shift(cohort: Cohort, scale: ScaleGuess) -> list[Finding]:
    """Return sites and batches that lie higher or lower than others.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    scale : ScaleGuess
        Scale of its values; linear ones and counts are compared in log2.

    Returns
    -------
    list of Finding
        ``site-shift`` where the medians of per-sample medians differ by more than
        0.25 in log2: info for counts, whose depth is divided out, else a warning.
    """
    if scale.kind not in ("counts", "linear", "log2"):
        return []
    columns = [("site", cohort.design.site), ("batch", cohort.design.batch)]
    named = [(role, column) for role, column in columns if column is not None]
    if not named:
        return []
    heights = _sample_heights(cohort, in_log2=scale.kind == "log2")
    findings = []
    for role, column in named:
        findings += _shift(heights, column, role, scale)
    return findings


def _sample_heights(cohort: Cohort, *, in_log2: bool) -> NDArray[np.float64]:
    step = max(1, -(-cohort.n_features // MAX_FEATURES))
    with warnings.catch_warnings():
        # a sample without any value has no height; it is named by its own finding
        warnings.filterwarnings("ignore", message="All-NaN slice")
        medians = np.nanmedian(cohort.values[::step].astype(np.float64), axis=0)
    if in_log2:
        return np.asarray(medians)
    return np.asarray(np.log2(np.maximum(medians, 0.0) + PREPARATION.log2_offset))


def _shift(
    heights: NDArray[np.float64], column: Text, role: str, scale: ScaleGuess
) -> list[Finding]:
    usable = np.isfinite(heights) & [not is_missing(cell) for cell in column]
    sizes = Counter(column[usable])
    levels = {
        level: float(np.median(heights[usable & (column == level)]))
        for level, size in sizes.items()
        if size >= MIN_LEVEL
    }
    if len(levels) < 2:
        return []
    low = min(levels, key=lambda level: levels[level])
    high = max(levels, key=lambda level: levels[level])
    shift = levels[high] - levels[low]
    if shift <= SHIFT:
        return []
    return [
        Finding(
            code="site-shift",
            severity="info" if scale.kind == "counts" else "warning",
            where=f"samples, {role}",
            message=f"the median sample of {role} {high!r} lies {figure(shift)} (in "
            f"log2) above that of {role} {low!r}",
            next_step="Normalise samples to a common level, or check the laboratories' "
            "protocols.",
        )
    ]
