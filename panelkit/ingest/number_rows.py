"""Rows of a matrix in text: at once where all cells are plain, else cell by cell."""

import math
from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import BadCells, cell_number
from panelkit.ingest.decimal_mark import DecimalMark, with_point
from panelkit.ingest.number_lines import PlainReader
from panelkit.records import Finding

__all__ = ["NumberRows"]


class NumberRows:
    """What the cells of a text say, for every format that holds numbers as text.

    Parameters
    ----------
    delimiter : str
        One character.
    columns : sequence of str
        Ids of the columns.
    bad_cells : BadCells
        Where cells that are no numbers are noted.
    """

    def __init__(
        self, delimiter: str, columns: Sequence[str], bad_cells: BadCells
    ) -> None:
        self._delimiter = delimiter
        self._columns = columns
        self._bad_cells = bad_cells
        self._plain = PlainReader(delimiter, len(columns))
        self._mark = DecimalMark(bad_cells.where, delimiter != ",")

    def wants(self, lines: Iterable[str]) -> bool:
        """Return whether lines may tell if numbers are written with a comma.

        Parameters
        ----------
        lines : iterable of str
            With or without their ids.

        Returns
        -------
        bool
            True until the decimal mark is known.
        """
        return self._mark.watching and any("," in line or "." in line for line in lines)

    def look(self, cells: Iterable[str]) -> None:
        """Learn the decimal mark from cells.

        Parameters
        ----------
        cells : iterable of str
            Of the next lines.

        Raises
        ------
        InputDataError
            When commas may mean two things.
        """
        self._mark.look(cells)

    def at_once(self, rests: list[str]) -> NDArray[np.float64] | None:
        """Return the numbers of lines whose cells are all plain.

        Parameters
        ----------
        rests : list of str
            Lines without their ids and without quotes.

        Returns
        -------
        ndarray of shape (n_lines, n_columns) or None
            None when a line needs a closer look.
        """
        return self._plain.numbers(rests, self._mark.comma)

    def one(self, name: str, cells: list[str]) -> NDArray[np.float64]:
        """Return the numbers of one line, cell by cell where that is needed.

        Parameters
        ----------
        name : str
            Id of the row.
        cells : list of str
            One for each column.

        Returns
        -------
        ndarray of shape (n_columns,)
            NaN where missing or noted as bad.

        Raises
        ------
        InputDataError
            When there are now too many bad cells.
        """
        values = self.at_once([self._delimiter.join(cells)])
        if values is not None:
            return values.reshape(-1)
        result = np.empty(len(cells))
        comma = self._mark.comma
        for position, cell in enumerate(cells):
            text = with_point(cell) if comma else cell
            value = None if text is None else cell_number(text)
            if value is None:
                self._bad_cells.add(name, self._columns[position], cell)
                value = math.nan
            result[position] = value
        return result

    def findings(self) -> list[Finding]:
        """Return what is said of the decimal mark.

        Returns
        -------
        list of Finding
            One or none.
        """
        return self._mark.findings()
