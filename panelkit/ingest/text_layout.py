"""Where a table begins in a text, and how its lines are divided."""

import csv
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from panelkit.errors import InputDataError
from panelkit.ingest.cells import cell_number
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Finding

__all__ = [
    "DELIMITERS",
    "MOST_FIELDS",
    "Layout",
    "SkippedLines",
    "find_layout",
    "is_blank",
    "is_comment",
    "sample_of",
    "split_quoted",
]

DELIMITERS = ("\t", ",", ";")

MOST_FIELDS = 5_000_000
"""Of a line: five times the widest matrix that panelkit is made for."""

_SAMPLE_LINES = 50
_SAMPLE_CHARACTERS = 2**20
_LOOKED_AT = 200
"""Cells of a line that tell numbers from names."""

Batch = tuple[int, list[str]]


@dataclass(frozen=True, slots=True)
class Layout:
    """How the lines of a table are divided.

    Attributes
    ----------
    delimiter : str
        Tab, comma or semicolon.
    header : int
        Position of the header among the lines of the sample, -1 when there is none.
    names : list of str
        The header's fields, one for each field of a data line but for a missing corner.
    n_fields : int
        Fields of a data line, delimiters without anything after them left out.
    trailing : int
        Fields without name and content at the end of the first data lines.
    """

    delimiter: str
    header: int
    names: list[str]
    n_fields: int
    trailing: int

    @property
    def lacks_corner(self) -> bool:
        """Whether the field above the row ids is missing, as R leaves it out."""
        return len(self.names) == self.n_fields - 1


class SkippedLines:
    """Lines and fields that are no part of the table, for the findings.

    Parameters
    ----------
    where : str
        The file, for messages.
    """

    def __init__(self, where: str) -> None:
        self.where = where
        self._first: list[str] = []
        self._count = 0
        self._padded = 0

    def line(self, text: str) -> None:
        """Note one skipped line.

        Parameters
        ----------
        text : str
            The line.
        """
        self._count += 1
        if len(self._first) < 3:
            self._first.append(text[:60])

    def padded(self, lines: int) -> None:
        """Note lines that end with delimiters after their last field.

        Parameters
        ----------
        lines : int
            How many.
        """
        self._padded += lines

    def findings(self) -> list[Finding]:
        """Return what was skipped.

        Returns
        -------
        list of Finding
            One for lines, one for delimiters at the end of lines.
        """
        found = []
        if self._count:
            shown = quoted(self._first, 3)
            more = self._count - len(self._first)
            found.append(
                Finding(
                    code="lines-skipped",
                    severity="info",
                    where=self.where,
                    message=f"{counted(self._count, 'line is', 'lines are')} no part "
                    f"of the table (comments, or shorter and before the header): "
                    f"{shown}" + (f" and {more} more" if more > 0 else ""),
                    next_step="Check that none of them holds data.",
                )
            )
        if self._padded:
            found.append(
                Finding(
                    code="delimiters-at-line-end",
                    severity="info",
                    where=self.where,
                    message=f"{counted(self._padded, 'line ends', 'lines end')} with "
                    "delimiters after the last column; these columns have neither "
                    "name nor content and were left out",
                    next_step="Nothing; spreadsheets leave them behind.",
                )
            )
        return found


def is_comment(line: str) -> bool:
    """Return whether a line begins like a comment (``#`` or ``!``).

    Parameters
    ----------
    line : str
        The line.

    Returns
    -------
    bool
        A table's own lines may begin so too; whoever asks looks at their length.
    """
    return line.startswith(("#", "!", '"#', '"!'))


def is_blank(line: str, delimiter: str) -> bool:
    """Return whether a line holds nothing but blanks and delimiters.

    Parameters
    ----------
    line : str
        The line.
    delimiter : str
        One character.

    Returns
    -------
    bool
        Spreadsheets leave such lines behind.
    """
    return not line or (
        line[0] in (delimiter, " ", "\t", '"')
        and not line.strip(delimiter + " \t").replace('"', "").strip(delimiter + " \t")
    )


