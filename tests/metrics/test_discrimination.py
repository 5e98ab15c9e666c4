"""Area under the ROC curve and each sample's placement."""

import numpy as np
import pytest
from sklearn.metrics import roc_auc_score

from panelkit.errors import FitError
from panelkit.metrics import areas, auc, auc_placements

# two markers on 7 cases and 8 controls, with ties within and between the classes:
# areas and variances are exact (DeLong, DeLong & Clarke-Pearson 1988, Biometrics
# 44:837), equal to pROC 1.18.0
OUTCOME = np.repeat([1.0, 0.0], [7, 8])
MARKER_A = np.array([9, 8, 8, 7, 6, 5, 3, 7, 6, 5, 4, 4, 3, 2, 1], float)
MARKER_B = np.array([6, 9, 5, 8, 4, 7, 2, 5, 3, 6, 4, 1, 2, 7, 2], float)


@pytest.mark.parametrize(
    ("scores", "expected"), [(MARKER_A, 23 / 28), (MARKER_B, 3 / 4)]
)
def test_area_of_two_markers(scores, expected):
    assert auc(scores, OUTCOME) == pytest.approx(expected, abs=1e-15)
    assert auc_placements(scores, OUTCOME)[0] == auc(scores, OUTCOME)


@pytest.mark.parametrize(
    ("scores", "expected"), [(MARKER_A, 5 / 384), (MARKER_B, 2285 / 131712)]
)
def test_placements_hold_delongs_variance(scores, expected):
    # S10 / m + S01 / n with divisors m - 1 and n - 1
    _, placed = auc_placements(scores, OUTCOME)
    variance = placed[:7].var(ddof=1) / 7 + placed[7:].var(ddof=1) / 8
    assert variance == pytest.approx(expected, abs=1e-15)


def test_placements_of_marker_a():
    # V10 and V01 of marker A: exact
    area, placed = auc_placements(MARKER_A, OUTCOME)
    v10 = [1, 1, 1, 15 / 16, 13 / 16, 11 / 16, 5 / 16]
    v01 = [1 / 2, 9 / 14, 11 / 14, 6 / 7, 6 / 7, 13 / 14, 1, 1]
    assert placed == pytest.approx([*v10, *v01])
    assert area == pytest.approx(np.mean(v01))


def test_weights_are_repeated_samples():
    """A case measured thirty times may not drag the area with it."""
    times = np.array([1, 1, 1, 1, 1, 1, 30, 1, 2, 1, 1, 3, 1, 1, 1])
    again = np.repeat(np.arange(15), times)
    weighted = auc(MARKER_A, OUTCOME, times.astype(float))
    assert weighted == pytest.approx(auc(MARKER_A[again], OUTCOME[again]))
    shared = auc(MARKER_A[again], OUTCOME[again], 1.0 / times[again])
    assert shared == pytest.approx(auc(MARKER_A, OUTCOME))
    assert weighted < shared - 0.2


def test_published_rating_table():
    # Hanley & McNeil 1982, Radiology 143:29: 109 images rated 1 to 5, area 0.893
    normal, abnormal = (33, 6, 6, 11, 2), (3, 2, 2, 11, 33)
    ratings = np.arange(1.0, 6.0)
    scores = np.concatenate([np.repeat(ratings, normal), np.repeat(ratings, abnormal)])
    outcome = np.repeat([0.0, 1.0], [58, 51])
    assert auc(scores, outcome) == pytest.approx(1321 / 1479, abs=1e-15)
    _, placed = auc_placements(scores, outcome)
    variance = placed[outcome == 1.0].var(ddof=1) / 51
    variance += placed[outcome == 0.0].var(ddof=1) / 58
    assert np.sqrt(variance) == pytest.approx(0.0307244084, abs=1e-10)  # pROC 1.18.0


@pytest.mark.parametrize("levels", [3, 10, 1000])
@pytest.mark.parametrize("seed", [0, 1])
def test_area_equals_scikit_learn_with_many_ties(levels, seed):
    draws = np.random.default_rng(seed)
    outcome = draws.integers(0, 2, 80) * 1.0
    scores = draws.integers(0, levels, 80) + outcome * draws.integers(0, 2, 80)
    assert auc(scores, outcome) == pytest.approx(roc_auc_score(outcome, scores))


def test_area_of_constant_scores_is_one_half():
    area, placed = auc_placements(np.zeros(6), np.array([0, 1, 0, 1, 1, 0.0]))
    assert area == 0.5
    assert (placed == 0.5).all()


def test_only_the_order_of_scores_counts():
    assert auc(np.exp(MARKER_A), OUTCOME) == auc(MARKER_A, OUTCOME)
    assert auc(-MARKER_A, OUTCOME) == pytest.approx(1.0 - auc(MARKER_A, OUTCOME))
    assert auc(MARKER_A, 1.0 - OUTCOME) == pytest.approx(1.0 - auc(MARKER_A, OUTCOME))
    order = np.random.default_rng(0).permutation(15)
    assert auc(MARKER_A[order], OUTCOME[order]) == pytest.approx(auc(MARKER_A, OUTCOME))


@pytest.mark.parametrize("value", [0.0, 1.0])
def test_one_class_is_refused(value):
    with pytest.raises(FitError) as caught:
        auc(np.arange(4.0), np.full(4, value))
    assert caught.value.code == "auc-one-class"


def test_a_score_that_is_not_a_number_is_no_area():
    scores = MARKER_A.copy()
    scores[3] = np.nan
    assert np.isnan(auc(scores, OUTCOME))


def test_areas_of_many_scores_are_the_single_ones():
    draws = np.random.default_rng(5)
    scores = draws.normal(size=(30, 17)).round(1)  # ties
    outcome = (np.arange(17) % 3 == 0) * 1.0
    weights = draws.uniform(0.5, 2.0, 17)
    many = areas(scores, outcome, weights)
    single = [auc(row, outcome, weights) for row in scores]
    assert many == pytest.approx(single)
    scores[3, 2] = np.nan
    assert np.isnan(areas(scores, outcome, weights)[3])
