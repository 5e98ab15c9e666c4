"""Which way round, and which samples: decided by ids, refused where unclear."""

import numpy as np
import pytest

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort


def finding(cohort, code):
    return next(item for item in cohort.findings if item.code == code)


@pytest.mark.parametrize(
    ("change", "hint"),
    [
        (lambda name: name.lstrip("0"), "leading zeros"),
        (lambda name: f"{name} ", "blanks"),
        (lambda name: f"P-{name}", None),
    ],
)
def test_no_match_names_both_sides_and_the_likely_reason(small, change, hint):
    small.sheet["sample_id"] = small.sheet["sample_id"].map(change)
    with pytest.raises(InputDataError) as caught:
        read_cohort(*small.write(), outcome="group", positive="case")
    error = caught.value
    assert error.code == "no-ids-match"
    assert error.exit_code == 3
    assert repr(small.sheet["sample_id"][0]) in error.what
    assert "'0001'" in error.what
    assert "'007'" in error.what
    assert "24" in error.what
    assert (hint is None) or (hint in error.what)


def test_letter_case_is_given_as_the_reason(small):
    small.matrix.index = [f"s{name}" for name in small.matrix.index]
    small.sheet["sample_id"] = [f"S{name}" for name in small.sheet["sample_id"]]
    with pytest.raises(InputDataError, match="but for letter case") as caught:
        read_cohort(*small.write())
    assert caught.value.code == "no-ids-match"


def test_ids_on_both_sides_are_refused_unless_the_word_is_given(small):
    small.matrix.columns = ["0001", "0002", "0003", "C", "D", "E"]
    files = small.write()
    with pytest.raises(InputDataError) as caught:
        read_cohort(*files)
    assert caught.value.code == "orientation-unclear"
    assert "24 in the first column, 3 in the header" in caught.value.what
    cohort = read_cohort(*files, orientation="samples-in-rows")
    assert cohort.n_samples == 24
    turned = read_cohort(*files, orientation="features-in-rows")
    assert list(turned.samples) == ["0001", "0002", "0003"]


def test_a_single_accidental_hit_does_not_make_it_unclear(small):
    small.matrix.columns = ["0001", "B", "C", "D", "E", "F"]
    assert read_cohort(*small.write()).n_samples == 24


def test_word_that_is_no_orientation(small):
    with pytest.raises(UsageError) as caught:
        read_cohort(*small.write(), orientation="samples-in-row")
    assert caught.value.code == "unknown-orientation"
    assert caught.value.exit_code == 2
    assert "samples-in-rows" in caught.value.accepted


def test_samples_of_one_side_only_are_named_and_counted(small):
    files = small.write()
    small.matrix.iloc[2:].to_csv(files[0])
    small.sheet.iloc[:-1].to_csv(files[1], index=False)
    cohort = read_cohort(*files, outcome="group", positive="case")
    assert cohort.n_samples == 21
    reverse = finding(cohort, "samples-not-in-matrix")
    assert "2 of 23" in reverse.message
    assert "'0001', '0002'" in reverse.message
    assert "'0024'" in finding(cohort, "samples-not-in-sheet").message
    reasons = {drop.id: drop.reason for drop in cohort.dropped}
    assert reasons == {
        "0001": "not in the expression matrix",
        "0002": "not in the expression matrix",
        "0024": "not in the sample sheet",
    }


def test_analysed_samples_follow_the_sheet(small):
    small.sheet = small.sheet.iloc[::-1]
    cohort = read_cohort(*small.write(), outcome="group", positive="case")
    assert list(cohort.samples) == list(small.sheet["sample_id"])
    assert np.array_equal(cohort.X, small.matrix.to_numpy()[::-1])
    assert list(cohort.sample_columns["age"]) == list(small.sheet["age"])


def test_ids_that_differ_by_case_only_are_noticed(small):
    small.matrix.columns = ["abc", "ABC", "c", "d", "e", "f"]
    cohort = read_cohort(*small.write())
    assert "'abc', 'ABC'" in finding(cohort, "ids-nearly-equal").message
