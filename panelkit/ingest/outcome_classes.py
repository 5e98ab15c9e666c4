"""Outcomes that are classes, two or more: named by the user, never guessed."""

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cells import is_missing
from panelkit.ingest.outcome_column import check_class_sizes, with_counts
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import as_text, nearest_hint
from panelkit.records import Outcome

__all__ = ["ManyClasses", "OutcomeClasses", "many_classes", "outcome_classes"]

FEWEST_CLASSES = 3


@dataclass(frozen=True, slots=True, eq=False)
class OutcomeClasses:
    """A binary outcome column with its missing entries told apart.

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

    def settle(self, rows: NDArray[np.bool_]) -> tuple[str, ...]:
        """Return the positive and the negative class, given the rows that are left.

        Parameters
        ----------
        rows : ndarray of shape (n_rows,), bool
            Rows that were matched, have an outcome and were kept.

        Returns
        -------
        tuple of str
            The negative one as named, or the only other class among the rows.

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
                what=f"{len(counts)} classes are left: {with_counts(counts)}",
                accepted=f"a binary outcome has {self.positive!r} and one other class",
                next_step="Name the other class as negative; the rest is then left "
                "out and counted",
            )
        if len(counts) < 2:
            raise InputDataError(
                code="one-class-only",
                where=self.where,
                what=f"only one class is left: {with_counts(counts)}",
                accepted="both classes are needed",
                next_step="Look at the row filters, at the matching of ids, and at "
                "the spelling of positive and negative",
            )
        return self.positive, str(others[0])

    def record(
        self,
        rows: NDArray[np.int64],
        groups: tuple[str, ...],
        subjects: NDArray[np.object_],
    ) -> Outcome:
        """Return the outcome of the analysed rows.

        Raises
        ------
        InputDataError
            When a class has too few subjects.
        """
        labels = self.labels[rows]
        check_class_sizes(self.where, labels, subjects)
        return Outcome(
            kind="binary",
            column=self.column,
            negative=groups[1],
            positive=groups[0],
            values=np.asarray(labels == groups[0], dtype=np.float64),
        )


@dataclass(frozen=True, slots=True, eq=False)
class ManyClasses:
    """An outcome column with three classes or more.

    Attributes
    ----------
    where : str
        Sheet and column, for messages.
    column : str
        Name of the column.
    labels : ndarray of shape (n_rows,), object
        The class of each row, ``""`` where missing.
    classes : tuple of str
        Those asked for, in order; empty for all that are left.
    """

    where: str
    column: str
    labels: NDArray[np.object_]
    classes: tuple[str, ...]

    def usable(self) -> NDArray[np.bool_]:
        """Return which rows have an outcome that may be analysed."""
        if not self.classes:
            return np.asarray(self.labels != "", dtype=bool)
        return np.isin(self.labels.astype(str), self.classes)

    def settle(self, rows: NDArray[np.bool_]) -> tuple[str, ...]:
        """Return the classes in the order asked for, or in that of their names.

        Parameters
        ----------
        rows : ndarray of shape (n_rows,), bool
            Rows that were matched, have an outcome and were kept.

        Returns
        -------
        tuple of str
            At least three.

        Raises
        ------
        InputDataError
            When a class asked for has no row left, or fewer than three are left.
        """
        counts = Counter(str(label) for label in self.labels[rows])
        names = self.classes or tuple(sorted(counts))
        gone = [name for name in names if not counts[name]]
        if gone:
            raise InputDataError(
                code="class-without-samples",
                where=self.where,
                what=f"no sample is left of {', '.join(map(repr, gone[:5]))}",
                accepted=f"samples of every class named (left are "
                f"{with_counts(counts)})",
                next_step="Look at the row filters and at the matching of ids, or take "
                "the class out of classes",
            )
        if len(names) < FEWEST_CLASSES:
            raise InputDataError(
                code="fewer-than-three-classes",
                where=self.where,
                what=f"{len(names)} classes are left: {with_counts(counts)}",
                accepted=f"an outcome of this kind has {FEWEST_CLASSES} or more",
                next_step="Name positive and negative in place of classes",
            )
        return names

    def record(
        self,
        rows: NDArray[np.int64],
        groups: tuple[str, ...],
        subjects: NDArray[np.object_],
    ) -> Outcome:
        """Return the outcome of the analysed rows.

        Raises
        ------
        InputDataError
            When a class has too few subjects.
        """
        labels = self.labels[rows]
        check_class_sizes(self.where, labels, subjects)
        place = {name: float(number) for number, name in enumerate(groups)}
        return Outcome(
            kind="classes",
            column=self.column,
            negative="",
            positive="",
            values=np.array([place[label] for label in labels]),
            classes=groups,
        )


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
    where = f"{sheet.where}, column {column!r}"
    named = [as_text(name) for name in (positive, negative) if name is not None]
    labels = _labels(sheet, column, named)
    counts = Counter(label for label in labels if label)
    if positive is None:
        raise UsageError(
            code="positive-class-missing",
            where=where,
            what="the class that scores point to is not named",
            accepted=f"positive is one of the classes {with_counts(counts)}",
            next_step="Name it as positive",
        )
    if len(set(named)) < len(named):
        raise UsageError(
            code="classes-equal",
            where=where,
            what=f"positive and negative are the same class {named[0]!r}",
            accepted=f"they are two of the classes {with_counts(counts)}",
            next_step="Name two different classes",
        )
    for name, role in zip(named, ("positive", "negative"), strict=False):
        _refuse_absent(name, f"the {role} class", counts, where)
    return OutcomeClasses(
        where, column, labels, named[0], named[1] if len(named) > 1 else None
    )


def many_classes(sheet: Sheet, column: str, classes: Sequence[object]) -> ManyClasses:
    """Return an outcome column with three classes or more.

    Parameters
    ----------
    sheet : Sheet
        The sample sheet.
    column : str
        The outcome's column.
    classes : sequence of object
        The classes in order; empty for all of the column.

    Returns
    -------
    ManyClasses
        Missing entries told apart.

    Raises
    ------
    UsageError
        When a class is named twice, or fewer than three are named.
    InputDataError
        When the column or a named class does not exist.
    """
    where = f"{sheet.where}, column {column!r}"
    named = tuple(as_text(name) for name in classes)
    labels = _labels(sheet, column, named)
    counts = Counter(label for label in labels if label)
    if named and (len(set(named)) < len(named) or len(named) < FEWEST_CLASSES):
        raise UsageError(
            code="classes-too-few",
            where=where,
            what=f"these are not {FEWEST_CLASSES} different classes or more (got "
            f"{list(named)})",
            accepted=f"classes of the column: {with_counts(counts)}",
            next_step="Name three or more, each once, or name positive and negative "
            "for two",
        )
    for name in named:
        _refuse_absent(name, "the class", counts, where)
    return ManyClasses(where, column, labels, named)


def _labels(sheet: Sheet, column: str, named: Sequence[str]) -> NDArray[np.object_]:
    """Return the class of each row; a class that is named is never a missing one."""
    cells = sheet.column(column, "outcome")
    labels = cells.copy()
    labels[[is_missing(cell) and cell not in named for cell in cells]] = ""
    return labels


def _refuse_absent(name: str, what: str, counts: Counter[str], where: str) -> None:
    if name not in counts:
        raise InputDataError(
            code="class-missing",
            where=where,
            what=f"{what} {name!r} does not occur",
            accepted=f"{nearest_hint(name, list(counts))}the classes are "
            f"{with_counts(counts)}",
            next_step="Name one of these classes as written",
        )
