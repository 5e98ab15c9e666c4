"""Outcomes of four kinds: coding never silent, wrong cells named by their samples."""

import numpy as np
import pytest
from scipy.stats import CensoredData, ecdf

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.cohort_reader import read_cohort


def finding(cohort, code):
    return next(item for item in cohort.findings if item.code == code)


def refused(small, error, /, **options):
    with pytest.raises(error) as caught:
        read_cohort(*small.write(), **options)
    assert caught.value.exit_code == (3 if error is InputDataError else 2)
    return caught.value


@pytest.fixture
def survival(small):
    """Twenty-four times without ties, every third sample with the event."""
    small.sheet["days"] = [str(10 + 7 * number) for number in range(24)]
    small.sheet["died"] = ["1", "0", "0"] * 8
    return small


ASKED = {"time": "days", "event": "died"}


def flow_of(cohort):
    return {entry.outcome_class: entry for entry in cohort.flow}


def test_survival_is_read(survival):
    cohort = read_cohort(*survival.write(), **ASKED, time_unit="days", horizon=100)
    outcome = cohort.outcome
    assert (outcome.kind, outcome.column, outcome.event_column) == (
        "survival", "days", "died",
    )  # fmt: skip
    assert outcome.values.tolist() == [10.0 + 7 * number for number in range(24)]
    assert outcome.event.tolist() == [True, False, False] * 8
    assert (outcome.unit, outcome.horizon) == ("days", 100)
    assert outcome.event_codes == ("1", "0")
    assert outcome.groups[0] == ("censored", "event")
    assert list(outcome.to_frame().columns) == ["time", "event"]
    assert flow_of(cohort)["event"].analysed == 8
    assert flow_of(cohort)["censored"].analysed == 16
    said = finding(cohort, "events").message
    assert "8 with the event (code '1' of 'died'), 16 censored ('0')" in said


def test_median_follow_up_is_that_of_exchanged_roles(survival):
    """Reference: scipy's product-limit estimate with events as the censored ones."""
    cohort = read_cohort(*survival.write(), **ASKED, time_unit="days")
    time, event = cohort.outcome.values, cohort.outcome.event
    curve = ecdf(CensoredData(uncensored=time[~event], right=time[event])).sf
    median = curve.quantiles[np.argmax(curve.probabilities <= 0.5)]
    said = finding(cohort, "events").message
    assert said.endswith(f"median follow-up {median:.3g} days")


def test_samples_without_follow_up_leave_with_a_reason(survival):
    survival.sheet.loc[[3, 4], ["days", "died"]] = ["", "NA"]
    cohort = read_cohort(*survival.write(), **ASKED)
    assert cohort.n_samples == 22
    assert [(d.id, d.reason) for d in cohort.dropped] == [
        ("0004", "no outcome"), ("0005", "no outcome"),
    ]  # fmt: skip
    assert (flow_of(cohort)[""].matched, flow_of(cohort)[""].with_outcome) == (2, 0)


@pytest.mark.parametrize(
    ("column", "cell", "code"),
    [
        ("days", "", "time-missing"),
        ("died", "", "event-missing"),
        ("days", "long", "time-not-numeric"),
        ("days", "inf", "time-not-numeric"),
        ("days", "0", "time-not-positive"),
        ("days", "-3.5", "time-not-positive"),
        ("died", "2", "other-event-codes"),
    ],
)
def test_cells_that_cannot_be_meant_are_named(survival, column, cell, code):
    survival.sheet.loc[6, column] = cell
    error = refused(survival, InputDataError, **ASKED)
    assert error.code == code
    assert repr(column) in error.where
    if code != "other-event-codes":
        assert "'0007'" in error.what
    # a sample that is filtered out need not be in order
    kept = read_cohort(*survival.write(), **ASKED, keep={"age": {"min": 37}})
    assert kept.n_samples == 17


def test_competing_events_are_refused_with_both_ways_out(survival):
    survival.sheet.loc[[1, 2, 4], "died"] = "2"
    error = refused(survival, InputDataError, **ASKED)
    assert "'2' (3)" in error.what
    assert "compete" in error.accepted
    assert "censored at its time" in error.next_step


@pytest.mark.parametrize(
    ("codes", "meaning"),
    [(("2", "1"), (2, 1)), (("dead", "alive"), ("dead", "alive"))],
)
def test_other_codes_need_their_meaning(survival, codes, meaning):
    survival.sheet["died"] = [codes[0], codes[1], codes[1]] * 8
    error = refused(survival, UsageError, **ASKED)
    assert error.code == "event-coding-missing"
    assert f"{codes[1]!r} (16)" in error.what
    half = refused(survival, UsageError, **ASKED, event_value=meaning[0])
    assert half.code == "event-coding-missing"
    cohort = read_cohort(
        *survival.write(), **ASKED, event_value=meaning[0], censored_value=meaning[1]
    )
    assert cohort.outcome.event.tolist() == [True, False, False] * 8
    assert cohort.outcome.event_codes == codes


def test_codes_as_other_programs_write_them(survival):
    survival.sheet["died"] = ["1.0", "0.0", "0.0"] * 8
    assert read_cohort(*survival.write(), **ASKED).outcome.event.sum() == 8


