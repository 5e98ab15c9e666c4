"""Sample, feature and assay sheets in files that other programs write."""

import datetime
import gzip
import sys

import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort

SHEET = pd.DataFrame(
    {
        "sample_id": ["S3", "S1", "S2"],
        "group": ["case", "control", "case"],
        "age": [41, None, 63],
        "dose": [1.0, 2.5, 3.0],
    }
)
MATRIX = pd.DataFrame(
    [[1.5, 2.0], [3.0, 4.0], [5.0, 6.5]], ["S1", "S2", "S3"], ["g1", "g2"]
)


def as_csv(path, frame):
    frame.to_csv(path, index=False)


def as_excel(path, frame):
    frame.to_excel(path, index=False)


def as_parquet(path, frame):
    whole = frame.astype({"age": "Int64"}) if "age" in frame else frame
    whole.to_parquet(path, index=False)


def as_parquet_with_index(path, frame):
    frame.set_index(frame.columns[0]).to_parquet(path)


def as_feather(path, frame):
    frame.to_feather(path, compression="lz4")


def as_stream(path, frame):
    table = pa.Table.from_pandas(frame)
    with pa.ipc.new_stream(path, table.schema) as stream:
        stream.write_table(table)


WRITERS = [
    (as_csv, "sheet.csv"),
    (as_excel, "sheet.xlsx"),
    (as_parquet, "sheet.parquet"),
    (as_parquet_with_index, "sheet.pq"),
    (as_feather, "sheet.feather"),
    (as_stream, "sheet.arrows"),
]


@pytest.mark.parametrize(("write", "name"), WRITERS)
@pytest.mark.parametrize("misnamed", [False, True])
def test_a_sample_sheet_in_any_format(tmp_path, write, name, misnamed):
    path = tmp_path / name
    write(path, SHEET)
    if misnamed and name != "sheet.csv":  # the content decides
        path = path.rename(tmp_path / "sheet.csv")
    cohort = read_cohort(MATRIX, path)
    assert list(cohort.samples) == ["S3", "S1", "S2"]
    assert cohort.X.tolist() == [[5.0, 6.5], [1.5, 2.0], [3.0, 4.0]]
    assert list(cohort.sample_columns["group"]) == ["case", "control", "case"]
    ages = [text.removesuffix(".0") for text in cohort.sample_columns["age"]]
    assert ages == ["41", "", "63"]
    assert [float(text) for text in cohort.sample_columns["dose"]] == [1.0, 2.5, 3.0]
    assert list(cohort.sources) == ["samples"]


@pytest.mark.parametrize(("write", "name"), WRITERS)
def test_feature_and_assay_sheets_in_any_format(tmp_path, write, name):
    features, assays = tmp_path / name, tmp_path / f"assays-{name}"
    write(features, pd.DataFrame({"feature": ["g2", "g1"], "symbol": ["B", "A"]}))
    rows = {"feature": ["g1", "g2"], "analyte": ["P1", "P2"], "assay": ["a1", "a2"]}
    if write is as_parquet_with_index:
        pd.DataFrame(rows).to_parquet(assays, index=False)
    else:
        write(assays, pd.DataFrame(rows))
    cohort = read_cohort(
        MATRIX, features=features, assays=assays, orientation="samples-in-rows"
    )
    assert list(cohort.feature_columns["symbol"]) == ["A", "B"]
    assert list(cohort.feature_columns["analyte"]) == ["P1", "P2"]
    assert sorted(cohort.sources) == ["assays", "features"]


def workbook(path, rows, more=()):
    book = openpyxl.Workbook()
    for row in rows:
        book.active.append(row)
    for title in more:
        book.create_sheet(title)
    book.save(path)
    return path


