"""Matrices from delimited text: exact, whatever wrote them, and clear when spoiled."""

import gzip

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from panelkit.errors import InputDataError
from panelkit.ingest.cells import LARGEST
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.delimited import read_delimited_matrix


def write(tmp_path, text, name="expression.csv"):
    path = tmp_path / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return path


def codes(cohort):
    return [finding.code for finding in cohort.findings]


@pytest.mark.parametrize("delimiter", [",", "\t", ";"])
@pytest.mark.parametrize("name", ["expression.csv", "expression.csv.gz"])
@pytest.mark.parametrize("turned", [False, True])
def test_files_of_pandas_come_back_equal(small, delimiter, name, turned):
    _, samples = small.write()
    path = small.folder / name
    (small.matrix.T if turned else small.matrix).to_csv(path, sep=delimiter)
    cohort = read_cohort(path, samples, outcome="group", positive="case")
    assert np.array_equal(cohort.X, small.matrix.to_numpy())
    assert list(cohort.samples) == list(small.matrix.index)
    assert list(cohort.features) == list(small.matrix.columns)
    assert cohort.values.flags.c_contiguous
    assert cohort.values.dtype == np.float64


numbers = st.one_of(
    st.floats(-LARGEST, LARGEST, width=64), st.just(float("nan")), st.just(-0.0)
)


@settings(
    max_examples=60,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(
    values=st.tuples(st.integers(1, 6), st.integers(1, 6)).flatmap(
        lambda shape: arrays(np.float64, shape, elements=numbers)
    ),
    missing=st.sampled_from(["", "NA", "NaN", "n/a", "null", "None", "NONE", " "]),
    quoting=st.sampled_from([0, 1, 2]),
)
def test_any_matrix_comes_back_equal(tmp_path, values, missing, quoting):
    path = tmp_path / "any.csv"
    rows, columns = values.shape
    pd.DataFrame(
        values,
        index=[f"0{row}" for row in range(rows)],
        columns=[f"f,{column}" for column in range(columns)],
    ).to_csv(path, na_rep=missing, quoting=quoting)
    table = read_delimited_matrix(path, 0)
    assert np.array_equal(table.values, values, equal_nan=True)
    assert table.row_ids == [f"0{row}" for row in range(rows)]
    assert table.column_ids == [f"f,{column}" for column in range(columns)]


def test_byte_order_mark_windows_lines_and_blank_lines_are_no_data(tmp_path):
    text = "\ufeffid,a,b\r\n01,1,2\r\n\r\n02,3,4\r\n,,\r\n"
    cohort = read_cohort(write(tmp_path, text))
    assert list(cohort.samples) == ["01", "02"]
    assert cohort.X.tolist() == [[1, 2], [3, 4]]


def test_header_without_the_field_above_the_row_names(tmp_path):
    # how R writes a matrix with row names
    text = '"a"\t"b"\n"01"\t1\t2\n"02"\t3\tNA\n'
    cohort = read_cohort(write(tmp_path, text))
    assert list(cohort.features) == ["a", "b"]
    assert list(cohort.samples) == ["01", "02"]
    assert np.isnan(cohort.X[1, 1])


def test_cells_that_float_would_take_are_no_numbers_here(tmp_path):
    text = "id,a,b,c,d\n1,1_000,inf,-Infinity,1e999\n2,1,2,3,٤\n"
    cohort = read_cohort(write(tmp_path, text))
    assert np.isnan(cohort.X).tolist() == [[True] * 4, [False, False, False, True]]
    finding = next(f for f in cohort.findings if f.code == "cells-not-numeric")
    assert finding.severity == "warning"
    assert "5 cells are" in finding.message


def test_bad_cells_are_missing_and_named_by_position(tmp_path):
    text = "id,a,b\nS1,ERR,2\nS2,<5,NA\nS3,5,6\n"
    cohort = read_cohort(write(tmp_path, text))
    finding = next(f for f in cohort.findings if f.code == "cells-not-numeric")
    assert "row 'S1', column 'a': 'ERR'" in finding.message
    assert "row 'S2', column 'a': '<5'" in finding.message
    missing = next(f for f in cohort.findings if f.code == "values-missing")
    assert "50 %" in missing.message


def test_more_bad_cells_than_allowed_are_an_error(tmp_path):
    lines = "".join(f"S{row},text{row},{row}\n" for row in range(9))
    path = write(tmp_path, "id,symbol,b\n" + lines)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path, max_bad_cells=4)
    assert caught.value.code == "text-everywhere"
    assert caught.value.exit_code == 3
    assert "row 'S0', column 'symbol': 'text0'" in caught.value.what
    assert "column 'symbol'" in caught.value.next_step


