"""Whether subjects with several samples were left unnamed."""

import re
from collections import Counter

import numpy as np

from panelkit.ingest.cells import is_missing
from panelkit.ingest.wording import quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_subject_named"]

_WORDS = (
    "subject",
    "patient",
    "participant",
    "donor",
    "person",
    "individual",
    "volunteer",
    "proband",
    "animal",
    "mouse",
)
_COLUMN = re.compile(
    rf"(?:.*[_ .-])?(?:{'|'.join(_WORDS)})s?(?:[_ .-]?(?:id|no|nr|number|code|name))?"
)
_TAIL = re.compile(r"(.*\d.*)[_.\- ](?:[A-Za-z]+\d{0,2}|\d{1,2})")
"""A part with a digit, a mark, and a short number or a word: P012_T2, 232-97_node."""
_SHARING = 0.1
"""Share of samples that have to share a stem."""
_LARGEST = 20
"""More samples with one stem than that: the stem is a study, not a person."""


def check_subject_named(cohort: Cohort) -> list[Finding]:
    """Return the request to name the subject column, where people seem to repeat.

    Parameters
    ----------
    cohort : Cohort
        Only one in which no samples belong together is looked at.

    Returns
    -------
    list of Finding
        ``subject-column-unnamed``: stop where a column named like a subject repeats
        its entries, warning where only the sample ids share stems.
    """
    if len(np.unique(cohort.design.blocks)) < cohort.n_samples:
        return []
    for name, cells in cohort.sample_columns.items():
        if not _COLUMN.fullmatch(name.strip().casefold()):
            continue
        filled = [str(cell) for cell in cells if not is_missing(str(cell))]
        if 1 < len(set(filled)) < len(filled):
            return [_column(cohort, name, filled)]
    return _stems(cohort)


def _column(cohort: Cohort, name: str, filled: list[str]) -> Finding:
    counts = Counter(filled)
    return Finding(
        code="subject-column-unnamed",
        severity="stop",
        where=f"samples, column {name!r}",
        message=f"no subject column is named, but {name!r} has {len(counts)} different "
        f"entries for {cohort.n_samples} samples, up to {max(counts.values())} of one: "
        "folds would train and test on the same people",
        next_step=f"Add subject = {name!r} if these are people; otherwise accept "
        "this finding with a reason.",
    )


def _stems(cohort: Cohort) -> list[Finding]:
    stems = []
    for sample in cohort.samples:
        match = _TAIL.fullmatch(str(sample))
        stems.append(match.group(1) if match else str(sample))
    counts = Counter(stems)
    sharing = np.array([counts[stem] > 1 for stem in stems])
    if sharing.mean() < _SHARING or max(counts.values()) > _LARGEST:
        return []
    if len(counts) < max(2, cohort.n_samples // 10):
        return []
    shared = [stem for stem, count in counts.items() if count > 1]
    return [
        Finding(
            code="subject-column-unnamed",
            severity="warning",
            where="samples, sample ids",
            message=f"no subject column is named, but {int(sharing.sum())} of "
            f"{cohort.n_samples} sample ids share their first part with another one "
            f"({quoted(shared)})",
            next_step="Add a subject column to the sample sheet if these are samples "
            "of the same people.",
        )
    ]
