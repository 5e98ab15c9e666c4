"""Parquet and Arrow files: columns in batches, into a matrix of its own layout."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import BadCells, cell_number
from panelkit.ingest.matrix_table import (
    BLOCK_BYTES,
    DeferredValues,
    MatrixTable,
    Note,
    Numbers,
    Positions,
    cell_notes,
    infinite_to_missing,
    truth_findings,
)
from panelkit.ingest.reader import (
    OpenedMatrix,
    ReadOptions,
    new_matrix,
    refuse_oversized,
    refuse_unreadable,
)
from panelkit.ingest.wording import as_text, quoted
from panelkit.records import Finding

__all__ = ["ArrowReader", "ParquetReader"]

_WIDE = 5000
"""Columns from which the layout is slow enough to be spoken of."""
_MOST_COLUMNS = 500
"""Columns decoded together; more are not faster."""
_ID_NAMES = ("sample_id", "feature")


@dataclass(frozen=True, slots=True, eq=False)
class _Columns:
    """A columnar file of either kind.

    `read` takes ascending positions of columns and returns an Arrow table of them;
    `release` gives back what the open file holds, which for many columns is more than
    the matrix.
    """

    path: Path
    title: str
    n_rows: int
    read: Callable[[Sequence[int]], Any]
    release: Callable[[], None]


class ParquetReader:
    """Reads Parquet files; satisfies `Reader`."""

    name = "parquet"
    title = "a Parquet file"
    suffixes = (".parquet", ".pq")
    takes: frozenset[str] = frozenset()

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the file begins as the Parquet specification says."""
        return start.startswith(b"PAR1")

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened: schema and ids, no numbers yet.

        Parameters
        ----------
        path : Path
            The file.
        options : ReadOptions
            None of them concerns Parquet.

        Returns
        -------
        OpenedMatrix
            Ready to be read.

        Raises
        ------
        InputDataError
            When the file is damaged, has no column of ids, or columns hold no numbers.
        """
        import pyarrow as pa
        from pyarrow import parquet

        held: list[Any] = []

        def opened() -> Any:
            if not held:
                held.append(parquet.ParquetFile(path))
            return held[0]

        def read(positions: Sequence[int]) -> Any:
            file = opened()
            groups = list(range(file.metadata.num_row_groups))
            # by position: by name every call would search all names
            return file.reader.read_row_groups(groups, column_indices=list(positions))

        try:
            n_rows, schema = opened().metadata.num_rows, opened().schema_arrow
        except (pa.ArrowException, OSError, ValueError) as error:
            refuse_unreadable(path, self.title, error)
        made = _opened(_Columns(path, self.title, n_rows, read, held.clear), schema)
        held.clear()  # what reading the schema left scattered goes with it
        return made


class ArrowReader:
    """Reads Arrow IPC files (Feather version 2) and streams; satisfies `Reader`."""

    name = "arrow"
    title = "an Arrow file"
    suffixes = (".arrow", ".feather", ".arrows")
    takes: frozenset[str] = frozenset()

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the file begins as the Arrow specification says."""
        return start.startswith((b"ARROW1", b"\xff\xff\xff\xff"))

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened: schema and ids, no numbers yet.

        Parameters
        ----------
        path : Path
            The file.
        options : ReadOptions
            None of them concerns Arrow.

        Returns
        -------
        OpenedMatrix
            Ready to be read.

        Raises
        ------
        InputDataError
            When the file is damaged, has no column of ids, or columns hold no numbers.
        """
        import pyarrow as pa

        try:
            source = pa.memory_map(str(path))
            is_file = source.read(6) == b"ARROW1"
            source.seek(0)
            opening = pa.ipc.open_file if is_file else pa.ipc.open_stream
            schema = opening(source).schema
            n_rows = sum(
                batch.num_rows for batch in _arrow_batches(path, [], len(schema))
            )
        except (pa.ArrowException, OSError, ValueError) as error:
            refuse_unreadable(path, self.title, error)

        def read(positions: Sequence[int]) -> Any:
            wanted = list(positions)
            batches = list(_arrow_batches(path, wanted, len(schema)))
            part = pa.schema([schema.field(position) for position in wanted])
            return pa.Table.from_batches(batches, part)

        def release() -> None:
            """Nothing is held between two calls."""

        return _opened(_Columns(path, self.title, n_rows, read, release), schema)


def _arrow_batches(path: Path, wanted: list[int], n_columns: int) -> Iterator[Any]:
    """Yield record batches with the wanted columns, or the first one for none."""
    import pyarrow as pa

    fields = wanted or list(range(min(1, n_columns)))
    options = pa.ipc.IpcReadOptions(included_fields=fields)
    source = pa.memory_map(str(path))
    is_file = source.read(6) == b"ARROW1"
    source.seek(0)
    if is_file:
        reader = pa.ipc.open_file(source, options=options)
        for number in range(reader.num_record_batches):
            yield reader.get_batch(number)
    else:
        yield from pa.ipc.open_stream(source, options=options)


def _opened(columns: _Columns, schema: Any) -> OpenedMatrix:
    """Return a file of either kind opened, its schema and ids checked."""
    names = list(schema.names)
    where = columns.path.name
    if columns.n_rows == 0 or len(names) < 2:
        raise InputDataError(
            code="matrix-empty",
            where=where,
            what=f"there is no matrix (got {columns.n_rows} rows and {len(names)} "
            "columns)",
            accepted="a column of ids and columns of numbers are needed",
            next_step="Write the file again",
        )
    place = _id_position(schema, where)
    numeric = [position for position in range(len(names)) if position != place]
    kinds = [schema.field(position).type for position in numeric]
    column_ids = [names[position] for position in numeric]
    _refuse_kinds(where, column_ids, kinds)
    dtype = _common_type(kinds)
    refuse_oversized(where, columns.n_rows, len(numeric))
    row_ids = _ids(columns, place)
    truths = [
        name
        for name, kind in zip(column_ids, kinds, strict=True)
        if str(_plain(kind)) == "bool"
    ]
    findings = (*truth_findings(where, truths), *_wide(columns, len(names)))

    def table(max_bad_cells: int) -> MatrixTable:
        bad_cells = BadCells(where, max_bad_cells)
        note = cell_notes(bad_cells, row_ids, column_ids)

        def numbers(chosen: Positions) -> Iterator[tuple[int, Numbers]]:
            return _numbers(columns, [numeric[p] for p in chosen], chosen, note)

        def take_rows(positions: Positions) -> Numbers:
            result = new_matrix(where, len(numeric), len(positions), dtype)
            for column, values in numbers(np.arange(len(numeric))):
                result[column] = values[positions]
            return result

        def take_columns(positions: Positions) -> Numbers:
            result = new_matrix(where, len(row_ids), len(positions), dtype)
            order = np.argsort(positions)
            for turn, (_, values) in enumerate(numbers(positions[order])):
                result[:, order[turn]] = values
            return result

        values = DeferredValues((len(row_ids), len(numeric)), take_rows, take_columns)
        return MatrixTable(where, row_ids, column_ids, values, bad_cells, findings)

    return OpenedMatrix(where, table)


def _id_position(schema: Any, where: str) -> int:
    """Return the position of the ids: the index of pandas, or the first text column."""
    import pyarrow as pa

    names = list(schema.names)
    index = [
        name
        for name in (schema.pandas_metadata or {}).get("index_columns", ())
        if isinstance(name, str)
    ]
    if len(index) > 1:
        raise InputDataError(
            code="ids-not-found",
            where=where,
            what=f"the rows have {len(index)} indices ({quoted(index)})",
            accepted="one index or one column of ids is needed",
            next_step="Reset the index and keep one column of ids",
        )
    if index and names.count(index[0]) == 1:
        return names.index(index[0])
    for position, kind in enumerate(schema.types):
        plain = kind.value_type if pa.types.is_dictionary(kind) else kind
        if _is_text(plain):
            return position
    for name in _ID_NAMES:
        if names.count(name) == 1:
            return names.index(name)
    raise InputDataError(
        code="ids-not-found",
        where=where,
        what=f"no column holds ids: none of the {len(names)} columns is text, and "
        "there is no pandas index",
        accepted="ids are the pandas index, the first text column, or a column called "
        "sample_id or feature",
        next_step="Write the file with its index or with a column of ids",
    )


def _is_text(kind: Any) -> bool:
    import pyarrow as pa

    types = pa.types
    return bool(
        types.is_string(kind) or types.is_large_string(kind) or kind == pa.string_view()
    )


def _is_number(kind: Any) -> bool:
    import pyarrow as pa

    types = pa.types
    return bool(
        types.is_floating(kind)
        or types.is_integer(kind)
        or types.is_decimal(kind)
        or types.is_boolean(kind)
        or types.is_null(kind)
    )


def _plain(kind: Any) -> Any:
    import pyarrow as pa

    return kind.value_type if pa.types.is_dictionary(kind) else kind


def _refuse_kinds(where: str, names: list[str], kinds: list[Any]) -> None:
    """Refuse columns that no cell of which can be a number."""
    wrong = [
        f"{name} ({kind})"
        for name, kind in zip(names, kinds, strict=True)
        if not (_is_number(_plain(kind)) or _is_text(_plain(kind)))
    ]
    if wrong:
        raise InputDataError(
            code="columns-not-numeric",
            where=where,
            what=f"{len(wrong)} columns hold neither numbers nor text: {quoted(wrong)}",
            accepted="columns of the matrix hold one number a row, or text that is one",
            next_step="Take these columns out, or write their numbers one a cell",
        )


def _common_type(kinds: list[Any]) -> "np.dtype[np.floating[Any]]":
    """Return float32 when that holds every number exactly, else float64."""
    narrow = ("halffloat", "float", "null")
    alike = {str(_plain(kind)) for kind in kinds}
    # one narrow float is needed: columns of nothing alone say nothing
    short = alike <= set(narrow) and alike != {"null"}
    return np.dtype(np.float32 if short else np.float64)


def _ids(columns: _Columns, place: int) -> list[str]:
    import pyarrow as pa

    try:
        column = columns.read([place]).column(0)
    except (pa.ArrowException, OSError, ValueError) as error:
        refuse_unreadable(columns.path, columns.title, error)
    return [as_text(value) for value in column.to_pylist()]


def _numbers(
    columns: _Columns, wanted: list[int], labels: Positions, note: Note
) -> Iterator[tuple[int, Numbers]]:
    """Yield the label and the numbers of each wanted column; `wanted` is ascending."""
    import pyarrow as pa

    together = max(1, min(_MOST_COLUMNS, BLOCK_BYTES // (8 * columns.n_rows)))
    for start in range(0, len(wanted), together):
        part = wanted[start : start + together]
        try:
            table = columns.read(part)
        except (pa.ArrowException, OSError, ValueError) as error:
            refuse_unreadable(columns.path, columns.title, error)
        for turn in range(len(part)):
            label = int(labels[start + turn])
            yield label, _column_numbers(table.column(turn), label, note)
    columns.release()


def _column_numbers(column: Any, label: int, note: Note) -> Numbers:
    """Return one column as floating-point numbers, NaN where nothing stands."""
    import pyarrow as pa

    kind = column.type
    if pa.types.is_dictionary(kind):
        column = column.cast(kind.value_type)
        kind = column.type
    if pa.types.is_null(kind):
        return np.full(len(column), np.nan, np.float32)
    if pa.types.is_boolean(kind):
        column = column.cast(pa.uint8())
    elif pa.types.is_decimal(kind):  # Arrow's own conversion rounds twice
        exact = [np.nan if value is None else value for value in column.to_pylist()]
        return _in_range(np.array([float(value) for value in exact]), label, note)
    elif _is_text(kind):
        return _text_numbers(column.to_pylist(), label, note)
    values: NDArray[Any] = column.to_numpy()
    if values.dtype.kind != "f":
        values = values.astype(np.float64)
    elif values.dtype.itemsize < 4:
        values = values.astype(np.float32)
    return _in_range(values, label, note)


def _in_range(values: Numbers, label: int, note: Note) -> Numbers:
    """Return one column with numbers beyond single precision noted as missing."""
    return infinite_to_missing(
        values[:, None], lambda row, _, text: note(row, label, text)
    )[:, 0]


def _text_numbers(cells: list[str | None], label: int, note: Note) -> Numbers:
    values = np.empty(len(cells))
    for row, cell in enumerate(cells):
        number = cell_number(cell or "")
        if number is None:
            note(row, label, str(cell))
            number = np.nan
        values[row] = number
    return values


def _wide(columns: _Columns, count: int) -> Iterator[Finding]:
    if count > _WIDE:
        yield Finding(
            code="many-columns-slow",
            severity="info",
            where=columns.path.name,
            message=f"{columns.title} with {count:,} columns is slow to read in "
            "every program, since each column is stored by itself",
            next_step="Store it with features in rows, or as .h5ad, to read it faster.",
        )
