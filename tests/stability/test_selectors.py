"""Other selectors, other families, and what may be a candidate."""

import numpy as np
import pytest

from panelkit.errors import StudyFileError
from panelkit.fits import ArraySource, fit_paths
from panelkit.stability import (
    SELECTORS,
    ShortlistRules,
    compare_selectors,
    draw_pairs,
    feature_statistics,
    outcome_strata,
    select_markers,
    trace_paths,
)


def test_univariate_picks_are_the_largest_statistics(draw):
    drawn = draw(61, 40, 50, signals=2)
    found = drawn.select(markers_per_subsample=3, selector="univariate")
    source, ones = ArraySource(drawn.X), np.ones(40)
    for rows, picks in zip(drawn.plan.rows, found.picks, strict=True):
        t = feature_statistics(source, drawn.y, "binomial", rows, np.arange(40), ones)
        assert picks.tolist() == np.argsort(-np.abs(t), kind="stable")[:3].tolist()
    assert found.bound.realised == 3.0


def test_elastic_net_takes_twins_together(draw):
    drawn = draw(62, 80, 60, signals=1, difference=2.0)
    X = drawn.X.copy()
    X[:, 1] = X[:, 0] + 0.15 * X[:, 1]
    lasso = drawn.select(X, markers_per_subsample=3)
    net = drawn.select(X, markers_per_subsample=3, selector="elastic-net", l1_share=0.2)
    # Zou & Hastie 2005, JRSS-B 67:301: the grouping effect
    assert net.frequency[:2].min() > lasso.frequency[:2].min() + 0.2
    paths = fit_paths(
        X, drawn.y, subsamples=drawn.plan.rows, max_markers=3, mixing=0.2,
        n_penalties=40, penalty_floor=0.1,
    )  # fmt: skip
    assert [p.tolist() for p in net.picks] == [p.tolist() for p in paths.entry_order]


def test_selectors_share_subsamples_and_have_their_own_agreement(draw):
    drawn = draw(63, 60, 60, signals=3, difference=1.5)
    rows = np.arange(60)
    found = compare_selectors(
        ArraySource(drawn.X), drawn.y, rows, rows, np.ones(60), drawn.plan,
        ShortlistRules(markers_per_subsample=4),
    )  # fmt: skip
    assert [each.selector for each in found] == list(SELECTORS)
    for each in found:
        alone = drawn.select(markers_per_subsample=4, selector=each.selector)
        assert each.shortlist.tolist() == alone.shortlist.tolist()
        assert each.top_frequency == alone.frequency.max()
        assert 0.0 < each.agreement.stability <= 1.0
    assert len({each.agreement.stability for each in found}) == 3


def test_unknown_selector(draw):
    with pytest.raises(StudyFileError) as caught:
        draw(64, 40, 30).select(selector="forest")
    assert "lasso, elastic-net, univariate" in caught.value.accepted


@pytest.mark.parametrize("family", ["gaussian", "cox", "multinomial"])
@pytest.mark.parametrize("selector", ["lasso", "univariate"])
def test_planted_markers_in_every_family(family, selector):
    draws = np.random.default_rng(7)
    n = 120
    X = draws.normal(size=(n, 150))
    score = 1.6 * X[:, 0] - 1.6 * X[:, 1]
    outcome = {
        "gaussian": score + draws.normal(size=n),
        "cox": (draws.exponential(size=n) * np.exp(-score), draws.random(n) < 0.7),
        "multinomial": np.digitize(score + 0.5 * draws.normal(size=n), [-1.0, 1.0]),
    }[family]
    if family == "cox":
        outcome = (outcome[0], outcome[1] * 1.0)
    rows = np.arange(n)
    plan = draw_pairs(rows, rows, outcome_strata(outcome, family), 15, draws)
    found = select_markers(
        ArraySource(X), outcome, rows, rows, np.ones(n), plan,
        ShortlistRules(markers_per_subsample=4, selector=selector), family=family,
    )  # fmt: skip
    assert sorted(found.shortlist.tolist()) == [0, 1]
    if family == "multinomial":
        assert np.isnan(found.positive_share).all()
    else:
        assert found.positive_share[:2].tolist() == [1.0, 0.0]
        assert found.t[0] > 0.0 > found.t[1]


