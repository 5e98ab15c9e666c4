"""Two of markers, threshold, false markers: the third follows, or it is refused."""

import numpy as np
import pytest

from panelkit.errors import StudyFileError
from panelkit.stability import (
    bound_of,
    markers_for,
    settle_demand,
    threshold_for,
    worst_case_bound,
)

# the largest q that keeps the worst-case bound: exact arithmetic
MARKERS = [
    (1000, 0.9, 1.0, 28),
    (1000, 0.6, 1.0, 14),
    (4088, 0.75, 1.0, 45),
    (10000, 0.9, 2.5, 141),
    (1000, 0.9, 0.5, 20),  # exactly at the bound: 400 / (0.8 * 1000)
    (1000, 0.7, 1.0, 20),
]


@pytest.mark.parametrize(("p", "threshold", "false_markers", "expected"), MARKERS)
def test_markers_allowed(p, threshold, false_markers, expected):
    assert markers_for(false_markers, threshold, p) == expected


# 1,000 features, 50 pairs, one false marker: the largest q by each bound
BY_BOUND = [
    (0.6, 14, 19, 31),
    (0.75, 22, 31, 61),
    (0.9, 28, 48, 113),
]


@pytest.mark.parametrize(("threshold", "worst", "unimodal", "r_concave"), BY_BOUND)
def test_markers_by_each_bound(threshold, worst, unimodal, r_concave):
    found = [
        markers_for(1.0, threshold, 1000, bound=bound, n_pairs=50)
        for bound in ("worst-case", "unimodal", "r-concave")
    ]
    assert found == [worst, unimodal, r_concave]


@pytest.mark.parametrize("seed", range(3))
def test_markers_allowed_are_the_largest_that_keep_the_bound(seed):
    draws = np.random.default_rng(seed)
    for _ in range(200):
        p = int(draws.integers(50, 1_000_000))
        threshold = round(float(draws.uniform(0.55, 1.0)), 2)
        tolerated = round(float(draws.uniform(0.2, 20.0)), 1)
        q = markers_for(tolerated, threshold, p)
        assert worst_case_bound(q, threshold, p) <= tolerated * (1.0 + 1e-9)
        assert worst_case_bound(q + 1, threshold, p) > tolerated


# smallest threshold on the grid of 1/100 (50 pairs) that keeps the bound; the exact
# worst-case values are 0.7, 0.892 and 0.7476761252 (exact arithmetic)
THRESHOLDS = [
    (1000, 20, 1.0, "worst-case", 0.70),
    (1000, 28, 1.0, "worst-case", 0.90),
    (4088, 45, 1.0, "worst-case", 0.75),
    (1000, 20, 0.5, "worst-case", 0.90),
    (1000, 50, 1.0, "unimodal", 0.91),
    (1000, 20, 1.0, "unimodal", 0.61),
    (1000, 20, 0.5, "unimodal", 0.71),
    (1000, 50, 1.0, "r-concave", 0.70),
    (1000, 20, 1.0, "r-concave", 0.60),  # it would hold from 0.43: not offered there
]


@pytest.mark.parametrize(("p", "q", "false_markers", "bound", "expected"), THRESHOLDS)
def test_threshold_that_follows(p, q, false_markers, bound, expected):
    found = threshold_for(q, false_markers, p, bound=bound, n_pairs=50)
    assert found == pytest.approx(expected, abs=1e-12)
    assert bound_of(bound, q, found, p, 50) <= false_markers * (1 + 1e-12)


def test_infeasible_markers_are_refused_with_what_would_do():
    # 1/2 (1 + 32^2 / 1000) = 1.012 is no threshold
    with pytest.raises(StudyFileError) as caught:
        threshold_for(32, 1.0, 1000)
    assert caught.value.code == "bound-infeasible"
    assert "at most 31 markers" in caught.value.accepted
    assert "at least 1.02 false" in caught.value.accepted
    assert threshold_for(31, 1.0, 1000) <= 1.0
    assert threshold_for(32, 1.024, 1000) == 1.0


def test_too_little_tolerance_is_refused_with_what_would_do():
    # one marker among 4 features at 0.75: 1 / (0.5 * 4) = 0.5
    with pytest.raises(StudyFileError) as caught:
        markers_for(0.4, 0.75, 4)
    assert caught.value.code == "bound-infeasible"
    assert "at least 0.5 false markers" in caught.value.accepted
    assert "threshold 0.82 and above" in caught.value.accepted
    assert markers_for(0.5, 0.75, 4) == 1
    assert markers_for(0.4, 0.82, 4) == 1


def settle(**given):
    asked = {"markers": None, "threshold": None, "false_markers": None} | given
    return settle_demand(n_features=1000, n_pairs=50, **asked)


def test_the_third_follows():
    assert settle(threshold=0.9, false_markers=1.0).markers == 28
    assert settle(markers=20, false_markers=1.0).threshold == pytest.approx(0.7)
    assert settle(markers=20, threshold=0.9).false_markers == pytest.approx(0.5)


@pytest.mark.parametrize(
    "given",
    [
        {"markers": 20, "threshold": 0.9, "false_markers": 1.0},
        {"markers": 20},
        {"threshold": 0.9},
        {},
    ],
)
def test_two_of_three_are_wanted(given):
    with pytest.raises(StudyFileError) as caught:
        settle(**given)
    assert caught.value.code == "demand-not-two-of-three"


def test_more_markers_than_features():
    with pytest.raises(StudyFileError) as caught:
        settle(markers=1001, threshold=0.9)
    assert caught.value.code == "markers-above-features"


def test_a_bound_that_is_not_defined_cannot_decide():
    with pytest.raises(StudyFileError) as caught:
        settle_demand(
            markers=700,
            threshold=0.9,
            false_markers=None,
            n_features=1000,
            n_pairs=50,
            bound="unimodal",
        )
    assert caught.value.code == "bound-undefined"


def test_ceiling_is_kept_and_told():
    found = settle_demand(
        markers=None,
        threshold=0.75,
        false_markers=5.0,
        n_features=3000,
        n_pairs=50,
        most_markers=10,
    )
    assert (found.markers, found.capped) == (10, True)
    assert found.false_markers == pytest.approx(100 / (0.5 * 3000))
