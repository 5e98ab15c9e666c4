"""Small ridge refits, ridge on all features, and Welch's t, each against a library."""

import numpy as np
import pytest
from scipy.stats import ttest_ind
from sklearn.linear_model import LogisticRegression

from panelkit.errors import FitError
from panelkit.fits import (
    ArraySource,
    fit_panels,
    kernel_matrix,
    rank_univariate,
    ridge_predictions,
    standardised,
)

PENALTIES = np.array([1.0, 0.1, 0.01, 0.001])


@pytest.fixture
def cohort(draw_cohort):
    X, y, _ = draw_cohort(51, 50, 12)
    return X, y


def scikit_learn(Z, y, penalty, weights=None):
    """Return intercept and coefficients for the mean loss plus penalty / 2 |b|^2."""
    n = len(y) if weights is None else weights.sum()
    model = LogisticRegression(C=1.0 / (n * penalty), tol=1e-12, max_iter=10_000)
    model.fit(Z, y, sample_weight=weights)
    return model


@pytest.mark.parametrize("weighted", [False, True])
def test_panels_equal_scikit_learn(weighted, cohort):
    # panels of unequal size share one padded array: padding that counted would show
    X, y = cohort
    weights = np.ones(50)
    if weighted:
        weights = np.random.default_rng(51).uniform(0.5, 3.0, 50)
    Z, _, _ = standardised(X.T, np.arange(50), weights)
    panels = [np.array([3]), np.array([7, 0, 4, 1, 9]), np.array([2, 5])]
    fits = fit_panels(Z, panels, y, weights, PENALTIES)
    eta = fits.linear_predictors(Z)
    assert eta.shape == (3, 4, 50)
    for s, panel in enumerate(panels):
        for k, penalty in enumerate(PENALTIES):
            other = scikit_learn(Z[panel].T, y, penalty, weights)
            found = fits.coefs[s, k, : 1 + len(panel)]
            expected = [other.intercept_[0], *other.coef_[0]]
            assert found == pytest.approx(expected, abs=1e-5)
            assert eta[s, k] == pytest.approx(
                other.decision_function(Z[panel].T), abs=1e-4
            )


def test_panels_satisfy_their_own_equations(cohort):
    # gradient of the objective from its definition: mean loss and ridge
    X, y = cohort
    Z, _, _ = standardised(X.T, np.arange(50), np.ones(50))
    panel = np.array([1, 5, 6])
    fits = fit_panels(Z, [panel], y, np.ones(50), PENALTIES)
    for k, penalty in enumerate(PENALTIES):
        b = fits.coefs[0, k]
        residual = y - 1.0 / (1.0 + np.exp(-(b[0] + b[1:] @ Z[panel])))
        assert abs(residual.mean()) < 1e-8
        assert Z[panel] @ residual / 50 == pytest.approx(penalty * b[1:], abs=1e-8)


def test_empty_panel_is_the_log_odds_of_the_weighted_share(cohort):
    X, y = cohort
    weights = np.where(y == 1.0, 3.0, 1.0)
    Z, _, _ = standardised(X.T, np.arange(50), weights)
    fits = fit_panels(Z, [np.array([], int)], y, weights, PENALTIES)
    share = weights[y == 1.0].sum() / weights.sum()
    assert fits.coefs[0, :, 0] == pytest.approx(np.log(share / (1.0 - share)))
    assert fits.linear_predictors(Z)[0, 0] == pytest.approx(fits.coefs[0, 0, 0])


def test_a_panel_alone_is_the_panel_among_many(cohort):
    X, y = cohort
    Z, _, _ = standardised(X.T, np.arange(50), np.ones(50))
    panels = [np.arange(s) for s in (1, 8, 3)]
    together = fit_panels(Z, panels, y, np.ones(50), PENALTIES)
    for s, panel in enumerate(panels):
        alone = fit_panels(Z, [panel], y, np.ones(50), PENALTIES)
        m = 1 + len(panel)
        assert alone.coefs[0, :, :m].tobytes() == together.coefs[s, :, :m].tobytes()
        assert (
            alone.linear_predictors(Z)[0].tobytes()
            == together.linear_predictors(Z)[s].tobytes()
        )


def test_one_row_scores_as_it_does_among_many(cohort):
    X, y = cohort
    Z, _, _ = standardised(X.T, np.arange(50), np.ones(50))
    fits = fit_panels(Z, [np.arange(6)], y, np.ones(50), PENALTIES)
    many = fits.linear_predictors(Z)
    for i in (0, 17, 49):
        one = fits.linear_predictors(Z[:, i : i + 1])
        assert one[:, :, 0].tobytes() == many[:, :, i].copy().tobytes()


def test_separable_panel_is_fitted_at_the_smallest_default_penalty(cohort):
    X, _ = cohort
    y = (X[:, 0] > np.median(X[:, 0])).astype(float)
    Z, _, _ = standardised(X.T, np.arange(50), np.ones(50))
    fits = fit_panels(Z, [np.array([0, 1])], y, np.ones(50), np.array([1.0, 1e-5]))
    assert np.isfinite(fits.coefs).all()


def test_one_class_is_refused(cohort):
    X, _ = cohort
    with pytest.raises(FitError) as caught:
        fit_panels(X.T, [np.array([0])], np.ones(50), np.ones(50), PENALTIES)
    assert caught.value.code == "one-class-subsample"


