"""Which way round a matrix is, and which of its samples the sheet knows."""

from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Literal, get_args

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import nearest_hint, quoted
from panelkit.records import Finding

__all__ = [
    "FeatureMajor",
    "Orientation",
    "check_orientation",
    "mismatch_hint",
    "orient",
    "refuse_strangers",
]

Orientation = Literal["auto", "samples-in-rows", "features-in-rows"]

# fewer accidental hits than this share of the other side's do not make both fit
_CLEARLY_FEWER = 0.1


@dataclass(frozen=True, slots=True, eq=False)
class FeatureMajor:
    """A matrix whose way round is known.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    features, samples : list of str
        Their ids, unique, in file order.
    values : ndarray of shape (n_features, n_samples)
        A view; not contiguous when samples were in rows.
    """

    where: str
    features: list[str]
    samples: list[str]
    values: NDArray[np.floating[Any]]


def check_orientation(orientation: str) -> None:
    """Refuse a word that is no orientation.

    Parameters
    ----------
    orientation : str
        What was asked for.

    Raises
    ------
    UsageError
        When it is none of the three.
    """
    known = get_args(Orientation)
    if orientation not in known:
        raise UsageError(
            code="unknown-orientation",
            where="orientation",
            what=f"{orientation!r} is no orientation",
            accepted=f"{nearest_hint(orientation, known)}accepted are {quoted(known)}",
            next_step="Use one of these words",
        )


def orient(
    table: MatrixTable, sheet: Sheet | None, orientation: str
) -> tuple[FeatureMajor, list[Finding]]:
    """Return the matrix with features first, and what had to be assumed.

    Parameters
    ----------
    table : MatrixTable
        As it was read.
    sheet : Sheet or None
        The sample sheet, whose ids decide under "auto".
    orientation : {"auto", "samples-in-rows", "features-in-rows"}
        A word other than "auto" wins over what the ids say.

    Returns
    -------
    matrix : FeatureMajor
        Ids checked.
    findings : list of Finding
        One when samples in rows had to be assumed.

    Raises
    ------
    InputDataError
        When no sheet id, or ids on both sides, are found, or when ids are blank or
        repeated.
    """
    findings = []
    if orientation == "auto":
        if sheet is None:
            findings.append(_assumed(table))
            orientation = "samples-in-rows"
        else:
            orientation = _decide(table, sheet)
    if orientation == "samples-in-rows":
        matrix = FeatureMajor(
            table.where, table.column_ids, table.row_ids, table.values.T
        )
    else:
        matrix = FeatureMajor(
            table.where, table.row_ids, table.column_ids, table.values
        )
    _check_unique(matrix.samples, "sample", table.where)
    _check_unique(matrix.features, "feature", table.where)
    if sheet is not None and not set(matrix.samples) & set(sheet.ids):
        raise _no_match(table, sheet)
    return matrix, findings


def _assumed(table: MatrixTable) -> Finding:
    rows, columns = len(table.row_ids), len(table.column_ids)
    return Finding(
        code="orientation-assumed",
        severity="info",
        where=table.where,
        message=f"there is no sample sheet to tell rows from columns: the {rows} rows "
        f"are taken as samples, the {columns} columns as features",
        next_step="Set orientation to features-in-rows if it is the other way round.",
    )


def _decide(table: MatrixTable, sheet: Sheet) -> str:
    known = set(sheet.ids)
    in_rows = len(known.intersection(table.row_ids))
    in_columns = len(known.intersection(table.column_ids))
    if not in_rows and not in_columns:
        raise _no_match(table, sheet)
    fewer, more = sorted((in_rows, in_columns))
    if fewer > _CLEARLY_FEWER * more:
        raise InputDataError(
            code="orientation-unclear",
            where=table.where,
            what=f"sample ids of {sheet.where} stand on both sides ({in_rows} in the "
            f"first column, {in_columns} in the header)",
            accepted="with orientation 'auto' they stand on one side",
            next_step="Set orientation to samples-in-rows or features-in-rows",
        )
    return "samples-in-rows" if in_rows > in_columns else "features-in-rows"


