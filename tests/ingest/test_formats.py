"""Every format, written by another program, comes back with the same numbers."""

import gzip
import json

import anndata
import h5py
import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pyarrow.feather
import pyarrow.parquet
import pytest
import scipy.io
from scipy import sparse

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest import ReadOptions, format_names, readers, register_reader
from panelkit.ingest.cells import BadCells
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.reader import OpenedMatrix


def write_parquet(folder, matrix):
    path = folder / "matrix.parquet"
    matrix.to_parquet(path, row_group_size=7)  # pandas, several row groups
    return path


def write_arrow_parquet(folder, matrix):
    """By pyarrow alone: no pandas metadata, ids in the first text column."""
    path = folder / "matrix.pq"
    columns = {"id": list(matrix.index)}
    columns |= {name: matrix[name].to_numpy() for name in matrix.columns}
    pa.parquet.write_table(pa.table(columns), path)
    return path


def write_feather(folder, matrix):
    path = folder / "matrix.feather"
    table = pa.Table.from_pandas(matrix)
    pa.feather.write_feather(table, path, compression="lz4", chunksize=5)
    return path


def write_arrow_stream(folder, matrix):
    path = folder / "matrix.arrows"
    table = pa.Table.from_pandas(matrix)
    with pa.ipc.new_stream(path, table.schema) as stream:
        stream.write_table(table, max_chunksize=5)
    return path


def write_h5ad(folder, matrix):
    path = folder / "matrix.h5ad"
    obs, var = pd.DataFrame(index=matrix.index), pd.DataFrame(index=matrix.columns)
    anndata.AnnData(X=matrix.to_numpy(), obs=obs, var=var).write_h5ad(path)
    return path


def write_gct(folder, matrix):
    path = folder / "matrix.gct"
    body = matrix.copy()
    body.insert(0, "Description", "na")
    with path.open("w") as text:
        text.write(f"#1.2\n{matrix.shape[0]}\t{matrix.shape[1]}\n")
        body.to_csv(text, sep="\t", index_label="NAME")
    return path


def write_market(folder, matrix):
    """As is common for counts: rows are called features, columns barcodes."""
    path = folder / "matrix.mtx"
    scipy.io.mmwrite(path, sparse.coo_array(matrix.to_numpy()), precision=17)
    (folder / "features.tsv").write_text("\n".join(matrix.index) + "\n")
    (folder / "barcodes.tsv").write_text("\n".join(matrix.columns) + "\n")
    return path


def write_market_array(folder, matrix):
    path = write_market(folder, matrix)
    scipy.io.mmwrite(path, matrix.to_numpy(), precision=17)
    packed = path.with_suffix(".mtx.gz")
    packed.write_bytes(gzip.compress(path.read_bytes()))
    path.unlink()
    return packed


def write_excel(folder, matrix):
    """By pandas through openpyxl, which writes 16 digits: one may get lost."""
    path = folder / "matrix.xlsx"
    matrix.to_excel(path)
    return path


WRITERS = [
    write_parquet,
    write_arrow_parquet,
    write_feather,
    write_arrow_stream,
    write_h5ad,
    write_gct,
    write_market,
    write_market_array,
    write_excel,
]


@pytest.mark.parametrize("write", WRITERS, ids=lambda write: write.__name__)
@pytest.mark.parametrize("turned", [False, True])
def test_numbers_ids_and_orientation_come_back(small, write, turned):
    """The sheet names fewer samples in another order: its ids decide everything."""
    matrix = small.matrix.copy()
    if write is not write_market and write is not write_market_array:
        matrix.iloc[3, 2] = np.nan
    path = write(small.folder, matrix.T if turned else matrix)
    sheet = small.sheet.iloc[::-1].iloc[:20]
    cohort = read_cohort(path, sheet, outcome="group", positive="case")
    expected = matrix.loc[list(cohort.samples)]
    if write is write_excel:
        expected = expected.map(lambda value: float(f"{value:.16g}"))
    assert list(cohort.samples) == list(sheet["sample_id"])
    assert list(cohort.features) == list(matrix.columns)
    assert np.array_equal(cohort.X, expected.to_numpy(), equal_nan=True)
    assert cohort.values.dtype == np.float64
    assert cohort.values.flags.c_contiguous
    assert "expression" in cohort.sources