def test_candidates_can_be_kept_to_what_is_assayable(draw):
    drawn = draw(65, 60, 80, signals=4, difference=1.5)
    free = drawn.select()
    allowed = np.ones(80, bool)
    allowed[[0, 1]] = False
    rows = np.arange(60)
    found = select_markers(
        ArraySource(drawn.X), drawn.y, rows, rows, np.ones(60), drawn.plan,
        ShortlistRules(), allowed=allowed, always=np.array([70]),
    )  # fmt: skip
    assert np.isin([0, 1], free.candidates).all()
    assert not np.isin([0, 1], found.candidates).any()
    assert {2, 3, 70} <= set(found.candidates.tolist())
    assert found.shortlist.tolist() == free.shortlist.tolist()
    assert found.frequency.tobytes() == free.frequency.tobytes()
    # the next ones move up: as many univariate candidates as before
    order = [j for j in np.argsort(-np.abs(found.t), kind="stable") if allowed[j]]
    assert set(order[:25]) <= set(found.candidates.tolist())


def test_bounds_of_the_shortlist_stand_side_by_side(draw):
    drawn = draw(66, 60, 300, signals=2)
    found = drawn.select(threshold=0.75, false_markers=1.0).bound
    assert 0.0 < found.unimodal < found.worst_case
    assert np.isnan(found.r_concave)
    sharp = drawn.select(threshold=0.75, false_markers=1.0, bound="r-concave").bound
    assert 0.0 < sharp.r_concave <= 1.0
    said = found.sentence()
    for part in ("worst case", "one mode", "no error of this kind", "not of a panel"):
        assert part in said.replace("not \nof", "not of")


def test_threshold_can_follow(draw):
    drawn = draw(67, 60, 400, signals=2)
    found = drawn.select(markers_per_subsample=12, threshold=None, false_markers=0.5)
    # 1/2 (1 + 144 / 200) = 0.86; 20 pairs: the next fortieth is 0.875
    assert found.bound.threshold == 0.875
    assert found.bound.asked == 12


def test_saturation_is_told(draw):
    # 20 people in a half, classes far apart: the path stops long before 60
    drawn = draw(68, 40, 2000, signals=20, difference=3.0)
    found = drawn.select(markers_per_subsample=60)
    assert found.bound.asked == 60
    assert found.bound.realised < 40
    assert found.bound.full_share < 1.0
    assert "Asked for 60" in found.bound.saturation()
    full = draw(69, 100, 200).select(markers_per_subsample=3)
    assert full.bound.saturation() == ""


def test_frequencies_at_equal_relative_penalty_are_those_of_whole_paths(draw):
    drawn = draw(70, 40, 80, signals=2)
    rules = ShortlistRules(n_penalties=12)
    found = trace_paths(ArraySource(drawn.X), drawn.y, np.ones(40), drawn.plan, rules)
    paths = fit_paths(
        drawn.X, drawn.y, subsamples=drawn.plan.rows, n_penalties=12, penalty_floor=0.1
    )
    for k in (3, 11):
        active = np.array([paths.coef(b, k)[1] != 0.0 for b in range(40)])
        expected = active.mean(axis=0)
        assert found.frequency[k].tolist() == expected[found.features].tolist()
        assert found.n_active[k] == pytest.approx(active.sum(axis=1).mean())
        apart = 0
        for b, rows in enumerate(drawn.plan.rows):
            intercept, beta = paths.coef(b, k)
            score = intercept + drawn.X[rows] @ beta
            case = drawn.y[rows] == 1.0
            apart += score[case].min() > score[~case].max()
        assert found.separated_share[k] == apart / 40
    assert found.relative_penalty[[0, -1]] == pytest.approx([1.0, 0.1])
    assert found.separated_share[-1] > 0.0
