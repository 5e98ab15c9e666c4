"""The `keep` row filter: accepted values, or a range of numbers or dates."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import UsageError
from panelkit.ingest.row_ranges import read_range
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import as_text, nearest_hint, quoted
from panelkit.records import Finding

__all__ = ["RowFilter", "row_filters"]


@dataclass(frozen=True, slots=True, eq=False)
class RowFilter:
    """Which rows one entry of `keep` lets through.

    Attributes
    ----------
    column : str
        The column it looks at.
    passes : ndarray of shape (n_rows,), bool
        True for rows that are kept.
    reason : str
        Why the others are left out.
    findings : tuple of Finding
        Accepted values that do not occur; cells of a range that are no numbers.
    """

    column: str
    passes: NDArray[np.bool_]
    reason: str
    findings: tuple[Finding, ...] = ()


def row_filters(sheet: Sheet, keep: Mapping[str, Any] | None) -> list[RowFilter]:
    """Return the filters of `keep`, one for each column.

    Parameters
    ----------
    sheet : Sheet
        The sample sheet.
    keep : mapping or None
        Column to one value, several values, or a mapping with `min`, `max` or both,
        or with `from`, `to` or both.

    Returns
    -------
    list of RowFilter
        In the order of `keep`.

    Raises
    ------
    UsageError
        When an entry is neither values nor a range.
    InputDataError
        When there is no such column.
    """
    filters = []
    for column, wanted in (keep or {}).items():
        cells = sheet.column(column, "keep")
        if isinstance(wanted, Mapping):
            filters.append(_range_filter(sheet, column, cells, wanted))
        else:
            filters.append(_value_filter(sheet, column, cells, wanted))
    return filters


def _value_filter(
    sheet: Sheet, column: str, cells: NDArray[np.object_], wanted: Any
) -> RowFilter:
    several = isinstance(wanted, list | tuple | set | frozenset)
    accepted = [as_text(value) for value in (wanted if several else [wanted])]
    if not accepted:
        raise _not_understood(column, wanted)
    known = sorted(set(cells))
    absent = [value for value in accepted if value not in known]
    findings = tuple(
        Finding(
            code="keep-value-absent",
            severity="warning",
            where=f"{sheet.where}, column {column!r}",
            message=f"keep asks for {value!r}, which does not occur; "
            f"{nearest_hint(value, known)}the values are {quoted(known)}",
            next_step="Correct the value, or leave it out of keep.",
        )
        for value in absent
    )
    return RowFilter(
        column,
        np.isin(cells.astype(str), accepted),
        f"{column} is not {' or '.join(map(repr, accepted))}",
        findings,
    )


def _range_filter(
    sheet: Sheet, column: str, cells: NDArray[np.object_], wanted: Mapping[str, Any]
) -> RowFilter:
    span = read_range(wanted)
    if span is None:
        raise _not_understood(column, dict(wanted))
    inside, unreadable = span.holds(cells)
    findings: tuple[Finding, ...] = ()
    if unreadable.any():
        findings = (
            Finding(
                code="keep-cells-not-numeric",
                severity="warning",
                where=f"{sheet.where}, column {column!r}",
                message=f"keep asks for a range, but {unreadable.sum()} cells are no "
                f"{span.kind} ({quoted(sorted(set(cells[unreadable])))}); their rows "
                "are left out",
                next_step="Correct these cells, or keep by values instead.",
            ),
        )
    return RowFilter(column, inside, f"{column} is not {span.words}", findings)


def _not_understood(column: str, wanted: Any) -> UsageError:
    return UsageError(
        code="keep-not-understood",
        where=f"keep, column {column!r}",
        what=f"this is neither values nor a range (got {wanted!r})",
        accepted="accepted are a list of values, a mapping with numbers min, max or "
        "both, or one with numbers or dates from, to or both, the first not above the "
        "second",
        next_step='Write for example {"lineage": ["B"]} or {"age": {"min": 18}}',
    )
