"""AnnData, in memory or on disk: .obs and .var as sheets, the matrix in blocks."""

import sys
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from typing import Any, NoReturn

import numpy as np

from panelkit.errors import InputDataError
from panelkit.ingest.cells import BadCells
from panelkit.ingest.data_frames import index_sheet
from panelkit.ingest.matrix_table import (
    DeferredValues,
    MatrixTable,
    Numbers,
    Positions,
    cell_notes,
)
from panelkit.ingest.reader import OpenedMatrix
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.stored_matrix import number_type, take_axis
from panelkit.ingest.wording import nearest_hint, quoted
from panelkit.records import Finding

__all__ = [
    "Annotated",
    "is_anndata",
    "open_annotated",
    "open_object",
    "refuse_layer",
]


@dataclass(frozen=True, slots=True, eq=False)
class Annotated:
    """A matrix with its two tables.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    obs, var : pandas.DataFrame
        Their indices are the ids of rows and columns.
    place : str
        What the matrix is called there, for messages.
    opened : callable
        Gives a context in which the matrix, dense or sparse, can be sliced.
    """

    where: str
    obs: Any
    var: Any
    place: str
    opened: Callable[[], AbstractContextManager[Any]]


def is_anndata(value: object) -> bool:
    """Return whether a value is an AnnData object, without importing anndata.

    Parameters
    ----------
    value : object
        Anything.

    Returns
    -------
    bool
        False while anndata is not loaded: then nobody can hold such an object.
    """
    anndata = sys.modules.get("anndata")
    return anndata is not None and isinstance(value, anndata.AnnData)


def open_object(annotated: Any, layer: str | None) -> OpenedMatrix:
    """Return an AnnData object opened: in memory, backed by its file, or a view.

    Parameters
    ----------
    annotated : anndata.AnnData
        The object.
    layer : str or None
        A layer's name, or ``raw``; None is X.

    Returns
    -------
    OpenedMatrix
        Samples on rows.

    Raises
    ------
    InputDataError
        When there is no such layer, or what is there are no numbers.
    """
    where = "expression (AnnData)"
    if annotated.isbacked and annotated.is_view:
        annotated = annotated.to_memory()
    var, place = annotated.var, "X" if layer is None else layer
    if layer is None:
        stored = annotated.X
    elif layer in annotated.layers:
        stored = annotated.layers[layer]
    elif layer == "raw" and annotated.raw is not None:
        stored, var = annotated.raw.X, annotated.raw.var
    else:
        stored = None
    if stored is None:
        known = [*annotated.layers, *(["raw"] if annotated.raw is not None else [])]
        refuse_layer(where, layer, known)
    return open_annotated(
        Annotated(where, annotated.obs, var, place, lambda: nullcontext(stored))
    )


def refuse_layer(where: str, layer: str | None, known: list[str]) -> NoReturn:
    """Refuse data that lack the matrix that was asked for.

    Parameters
    ----------
    where : str
        The file or argument.
    layer : str or None
        What was asked for, None for X.
    known : list of str
        Layers that there are.

    Raises
    ------
    InputDataError
        Always.
    """
    accepted = f"its layers are {quoted(known)}" if known else "it has no layers"
    if layer is None:
        raise InputDataError(
            code="matrix-empty",
            where=where,
            what="X holds no numbers (got no X)",
            accepted=f"X is a matrix of numbers, samples by features; {accepted}",
            next_step="Name one of its layers as layer"
            if known
            else "Put the expression values into X",
        )
    raise InputDataError(
        code="layer-missing",
        where=where,
        what=f"there is no layer {layer!r}",
        accepted=f"{nearest_hint(layer, known)}{accepted}",
        next_step="Name one of them as layer" if known else "Leave out layer to read X",
    )


def open_annotated(source: Annotated) -> OpenedMatrix:
    """Return annotated data opened; the matrix is read when samples are chosen.

    Parameters
    ----------
    source : Annotated
        The tables, and a way to the matrix.

    Returns
    -------
    OpenedMatrix
        Samples on rows.

    Raises
    ------
    InputDataError
        When matrix and tables differ in size, or the matrix holds no numbers.
    """
    where = source.where
    with source.opened() as stored:
        shape, kind = tuple(stored.shape), np.dtype(stored.dtype)
    if len(shape) != 2 or 0 in shape or kind.kind not in "iufb":
        raise InputDataError(
            code="matrix-empty",
            where=where,
            what=f"{source.place} holds no numbers (got shape {shape}, {kind})",
            accepted="a matrix of real numbers, samples by features",
            next_step="Put the expression values into X",
        )
    if shape != (len(source.obs), len(source.var)):
        raise InputDataError(
            code="dimensions-differ",
            where=where,
            what=f"{source.place} has {shape[0]} rows and {shape[1]} columns, the "
            f"tables name {len(source.obs)} rows and {len(source.var)} columns",
            accepted="one name for each row and each column",
            next_step="Write the file again",
        )
    row_ids = [str(name) for name in source.obs.index]
    column_ids = [str(name) for name in source.var.index]
    dtype = number_type(kind)

    def table(max_bad_cells: int) -> MatrixTable:
        bad_cells = BadCells(where, max_bad_cells)
        note = cell_notes(bad_cells, row_ids, column_ids)

        def take(positions: Positions, axis: int) -> Numbers:
            with source.opened() as stored:
                return take_axis(stored, positions, axis, dtype, where, note)

        values = DeferredValues(shape, lambda p: take(p, 0), lambda p: take(p, 1))
        findings = (
            *_numbered(f"{where}, .obs", row_ids),
            *_numbered(f"{where}, .var", column_ids),
        )
        return MatrixTable(where, row_ids, column_ids, values, bad_cells, findings)

    def sheet(part: str, frame: Any) -> Sheet:
        return index_sheet(frame, f"{where}, .{part}")

    return OpenedMatrix(
        where,
        table,
        "rows",
        lambda: sheet("obs", source.obs),
        lambda: sheet("var", source.var),
        fixed=True,
    )


def _numbered(where: str, ids: list[str]) -> Iterator[Finding]:
    """Say that ids are mere row numbers: AnnData makes them up where there are none."""
    if len(ids) > 1 and all(name == str(row) for row, name in enumerate(ids)):
        yield Finding(
            code="names-are-numbers",
            severity="warning",
            where=where,
            message=f"the {len(ids):,} names are the numbers 0 to {len(ids) - 1:,}: "
            "the real ones seem to be lost",
            next_step="Set the index of the table to the names before writing it.",
        )