def refuse_strangers(table: MatrixTable, sheet: Sheet, missing: Sequence[str]) -> None:
    """Refuse a sheet and a matrix that have no id in common.

    Parameters
    ----------
    table : MatrixTable
        As it was read.
    sheet : Sheet
        The sample sheet.
    missing : sequence of str
        Columns that the sheet does not have either: it may be another study's.

    Raises
    ------
    InputDataError
        With the first ids of both sides, their counts, and what keeps them apart.
    """
    if set(sheet.ids).isdisjoint({*table.row_ids, *table.column_ids}):
        raise _no_match(table, sheet, missing)


def _no_match(
    table: MatrixTable, sheet: Sheet, missing: Sequence[str] = ()
) -> InputDataError:
    hints = [
        hint
        for hint in (
            mismatch_hint(sheet.ids, table.row_ids, "the first column"),
            mismatch_hint(sheet.ids, table.column_ids, "the header"),
        )
        if hint
    ]
    advice = f"; {hints[0]}" if hints else ""
    return InputDataError(
        code="no-ids-match",
        where=f"{table.where} and {sheet.where}",
        what=f"none of the {len(sheet.ids)} sample ids of the sheet "
        f"({quoted(sheet.ids, 3)}) is among the {len(table.row_ids)} ids of the "
        f"matrix's first column ({quoted(table.row_ids, 3)}) or the "
        f"{len(table.column_ids)} of its header ({quoted(table.column_ids, 3)})"
        + advice
        + (f"; nor has the sheet a column {quoted(missing)}" if missing else ""),
        accepted="ids are compared as text, character by character",
        next_step="Check that both files are of the same study; make the ids equal in "
        "both, or name the sheet's id column sample_id",
    )


def _without_case(name: str) -> str:
    return name.casefold()


def _without_blanks(name: str) -> str:
    return name.strip()


def _without_zeros(name: str) -> str:
    return name.lstrip("0").removesuffix(".0")


def _without_marks(name: str) -> str:
    # some programs turn hyphens into dots and put an X before a digit
    plain = name.replace("-", ".").replace("_", ".").replace(" ", ".")
    return plain[1:] if plain[:1] == "X" and plain[1:2].isdigit() else plain


_CHANGES: tuple[tuple[str, Callable[[str], str]], ...] = (
    ("letter case", _without_case),
    ("blanks around them", _without_blanks),
    ("leading zeros or a final .0", _without_zeros),
    ("hyphens, underscores, dots or a leading X", _without_marks),
)


def mismatch_hint(wanted: Iterable[str], found: Iterable[str], place: str) -> str:
    """Return which small difference keeps ids apart, if one does.

    Parameters
    ----------
    wanted, found : iterable of str
        Ids of the two sides, none in common.
    place : str
        Where `found` stands, for the sentence.

    Returns
    -------
    str
        For example "79 would match those of the header but for letter case", or
        nothing.
    """
    wanted, found = list(wanted), list(found)
    best = (0, "")
    for label, change in _CHANGES:
        known = {change(name) for name in found}
        hits = sum(change(name) in known for name in wanted)
        best = max(best, (hits, label), key=lambda pair: pair[0])
    hits, label = best
    if not hits:
        return ""
    return f"{hits} would match those of {place} but for {label}"


def _check_unique(names: list[str], kind: str, where: str) -> None:
    blank = sum(not name.strip() for name in names)
    if blank:
        raise InputDataError(
            code="blank-id",
            where=f"{where}, {kind} ids",
            what=f"{blank} of the {len(names)} {kind} ids are blank",
            accepted=f"every {kind} has an id",
            next_step="Fill in the ids or remove these rows or columns",
        )
    repeated = [name for name, count in Counter(names).items() if count > 1]
    if repeated:
        raise InputDataError(
            code="repeated-ids",
            where=f"{where}, {kind} ids",
            what=f"{len(repeated)} {kind} ids occur more than once: {quoted(repeated)}",
            accepted=f"every {kind} has an id of its own",
            next_step="Rename, merge or remove the repeated ones",
        )
