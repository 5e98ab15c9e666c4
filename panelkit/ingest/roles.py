"""Which column of the sample sheet plays which part."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cells import is_missing
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import quoted
from panelkit.records import Design

__all__ = ["Roles", "design_of", "refuse_survival"]


@dataclass(frozen=True, slots=True)
class Roles:
    """Columns by the part they play, as named by the user.

    Attributes
    ----------
    outcome, subject, site, batch, replicate_of : str or None
        One column each.
    positive, negative : object
        Classes of the outcome.
    covariates, nuisance : sequence of str
        Several columns each.
    """

    outcome: str | None = None
    positive: object = None
    negative: object = None
    subject: str | None = None
    site: str | None = None
    batch: str | None = None
    replicate_of: str | None = None
    covariates: Sequence[str] = ()
    nuisance: Sequence[str] = ()

    def columns(self) -> Iterator[tuple[str, str]]:
        """Yield each role with a column that was named for it."""
        for role in ("outcome", "subject", "site", "batch", "replicate_of"):
            name = getattr(self, role)
            if name is not None:
                yield role, name
        for role in ("covariates", "nuisance"):
            for name in getattr(self, role):
                yield role, name

    def check(self, sheet: Sheet | None) -> None:
        """Refuse columns that do not exist and classes without an outcome.

        Parameters
        ----------
        sheet : Sheet or None
            The sample sheet, if there is one.

        Raises
        ------
        UsageError
            When columns are named without a sheet, classes without an outcome, or a
            text stands where several columns are expected.
        InputDataError
            When a column does not exist.
        """
        for role in ("covariates", "nuisance"):
            if isinstance(getattr(self, role), str):
                raise UsageError(
                    code="list-expected",
                    where=role,
                    what=f"this is one text (got {getattr(self, role)!r})",
                    accepted="a list of column names is needed",
                    next_step="Put the name into a list",
                )
        if self.outcome is None and not self.positive is self.negative is None:
            raise UsageError(
                code="outcome-missing",
                where="positive, negative",
                what="classes are named, but no outcome",
                accepted="outcome names the column in which the classes stand",
                next_step="Name the outcome",
            )
        named = list(self.columns())
        if sheet is None and named:
            raise UsageError(
                code="sample-sheet-missing",
                where="samples",
                what="there is no sample sheet, but columns of it are named: "
                f"{quoted(name for _, name in named)}",
                accepted="columns are looked up in the sample sheet",
                next_step="Pass the sample sheet as samples",
            )
        for role, name in named:
            if sheet is not None:
                sheet.column(name, role)


def refuse_survival(time: object, event: object) -> None:
    """Refuse a survival outcome.

    Parameters
    ----------
    time, event : object
        Columns as named by the user.

    Raises
    ------
    UsageError
        When either is named.
    """
    if time is not None or event is not None:
        raise UsageError(
            code="outcome-not-supported",
            where="time, event",
            what=f"survival outcomes are not built yet (got {time!r} and {event!r})",
            accepted="binary outcomes are accepted",
            next_step="Name a binary outcome with outcome and positive instead",
        )


def design_of(
    sheet: Sheet | None, samples: Text, rows: NDArray[np.int64], roles: Roles
) -> Design:
    """Return how the analysed samples belong together.

    Parameters
    ----------
    sheet : Sheet or None
        The sample sheet.
    samples : ndarray of shape (n_samples,), object
        Ids of the analysed samples.
    rows : ndarray of shape (n_samples,), int64
        Their rows of the sheet.
    roles : Roles
        Columns for subject, site and batch.

    Returns
    -------
    Design
        Subjects in order of first row; weights 1 / rows of the subject, summing to 1.

    Raises
    ------
    InputDataError
        When a subject is blank.
    """

    def cells(name: str | None, role: str) -> Text | None:
        if sheet is None or name is None:
            return None
        return sheet.column(name, role)[rows]

    subjects = cells(roles.subject, "subject")
    if subjects is None:
        subjects = samples
    else:
        _refuse_blank_subjects(subjects, samples, f"column {roles.subject!r}")
    places: dict[str, int] = {}
    codes = np.array([places.setdefault(name, len(places)) for name in subjects])
    weights = 1.0 / np.bincount(codes)[codes]
    return Design(
        subject=codes.astype(np.int64),
        subject_ids=np.array(list(places), dtype=object),
        weights=weights / weights.sum(),
        site=cells(roles.site, "site"),
        batch=cells(roles.batch, "batch"),
    )


def _refuse_blank_subjects(subjects: Text, samples: Text, where: str) -> None:
    blank = [s for s, name in zip(samples, subjects, strict=True) if is_missing(name)]
    if blank:
        raise InputDataError(
            code="blank-subject",
            where=f"samples, {where}",
            what=f"{len(blank)} samples have no subject: {quoted(blank)}",
            accepted="every sample belongs to a subject",
            next_step="Fill in the subjects, or leave these samples out with keep",
        )
