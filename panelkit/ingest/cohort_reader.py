"""From files to a checked cohort."""

import os
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import COHORT
from panelkit.errors import UsageError
from panelkit.ingest.alignment import (
    FeatureMajor,
    Orientation,
    check_orientation,
    orient,
)
from panelkit.ingest.cells import is_missing
from panelkit.ingest.checks import check_cohort
from panelkit.ingest.expression_source import (
    ExpressionSource,
    open_expression,
    open_sheet,
)
from panelkit.ingest.feature_sheet import feature_columns
from panelkit.ingest.outcome_classes import (
    OutcomeClasses,
    check_class_sizes,
    outcome_classes,
)
from panelkit.ingest.replicate_checks import replicates_of
from panelkit.ingest.roles import Roles, design_of, refuse_survival
from panelkit.ingest.row_filter import RowFilter, row_filters
from panelkit.ingest.row_selection import Selection, select_rows
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.source_file import sha256
from panelkit.ingest.tie_checks import check_ties
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Cohort, Finding, Findings, Flow, Outcome

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
    source = open_expression(expression)
    _refuse_turned_annotated(source, orientation)
    hashes: dict[str, str] = {}
    sheet = _sheet(samples, source, "samples", hashes)
    roles.check(sheet)
    classes = _classes(sheet, roles)
    filters = _filters(sheet, keep)
    feature_table = _sheet(features, source, "features", hashes)

    table = source.matrix(max_bad_cells)
    # AnnData says itself which side the samples are on
    known = orientation if source.annotated is None else "samples-in-rows"
    matrix, findings = orient(table, sheet, known)
    columns, feature_findings = feature_columns(feature_table, matrix.features)
    selection = _select(sheet, matrix, classes, filters, replicate_of)
    if source.path is not None:
        hashes["expression"] = sha256(source.path)

    cohort = _assemble(sheet, matrix, classes, selection, roles)
    early = (
        *(sheet.findings if sheet else ()),
        *(feature_table.findings if feature_table else ()),
        *table.findings,
        *table.bad_cells.findings(),
        *findings,
        *selection.findings,
        *feature_findings,
    )
    cohort = replace(
        cohort,
        feature_columns=columns,
        findings=Findings(early),
        sources={role: hashes[role] for role in sorted(hashes)} or None,
        replicates=replicates_of(sheet, matrix, selection, replicate_of),
    )
    late = (
        *check_ties(cohort, nuisance, covariates),
        *_blank_covariates(cohort, covariates),
    )
    found = Findings((*check_cohort(cohort), *late)).ordered()
    return replace(cohort, findings=found)


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
        values=_ordered(matrix.values, positions),
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


def _ordered(
    values: NDArray[np.floating[Any]], positions: NDArray[np.int64]
) -> NDArray[np.floating[Any]]:
    """Return the samples at `positions`, feature-major and C-contiguous."""
    result = np.empty((len(values), len(positions)), dtype=values.dtype)
    for start in range(0, len(values), _TILE):
        result[start : start + _TILE] = values[start : start + _TILE][:, positions]
    return result


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
