"""From files to a checked cohort."""

import os
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import COHORT, DESIGN, DesignKind, check_design
from panelkit.errors import UsageError
from panelkit.ingest.alignment import (
    FeatureMajor,
    Orientation,
    check_orientation,
    orient,
    refuse_strangers,
)
from panelkit.ingest.assay_sheet import assay_map, open_assays
from panelkit.ingest.cells import BadCells, is_missing
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.design_columns import design_of
from panelkit.ingest.expression_source import (
    ExpressionSource,
    open_expression,
    open_sheet,
)
from panelkit.ingest.feature_sheet import feature_columns
from panelkit.ingest.given_folds import check_given_folds
from panelkit.ingest.matched_sets import check_matched_sets
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.openings import read_openings, record_opening
from panelkit.ingest.outcome_column import OutcomeColumn, OutcomeWords
from panelkit.ingest.outcome_findings import check_outcome
from panelkit.ingest.outcome_kinds import kind_of, read_outcome
from panelkit.ingest.replicate_checks import replicates_of
from panelkit.ingest.roles import Roles
from panelkit.ingest.row_filter import RowFilter, row_filters
from panelkit.ingest.row_selection import Selection, select_rows
from panelkit.ingest.set_aside import SetAside, check_set_aside, divide, on_both_sides
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.source_file import sha256
from panelkit.ingest.tie_checks import check_ties
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding, Findings, Flow, Opening

if TYPE_CHECKING:
    import anndata
    import pandas as pd

__all__ = ["read_cohort"]

_TILE = 4096
"""Features copied together when the matrix is brought into its final order."""


