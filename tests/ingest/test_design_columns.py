"""Matched sets, run order, the user's folds, and designs that contradict them."""

import numpy as np
import pytest

from panelkit.errors import InputDataError, StudyFileError
from panelkit.ingest.cohort_reader import read_cohort

OUTCOME = {"outcome": "group", "positive": "case"}
MATCHED = {**OUTCOME, "matched_set": "pair", "design": "matched"}


@pytest.fixture
def paired(small):
    """Twelve pairs of a case and a control, in neighbouring rows."""
    small.sheet["pair"] = [f"set {number // 2}" for number in range(24)]
    return small


def finding(cohort, code):
    return next(item for item in cohort.findings if item.code == code)


def codes_of(cohort):
    return [item.code for item in cohort.findings]


def test_pairs_are_coded_in_order_of_first_row(paired):
    design = read_cohort(*paired.write(), **MATCHED).design
    assert design.matched_set.tolist() == [number // 2 for number in range(24)]
    assert design.matched_set_ids[3] == "set 3"
    assert design.blocks.tolist() == design.matched_set.tolist()
    assert design.kind == "matched"


def test_pairs_in_order_raise_no_finding(paired):
    said = codes_of(read_cohort(*paired.write(), **MATCHED))
    assert not [code for code in said if "matched" in code or "two-sets" in code]


def test_sets_without_a_contrast_are_said(paired):
    """A filter took the partner of one; another holds two cases; one is blank."""
    paired.sheet.loc[[2, 3], "group"] = "case"
    paired.sheet.loc[23, "pair"] = ""
    cohort = read_cohort(*paired.write(), **MATCHED, keep={"age": {"min": 31}})
    said = finding(cohort, "matched-set-one-class")
    assert said.severity == "warning"
    assert "3 of 12 matched sets" in said.message
    assert "2 of them are one sample alone" in said.message
    assert "'set 0', 'set 1', 'set 11'" in said.message
    assert "'0024'" in finding(cohort, "matched-set-blank").message
    assert cohort.design.matched_set[-1] == -1


def test_no_set_with_a_contrast_stops(paired):
    paired.sheet["pair"] = paired.sheet["group"]
    cohort = read_cohort(*paired.write(), **MATCHED)
    assert finding(cohort, "matched-set-one-class").severity == "stop"


def test_a_person_in_two_sets_joins_them(paired):
    paired.sheet["person"] = [f"p{number}" for number in range(24)]
    paired.sheet.loc[8, "person"] = "p0"
    cohort = read_cohort(*paired.write(), **MATCHED, subject="person")
    assert "'p0'" in finding(cohort, "subject-in-two-sets").message
    blocks = cohort.design.blocks
    assert blocks[[0, 1, 8, 9]].tolist() == [0, 0, 0, 0]
    assert len(np.unique(blocks)) == 11


@pytest.mark.parametrize(
    ("options", "code"),
    [
        ({**OUTCOME, "design": "matched"}, "matched-without-sets"),
        ({**OUTCOME, "matched_set": "pair"}, "sets-without-matched"),
        (
            {**OUTCOME, "matched_set": "pair", "design": "case-control"},
            "sets-without-matched",
        ),
        ({**OUTCOME, "prevalence": 1.0}, "prevalence-out-of-range"),
        (
            {"outcome": "age", "kind": "number", "design": "case-control"},
            "design-needs-two-classes",
        ),
        (
            {"outcome": "age", "kind": "number", "prevalence": 0.1},
            "design-needs-two-classes",
        ),
    ],
)
def test_designs_that_contradict_themselves(paired, options, code):
    with pytest.raises(StudyFileError) as caught:
        read_cohort(*paired.write(), **options)
    assert caught.value.code == code
    assert caught.value.exit_code == 2


def test_design_and_prevalence_travel_with_the_cohort(small):
    cohort = read_cohort(
        *small.write(), **OUTCOME, design="case-control", prevalence=0.02
    )
    assert (cohort.design.kind, cohort.design.prevalence) == ("case-control", 0.02)


def test_run_order_is_a_number(small):
    small.sheet["place"] = [str(24 - number) for number in range(24)]
    small.sheet.loc[0, "place"] = ""
    order = read_cohort(*small.write(), run_order="place").design.run_order
    assert np.isnan(order[0])
    assert order[1:3].tolist() == [23.0, 22.0]
    small.sheet.loc[4, "place"] = "last"
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), run_order="place")
    assert caught.value.code == "run-order-not-numeric"
    assert "'0005' ('last')" in caught.value.what


