"""Numbers of many lines at once, by compiled readers where every cell is plain."""

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import LARGEST, MISSING_SPELLINGS

__all__ = ["GrowingMatrix", "PlainReader", "unquoted"]


class _Spellings:
    """Ways to write a missing value that were met, with the delimiters around."""

    def __init__(self, delimiter: str) -> None:
        self.delimiter = delimiter
        self._all = [f"{delimiter}{each}{delimiter}" for each in MISSING_SPELLINGS]
        self.met: list[str] = []

    def search(self, rests: Sequence[str]) -> bool:
        """Look for further ones; return whether there are any."""
        mark = self.delimiter
        padded = [f"{mark}{rest}{mark}" for rest in rests]
        new = [
            each
            for each in self._all
            if each not in self.met and any(each in text for text in padded)
        ]
        self.met += new
        return bool(new)

    def as_nan(self, rest: str) -> str:
        mark = self.delimiter
        text = f"{mark}{rest}{mark}"
        nan = f"{mark}nan{mark}"
        for each in self.met:
            if each in text:
                # twice, since neighbours share a delimiter
                text = text.replace(each, nan).replace(each, nan)
        return text[1:-1]


class PlainReader:
    """Reads lines whose cells are plain numbers or usual spellings of a missing one.

    Parameters
    ----------
    delimiter : str
        One character.
    n_columns : int
        Cells of each line.
    """

    def __init__(self, delimiter: str, n_columns: int) -> None:
        self._delimiter = delimiter
        self._n_columns = n_columns
        self._missing = _Spellings(delimiter)

    def numbers(self, rests: list[str], comma: bool) -> NDArray[np.float64] | None:
        """Return the numbers of lines, each equal to float() of its cell.

        Parameters
        ----------
        rests : list of str
            Lines without their ids and without quotes.
        comma : bool
            Whether numbers have a decimal comma.

        Returns
        -------
        ndarray of shape (n_lines, n_columns) or None
            None when a cell or line needs a closer look.
        """
        # compiled readers would take blanks of other scripts and nan(1)
        if not all(map(str.isascii, rests)) or any("(" in rest for rest in rests):
            return None
        inner = self._n_columns - 1
        if any(rest.count(self._delimiter) != inner for rest in rests):
            return None
        if comma:
            if any("." in rest for rest in rests):
                return None
            rests = [rest.replace(",", ".") for rest in rests]
        if self._missing.met:
            rests = list(map(self._missing.as_nan, rests))
        values = self._by_arrow(rests)
        if values is None and self._missing.search(rests):
            rests = list(map(self._missing.as_nan, rests))
            values = self._by_arrow(rests)
        if values is None and any(" " in rest for rest in rests):
            values = self._by_numpy(rests)
        if values is None:
            return None
        low, high = np.fmin.reduce(values, axis=None), np.fmax.reduce(values, axis=None)
        return None if high > LARGEST or low < -LARGEST else values

    def _by_arrow(self, rests: list[str]) -> NDArray[np.float64] | None:
        """Read cells without blanks around them: the cast of text rounds correctly."""
        import pyarrow as pa  # slow to import
        import pyarrow.compute as pc

        mark = self._delimiter
        text = (mark.join(rests) + mark).encode("ascii")
        ends = np.flatnonzero(np.frombuffer(text, np.uint8) == ord(mark)) + 1
        starts = np.zeros(len(ends) + 1, dtype=np.int32)
        starts[1:] = ends
        cells = pa.StringArray.from_buffers(
            len(ends), pa.py_buffer(starts), pa.py_buffer(text)
        )
        try:
            numbers = pc.ascii_rtrim(cells, mark).cast(pa.float64())
        except pa.ArrowInvalid:
            return None
        shape = (len(rests), self._n_columns)
        return np.asarray(numbers.to_numpy(), dtype=np.float64).reshape(shape)

    def _by_numpy(self, rests: list[str]) -> NDArray[np.float64] | None:
        """Read cells that may have blanks around them."""
        if not all(rests):
            return None  # numpy's reader passes over empty lines
        try:
            values = np.loadtxt(
                rests,
                delimiter=self._delimiter,
                comments=None,
                ndmin=2,
                max_rows=len(rests),
            )
        except ValueError:
            return None
        fits = values.shape == (len(rests), self._n_columns)
        return values if fits else None


def unquoted(rest: str, delimiter: str, n_columns: int) -> str | None:
    """Return cells without quotes, when all of them or none are in quotes.

    Parameters
    ----------
    rest : str
        A line without its id.
    delimiter : str
        One character.
    n_columns : int
        Cells that it should have.

    Returns
    -------
    str or None
        None when quotes stand elsewhere.
    """
    quotes = rest.count('"')
    if not quotes:
        return rest
    between = f'"{delimiter}"'
    every = (
        quotes == 2 * n_columns
        and rest[0] == rest[-1] == '"'
        and rest.count(between) == n_columns - 1
        and rest.count(delimiter) == n_columns - 1
    )
    return rest[1:-1].replace(between, delimiter) if every else None


class GrowingMatrix:
    """Rows gathered in one piece of memory, never held twice.

    Parameters
    ----------
    n_columns : int
        Numbers of each row.
    expected : int
        Rows that there may be; memory that is not written to costs nothing.
    """

    def __init__(self, n_columns: int, expected: int = 0) -> None:
        self._values = np.empty((expected, n_columns))
        self._n_rows = 0

    def add(self, rows: NDArray[np.float64]) -> None:
        """Append rows.

        Parameters
        ----------
        rows : ndarray of shape (n_new, n_columns)
            Copied.
        """
        needed = self._n_rows + len(rows)
        if needed > len(self._values):
            # a large piece is moved by the page table, not copied
            size = max(needed, math.ceil(len(self._values) * 1.2))
            self._values.resize((size, self._values.shape[1]), refcheck=False)
        self._values[self._n_rows : needed] = rows
        self._n_rows = needed

    def whole(self) -> NDArray[np.float64]:
        """Return what was gathered.

        Returns
        -------
        ndarray of shape (n_rows, n_columns)
            C-contiguous; nothing may be added afterwards.
        """
        self._values.resize((self._n_rows, self._values.shape[1]), refcheck=False)
        return self._values
