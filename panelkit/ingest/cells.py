"""Single cells of a matrix: numbers, missing ones, and cells that are neither."""

import math
import re
from collections import Counter
from dataclasses import dataclass

from panelkit.errors import InputDataError
from panelkit.ingest.wording import counted
from panelkit.records import Finding

__all__ = [
    "LARGEST",
    "MISSING_SPELLINGS",
    "BadCell",
    "BadCells",
    "cell_number",
    "is_missing",
]

_MISSING = frozenset({"", "na", "nan", "-nan", "+nan", "n/a", "null", "none"})

MISSING_SPELLINGS = (
    "", "NA", "na", "N/A", "n/a", "NULL", "null", "None", "none", "Null", "NONE",
)  # fmt: skip
"""The usual ones beside nan; rarer ones take the way of the single cell."""

LARGEST = 3.4028234663852886e38
"""Of single precision: beyond it, a matrix in float32 would hold infinity."""
N_EXAMPLES = 5
_DECIMAL_COMMA = re.compile(r"[+-]?\d+,\d+")


def is_missing(text: str) -> bool:
    """Return whether a cell says that nothing is there.

    Parameters
    ----------
    text : str
        The cell as written.

    Returns
    -------
    bool
        True for blank, NA, NaN, n/a, null and None in any case.
    """
    return text.strip().lower() in _MISSING


def cell_number(text: str) -> float | None:
    """Return the number in a cell, NaN for a missing one, None for anything else.

    Parameters
    ----------
    text : str
        The cell as written.

    Returns
    -------
    float or None
        None for text, for infinity and beyond the range of single precision.
    """
    if is_missing(text):
        return math.nan
    # float() would also take 1_000 and digits of other scripts
    if "_" in text or not text.isascii():
        return None
    try:
        value = float(text)
    except ValueError:
        return None
    return value if abs(value) <= LARGEST else None


@dataclass(frozen=True, slots=True)
class BadCell:
    """A cell that is neither a number nor a missing value.

    Attributes
    ----------
    row, column : str
        Ids of its row and column in the file.
    text : str
        What is written there.
    """

    row: str
    column: str
    text: str

    def __str__(self) -> str:
        return f"row {self.row!r}, column {self.column!r}: {self.text[:40]!r}"


class BadCells:
    """Collects bad cells while a matrix is read, and refuses too many of them.

    Parameters
    ----------
    where : str
        The matrix, for messages.
    limit : int
        Largest number of bad cells that are read as missing.
    """

    def __init__(self, where: str, limit: int) -> None:
        self.where = where
        self.limit = limit
        self.cells: list[BadCell] = []

    def add(self, row: str, column: str, text: str) -> None:
        """Note one bad cell.

        Parameters
        ----------
        row, column : str
            Ids of its row and column.
        text : str
            What is written there.

        Raises
        ------
        InputDataError
            When there are now more than the limit.
        """
        self.cells.append(BadCell(row, column, text))
        if len(self.cells) > self.limit:
            raise InputDataError(
                code="text-everywhere",
                where=self.where,
                what=f"more than {self.limit} cells are text instead of numbers "
                f"({_examples(self.cells)})",
                accepted="cells hold numbers with a decimal point, or are blank, NA, "
                "NaN, n/a, null or None",
                next_step=self._advice(),
            )

    def _advice(self) -> str:
        columns = Counter(cell.column for cell in self.cells)
        column, hits = columns.most_common(1)[0]
        if all(_DECIMAL_COMMA.fullmatch(cell.text.strip()) for cell in self.cells):
            return "Write the numbers with a decimal point"
        if hits > len(self.cells) // 2:
            return (
                f"Take column {column!r} out of the matrix (annotation belongs in the "
                "sample sheet or the feature sheet)"
            )
        return "Correct these cells, or raise max_bad_cells if they may be missing"

    def findings(self) -> list[Finding]:
        """Return the findings that name the bad cells, if there are any."""
        absurd = [cell for cell in self.cells if _is_number(cell.text)]
        text = [cell for cell in self.cells if not _is_number(cell.text)]
        found = []
        if text:
            count = counted(len(text), "cell is", "cells are")
            found.append(
                Finding(
                    code="cells-not-numeric",
                    severity="warning",
                    where=self.where,
                    message=f"{count} neither a number nor blank and read as missing: "
                    f"{_examples(text)}",
                    next_step="Correct them in the file, or leave them to be imputed.",
                )
            )
        if absurd:
            count = counted(len(absurd), "cell holds", "cells hold")
            found.append(
                Finding(
                    code="value-beyond-range",
                    severity="warning",
                    where=self.where,
                    message=f"{count} a number beyond 3.4e38, the range of single "
                    f"precision, and read as missing: {_examples(absurd)}",
                    next_step="Correct them in the file: no assay reports such values.",
                )
            )
        return found


def _examples(cells: list[BadCell]) -> str:
    # a semicolon, since each example holds a comma
    left = len(cells) - N_EXAMPLES
    shown = "; ".join(map(str, cells[:N_EXAMPLES]))
    return f"{shown} and {left} more" if left > 0 else shown


def _is_number(text: str) -> bool:
    """Return whether a bad cell is a finite number, too large for single precision."""
    if "_" in text or not text.isascii():
        return False
    try:
        return LARGEST < abs(float(text.replace(",", "."))) < math.inf
    except ValueError:
        return False
