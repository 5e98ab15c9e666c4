"""Tests of many things at once, against published examples and scipy."""

import numpy as np
import pytest
from scipy.stats import fisher_exact

from panelkit.metrics import (
    auc,
    auc_score_interval,
    false_discovery_adjusted,
    fisher_exact_many,
    holm_adjusted,
    rank_sum_p,
)

# Benjamini & Hochberg 1995, JRSS-B 57:289, section 4: fifteen p-values, of which their
# procedure rejects four at 0.05 and Bonferroni three (from memory, recomputed)
FIFTEEN = np.array([
    0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344,
    0.0459, 0.3240, 0.4262, 0.5719, 0.6528, 0.7590, 1.0,
])  # fmt: skip


def test_fifteen_p_values():
    adjusted = false_discovery_adjusted(FIFTEEN)
    assert (adjusted <= 0.05).sum() == 4
    assert adjusted[:5] == pytest.approx([0.0015, 0.003, 0.0095, 0.035625, 0.0603])
    assert (holm_adjusted(FIFTEEN) <= 0.05).sum() == 3


def test_holm_steps_down_and_keeps_the_order_given():
    """By hand: 3 x 0.01, then 2 x 0.03, then at least as much as before."""
    assert holm_adjusted(np.array([0.03, 0.01, 0.04])) == pytest.approx(
        [0.06, 0.03, 0.06]
    )
    assert holm_adjusted(np.array([0.9, 0.8])).max() == 1.0


def test_tea_tasting():
    """Fisher's lady: three of four cups right has p = 34/70, all four 2/70."""
    p = fisher_exact_many(np.array([3, 4]), np.array([4, 4]), 4, 4)
    assert p == pytest.approx([34 / 70, 2 / 70])


def test_many_tables_are_scipy_s_single_ones():
    draws = np.random.default_rng(0)
    hits = draws.integers(0, 10, 200)
    totals = hits + draws.integers(0, 15, 200)
    expected = [
        fisher_exact([[h, 9 - h], [t - h, 14 - t + h]]).pvalue
        for h, t in zip(hits, totals, strict=True)
    ]
    assert fisher_exact_many(hits, totals, 9, 14) == pytest.approx(expected, abs=1e-12)


def test_rank_sum_of_separated_samples():
    """Exact: one of choose(8, 4) = 70 arrangements in each direction."""
    scores, outcome = np.arange(8.0), np.repeat([0.0, 1.0], 4)
    assert rank_sum_p(scores, outcome) == pytest.approx(2 / 70)
    assert rank_sum_p(np.ones(8), outcome) == 1.0


def test_interval_solves_its_equation():
    """|area - end| = z SE(end), with the variance written out for 20 and 30 people."""
    for end in auc_score_interval(0.8, 20, 30, 0.95):
        q1, q2 = end / (2 - end), 2 * end**2 / (1 + end)
        m = 0.5 * (20 + 30) - 1
        variance = (end * (1 - end) + m * (q1 - end**2) + m * (q2 - end**2)) / 600
        assert abs(0.8 - end) == pytest.approx(1.959963985 * np.sqrt(variance))


def test_interval_at_the_edges():
    low, high = auc_score_interval(1.0, 10, 10, 0.95)
    assert high == 1.0
    assert 0.75 < low < 0.9
    assert auc_score_interval(0.0, 10, 10, 0.95) == pytest.approx((1 - high, 1 - low))


def test_interval_covers_as_often_as_it_says():
    draws = np.random.default_rng(1)
    outcome = np.repeat([0.0, 1.0], [25, 15])
    truth = 0.7602499389  # Phi(1 / sqrt 2): normal classes one deviation apart
    covered = 0
    for _ in range(1000):
        area = auc(draws.normal(outcome), outcome)
        low, high = auc_score_interval(area, 15, 25, 0.95)
        covered += low <= truth <= high
    assert 0.93 <= covered / 1000 <= 0.975
