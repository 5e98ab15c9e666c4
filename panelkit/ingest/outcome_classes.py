"""The classes of a binary outcome: named by the user, never guessed."""

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cells import is_missing
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import as_text, nearest_hint

__all__ = ["OutcomeClasses", "check_class_sizes", "outcome_classes"]

MIN_SUBJECTS = 4
"""Fewer subjects in a class cannot be split into folds that mean anything."""


@dataclass(frozen=True, slots=True, eq=False)
class OutcomeClasses:
    """An outcome column with its missing entries told apart.

    Attributes
    ----------
    where : str
        Sheet and column, for messages.
    column : str
        Name of the column.
    labels : ndarray of shape (n_rows,), object
        The class of each row, ``""`` where missing.
    positive : str
        The class that scores point to.
    negative : str or None
        The other one; None until the row filters have left two.
    """

    where: str
    column: str
    labels: NDArray[np.object_]
    positive: str
    negative: str | None

    def usable(self) -> NDArray[np.bool_]:
        """Return which rows have an outcome that may be analysed."""
        if self.negative is None:
            return np.asarray(self.labels != "", dtype=bool)
        return np.isin(self.labels.astype(str), [self.positive, self.negative])

    def settle_negative(self, rows: NDArray[np.bool_]) -> str:
        """Return the negative class, given the rows that are left.

        Parameters
        ----------
        rows : ndarray of shape (n_rows,), bool
            Rows that were matched, have an outcome and were kept.

        Returns
        -------
        str
            As named, or the only other class among the rows.

        Raises
        ------
        InputDataError
            When one class only is left, or more than two are and none was named.
        """
        counts = Counter(self.labels[rows])
        others = [name for name in counts if name != self.positive]
        if self.negative is None and len(others) > 1:
            raise InputDataError(
                code="more-than-two-classes",
                where=self.where,
                what=f"{len(counts)} classes are left: {_with_counts(counts)}",
                accepted=f"a binary outcome has {self.positive!r} and one other class",
                next_step="Name the other class as negative; the rest is then left "
                "out and counted",
            )
        if len(counts) < 2:
            raise InputDataError(
                code="one-class-only",
                where=self.where,
                what=f"only one class is left: {_with_counts(counts)}",
                accepted="both classes are needed",
                next_step="Look at the row filters, at the matching of ids, and at "
                "the spelling of positive and negative",
            )
        return str(others[0])


def outcome_classes(
    sheet: Sheet, column: str, positive: object, negative: object
) -> OutcomeClasses:
    """Return an outcome column with the classes that were named.

    Parameters
    ----------
    sheet : Sheet
        The sample sheet.
    column : str
        The outcome's column.
    positive, negative : object
        Classes as named by the user; `negative` may be None. A class named here is
        never taken as missing, even if it is called "none".

    Returns
    -------
    OutcomeClasses
        Missing entries told apart.

    Raises
    ------
    UsageError
        When `positive` is not named, or equals `negative`.
    InputDataError
        When the column or a named class does not exist.
    """
    cells = sheet.column(column, "outcome")
    where = f"{sheet.where}, column {column!r}"
    named = [as_text(name) for name in (positive, negative) if name is not None]
    labels = cells.copy()
    labels[[is_missing(cell) and cell not in named for cell in cells]] = ""
    counts = Counter(label for label in labels if label)
    if positive is None:
        raise UsageError(
            code="positive-class-missing",
            where=where,
            what="the class that scores point to is not named",
            accepted=f"positive is one of the classes {_with_counts(counts)}",
            next_step="Name it as positive",
        )
    if len(set(named)) < len(named):
        raise UsageError(
            code="classes-equal",
            where=where,
            what=f"positive and negative are the same class {named[0]!r}",
            accepted=f"they are two of the classes {_with_counts(counts)}",
            next_step="Name two different classes",
        )
    for name, role in zip(named, ("positive", "negative"), strict=False):
        if name not in counts:
            raise InputDataError(
                code="class-missing",
                where=where,
                what=f"the {role} class {name!r} does not occur",
                accepted=f"{nearest_hint(name, list(counts))}the classes are "
                f"{_with_counts(counts)}",
                next_step="Name one of these classes as written",
            )
    return OutcomeClasses(
        where, column, labels, named[0], named[1] if len(named) > 1 else None
    )


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
            what=f"too few subjects in a class: {_with_counts(small)}",
            accepted=f"each class needs at least {MIN_SUBJECTS} subjects",
            next_step="Add subjects, or choose other classes or row filters",
        )


def _with_counts(counts: Counter[str]) -> str:
    ranked = counts.most_common()
    shown = ", ".join(f"{name!r} ({count})" for name, count in ranked[:5])
    left = len(ranked) - 5
    return (f"{shown} and {left} more" if left > 0 else shown) or "none at all"
