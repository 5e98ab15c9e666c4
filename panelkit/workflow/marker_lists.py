"""Which markers a planner means: names, a file of names, or so many of a list."""

import csv
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Final

from panelkit.errors import InputDataError, UsageError, name_some
from panelkit.records import ANY_MARKER, AssayPrice, PriceList

__all__ = ["count_of", "markers_of", "names_meant"]

HEADINGS: Final = ("marker", "feature", "assay", "id")


def count_of(words: Sequence[str]) -> int | None:
    """Return how many markers are meant where a number alone says it."""
    if len(words) == 1 and words[0].isdecimal() and not Path(words[0]).exists():
        return int(words[0])
    return None


def names_meant(words: Sequence[str]) -> tuple[str, ...]:
    """Return the names that words stand for, files of names read.

    Parameters
    ----------
    words : sequence of str
        Names, several in one word with commas between, or paths of files: a name a
        line, or a CSV file with a column marker, feature, assay or id.

    Returns
    -------
    tuple of str
        In the order given, each once.

    Raises
    ------
    UsageError
        A name is given twice, or none is.
    InputDataError
        A file holds no names.
    """
    names: list[str] = []
    for word in words:
        path = Path(word)
        if path.is_file():
            names += _from_file(path)
        elif path.suffix in (".txt", ".csv", ".tsv"):
            raise UsageError(
                code="marker-file-missing",
                where=f"markers, {word}",
                what=f"there is no file of that name (got {word!r})",
                accepted="a file with a marker on each line, or names of markers",
                next_step="Check the path",
            )
        else:
            names += [part.strip() for part in word.split(",") if part.strip()]
    if twice := sorted({name for name in names if names.count(name) > 1}):
        raise UsageError(
            code="marker-repeated",
            where="markers",
            what=f"markers are named twice (got {name_some(twice)})",
            accepted="each marker is named once",
            next_step="Remove the repeated names",
        )
    if not names:
        raise UsageError(
            code="panel-empty",
            where="markers",
            what="no marker is named (got none)",
            accepted="names, a file of names, or how many",
            next_step="Name the panel's markers",
        )
    return tuple(names)


def _from_file(path: Path) -> list[str]:
    try:
        text = path.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        raise InputDataError(
            code="file-unreadable",
            where=str(path),
            what=f"the file cannot be read (got {error})",
            accepted="a text file in UTF-8 with a marker on each line",
            next_step="Check the file",
        ) from None
    lines = [line for line in text.splitlines() if line.strip()]
    lines = [line for line in lines if not line.lstrip().startswith("#")]
    rows = [[cell.strip() for cell in row] for row in csv.reader(lines)]
    if not rows:
        raise InputDataError(
            code="marker-file-empty",
            where=str(path),
            what="the file names no marker (got no line)",
            accepted="a marker on each line",
            next_step="Write the panel's markers into it",
        )
    head = [cell.lower() for cell in rows[0]]
    column = next((head.index(name) for name in HEADINGS if name in head), None)
    if column is None:
        if len(rows[0]) > 1 and len(rows) > 1:
            raise InputDataError(
                code="marker-column-missing",
                where=f"{path}, line 1",
                what=f"no column holds the markers (got {name_some(rows[0])})",
                accepted=f"a column named {', '.join(HEADINGS)}, or one name a line",
                next_step="Name the column",
            )
        return [cell for row in rows for cell in row if cell]
    return [row[column] for row in rows[1:] if len(row) > column and row[column]]


def markers_of(
    words: Sequence[str],
    prices: PriceList,
    platforms: Iterable[str],
    first: Sequence[str] = (),
) -> tuple[str, ...]:
    """Return the panel that words stand for.

    Parameters
    ----------
    words : sequence of str
        As for `names_meant`, or one number: so many of `first`, then of the price
        list, then without a name where it prices any marker.
    prices : PriceList
        Names markers in file order.
    platforms : iterable of str
        Whose rows count.
    first : sequence of str
        Markers that a number counts before those of the list.

    Returns
    -------
    tuple of str
        The panel.

    Raises
    ------
    UsageError
        There are not so many markers.
    InputDataError
        A file holds no names.
    """
    count = count_of(words)
    if count is None:
        return names_meant(words)
    rows = [row for name in platforms for row in prices.quotes(name)]
    listed = [row.marker for row in rows if _is_own(row) and not row.backup_of]
    known = list(dict.fromkeys([*first, *listed]))
    if any(row.marker == ANY_MARKER for row in rows):
        known += [f"marker-{k}" for k in range(len(known) + 1, count + 1)]
    if not 1 <= count <= len(known):
        raise UsageError(
            code="markers-too-few",
            where="markers",
            what=f"the price list does not name so many markers (got {count})",
            accepted=f"a number from 1 to {len(known)}",
            next_step="Name the markers, or price any marker by a row '*'",
        )
    return tuple(known[:count])


def _is_own(row: AssayPrice) -> bool:
    return row.role == "marker" and row.marker != ANY_MARKER
