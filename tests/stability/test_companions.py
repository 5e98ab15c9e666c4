"""Companion groups: complete linkage on 1 - |Pearson|."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import rankdata, spearmanr

from panelkit.fits import ArraySource
from panelkit.stability import (
    ShortlistRules,
    describe_companions,
    draw_pairs,
    group_companions,
    select_markers,
)
from panelkit.stability.companions import correlations, group_frequencies

# permutations of 1 to 8, so that Pearson's r is Spearman's: rationals over 42, exact
# arithmetic; merge heights as scipy 1.17.1 linkage finds them
A = [1, 2, 3, 4, 5, 6, 7, 8]
B = [2, 1, 4, 3, 6, 5, 8, 7]
C = [9, 8, 6, 7, 4, 3, 1, 2]  # ranks of a falling column
D = [3, 7, 1, 8, 2, 6, 4, 5]
E = [5, 1, 8, 2, 7, 6, 3, 4]


@pytest.fixture
def five():
    ranks = np.argsort(np.argsort(C)) + 1
    return np.array([A, B, ranks, D, E], float)


def test_correlations_of_the_example(five):
    r = np.corrcoef(five)
    assert r[0, 1] == pytest.approx(0.9047619048, abs=1e-10)
    assert r[0, 2] == pytest.approx(-0.9523809524, abs=1e-10)
    assert r[1, 2] == pytest.approx(-0.9523809524, abs=1e-10)
    assert r[3, 4] == pytest.approx(-0.8095238095, abs=1e-10)


@pytest.mark.parametrize(
    ("correlation", "expected"),
    [
        (0.96, [0, 1, 2, 3, 4]),
        (0.9047619, [0, 0, 0, 1, 2]),
        (0.9047620, [0, 1, 0, 2, 3]),  # a-c and b-c are equal: the first joins
        (0.82, [0, 0, 0, 1, 2]),
        (0.8, [0, 0, 0, 1, 1]),  # d and e join by their negative correlation
        (0.03, [0, 0, 0, 1, 1]),
        (0.0, [0, 0, 0, 0, 0]),
    ],
)
def test_groups_of_the_example(correlation, expected, five):
    found = group_companions(five, correlation)
    if expected == [0, 1, 0, 2, 3]:
        assert len(np.unique(found)) == 4
        assert found[2] in (found[0], found[1])
    else:
        assert found.tolist() == expected


def test_single_linkage_would_chain_what_complete_linkage_keeps_apart():
    # x - y and y - z reach 0.8, x - z does not (common practice: complete linkage)
    draws = np.random.default_rng(0)
    noise = draws.normal(size=(3, 200))
    x, z = noise[0], noise[1]
    y = x + z + 0.3 * noise[2]
    values = np.array([x, y, z])
    r = np.abs(np.corrcoef(values))
    cut = min(r[0, 1], r[1, 2]) - 0.01
    assert cut > r[0, 2]
    assert len(np.unique(group_companions(values, cut))) == 2


@settings(derandomize=True, deadline=None, max_examples=60, database=None)
@given(
    seed=st.integers(0, 10_000),
    n_features=st.integers(1, 25),
    correlation=st.floats(0.1, 0.99),
)
def test_every_pair_of_a_group_has_the_asked_correlation(seed, n_features, correlation):
    draws = np.random.default_rng(seed)
    hidden = draws.normal(size=(4, 12))
    values = hidden[draws.integers(0, 4, n_features)]
    values = values * draws.choice([-1.0, 1.0], n_features)[:, None]
    values = values + draws.uniform(0.0, 1.0) * draws.normal(size=values.shape)
    groups = group_companions(values, correlation)
    assert groups.tolist() == _by_first_member(groups)
    r = np.abs(np.corrcoef(values)).reshape(n_features, n_features)
    for g in np.unique(groups):
        members = np.flatnonzero(groups == g)
        assert r[np.ix_(members, members)].min() >= correlation - 1e-9


def _by_first_member(groups):
    seen = {}
    return [seen.setdefault(g, len(seen)) for g in groups.tolist()]


def test_offset_scale_and_sign_do_not_matter(five):
    other = five * np.array([2.0, -3.0, 0.1, 1e3, -1.0])[:, None] + 7.0
    assert group_companions(other, 0.8).tolist() == group_companions(five, 0.8).tolist()


def test_constant_feature_is_a_group_of_its_own(five):
    values = np.vstack([five, np.full(8, 3.0), np.full(8, 3.0)])
    assert group_companions(values, 0.8).tolist() == [0, 0, 0, 1, 1, 2, 3]


def test_constants_whose_mean_rounds_stay_apart():
    values = np.vstack([np.full(23, 0.1), np.full(23, 0.3), np.full(23, 0.7)])
    assert (values.mean(axis=1) != values[:, 0]).sum() >= 2
    assert group_companions(values, 0.8).tolist() == [0, 1, 2]


def test_one_feature_and_none():
    assert group_companions(np.ones((1, 4)), 0.8).tolist() == [0]
    assert group_companions(np.ones((0, 4)), 0.8).tolist() == []


def test_a_group_is_picked_when_any_member_is():
    groups = np.array([0, 1, 0, 2])
    picked = np.array(
        [[1, 0, 0, 0], [0, 0, 1, 0], [1, 0, 1, 0], [0, 1, 0, 0]], dtype=bool
    )
    found = group_frequencies(groups, picked)
    assert found.tolist() == [0.75, 0.25, 0.75, 0.0]


def test_spearman_of_the_worked_columns_with_ties():
    # average ranks; exact: .7631578947 (scipy 1.17.1 spearmanr)
    ranks = rankdata(np.array([[1, 2, 2, 4, 5], [3, 1, 4, 4, 6]]), axis=1)
    assert correlations(ranks)[0, 1] == pytest.approx(0.7631578947, abs=1e-10)


def test_pairs_of_companions_are_described(draw):
    drawn = draw(21, 60, 80, signals=1, difference=1.5)
    X = drawn.X.copy()
    X[:, 1] = np.exp(X[:, 0] + 0.1 * X[:, 1])  # another scale: ranks agree better
    found = drawn.select(X, markers_per_subsample=3, companion_correlation=0.6)
    told = describe_companions(ArraySource(X), np.arange(60), found).to_frame()
    pair = told[(told["first"] == 0) & (told["second"] == 1)].iloc[0]
    assert pair["group"] == found.group[0] >= 0
    assert pair["pearson"] == pytest.approx(np.corrcoef(X[:, 0], X[:, 1])[0, 1])
    assert pair["spearman"] == pytest.approx(spearmanr(X[:, 0], X[:, 1]).statistic)
    assert pair["spearman"] > pair["pearson"]
    both = (found.picked[:, 0] & found.picked[:, 1]).mean()
    assert pair["together"] == both
    assert pair["expected"] == pytest.approx(found.frequency[0] * found.frequency[1])
    assert (pair["z"] < 0) == (both < pair["expected"])


def test_twins_split_their_votes_and_exclude_each_other():
    """Four nearly equal markers, one pick a subsample: none alone reaches 0.6."""
    draws = np.random.default_rng(8)
    y = np.arange(80) % 2 * 1.0
    X = draws.normal(size=(80, 60))
    X[:, :4] = (y + 0.8 * draws.normal(size=80))[:, None] + 0.12 * X[:, :4]
    rows = np.arange(80)
    found = select_markers(
        ArraySource(X), y, rows, rows, np.ones(80),
        draw_pairs(rows, rows, y, 50, draws),
        ShortlistRules(markers_per_subsample=1, threshold=0.6),
    )  # fmt: skip
    assert found.frequency.max() < 0.6
    assert len(found.shortlist) == 0
    assert found.group_frequency[0] > 0.9
    told = describe_companions(ArraySource(X), rows, found).to_frame()
    twins = told[(told["first"] < 4) & (told["second"] < 4)]
    assert len(twins) == 6
    assert twins["vote_split"].all()
    assert (twins["together"] == 0.0).all()
    assert (twins["z"] < 0.0).any()
