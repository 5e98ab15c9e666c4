"""From received to analysed rows: nothing silent, every step counted."""

import numpy as np
import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort


def finding(cohort, code):
    return next(item for item in cohort.findings if item.code == code)


def refused(kind, *files, **options):
    with pytest.raises(kind) as caught:
        read_cohort(*files, **options)
    return caught.value


def test_positive_class_is_never_guessed(small):
    error = refused(UsageError, *small.write(), outcome="group")
    assert error.code == "positive-class-missing"
    assert error.exit_code == 2
    assert "'case' (12), 'control' (12)" in error.accepted


def test_classes_that_do_not_occur_or_are_equal(small):
    files = small.write()
    error = refused(InputDataError, *files, outcome="group", positive="Case")
    assert error.code == "class-missing"
    assert "the nearest is 'case'" in error.accepted
    error = refused(
        UsageError, *files, outcome="group", positive="case", negative="case"
    )
    assert error.code == "classes-equal"
    error = refused(UsageError, *files, positive="case")
    assert error.code == "outcome-missing"


def test_outcome_points_to_the_positive_class(small):
    cohort = read_cohort(*small.write(), outcome="group", positive="case")
    assert cohort.outcome.negative == "control"
    assert cohort.outcome.values.tolist() == [1.0, 0.0] * 12


def test_numbers_as_classes_are_taken_as_written(small):
    small.sheet["group"] = ["1", "0"] * 12
    cohort = read_cohort(*small.write(), outcome="group", positive=1)
    assert cohort.outcome.positive == "1"


def test_a_class_called_none_counts_once_it_is_named(small):
    small.sheet["group"] = ["disease", "none"] * 12
    files = small.write()
    cohort = read_cohort(*files, outcome="group", positive="disease", negative="none")
    assert cohort.n_samples == 24
    error = refused(InputDataError, *files, outcome="group", positive="disease")
    assert error.code == "one-class-only"


def test_third_class_needs_a_negative_and_is_then_counted(small):
    small.sheet.loc[:3, "group"] = "other"
    small.sheet.loc[4, "group"] = "NA"
    files = small.write()
    error = refused(InputDataError, *files, outcome="group", positive="case")
    assert error.code == "more-than-two-classes"
    assert "'other' (4)" in error.what
    cohort = read_cohort(*files, outcome="group", positive="case", negative="control")
    assert "'other'" in finding(cohort, "other-classes").message
    assert "1 sample has" in finding(cohort, "outcome-blank").message
    flow = {entry.outcome_class: entry for entry in cohort.flow}
    assert list(flow) == ["case", "control", "other", ""]
    assert (flow["other"].received, flow["other"].with_outcome) == (4, 0)
    assert (flow[""].matched, flow[""].with_outcome) == (1, 0)
    reasons = [drop.reason for drop in cohort.dropped]
    assert reasons == ["outcome is 'other'"] * 4 + ["no outcome"]


def test_classes_are_settled_after_the_row_filters(small):
    small.sheet.loc[:11, "group"] = ["other", "case"] * 6
    cohort = read_cohort(
        *small.write(), outcome="group", positive="case", keep={"clinic": ["south"]}
    )
    assert cohort.outcome.negative == "control"
    assert cohort.n_samples == 12


def test_one_class_only_and_too_few_subjects(small):
    files = small.write()
    error = refused(
        InputDataError, *files, outcome="group", positive="case", keep={"group": "case"}
    )
    assert error.code == "one-class-only"
    assert error.exit_code == 3
    assert "'case' (12)" in error.what
    error = refused(
        InputDataError, *files, outcome="group", positive="case",
        keep={"age": {"max": 36}},
    )  # fmt: skip
    assert error.code == "too-few-subjects"
    assert "'control' (3)" in error.what


def test_few_subjects_in_a_class_are_a_warning(small):
    cohort = read_cohort(
        *small.write(), outcome="group", positive="case", keep={"age": {"max": 45}}
    )
    few = finding(cohort, "few-subjects")
    assert few.severity == "warning"
    assert "'case' has 8" in few.message


