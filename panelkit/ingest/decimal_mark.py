"""Decimal commas: recognised by what can be nothing else, never guessed."""

import re
from collections.abc import Iterable

from panelkit.errors import InputDataError
from panelkit.records import Finding

__all__ = ["DecimalMark", "with_point"]

_COMMA = re.compile(r"[+-]?(?:\d+,\d*|,\d+)(?:[eE][+-]?\d+)?")
_POINT = re.compile(r"[+-]?(?:\d+\.\d*|\.\d+)(?:[eE][+-]?\d+)?")
_THOUSANDS = re.compile(r"[+-]?[1-9]\d{0,2},\d{3}")
_MOST_CELLS = 20_000
"""Looked at in one batch to choose between point and comma."""


def with_point(text: str) -> str | None:
    """Return a number with a decimal comma as one with a point.

    Parameters
    ----------
    text : str
        One cell.

    Returns
    -------
    str or None
        The cell itself when it is a whole number or no number, None when it holds a
        point or several commas: which one is the decimal mark is not guessed.
    """
    if "," not in text:
        return None if _POINT.fullmatch(text.strip()) else text
    return text.replace(",", ".") if _COMMA.fullmatch(text.strip()) else None


class DecimalMark:
    """Which decimal mark a file uses; learnt from its first numbers that have one.

    Parameters
    ----------
    where : str
        The file, for messages.
    possible : bool
        False where the comma is the delimiter.

    Attributes
    ----------
    comma : bool
        Whether numbers are read with a decimal comma.
    """

    def __init__(self, where: str, possible: bool) -> None:
        self.where = where
        self.comma = False
        self.settled = not possible
        self._proof = ""
        self._example = ""

    @property
    def watching(self) -> bool:
        """Whether cells still have to be shown to `look`."""
        return not self.settled or (self.comma and not self._proof)

    @property
    def proved(self) -> str:
        """A number whose comma can be nothing but a decimal mark, or ``""``."""
        return self._proof if self.comma else ""

    def look(self, cells: Iterable[str]) -> None:
        """Learn from cells, in file order.

        Parameters
        ----------
        cells : iterable of str
            Cells of a batch of lines.
        """
        commas = points = 0
        for place, cell in enumerate(cells):
            text = cell.strip()
            if _COMMA.fullmatch(text):
                commas += 1
                self._example = self._example or text
                if not self._proof and not _THOUSANDS.fullmatch(text):
                    self._proof = text
            elif _POINT.fullmatch(text):
                points += 1
            if self.settled and self._proof:
                return
            if place >= _MOST_CELLS and not self.settled and commas + points:
                break
        if not self.settled and commas + points:
            self.settled = True
            self.comma = commas > points

    def findings(self) -> list[Finding]:
        """Return the finding that says a decimal comma was read, if so.

        Returns
        -------
        list of Finding
            One or none.

        Raises
        ------
        InputDataError
            When every comma could as well set off thousands.
        """
        if not self.comma:
            return []
        if not self._proof:
            raise InputDataError(
                code="decimal-mark-ambiguous",
                where=self.where,
                what=f"every comma in a number is followed by three digits (first "
                f"{self._example!r}): it may be a decimal comma or set off thousands",
                accepted="numbers with a decimal point are needed, or a decimal comma "
                "that cannot be taken for anything else",
                next_step="Export the numbers with a decimal point and without "
                "separators of thousands",
            )
        shown = self._proof
        return [
            Finding(
                code="decimal-comma-read",
                severity="info",
                where=self.where,
                message="numbers are written with a decimal comma and were read so: "
                f"{shown!r} as {shown.replace(',', '.')}",
                next_step="Check that commas are decimal marks throughout.",
            )
        ]
