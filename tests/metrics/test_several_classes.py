"""Metrics of three or more classes."""

import numpy as np
import pytest
from sklearn.metrics import log_loss as sklearn_log_loss
from sklearn.metrics import roc_auc_score

from panelkit.errors import FitError
from panelkit.metrics import (
    auc,
    class_areas,
    hand_till,
    log_loss_of_classes,
    softmax,
)

CLASSES = np.array([0, 0, 0, 1, 1, 2, 2, 2])
CHANCES = np.array(
    [
        [0.6, 0.3, 0.1],
        [0.3, 0.4, 0.3],
        [0.4, 0.1, 0.5],
        [0.2, 0.5, 0.3],
        [0.4, 0.35, 0.25],
        [0.1, 0.2, 0.7],
        [0.3, 0.3, 0.4],
        [0.25, 0.45, 0.3],
    ]
).T


def test_worked_example_of_hand_and_till():
    # by hand; scikit-learn's one-against-one macro average agrees
    assert hand_till(CHANCES, CLASSES)[0] == pytest.approx(0.8333333333, abs=1e-10)
    found = roc_auc_score(CLASSES, CHANCES.T, multi_class="ovo")
    assert hand_till(CHANCES, CLASSES)[0] == pytest.approx(found)


def test_two_classes_give_the_usual_area():
    draws = np.random.default_rng(1)
    chance = draws.uniform(size=40)
    classes = (draws.uniform(size=40) < chance).astype(int)
    both = np.array([1.0 - chance, chance])
    assert hand_till(both, classes)[0] == pytest.approx(auc(chance, classes * 1.0))


def test_influence_is_the_derivative_by_a_samples_weight():
    share = np.full(len(CLASSES), 1.0)
    area, influence = hand_till(CHANCES, CLASSES, share)
    assert influence.sum() == pytest.approx(0.0, abs=1e-14)
    for i in range(len(CLASSES)):
        more = share.copy()
        more[i] += 1e-6
        change = (hand_till(CHANCES, CLASSES, more)[0] - area) / 1e-6
        # AUC of a pair is linear in each class's weighted mean
        assert influence[i] == pytest.approx(change, abs=1e-6)


def test_log_loss_against_scikit_learn():
    predictors = np.log(CHANCES) + 3.0
    assert softmax(predictors) == pytest.approx(CHANCES)
    assert log_loss_of_classes(predictors, CLASSES) == pytest.approx(
        sklearn_log_loss(CLASSES, CHANCES.T)
    )


def test_each_class_against_the_others():
    areas = class_areas(CHANCES, CLASSES)
    for k in range(3):
        assert areas[k] == pytest.approx(roc_auc_score(k == CLASSES, CHANCES[k]))
    assert np.isnan(class_areas(CHANCES, np.minimum(CLASSES, 1))[2])


def test_one_class_is_refused():
    with pytest.raises(FitError, match="one class"):
        hand_till(CHANCES, np.zeros(8, int))
