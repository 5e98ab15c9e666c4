"""The assay sheet: feature to analyte to assay, many to one."""

import os
from collections import Counter
from collections.abc import Sequence
from pathlib import Path
from typing import NamedTuple

import numpy as np

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.alignment import mismatch_hint
from panelkit.ingest.data_frames import is_data_frame, series_text
from panelkit.ingest.sheet import Text, read_columns
from panelkit.ingest.source_file import sha256
from panelkit.ingest.wording import counted, quoted
from panelkit.records import AssayMap, Finding

__all__ = ["ASSAY_COLUMNS", "assay_map", "open_assays"]

ASSAY_COLUMNS = ("feature", "analyte", "assay")


class AssayTable(NamedTuple):
    """The columns of an assay sheet.

    Attributes
    ----------
    where : str
        For messages.
    names : list of str
        Column names.
    texts : list of ndarray of shape (n_rows,), object
        Their content.
    digest : str or None
        SHA-256 of the file; None for a data frame.
    findings : tuple of Finding
        What was noticed about the file itself.
    """

    where: str
    names: list[str]
    texts: list[Text]
    digest: str | None
    findings: tuple[Finding, ...] = ()


def open_assays(given: object) -> AssayTable:
    """Return where an assay sheet is, its columns, and the hash of its file.

    Parameters
    ----------
    given : path or pandas.DataFrame
        As handed to `read_cohort`.

    Returns
    -------
    AssayTable
        Its columns as text.

    Raises
    ------
    UsageError
        When it is something else.
    InputDataError
        When the file cannot be read.
    """
    if is_data_frame(given):
        texts = [series_text(given.iloc[:, k]) for k in range(given.shape[1])]
        names = [str(name) for name in given.columns]
        return AssayTable("assays (data frame)", names, texts, None)
    if not isinstance(given, str | os.PathLike):
        raise UsageError(
            code="sheet-not-understood",
            where="assays",
            what=f"this is a {type(given).__name__}",
            accepted="a path or a pandas data frame is needed",
            next_step="Pass one of these",
        )
    path = Path(given)
    names, texts, findings = read_columns(path, "feature")
    return AssayTable(path.name, names, texts, sha256(path), findings)


def assay_map(
    where: str,
    names: Sequence[str],
    texts: Sequence[Text],
    features: Sequence[str],
    feature_columns: dict[str, Text],
) -> tuple[AssayMap, list[Finding]]:
    """Return which assay measures which feature of the matrix.

    Parameters
    ----------
    where : str
        The file or argument, for messages.
    names : sequence of str
        Column names.
    texts : sequence of ndarray of shape (n_rows,), object
        Their content.
    features : sequence of str
        Features of the matrix.
    feature_columns : dict of str to ndarray of shape (n_features,), object
        The feature sheet's columns; an `analyte` there must not differ.

    Returns
    -------
    assays : AssayMap
        Rows of features that the matrix has, in the order of the sheet.
    findings : list of Finding
        Features of one side only.

    Raises
    ------
    InputDataError
        When a column is missing, a row is repeated or blank, a feature stands for two
        analytes, an analyte has two assays, or no feature is in the matrix.
    """
    table = _columns(where, names, texts)
    feature, analyte, assay = (table[name] for name in ASSAY_COLUMNS)
    _refuse_blanks(where, feature, analyte)
    _refuse_repeats(where, feature, analyte)
    _refuse_several(where, analyte, assay)
    known = set(features)
    found = np.array([name in known for name in feature], bool)
    if not found.any():
        hint = mismatch_hint(feature, features, "the matrix")
        raise InputDataError(
            code="no-features-match",
            where=where,
            what=f"none of the {len(feature)} features of the sheet "
            f"({quoted(feature, 3)}) is among the {len(features)} of the matrix "
            f"({quoted(features, 3)})" + (f"; {hint}" if hint else ""),
            accepted="ids are compared as text, character by character",
            next_step="Make the ids equal in both files",
        )
    made = AssayMap(feature[found], analyte[found], assay[found])
    _refuse_other_analytes(where, made, features, feature_columns)
    return made, _one_sided(where, feature[~found], set(feature), features)


