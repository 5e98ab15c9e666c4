"""Sample sheets and feature sheets: text throughout, columns named when missing."""

import pandas as pd
import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort
from panelkit.ingest.sheet import read_sheet


def spoil(small, content):
    expression, samples = small.write()
    samples.write_bytes(content)
    return expression, samples


def test_everything_is_text(small):
    small.sheet["code"] = ["007"] * 24
    cohort = read_cohort(*small.write())
    assert set(cohort.sample_columns["code"]) == {"007"}
    assert cohort.samples[0] == "0001"


def test_id_column_may_stand_anywhere_by_name(small):
    small.sheet = small.sheet[["group", "age", "sample_id"]]
    cohort = read_cohort(*small.write())
    assert list(cohort.samples) == list(small.matrix.index)
    assert list(cohort.sample_columns) == ["group", "age"]


def test_quoted_fields_may_hold_delimiters_and_line_breaks(tmp_path):
    path = tmp_path / "samples.csv"
    path.write_text('id;note\n01;"a;b"\n02;"two\nlines"\n')
    sheet = read_sheet(path, "sample_id")
    assert list(sheet.columns["note"]) == ["a;b", "two\nlines"]


@pytest.mark.parametrize(
    ("content", "code", "named"),
    [
        (b"", "file-empty", "samples.csv"),
        (b"sample_id,group\n", "no-data-lines", "a header only"),
        (b"sample_id,group\n0001,case\n0001,case\n", "repeated-ids", "'0001'"),
        (b"sample_id,group\n0001,case\n,case\n", "blank-id", "'2'"),
        (b"sample_id,group\n0001,case\n0002\n", "line-length-differs", "row 2"),
        (b"sample_id,g,g\n0001,a,b\n", "repeated-columns", "'g'"),
        (b'sample_id,g\n0001,"a\n', "quotes-unbalanced", "quoted field"),
        (b"\x89HDF\r\n\x1a\n and more", "wrong-file-kind", "HDF5"),
    ],
)
def test_spoiled_sheets_give_one_sentence(small, content, code, named):
    with pytest.raises(InputDataError) as caught:
        read_cohort(*spoil(small, content))
    assert caught.value.code == code
    assert caught.value.exit_code == 3
    assert named in str(caught.value)


@pytest.mark.parametrize(
    "role", ["outcome", "subject", "site", "batch", "replicate_of"]
)
def test_unknown_columns_are_refused_with_the_nearest_name(small, role):
    roles = {"outcome": "group", "positive": "case", role: "Clinc"}
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), **roles)
    error = caught.value
    assert error.code == "unknown-column"
    assert error.where == f"samples.csv, {role}"
    assert "the nearest is 'clinic'" in error.accepted
    assert "'group', 'age', 'clinic'" in error.accepted


@pytest.mark.parametrize("role", ["covariates", "nuisance"])
def test_unknown_columns_in_lists(small, role):
    files = small.write()
    with pytest.raises(InputDataError) as caught:
        read_cohort(*files, **{role: ["age", "weight"]})
    assert caught.value.code == "unknown-column"
    with pytest.raises(UsageError) as caught:
        read_cohort(*files, **{role: "age"})
    assert caught.value.code == "list-expected"


def test_columns_cannot_be_named_without_a_sheet(small):
    expression, _ = small.write()
    for named in ({"outcome": "group", "positive": "case"}, {"keep": {"age": ["3"]}}):
        with pytest.raises(UsageError) as caught:
            read_cohort(expression, **named)
        assert caught.value.code == "sample-sheet-missing"
        assert caught.value.exit_code == 2


def test_feature_sheet_follows_the_matrix(small):
    sheet = pd.DataFrame(
        {
            "symbol": ["SIX", "SEVEN", "GONE"],
            "feature": ["F6", "007", "X9"],
            "role": ["control", "", "marker"],
        }
    )
    cohort = read_cohort(*small.write(), features=sheet)
    assert list(cohort.feature_columns["symbol"]) == ["SEVEN", *[""] * 4, "SIX"]
    messages = {item.code: item.message for item in cohort.findings}
    assert "'F6'" in messages["control-features"]
    assert "'X9'" in messages["features-not-in-matrix"]
    assert "4 features" in messages["features-not-in-sheet"]


def test_role_that_does_not_exist(small):
    sheet = pd.DataFrame({"feature": ["F6", "E5"], "role": ["controls", "marker"]})
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), features=sheet)
    assert caught.value.code == "unknown-role"
    assert "F6 (controls)" in caught.value.what
    assert "the nearest is 'control'" in caught.value.accepted


def test_feature_sheet_without_a_single_match(small):
    sheet = pd.DataFrame({"feature": ["f6", "e5"]})
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), features=sheet)
    assert caught.value.code == "no-features-match"
    assert "letter case" in caught.value.what


@pytest.mark.parametrize("argument", ["samples", "features"])
def test_sheets_of_another_type(small, argument):
    expression, _ = small.write()
    with pytest.raises(UsageError) as caught:
        read_cohort(expression, **{argument: 5})
    assert caught.value.code == "sheet-not-understood"
