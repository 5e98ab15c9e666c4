"""Univariate statistics of all families against scipy and exact scores."""

import numpy as np
import pytest
from scipy import stats

from panelkit.errors import FitError
from panelkit.fits import ArraySource
from panelkit.stability import (
    cox_score_statistics,
    f_statistics,
    feature_statistics,
)

# eight rows, four features, with ties at 5 and 8; scores at 0 in exact arithmetic
# (Efron 1977, JASA 72:557), as R survival 3.5-3 coxph gives them
X = np.array(
    [
        [1, 0, 2, -1],
        [2, 1, 0, 1],
        [-1, 3, 1, 0],
        [0, 2, -2, 2],
        [3, -1, 1, 1],
        [-2, 1, 0, -2],
        [1, -2, 3, 0],
        [0, -1, -1, 3],
    ],
    float,
)
TIME = np.array([5, 8, 3, 8, 10, 2, 5, 9], float)
EVENT = np.array([1, 1, 0, 1, 0, 1, 1, 1], float)
SCORE = [-4.95, 1.7083333333, 1.7333333333, -5.3833333333]


def efron(beta, x):
    """The partial log likelihood, term by term."""
    eta, total = beta * x, 0.0
    for moment in np.unique(TIME[EVENT == 1]):
        dying = (moment == TIME) & (EVENT == 1)
        risk, own = np.exp(eta[moment <= TIME]).sum(), np.exp(eta[dying]).sum()
        d = dying.sum()
        total += eta[dying].sum()
        total -= sum(np.log(risk - k / d * own) for k in range(d))
    return total


def test_cox_score_over_the_root_of_its_information():
    found = cox_score_statistics(np.ascontiguousarray(X.T), TIME, EVENT)
    h = 1e-4
    for j, score in enumerate(SCORE):
        x = X[:, j]
        up, here, down = efron(h, x), efron(0.0, x), efron(-h, x)
        assert (up - down) / (2 * h) == pytest.approx(score, abs=1e-6)
        information = -(up - 2 * here + down) / h**2
        assert found[j] == pytest.approx(score / np.sqrt(information), rel=1e-5)


def test_cox_without_censoring_or_ties_is_the_logrank_test_of_two_groups():
    # score test of a binary covariate: Cox 1972, JRSS-B 34:187; scipy's logrank
    draws = np.random.default_rng(3)
    time, group = draws.exponential(size=40), np.arange(40) % 2 == 0
    time[group] *= 1.6
    found = cox_score_statistics(group[None].astype(float), time, np.ones(40))
    expected = stats.logrank(time[group], time[~group])
    assert found[0] ** 2 == pytest.approx(expected.statistic**2, rel=1e-10)


def test_cox_does_not_see_shift_or_scale():
    one = cox_score_statistics(np.ascontiguousarray(X.T), TIME, EVENT)
    other = cox_score_statistics(np.ascontiguousarray(3e4 + 7.0 * X.T), TIME, EVENT)
    assert other == pytest.approx(one, rel=1e-6)
    constant = cox_score_statistics(np.full((1, 8), 0.3), TIME, EVENT)
    assert constant.tolist() == [0.0]


def test_f_is_scipys():
    draws = np.random.default_rng(1)
    values, classes = (
        draws.normal(size=(20, 30)),
        np.repeat(["a", "b", "c"], [8, 12, 10]),
    )
    values[:5] += (classes == "b") * 1.0
    found = f_statistics(values, classes)
    expected = [
        stats.f_oneway(*(row[classes == c] for c in "abc")).statistic for row in values
    ]
    assert found == pytest.approx(expected, rel=1e-10)
    assert f_statistics(np.full((1, 30), 0.1), classes).tolist() == [0.0]


def statistics(X, outcome, family, subjects=None, source=None):
    n = len(X)
    return feature_statistics(
        ArraySource(X) if source is None else source,
        outcome,
        family,
        np.arange(n),
        np.arange(n) if subjects is None else subjects,
        np.ones(n),
    )


def test_each_family_has_its_statistic():
    draws = np.random.default_rng(2)
    X, y = draws.normal(size=(40, 6)), np.arange(40) % 2 * 1.0
    X[:, 0] += y
    number = X[:, 1] + draws.normal(size=40)
    welch = [stats.ttest_ind(c[y == 1], c[y == 0], equal_var=False)[0] for c in X.T]
    assert statistics(X, y, "binomial") == pytest.approx(welch, rel=1e-9)
    r = np.array([stats.pearsonr(c, number)[0] for c in X.T])
    t = r * np.sqrt(38 / (1 - r**2))
    assert statistics(X, number, "gaussian") == pytest.approx(t, rel=1e-9)
    classes = np.arange(40) % 3
    f = [stats.f_oneway(*(c[classes == k] for k in range(3))).statistic for c in X.T]
    assert statistics(X, classes, "multinomial") == pytest.approx(f, rel=1e-9)


@pytest.mark.parametrize("family", ["gaussian", "multinomial", "cox"])
def test_a_subject_counts_once(family):
    """Every row three times with one subject: the statistic of the single rows."""
    draws = np.random.default_rng(4)
    X, number = draws.normal(size=(30, 5)), draws.normal(size=30)
    outcome = {
        "gaussian": number,
        "multinomial": np.arange(30) % 3,
        "cox": (np.exp(number), (number > -0.5) * 1.0),
    }[family]
    thrice = np.repeat(np.arange(30), 3)[np.random.default_rng(5).permutation(90)]
    order = np.argsort(np.unique(thrice, return_index=True)[1])
    assert len(order) == 30
    repeated = (
        tuple(part[thrice] for part in outcome) if family == "cox" else outcome[thrice]
    )
    one = statistics(X, outcome, family)
    other = statistics(X[thrice], repeated, family, subjects=thrice)
    assert other == pytest.approx(one, rel=1e-9)


def test_features_left_out_have_none():
    draws = np.random.default_rng(6)
    source = ArraySource(draws.normal(size=(30, 4)))
    source.included[2] = False
    found = statistics(
        np.empty((30, 4)), draws.normal(size=30), "gaussian", None, source
    )
    assert found[2] == 0.0
    assert (found[[0, 1, 3]] != 0.0).all()


def test_what_cannot_be_ranked():
    with pytest.raises(FitError):
        cox_score_statistics(X.T, TIME, np.zeros(8))
    with pytest.raises(FitError):
        f_statistics(X.T, np.zeros(8))
    with pytest.raises(FitError):
        statistics(X[:2], np.array([0.1, 0.2]), "gaussian")
