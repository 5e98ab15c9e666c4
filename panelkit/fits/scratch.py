"""Matrices that do not fit in memory: feature-major files, read as they are needed."""

from pathlib import Path
from typing import Any

import numpy as np

from panelkit.errors import RunFolderError, UsageError
from panelkit.fits.sources import ArraySource

__all__ = ["open_feature_major", "write_feature_major"]

TILE = 4096  # features copied at a time


def write_feature_major(matrix: Any, path: Path) -> Path:
    """Write a matrix to a feature-major scratch file, a tile of features at a time.

    Parameters
    ----------
    matrix : array_like of shape (n_samples, n_features)
        Anything that can be sliced by columns: an array, a memory map, a data set of an
        HDF5 file. float32 and float64 are kept, anything else becomes float64.
    path : Path
        The file; an existing one is replaced.

    Returns
    -------
    Path
        The same path, an .npy file of shape (n_features, n_samples).

    Raises
    ------
    UsageError
        Not a matrix.
    RunFolderError
        The file cannot be written.
    """
    if len(matrix.shape) != 2 or 0 in matrix.shape:
        raise UsageError(
            code="matrix-shape",
            where="matrix",
            what=f"an array of shape {tuple(matrix.shape)}",
            accepted="two axes, samples by features, neither empty",
            next_step="Reshape it",
        )
    kind = np.dtype(matrix.dtype)
    if kind not in (np.float32, np.float64):
        kind = np.dtype(np.float64)
    n_samples, n_features = matrix.shape
    try:
        file = np.lib.format.open_memmap(
            path, mode="w+", dtype=kind, shape=(n_features, n_samples)
        )
        for start in range(0, n_features, TILE):
            stop = min(n_features, start + TILE)
            file[start:stop] = np.asarray(matrix[:, start:stop]).T
        file.flush()
    except OSError as error:
        raise RunFolderError(
            code="cannot-write",
            where=str(path),
            what=f"cannot be written ({error.strerror or error})",
            accepted="a folder that can be written, with room for the matrix",
            next_step="Free space, or name another folder",
        ) from error
    return path


def open_feature_major(path: Path) -> ArraySource:
    """Return a source that reads a feature-major file without loading it.

    Parameters
    ----------
    path : Path
        From `write_feature_major`.

    Returns
    -------
    ArraySource
        Its base is a read-only memory map.

    Raises
    ------
    UsageError
        The file is not such a matrix, or holds values that are not finite.
    """
    try:
        base = np.load(path, mmap_mode="r", allow_pickle=False)
    except (OSError, ValueError) as error:
        raise UsageError(
            code="file-unreadable",
            where=str(path),
            what=f"cannot be read as a matrix ({error})",
            accepted="a file from write_feature_major",
            next_step="Write it again",
        ) from error
    return ArraySource(base.T)