def _columns(
    where: str, names: Sequence[str], texts: Sequence[Text]
) -> dict[str, Text]:
    missing = [name for name in ASSAY_COLUMNS if name not in names]
    if missing:
        raise InputDataError(
            code="unknown-column",
            where=where,
            what=f"there is no column {' or '.join(map(repr, missing))} (got "
            f"{quoted(names, 20)})",
            accepted="the columns feature, analyte and assay, each once",
            next_step="Name the columns so",
        )
    return {name: texts[list(names).index(name)] for name in ASSAY_COLUMNS}


def _refuse_blanks(where: str, feature: Text, analyte: Text) -> None:
    blank = [
        row + 1
        for row, pair in enumerate(zip(feature, analyte, strict=True))
        if not all(cell.strip() for cell in pair)
    ]
    if blank:
        raise InputDataError(
            code="blank-id",
            where=where,
            what=f"{counted(len(blank), 'row has', 'rows have')} no feature or no "
            f"analyte (data rows {quoted(blank)})",
            accepted="a feature and an analyte in every row; the assay may be blank",
            next_step="Fill them in or remove these rows",
        )


def _refuse_repeats(where: str, feature: Text, analyte: Text) -> None:
    repeated = [name for name, count in Counter(feature).items() if count > 1]
    if not repeated:
        return
    of = {name: sorted(set(analyte[feature == name])) for name in repeated}
    several = [f"{name!r} ({' and '.join(of[name])})" for name in of if of[name][1:]]
    if several:
        raise InputDataError(
            code="feature-in-two-analytes",
            where=where,
            what=f"{counted(len(several), 'feature stands', 'features stand')} for "
            f"more than one analyte: {_some(several)}",
            accepted="one analyte for each feature",
            next_step="Keep the analyte that the feature measures, or leave the "
            "feature out of the sheet",
        )
    raise InputDataError(
        code="repeated-ids",
        where=f"{where}, column 'feature'",
        what=f"{len(repeated)} features occur more than once: {quoted(repeated)}",
        accepted="every feature once",
        next_step="Remove the repeated rows",
    )


def _refuse_several(where: str, analyte: Text, assay: Text) -> None:
    of: dict[str, set[str]] = {}
    for name, ordered in zip(analyte, assay, strict=True):
        if ordered.strip():
            of.setdefault(name, set()).add(ordered)
    several = [
        f"{n!r} ({' and '.join(sorted(a))})" for n, a in of.items() if len(a) > 1
    ]
    if several:
        raise InputDataError(
            code="analyte-in-two-assays",
            where=where,
            what=f"{counted(len(several), 'analyte has', 'analytes have')} more than "
            f"one assay: {_some(several)}",
            accepted="one assay for each analyte; an assay may measure several",
            next_step="Keep the assay that would be ordered",
        )


def _some(texts: Sequence[str]) -> str:
    left = len(texts) - 5
    return ", ".join(texts[:5]) + (f" and {left} more" if left > 0 else "")


def _refuse_other_analytes(
    where: str,
    made: AssayMap,
    features: Sequence[str],
    feature_columns: dict[str, Text],
) -> None:
    stated = feature_columns.get("analyte")
    if stated is None:
        return
    own = made.columns(features)["analyte"]
    apart = [
        f"{name!r} ({theirs} and {ours})"
        for name, theirs, ours in zip(features, stated, own, strict=True)
        if theirs and ours and theirs != ours
    ]
    if apart:
        raise InputDataError(
            code="feature-in-two-analytes",
            where=f"{where} and the feature sheet, column 'analyte'",
            what=f"{counted(len(apart), 'feature stands', 'features stand')} for "
            f"another analyte in either: {_some(apart)}",
            accepted="the same analyte in both sheets",
            next_step="Correct one of them, or take the column out of the feature "
            "sheet",
        )


def _one_sided(
    where: str, surplus: Text, known: set[str], features: Sequence[str]
) -> list[Finding]:
    without = [name for name in features if name not in known]
    sides = (
        ("assay-features-not-in-matrix", surplus, "rows without a feature of the "
         "matrix"),
        ("features-without-analyte", without, "features of the matrix without a row"),
    )  # fmt: skip
    return [
        Finding(
            code=code,
            severity="info",
            where=where,
            message=f"{len(names)} {what}: {quoted(names)}",
            next_step="Make the ids equal in both files if they should match.",
        )
        for code, names, what in sides
        if len(names)
    ]