def test_codes_that_do_not_occur_or_are_equal(survival):
    error = refused(
        survival, InputDataError, **ASKED, event_value="yes", censored_value="0"
    )
    assert error.code == "class-missing"
    error = refused(survival, UsageError, **ASKED, event_value="1", censored_value="1")
    assert error.code == "classes-equal"


def test_too_few_events(survival):
    survival.sheet["died"] = ["1"] * 3 + ["0"] * 21
    assert refused(survival, InputDataError, **ASKED).code == "too-few-events"


def test_a_horizon_that_nobody_reached(survival):
    cohort = read_cohort(*survival.write(), **ASKED, horizon=5000)
    assert "5,000" in finding(cohort, "horizon-beyond-follow-up").message


def test_classes_in_the_order_asked_for(small):
    small.sheet["group"] = ["mild", "none", "severe", "lost"] * 6
    cohort = read_cohort(
        *small.write(), outcome="group", classes=["none", "mild", "severe"]
    )
    assert cohort.outcome.classes == ("none", "mild", "severe")
    assert cohort.outcome.values[:3].tolist() == [1.0, 0.0, 2.0]
    assert cohort.n_samples == 18
    assert "'lost'" in finding(cohort, "other-classes").message
    assert list(flow_of(cohort)) == ["none", "mild", "severe", "lost", ""]
    assert "'none' 6, 'mild' 6, 'severe' 6" in finding(cohort, "class-sizes").message


def test_all_classes_of_a_column_once_the_kind_is_stated(small):
    small.sheet["group"] = ["2", "10", "1"] * 8
    cohort = read_cohort(*small.write(), outcome="group", kind="classes")
    assert cohort.outcome.classes == ("1", "10", "2")


@pytest.mark.parametrize(
    ("options", "kind", "code"),
    [
        ({"classes": ["case", "control"]}, UsageError, "classes-too-few"),
        ({"classes": ["a", "a", "b"]}, UsageError, "classes-too-few"),
        ({"classes": ["case", "control", "x"]}, InputDataError, "class-missing"),
        ({"kind": "classes"}, InputDataError, "fewer-than-three-classes"),
    ],
)
def test_classes_that_cannot_be_meant(small, options, kind, code):
    assert refused(small, kind, outcome="group", **options).code == code


def test_a_class_that_the_filters_took(small):
    small.sheet["group"] = ["a", "b", "c"] * 8
    error = refused(
        small, InputDataError, outcome="group", classes=["a", "b", "c"],
        keep={"group": ["a", "b"]},
    )  # fmt: skip
    assert error.code == "class-without-samples"
    assert "'c'" in error.what


def test_a_number_with_its_unit(small):
    small.sheet.loc[5, "age"] = "NA"
    cohort = read_cohort(*small.write(), outcome="age", kind="number", unit="years")
    assert (cohort.outcome.kind, cohort.outcome.unit) == ("number", "years")
    assert cohort.outcome.values[:3].tolist() == [30.0, 31.0, 32.0]
    assert cohort.n_samples == 23
    assert cohort.dropped[0].id == "0006"
    assert "from 30 to 53 years" in finding(cohort, "outcome-range").message
    assert flow_of(cohort)["number"].analysed == 23


def test_numbers_that_are_none_are_named(small):
    small.sheet.loc[[2, 9], "age"] = ["old", "4,5"]
    error = refused(small, InputDataError, outcome="age", kind="number")
    assert error.code == "outcome-not-numeric"
    assert "got 2: '0003' ('old'), '0010' ('4,5')" in error.what


def test_a_constant_and_a_code_are_no_numbers_to_learn_from(small):
    small.sheet["grade"] = ["1", "2", "3"] * 8
    cohort = read_cohort(*small.write(), outcome="grade", kind="number")
    assert "'1', '2', '3'" in finding(cohort, "outcome-few-values").message
    small.sheet["grade"] = "1"
    error = refused(small, InputDataError, outcome="grade", kind="number")
    assert error.code == "outcome-constant"


@pytest.mark.parametrize(
    ("options", "code"),
    [
        ({"kind": "ordinal", "outcome": "age"}, "outcome-kind-unknown"),
        ({"time": "age"}, "outcome-missing"),
        ({"event": "group"}, "outcome-missing"),
        ({"kind": "number"}, "outcome-missing"),
        ({"horizon": 5.0}, "outcome-missing"),
        ({"classes": ["a", "b", "c"]}, "outcome-missing"),
        (
            {"outcome": "age", "kind": "number", "positive": "x"},
            "outcome-contradiction",
        ),
        (
            {"outcome": "group", "positive": "case", "unit": "mg"},
            "outcome-contradiction",
        ),
        (
            {"outcome": "group", "time": "age", "event": "group"},
            "outcome-contradiction",
        ),
        (
            {"time": "age", "event": "group", "horizon": 0.0},
            "horizon-not-positive",
        ),
    ],
)
def test_outcomes_that_contradict_themselves(small, options, code):
    assert refused(small, UsageError, **options).code == code


def test_a_subject_with_two_outcomes(survival):
    survival.sheet["person"] = ["A", "A", *[f"p{i}" for i in range(22)]]
    cohort = read_cohort(*survival.write(), **ASKED, subject="person")
    several = finding(cohort, "subject-with-several-outcomes")
    assert several.severity == "stop"
    assert "'A'" in several.message
