"""Samples taken from a dense or sparse matrix, on disk or in memory, in blocks."""

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import LARGEST
from panelkit.ingest.matrix_table import (
    BLOCK_BYTES,
    Note,
    Numbers,
    Positions,
    infinite_to_missing,
)
from panelkit.ingest.reader import new_matrix

__all__ = ["number_type", "take_axis"]


def number_type(kind: "np.dtype[Any]") -> "np.dtype[np.floating[Any]]":
    """Return the type in which stored numbers are held.

    Parameters
    ----------
    kind : dtype
        As stored.

    Returns
    -------
    dtype
        float32 for floating-point numbers that it holds exactly, else float64.
    """
    narrow = kind.kind == "f" and kind.itemsize <= 4
    return np.dtype(np.float32 if narrow else np.float64)


def take_axis(
    stored: Any,
    positions: Positions,
    axis: int,
    dtype: "np.dtype[np.floating[Any]]",
    where: str,
    note: Note,
) -> Numbers:
    """Return the wanted rows or columns of a stored matrix, one in each column.

    Parameters
    ----------
    stored : array, h5py.Dataset, sparse matrix or sparse dataset
        Anything two-dimensional that can be sliced.
    positions : ndarray of shape (n_taken,), int64
        Wanted rows or columns, each once.
    axis : {0, 1}
        0 for rows, 1 for columns.
    dtype : dtype
        Of the result.
    where : str
        The file or argument, for messages.
    note : callable
        Called with row, column and text of each infinite cell, which becomes NaN.

    Returns
    -------
    ndarray of shape (size of the other axis, n_taken)
        C-contiguous. Beside it only one block of the file is in memory.

    Raises
    ------
    InputDataError
        When indices of a sparse matrix lie outside it.
    RunFolderError
        When the machine has too little memory.
    """
    result = new_matrix(where, stored.shape[1 - axis], len(positions), dtype)
    place = np.full(stored.shape[axis], -1, dtype=np.int64)
    place[positions] = np.arange(len(positions))
    layout = getattr(stored, "format", None)
    if layout is None:
        _take_dense(stored, place, axis, result, note)
    else:
        if layout not in ("csr", "csc"):
            stored, layout = stored.tocsr(), "csr"
        _take_sparse(stored, layout, place, axis, result, note, where)
    return result


def _take_dense(
    stored: Any, place: Positions, axis: int, result: Numbers, note: Note
) -> None:
    for rows, columns in _blocks(stored):
        along, across = (rows, columns) if axis == 0 else (columns, rows)
        wanted = place[along] >= 0
        if not wanted.any():
            continue
        block = np.asarray(stored[rows, columns])
        block = block[wanted].T if axis == 0 else block[:, wanted]
        chosen = np.flatnonzero(wanted) + along.start

        def noted(
            other: int, turn: int, text: str, chosen: Any = chosen, start: Any = across
        ) -> None:
            one, two = int(chosen[turn]), other + start.start
            if axis == 1:
                one, two = two, one
            note(one, two, text)

        if block.dtype.kind == "f":
            block = infinite_to_missing(block, noted)
        result[across, place[chosen]] = block


def _blocks(stored: Any) -> Iterator[tuple[slice, slice]]:
    """Yield rectangles that hold whole chunks, so that none is unpacked twice."""
    n_rows, n_columns = stored.shape
    size = np.dtype(stored.dtype).itemsize
    chunks = getattr(stored, "chunks", None)
    high, wide = 1, n_columns
    if isinstance(chunks, tuple) and all(isinstance(c, int) for c in chunks):
        high, wide = chunks  # of HDF5; other libraries mean something else by it
    if high * n_columns * size <= BLOCK_BYTES:
        wide = n_columns
        high *= max(1, BLOCK_BYTES // (high * wide * size))
    else:
        wide *= max(1, BLOCK_BYTES // (high * wide * size))
    for row in range(0, n_rows, high):
        for column in range(0, n_columns, wide):
            yield (
                slice(row, min(row + high, n_rows)),
                slice(column, min(column + wide, n_columns)),
            )


def _take_sparse(
    stored: Any,
    layout: str,
    place: Positions,
    axis: int,
    result: Numbers,
    note: Note,
    where: str,
) -> None:
    major = 0 if layout == "csr" else 1
    size, limit = stored.shape[major], stored.shape[1 - major]
    for start, stop in _runs(_pointers(stored, size, where)):
        if major == axis and not (place[start:stop] >= 0).any():
            continue
        block = stored[start:stop] if major == 0 else stored[:, start:stop]
        _check_indices(block.indices, limit, where)
        if not block.has_canonical_format:
            block = block.copy()
            block.sum_duplicates()
        outer = np.repeat(np.arange(start, stop), np.diff(block.indptr))
        along, across = (
            (outer, block.indices) if major == axis else (block.indices, outer)
        )
        wanted = place[along] >= 0
        along, across, data = along[wanted], across[wanted], block.data[wanted]
        if data.dtype.kind == "f" and (np.abs(data) > LARGEST).any():
            data = data.copy()
            for entry in np.flatnonzero(np.abs(data) > LARGEST):
                one, two = int(along[entry]), int(across[entry])
                if axis == 1:
                    one, two = two, one
                note(one, two, str(data[entry]))
                data[entry] = np.nan
        result[across, place[along]] = data


def _pointers(stored: Any, size: int, where: str) -> NDArray[Any]:
    """Return where each row or column begins, checked: compiled code believes them."""
    parts = getattr(stored, "group", None)  # of a sparse matrix on disk
    if parts is None:
        parts = {name: getattr(stored, name) for name in ("data", "indices", "indptr")}
    pointers = np.asarray(parts["indptr"][:], dtype=np.int64)
    entries = parts["data"].shape[0]
    sound = (
        len(pointers) == size + 1
        and pointers[0] == 0
        and pointers[-1] == entries == parts["indices"].shape[0]
        and not (np.diff(pointers) < 0).any()
    )
    if not sound:
        raise InputDataError(
            code="wrong-file-kind",
            where=where,
            what=f"the sparse matrix contradicts itself (its pointers do not lead "
            f"through its {entries} entries)",
            accepted="pointers begin at 0, never fall and end at the last entry",
            next_step="Write the file again",
        )
    return pointers


def _runs(pointers: NDArray[Any]) -> Iterator[tuple[int, int]]:
    """Yield the first and the last row or column of blocks of a bounded size."""
    together = BLOCK_BYTES // 16  # a number, its index, and the copy of both
    start, size = 0, len(pointers) - 1
    while start < size:
        reach = np.searchsorted(pointers, pointers[start] + together, side="right")
        stop = min(max(start + 1, int(reach) - 1), size)
        yield start, stop
        start = stop


def _check_indices(indices: NDArray[Any], limit: int, where: str) -> None:
    """Refuse indices outside the matrix: compiled code would follow them anywhere."""
    if indices.size and (indices.min() < 0 or indices.max() >= limit):
        raise InputDataError(
            code="wrong-file-kind",
            where=where,
            what="the sparse matrix has entries outside its own size (index "
            f"{int(indices.min() if indices.min() < 0 else indices.max())} of {limit})",
            accepted="indices lie inside the matrix",
            next_step="Write the file again",
        )
