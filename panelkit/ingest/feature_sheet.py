"""The feature sheet: symbols, roles and platforms of the features of the matrix."""

from collections.abc import Sequence

import numpy as np

from panelkit.errors import InputDataError
from panelkit.ingest.alignment import mismatch_hint
from panelkit.ingest.assayable import read_assayable
from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import nearest_hint, quoted
from panelkit.records import Finding

__all__ = ["ROLES", "feature_columns"]

ROLES = ("marker", "control", "reference")


def feature_columns(
    sheet: Sheet | None,
    features: Sequence[str],
    platforms: Sequence[str] | None = None,
) -> tuple[dict[str, Text], list[Finding]]:
    """Return the sheet's columns in the order of the matrix's features.

    Parameters
    ----------
    sheet : Sheet or None
        The feature sheet, if there is one.
    features : sequence of str
        Features of the matrix.
    platforms : sequence of str or None
        Platforms that exist; None when nothing is known of them.

    Returns
    -------
    columns : dict of str to ndarray of shape (n_features,), object
        ``""`` for features without a row. `assayable` holds sorted platform names
        joined by ``;``, whichever way the sheet says it.
    findings : list of Finding
        Features of one side only.

    Raises
    ------
    InputDataError
        When no feature is found in the sheet, a role is none of the three, or a
        platform does not exist.
    """
    if sheet is None:
        return {}, []
    _check_roles(sheet)
    assayable = read_assayable(sheet, platforms)
    given = {**sheet.columns, **({} if assayable is None else {"assayable": assayable})}
    place = {name: position for position, name in enumerate(sheet.ids)}
    rows = np.array([place.get(name, -1) for name in features])
    found = rows >= 0
    if not found.any():
        hint = mismatch_hint(sheet.ids, features, "the matrix")
        raise InputDataError(
            code="no-features-match",
            where=sheet.where,
            what=f"none of the {len(sheet.ids)} features of the sheet "
            f"({quoted(sheet.ids, 3)}) is among the {len(features)} of the matrix "
            f"({quoted(features, 3)})" + (f"; {hint}" if hint else ""),
            accepted="ids are compared as text, character by character",
            next_step="Make the ids equal, or put them into the column feature",
        )
    columns = {}
    for name, text in given.items():
        column = np.full(len(features), "", dtype=object)
        column[found] = text[rows[found]]
        columns[name] = column
    return columns, _one_sided(sheet, features, found)


def _check_roles(sheet: Sheet) -> None:
    roles = sheet.columns.get("role")
    if roles is None:
        return
    wrong = [
        f"{name} ({role})"
        for name, role in zip(sheet.ids, roles, strict=True)
        if role not in (*ROLES, "")
    ]
    if wrong:
        example = str(roles[[r not in (*ROLES, "") for r in roles]][0])
        raise InputDataError(
            code="unknown-role",
            where=f"{sheet.where}, column 'role'",
            what=f"{len(wrong)} features have a role that does not exist: "
            f"{quoted(wrong)}",
            accepted=f"{nearest_hint(example, ROLES)}roles are marker, control, "
            "reference or blank",
            next_step="Correct these roles",
        )


def _one_sided(
    sheet: Sheet,
    features: Sequence[str],
    found: np.ndarray[tuple[int], np.dtype[np.bool_]],
) -> list[Finding]:
    known = set(features)
    without = [name for name, hit in zip(features, found, strict=True) if not hit]
    surplus = [name for name in sheet.ids if name not in known]
    sides = (
        ("features-not-in-sheet", without, "features of the matrix without a row"),
        ("features-not-in-matrix", surplus, "rows without a feature of the matrix"),
    )
    return [
        Finding(
            code=code,
            severity="info",
            where=sheet.where,
            message=f"{len(names)} {what}: {quoted(names)}",
            next_step="Make the ids equal in both files if they should match.",
        )
        for code, names, what in sides
        if names
    ]
