"""From files to a checked cohort."""

import os
from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from panelkit.config import COHORT
from panelkit.errors import UsageError
from panelkit.ingest.alignment import (
    FeatureMajor,
    Orientation,
    check_orientation,
)
from panelkit.ingest.cells import is_missing
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.design_checks import check_ties
from panelkit.ingest.expression_source import Expressions, open_sheet
from panelkit.ingest.feature_sheet import feature_columns
from panelkit.ingest.joined_matrices import Join, open_expressions
from panelkit.ingest.matrix_table import values_of_samples
from panelkit.ingest.outcome_classes import (
    OutcomeClasses,
    check_class_sizes,
    outcome_classes,
)
from panelkit.ingest.reader import ReadOptions
from panelkit.ingest.roles import Roles, design_of, refuse_survival
from panelkit.ingest.row_filter import RowFilter, row_filters
from panelkit.ingest.row_selection import Selection, select_rows
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding, Findings, Flow, Outcome

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
    time: str | None = None,
    event: str | None = None,
    subject: str | None = None,
    site: str | None = None,
    batch: str | None = None,
    replicate_of: str | None = None,
    features: "str | os.PathLike[str] | pd.DataFrame | None" = None,
    keep: Mapping[str, Any] | None = None,
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
        Column of a binary outcome.
    positive, negative : object, optional
        Its classes. Scores point to `positive`, which must be named; `negative` may
        be left out when two classes remain, otherwise all others are left out.
    time, event : str, optional
        Survival outcomes are refused for now.
    subject, site, batch, replicate_of : str, optional
        Columns: the person, the place, the run, and the sample of which a row is a
        technical replicate (such rows are not analysed).
    features : path or pandas.DataFrame, optional
        The feature sheet: ``feature`` (or first column), and optionally ``symbol``
        and ``role`` (marker, control, reference).
    keep : mapping, optional
        Row filter: column to accepted values, or to ``{"min": ..., "max": ...}``.
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
    refuse_survival(time, event)
    check_orientation(orientation)
    roles = Roles(
        outcome, positive, negative, subject, site, batch, replicate_of, covariates,
        nuisance,
    )  # fmt: skip
    options = ReadOptions(format, layer, sheet, _path(row_names), _path(column_names))
    source = open_expressions(expression, options, join)
    hashes: dict[str, str] = {}
    own = samples is None
    known = _sheet(samples, source, "samples", hashes, orientation)
    known = source.with_origin(known, orientation, max_bad_cells)
    roles.check(known)
    classes = _classes(known, roles)
    filters = _filters(known, keep)
    feature_table = _sheet(features, source, "features", hashes, orientation)

    turned = source.turned(known, own, orientation, max_bad_cells)
    matrix = turned.matrix
    columns, feature_findings = feature_columns(
        turned.feature_sheet if features is None else feature_table, matrix.features
    )
    selection = _select(known, matrix, classes, filters, replicate_of)
    hashes.update(source.hashes())

    cohort = _assemble(known, matrix, classes, selection, roles)
    early = (*turned.findings(), *selection.findings, *feature_findings)
    cohort = replace(
        cohort,
        feature_columns=columns,
        findings=Findings(early),
        sources={role: hashes[role] for role in sorted(hashes)} or None,
    )
    late = (
        *check_ties(cohort, nuisance, covariates),
        *_blank_covariates(cohort, covariates),
    )
    found = dict.fromkeys((*check_cohort(cohort), *late))
    return replace(cohort, findings=Findings(tuple(found)))


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


def _classes(sheet: Sheet | None, roles: Roles) -> OutcomeClasses | None:
    if sheet is None or roles.outcome is None:
        return None
    return outcome_classes(sheet, roles.outcome, roles.positive, roles.negative)


def _filters(sheet: Sheet | None, keep: Mapping[str, Any] | None) -> list[RowFilter]:
    if sheet is not None:
        return row_filters(sheet, keep)
    if keep:
        raise UsageError(
            code="sample-sheet-missing",
            where="keep",
            what="there is no sample sheet to filter by",
            accepted="keep names columns of the sample sheet",
            next_step="Pass the sample sheet as samples",
        )
    return []


def _select(
    sheet: Sheet | None,
    matrix: FeatureMajor,
    classes: OutcomeClasses | None,
    filters: list[RowFilter],
    replicate_of: str | None,
) -> Selection:
    if sheet is not None:
        return select_rows(sheet, matrix.samples, classes, filters, replicate_of)
    count = len(matrix.samples)
    flow = Flow("", count, count, count, count, count)
    return Selection(np.arange(count), None, (), (flow,), ())


def _assemble(
    sheet: Sheet | None,
    matrix: FeatureMajor,
    classes: OutcomeClasses | None,
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
        outcome=_outcome(classes, selection, design.subject_ids[design.subject]),
        design=design,
        sample_columns={
            name: text[rows] for name, text in (sheet.columns if sheet else {}).items()
        },
        feature_columns={},
        findings=Findings(),
        dropped=selection.dropped,
        flow=selection.flow,
    )


def _outcome(
    classes: OutcomeClasses | None,
    selection: Selection,
    subjects: NDArray[np.object_],
) -> Outcome | None:
    if classes is None:
        return None
    labels = classes.labels[selection.rows]
    check_class_sizes(classes.where, labels, subjects)
    return Outcome(
        kind="binary",
        column=classes.column,
        negative=str(selection.negative),
        positive=classes.positive,
        values=np.asarray(labels == classes.positive, dtype=np.float64),
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