def read_cohort(  # noqa: PLR0913 - one keyword for each part a column can play
    expression: "str | os.PathLike[str] | anndata.AnnData | pd.DataFrame",
    samples: "str | os.PathLike[str] | pd.DataFrame | None" = None,
    *,
    outcome: str | None = None,
    positive: object = None,
    negative: object = None,
    kind: str | None = None,
    classes: Sequence[object] = (),
    unit: str = "",
    time: str | None = None,
    event: str | None = None,
    event_value: object = None,
    censored_value: object = None,
    horizon: float | None = None,
    time_unit: str = "",
    subject: str | None = None,
    site: str | None = None,
    batch: str | None = None,
    matched_set: str | None = None,
    run_order: str | None = None,
    replicate_of: str | None = None,
    folds: str | None = None,
    design: DesignKind = DESIGN.kind,
    prevalence: float | None = None,
    features: "str | os.PathLike[str] | pd.DataFrame | None" = None,
    assays: "str | os.PathLike[str] | pd.DataFrame | None" = None,
    platforms: Sequence[str] | None = None,
    keep: Mapping[str, Any] | None = None,
    set_aside: Mapping[str, Any] | None = None,
    open_set_aside: str | None = None,
    openings: "str | os.PathLike[str] | None" = None,
    orientation: Orientation = COHORT.orientation,
    covariates: Sequence[str] = (),
    nuisance: Sequence[str] = (),
    max_bad_cells: int = COHORT.max_bad_cells,
) -> Cohort:
    """Return a checked cohort from an expression matrix and a sample sheet.

    Parameters
    ----------
    expression : path, AnnData or pandas.DataFrame
        The matrix: CSV or TSV (plain or .gz), .h5ad, or an object in memory (a data
        frame has samples in rows and sample ids as its index).
    samples : path or pandas.DataFrame, optional
        The sample sheet; ids in the column ``sample_id`` or the first one. AnnData
        brings its own (``.obs``).
    outcome : str, optional
        Column of an outcome that is two classes, more classes, or a number.
    positive, negative : object, optional
        Two classes. Scores point to `positive`, which must be named; `negative` may
        be left out when two classes remain, otherwise all others are left out.
    kind : {"binary", "classes", "number", "survival"}, optional
        None: survival with `time`, classes with `classes`, else binary.
    classes : sequence of object
        Three or more classes, in order; others are left out. With `kind` "classes"
        alone all classes of the column are taken, in the order of their names.
    unit : str
        Of a number, in words.
    time, event : str, optional
        Columns of a survival outcome: time above 0, and code.
    event_value, censored_value : object, optional
        The codes that mean event and censored; needed when they are not 1 and 0.
    horizon : float, optional
        Time up to which chances are asked for.
    time_unit : str
        Of the times, in words.
    subject, site, batch, matched_set, replicate_of : str, optional
        Columns: the person, the place, the run, the set of people matched to one
        another, and the sample of which a row is a technical replicate (such rows are
        not analysed).
    run_order : str, optional
        Column with the place in the order of measurement, a number.
    folds : str, optional
        Column with the fold in which each sample is tested.
    design : {"cohort", "case-control", "matched"}
        How people came into the study; matched needs `matched_set`.
    prevalence : float, optional
        Share of the positive class among the people that the test is meant for.
    features : path or pandas.DataFrame, optional
        The feature sheet: ``feature`` (or first column), and optionally ``symbol``,
        ``analyte``, ``role`` (marker, control, reference) and ``assayable`` (platform
        names joined by ``;``, or a column ``assayable_NAME`` for each platform).
    assays : path or pandas.DataFrame, optional
        The assay sheet: ``feature``, ``analyte``, ``assay``.
    platforms : sequence of str, optional
        Platforms that the feature sheet may name; None accepts any.
    keep : mapping, optional
        Row filter: column to accepted values, to ``{"min": ..., "max": ...}``, or to
        ``{"from": ..., "to": ...}`` with numbers or dates; ends included.
    set_aside : mapping, optional
        Rows that are not read: ``{"column": ..., "values": [...]}`` or ``{"column":
        ..., "from": ..., "to": ...}``. Neither their values nor their outcomes are
        looked at.
    open_set_aside : str, optional
        The reason for opening these rows: they, and no other, are then read, and the
        opening is recorded in `openings` before.
    openings : path, optional
        The openings file; needed for `open_set_aside`.
    orientation : {"auto", "samples-in-rows", "features-in-rows"}
        Which way round the matrix is.
    covariates, nuisance : sequence of str
        Columns that travel with the panel, and columns that must not explain it.
    max_bad_cells : int
        Non-numeric cells read as missing; more than these are an error.

    Returns
    -------
    Cohort
        Analysed samples in the order of the sheet; `findings` holds what was noticed.

    Raises
    ------
    UsageError
        When the arguments cannot be meant together.
    InputDataError
        When files cannot be read, or do not fit each other or the arguments.
    """
    check_orientation(orientation)
    words = OutcomeWords(
        outcome, kind, positive, negative, tuple(classes), unit, time, event,
        event_value, censored_value, horizon, time_unit,
    )  # fmt: skip
    roles = Roles(
        words, subject, site, batch, replicate_of, matched_set, run_order, folds,
        covariates, nuisance,
    )  # fmt: skip
    check_design(design, prevalence, matched_set, kind_of(words), "design")
    check_set_aside(set_aside)
    source = open_expression(expression)
    _refuse_turned_annotated(source, orientation)
    # AnnData says itself which side the samples are on
    known = orientation if source.annotated is None else "samples-in-rows"
    hashes: dict[str, str] = {}
    everybody = _sheet(samples, source, "samples", hashes)
    _check_roles(roles, everybody, source, max_bad_cells)
    part, opened = _part(everybody, set_aside, open_set_aside, openings)
    sheet = None if part is None else part.sheet
    column = read_outcome(sheet, words)
    filters = _filters(sheet, keep)
    feature_table = _sheet(features, source, "features", hashes)

    table = source.matrix(max_bad_cells)
    matrix, findings = orient(table, everybody, known)
    hidden = set() if part is None else set(part.hidden)
    columns, feature_findings = feature_columns(
        feature_table, matrix.features, platforms
    )
    assay_columns = None
    if assays is not None:
        read = open_assays(assays)
        assay_columns, more = assay_map(
            read.where, read.names, read.texts, matrix.features, columns
        )
        columns |= _merged(columns, assay_columns.columns(matrix.features))
        feature_findings = [*feature_findings, *read.findings, *more]
        if read.digest is not None:
            hashes["assays"] = read.digest
    selection = _select(sheet, matrix, hidden, column, filters, replicate_of)
    if source.path is not None:
        hashes["expression"] = sha256(source.path)

    cohort = _assemble(sheet, matrix, column, selection, roles)
    early = (
        *(everybody.findings if everybody else ()),
        *(feature_table.findings if feature_table else ()),
        *table.findings,
        *_bad_cells(table, hidden).findings(),
        *findings,
        *_apart(everybody, part, (subject, matched_set)),
        *selection.findings,
        *feature_findings,
    )
    cohort = replace(
        cohort,
        design=replace(cohort.design, kind=design, prevalence=prevalence),
        feature_columns=columns,
        assays=assay_columns,
        findings=Findings(early),
        sources={role: hashes[role] for role in sorted(hashes)} or None,
        replicates=replicates_of(sheet, matrix, selection, replicate_of),
        openings=opened,
    )
    if part is not None:
        cohort = replace(
            cohort,
            dropped=(*cohort.dropped, *part.dropped()),
            flow=(*cohort.flow, *part.flow()),
            set_aside=0 if part.opened else len(part.hidden),
        )
    ordered = () if run_order is None or run_order in nuisance else (run_order,)
    late = (
        *check_ties(cohort, (*nuisance, *ordered), covariates),
        *check_outcome(cohort),
        *check_matched_sets(cohort),
        *check_given_folds(cohort, folds),
        *_blank_covariates(cohort, covariates),
    )
    found = Findings((*check_cohort(cohort), *late)).ordered()
    return replace(cohort, findings=found)