GZIP = gzip.compress(b"id,a\nS1,1\nS2,2\n" * 200, mtime=0)


@pytest.mark.parametrize(
    ("content", "code", "named"),
    [
        (b"", "file-empty", "0 bytes"),
        (gzip.compress(b"", mtime=0), "file-empty", "0 bytes"),
        (b"id,a,b\n", "no-data-lines", "a header only"),
        (b"\n\n", "no-data-lines", "blank lines only"),
        (b"id\nS1\nS2\n", "one-column-only", "'id'"),
        (b"id,a,b\nS1,1,2\nS2,1\n", "line-length-differs", "2 fields"),
        (b"id,a,b\nS1,1,2\nS2,1,2,3\n", "line-length-differs", "4 fields"),
        (b'id,a,b\nS1,"1,2\nS2,1,2\n', "quotes-unbalanced", "quoted field"),
        (b"id,a,b\nS1,1,2\nS1,1,2\nS2,3,4\n", "repeated-ids", "'S1'"),
        (b"id,a,a\nS1,1,2\nS2,1,2\n", "repeated-ids", "'a'"),
        (b"id,a,\nS1,1,2\nS2,1,2\n", "blank-id", "feature"),
        (b"id,a,b\n ,1,2\nS2,1,2\n", "blank-id", "sample"),
        (b"\x00\x01\x02\x03 junk", "wrong-file-kind", "zero bytes"),
        (b"id,\x01\xfe\nS1,1\n", "wrong-file-kind", "control characters"),
        ("id,a\nS1,1\n".encode("utf-16-le"), "wrong-file-kind", "byte order mark"),
        (b"PK\x03\x04 and so on", "wrong-file-kind", "Excel"),
        (GZIP[: len(GZIP) // 2], "archive-damaged", "cut short"),
    ],
)
def test_spoiled_files_give_one_sentence(tmp_path, content, code, named):
    path = write(tmp_path, content)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path)
    assert caught.value.code == code
    assert caught.value.exit_code == 3
    assert named in str(caught.value)
    assert "expression.csv" in caught.value.where


def test_line_of_another_length_is_named_by_its_number(tmp_path):
    path = write(tmp_path, "id,a,b\nS1,1,2\n\nS2,1\n")
    with pytest.raises(InputDataError) as caught:
        read_cohort(path)
    assert caught.value.where == "expression.csv, line 4"


def test_missing_files_and_folders(tmp_path):
    with pytest.raises(InputDataError) as caught:
        read_cohort(tmp_path / "nowhere.csv")
    assert caught.value.code == "file-missing"
    with pytest.raises(InputDataError) as caught:
        read_cohort(tmp_path)
    assert caught.value.code == "not-a-file"


def test_hashes_of_all_input_files(small):
    expression, samples = small.write()
    features = write(small.folder, "feature,symbol\n007,BOND\n", "features.csv")
    cohort = read_cohort(expression, samples, features=features)
    assert sorted(cohort.sources) == ["expression", "features", "samples"]
    assert all(len(digest) == 64 for digest in cohort.sources.values())
    assert len(set(cohort.sources.values())) == 3


def test_without_a_sheet_samples_in_rows_are_assumed_and_said(small):
    expression, _ = small.write()
    cohort = read_cohort(expression)
    assert "orientation-assumed" in codes(cohort)
    assert cohort.n_samples == 24
    turned = read_cohort(expression, orientation="features-in-rows")
    assert "orientation-assumed" not in codes(turned)
    assert turned.n_features == 24
