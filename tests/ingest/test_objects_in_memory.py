"""AnnData objects, .h5ad files and data frames."""

import anndata
import numpy as np
import pandas as pd
import pytest
from scipy import sparse

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort


@pytest.fixture
def annotated(small):
    obs = small.sheet.set_index("sample_id")
    obs.index.name = None
    obs["group"] = obs["group"].astype("category")
    obs["score"] = np.where(np.arange(24) < 3, np.nan, 1.0)
    var = pd.DataFrame({"symbol": list("ABCDEF")}, index=small.matrix.columns)
    values = small.matrix.to_numpy(dtype=np.float32)
    return anndata.AnnData(X=values, obs=obs, var=var)


def test_object_brings_its_sheets_and_precision(annotated):
    cohort = read_cohort(annotated, outcome="group", positive="case", site="clinic")
    assert np.array_equal(cohort.X, annotated.X)
    assert cohort.values.dtype == np.float32
    assert cohort.values.flags.c_contiguous
    assert not np.shares_memory(cohort.values, annotated.X)
    assert list(cohort.feature_columns["symbol"]) == list("ABCDEF")
    assert list(cohort.sample_columns["score"][:4]) == ["", "", "", "1"]
    assert cohort.sources is None


@pytest.mark.parametrize("layout", ["dense", "rows", "columns"])
def test_files_come_back_equal(annotated, tmp_path, layout):
    dense = annotated.X.copy()
    change = {"rows": sparse.csr_matrix, "columns": sparse.csc_matrix}.get(layout)
    if change:
        annotated.X = change(dense)
    path = tmp_path / "expression.h5ad"
    annotated.write_h5ad(path)
    cohort = read_cohort(path, outcome="group", positive="case")
    assert np.array_equal(cohort.X, dense)
    assert list(cohort.samples) == list(annotated.obs_names)
    assert list(cohort.sources) == ["expression"]


def test_round_trip_of_a_cohort(annotated):
    cohort = read_cohort(annotated, outcome="group", positive="case")
    again = read_cohort(cohort.to_anndata(), outcome="group", positive="case")
    assert np.array_equal(again.values, cohort.values)
    assert list(again.samples) == list(cohort.samples)


def test_another_sheet_wins_over_obs(annotated, small):
    sheet = small.sheet.iloc[:10]
    cohort = read_cohort(annotated, sheet, outcome="group", positive="case")
    assert cohort.n_samples == 10


def test_whole_numbers_and_infinity(annotated):
    annotated.X = np.arange(144).reshape(24, 6)
    assert read_cohort(annotated).values.dtype == np.float64
    annotated.X = annotated.X.astype(float)
    annotated.X[1, 2] = np.inf
    cohort = read_cohort(annotated)
    assert np.isnan(cohort.X[1, 2])
    assert np.isinf(annotated.X[1, 2])
    message = next(f.message for f in cohort.findings if f.code == "cells-not-numeric")
    assert "row '0002', column 'C-3': 'inf'" in message


def test_object_cannot_be_turned_and_needs_numbers(annotated):
    with pytest.raises(UsageError) as caught:
        read_cohort(annotated, orientation="features-in-rows")
    assert caught.value.code == "orientation-fixed"
    with pytest.raises(InputDataError) as caught:
        read_cohort(anndata.AnnData(obs=annotated.obs))
    assert caught.value.code == "matrix-empty"


def test_repeated_names_are_refused(annotated, tmp_path):
    annotated.var_names = ["a", "a", "b", "c", "d", "e"]
    path = tmp_path / "expression.h5ad"
    annotated.write_h5ad(path)
    with pytest.raises(InputDataError) as caught:
        read_cohort(path)
    assert caught.value.code == "repeated-ids"
    assert "'a'" in caught.value.what


def test_files_that_are_no_anndata(tmp_path):
    text = tmp_path / "text.h5ad"
    text.write_text("id,a\nS1,1\n")
    with pytest.raises(InputDataError) as caught:
        read_cohort(text)
    assert caught.value.code == "wrong-file-kind"
    damaged = tmp_path / "damaged.h5ad"
    damaged.write_bytes(b"\x89HDF\r\n\x1a\n" + bytes(100))
    with pytest.raises(InputDataError) as caught:
        read_cohort(damaged)
    assert caught.value.code == "wrong-file-kind"
    assert caught.value.exit_code == 3


def test_frame_has_samples_in_rows(small):
    cohort = read_cohort(small.matrix, small.sheet, outcome="group", positive="case")
    assert np.array_equal(cohort.X, small.matrix.to_numpy())
    assert not np.shares_memory(cohort.values, small.matrix.to_numpy())
    by_index = small.sheet.set_index("sample_id")
    again = read_cohort(small.matrix, by_index, outcome="group", positive="case")
    assert list(again.samples) == list(cohort.samples)
    narrow = read_cohort(small.matrix.astype(np.float32), small.sheet)
    assert narrow.values.dtype == np.float32


def test_frame_with_text_missing_and_nullable_columns(small):
    frame = small.matrix.astype(object)
    frame.iloc[0, 0] = "<5"
    frame.iloc[1, 0] = "NA"
    frame["E5"] = pd.array([None, *range(23)], dtype="Int64")
    cohort = read_cohort(frame, small.sheet)
    assert np.isnan(cohort.X[:2, 0]).all()
    assert np.isnan(cohort.X[0, 4])
    assert cohort.X[2, 0] == small.matrix.iloc[2, 0]
    message = next(f.message for f in cohort.findings if f.code == "cells-not-numeric")
    assert "1 cell is" in message
    assert "row '0001', column '007': '<5'" in message


def test_outcome_of_ones_and_zeros_with_a_gap(small):
    # a gap turns 0 and 1 into floats; the classes are still "0" and "1"
    small.sheet["group"] = [np.nan, *[0, 1] * 11, 0]
    cohort = read_cohort(small.matrix, small.sheet, outcome="group", positive=1)
    assert (cohort.outcome.positive, cohort.outcome.negative) == ("1", "0")
    assert cohort.n_samples == 23


def test_anything_else_is_refused():
    with pytest.raises(UsageError) as caught:
        read_cohort(np.zeros((3, 3)))
    assert caught.value.code == "expression-not-understood"
    assert caught.value.exit_code == 2
