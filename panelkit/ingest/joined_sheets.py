"""What several joined matrices say about the features that they share."""

from collections.abc import Sequence

import numpy as np

from panelkit.ingest.sheet import Sheet, Text
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Finding

__all__ = ["joined_feature_sheet"]


def joined_feature_sheet(
    sheets: Sequence[Sheet | None], names: Sequence[str], features: Sequence[str]
) -> Sheet | None:
    """Return the feature sheets of joined parts as one.

    Parameters
    ----------
    sheets : sequence of Sheet or None
        What each part says about its features.
    names : sequence of str
        What the parts are called.
    features : sequence of str
        The features that are kept.

    Returns
    -------
    Sheet or None
        Columns of all parts. Where parts differ the entry of the first one that has
        the column stands, and a finding of the sheet says so.
    """
    known = [
        (sheet, name)
        for sheet, name in zip(sheets, names, strict=True)
        if sheet is not None
    ]
    if not known:
        return None
    columns: dict[str, Text] = {}
    source: dict[str, str] = {}
    findings = [finding for sheet, _ in known for finding in sheet.findings]
    for sheet, part in known:
        place = {name: row for row, name in enumerate(sheet.ids)}
        rows = [place.get(name, -1) for name in features]
        differing: dict[str, list[str]] = {}
        for name, column in sheet.columns.items():
            text = np.array([column[k] if k >= 0 else "" for k in rows], dtype=object)
            if name not in columns:
                columns[name], source[name] = text, part
            elif unequal := np.flatnonzero(columns[name] != text).tolist():
                differing[name] = [features[k] for k in unequal]
        if differing:
            findings.append(_differs(differing, source, part))
    where = " and ".join(name for _, name in known)
    ids = np.array(features, dtype=object)
    return Sheet(where, ids, columns, tuple(findings))


def _differs(
    differing: dict[str, list[str]], source: dict[str, str], part: str
) -> Finding:
    column, hit = next(iter(differing.items()))
    used = list(dict.fromkeys(source[name] for name in differing))
    return Finding(
        code="feature-columns-differ",
        severity="warning",
        where=part,
        message=f"what the file says of features differs from {quoted(used)} in "
        f"{counted(len(differing), 'column', 'columns')} ({quoted(differing)}), in "
        f"{column!r} for {counted(len(hit), 'feature', 'features')} ({quoted(hit)}); "
        f"that of {quoted(used)} is used",
        next_step="Check that ids mean the same in all files; a feature sheet given "
        "as features settles it.",
    )