@pytest.mark.parametrize(
    "write", [write_parquet, write_feather, write_h5ad], ids=lambda w: w.__name__
)
@pytest.mark.parametrize("turned", [False, True])
def test_single_precision_stays_single(small, write, turned):
    matrix = small.matrix.astype(np.float32)
    path = write(small.folder, matrix.T if turned else matrix)
    cohort = read_cohort(path, small.sheet)
    assert cohort.values.dtype == np.float32
    assert np.array_equal(cohort.X, matrix.to_numpy())


@pytest.mark.parametrize("write", WRITERS, ids=lambda write: write.__name__)
def test_ids_on_both_sides_are_an_error_with_both_counts(small, write):
    matrix = small.matrix.iloc[:6].copy()
    matrix.columns = [f"{number:04d}" for number in range(3, 9)]
    path = write(small.folder, matrix)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path, small.sheet)
    assert caught.value.code == "orientation-unclear"
    assert "6 in the first column, 6 in the header" in caught.value.what
    for word, ids in (
        ("samples-in-rows", matrix.index),
        ("features-in-rows", matrix.columns),
    ):
        cohort = read_cohort(path, small.sheet, orientation=word)
        assert list(cohort.samples) == list(ids)


# --- Parquet and Arrow ---------------------------------------------------------


def read_table(tmp_path, columns, schema=None):
    path = tmp_path / "table.parquet"
    pa.parquet.write_table(pa.table(columns, schema=schema), path)
    return path


def test_every_kind_of_column_is_read_as_its_numbers(tmp_path):
    from decimal import Decimal

    tenth = [Decimal("0.1"), None, Decimal("12345678901234567890.3")]
    path = read_table(
        tmp_path,
        {
            "id": pa.array(["a", "b", "c"]).dictionary_encode(),
            "half": pa.array([np.float16(0.5), None, np.float16(2)], pa.float16()),
            "single": pa.array([0.1, None, np.inf], pa.float32()),
            "int": pa.array([1, None, -3], pa.int8()),
            "large": pa.array([1, 2**53, 3], pa.uint64()),
            "truth": pa.array([True, None, False]),
            "exact": pa.array(tenth, pa.decimal128(30, 1)),
            "nothing": pa.nulls(3),
            "text": pa.array(["1.5", "NA", "ERR"]),
            "levels": pa.array([2.5, 2.5, None]).dictionary_encode(),
        },
    )
    cohort = read_cohort(path)
    expected = [
        [0.5, np.float32(0.1), 1, 1, 1, 0.1, np.nan, 1.5, 2.5],
        [np.nan, np.nan, np.nan, 2.0**53, np.nan, np.nan, np.nan, np.nan, 2.5],
        [2, np.nan, -3, 3, 0, 12345678901234567890.3, np.nan, np.nan, np.nan],
    ]
    assert np.array_equal(cohort.X, np.array(expected, float), equal_nan=True)
    found = {finding.code: finding.message for finding in cohort.findings}
    assert "'truth'" in found["truth-values-as-numbers"]
    assert "row 'c', column 'single': 'inf'" in found["cells-not-numeric"]
    assert "row 'c', column 'text': 'ERR'" in found["cells-not-numeric"]


def test_ids_are_the_index_or_a_named_column(tmp_path):
    frame = pd.DataFrame({"note": ["1", "2"], "b": [3.0, 4.0]}, index=["S1", "S2"])
    path = tmp_path / "indexed.parquet"
    frame.to_parquet(path)
    assert list(read_cohort(path).samples) == ["S1", "S2"]  # not the text column
    path = read_table(tmp_path, {"a": [1.5, 2.5], "sample_id": [7, 8]})
    assert list(read_cohort(path).samples) == ["7", "8"]


