"""From files to a checked cohort."""

import os
from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from panelkit.config import COHORT, DESIGN, DesignKind, check_design
from panelkit.errors import UsageError
from panelkit.ingest.alignment import (
    FeatureMajor,
    Orientation,
    check_orientation,
)
from panelkit.ingest.assay_sheet import assay_map, open_assays
from panelkit.ingest.cells import is_missing
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.design_columns import design_of
from panelkit.ingest.expression_source import Expressions, open_sheet
from panelkit.ingest.feature_sheet import feature_columns
from panelkit.ingest.given_folds import check_given_folds
from panelkit.ingest.joined_matrices import Join, open_expressions
from panelkit.ingest.matched_sets import check_matched_sets
from panelkit.ingest.matrix_table import values_of_samples
from panelkit.ingest.openings import read_openings, record_opening
from panelkit.ingest.outcome_column import OutcomeColumn, OutcomeWords
from panelkit.ingest.outcome_findings import check_outcome
from panelkit.ingest.outcome_kinds import kind_of, read_outcome
from panelkit.ingest.reader import ReadOptions
from panelkit.ingest.replicate_checks import replicates_of
from panelkit.ingest.roles import Roles
from panelkit.ingest.row_filter import RowFilter, row_filters
from panelkit.ingest.row_selection import Selection, select_rows
from panelkit.ingest.set_aside import SetAside, check_set_aside, divide, on_both_sides
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.tie_checks import check_ties
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding, Findings, Flow, Opening

if TYPE_CHECKING:
    import anndata
    import pandas as pd

    _Expression: TypeAlias = str | os.PathLike[str] | anndata.AnnData | pd.DataFrame

__all__ = ["read_cohort"]


def read_cohort(  # noqa: PLR0913 - one keyword for each part a column can play
    expression: "_Expression | Sequence[_Expression]",
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
    format: str | None = None,
    layer: str | None = None,
    sheet: str | None = None,
    row_names: "str | os.PathLike[str] | None" = None,
    column_names: "str | os.PathLike[str] | None" = None,
    join: Join = COHORT.join,
) -> Cohort:
    """Return a checked cohort from an expression matrix and a sample sheet.

    Parameters
    ----------
    expression : path, AnnData, pandas.DataFrame, or a list of them
        The matrix: delimited text, Parquet, Arrow or Feather, .h5ad, GCT, Matrix
        Market, an Excel workbook, or an object in memory (a data frame has samples
        in rows and sample ids as its index). Several matrices of different samples
        are joined by feature; the column ``source_file`` then says which one a
        sample came from.
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
    format : str, optional
        ``text``, ``parquet``, ``arrow``, ``h5ad``, ``gct``, ``matrix-market`` or
        ``excel``; without it the content decides.
    layer : str, optional
        Of AnnData: a layer's name, or ``raw``, in place of X.
    sheet : str, optional
        Of an Excel workbook: the sheet's name; without it the first one.
    row_names, column_names : path, optional
        Of a Matrix Market file: the files of its ids; without them they are looked
        for beside it.
    join : {"refuse", "intersection"}
        Whether several matrices with different features are an error, or the features
        of all of them are kept.

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
    options = ReadOptions(format, layer, sheet, _path(row_names), _path(column_names))
    source = open_expressions(expression, options, join)
    hashes: dict[str, str] = {}
    everybody = _sheet(samples, source, "samples", hashes, orientation)
    everybody = source.with_origin(everybody, orientation, max_bad_cells)
    _check_roles(roles, everybody, source, max_bad_cells)
    part, opened = _part(everybody, set_aside, open_set_aside, openings)
    known = None if part is None else part.sheet
    column = read_outcome(known, words)
    filters = _filters(known, keep)
    feature_table = _sheet(features, source, "features", hashes, orientation)

    turned = source.turned(everybody, samples is None, orientation, max_bad_cells)
    matrix = turned.matrix
    if features is None:
        feature_table = turned.feature_sheet
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
    selection = _select(known, matrix, hidden, column, filters, replicate_of)
    hashes.update(source.hashes())

    cohort = _assemble(known, matrix, column, selection, roles)
    repeated = replicates_of(known, matrix, selection, replicate_of)
    early = (
        *(everybody.findings if everybody else ()),
        *(feature_table.findings if feature_table else ()),
        *turned.findings(hidden),
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
        replicates=repeated,
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
    roles: Roles, sheet: Sheet | None, source: Expressions, max_bad_cells: int
) -> None:
    """Refuse columns that do not exist; of another study's sheet the ids say more."""
    missing = [
        name
        for _, name in roles.columns()
        if sheet is not None and name not in sheet.columns
    ]
    if sheet is not None and missing:
        source.refuse_strangers(sheet, missing, max_bad_cells)
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


def _path(name: "str | os.PathLike[str] | None") -> Path | None:
    return None if name is None else Path(name)


def _sheet(
    given: object,
    source: Expressions,
    role: str,
    hashes: dict[str, str],
    orientation: str,
) -> Sheet | None:
    """Return the sheet that was given, else the one the expression data bring."""
    if given is None:
        return source.sample_sheet(orientation) if role == "samples" else None
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
        values=values_of_samples(matrix.values, positions),
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