def test_an_outcome_measured_in_order_is_noticed(small):
    """All cases first: what drifts in the run would pass for the disease."""
    small.sheet["group"] = ["case"] * 12 + ["control"] * 12
    small.sheet["place"] = [str(number) for number in range(24)]
    cohort = read_cohort(*small.write(), **OUTCOME, run_order="place")
    tied = [item for item in cohort.findings if item.code.startswith("outcome-tied")]
    assert tied
    assert "'place'" in tied[0].where


def test_given_folds_are_coded(small):
    small.sheet["fold"] = ["b", "b", "a", "c"] * 6
    small.sheet["fold"] = [f"f{number // 2 % 3}" for number in range(24)]
    design = read_cohort(*small.write(), **OUTCOME, folds="fold").design
    assert design.fold[:6].tolist() == [0, 0, 1, 1, 2, 2]
    assert list(design.fold_ids) == ["f0", "f1", "f2"]


def spoil_one(sheet):
    sheet["fold"] = "only"


def spoil_blank(sheet):
    sheet.loc[7, "fold"] = ""


def spoil_subject(sheet):
    sheet["person"] = [f"p{number % 12}" for number in range(24)]
    sheet["fold"] = ["x"] * 12 + ["y"] * 12


def spoil_training(sheet):
    sheet["fold"] = ["x" if g == "case" else "y" for g in sheet["group"]]


@pytest.mark.parametrize(
    ("spoil", "code", "named"),
    [
        (spoil_one, "folds-too-few", "'only'"),
        (spoil_blank, "blank-fold", "'0008'"),
        (spoil_subject, "folds-split", "'p4' and 7 more"),
        (spoil_training, "fold-training-one-class", "'case'"),
    ],
)
def test_folds_that_cannot_judge(small, spoil, code, named):
    small.sheet["fold"] = [f"f{number // 2 % 3}" for number in range(24)]
    small.sheet["person"] = small.sheet["sample_id"]
    spoil(small.sheet)
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), **OUTCOME, folds="fold", subject="person")
    assert caught.value.code == code
    assert named in caught.value.what


def test_folds_must_not_split_a_matched_set(paired):
    paired.sheet["fold"] = ["x", "y", "y", "x"] * 6
    with pytest.raises(InputDataError) as caught:
        read_cohort(*paired.write(), **MATCHED, folds="fold")
    assert caught.value.code == "folds-split"
    assert "12 matched sets lie" in caught.value.what


def test_folds_with_one_class_are_said(small):
    small.sheet["fold"] = ["x"] * 8 + ["y"] * 8 + ["z"] * 8
    small.sheet.loc[16:, "group"] = "control"
    cohort = read_cohort(*small.write(), **OUTCOME, folds="fold")
    said = finding(cohort, "folds-with-one-class")
    assert said.severity == "warning"
    assert "1 of 3 folds" in said.message
    assert "'z'" in said.message


def test_folds_are_looked_at_without_an_outcome_too(small):
    small.sheet["fold"] = "only"
    with pytest.raises(InputDataError):
        read_cohort(*small.write(), folds="fold")


def test_the_sheet_of_another_study_is_told_from_a_misspelt_column(small):
    """A missing column alone would send people to the wrong place."""
    small.sheet["sample_id"] = [f"GSM{number}" for number in range(24)]
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), outcome="relapse", positive="yes", subject="who")
    assert caught.value.code == "no-ids-match"
    said = str(caught.value)
    assert "24 sample ids of the sheet ('GSM0', 'GSM1', 'GSM2' and 21 more)" in said
    assert "24 ids of the matrix's first column ('0001', '0002', '0003'" in said
    assert "nor has the sheet a column 'relapse', 'who'" in said
    assert "same study" in said