def test_wide_files_are_advised_to_turn(tmp_path):
    frame = pd.DataFrame(np.ones((2, 5001)), index=["a", "b"]).add_prefix("f")
    path = tmp_path / "wide.parquet"
    frame.to_parquet(path)
    cohort = read_cohort(path)
    assert cohort.n_features == 5001
    finding = next(f for f in cohort.findings if f.code == "many-columns-slow")
    assert "5,002 columns" in finding.message
    assert ".h5ad" in finding.next_step


def test_truth_values_of_a_frame_are_read_as_in_its_file(small):
    frame = small.matrix.copy()
    frame["E5"] = frame["E5"] > 7
    path = small.folder / "truths.parquet"
    frame.to_parquet(path)
    for given in (frame, path):
        cohort = read_cohort(given, small.sheet)
        assert np.array_equal(cohort.X, frame.to_numpy(dtype=float))
        found = [f.message for f in cohort.findings if "truth" in f.code]
        assert len(found) == 1
        assert "1 column holds truth values, read as 0 and 1: 'E5'" in found[0]


# --- AnnData -------------------------------------------------------------------


@pytest.fixture
def rich(small):
    """AnnData with zeros, a layer, a raw part of more features, and categories."""
    draws = np.random.default_rng(1)
    values = draws.poisson(0.7, (24, 9)) * draws.normal(1.0, 0.1, (24, 9))
    obs = small.sheet.set_index("sample_id").rename_axis(None)
    obs["group"] = obs["group"].astype("category")
    var = pd.DataFrame({"symbol": list("ABCDEFGHI")}, index=list("abcdefghi"))
    whole = anndata.AnnData(X=values + 1.0, obs=obs, var=var)
    part = whole[:, :6].copy()
    part.raw = whole
    part.X = values[:, :6]
    part.layers["counts"] = np.round(values[:, :6] * 3)
    return part


LAYOUTS = {
    "dense": np.asarray,
    "by rows": sparse.csr_matrix,
    "by columns": sparse.csc_matrix,
    "array by rows": sparse.csr_array,
}


@pytest.mark.parametrize("backed", [None, "memory", "file", "view"])
@pytest.mark.parametrize("layout", LAYOUTS)
@pytest.mark.parametrize("layer", [None, "counts", "raw"])
def test_layers_layouts_and_backing(rich, tmp_path, layout, layer, backed):
    """All ways to the same numbers, for rows chosen out of order."""
    expected = {None: rich.X, "counts": rich.layers["counts"], "raw": rich.raw.X}[layer]
    expected = pd.DataFrame(np.array(expected), index=rich.obs_names)
    rich.X = LAYOUTS[layout](rich.X)
    rich.layers["counts"] = LAYOUTS[layout](rich.layers["counts"])
    path = tmp_path / "rich.h5ad"
    rich.write_h5ad(path)
    given = {
        None: lambda: path,
        "memory": lambda: rich,
        "file": lambda: anndata.read_h5ad(path, backed="r"),
        "view": lambda: anndata.read_h5ad(path, backed="r")[2:20],
    }[backed]()
    cohort = read_cohort(
        given, outcome="group", positive="case", keep={"clinic": ["south"]}, layer=layer
    )
    if hasattr(given, "file") and backed == "file":
        given.file.close()
    assert np.array_equal(cohort.X, expected.loc[list(cohort.samples)])
    assert cohort.n_samples == (12 if backed != "view" else 8)
    assert len(cohort.feature_columns["symbol"]) == expected.shape[1]