def test_values_and_ranges_filter_rows_and_are_counted(small):
    small.sheet.loc[0, "age"] = ""
    small.sheet.loc[1, "age"] = "old"
    cohort = read_cohort(
        *small.write(), keep={"clinic": ["north", "west"], "age": {"min": 35}}
    )
    assert list(cohort.samples) == [f"{number:04d}" for number in range(6, 13)]
    assert "'old'" in finding(cohort, "keep-cells-not-numeric").message
    assert "'west'" in finding(cohort, "keep-value-absent").message
    reasons = {drop.id: drop.reason for drop in cohort.dropped}
    assert reasons["0003"] == "age is not at least 35"
    assert reasons["0024"] == "clinic is not 'north' or 'west'"
    flow = cohort.flow[0]
    assert (flow.received, flow.matched, flow.kept, flow.analysed) == (24, 24, 7, 7)


@pytest.mark.parametrize(
    "wanted",
    [
        [],
        {},
        {"least": 3},
        {"min": "x"},
        {"min": 5, "max": 4},
        {"min": 5, "to": 9},
        {"from": "2019-13"},
        {"from": "2019-02-30"},
        {"from": "2020", "to": "2019-12-31"},
        {"from": 3, "to": "2019"},
    ],
)
def test_filters_that_cannot_be_meant(small, wanted):
    error = refused(UsageError, *small.write(), keep={"age": wanted})
    assert error.code == "keep-not-understood"
    assert "'age'" in error.where


def test_filter_that_leaves_nothing(small):
    error = refused(InputDataError, *small.write(), keep={"clinic": ["North"]})
    assert error.code == "nothing-kept"
    assert "the nearest is 'north'" in error.accepted


def test_technical_replicates_are_left_out_and_said(small):
    small.sheet["copy_of"] = ""
    small.sheet.loc[20:23, "copy_of"] = ["0001", "0002", "0099", "0024"]
    cohort = read_cohort(
        *small.write(), outcome="group", positive="case", replicate_of="copy_of"
    )
    assert cohort.n_samples == 21  # the last row names itself: it is the original
    assert "3 samples" in finding(cohort, "technical-replicates").message
    assert "'0099'" in finding(cohort, "replicate-of-unknown-sample").message
    assert cohort.dropped[0].reason == "technical replicate"
    assert sum(entry.kept - entry.analysed for entry in cohort.flow) == 3


def test_subjects_share_one_weight(small):
    small.sheet["person"] = ["B", "A", "B", "A", *[f"p{i}" for i in range(20)]]
    cohort = read_cohort(
        *small.write(), outcome="group", positive="case", subject="person"
    )
    design = cohort.design
    assert design.subject[:5].tolist() == [0, 1, 0, 1, 2]
    assert list(design.subject_ids[:2]) == ["B", "A"]
    assert design.n_subjects == 22
    assert np.isclose(design.weights.sum(), 1.0)
    assert np.allclose(design.weights[:5] * 22, [0.5, 0.5, 0.5, 0.5, 1.0])
    assert "up to 2" in finding(cohort, "several-samples-per-subject").message
    assert "'case' 12 of 11 subjects" in finding(cohort, "class-sizes").message


def test_blank_subjects_are_refused_by_name(small):
    small.sheet["person"] = small.sheet["sample_id"]
    small.sheet.loc[[3, 7], "person"] = ["", "NA"]
    error = refused(InputDataError, *small.write(), subject="person")
    assert error.code == "blank-subject"
    assert "'0004', '0008'" in error.what


def test_subject_with_both_classes_stops(small):
    small.sheet["person"] = ["twice", "twice", *[f"p{i}" for i in range(22)]]
    cohort = read_cohort(
        *small.write(), outcome="group", positive="case", subject="person"
    )
    both = finding(cohort, "subject-in-both-classes")
    assert both.severity == "stop"
    assert "'twice'" in both.message


def test_no_outcome_keeps_every_matched_row(small):
    cohort = read_cohort(*small.write())
    assert cohort.outcome is None
    assert len(cohort.flow) == 1
    assert cohort.flow[0].analysed == 24
    assert np.allclose(cohort.design.weights, 1 / 24)
