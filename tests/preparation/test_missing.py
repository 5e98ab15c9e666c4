"""Values below a limit of detection, and nearest neighbours."""

import numpy as np
import pytest
from scipy import stats
from sklearn.impute import KNNImputer

from panelkit.preparation import Recipe
from panelkit.preparation.missing import (
    BelowLimit,
    HalfMinimum,
    Neighbours,
    below_limit_means,
    censored_normal,
)

NAN = np.nan
VALUES = [3.1, NAN, 5.2, 2.4, NAN, 8.8, 4.0, 2.9]  # two below the limit of 2
EVERYONE = np.arange(8)


def test_half_minimum(values_of, nothing):
    plain = HalfMinimum("linear").learn(values_of([VALUES]), EVERYONE, nothing)
    assert plain["fill"] == pytest.approx([1.2])
    logs = values_of(np.log2([VALUES]))
    on_logs = HalfMinimum("log2").learn(logs, EVERYONE, nothing)
    assert np.exp2(on_logs["fill"]) == pytest.approx([1.2])


def moments(logs):
    there = ~np.isnan(logs)
    return logs[there].mean(), logs[there].var(), there.sum(), (~there).sum()


def test_censored_normal_against_a_published_routine():
    """Maximum likelihood of R's survreg (survival), left-censored, natural logs."""
    mean, variance, measured, censored = moments(np.log(VALUES))
    mu, sigma = censored_normal(
        np.array([mean]),
        np.array([variance]),
        np.array([measured]),
        np.array([censored]),
        np.log([2.0]),
    )
    assert mu == pytest.approx([1.1193202628], abs=1e-8)
    assert sigma == pytest.approx([0.6048578129], abs=1e-8)
    below = below_limit_means(mu, sigma, np.log([2.0]))
    assert below == pytest.approx([0.3366379082], abs=1e-8)


@pytest.mark.parametrize("limit", [-1.5, -0.3, 0.4, 1.0])
@pytest.mark.parametrize("seed", [0, 1])
def test_censored_normal_against_scipy(limit, seed):
    """`scipy.stats.norm.fit` of censored data maximises the same likelihood."""
    draws = np.random.default_rng(seed).normal(0.2, 1.1, 60)
    above = draws[draws >= limit]
    data = stats.CensoredData(
        uncensored=above, left=np.full((draws < limit).sum(), limit)
    )
    expected = stats.norm.fit(data)
    mu, sigma = censored_normal(
        np.array([above.mean()]),
        np.array([above.var()]),
        np.array([len(above)]),
        np.array([60 - len(above)]),
        np.array([limit]),
    )
    assert (mu[0], sigma[0]) == pytest.approx(expected, abs=2e-4)


def test_below_limit_on_both_scales(values_of, nothing):
    linear = BelowLimit(2.0, "linear").learn(values_of([VALUES]), EVERYONE, nothing)
    assert np.log(linear["fill"]) == pytest.approx([0.3366379082], abs=1e-8)
    logs = values_of(np.log2([VALUES]))
    on_logs = BelowLimit(1.0, "log2").learn(logs, EVERYONE, nothing)
    assert np.exp2(on_logs["fill"]) == pytest.approx(linear["fill"])


def test_below_limit_falls_back_where_nothing_can_be_estimated(values_of, nothing):
    """One value, equal values, and none at all."""
    rows = [[NAN, NAN, 3.0], [5.0, NAN, 5.0], [NAN, NAN, NAN]]
    fill = BelowLimit().learn(values_of(rows), np.arange(3), nothing)["fill"]
    assert fill[:2].tolist() == [2.0, 4.0]
    assert np.isnan(fill[2])


def test_below_limit_lies_below_what_was_measured(values_of, nothing):
    draws = np.random.default_rng(3).normal(20, 2, (80, 30))
    draws[draws < 19.0] = NAN
    fill = BelowLimit().learn(values_of(draws), np.arange(30), nothing)["fill"]
    assert (fill < np.nanmin(draws, axis=1)).all()
    assert (fill > np.nanmin(draws, axis=1) - 6.0).all()


def test_neighbours_are_those_of_scikit_learn():
    rng = np.random.default_rng(4)
    values = rng.normal(size=(30, 20)) + rng.normal(size=20)
    values[rng.random(values.shape) < 0.2] = NAN
    training = np.arange(14)
    recipe = Recipe(({"step": "neighbours", "k": 3},))
    state = recipe.learn(values, training, np.full(30, "", object))
    found = recipe.apply(state, values, np.arange(20))
    theirs = KNNImputer(n_neighbors=3).fit(values[:, training].T).transform(values.T)
    assert found == pytest.approx(theirs.T, abs=1e-6)  # the matrix is float32


def test_neighbours_without_a_feature_to_go_by(values_of, nothing):
    values = values_of(np.full((2, 3), NAN))
    step = Neighbours()
    learnt = step.learn(values, np.arange(3), nothing)
    assert np.isnan(step.apply(values, learnt, nothing).matrix).all()