@pytest.mark.parametrize("chunks", [None, (5, 6), (24, 2), (1, 1)])
@pytest.mark.parametrize("turned", [False, True])
def test_blocks_fall_on_chunks_of_any_shape(small, monkeypatch, chunks, turned):
    from panelkit.ingest import stored_matrix

    monkeypatch.setattr(stored_matrix, "BLOCK_BYTES", 8 * 12)
    matrix = small.matrix.T if turned else small.matrix
    path = small.folder / "chunked.h5ad"
    obs, var = pd.DataFrame(index=matrix.index), pd.DataFrame(index=matrix.columns)
    anndata.AnnData(X=matrix.to_numpy(), obs=obs, var=var).write_h5ad(path)
    if chunks is not None:
        with h5py.File(path, "r+") as file:
            attributes = dict(file["X"].attrs)
            del file["X"]
            made = file.create_dataset(
                "X",
                data=matrix.to_numpy(),
                chunks=chunks[::-1] if turned else chunks,
                compression="gzip",
            )
            made.attrs.update(attributes)
    cohort = read_cohort(path, small.sheet.iloc[5:19][::-1])
    wanted = small.matrix.loc[list(cohort.samples)]
    assert np.array_equal(cohort.X, wanted)


def test_small_blocks_of_sparse_matrices(rich, tmp_path, monkeypatch):
    from panelkit.ingest import stored_matrix

    monkeypatch.setattr(stored_matrix, "BLOCK_BYTES", 100)
    expected = rich.X.copy()
    for layout in (sparse.csr_matrix, sparse.csc_matrix):
        rich.X = layout(expected)
        path = tmp_path / "sparse.h5ad"
        rich.write_h5ad(path)
        assert np.array_equal(read_cohort(path).X, expected)


def test_infinite_entries_are_named_in_every_layout(rich):
    dense = rich.X.copy()
    dense[4, 2] = np.inf
    for change in LAYOUTS.values():
        rich.X = change(dense)
        cohort = read_cohort(rich)
        message = next(f.message for f in cohort.findings if "numeric" in f.code)
        assert "row '0005', column 'c': 'inf'" in message
        assert np.isnan(cohort.X[4, 2])


def test_sparse_entries_that_stand_twice_add_up(rich):
    """As every sparse library reads them."""
    twice = sparse.csr_matrix(
        (np.array([1.0, 2.0, 4.0]), np.array([3, 3, 0]), np.array([0, 2, *[3] * 23])),
        shape=(24, 6),
    )
    rich.X = twice
    assert read_cohort(rich).X[0, 3] == 3.0


def test_lost_names_are_noticed(tmp_path):
    path = tmp_path / "numbered.h5ad"
    anndata.AnnData(X=np.ones((3, 4))).write_h5ad(path)
    where = [f.where for f in read_cohort(path).findings if "numbers" in f.code]
    assert where == ["numbered.h5ad, .obs", "numbered.h5ad, .var"]


# --- GCT -----------------------------------------------------------------------

GCT_13 = """#1.3
2\t3\t1\t2
id\tsymbol\tS1\tS2\tS3
group\tna\tcase\tcontrol\tcase
plate\tna\tp1\tp1\tp2
g1\tAAA\t1.5\t2.25\tNA
g2\tBBB\t-3\t4e-3\t5
"""


@pytest.mark.parametrize("pack", [lambda raw: raw, gzip.compress])
def test_blocks_of_metadata_become_sheets(tmp_path, pack):
    path = tmp_path / "annotated.gct"
    path.write_bytes(pack(GCT_13.encode()))
    cohort = read_cohort(path, batch="plate", keep={"group": ["case", "control"]})
    assert np.array_equal(
        cohort.X, [[1.5, -3], [2.25, 0.004], [np.nan, 5]], equal_nan=True
    )
    assert list(cohort.samples) == ["S1", "S2", "S3"]
    assert list(cohort.sample_columns["group"]) == ["case", "control", "case"]
    assert list(cohort.design.batch) == ["p1", "p1", "p2"]
    assert list(cohort.feature_columns["symbol"]) == ["AAA", "BBB"]


def test_turned_metadata_follow_the_sample_sheet(tmp_path):
    """Samples in rows after all: then the columns' metadata speak of features."""
    path = tmp_path / "turned.gct"
    path.write_text(GCT_13)
    sheet = pd.DataFrame({"sample_id": ["g2", "g1"]})
    cohort = read_cohort(path, sheet)
    assert list(cohort.samples) == ["g2", "g1"]
    assert list(cohort.feature_columns["plate"]) == ["p1", "p1", "p2"]


