"""Tuning: the best penalty, and what is within one standard error of the best."""

import numpy as np
import pytest

from panelkit.costing import choose_within_one_se, within_one_se
from panelkit.costing.tuning import judge, tune_ridge
from panelkit.errors import FitError
from panelkit.fits import ArraySource, kernel_matrix, ridge_predictions
from panelkit.metrics import auc, log_loss
from panelkit.records import SubsamplePlan

# five fold errors for panels of 1, 2, 3, 5, 8, 12 and 20 markers
SIZES = np.array([1, 2, 3, 5, 8, 12, 20])
ERRORS = np.array(
    [
        [0.32, 0.28, 0.34, 0.30, 0.36],
        [0.24, 0.22, 0.30, 0.26, 0.28],
        [0.20, 0.18, 0.24, 0.20, 0.22],
        [0.19, 0.15, 0.22, 0.18, 0.20],
        [0.18, 0.14, 0.20, 0.18, 0.20],
        [0.18, 0.15, 0.21, 0.17, 0.20],
        [0.19, 0.17, 0.22, 0.18, 0.21],
    ]
)
AREA = (1.0 - ERRORS).T


def test_within_one_se_of_the_paired_difference():
    # exact arithmetic: 8 markers are best (mean 0.820); 12 lose 0.002 with corrected SE
    # sqrt((1/5 + 1/4) 7.0e-5) = 0.0056; 5 lose 0.008 with the same SE: outside, though
    # the naive SE of the best alone (0.011) would let them in
    assert SIZES[within_one_se(AREA, 0.25)].tolist() == [8, 12]
    naive = 0.0109544512
    assert SIZES[AREA.mean(0) >= 0.820 - naive].min() == 5


def test_a_larger_test_share_widens_the_rule():
    # 5 lose 0.008 = sqrt((1/5 + r) 7.0e-5) at r = 0.714: exact arithmetic
    assert not within_one_se(AREA, 0.70)[3]
    assert within_one_se(AREA, 0.73)[3]


def test_the_best_is_always_within():
    for seed in range(20):
        draws = np.random.default_rng(seed)
        area = draws.uniform(0.5, 1.0, (5, 8))
        assert within_one_se(area, 0.25)[area.mean(0).round(4).argmax()]


def test_steady_loss_is_not_within():
    # 0.01 less on every split: the paired difference has no spread, so SE is 0
    base = np.array([0.6, 0.7, 0.8, 0.9])
    area = np.column_stack([base - 0.01, base, base])
    assert within_one_se(area, 0.25).tolist() == [False, True, True]


def test_equals_of_the_best_are_within_whatever_the_standard_error():
    area = np.column_stack([[0.7, 0.9], [0.9, 0.7], [0.8, 0.8]])
    assert within_one_se(area, 0.0).all()


def test_one_split_lets_only_equals_in():
    area = np.array([[0.7, 0.9, 0.9, 0.89996, 0.8999]])
    assert within_one_se(area, 0.25).tolist() == [False, True, True, True, False]


def test_differences_below_the_rounding_do_not_decide():
    # machines differ in the last bits: 1e-7 must not turn a choice
    base = np.array([0.6, 0.7, 0.8])
    area = np.column_stack([base, base + 1e-7])
    assert within_one_se(area, 0.5).all()
    assert choose_within_one_se(area[:, None, :], 0.5) == (0, 0)


def test_undefined_splits_are_left_out():
    area = np.vstack([AREA, np.full(7, np.nan)])
    assert within_one_se(area, 0.25).tolist() == within_one_se(AREA, 0.25).tolist()


def test_smallest_size_within_one_se_is_chosen():
    assert choose_within_one_se(AREA[:, None, :], 0.25) == (0, 4)
    assert choose_within_one_se(AREA[:, None, :], 0.73) == (0, 3)


def test_more_accurate_maker_of_the_size_is_chosen_then_the_first():
    worse = AREA - np.array([[0.001], [-0.001], [0.001], [-0.001], [0.001]])
    both = np.stack([worse, AREA], axis=1)  # folds, makers, sizes
    assert choose_within_one_se(both, 0.25) == (1, 4)
    assert choose_within_one_se(np.stack([AREA, AREA], axis=1), 0.25) == (0, 4)


def test_smaller_size_wins_over_the_more_accurate_maker():
    # maker 0 is best with 2 markers; maker 1 is as good as that with 1
    area = np.zeros((4, 2, 2))
    area[:, 0] = [0.6, 0.9]
    area[:, 1] = [0.9, 0.7]
    assert choose_within_one_se(area, 0.25) == (1, 0)


# tuning the ridge penalty


def test_judge_takes_the_penalty_with_the_smallest_mean_log_loss():
    draws = np.random.default_rng(0)
    outcomes = [np.repeat([0.0, 1.0], 5), np.repeat([0.0, 1.0], 6)]
    weights = [draws.uniform(0.5, 2.0, len(y)) for y in outcomes]
    # two makers, two sizes, three penalties
    log_odds = [draws.normal(size=(4, 3, len(y))) + y for y in outcomes]
    found = judge(log_odds, outcomes, weights, (2, 2))
    assert found.best.shape == (2, 2)
    assert found.area.shape == (2, 2, 2)
    for panel in range(4):
        loss = [
            np.mean(
                [
                    log_loss(eta[panel, k], y, w)
                    for eta, y, w in zip(log_odds, outcomes, weights, strict=True)
                ]
            )
            for k in range(3)
        ]
        best = int(np.argmin(loss))
        assert found.best.ravel()[panel] == best
        for fold in range(2):
            assert found.area[fold].ravel()[panel] == auc(
                log_odds[fold][panel, best], outcomes[fold], weights[fold]
            )


def test_judge_prefers_the_larger_penalty_of_equals():
    y = np.array([0.0, 1.0, 0.0, 1.0])
    eta = np.tile(np.array([-1.0, 1.0, 0.2, 0.4]), (1, 3, 1))
    assert judge([eta], [y], [np.ones(4)], (1, 1)).best.tolist() == [[0]]


def test_judge_refuses_an_inner_fold_of_one_class():
    with pytest.raises(FitError):
        judge([np.zeros((1, 1, 3))], [np.ones(3)], [np.ones(3)], (1, 1))


def test_ridge_on_all_is_tuned_by_halves_that_judge_each_other():
    draws = np.random.default_rng(1)
    X, y = draws.normal(size=(40, 60)), np.arange(40) % 2 * 1.0
    X[:, :5] += y[:, None]
    weights = draws.uniform(0.5, 2.0, 40)
    kernel = kernel_matrix(ArraySource(X), np.arange(40), weights)
    order = [np.random.default_rng(k).permutation(40) for k in range(3)]
    plan = SubsamplePlan(
        tuple(np.sort(half) for mixed in order for half in (mixed[:20], mixed[20:]))
    )
    penalties = np.array([10.0, 0.1, 0.01, 1e-5])
    loss = np.zeros(4)
    for b in range(4):  # the first two pairs, both directions
        teach, test = plan.rows[b], plan.rows[b ^ 1]
        for k in range(4):
            eta = ridge_predictions(
                kernel, y, weights, teach, test, penalties[k : k + 1]
            )[0]
            loss[k] += log_loss(eta, y[test], weights[test])
    found = tune_ridge(kernel, y, weights, plan, 2, penalties)
    assert found == int(loss.argmin())
    assert 0 < found < 3  # an answer at an end could be a constant one
