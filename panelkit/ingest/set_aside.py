"""Rows that are set aside: nothing reads them until they are opened, on record."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cells import is_missing
from panelkit.ingest.outcome_column import named_cells
from panelkit.ingest.row_ranges import Range, read_range
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import as_text, counted, nearest_hint, quoted
from panelkit.records import Dropped, Finding, Flow

__all__ = ["SetAside", "check_set_aside", "divide", "on_both_sides"]

STAGE = "set aside"


@dataclass(frozen=True, slots=True, eq=False)
class SetAside:
    """A sample sheet in two parts, of which one is read.

    Attributes
    ----------
    sheet : Sheet
        The rows that are read.
    hidden : ndarray of shape (n_hidden,), object
        Ids of the rows that are not.
    reason : str
        Why these are not read.
    opened : bool
        True when the rows that had been set aside are the ones that are read.
    """

    sheet: Sheet
    hidden: Text
    reason: str = ""
    opened: bool = False

    def dropped(self) -> list[Dropped]:
        """Return each hidden row with its stage and reason."""
        return [
            Dropped("sample", str(name), STAGE, self.reason) for name in self.hidden
        ]

    def flow(self) -> list[Flow]:
        """Return the hidden rows as an entry of the participant flow."""
        count = len(self.hidden)
        if not count:
            return []
        name = "(not set aside)" if self.opened else "(set aside)"
        return [Flow(name, count, 0, 0, 0, 0, set_aside=0 if self.opened else count)]

    def findings(self) -> list[Finding]:
        """Return what is said of rows that are set aside, or were opened."""
        if not self.reason:
            return []
        if self.opened:
            return [
                Finding(
                    code="set-aside-opened",
                    severity="warning",
                    where=self.sheet.where,
                    message=f"these are the {len(self.sheet.ids)} rows that had been "
                    f"set aside ({self.reason})",
                    next_step="Judge by them what was fixed before; a change made "
                    "after this look needs new people to be judged by.",
                )
            ]
        count = len(self.hidden)
        return [
            Finding(
                code="rows-set-aside",
                severity="info",
                where=self.sheet.where,
                message=f"{counted(count, 'row is', 'rows are')} set aside and not "
                f"read: {self.reason}",
                next_step="Open them once, when all choices have been made.",
            )
        ]


def check_set_aside(wanted: Mapping[str, Any] | None) -> None:
    """Refuse a `set_aside` that cannot be meant.

    Parameters
    ----------
    wanted : mapping or None
        `column` with `values`, or with `min` and `max`, or `from` and `to`.

    Raises
    ------
    UsageError
        When it is something else.
    """
    if wanted:
        _parts(wanted)


def divide(
    sheet: Sheet, wanted: Mapping[str, Any] | None, opened: bool = False
) -> SetAside:
    """Return the part of the sample sheet that may be read.

    Parameters
    ----------
    sheet : Sheet
        All rows.
    wanted : mapping or None
        As `check_set_aside` takes it; None or empty hides nothing.
    opened : bool
        True to read the rows that were set aside, and no other.

    Returns
    -------
    SetAside
        Both parts in the order of the sheet.

    Raises
    ------
    UsageError
        When it cannot be meant, or nothing is set aside that could be opened.
    InputDataError
        When the column or a value does not exist, a cell does not tell on which side
        its row is, or one side is empty.
    """
    if not wanted:
        if opened:
            raise UsageError(
                code="nothing-set-aside",
                where="open_set_aside",
                what="no rows are set aside that could be opened",
                accepted="set_aside names the rows",
                next_step="Leave open_set_aside out, or name set_aside",
            )
        return SetAside(sheet, np.empty(0, object))
    column, choice = _parts(wanted)
    cells = sheet.column(column, "set_aside")
    where = f"{sheet.where}, column {column!r}"
    if isinstance(choice, Range):
        hidden, unreadable = choice.holds(cells)
        unreadable = unreadable | [is_missing(cell) for cell in cells]
        if unreadable.any():
            raise InputDataError(
                code="set-aside-unclear",
                where=where,
                what=f"cells are no {choice.kind}, so that nothing tells whether their "
                f"rows are set aside {named_cells(unreadable, sheet.ids, cells)}",
                accepted=f"{choice.kind} in every row",
                next_step="Correct these cells, or remove their rows from the sheet",
            )
        reason = f"{column} is {choice.words}"
    else:
        hidden = np.isin(cells.astype(str), choice)
        _refuse_absent(choice, cells, where)
        reason = f"{column} is {' or '.join(map(repr, choice))}"
    if hidden.all() or not hidden.any():
        raise InputDataError(
            code="set-aside-one-sided",
            where=where,
            what=f"{'all' if hidden.all() else 'none'} of the {len(cells)} rows are "
            f"set aside ({reason})",
            accepted="some rows on either side",
            next_step="Correct set_aside, or take it out",
        )
    chosen = hidden if opened else ~hidden
    return SetAside(_part(sheet, chosen), sheet.ids[~chosen], reason, opened)


def on_both_sides(everybody: Sheet, part: SetAside, column: str) -> list[Finding]:
    """Return the people, or the matched sets, with rows read and rows not read.

    Parameters
    ----------
    everybody : Sheet
        All rows.
    part : SetAside
        What is read of them.
    column : str
        The column of subjects or of matched sets.

    Returns
    -------
    list of Finding
        One or none.
    """
    away = np.isin(everybody.ids.astype(str), part.hidden.astype(str))
    names = everybody.column(column, "subject")
    shared = sorted(
        name for name in set(names[away]) & set(names[~away]) if not is_missing(name)
    )
    if not shared:
        return []
    return [
        Finding(
            code="set-aside-not-apart",
            severity="warning",
            where=f"{everybody.where}, column {column!r}",
            message=f"{counted(len(shared), 'entry has', 'entries have')} rows that "
            f"are set aside and rows that are not: {quoted(shared)}",
            next_step="Set aside whole people and whole matched sets: else the rows "
            "set aside are no new people.",
        )
    ]


def _part(sheet: Sheet, rows: NDArray[np.bool_]) -> Sheet:
    columns = {name: text[rows] for name, text in sheet.columns.items()}
    return Sheet(sheet.where, sheet.ids[rows], columns)


def _refuse_absent(values: list[str], cells: Text, where: str) -> None:
    known = sorted(set(cells))
    absent = [value for value in values if value not in known]
    if absent:
        raise InputDataError(
            code="set-aside-value-absent",
            where=where,
            what=f"set_aside names {quoted(absent)}, which does not occur",
            accepted=f"{nearest_hint(absent[0], known)}the values are {quoted(known)}",
            next_step="Name values of this column as written",
        )


def _parts(wanted: Mapping[str, Any]) -> tuple[str, Range | list[str]]:
    """Return the column, and the range or the values in it."""
    rest = {key: value for key, value in wanted.items() if key != "column"}
    column = wanted.get("column")
    if isinstance(column, str):
        if set(rest) == {"values"}:
            given = rest["values"]
            several = isinstance(given, list | tuple | set | frozenset)
            values = [as_text(value) for value in (given if several else [given])]
            if values:
                return column, values
        span = read_range(rest)
        if span is not None:
            return column, span
    raise UsageError(
        code="set-aside-not-understood",
        where="set_aside",
        what=f"this names no rows (got {dict(wanted)!r})",
        accepted="accepted are column with values, or column with from, to or both "
        "(numbers or dates)",
        next_step='Write for example { column = "year", from = 2019 }',
    )
