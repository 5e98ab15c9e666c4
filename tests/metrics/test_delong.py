"""Paired areas: exact fractions by hand, a published table, scikit-learn."""

import numpy as np
import pytest
from sklearn.metrics import roc_auc_score

from panelkit.errors import FitError
from panelkit.metrics import area_interval, delong, hanley_mcneil_se

A = np.array([9, 8, 8, 7, 6, 5, 3, 7, 6, 5, 4, 4, 3, 2, 1], float)
B = np.array([6, 9, 5, 8, 4, 7, 2, 5, 3, 6, 4, 1, 2, 7, 2], float)
Y = np.array([1.0] * 7 + [0.0] * 8)


def test_fifteen_people_by_hand():
    """The R package pROC 1.18.0 gives the same (roc.test, method delong)."""
    found = delong(np.array([A, B]), Y)
    assert found.areas == pytest.approx([23 / 28, 3 / 4], abs=1e-15)
    c = found.covariance
    assert c[0, 0] == pytest.approx(5 / 384)
    assert c[1, 1] == pytest.approx(2285 / 131712)
    assert c[0, 1] == pytest.approx(661 / 87808)
    gap, low, high, p = found.difference(0.95)
    assert gap / np.sqrt(2017 / 131712) == pytest.approx(0.5772071304, abs=5e-11)
    assert p == pytest.approx(0.5637995408, abs=5e-11)
    assert low < 0.0 < high
    assert area_interval(23 / 28, found.se(), 0.95) == pytest.approx(
        (0.5003379322, 0.9548153644), abs=5e-11
    )


def test_areas_are_those_of_scikit_learn():
    draws = np.random.default_rng(0)
    scores = draws.normal(size=(3, 60)).round(1)  # with ties
    y = (draws.random(60) < 0.4).astype(float)
    expected = [roc_auc_score(y, row) for row in scores]
    assert delong(scores, y).areas == pytest.approx(expected, abs=1e-12)


def test_a_copy_of_everybody_is_no_news():
    """Clusters of two equal samples know as much as one of them."""
    people = np.tile(np.arange(15), 2)
    once = delong(np.array([A, B]), Y)
    twice = delong(np.tile([A, B], 2), np.tile(Y, 2), people)
    assert twice.covariance == pytest.approx(once.covariance, rel=1e-12)
    naive = delong(np.tile([A, B], 2), np.tile(Y, 2))
    assert naive.covariance[0, 0] < 0.6 * once.covariance[0, 0]


def test_the_variance_is_that_of_a_simulation():
    """What the theory says of the spread of areas, against a thousand of them."""
    draws = np.random.default_rng(1)
    y = np.repeat([1.0, 0.0], 30)
    found = [delong((draws.normal(size=60) + y)[None], y) for _ in range(1000)]
    areas = np.array([each.areas[0] for each in found])
    told = np.mean([each.covariance[0, 0] for each in found])
    assert told == pytest.approx(areas.var(), rel=0.12)


def test_rating_table():
    """Hanley & McNeil 1982, Radiology 143:29: 109 images, W = 0.893, SE 0.032."""
    normal, abnormal = [33, 6, 6, 11, 2], [3, 2, 2, 11, 33]
    scores = np.concatenate(
        [np.repeat(np.arange(5.0), normal), np.repeat(np.arange(5.0), abnormal)]
    )
    y = np.repeat([0.0, 1.0], [58, 51])
    found = delong(scores[None], y)
    assert found.areas[0] == pytest.approx(1321 / 1479)
    # the DeLong standard error is that of the R package pROC
    assert found.se() == pytest.approx(0.0307244084, abs=5e-11)
    assert hanley_mcneil_se(1321 / 1479, 51, 58) == pytest.approx(
        0.0324865796, abs=5e-11
    )


@pytest.mark.parametrize(
    ("area", "cases", "controls", "se"),
    [
        (23 / 28, 7, 8, 0.1151933694),
        (3 / 4, 7, 8, 0.1319496657),
        (0.8, 50, 50, 0.0445021847),
        (0.9, 30, 60, 0.0397389809),
    ],
)
def test_error_of_an_area_alone(area, cases, controls, se):
    """The formula of Hanley & McNeil 1982, by hand."""
    assert hanley_mcneil_se(area, cases, controls) == pytest.approx(se, abs=5e-11)


def test_what_has_no_error():
    perfect = delong(Y[None], Y)
    assert perfect.areas[0] == 1.0
    assert np.isnan(area_interval(1.0, perfect.se(), 0.95)).all()
    alone = delong(np.array([[3.0, 1.0, 2.0]]), np.array([1.0, 0.0, 0.0]))
    assert np.isnan(alone.covariance).all()
    same = delong(np.array([A, A]), Y).difference(0.95)
    assert same[0] == 0.0
    assert np.isnan(same[3])
    with pytest.raises(FitError):
        delong(A[None], np.ones(15))
    with pytest.raises(FitError):
        hanley_mcneil_se(1.2, 5, 5)
