"""The worst-case bound and the number of markers it allows."""

import numpy as np
import pytest

from panelkit.errors import StudyFileError
from panelkit.stability import markers_for, worst_case_bound

# Meinshausen & Buhlmann 2010, JRSS-B 72:417, theorem 1: exact arithmetic; the row with
# 4,088 features and 57 markers is that of a discussant of the paper
BOUNDS = [
    (1000, 20, 0.9, 0.5),
    (1000, 50, 0.6, 12.5),
    (1000, 50, 0.9, 3.125),
    (4088, 30, 0.75, 0.4403131115),
    (4088, 57, 0.9, 0.9934564579),
    (1000, 20, 0.7, 1.0),
    (1000, 100, 1.0, 10.0),
]


@pytest.mark.parametrize(("p", "q", "threshold", "expected"), BOUNDS)
def test_bound(p, q, threshold, expected):
    assert worst_case_bound(q, threshold, p) == pytest.approx(expected, abs=1e-10)


# the largest q that keeps the bound: exact arithmetic
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


@pytest.mark.parametrize("threshold", [0.5, 0.2, 1.0001, float("nan")])
def test_no_bound_below_one_half_or_above_one(threshold):
    with pytest.raises(StudyFileError) as caught:
        worst_case_bound(5, threshold, 100)
    assert caught.value.code == "threshold-out-of-range"


def test_too_little_tolerance_is_refused_with_what_would_do():
    # one marker among 4 features at 0.75: 1 / (0.5 * 4) = 0.5
    with pytest.raises(StudyFileError) as caught:
        markers_for(0.4, 0.75, 4)
    assert caught.value.code == "bound-infeasible"
    assert "0.5" in caught.value.accepted
    assert markers_for(0.5, 0.75, 4) == 1
