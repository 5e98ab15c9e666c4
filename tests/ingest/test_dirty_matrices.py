"""Small matrices with random dirt: the same numbers come back, or one error says where.

What is expected is made from the cells' own texts by Python's float() and by the rules
that the documentation states, never by the reader's own parts.
"""

import bz2
import gzip
import lzma
import re
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from hypothesis import HealthCheck, event, given, settings
from hypothesis import strategies as st

from panelkit.errors import InputDataError
from panelkit.ingest.delimited import read_delimited_matrix

MISSING = ("", "NA", "NaN", "n/a", "null", "NONE", " ", "-nan")
TEXTS = (
    "ERR",
    "<5",
    "1_000",
    "inf",
    "-Infinity",
    "1e999",
    "nan(1)",
    "1 5",
    "٤",
    "1e39",
)
PACKED = {
    "plain": lambda content: content,
    "gzip": gzip.compress,
    "bzip2": bz2.compress,
    "xz": lzma.compress,
    "zstd": lambda content: pa.Codec("zstd").compress(content, asbytes=True),
}
FORMS = (repr, "{:.3f}".format, "{:.17g}".format, "{:.0f}".format, "{:+.2e}".format)
THOUSANDS = re.compile(r"[+-]?[1-9]\d{0,2},\d{3}")


@dataclass
class Dirty:
    """A file and what has to come back from it."""

    content: bytes
    rows: list
    columns: list
    values: np.ndarray
    bad: list
    ragged: int | None
    ambiguous: bool


@st.composite
def dirty(draw):
    n_rows, n_columns = draw(st.integers(3, 6)), draw(st.integers(2, 5))
    delimiter = draw(st.sampled_from(",;\t"))
    comma = delimiter != "," and draw(st.booleans())
    corner = draw(st.booleans())
    number = st.floats(-1e6, 1e6) | st.integers(-5, 5000).map(float)
    blanks = draw(st.sampled_from(["", " "]))
    rows = [f"S{place}é" for place in range(n_rows)]
    columns = [f"g {place}" for place in range(n_columns)]
    values = np.full((n_rows, n_columns), np.nan)
    bad = []
    cells = []
    chosen = draw(st.tuples(st.integers(0, n_rows - 1), st.integers(0, n_columns - 1)))
    text = draw(st.none() | st.sampled_from(TEXTS))
    for row in range(n_rows):
        line = []
        for column in range(n_columns):
            if text is not None and (row, column) == chosen:
                cell = text
                bad.append((rows[row], columns[column], text))
            elif draw(st.integers(0, 5)) == 0:
                # a column that is blank throughout cannot be told from no column
                few = MISSING if corner and column < n_columns - 1 else MISSING[1:6]
                cell = draw(st.sampled_from(few))
            else:
                cell = draw(st.sampled_from(FORMS))(draw(number))
                values[row, column] = float(cell)
                cell = blanks + cell
            line.append(cell.replace(".", ",") if comma else cell)
        cells.append(line)
    written = [cell.strip() for line in cells for cell in line if "," in cell]
    lines = [[*(["id"] if corner else []), *columns]]
    lines += [[name, *line] for name, line in zip(rows, cells, strict=True)]
    quoted = draw(st.sampled_from(["none", "ids", "all"]))
    texts = [_line(line, delimiter, quoted) for line in lines]
    padding = delimiter * draw(st.integers(0, 2))
    texts = [line + padding for line in texts]
    ragged = None
    if draw(st.integers(0, 4)) == 0:
        ragged = draw(st.integers(2, n_rows))
        texts[ragged] = draw(
            st.sampled_from([texts[ragged] + delimiter + "7", "S9" + delimiter + "1"])
        )
    before = draw(st.lists(st.sampled_from(["# x,y;z\tw", "!n", "Title", ""])))
    after = draw(st.lists(st.sampled_from(["", delimiter * 2, "#end"]), max_size=2))
    end = draw(st.sampled_from(["\n", "\r\n", "\r"]))
    codec = draw(st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "cp1252"]))
    if text == "٤" and codec == "cp1252":
        codec = "utf-8"
    zeros = "\0" * draw(st.sampled_from([0, 0, 3]))
    whole = end.join([*before, *texts, *after]) + draw(st.sampled_from(["", end]))
    pack = PACKED[draw(st.sampled_from(sorted(PACKED)))]
    return Dirty(
        pack((whole + zeros).encode(codec)),
        rows,
        columns,
        values,
        bad,
        None if ragged is None else len(before) + ragged + 1,
        bool(comma and written and all(map(THOUSANDS.fullmatch, written))),
    )


def _line(fields, delimiter, quoted):
    if quoted == "all":
        fields = [f'"{field}"' for field in fields]
    elif quoted == "ids":
        fields = [f'"{fields[0]}"', *fields[1:]]
    return delimiter.join(fields)


def read(path):
    try:
        return read_delimited_matrix(path, 10), None
    except InputDataError as error:
        return None, error


@settings(
    max_examples=100,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)
@given(made=dirty())
def test_dirt_changes_no_number_or_is_named(tmp_path, made):
    path = tmp_path / "dirty"
    path.write_bytes(made.content)
    table, error = read(path)
    if error is not None:
        event(error.code)
        assert "\n" not in str(error)
        if made.ragged is not None:
            assert error.code == "line-length-differs"
            assert error.where == f"dirty, line {made.ragged}"
        else:
            assert made.ambiguous
            assert error.code == "decimal-mark-ambiguous"
        return
    assert made.ragged is None
    assert not made.ambiguous
    assert table.row_ids == made.rows
    assert table.column_ids == made.columns
    assert np.array_equal(table.values, made.values, equal_nan=True)
    assert np.array_equal(np.signbit(table.values), np.signbit(made.values)) or (
        np.isnan(made.values).any()
    )
    found = [(cell.row, cell.column, cell.text) for cell in table.bad_cells.cells]
    assert found == made.bad
