"""What every kind of outcome column can tell while rows are selected."""

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, name_some
from panelkit.records import Outcome

__all__ = [
    "CELL_ADVICE",
    "MIN_SUBJECTS",
    "OutcomeColumn",
    "OutcomeWords",
    "check_class_sizes",
    "named_cells",
    "with_counts",
]

MIN_SUBJECTS = 4
"""Fewer subjects in a class cannot be split into folds that mean anything."""

CELL_ADVICE = "Correct these cells, or leave their samples out with keep"

Mask = NDArray[np.bool_]
Text = NDArray[np.object_]


@dataclass(frozen=True, slots=True)
class OutcomeWords:
    """What the user says about the outcome.

    Attributes
    ----------
    outcome : str or None
        Column with classes or numbers.
    kind : str or None
        As stated: binary, classes, number or survival.
    positive, negative : object
        Classes of a binary outcome.
    classes : tuple of object
        Classes of an outcome with three or more.
    unit : str
        Of a number.
    time, event : str or None
        Columns of a survival outcome.
    event_value, censored_value : object
        Codes in `event`; None for 1 and 0.
    horizon : float or None
        Time up to which chances are asked for.
    time_unit : str
        Of `time` and `horizon`.
    """

    outcome: str | None = None
    kind: str | None = None
    positive: object = None
    negative: object = None
    classes: tuple[object, ...] = ()
    unit: str = ""
    time: str | None = None
    event: str | None = None
    event_value: object = None
    censored_value: object = None
    horizon: float | None = None
    time_unit: str = ""


class OutcomeColumn(Protocol):
    """An outcome as it stands in the sample sheet, one entry a row.

    Attributes
    ----------
    where : str
        Sheet and column, for messages.
    labels : ndarray of shape (n_rows,), object
        The group in which each row is counted, ``""`` where the outcome is missing.
    """

    @property
    def where(self) -> str:
        """Sheet and column."""

    @property
    def labels(self) -> Text:
        """Group of each row."""

    def usable(self) -> Mask:
        """Return which rows have an outcome that may be analysed."""

    def settle(self, rows: Mask) -> tuple[str, ...]:
        """Return the groups that are analysed, in the order in which they are shown.

        Parameters
        ----------
        rows : ndarray of shape (n_rows,), bool
            Rows that were matched, have an outcome and were kept.

        Raises
        ------
        InputDataError
            When these rows do not make an outcome of this kind.
        """

    def record(
        self, rows: NDArray[np.int64], groups: tuple[str, ...], subjects: Text
    ) -> Outcome:
        """Return the outcome of the analysed rows.

        Parameters
        ----------
        rows : ndarray of shape (n_samples,), int64
            Positions in the sheet.
        groups : tuple of str
            As settled.
        subjects : ndarray of shape (n_samples,), object
            Subject of each analysed row.

        Raises
        ------
        InputDataError
            When there are too few subjects.
        """


def check_class_sizes(
    where: str, labels: Iterable[str], subjects: Iterable[str]
) -> None:
    """Refuse a class with too few subjects.

    Parameters
    ----------
    where : str
        Sheet and column, for the message.
    labels, subjects : iterable of str
        Class and subject of each analysed sample.

    Raises
    ------
    InputDataError
        When a class has fewer than four subjects.
    """
    pairs = set(zip(labels, subjects, strict=True))
    counts = Counter(label for label, _ in pairs)
    small = Counter({k: n for k, n in counts.items() if n < MIN_SUBJECTS})
    if small:
        raise InputDataError(
            code="too-few-subjects",
            where=where,
            what=f"too few subjects in a class: {with_counts(small)}",
            accepted=f"each class needs at least {MIN_SUBJECTS} subjects",
            next_step="Add subjects, or choose other classes or row filters",
        )


def named_cells(wrong: Mask, ids: Text, cells: Text) -> str:
    """Return cells with the samples that they belong to, counted, the first five named.

    Parameters
    ----------
    wrong : ndarray of shape (n_rows,), bool
        Which cells.
    ids, cells : ndarray of shape (n_rows,), object
        Samples, and the cells as written.

    Returns
    -------
    str
        ``"(got 2: 'S03' ('x'), 'S17' ('-'))"``.
    """
    named = [
        f"{str(name)!r} ({str(cell)[:40]!r})"
        for name, cell in zip(ids[wrong], cells[wrong], strict=True)
    ]
    return f"(got {len(named)}: {name_some(named)})"


def with_counts(counts: Counter[str]) -> str:
    """Return names with their counts, the most frequent five of them."""
    ranked = counts.most_common()
    shown = ", ".join(f"{name!r} ({count})" for name, count in ranked[:5])
    left = len(ranked) - 5
    return (f"{shown} and {left} more" if left > 0 else shown) or "none at all"
