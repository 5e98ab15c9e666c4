"""Text formats follow the text layer: compression, encoding, decimal marks, range."""

import bz2
import gzip
import lzma

import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pytest
import scipy.io
from scipy import sparse

from panelkit.errors import InputDataError
from panelkit.ingest.cohort_reader import read_cohort


def by_zstd(raw):
    sink = pa.BufferOutputStream()
    with pa.CompressedOutputStream(sink, "zstd") as stream:
        stream.write(raw)
    return sink.getvalue().to_pybytes()


PACKERS = {
    "plain": bytes,
    "gz": gzip.compress,
    "bz2": bz2.compress,
    "xz": lzma.compress,
    "zst": by_zstd,
}
GCT = (
    "#1.2\n2\t3\nNAME\tDescription\tS1\tS2\tS3\ng1\tx\t1.5\t-2\tNA\ng2\ty\t4e-3\t5\t6\n"
)
VALUES = [[1.5, 0.004], [-2.0, 5.0], [np.nan, 6.0]]


@pytest.fixture
def market(tmp_path):
    """Two features and three samples with their files of ids, by scipy."""
    path = tmp_path / "matrix.mtx"
    scipy.io.mmwrite(path, sparse.coo_array([[1.0, 0.0, 2.5], [0.0, -4.0, 3.0]]))
    (tmp_path / "features.tsv").write_text("g1\ng2\n")
    (tmp_path / "barcodes.tsv").write_text("S1\nS2\nS3\n")
    return path


def packed(path, content, how):
    target = path if how == "plain" else path.with_name(f"{path.name}.{how}")
    path.unlink(missing_ok=True)
    target.write_bytes(PACKERS[how](content))
    return target


@pytest.mark.parametrize("how", PACKERS)
def test_gct_is_recognised_inside_any_compression(tmp_path, how):
    cohort = read_cohort(packed(tmp_path / "m.gct", GCT.encode(), how))
    assert np.array_equal(cohort.X, VALUES, equal_nan=True)
    assert list(cohort.samples) == ["S1", "S2", "S3"]


@pytest.mark.parametrize("codec", ["utf-8-sig", "utf-16", "cp1252"])
def test_gct_in_any_encoding(tmp_path, codec):
    path = tmp_path / "m.gct"
    path.write_bytes(GCT.replace("\ty\t", "\té\t").encode(codec))
    cohort = read_cohort(path)
    assert np.array_equal(cohort.X, VALUES, equal_nan=True)
    assert list(cohort.feature_columns["Description"]) == ["x", "é"]
    codes = {finding.code for finding in cohort.findings}
    assert ("encoding-assumed" in codes) == (codec == "cp1252")


def test_gct_with_decimal_commas_and_quotes(tmp_path):
    path = tmp_path / "m.gct"
    text = GCT.replace("1.5", '"1,5"').replace("4e-3", "0,004")
    path.write_text(text.replace("\n", "\r\n"), newline="")
    cohort = read_cohort(path)
    assert np.array_equal(cohort.X, VALUES, equal_nan=True)
    assert "decimal-comma-read" in {finding.code for finding in cohort.findings}


def test_gct_cells_are_named_like_those_of_text(tmp_path):
    """The same cells as text and as GCT give the same findings."""
    cells = ["1_000", "\uff11", "1e39", "inf", "n/a", "x", " 7 "]
    names = [f"S{n}" for n in range(len(cells))]
    gct, text = tmp_path / "m.gct", tmp_path / "m.tsv"
    head = "\t".join(names)
    gct.write_text(
        f"#1.2\n1\t{len(cells)}\nN\tD\t{head}\ng1\td\t" + "\t".join(cells) + "\n"
    )
    text.write_text(f"N\t{head}\ng1\t" + "\t".join(cells) + "\n")
    read = [
        read_cohort(path, orientation="features-in-rows", max_bad_cells=10)
        for path in (gct, text)
    ]
    assert np.array_equal(read[0].X, read[1].X, equal_nan=True)
    assert [f.message for f in read[0].findings] == [
        f.message for f in read[1].findings
    ]
    assert {"cells-not-numeric", "value-beyond-range"} <= {
        finding.code for finding in read[0].findings
    }


