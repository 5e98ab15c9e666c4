"""Folds: grouped by subject, stratified by outcome, balanced, repeated."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from panelkit.costing import draw_folds, given_folds
from panelkit.errors import FitError


def generators(seed, n_repeats=2):
    return [np.random.default_rng([seed, repeat]) for repeat in range(n_repeats)]


def cohort(seed, n_controls, n_cases, rows_per_subject):
    draws = np.random.default_rng(seed)
    classes = np.repeat([0.0, 1.0], [n_controls, n_cases])
    labels = draws.permutation(500)[: len(classes)]  # codes with gaps
    counts = draws.integers(1, rows_per_subject + 1, len(classes))
    order = draws.permutation(counts.sum())
    return np.repeat(labels, counts)[order], np.repeat(classes, counts)[order]


@settings(derandomize=True, deadline=None, max_examples=80, database=None)
@given(
    seed=st.integers(0, 10_000),
    n_folds=st.integers(2, 6),
    n_controls=st.integers(6, 25),
    n_cases=st.integers(6, 25),
    rows_per_subject=st.integers(1, 4),
)
def test_what_holds_for_every_draw(
    seed, n_folds, n_controls, n_cases, rows_per_subject
):
    subjects, y = cohort(seed, n_controls, n_cases, rows_per_subject)
    plan = draw_folds(subjects, y, n_folds, generators(seed))
    assert (plan.n_folds, plan.n_repeats) == (n_folds, 2)
    for repeat in range(2):
        counts = np.zeros((n_folds, 2), int)
        tested = []
        for fold in range(n_folds):
            training, test = plan.split(repeat, fold)
            assert sorted([*training, *test]) == list(range(len(y)))
            assert not np.intersect1d(subjects[training], subjects[test]).size
            for value in (0, 1):
                counts[fold, value] = len(np.unique(subjects[test][y[test] == value]))
            tested.extend(test.tolist())
        assert sorted(tested) == list(range(len(y)))  # everybody exactly once
        assert (np.ptp(counts, axis=0) <= 1).all()
        assert np.ptp(counts.sum(axis=1)) <= 1


def test_seven_cases_of_twenty_in_five_folds():
    # exact: positives 1, 1, 1, 2, 2 in some order, four samples in every fold
    y = np.repeat([1.0, 0.0], [7, 13])
    plan = draw_folds(np.arange(20), y, 5, generators(1, 20))
    for repeat in range(20):
        folds = [plan.split(repeat, fold)[1] for fold in range(5)]
        assert sorted(int(y[test].sum()) for test in folds) == [1, 1, 1, 2, 2]
        assert [len(test) for test in folds] == [4, 4, 4, 4, 4]


def test_repeats_are_other_partitions_and_do_not_depend_on_each_other():
    subjects, y = cohort(2, 20, 20, 1)
    plan = draw_folds(subjects, y, 5, generators(2, 10))
    assert len({row.tobytes() for row in plan.test_fold}) == 10
    alone = draw_folds(subjects, y, 5, [generators(2, 10)[7]])
    assert alone.test_fold[0].tolist() == plan.test_fold[7].tolist()


def test_any_two_subjects_can_meet():
    # folds drawn in blocks of the sheet's order would keep neighbours together
    y = np.arange(20) % 2 * 1.0
    plan = draw_folds(np.arange(20), y, 5, generators(3, 300))
    together = np.mean(
        [
            [row[i] == row[j] for i in range(20) for j in range(i)]
            for row in plan.test_fold
        ],
        axis=0,
    )
    # own class 1/9, other class 1/5 on average; 5 standard errors of 300 draws
    assert together.min() > 0.02
    assert together.max() < 0.32


def test_rows_that_are_not_measured_do_not_count_as_subjects():
    subjects = np.repeat(np.arange(6), 5)
    y = np.repeat([0.0, 1.0], 15)
    with pytest.raises(FitError) as caught:
        draw_folds(subjects, y, 4, generators(4))
    assert caught.value.code == "too-few-for-folds"
    assert "3 subjects" in caught.value.what


@pytest.mark.parametrize("n_folds", [0, 1, 5])
def test_impossible_numbers_of_folds_are_refused(n_folds):
    y = np.repeat([0.0, 1.0], [10, 4])
    with pytest.raises(FitError) as caught:
        draw_folds(np.arange(14), y, n_folds, generators(5))
    assert caught.value.code == "too-few-for-folds"
    assert "4 subjects in the smaller class" in caught.value.what


def test_leave_one_pair_out_is_possible():
    y = np.repeat([0.0, 1.0], 4)
    plan = draw_folds(np.arange(8), y, 4, generators(6, 1))
    for fold in range(4):
        assert y[plan.split(0, fold)[1]].tolist() == [0.0, 1.0]


@settings(derandomize=True, deadline=None, max_examples=60, database=None)
@given(
    seed=st.integers(0, 10_000),
    n_both=st.integers(4, 20),
    n_cases=st.integers(0, 6),
    n_controls=st.integers(0, 6),
)
def test_matched_sets_of_both_classes_are_spread_evenly(
    seed, n_both, n_cases, n_controls
):
    """Sets of a case and one to three controls, and samples without a partner."""
    draws = np.random.default_rng(seed)
    sets = [[1.0] + [0.0] * draws.integers(1, 4) for _ in range(n_both)]
    sets += [[1.0]] * n_cases + [[0.0]] * n_controls
    unit = np.repeat(np.arange(len(sets)), [len(each) for each in sets])
    y = np.concatenate([np.array(each) for each in sets])
    order = draws.permutation(len(y))
    unit, y = unit[order], y[order]
    plan = draw_folds(unit, y, 4, generators(seed))
    for repeat in range(2):
        counts = []
        for fold in range(4):
            training, test = plan.split(repeat, fold)
            assert not np.intersect1d(unit[training], unit[test]).size
            assert set(y[test]) == {0.0, 1.0}
            counts.append(len(np.unique(unit[test][unit[test] < n_both])))
        assert np.ptp(counts) <= 1


def test_given_folds_are_one_repeat():
    plan = given_folds(np.array([2, 0, 1, 0]))
    assert (plan.n_repeats, plan.n_folds) == (1, 3)
    assert [plan.split(0, fold)[1].tolist() for fold in range(3)] == [[1, 3], [2], [0]]