def _check_roles(
    roles: Roles, sheet: Sheet | None, source: ExpressionSource, max_bad_cells: int
) -> None:
    """Refuse columns that do not exist; of another study's sheet the ids say more."""
    missing = [
        name
        for _, name in roles.columns()
        if sheet is not None and name not in sheet.columns
    ]
    if sheet is not None and missing:
        refuse_strangers(source.matrix(max_bad_cells), sheet, missing)
    roles.check(sheet)


def _part(
    sheet: Sheet | None,
    wanted: Mapping[str, Any] | None,
    reason: str | None,
    openings: "str | os.PathLike[str] | None",
) -> tuple[SetAside | None, tuple[Opening, ...]]:
    """Return the rows that may be read, and every opening so far."""
    opening = reason is not None
    if sheet is None:
        if wanted or opening:
            raise _sheet_missing("set_aside")
        return None, ()
    part = divide(sheet, wanted, opening)
    if reason is None:
        return part, () if openings is None else read_openings(openings)
    if openings is None:
        raise UsageError(
            code="openings-missing",
            where="open_set_aside",
            what="no file is named in which the opening is recorded",
            accepted="openings names the file",
            next_step="Name openings",
        )
    return part, record_opening(openings, map(str, part.sheet.ids), reason)


def _apart(
    everybody: Sheet | None, part: SetAside | None, columns: Sequence[str | None]
) -> list[Finding]:
    """Return what is said of rows set aside, and of people on both sides."""
    if everybody is None or part is None or not len(part.hidden):
        return []
    return [
        *part.findings(),
        *(
            item
            for name in columns
            if name is not None
            for item in on_both_sides(everybody, part, name)
        ),
    ]


def _merged(
    columns: Mapping[str, NDArray[np.object_]], own: Mapping[str, NDArray[np.object_]]
) -> dict[str, NDArray[np.object_]]:
    """Return the assay sheet's columns, filled up by those of the feature sheet."""
    return {
        name: np.where(text == "", columns.get(name, text), text)
        for name, text in own.items()
    }


def _bad_cells(table: MatrixTable, hidden: set[str]) -> BadCells:
    """Return the bad cells of rows that may be read."""
    visible = BadCells(table.bad_cells.where, table.bad_cells.limit)
    visible.cells += [
        cell
        for cell in table.bad_cells.cells
        if cell.row not in hidden and cell.column not in hidden
    ]
    return visible


