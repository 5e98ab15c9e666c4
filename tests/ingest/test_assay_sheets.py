"""Feature sheets with platforms, and the sheet of assays."""

import pandas as pd
import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort

FEATURES = ["007", "B_2", "C-3", "d 4", "E5", "F6"]


def refused(small, **options):
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), **options)
    return caught.value


def sheet_of(**columns):
    return pd.DataFrame({"feature": FEATURES, **columns})


def assays_of(*rows):
    return pd.DataFrame(rows, columns=["feature", "analyte", "assay"])


ASSAYS = assays_of(
    ("B_2", "CLDN3", "A-17"), ("E5", "CLDN3", "A-17"), ("007", "MSLN", "A-17"),
    ("F6", "GPC1", ""),
)  # fmt: skip


@pytest.mark.parametrize(
    "columns",
    [
        {"assayable": ["wells; pools", "wells", "", "pools;wells", "", ""]},
        {
            "assayable_wells": ["yes", "Y", "", "1", "no", "0"],
            "assayable_pools": ["true", "n", "no", "yes", "", "false"],
        },
        {
            "assayable": ["wells", "", "", "pools", "", ""],
            "assayable_wells": ["", "1", "", "1", "", ""],
            "assayable_pools": ["1", "", "", "", "", ""],
        },
    ],
)
def test_platforms_in_either_form(small, columns):
    cohort = read_cohort(
        *small.write(), features=sheet_of(**columns), platforms=["pools", "wells"]
    )
    assert list(cohort.feature_columns["assayable"]) == [
        "pools;wells", "wells", "", "pools;wells", "", "",
    ]  # fmt: skip


@pytest.mark.parametrize(
    "columns",
    [
        {"assayable": ["wels", *[""] * 5]},
        {"assayable_wels": ["yes", *[""] * 5]},
        {"assayable_wels": ["no"] * 6},
    ],
)
def test_platforms_that_do_not_exist(small, columns):
    error = refused(small, features=sheet_of(**columns), platforms=["pools", "wells"])
    assert error.code == "unknown-platform"
    assert "'wels'" in error.what
    assert "the nearest is 'wells'" in error.accepted
    # with nothing known of platforms any name goes
    assert read_cohort(*small.write(), features=sheet_of(**columns))


def test_neither_yes_nor_no(small):
    error = refused(small, features=sheet_of(assayable_wells=["perhaps", *["1"] * 5]))
    assert error.code == "assayable-unclear"
    assert "'007' ('perhaps')" in error.what


def test_features_share_analytes_and_assays(small):
    cohort = read_cohort(*small.write(), assays=ASSAYS)
    assert list(cohort.feature_columns["analyte"]) == [
        "MSLN", "CLDN3", "", "", "CLDN3", "GPC1",
    ]  # fmt: skip
    assert list(cohort.feature_columns["assay"]) == ["A-17", "A-17", "", "", "A-17", ""]
    assert len(cohort.assays.to_frame()) == 4
    messages = {item.code: item.message for item in cohort.findings}
    assert "2 features of the matrix" in messages["features-without-analyte"]


def test_from_a_file_it_is_among_the_sources(small, tmp_path):
    path = tmp_path / "assays.csv"
    ASSAYS.to_csv(path, index=False)
    cohort = read_cohort(*small.write(), assays=path)
    assert list(cohort.sources) == ["assays", "expression", "samples"]
    assert list(cohort.feature_columns["assay"])[:2] == ["A-17", "A-17"]


def test_features_that_the_matrix_does_not_have_are_said(small):
    more = pd.concat([ASSAYS, assays_of(("Z9", "LRG1", "A-3"))])
    cohort = read_cohort(*small.write(), assays=more)
    messages = {item.code: item.message for item in cohort.findings}
    assert "'Z9'" in messages["assay-features-not-in-matrix"]
    assert "Z9" not in cohort.assays.feature


@pytest.mark.parametrize(
    ("sheet", "code", "named"),
    [
        (assays_of(("B_2", "X", "1"), ("B_2", "X", "1")), "repeated-ids", "'B_2'"),
        (
            assays_of(("B_2", "X", "1"), ("B_2", "Y", "2")),
            "feature-in-two-analytes",
            "'B_2' (X and Y)",
        ),
        (
            assays_of(("B_2", "X", "1"), ("E5", "X", "2")),
            "analyte-in-two-assays",
            "'X' (1 and 2)",
        ),
        (assays_of(("b_2", "X", "1"), ("e5", "Y", "2")), "no-features-match", "case"),
        (assays_of(("B_2", "", "1")), "blank-id", "'1'"),
        (ASSAYS.rename(columns={"assay": "Assay"}), "unknown-column", "'assay'"),
    ],
)
def test_assay_sheets_that_cannot_be_meant(small, sheet, code, named):
    error = refused(small, assays=sheet)
    assert error.code == code
    assert named in error.what


def test_both_sheets_must_agree_on_the_analyte(small):
    own = sheet_of(analyte=["MSLN", "CLDN4", "LRG1", "", "", ""])
    error = refused(small, features=own, assays=ASSAYS)
    assert error.code == "feature-in-two-analytes"
    assert "'B_2' (CLDN4 and CLDN3)" in error.what
    own.loc[1, "analyte"] = "CLDN3"
    cohort = read_cohort(*small.write(), features=own, assays=ASSAYS)
    assert cohort.feature_columns["analyte"][2] == "LRG1"


def test_assays_of_another_type(small):
    with pytest.raises(UsageError) as caught:
        read_cohort(*small.write(), assays=5)
    assert caught.value.code == "sheet-not-understood"
