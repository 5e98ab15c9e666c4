"""The bounds against exact arithmetic and published theorems."""

import math

import numpy as np
import pytest
from scipy.optimize import linprog

from panelkit.errors import StudyFileError, UsageError
from panelkit.stability import (
    attained_threshold,
    bound_of,
    r_concave_bound,
    r_concave_tail,
    unimodal_bound,
    unimodal_factor,
    worst_case_bound,
)

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
def test_worst_case(p, q, threshold, expected):
    assert worst_case_bound(q, threshold, p) == pytest.approx(expected, abs=1e-10)


@pytest.mark.parametrize("threshold", [0.5, 0.2, 1.0001, float("nan")])
def test_no_bound_below_one_half_or_above_one(threshold):
    for bound in (worst_case_bound, unimodal_factor):
        arguments = (5, threshold, 100) if bound is worst_case_bound else (threshold, 9)
        with pytest.raises(StudyFileError) as caught:
            bound(*arguments)
        assert caught.value.code == "threshold-out-of-range"


# Shah & Samworth 2013, JRSS-B 75:55, theorem 2 (the formula from memory): exact
# arithmetic for 50 pairs
FACTORS = [
    (0.55, 5.5555555556),
    (0.6, 2.6315789474),
    (0.7, 1.2820512821),
    (0.75, 1.0204081633),
    (0.8, 0.8235294118),
    (0.9, 0.4313725490),
    (1.0, 0.0392156863),
]


@pytest.mark.parametrize(("threshold", "expected"), FACTORS)
def test_unimodal_factor(threshold, expected):
    assert unimodal_factor(threshold, 50) == pytest.approx(expected, abs=1e-10)


@pytest.mark.parametrize("n_pairs", [10, 25, 50])
@pytest.mark.parametrize("share", [0.02, 0.05, 0.1])
@pytest.mark.parametrize("threshold", [0.6, 0.7, 0.8, 0.9, 1.0])
def test_unimodal_factor_is_the_largest_tail(n_pairs, share, threshold):
    """A linear programme over all distributions with one mode and the mean.

    The tail of the share of pairs in which both halves pick, at 2 threshold - 1: the
    theorem's own step (Shah & Samworth 2013), solved here by scipy.
    """
    best = 0.0
    x = np.arange(n_pairs + 1) / n_pairs
    tail = (x >= 2 * threshold - 1 - 1e-9).astype(float)
    for mode in range(n_pairs + 1):
        rising = np.zeros((n_pairs, n_pairs + 1))
        steps = np.arange(n_pairs)
        sign = np.where(steps < mode, 1.0, -1.0)
        rising[steps, steps], rising[steps, steps + 1] = sign, -sign
        found = linprog(
            -tail,
            A_ub=np.vstack([rising, x]),
            b_ub=np.append(np.zeros(n_pairs), share**2),
            A_eq=np.ones((1, n_pairs + 1)),
            b_eq=[1.0],
        )
        if found.success:
            best = max(best, -found.fun)
    expected = unimodal_factor(threshold, n_pairs) * share**2
    assert best == pytest.approx(expected, rel=1e-6)


# 1,000 features, 50 pairs: D from the definition (convex sequences, own code; checked
# for up to 10 steps by free optimisation), the others exact
TABLE = [
    (20, 0.60, 0.33449785, 1.05263158),
    (20, 0.70, 0.14592470, 0.51282051),
    (20, 0.75, 0.09749027, 0.40816327),
    (20, 0.90, 0.02561283, 0.17254902),
    (50, 0.60, 2.60533431, 6.57894737),
    (50, 0.75, 0.64784634, 2.55102041),
    (50, 0.80, 0.43513393, 2.05882353),
    (50, 1.00, 0.01238007, 0.09803922),
    (100, 0.60, 11.41339436, 26.31578947),
    (100, 0.90, 0.75530630, 4.31372549),
]


