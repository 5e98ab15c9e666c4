"""From the rows of the sample sheet to the analysed samples, each step counted."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.alignment import mismatch_hint
from panelkit.ingest.cells import is_missing
from panelkit.ingest.outcome_column import OutcomeColumn
from panelkit.ingest.row_filter import RowFilter
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Dropped, Finding, Flow

__all__ = ["Selection", "select_rows"]

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Selection:
    """The analysed rows of the sample sheet, and what became of the others.

    Attributes
    ----------
    rows : ndarray of shape (n_samples,), int64
        Positions in the sheet, ascending.
    groups : tuple of str
        Groups of the outcome that are analysed; empty without an outcome.
    dropped : tuple of Dropped
        Every row, and every sample of the matrix, that was left out.
    flow : tuple of Flow
        One entry a class, and one for rows without an outcome.
    findings : tuple of Finding
        What was noticed.
    """

    rows: NDArray[np.int64]
    groups: tuple[str, ...]
    dropped: tuple[Dropped, ...]
    flow: tuple[Flow, ...]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True, eq=False)
class _Stages:
    """Which rows are still there after each stage."""

    matched: Mask
    with_outcome: Mask
    kept: Mask
    analysed: Mask


def select_rows(
    sheet: Sheet,
    matrix_samples: Sequence[str],
    classes: OutcomeColumn | None,
    filters: Sequence[RowFilter],
    replicate_of: str | None,
) -> Selection:
    """Return the rows to analyse.

    Parameters
    ----------
    sheet : Sheet
        The sample sheet.
    matrix_samples : sequence of str
        Sample ids of the matrix.
    classes : OutcomeColumn or None
        The outcome, if there is one.
    filters : sequence of RowFilter
        The row filters.
    replicate_of : str or None
        Column that names the sample of which a row is a technical replicate; a row
        that names itself is no replicate.

    Returns
    -------
    Selection
        Rows in the order of the sheet.

    Raises
    ------
    InputDataError
        When no row is left, or those that are make no outcome of its kind.
    """
    known = set(matrix_samples)
    matched = np.array([name in known for name in sheet.ids], dtype=bool)
    usable = classes.usable() if classes else np.ones_like(matched)
    passes = np.ones_like(matched)
    for entry in filters:
        passes &= entry.passes
    replicate, findings = _replicates(sheet, replicate_of)
    stages = _Stages(
        matched,
        matched & usable,
        matched & usable & passes,
        matched & usable & passes & ~replicate,
    )
    _refuse_nothing(sheet, stages, filters)
    groups = classes.settle(stages.analysed) if classes else ()
    dropped = _dropped_rows(sheet, stages, classes, filters)
    return Selection(
        rows=np.flatnonzero(stages.analysed),
        groups=groups,
        dropped=(*dropped, *_dropped_matrix_samples(sheet, matrix_samples)),
        flow=_flow(stages, classes, groups),
        findings=(
            *_matching_findings(sheet, matrix_samples, stages.matched),
            *_outcome_findings(stages, classes),
            *_filter_findings(sheet, stages, filters),
            *findings,
            *_replicate_findings(sheet, stages, replicate_of),
        ),
    )


def _replicates(sheet: Sheet, column: str | None) -> tuple[Mask, list[Finding]]:
    if column is None:
        return np.zeros(len(sheet.ids), dtype=bool), []
    cells = sheet.column(column, "replicate_of")
    mask = np.array(
        [
            not is_missing(cell) and cell != own
            for cell, own in zip(cells, sheet.ids, strict=True)
        ],
        dtype=bool,
    )
    unknown = sorted(set(cells[mask]) - set(sheet.ids))
    if not unknown:
        return mask, []
    finding = Finding(
        code="replicate-of-unknown-sample",
        severity="warning",
        where=f"{sheet.where}, column {column!r}",
        message=f"{len(unknown)} samples named there have no row of their own: "
        f"{quoted(unknown)}",
        next_step="Correct the ids, or leave the cell blank for the row that is to be "
        "analysed.",
    )
    return mask, [finding]


def _refuse_nothing(
    sheet: Sheet, stages: _Stages, filters: Sequence[RowFilter]
) -> None:
    if stages.analysed.any():
        return
    advice = [f.message for entry in filters for f in entry.findings]
    raise InputDataError(
        code="nothing-kept",
        where=sheet.where,
        what=f"no row is left for the analysis (of {len(sheet.ids)} rows "
        f"{stages.matched.sum()} are in the matrix, {stages.with_outcome.sum()} of "
        f"these have an outcome, {stages.kept.sum()} of these are kept, "
        f"{stages.analysed.sum()} of these are no technical replicates)",
        accepted=advice[0] if advice else "some rows have to be left",
        next_step="Look at the outcome, at keep and at replicate_of",
    )


def _dropped_rows(
    sheet: Sheet,
    stages: _Stages,
    classes: OutcomeColumn | None,
    filters: Sequence[RowFilter],
) -> list[Dropped]:
    reasons = []
    for row in np.flatnonzero(~stages.analysed):
        if not stages.matched[row]:
            reason = "not in the expression matrix"
        elif not stages.with_outcome[row]:
            reason = _outcome_reason(classes, int(row))
        elif not stages.kept[row]:
            reason = "; ".join(f.reason for f in filters if not f.passes[row])
        else:
            reason = "technical replicate"
        reasons.append(Dropped("sample", str(sheet.ids[row]), "ingest", reason))
    return reasons


def _outcome_reason(classes: OutcomeColumn | None, row: int) -> str:
    label = classes.labels[row] if classes else ""
    return f"outcome is {label!r}" if label else "no outcome"


def _dropped_matrix_samples(sheet: Sheet, samples: Sequence[str]) -> list[Dropped]:
    known = set(sheet.ids)
    return [
        Dropped("sample", name, "ingest", "not in the sample sheet")
        for name in samples
        if name not in known
    ]


def _flow(
    stages: _Stages, classes: OutcomeColumn | None, groups: tuple[str, ...]
) -> tuple[Flow, ...]:
    if classes is None:
        labels = np.full(len(stages.matched), "", dtype=object)
        names = [""]
    else:
        labels = classes.labels
        names = [*groups, *sorted({*labels} - {*groups, ""}), ""]
    entries = []
    for name in names:
        rows = np.asarray(labels == name, dtype=bool)
        entries.append(
            Flow(
                outcome_class=name,
                received=int(rows.sum()),
                matched=int((rows & stages.matched).sum()),
                with_outcome=int((rows & stages.with_outcome).sum()),
                kept=int((rows & stages.kept).sum()),
                analysed=int((rows & stages.analysed).sum()),
            )
        )
    return tuple(entries)


def _matching_findings(
    sheet: Sheet, samples: Sequence[str], matched: Mask
) -> list[Finding]:
    known = set(sheet.ids)
    only_matrix = [name for name in samples if name not in known]
    only_sheet = list(sheet.ids[~matched])
    hint = mismatch_hint(only_sheet, only_matrix, "the matrix")
    sides = (
        ("samples-not-in-sheet", only_matrix, len(samples), "samples of the matrix"),
        ("samples-not-in-matrix", only_sheet, len(sheet.ids), "rows of the sheet"),
    )
    return [
        Finding(
            code=code,
            severity="warning",
            where=sheet.where,
            message=f"{len(names)} of {total} {what} without a partner, left out: "
            f"{quoted(names)}" + (f"; {hint}" if hint else ""),
            next_step="Make the ids equal in both files if they should match.",
        )
        for code, names, total, what in sides
        if names
    ]


def _outcome_findings(stages: _Stages, classes: OutcomeColumn | None) -> list[Finding]:
    if classes is None:
        return []
    left = stages.matched & ~stages.with_outcome
    blank = int((left & (classes.labels == "")).sum())
    others = sorted({*classes.labels[left]} - {""})
    findings = []
    if blank:
        findings.append(
            Finding(
                code="outcome-blank",
                severity="info",
                where=classes.where,
                message=f"{counted(blank, 'sample has', 'samples have')} no outcome "
                "and cannot be analysed",
                next_step="Check that outcomes are not missing for a reason that has "
                "to do with the classes.",
            )
        )
    if others:
        findings.append(
            Finding(
                code="other-classes",
                severity="info",
                where=classes.where,
                message=f"{counted(int(left.sum()) - blank, 'sample', 'samples')} of "
                f"other classes left out: {quoted(others)}",
                next_step="Nothing, if only the named classes are of interest.",
            )
        )
    return findings


def _filter_findings(
    sheet: Sheet, stages: _Stages, filters: Sequence[RowFilter]
) -> list[Finding]:
    findings: list[Finding] = []
    for entry in filters:
        findings += entry.findings
        count = int((stages.with_outcome & ~entry.passes).sum())
        if count:
            findings.append(
                Finding(
                    code="rows-filtered",
                    severity="info",
                    where=f"{sheet.where}, column {entry.column!r}",
                    message=f"{counted(count, 'sample', 'samples')} left out: "
                    f"{entry.reason}",
                    next_step="Nothing, if this is the population of interest.",
                )
            )
    return findings


def _replicate_findings(
    sheet: Sheet, stages: _Stages, column: str | None
) -> list[Finding]:
    left = stages.kept & ~stages.analysed
    if not left.any():
        return []
    names = sheet.ids[left]
    return [
        Finding(
            code="technical-replicates",
            severity="info",
            where=f"{sheet.where}, column {column!r}",
            message="left out of the analysis as technical replicates: "
            f"{counted(len(names), 'sample', 'samples')} ({quoted(names)})",
            next_step="Nothing; repeated measurements are no new subjects.",
        )
    ]