def test_columns_are_standardised_by_training_rows_alone(cohort):
    X, _ = cohort
    training = np.arange(10, 40)
    weights = np.random.default_rng(3).uniform(0.5, 2.0, 30)
    Z, mean, deviation = standardised(X.T, training, weights)
    expected = np.average(X[training], axis=0, weights=weights)
    spread = np.average((X[training] - expected) ** 2, axis=0, weights=weights)
    assert mean == pytest.approx(expected)
    assert deviation == pytest.approx(np.sqrt(spread))
    assert pytest.approx(((X - expected) / np.sqrt(spread)).T) == Z
    changed = X.copy()
    changed[:10] = 1e6
    again = standardised(changed.T, training, weights)
    assert again[1].tobytes() == mean.tobytes()
    assert again[2].tobytes() == deviation.tobytes()


def test_column_constant_on_the_training_rows_becomes_zero(cohort):
    X = cohort[0].copy()
    X[10:, 2] = 5.0
    Z, mean, deviation = standardised(X.T, np.arange(10, 50), np.ones(40))
    assert (Z[2] == 0.0).all()
    assert (mean[2], deviation[2]) == (5.0, 1.0)


# ridge on all features


def test_kernel_is_the_mean_product_of_standardised_columns(draw_cohort, monkeypatch):
    X, _, _ = draw_cohort(52, 30, 90)
    monkeypatch.setattr("panelkit.fits.ridge.TILE", 16)
    X[:, 4] = 1.0  # constant: counted in the divisor, adds nothing
    weights = np.random.default_rng(52).uniform(0.5, 2.0, 30)
    training = np.arange(4, 30)
    source = ArraySource(X)
    source.included[7] = False
    keep = np.delete(np.arange(90), 7)
    Z, _, _ = standardised(X[:, keep].T, training, weights[training])
    assert kernel_matrix(source, training, weights) == pytest.approx(Z.T @ Z / 89)


@pytest.mark.parametrize("weighted", [False, True])
def test_ridge_equals_scikit_learn_on_the_same_columns(weighted, draw_cohort):
    X, y, _ = draw_cohort(53, 60, 200)
    training, test = np.arange(40), np.arange(40, 60)
    weights = np.ones(60)
    if weighted:
        weights = np.random.default_rng(53).uniform(0.5, 2.0, 60)
    kernel = kernel_matrix(ArraySource(X), training, weights)
    found = ridge_predictions(kernel, y, weights, training, test, PENALTIES)
    Z, _, _ = standardised(X.T, training, weights[training])
    columns = Z.T / np.sqrt(200)  # the kernel is a mean product
    for k, penalty in enumerate(PENALTIES):
        other = scikit_learn(columns[training], y[training], penalty, weights[training])
        assert found[k] == pytest.approx(
            other.decision_function(columns[test]), abs=2e-4
        )


def test_ridge_reads_no_outcome_of_a_test_row(draw_cohort):
    X, y, _ = draw_cohort(54, 40, 80)
    training, test = np.arange(30), np.arange(30, 40)
    kernel = kernel_matrix(ArraySource(X), training, np.ones(40))
    found = ridge_predictions(kernel, y, np.ones(40), training, test, PENALTIES)
    other = y.copy()
    other[30:] = 1.0 - other[30:]
    again = ridge_predictions(kernel, other, np.ones(40), training, test, PENALTIES)
    assert again.tobytes() == found.tobytes()


# one feature at a time


def test_welch_equals_scipy(draw_cohort):
    X, y, _ = draw_cohort(55, 41, 30)
    rows = np.arange(2, 41)
    found = rank_univariate(ArraySource(X), y, rows, np.arange(41), np.ones(41))
    cases, controls = X[rows][y[rows] == 1.0], X[rows][y[rows] == 0.0]
    expected = ttest_ind(cases, controls, equal_var=False).statistic
    assert found.t == pytest.approx(expected, rel=1e-10)
    assert found.means == pytest.approx(
        np.column_stack([controls.mean(0), cases.mean(0)])
    )
    assert found.variances == pytest.approx(
        np.column_stack([controls.var(0, ddof=1), cases.var(0, ddof=1)])
    )
    assert found.order.tolist() == np.argsort(-np.abs(expected)).tolist()


def test_welch_counts_subjects_not_rows(draw_cohort):
    # every sample measured twice, each half a unit: the t of the samples themselves
    X, y, _ = draw_cohort(56, 30, 10)
    once = rank_univariate(ArraySource(X), y, np.arange(30), np.arange(30), np.ones(30))
    twice = rank_univariate(
        ArraySource(np.repeat(X, 2, axis=0)),
        np.repeat(y, 2),
        np.arange(60),
        np.repeat(np.arange(30), 2),
        np.full(60, 0.5),
    )
    assert twice.t == pytest.approx(once.t, rel=1e-10)
    naive = rank_univariate(
        ArraySource(np.repeat(X, 2, axis=0)),
        np.repeat(y, 2),
        np.arange(60),
        np.arange(60),
        np.ones(60),
    )
    assert np.abs(naive.t).max() > 1.3 * np.abs(once.t).max()


def test_welch_is_zero_for_constant_and_excluded_features(draw_cohort):
    X, y, _ = draw_cohort(57, 30, 10)
    X[:, 0] = 4.0
    source = ArraySource(X)
    source.included[1] = False
    found = rank_univariate(source, y, np.arange(30), np.arange(30), np.ones(30))
    assert (found.t[:2] == 0.0).all()
    assert set(found.order[-2:].tolist()) == {0, 1}
    assert (found.t[2:] != 0.0).all()


def test_equal_features_rank_by_column(draw_cohort):
    X, y, _ = draw_cohort(58, 30, 3)
    found = rank_univariate(
        ArraySource(np.column_stack([X, X])),
        y,
        np.arange(30),
        np.arange(30),
        np.ones(30),
    )
    place = {int(feature): k for k, feature in enumerate(found.order)}
    for j in range(3):
        assert place[j + 3] == place[j] + 1