@pytest.mark.parametrize(("q", "threshold", "r_concave", "unimodal"), TABLE)
def test_bounds_side_by_side(q, threshold, r_concave, unimodal):
    assert unimodal_bound(q, threshold, 1000, 50) == pytest.approx(unimodal, abs=6e-9)
    found = r_concave_bound(q, threshold, 1000, 50)
    assert found == pytest.approx(r_concave, rel=1e-5)
    assert found < unimodal < worst_case_bound(q, threshold, 1000) or threshold == 0.6


def test_fewer_pairs_give_larger_bounds():
    assert r_concave_bound(50, 0.6, 1000, 25) == pytest.approx(3.24289564, rel=1e-6)
    assert r_concave_bound(50, 0.9, 1000, 25) == pytest.approx(0.21673937, rel=1e-6)
    assert unimodal_bound(50, 0.6, 1000, 25) == pytest.approx(6.94444444, rel=1e-8)


def test_the_attained_threshold_is_used():
    # 25 pairs: frequencies are multiples of 1/50, and 0.75 is none of them
    assert attained_threshold(0.75, 25) == 0.76
    assert attained_threshold(0.75, 50) == 0.75
    assert unimodal_bound(50, 0.75, 1000, 25) == pytest.approx(2.5, rel=1e-12)


# from the definition; each checked by free optimisation over convex sequences
TAILS = [
    (0.01, 0.4, 5, -1 / 2, 0.010992525911),
    (0.04, 0.6, 5, -1 / 2, 0.022949215292),
    (0.05, 0.5, 6, -1 / 2, 0.036980458),
    (0.1, 0.5, 6, -1 / 4, 0.068441332956),
    (0.1, 0.7, 6, -1 / 4, 0.016546466),
    (0.02, 0.5, 8, -1 / 2, 0.01158297),
    (0.05, 0.75, 8, -1 / 4, 0.005863429),
    (0.05, 0.5, 10, -1 / 4, 0.016434501249),
    (0.0025, 0.2, 10, -1 / 2, 0.005375340108),
    (0.2, 0.5, 6, -1 / 4, 0.184512258291),
    (0.2, 0.5, 6, -1 / 2, 0.189967601800),
    (0.0025, 0.4, 10, -1, 0.0027666959),
    (0.0025, 0.4, 10, -2, 0.0032153909),
]


@pytest.mark.parametrize(("mean", "cutoff", "steps", "r", "expected"), TAILS)
def test_r_concave_tail(mean, cutoff, steps, r, expected):
    assert r_concave_tail(mean, cutoff, steps, r) == pytest.approx(expected, rel=1e-7)


def test_r_concave_lies_between_its_limits():
    # weaker assumptions, larger tails: unimodal at the end, then Markov's inequality
    tails = [r_concave_tail(0.0025, 0.4, 10, r) for r in (-0.25, -0.5, -1, -2, -8)]
    assert tails == sorted(tails)
    assert tails[-1] < 0.0035714286 < 0.0025 / 0.4


def test_r_concave_tail_is_safe_where_it_is_not_computed():
    assert r_concave_tail(0.3, 0.6, 10, -0.5) == 1.0
    assert r_concave_tail(0.0, 0.6, 10, -0.5) == 0.0
    with pytest.raises(UsageError):
        r_concave_tail(0.1, 0.6, 10, 0.5)


def test_r_concave_is_refused_below_six_tenths():
    # plain noise was seen to exceed it there (own simulation)
    with pytest.raises(StudyFileError) as caught:
        r_concave_bound(10, 0.55, 200, 50)
    assert "0.6 or more" in caught.value.accepted
    assert r_concave_bound(10, 0.6, 200, 50) > 0.0


def test_unimodal_is_nan_where_the_theorem_says_nothing():
    assert math.isnan(unimodal_bound(70, 0.75, 100, 50))  # q / p above 1 / sqrt(3)
    assert math.isnan(unimodal_bound(10, 0.505, 100, 50))  # next to one half
    assert bound_of("worst-case", 70, 0.75, 100, 50) == 98.0


def test_unknown_bound():
    with pytest.raises(UsageError) as caught:
        bound_of("hopeful", 5, 0.75, 100, 50)
    assert "worst-case, unimodal, r-concave" in caught.value.accepted