@pytest.mark.parametrize("how", PACKERS)
def test_matrix_market_and_its_ids_inside_any_compression(market, how):
    for name in ("features.tsv", "barcodes.tsv"):
        beside = market.with_name(name)
        packed(beside, beside.read_bytes(), how)
    cohort = read_cohort(packed(market, market.read_bytes(), how))
    assert cohort.X.tolist() == [[1.0, 0.0], [0.0, -4.0], [2.5, 3.0]]
    assert list(cohort.features) == ["g1", "g2"]


def test_a_compressed_matrix_market_file_cut_short_is_named(market):
    cut = market.with_name("matrix.mtx.xz")
    cut.write_bytes(lzma.compress(market.read_bytes() * 400)[:-40])
    with pytest.raises(InputDataError) as caught:
        read_cohort(cut)
    assert caught.value.exit_code == 3


@pytest.mark.parametrize("given", [True, False])
def test_a_sample_sheet_beside_a_matrix_market_file_holds_no_ids_of_it(market, given):
    sheet = market.with_name("samples.csv")
    sheet.write_text("sample_id,group\nS3,a\nS1,b\nS2,a\n")
    cohort = read_cohort(market, sheet if given else None)
    order = ["S3", "S1", "S2"] if given else ["S1", "S2", "S3"]
    assert list(cohort.samples) == order
    by_name = dict(zip(cohort.samples, cohort.X.tolist(), strict=True))
    assert by_name == {"S1": [1.0, 0.0], "S2": [0.0, -4.0], "S3": [2.5, 3.0]}


def write_parquet(path):
    pd.DataFrame({"a": [1e39, 2.0], "b": [3.0, -4.0]}, ["S1", "S2"]).to_parquet(path)


def write_market(path):
    scipy.io.mmwrite(path, sparse.coo_array([[1e39, 2.0], [3.0, -4.0]]))
    path.with_name("features.tsv").write_text("a\nb\n")
    path.with_name("samples.tsv").write_text("S1\nS2\n")


def write_h5ad(path):
    import anndata

    names = {"obs": pd.DataFrame(index=["S1", "S2"]),
             "var": pd.DataFrame(index=["a", "b"])}  # fmt: skip
    values = sparse.csr_matrix([[1e39, 3.0], [2.0, -4.0]])
    anndata.AnnData(X=values, **names).write_h5ad(path)


def write_excel(path):
    book = openpyxl.Workbook()
    for row in (["id", "a", "b"], ["S1", 1e39, 3.0], ["S2", 10**60, -4.0]):
        book.active.append(row)
    book.save(path)


@pytest.mark.parametrize(
    ("name", "write"),
    [
        ("m.parquet", write_parquet),
        ("m.mtx", write_market),
        ("m.h5ad", write_h5ad),
        ("m.xlsx", write_excel),
    ],
)
def test_numbers_beyond_single_precision_are_named_in_every_format(
    tmp_path, name, write
):
    path = tmp_path / name
    write(path)
    cohort = read_cohort(
        path,
        orientation="auto"
        if ".xlsx" not in name and ".parquet" not in name
        else "samples-in-rows",
    )
    finding = next(f for f in cohort.findings if f.code == "value-beyond-range")
    assert "1e+39" in finding.message
    assert np.isnan(cohort.X[0, 0])
    assert np.isfinite(cohort.X).sum() == (2 if name == "m.xlsx" else 3)


@pytest.mark.parametrize("how", ["gz", "xz"])
@pytest.mark.parametrize(
    ("name", "write"),
    [("m.parquet", write_parquet), ("m.h5ad", write_h5ad), ("m.xlsx", write_excel)],
)
def test_binary_files_inside_a_compressed_one_are_refused(tmp_path, name, write, how):
    path = tmp_path / name
    write(path)
    target = packed(path, path.read_bytes(), how)
    with pytest.raises(InputDataError) as caught:
        read_cohort(target)
    assert caught.value.code == "wrong-file-kind"
    assert "inside a compressed file" in caught.value.what
    assert "Unpack" in caught.value.next_step