def test_descriptions_of_version_two_become_the_feature_sheet(tmp_path):
    path = tmp_path / "two.gct"
    path.write_text(
        "#1.2\n2\t2\nNAME\tDescription\tA\tB\ng1\tfirst\t1\t2\ng2\t\t3\tx\n"
    )
    cohort = read_cohort(path)
    assert list(cohort.feature_columns["Description"]) == ["first", ""]
    assert list(cohort.samples) == ["A", "B"]
    finding = next(f for f in cohort.findings if f.code == "cells-not-numeric")
    assert "row 'g2', column 'B': 'x'" in finding.message


# --- Matrix Market -------------------------------------------------------------


def market(folder, values, features, barcodes, names=None):
    """Write a matrix and the files of its ids, under their usual names or others."""
    names = names or ("matrix.mtx", "features.tsv", "barcodes.tsv")
    scipy.io.mmwrite(folder / names[0], values, precision=17)
    (folder / names[1]).write_text(features)
    (folder / names[2]).write_text(barcodes)
    return folder / names[0]


def test_files_of_ids_are_found_by_their_length(tmp_path):
    """The same two files fit a matrix either way round."""
    counts = np.array([[0, 2], [3, 0], [0, 0]])
    features, barcodes = "g1\tAAA\ng2\tBBB\ng3\tCCC\n", "S1\nS2\n"
    for values in (counts, counts.T):
        path = market(tmp_path, sparse.coo_array(values), features, barcodes)
        cohort = read_cohort(path)
        assert cohort.X.tolist() == counts.T.tolist()
        assert list(cohort.samples) == ["S1", "S2"]
        assert list(cohort.feature_columns["symbol"]) == ["AAA", "BBB", "CCC"]
        assert sorted(cohort.sources) == [
            "expression",
            "expression-column-names",
            "expression-row-names",
        ]


def test_files_of_ids_by_name_prefix_header_and_compression(tmp_path):
    counts = sparse.coo_array(np.array([[1, 2], [3, 4]]))
    path = market(
        tmp_path,
        counts,
        "feature\tsymbol\ng1\tAAA\ng2\tBBB\n",
        "S1\nS2\n",
        ("lane1_matrix.mtx", "lane1_genes.tsv", "lane1_samples.txt"),
    )
    other = tmp_path / "features.tsv"  # of another matrix: the prefix decides
    other.write_text("x\n")
    cohort = read_cohort(path)
    assert list(cohort.features) == ["g1", "g2"]
    named = read_cohort(
        path,
        row_names=tmp_path / "lane1_samples.txt",
        column_names=tmp_path / "lane1_genes.tsv",
        orientation="samples-in-rows",
    )
    assert list(named.features) == ["g1", "g2"]
    assert named.X.tolist() == [[1, 2], [3, 4]]


# --- Excel ---------------------------------------------------------------------


def workbook(path, sheets):
    book = openpyxl.Workbook()
    book.remove(book.active)
    for title, rows in sheets.items():
        sheet = book.create_sheet(title)
        for row in rows:
            sheet.append(row)
    book.save(path)
    return path


def test_sheet_by_name_and_text_that_is_a_number(tmp_path):
    rows = [["id", "a", "b"], ["S1", 1, "2.5"], [], ["S2", None, "ERR"], [None]]
    path = workbook(tmp_path / "book.xlsx", {"notes": [["x"]], "values": rows})
    cohort = read_cohort(path, sheet="values")
    assert np.array_equal(cohort.X, [[1, 2.5], [np.nan, np.nan]], equal_nan=True)
    finding = next(f for f in cohort.findings if f.code == "cells-not-numeric")
    assert "row 'S2', column 'b': 'ERR'" in finding.message


def test_names_that_became_dates_are_a_finding(tmp_path):
    import datetime

    first = datetime.datetime(2026, 3, 1)
    rows = [["id", "S1", "S2"], [first, 1, 2], ["TP53", 3, 4]]
    path = workbook(tmp_path / "book.xlsx", {"values": rows})
    cohort = read_cohort(path, orientation="features-in-rows")
    finding = next(f for f in cohort.findings if f.code == "ids-are-dates")
    assert finding.severity == "warning"
    assert "'2026-03-01'" in finding.message
    assert list(cohort.features) == ["2026-03-01", "TP53"]