def sample_of(batches: Iterator[Batch]) -> list[str]:
    """Return the first lines of a text, enough of them to see how it is divided.

    Parameters
    ----------
    batches : iterator of (int, list of str)
        Consumed as far as needed, whole batches.

    Returns
    -------
    list of str
        From the first line on.
    """
    lines: list[str] = []
    telling = size = 0
    for _, batch in batches:
        lines += batch
        telling += sum(bool(line.strip()) and not is_comment(line) for line in batch)
        size += sum(map(len, batch))
        if telling >= _SAMPLE_LINES or (telling > 2 and size > _SAMPLE_CHARACTERS):
            break
    return lines


def split_quoted(line: str, delimiter: str, where: str) -> list[str]:
    """Return the fields of one line that holds quotes.

    Parameters
    ----------
    line : str
        Without its line end.
    delimiter : str
        One character.
    where : str
        File and line, for messages.

    Returns
    -------
    list of str
        The fields, without their quotes.

    Raises
    ------
    InputDataError
        When a quoted field is not closed on the line, or text follows its end.
    """
    try:
        return next(csv.reader([line], delimiter=delimiter, strict=True))
    except csv.Error as error:
        raise InputDataError(
            code="quotes-unbalanced",
            where=where,
            what=f"a quoted field does not end where it should ({error})",
            accepted="quotes are closed on the same line and doubled inside a field",
            next_step="Correct the quotes of this line",
        ) from error


def _fields(line: str, delimiter: str) -> list[str]:
    """Return the fields as far as quotes allow; errors are for whoever reads them."""
    if '"' not in line:
        return line.split(delimiter)
    try:
        return next(csv.reader([line], delimiter=delimiter), [""])
    except csv.Error:
        return line.split(delimiter)


def find_layout(
    lines: Sequence[str], where: str, id_column: str | None = None
) -> Layout:
    """Return where the table begins and how its lines are divided.

    Parameters
    ----------
    lines : sequence of str
        The first lines of the text.
    where : str
        The file, for messages.
    id_column : str or None
        Of a sheet, the name that its column of ids usually has; None for a matrix.

    Returns
    -------
    Layout
        With the delimiter that explains most lines.

    Raises
    ------
    InputDataError
        When the header has more fields than any matrix.
    """
    telling = [
        place
        for place, line in enumerate(lines)
        if line.strip(" \t,;") and not is_comment(line)
    ][: 4 * _SAMPLE_LINES]
    _check_width(lines, telling, where)
    tried = [
        _Division.of(
            mark, [_fields(lines[place], mark) for place in telling], id_column
        )
        for mark in DELIMITERS
    ]
    best = max(tried, key=lambda each: (each.splits_header(tried), *each.merit))
    delimiter, rows, begin = best.delimiter, best.rows, best.begin
    if not rows:
        return Layout(delimiter, -1, [], 0, 0)
    header = telling[begin]
    names, data = rows[begin], rows[begin + 1 :]
    above = _header_behind_a_mark(lines[:header], delimiter, rows[begin:], id_column)
    if above is not None:
        header, names, data = above[0], above[1], rows[begin:]
    return _measured(delimiter, header, names, data, best.width)


@dataclass(frozen=True, slots=True)
class _Division:
    """The lines that tell something, divided by one delimiter."""

    delimiter: str
    rows: list[list[str]]
    width: int
    begin: int
    full: int

    @classmethod
    def of(
        cls, delimiter: str, rows: list[list[str]], id_column: str | None
    ) -> "_Division":
        width = _usual_width(rows)
        begin = _header(rows, width, id_column)
        full = sum(len(row) == width for row in rows[begin:])
        return cls(delimiter, rows, width, begin, full)

    @property
    def merit(self) -> tuple[int, int, int]:
        """Lines explained less lines passed over, then ways to settle a tie."""
        if self.width == 1:
            return -len(self.rows) - 1, 0, 0
        lacks_corner = len(self.rows[self.begin]) == self.width - 1
        return self.full + lacks_corner - self.begin, self.full, self.width

    def splits_header(self, others: Sequence["_Division"]) -> bool:
        """Return False if the delimiter is not in its header but another one is."""
        if not self.rows or len(self.rows[self.begin]) > 1:
            return True
        return not any(
            each.full > 1 and len(each.rows[self.begin]) > 1 for each in others
        )


