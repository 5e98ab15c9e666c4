"""What the design shows: classes, subjects, and an outcome tied to something else."""

import warnings
from collections import Counter
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.ingest.cells import cell_number, is_missing
from panelkit.ingest.scale import ScaleGuess
from panelkit.ingest.wording import counted, figure, quoted
from panelkit.metrics import (
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)
from panelkit.records import Cohort, Finding

__all__ = ["check_design", "check_level_shift", "check_ties"]

FEW_SUBJECTS = 10
TIED = 0.3
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


def check_ties(
    cohort: Cohort, nuisance: Sequence[str] = (), covariates: Sequence[str] = ()
) -> list[Finding]:
    """Return where the outcome goes along with site, batch or another column.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    nuisance, covariates : sequence of str
        Further columns of the sample sheet; those with many different numbers are
        cut into quarters.

    Returns
    -------
    list of Finding
        ``outcome-tied-to-...``: stop where no level can compare the classes, warning
        above a corrected Cramer's V of 0.3; blank entries.
    """
    findings = []
    for role, column in (("site", cohort.design.site), ("batch", cohort.design.batch)):
        if column is not None:
            findings += _tie(cohort, column, role, f"samples, {role}")
    for role, names in (("nuisance", nuisance), ("covariate", covariates)):
        for name in names:
            levels = _quarters(cohort.sample_columns[name])
            findings += _tie(cohort, levels, role, f"samples, column {name!r}")
    return findings


def _quarters(cells: Text) -> Text:
    """Return numbers with more than ten different values as quarters."""
    numbers = np.array(
        [np.nan if (v := cell_number(c)) is None else v for c in cells], dtype=float
    )
    text = [c for c, v in zip(cells, numbers, strict=True) if np.isnan(v)]
    observed = numbers[~np.isnan(numbers)]
    if len(np.unique(observed)) <= 10 or not all(is_missing(c) for c in text):
        return cells
    cuts = np.quantile(observed, [0.25, 0.5, 0.75])
    quarter = np.searchsorted(cuts, numbers, side="left") + 1
    return np.array(
        [
            "" if np.isnan(v) else f"quarter {q}"
            for v, q in zip(numbers, quarter, strict=True)
        ],
        dtype=object,
    )


def _tie(cohort: Cohort, column: Text, role: str, where: str) -> list[Finding]:
    present = np.array([not is_missing(cell) for cell in column], dtype=bool)
    findings = []
    if not present.all():
        blank = int((~present).sum())
        findings.append(
            Finding(
                code=f"{role}-blank",
                severity="warning",
                where=where,
                message=f"{counted(blank, 'sample has', 'samples have')} "
                f"a blank entry: {quoted(cohort.samples[~present])}",
                next_step="Fill them in; they are left out of this check.",
            )
        )
    if cohort.outcome is None or cohort.outcome.kind != "binary":
        return findings
    classes = cohort.outcome.values[present].astype(int).astype(str).astype(object)
    table, levels, _ = contingency_table(column[present], classes)
    if min(table.shape) < 2:
        return findings
    return findings + _tie_finding(table, levels, role, where)


def _tie_finding(
    table: NDArray[np.int64], levels: list[str], role: str, where: str
) -> list[Finding]:
    plain, corrected = cramers_v(table), cramers_v_corrected(table)
    comparable = table.min(axis=1) >= 2
    # matched sets (one of each class in a level) are balanced, not confounded
    confounded = not comparable.any() and plain > TIED
    if not confounded and corrected <= TIED:
        return []
    shared = int(table[table.min(axis=1) >= 1].sum())
    figures = (
        f"Cramer's V {figure(plain)}, bias-corrected {figure(corrected)}; {shared} of "
        f"{table.sum()} samples sit in a level with both classes; levels "
        + _level_counts(table, levels)
    )
    if confounded:
        return [
            Finding(
                code=f"outcome-tied-to-{role}",
                severity="stop",
                where=where,
                message="no level holds at least 2 samples of each class, so that "
                f"outcome and {role} cannot be told apart ({figures})",
                next_step="Measure both classes in the same runs, or compare other "
                "classes; no correction can mend this.",
            )
        ]
    return [
        Finding(
            code=f"outcome-tied-to-{role}",
            severity="warning",
            where=where,
            message=f"the outcome goes along with {role} ({figures})",
            next_step=f"Keep to levels of {role} that hold both classes, or validate "
            "where the two are balanced.",
        )
    ]


def _level_counts(table: NDArray[np.int64], levels: list[str]) -> str:
    order = np.argsort(-table.sum(axis=1), kind="stable")
    shown = [f"{levels[i]!r} {table[i, 1]}/{table[i, 0]}" for i in order]
    more = f" and {len(shown) - 5} more" if len(shown) > 5 else ""
    return ", ".join(shown[:5]) + more + " (positive/negative)"


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