def _refuse_turned_annotated(source: ExpressionSource, orientation: str) -> None:
    if source.annotated is not None and orientation == "features-in-rows":
        raise UsageError(
            code="orientation-fixed",
            where="orientation",
            what="AnnData has samples in rows (got 'features-in-rows')",
            accepted="'auto' and 'samples-in-rows' are accepted for AnnData",
            next_step="Transpose the object first if its .obs describes features",
        )


def _sheet(
    given: object, source: ExpressionSource, role: str, hashes: dict[str, str]
) -> Sheet | None:
    """Return the sheet that was given, else the one the expression data bring."""
    if given is None:
        return source.own_sheet("obs" if role == "samples" else "var")
    id_column = "sample_id" if role == "samples" else "feature"
    sheet, digest = open_sheet(given, role, id_column)
    if digest is not None:
        hashes[role] = digest
    return sheet


def _filters(sheet: Sheet | None, keep: Mapping[str, Any] | None) -> list[RowFilter]:
    if sheet is not None:
        return row_filters(sheet, keep)
    if keep:
        raise _sheet_missing("keep")
    return []


def _sheet_missing(where: str) -> UsageError:
    return UsageError(
        code="sample-sheet-missing",
        where=where,
        what="there is no sample sheet to filter by",
        accepted=f"{where} names columns of the sample sheet",
        next_step="Pass the sample sheet as samples",
    )


def _select(
    sheet: Sheet | None,
    matrix: FeatureMajor,
    hidden: set[str],
    column: OutcomeColumn | None,
    filters: list[RowFilter],
    replicate_of: str | None,
) -> Selection:
    if sheet is not None:
        visible = [name for name in matrix.samples if name not in hidden]
        return select_rows(sheet, visible, column, filters, replicate_of)
    count = len(matrix.samples)
    flow = Flow("", count, count, count, count, count)
    return Selection(np.arange(count), (), (), (flow,), ())


def _assemble(
    sheet: Sheet | None,
    matrix: FeatureMajor,
    column: OutcomeColumn | None,
    selection: Selection,
    roles: Roles,
) -> Cohort:
    rows = selection.rows
    ids = np.array(matrix.samples, dtype=object) if sheet is None else sheet.ids
    analysed = ids[rows]
    place = {name: position for position, name in enumerate(matrix.samples)}
    positions = np.array([place[name] for name in analysed])
    design = design_of(sheet, analysed, rows, roles)
    return Cohort(
        values=_ordered(matrix.values, positions),
        features=np.array(matrix.features, dtype=object),
        samples=analysed,
        outcome=None
        if column is None
        else column.record(rows, selection.groups, design.subject_ids[design.subject]),
        design=design,
        sample_columns={
            name: text[rows] for name, text in (sheet.columns if sheet else {}).items()
        },
        feature_columns={},
        findings=Findings(),
        dropped=selection.dropped,
        flow=selection.flow,
    )


def _ordered(
    values: NDArray[np.floating[Any]], positions: NDArray[np.int64]
) -> NDArray[np.floating[Any]]:
    """Return the samples at `positions`, feature-major and C-contiguous."""
    result = np.empty((len(values), len(positions)), dtype=values.dtype)
    for start in range(0, len(values), _TILE):
        result[start : start + _TILE] = values[start : start + _TILE][:, positions]
    return result


def _blank_covariates(cohort: Cohort, covariates: Sequence[str]) -> list[Finding]:
    findings = []
    for name in covariates:
        blank = [is_missing(cell) for cell in cohort.sample_columns[name]]
        if any(blank):
            findings.append(
                Finding(
                    code="covariate-blank",
                    severity="warning",
                    where=f"samples, column {name!r}",
                    message=f"{counted(sum(blank), 'sample has', 'samples have')} "
                    f"a blank entry: {quoted(cohort.samples[blank])}",
                    next_step="Fill them in, or leave these samples out with keep.",
                )
            )
    return findings