def test_dates_gaps_and_further_worksheets(tmp_path):
    rows = [
        ["sample_id", "seen", "note"],
        ["S1", datetime.datetime(2024, 2, 29), "x"],
        [],
        ["S2", datetime.datetime(2024, 3, 1)],
    ]
    path = workbook(tmp_path / "s.xlsx", rows, ["legend"])
    cohort = read_cohort(MATRIX, path)
    assert list(cohort.sample_columns["seen"]) == ["2024-02-29", "2024-03-01"]
    assert list(cohort.sample_columns["note"]) == ["x", ""]
    finding = next(f for f in cohort.findings if f.code == "first-worksheet-read")
    assert "'legend'" in finding.message


def test_features_that_became_dates_are_named(tmp_path):
    rows = [["feature", "symbol"], [datetime.datetime(2024, 3, 1), "A"], ["g2", "B"]]
    path = workbook(tmp_path / "f.xlsx", rows)
    cohort = read_cohort(MATRIX, features=path, orientation="samples-in-rows")
    finding = next(f for f in cohort.findings if f.code == "ids-are-dates")
    assert "2024-03-01" in finding.message


def test_formulas_without_results_are_refused(tmp_path):
    rows = [["sample_id", "group"], ["S1", '=IF(1>0,"a","b")'], ["S2", "b"]]
    with pytest.raises(InputDataError) as caught:
        read_cohort(MATRIX, workbook(tmp_path / "s.xlsx", rows))
    assert caught.value.code == "formulas-without-results"


@pytest.mark.parametrize(
    ("rows", "code"),
    [
        ([], "no-data-lines"),
        ([["sample_id", "group"]], "no-data-lines"),
        ([["sample_id"], ["S1", "case"]], "line-length-differs"),
        ([["sample_id", "g"], ["S1", "a"], ["S1", "b"]], "repeated-ids"),
        ([["sample_id", "g"], ["S1", "a"], [None, "b"]], "blank-id"),
    ],
)
def test_workbooks_that_are_no_sheet(tmp_path, rows, code):
    with pytest.raises(InputDataError) as caught:
        read_cohort(MATRIX, workbook(tmp_path / "s.xlsx", rows))
    assert caught.value.code == code


def test_without_openpyxl_the_extra_is_named(tmp_path, monkeypatch):
    path = workbook(tmp_path / "s.xlsx", [["sample_id"], ["S1"]])
    monkeypatch.setitem(sys.modules, "openpyxl", None)
    with pytest.raises(UsageError) as caught:
        read_cohort(MATRIX, path)
    assert caught.value.code == "extra-missing"


def test_columnar_sheets_that_cannot_be_used(tmp_path):
    path = tmp_path / "s.parquet"
    SHEET.assign(more=[[1], [2], [3]]).to_parquet(path)
    with pytest.raises(InputDataError) as caught:
        read_cohort(MATRIX, path)
    assert caught.value.code == "columns-not-flat"
    SHEET.iloc[:0].to_parquet(path)
    with pytest.raises(InputDataError) as caught:
        read_cohort(MATRIX, path)
    assert caught.value.code == "no-data-lines"
    SHEET.to_parquet(path)
    path.write_bytes(path.read_bytes()[:-30])
    with pytest.raises(InputDataError) as caught:
        read_cohort(MATRIX, path)
    assert caught.value.code == "wrong-file-kind"
    packed = tmp_path / "s.parquet.gz"
    SHEET.to_parquet(path)
    packed.write_bytes(gzip.compress(path.read_bytes()))
    with pytest.raises(InputDataError) as caught:
        read_cohort(MATRIX, packed)
    assert caught.value.code == "wrong-file-kind"


def test_a_matrix_and_its_sheet_may_share_a_format(tmp_path):
    MATRIX.to_parquet(tmp_path / "m.parquet")
    SHEET.to_parquet(tmp_path / "s.parquet")
    cohort = read_cohort(tmp_path / "m.parquet", tmp_path / "s.parquet")
    assert np.array_equal(cohort.X, MATRIX.loc[["S3", "S1", "S2"]])