# --- recognition ---------------------------------------------------------------


def test_content_decides_whatever_the_name_says(small):
    for write in WRITERS:
        path = write(small.folder, small.matrix)
        renamed = small.folder / "anything.dat"
        path.replace(renamed)
        if "market" in write.__name__:
            continue  # its files of ids go by its name
        cohort = read_cohort(renamed, small.sheet)
        assert np.allclose(cohort.X, small.matrix, rtol=1e-15, atol=0)


def test_a_named_format_wins_and_a_contradiction_is_said(small):
    path = small.folder / "text.parquet"
    small.matrix.to_csv(path)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path, small.sheet)
    assert caught.value.code == "wrong-file-kind"
    assert "Parquet" in caught.value.what
    cohort = read_cohort(path, small.sheet, format="text")
    assert np.array_equal(cohort.X, small.matrix)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path, small.sheet, format="parquet")
    assert caught.value.code == "format-contradicted"
    assert "'parquet'" in caught.value.what
    assert "delimited text" in caught.value.what
    parquet = write_parquet(small.folder, small.matrix)
    with pytest.raises(InputDataError) as caught:
        read_cohort(parquet, small.sheet, format="text")
    assert caught.value.code == "format-contradicted"


@pytest.mark.parametrize(
    ("arguments", "code"),
    [
        ({"format": "parket"}, "unknown-format"),
        ({"layer": "raw"}, "option-without-use"),
        ({"sheet": "values"}, "option-without-use"),
        ({"row_names": "names.tsv"}, "option-without-use"),
        ({"join": "outer"}, "unknown-join"),
    ],
)
def test_options_that_cannot_be_meant(small, arguments, code):
    expression, samples = small.write()
    with pytest.raises(UsageError) as caught:
        read_cohort(expression, samples, **arguments)
    assert caught.value.code == code
    assert caught.value.exit_code == 2


def test_options_of_objects(small):
    for given, arguments in (
        (small.matrix, {"layer": "raw"}),
        (anndata.AnnData(small.matrix), {"format": "h5ad"}),
    ):
        with pytest.raises(UsageError) as caught:
            read_cohort(given, small.sheet, **arguments)
        assert caught.value.code == "option-without-use"


def test_missing_package_names_its_extra(small, monkeypatch):
    path = write_excel(small.folder, small.matrix)
    monkeypatch.setitem(__import__("sys").modules, "openpyxl", None)
    with pytest.raises(UsageError) as caught:
        read_cohort(path, small.sheet)
    assert caught.value.code == "extra-missing"
    assert "panelkit[excel]" in caught.value.next_step


class JsonReader:
    """What somebody may plug in: rows of numbers under their ids."""

    name = "json"
    title = "a JSON matrix"
    suffixes = (".json",)
    takes: frozenset = frozenset()

    def matches(self, path, start):
        return start.startswith(b"{")

    def read(self, path, options):
        assert isinstance(options, ReadOptions)
        found = json.loads(path.read_text())

        def table(max_bad_cells):
            values = np.array(list(found["rows"].values()))
            bad_cells = BadCells(path.name, max_bad_cells)
            return MatrixTable(
                path.name, list(found["rows"]), found["columns"], values, bad_cells
            )

        return OpenedMatrix(path.name, table)


def test_a_reader_can_be_registered(tmp_path, monkeypatch):
    monkeypatch.setattr(readers, "_READERS", list(readers._READERS))
    register_reader(JsonReader())
    assert format_names()[0] == "json"
    path = tmp_path / "matrix.json"
    path.write_text('{"columns": ["a", "b"], "rows": {"S1": [1.5, 2], "S2": [3, 4]}}')
    assert read_cohort(path).X.tolist() == [[1.5, 2], [3, 4]]
    with pytest.raises(UsageError) as caught:
        register_reader(JsonReader())
    assert caught.value.code == "reader-twice"
