"""Intervals and standard errors of cross-validated figures."""

from statistics import NormalDist

import numpy as np
import pytest

from panelkit.metrics import auc, corrected_se, cross_validated_auc, naive_se

OUTCOME = np.repeat([1.0, 0.0], [7, 8])
MARKER = np.array([9, 8, 8, 7, 6, 5, 3, 7, 6, 5, 4, 4, 3, 2, 1], float)


def standard_error(found, confidence=0.95):
    """Return the standard error behind an interval on the log-odds scale."""
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    low, high = (np.log(v / (1.0 - v)) for v in (found.low, found.high))
    return (high - low) / (2.0 * z) * found.mean * (1.0 - found.mean)


def one_fold(scores=MARKER, outcome=OUTCOME, subjects=None, fold=None, weights=None):
    n = len(outcome)
    return cross_validated_auc(
        np.atleast_2d(scores),
        outcome,
        np.zeros((1, n), int) if fold is None else np.atleast_2d(fold),
        np.arange(n) if subjects is None else subjects,
        np.ones(n) if weights is None else weights,
        0.95,
    )


@pytest.fixture
def repeated():
    """Return scores, outcome, folds of two repeats of three folds over 30 samples."""
    draws = np.random.default_rng(0)
    outcome = np.arange(30) % 2 * 1.0
    scores = draws.normal(size=(2, 30)) + outcome
    folds = np.array([np.arange(30) // 2 % 3, np.arange(30) // 10])
    return scores, outcome, folds


def test_single_fold_holds_delongs_variance():
    # exact: DeLong, DeLong & Clarke-Pearson 1988; pROC 1.18.0 agrees
    found = one_fold()
    assert found.mean == pytest.approx(23 / 28)
    assert standard_error(found) ** 2 == pytest.approx(5 / 384, abs=1e-12)


def test_interval_is_symmetric_on_the_log_odds_scale():
    found = one_fold()
    centre = np.log(found.mean / (1.0 - found.mean))
    low, high = (np.log(v / (1.0 - v)) for v in (found.low, found.high))
    assert centre - low == pytest.approx(high - centre)
    assert 0.0 < found.low < found.mean < found.high < 1.0


def test_every_row_twice_counts_once_when_subjects_are_known():
    twice = {"scores": np.repeat(MARKER, 2), "outcome": np.repeat(OUTCOME, 2)}
    single = standard_error(one_fold()) ** 2
    clustered = standard_error(one_fold(**twice, subjects=np.repeat(np.arange(15), 2)))
    naive = standard_error(one_fold(**twice))
    assert clustered**2 == pytest.approx(single)
    assert naive**2 < 0.5 * clustered**2  # thirty units instead of fifteen


def test_mean_is_taken_within_folds_then_over_repeats(repeated):
    scores, outcome, folds = repeated
    found = cross_validated_auc(
        scores, outcome, folds, np.arange(30), np.ones(30), 0.95
    )
    for repeat in range(2):
        for fold in range(3):
            test = folds[repeat] == fold
            assert found.per_fold[repeat, fold] == auc(
                scores[repeat, test], outcome[test]
            )
    assert found.mean == pytest.approx(found.per_fold.mean(axis=1).mean())
    pooled = np.mean([auc(row, outcome) for row in scores])
    assert found.mean != pytest.approx(pooled, abs=1e-6)


def test_scores_of_different_folds_are_never_compared(repeated):
    scores, outcome, folds = repeated
    shifted = scores + 10.0 * folds
    one = cross_validated_auc(scores, outcome, folds, np.arange(30), np.ones(30), 0.95)
    other = cross_validated_auc(
        shifted, outcome, folds, np.arange(30), np.ones(30), 0.95
    )
    assert other.per_fold == pytest.approx(one.per_fold)
    assert (other.low, other.high) == pytest.approx((one.low, one.high))


def test_order_of_samples_and_labels_of_folds_and_subjects_do_not_matter(repeated):
    scores, outcome, folds = repeated
    subjects = np.arange(30) // 2 * 3
    one = cross_validated_auc(scores, outcome, folds, subjects, np.ones(30), 0.9)
    order = np.random.default_rng(1).permutation(30)
    other = cross_validated_auc(
        scores[:, order],
        outcome[order],
        (folds[:, order] + 1) % 3,
        (60 - subjects)[order],
        np.ones(30),
        0.9,
    )
    assert (other.mean, other.low, other.high) == pytest.approx(
        (one.mean, one.low, one.high)
    )


def test_a_repeat_told_twice_adds_nothing(repeated):
    scores, outcome, folds = repeated
    one = cross_validated_auc(
        scores[:1], outcome, folds[:1], np.arange(30), np.ones(30), 0.95
    )
    other = cross_validated_auc(
        np.repeat(scores[:1], 4, axis=0),
        outcome,
        np.repeat(folds[:1], 4, axis=0),
        np.arange(30),
        np.ones(30),
        0.95,
    )
    assert (other.mean, other.low, other.high) == pytest.approx(
        (one.mean, one.low, one.high)
    )


def test_a_higher_confidence_is_a_wider_interval(repeated):
    scores, outcome, folds = repeated
    narrow = cross_validated_auc(
        scores, outcome, folds, np.arange(30), np.ones(30), 0.8
    )
    wide = cross_validated_auc(scores, outcome, folds, np.arange(30), np.ones(30), 0.99)
    assert wide.low < narrow.low < narrow.high < wide.high


def test_fold_with_one_class_is_left_out():
    scores = np.append(MARKER, [3.0, 4.0])
    outcome = np.append(OUTCOME, [1.0, 1.0])
    fold = np.repeat([0, 1], [15, 2])
    found = one_fold(scores, outcome, fold=fold)
    assert found.mean == pytest.approx(23 / 28)
    assert np.isnan(found.per_fold[0, 1])


def test_no_fold_with_both_classes_is_no_figure():
    found = one_fold(fold=np.arange(15))
    assert np.isnan([found.mean, found.low, found.high]).all()


def test_repeat_without_a_figure_does_not_narrow_the_interval():
    alone = one_fold()
    found = one_fold(
        np.stack([MARKER, MARKER]), fold=np.stack([np.zeros(15, int), np.arange(15)])
    )
    assert found.mean == pytest.approx(alone.mean)
    assert (found.low, found.high) == pytest.approx((alone.low, alone.high))


def test_perfect_separation_has_no_interval():
    found = one_fold(np.arange(15.0)[::-1])
    assert found.mean == 1.0
    assert np.isnan([found.low, found.high]).all()


@pytest.mark.parametrize(
    ("cases", "controls", "folds", "visits"),
    [(30, 30, 1, 1), (10, 60, 5, 1), (20, 20, 5, 1), (20, 20, 5, 5)],
)
def test_interval_covers_the_true_area(cases, controls, folds, visits):
    """Fixed scores, so that the training set adds no spread; own simulation.

    Binormal scores with difference 1 have the area 0.7602499389 (exact). Few cases in
    a fold, or a fifth of the people measured often, break an interval that centres
    within folds or counts rows.
    """
    draws = np.random.default_rng(2)
    inside = 0
    for _ in range(400):
        n = cases + controls
        label = np.repeat([1.0, 0.0], [cases, controls])
        times = np.where(draws.random(n) < 0.2, visits, 1)
        subject = np.repeat(np.arange(n), times)
        person = draws.normal(size=n) * np.sqrt(0.5)
        score = person[subject] + draws.normal(size=len(subject)) * np.sqrt(0.5)
        plan = np.empty((3, n), int)
        for repeat in plan:
            for value in (0.0, 1.0):
                own = draws.permutation(np.flatnonzero(label == value))
                repeat[own] = np.arange(len(own)) % folds
        found = cross_validated_auc(
            np.tile(score + label[subject], (3, 1)),
            label[subject],
            plan[:, subject],
            subject,
            1.0 / times[subject],
            0.95,
        )
        inside += found.low <= 0.7602499389 <= found.high
    assert 0.91 <= inside / 400 <= 0.985


def test_one_case_has_no_interval():
    found = one_fold(np.array([3.0, 1, 2, 4]), np.array([1.0, 0, 0, 0]))
    assert found.mean == pytest.approx(2 / 3)
    assert np.isnan([found.low, found.high]).all()


# standard errors of fold values


def test_corrected_standard_error_of_ten_splits():
    # variance (1/J + n_test/n_train) s^2 of Nadeau & Bengio 2003, Machine Learning
    # 52:239, for 90 training and 10 test samples: exact arithmetic, t from scipy 1.17.1
    d = np.array([0.02, 0.05, -0.01, 0.03, 0.04, 0.0, 0.06, 0.02, 0.03, -0.02])
    assert d.var(ddof=1) == pytest.approx(0.0006622222, abs=1e-10)
    assert corrected_se(d, 10 / 90) ** 2 == pytest.approx(0.0001398025, abs=1e-10)
    assert d.mean() / corrected_se(d, 10 / 90) == pytest.approx(1.8606524533, abs=1e-9)
    assert d.mean() / naive_se(d) == pytest.approx(2.7034653377, abs=1e-9)


def test_naive_standard_error_of_five_folds():
    # Breiman, Friedman, Olshen & Stone 1984, section 3.4.3: s / sqrt(K), exact
    errors = np.array([0.18, 0.14, 0.20, 0.18, 0.20])
    assert naive_se(errors) == pytest.approx(0.0109544512, abs=1e-10)


def test_undefined_folds_are_left_out():
    values = np.array([[0.7, np.nan, 0.8], [0.9, 0.6, np.nan]])
    kept = np.array([0.7, 0.8, 0.9, 0.6])
    assert naive_se(values) == naive_se(kept)
    assert corrected_se(values, 0.5) == corrected_se(kept, 0.5)


@pytest.mark.parametrize("values", [[], [0.7], [0.7, np.nan]])
def test_fewer_than_two_folds_have_no_standard_error(values):
    assert np.isnan(naive_se(np.array(values)))
    assert np.isnan(corrected_se(np.array(values), 0.25))


def test_equal_folds_have_standard_error_zero():
    assert corrected_se(np.full(5, 0.75), 0.25) == 0.0