def _check_width(lines: Sequence[str], telling: list[int], where: str) -> None:
    for place in telling:
        width = 1 + max(map(lines[place].count, DELIMITERS))
        if width > MOST_FIELDS:
            raise InputDataError(
                code="too-many-columns",
                where=f"{where}, line {place + 1}",
                what=f"the line has {width:,} fields",
                accepted=f"at most {MOST_FIELDS:,} are accepted",
                next_step="Check that the file is the matrix, or split it",
            )


def _usual_width(rows: list[list[str]]) -> int:
    """Return the most common number of fields above one; the larger one of a tie."""
    counts = Counter(len(row) for row in rows if len(row) > 1)
    return max(counts, key=lambda width: (counts[width], width), default=1)


def _header(rows: list[list[str]], width: int, id_column: str | None) -> int:
    """Return the first row that is no shorter line before the header."""
    for place, row in enumerate(rows):
        after = rows[place + 1] if place + 1 < len(rows) else []
        before = rows[place - 1] if place else []
        if len(row) >= width:
            if width > 2 and len(_strip_blank_end(row)) == 1 and len(after) >= width:
                continue  # a title, filled up with delimiters by a spreadsheet
        elif id_column is not None and id_column in row:
            return place
        elif not len(row) == width - 1 == len(after) - 1 or not _lacks_corner(
            row, after, id_column
        ):
            continue
        # numbers below a line of several fields: that line is a header cut short
        short = id_column is None and len(before) > 1 and _has_numbers(row)
        return place - 1 if short else place
    return 0


def _lacks_corner(row: list[str], after: list[str], id_column: str | None) -> bool:
    """Return whether a row one field short is a header, not a title before it."""
    if len(row) > 2 and len(_strip_blank_end(row)) == 1:
        return False
    if id_column is None:
        return _readable(after)[1]
    title = len(row) == 1 and " " in row[0].strip()
    return id_column not in after and not title


def _readable(row: Sequence[str]) -> tuple[int, bool]:
    """Return the count of numbers, and whether half the cells are such or missing."""
    cells = row[1 : 1 + _LOOKED_AT]
    values = [cell_number(cell.replace(",", ".")) for cell in cells]
    known = [value for value in values if value is not None]
    return sum(value == value for value in known), 2 * len(known) >= len(cells)


def _has_numbers(row: Sequence[str]) -> bool:
    numbers, mostly = _readable(row)
    return numbers > 0 and mostly


def _header_behind_a_mark(
    before: Sequence[str], delimiter: str, rows: list[list[str]], id_column: str | None
) -> tuple[int, list[str]] | None:
    """Return the last comment as header when it names columns: ``#id<tab>a<tab>b``."""
    places = [place for place, line in enumerate(before) if line.strip()]
    if not places or not is_comment(before[places[-1]]):
        return None
    names = _fields(before[places[-1]], delimiter)
    if names[0][:1] != "#" or len(names) != len(rows[0]) or len(names) < 2:
        return None
    if id_column is None and (not _has_numbers(rows[0]) or _has_numbers(names)):
        return None
    if id_column is not None and id_column in rows[0]:
        return None
    names[0] = names[0].lstrip("# ")
    return places[-1], names


def _strip_blank_end(row: list[str]) -> list[str]:
    end = len(row)
    while end and not row[end - 1].strip():
        end -= 1
    return row[:end]


def _measured(
    delimiter: str, header: int, names: list[str], data: list[list[str]], width: int
) -> Layout:
    """Return the layout after delimiters at the end of lines have been seen through."""
    named = _strip_blank_end(names)
    filled = max((len(_strip_blank_end(row)) for row in data), default=0)
    if width == len(names) + 1 and filled > len(named):
        if filled > len(names):
            return Layout(delimiter, header, names, width, 0)  # the corner is missing
        if filled == len(named) + 1:  # and delimiters at the end of lines
            return Layout(delimiter, header, named, filled, width - filled)
    if filled > len(named) and width >= len(names):
        named = names  # a column without a name has content
    return Layout(
        delimiter, header, named, len(named), max(0, width - len(named)) if data else 0
    )
