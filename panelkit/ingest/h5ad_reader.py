"""AnnData's .h5ad files: sheets through anndata, the matrix in blocks."""

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from panelkit.errors import InputDataError
from panelkit.ingest.annotated import Annotated, open_annotated, refuse_layer
from panelkit.ingest.reader import (
    OpenedMatrix,
    ReadOptions,
    refuse_oversized,
    refuse_unreadable,
)
from panelkit.ingest.wording import quoted

__all__ = ["H5adReader"]


class H5adReader:
    """Reads .h5ad files; satisfies `Reader`."""

    name = "h5ad"
    title = "an .h5ad file"
    suffixes = (".h5ad", ".h5", ".hdf5")
    takes = frozenset({"layer"})

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the file begins as the HDF5 specification says."""
        return start.startswith(b"\x89HDF\r\n\x1a\n")

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened: names, .obs and .var, no numbers yet.

        Parameters
        ----------
        path : Path
            The file.
        options : ReadOptions
            May name a layer, or ``raw``.

        Returns
        -------
        OpenedMatrix
            Samples on rows, as AnnData has them.

        Raises
        ------
        InputDataError
            When the file is damaged, points to other files, holds no AnnData or not
            the asked layer.
        """
        import h5py

        with _damage(path, _OPENING), h5py.File(path, "r") as file:
            _refuse_links(path, file)
            place, names_of = _place(path, file, options.layer)
            shape = _shape(path, file, place)
            refuse_oversized(path.name, *shape)
            obs, var = _frame(path, file, "obs"), _frame(path, file, names_of)
        where = path.name

        @contextmanager
        def opened() -> Iterator[Any]:
            with _damage(path, _READING), h5py.File(path, "r") as file:
                yield _stored(file, place)

        return open_annotated(Annotated(where, obs, var, place, opened))


_READING = (OSError, KeyError, ValueError, RuntimeError)
"""What h5py raises where bytes of a file are not as they should be."""
_OPENING = (*_READING, TypeError, AttributeError, IndexError)
"""What anndata raises where the layout of a file is not as it should be."""


@contextmanager
def _damage(path: Path, kinds: tuple[type[Exception], ...]) -> Iterator[None]:
    """Turn what h5py and anndata say about damaged files into one sentence."""
    try:
        with warnings.catch_warnings():
            # older files are read as they are; repeated names are refused by us
            warnings.simplefilter("ignore")
            yield
    except kinds as error:
        refuse_unreadable(path, H5adReader.title, error)


def _refuse_links(path: Path, file: Any) -> None:
    """Refuse whatever would make HDF5 open another file than the one named."""
    import h5py

    found: list[str] = []

    def visit(name: str, link: Any) -> None:
        if isinstance(link, h5py.ExternalLink):
            found.append(f"{name} (a link to {link.filename})")
        elif isinstance(link, h5py.HardLink):
            item = file[name]
            if isinstance(item, h5py.Dataset) and (item.external or item.is_virtual):
                found.append(f"{name} (its numbers lie in another file)")

    file.visititems_links(visit)
    if found:
        raise InputDataError(
            code="external-link",
            where=path.name,
            what=f"the file points to other files: {quoted(found)}",
            accepted="all data lie in the file itself",
            next_step="Write the file again with the data inside",
        )


def _place(path: Path, file: Any, layer: str | None) -> tuple[str, str]:
    """Return where in the file the matrix and the names of its columns stand."""
    layers = list(file["layers"]) if "layers" in file else []
    if layer is None:
        place, names_of = "X", "var"
    elif layer == "raw" and "raw" not in layers:
        place, names_of = "raw/X", "raw/var"
    else:
        place, names_of = f"layers/{layer}", "var"
    if place not in file or (place.startswith("layers") and layer not in layers):
        known = [*layers, *(["raw"] if "raw/X" in file else [])]
        refuse_layer(path.name, layer, known)
    return place, names_of


def _shape(path: Path, file: Any, place: str) -> tuple[int, int]:
    """Return rows and columns of the stored matrix, whatever its layout."""
    import h5py

    item = file[place]
    if isinstance(item, h5py.Dataset):
        shape = item.shape
    elif item.attrs.get("encoding-type") in ("csr_matrix", "csc_matrix"):
        shape = tuple(int(size) for size in item.attrs["shape"])
    elif "h5sparse_format" in item.attrs:
        shape = tuple(int(size) for size in item.attrs["h5sparse_shape"])
    else:
        raise InputDataError(
            code="wrong-file-kind",
            where=f"{path.name}, {place}",
            what=f"this is a group of {quoted(item) if len(item) else 'nothing'}, no "
            "matrix",
            accepted="a dense matrix or a sparse one by rows or columns",
            next_step="Write the file again with AnnData's write_h5ad",
        )
    if len(shape) != 2:
        raise InputDataError(
            code="matrix-empty",
            where=f"{path.name}, {place}",
            what=f"this is no matrix (got shape {shape})",
            accepted="a matrix of numbers, samples by features",
            next_step="Put the expression values into X",
        )
    return int(shape[0]), int(shape[1])


def _frame(path: Path, file: Any, name: str) -> Any:
    """Return .obs or .var as a data frame."""
    import h5py
    from anndata.io import read_elem

    item = file.get(name)
    if isinstance(item, h5py.Dataset):
        raise InputDataError(
            code="wrong-file-kind",
            where=f"{path.name}, {name}",
            what="the table is stored as AnnData did before version 0.7",
            accepted="files of AnnData 0.7 or later",
            next_step="Read the file with AnnData and write it again with write_h5ad",
        )
    index = None if item is None else item.attrs.get("_index")
    if index is None or index not in item:
        raise InputDataError(
            code="names-missing",
            where=f"{path.name}, {name}",
            what="the table is missing"
            if item is None
            else "the table has no index, so nothing says what its rows are",
            accepted="obs and var are tables with an index of names",
            next_step="Write the file again with AnnData's write_h5ad",
        )
    return read_elem(item)


def _stored(file: Any, place: str) -> Any:
    """Return the matrix on disk; a slice of rows or columns reads that part."""
    import h5py
    from anndata.io import sparse_dataset

    item = file[place]
    return item if isinstance(item, h5py.Dataset) else sparse_dataset(item)
