"""Reading a price list."""

from collections.abc import Iterator, Sequence
from datetime import date
from itertools import pairwise
from pathlib import Path

from panelkit.errors import InputDataError, name_some
from panelkit.ingest.csv_rows import read_header, read_lines, take_cells
from panelkit.records import (
    PRICE_COLUMNS,
    AssayPrice,
    Finding,
    Findings,
    PriceList,
    check_price_columns,
)

__all__ = ["read_price_list"]

QUOTE_MONTHS = 12  # a quote older than this beside the newest one is worth a question
NEEDED_COLUMNS = ("marker", "platform")


def read_price_list(path: str | Path) -> PriceList:
    """Return the price list that a CSV file holds.

    Cells are read as decimals, never through a binary float. Empty cells take the
    column's default; a price left empty is a missing quote, while 0 is a price.

    Parameters
    ----------
    path : str or Path
        A comma-separated file with a header; see `PRICE_COLUMNS`.

    Returns
    -------
    PriceList
        Rows in file order, and what was noticed about them.

    Raises
    ------
    InputDataError
        If the file cannot be read, a column is unknown, repeated or missing, a
        cell is not what its column accepts, or a marker is priced twice on a
        platform.
    """
    name = str(path)
    lines = read_lines(path)
    header, head = read_header(lines, name, NEEDED_COLUMNS, PRICE_COLUMNS)
    check_price_columns(header, head)
    rows: list[AssayPrice] = []
    places: dict[tuple[str, str], int] = {}
    for number, cells in lines:
        row = AssayPrice.from_row(
            take_cells(cells, header, name, number),
            where=f"{name}, line {number}",
        )
        _check_key(row, places, name, number)
        places[row.marker, row.platform] = number
        rows.append(row)
    if not rows:
        raise InputDataError(
            code="price-list-empty",
            where=name,
            what="the price list has no row (got only a header)",
            accepted="one row for each marker and platform",
            next_step="Add prices",
        )
    return PriceList(tuple(rows), Findings(tuple(_findings(rows, places, name))))


def _check_key(
    row: AssayPrice, places: dict[tuple[str, str], int], name: str, number: int
) -> None:
    if not row.platform:
        raise InputDataError(
            code="platform-empty",
            where=f"{name}, line {number}, column 'platform'",
            what="the platform has no name (got an empty cell)",
            accepted="the name of a platform of the study",
            next_step="Name the platform or remove the row",
        )
    before = places.get((row.marker, row.platform))
    if before is not None:
        raise InputDataError(
            code="price-repeated",
            where=f"{name}, line {number}, column 'marker'",
            what=f"the marker is priced twice on platform '{row.platform}' "
            f"(got {row.marker!r}, first on line {before})",
            accepted="one row for each marker and platform",
            next_step="Remove one of the rows",
        )


def _findings(
    rows: Sequence[AssayPrice], places: dict[tuple[str, str], int], name: str
) -> Iterator[Finding]:
    dates = [row.quote_date for row in rows if row.quote_date is not None]
    if dates:
        # Beside the newest quote, not today: a run must not depend on its day.
        limit = _months_before(max(dates), QUOTE_MONTHS)
        old = [row for row in rows if row.quote_date and row.quote_date < limit]
        if old:
            yield Finding(
                code="quote-old",
                severity="warning",
                where=f"{name}, column 'quote_date'",
                message=f"{len(old)} quotes are more than {QUOTE_MONTHS} months older "
                f"than the newest, of {max(dates)}: {name_some(r.marker for r in old)}",
                next_step="Ask for these prices again",
            )
    for row in rows:
        prices = [price for _, price in row.tiers]
        if any(b >= a for a, b in pairwise(prices)):
            yield Finding(
                code="tier-price-not-falling",
                severity="warning",
                where=f"{name}, line {places[row.marker, row.platform]}, "
                "column 'tiers'",
                message=f"the price of {row.marker} does not fall with quantity",
                next_step="Check the tiers against the quote",
            )


def _months_before(day: date, months: int) -> date:
    """Return the same day some months earlier, or the last day of that month."""
    year, month = divmod(day.year * 12 + day.month - 1 - months, 12)
    for last in (day.day, 30, 29, 28):
        try:
            return date(year, month + 1, min(day.day, last))
        except ValueError:
            continue
    return day
