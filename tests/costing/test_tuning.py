"""Tuning: the ridge penalty that loses least outside the selection."""

import numpy as np
import pytest

from panelkit.costing import BinaryTask, ProcedureData, Split
from panelkit.costing.tuning import judge, tune_ridge
from panelkit.errors import FitError
from panelkit.fits import ArraySource, kernel_matrix, ridge_predictions
from panelkit.metrics import auc, log_loss
from panelkit.records import SubsamplePlan


def data_of(y, weights):
    return ProcedureData(
        base=np.zeros((0, len(y))),
        task=BinaryTask(y),
        weights=weights,
        subjects=np.arange(len(y)),
        barred=np.empty(0, object),
        always=np.empty(0, np.int64),
    )


def test_judge_takes_the_penalty_with_the_smallest_mean_log_loss():
    draws = np.random.default_rng(0)
    y = np.concatenate([np.repeat([0.0, 1.0], 5), np.repeat([0.0, 1.0], 6)])
    every = draws.uniform(0.5, 2.0, len(y))
    splits = [
        Split(np.arange(10, 22), np.arange(10)),
        Split(np.arange(10), np.arange(10, 22)),
    ]
    outcomes = [y[split.test] for split in splits]
    weights = [every[split.test] for split in splits]
    # two makers, two sizes, three penalties
    log_odds = [draws.normal(size=(4, 3, len(y))) + y for y in outcomes]
    found = judge(log_odds, data_of(y, every), splits, (2, 2))
    assert found.best.shape == (2, 2)
    assert found.metric.shape == (2, 2, 2)
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
            assert found.metric[fold].ravel()[panel] == pytest.approx(
                auc(log_odds[fold][panel, best], outcomes[fold], weights[fold])
            )


def test_judge_prefers_the_larger_penalty_of_equals():
    y = np.array([0.0, 1.0, 0.0, 1.0])
    eta = np.tile(np.array([-1.0, 1.0, 0.2, 0.4]), (1, 3, 1))
    split = Split(np.arange(4), np.arange(4))
    found = judge([eta], data_of(y, np.ones(4)), [split], (1, 1))
    assert found.best.tolist() == [[0]]


def test_judge_refuses_an_inner_fold_of_one_class():
    split = Split(np.arange(3), np.arange(3))
    with pytest.raises(FitError):
        judge([np.zeros((1, 1, 3))], data_of(np.ones(3), np.ones(3)), [split], (1, 1))


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
    found = tune_ridge(kernel, BinaryTask(y), weights, plan, 2, penalties)
    assert found == int(loss.argmin())
    assert 0 < found < 3  # an answer at an end could be a constant one
