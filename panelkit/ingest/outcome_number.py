"""An outcome that is a number."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import cell_number, is_missing
from panelkit.ingest.outcome_column import CELL_ADVICE, MIN_SUBJECTS, named_cells
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import figure
from panelkit.records import Outcome

__all__ = ["OutcomeNumber", "numbers_of", "outcome_number"]

GROUP = "number"
FEWEST = 2 * MIN_SUBJECTS
"""As many subjects as two classes need together."""


@dataclass(frozen=True, slots=True, eq=False)
class OutcomeNumber:
    """A column of numbers, its missing entries told apart.

    Attributes
    ----------
    where, column : str
        For messages; name of the column.
    ids, cells : ndarray of shape (n_rows,), object
        Samples, and the cells as written.
    labels : ndarray of shape (n_rows,), object
        ``"number"``, or ``""`` where missing.
    values : ndarray of shape (n_rows,), float64
        NaN where there is no number.
    unit : str
        In the user's words.
    """

    where: str
    column: str
    ids: Text
    cells: Text
    labels: Text
    values: NDArray[np.float64]
    unit: str

    def usable(self) -> NDArray[np.bool_]:
        """Return which rows have an outcome, a number or not."""
        return np.asarray(self.labels != "", dtype=bool)

    def settle(self, rows: NDArray[np.bool_]) -> tuple[str, ...]:
        """Return the one group of this kind.

        Parameters
        ----------
        rows : ndarray of shape (n_rows,), bool
            Rows that were matched, have an outcome and were kept.

        Returns
        -------
        tuple of str
            One.

        Raises
        ------
        InputDataError
            When a cell is no number, or all are equal.
        """
        wrong = rows & np.isnan(self.values)
        if wrong.any():
            raise InputDataError(
                code="outcome-not-numeric",
                where=self.where,
                what="the outcome is not a number everywhere "
                + named_cells(wrong, self.ids, self.cells),
                accepted="finite numbers with a decimal point, or blank",
                next_step=CELL_ADVICE,
            )
        kept = self.values[rows]
        if np.ptp(kept) == 0.0:
            raise InputDataError(
                code="outcome-constant",
                where=self.where,
                what=f"all {len(kept)} samples have the same outcome "
                f"({figure(float(kept[0]))})",
                accepted="a number that differs between samples",
                next_step="Look at the row filters, or name another column",
            )
        return (GROUP,)

    def record(
        self, rows: NDArray[np.int64], groups: tuple[str, ...], subjects: Text
    ) -> Outcome:
        """Return the outcome of the analysed rows.

        Raises
        ------
        InputDataError
            When there are too few subjects.
        """
        n_subjects = len(set(subjects))
        if n_subjects < FEWEST:
            raise InputDataError(
                code="too-few-subjects",
                where=self.where,
                what=f"there are {n_subjects} subjects with a number",
                accepted=f"at least {FEWEST} are needed",
                next_step="Add subjects, or choose other row filters",
            )
        return Outcome(
            kind="number",
            column=self.column,
            negative="",
            positive="",
            values=self.values[rows],
            unit=self.unit,
        )


def numbers_of(cells: Text) -> NDArray[np.float64]:
    """Return the numbers in cells, NaN where a cell is missing or no number."""
    read = [cell_number(cell) for cell in cells]
    return np.array([np.nan if value is None else value for value in read], np.float64)


def outcome_number(sheet: Sheet, column: str, unit: str) -> OutcomeNumber:
    """Return an outcome column of numbers.

    Parameters
    ----------
    sheet : Sheet
        The sample sheet.
    column, unit : str
        The outcome's column and unit.

    Returns
    -------
    OutcomeNumber
        Cells that are no numbers are refused when the rows are settled.

    Raises
    ------
    InputDataError
        When there is no such column.
    """
    cells = sheet.column(column, "outcome")
    labels = np.array(["" if is_missing(cell) else GROUP for cell in cells], object)
    where = f"{sheet.where}, column {column!r}"
    return OutcomeNumber(
        where, column, sheet.ids, cells, labels, numbers_of(cells), unit
    )
