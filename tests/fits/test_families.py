"""Cox and multinomial paths: published checks, independent fits, edge cases.

The eight rows are those of test_eight_rows.py. Sources of the values stand beside them.
"""

import numpy as np
import pytest
from scipy.optimize import minimize
from sklearn.linear_model import LogisticRegression, Ridge

from panelkit.errors import FitError, UsageError
from panelkit.fits import (
    ArraySource,
    fit_panels,
    fit_paths,
    kernel_matrix,
    ridge_predictions,
    standardised,
)

TIME = np.array([5, 8, 3, 8, 10, 2, 5, 9], float)
EVENT = np.array([1, 1, 0, 1, 0, 1, 1, 1], float)  # two events tied at 5, two at 8
CLASSES = np.array([0, 0, 1, 1, 2, 1, 2, 0])
TIGHT = {"standardise": False, "tol": 1e-10}


@pytest.mark.parametrize(
    ("ties", "penalty", "expected"),
    [
        # R glmnet 4.1-6, skglm 0.5 and scikit-survival 0.28 agree to 1e-6
        ("breslow", 0.15, [-0.6556749649, 0, 0, -0.7403413321]),
        ("breslow", 0.05, [-1.1012170488, 0, 0.2057260867, -1.0163491181]),
        # skglm 0.5 with Efron's ties
        ("efron", 0.15, [-0.7122477762, 0, 0, -0.8480091340]),
        # optimality conditions alone: no second library for this row
        ("efron", 0.05, [-1.1833145523, 0, 0.2118536574, -1.1465369508]),
    ],
)
def test_cox_on_eight_rows(eight, ties, penalty, expected):
    fit = fit_paths(
        eight.X, (TIME, EVENT), family="cox", ties=ties, penalties=[penalty], **TIGHT
    )
    intercept, coefficients = fit.coef(0, 0)
    assert intercept == 0.0
    np.testing.assert_allclose(coefficients, expected, rtol=0, atol=2e-8)


def test_largest_penalties_of_cox_differ_by_ties(eight):
    # exact: the score at zero over n, largest entry (Breslow 5/8, Efron 5.38.../8)
    for ties, raw, scaled in (
        ("breslow", 0.625, 0.4166666667),
        ("efron", 0.6729166667, 0.4486111111),
    ):
        for standardise, largest in ((False, raw), (True, scaled)):
            fit = fit_paths(
                eight.X,
                (TIME, EVENT),
                family="cox",
                ties=ties,
                penalties=[0.5],
                standardise=standardise,
            )
            assert fit.largest_penalty[0] == pytest.approx(largest, abs=1e-9)


def test_standardised_cox_is_reported_on_the_original_scale(eight):
    # R glmnet 4.1-6, Breslow ties
    fit = fit_paths(
        eight.X,
        (TIME, EVENT),
        family="cox",
        ties="breslow",
        penalties=[0.15],
        tol=1e-10,
    )
    expected = [-0.5074691527, 0, 0, -0.5811672900]
    np.testing.assert_allclose(fit.coef(0, 0)[1], expected, atol=2e-8)


@pytest.mark.parametrize(
    ("ties", "slope"), [("breslow", 1.4752849148), ("efron", 1.6768574856)]
)
def test_published_tie_check(ties, slope):
    """Therneau & Grambsch 2000, appendix E: log((3 + sqrt 33)/2); root of a cubic."""
    x = np.array([0, 1, 1, 1, 0, 0], float)
    noise = np.arange(6.0)
    fit = fit_paths(
        np.column_stack([x, noise]),
        ((9, 1, 1, 6, 6, 8), (1, 1, 0, 1, 1, 0)),
        family="cox",
        ties=ties,
        penalties=[1e6],
        feature_weights=[0.0, 1.0],
        standardise=False,
        tol=1e-9,
    )
    assert fit.coef(0, 0)[1] == pytest.approx([slope, 0.0], abs=1e-8)


def test_unpenalised_covariates_of_cox(eight):
    # R survival 3.5-3, coxph on columns 1 and 2
    for ties, expected in (
        ("breslow", [-0.5689084675, 0.0092929124]),
        ("efron", [-0.5497635233, 0.0400471589]),
    ):
        fit = fit_paths(
            eight.X[:, 2:],
            (TIME, EVENT),
            family="cox",
            ties=ties,
            unpenalised=eight.X[:, :2],
            penalties=[1e6],
            tol=1e-9,
        )
        found = fit.covariate_coefficients[0, 0]
        np.testing.assert_allclose(found, expected, atol=1e-8)
        assert not fit.coef(0, 0)[1].any()


def partial_likelihood(beta, X, time, event, strata):
    """Breslow's log partial likelihood, term by term from the definition."""
    eta = X @ beta
    total = 0.0
    for i in np.flatnonzero(event):
        at_risk = (time >= time[i]) & (strata == strata[i])
        total += eta[i] - np.log(np.exp(eta[at_risk]).sum())
    return total


def test_strata_against_the_definition():
    """Strata that are ignored give other coefficients: baselines differ tenfold."""
    rng = np.random.default_rng(4)
    X = rng.standard_normal((60, 3))
    strata = np.repeat([0, 1, 2], 20)
    time = rng.exponential(np.exp(-X[:, 0]) * 10.0**strata)
    event = (rng.random(60) < 0.7).astype(float)
    found = minimize(
        lambda b: -partial_likelihood(b, X, time, event, strata),
        np.zeros(3),
        method="BFGS",
        options={"gtol": 1e-8},
    ).x
    settings = {
        "family": "cox",
        "penalties": [1.0],
        "feature_weights": [0, 0, 0],
        "ties": "breslow",
    }
    fit = fit_paths(X, (time, event), strata=strata, **settings)
    np.testing.assert_allclose(fit.coef(0, 0)[1], found, atol=1e-5)
    ignored = fit_paths(X, (time, event), **settings)
    assert np.abs(ignored.coef(0, 0)[1] - found).max() > 0.05


def test_matched_pairs_are_conditional_logistic_regression():
    """Breslow & Day 1980, chapter 7: 1:1 pairs are logistic on the differences."""
    rng = np.random.default_rng(5)
    cases = rng.standard_normal((40, 2)) + np.array([0.8, 0.0])
    controls = rng.standard_normal((40, 2))
    X = np.vstack([cases, controls])
    event = np.repeat([1.0, 0.0], 40)
    pair = np.tile(np.arange(40), 2)
    fit = fit_paths(
        X,
        (np.ones(80), event),
        family="cox",
        strata=pair,
        penalties=[1.0],
        feature_weights=[0, 0],
        tol=1e-9,
    )
    d = cases - controls
    direct = minimize(
        lambda b: np.logaddexp(0.0, -d @ b).sum(), np.zeros(2), options={"gtol": 1e-9}
    ).x
    np.testing.assert_allclose(fit.coef(0, 0)[1], direct, atol=1e-6)


def test_grouped_multinomial_on_eight_rows(eight):
    # R glmnet 4.1-6 (grouped) and cvxpy 1.9.3
    fit = fit_paths(eight.X, CLASSES, family="multinomial", penalties=[0.1], **TIGHT)
    intercepts, coefficients = fit.coef(0, 0)
    np.testing.assert_allclose(
        intercepts, [1.1542375066, 0.2195956277, -1.3738331343], atol=2e-8
    )
    expected = [
        [0.0785521475, -0.9228992301, 0.8443470827],
        [0.0325979926, 1.1612203358, -1.1938183285],
        [-0.0515837159, -0.1150323784, 0.1666160943],
        [0, 0, 0],
    ]
    np.testing.assert_allclose(coefficients, expected, atol=2e-8)
    assert fit.largest_penalty[0] == pytest.approx(0.7815624375, abs=1e-9)
    assert fit.classes == (0, 1, 2)


def test_two_classes_are_the_binomial_path(eight):
    """Two opposite columns of b/2 have the norm |b|/sqrt 2: the penalty is scaled."""
    two = fit_paths(
        eight.X,
        eight.binomial,
        family="multinomial",
        penalties=[0.1 * np.sqrt(2.0)],
        **TIGHT,
    )
    one = fit_paths(eight.X, eight.binomial, penalties=[0.1], **TIGHT)
    both = two.coef(0, 0)[1]
    np.testing.assert_allclose(both[:, 1] - both[:, 0], one.coef(0, 0)[1], atol=1e-7)


def cohort(n=80, p=300, seed=0):
    rng = np.random.default_rng(seed)
    X = rng.standard_normal((n, p))
    return rng, X, X[:, 0] - X[:, 1]


def outcomes(rng, eta):
    n = len(eta)
    noise = rng.gumbel(size=(n, 3))
    return {
        "gaussian": eta + rng.standard_normal(n),
        "binomial": (rng.random(n) < 1 / (1 + np.exp(-eta))).astype(float),
        "cox": (
            rng.exponential(np.exp(-eta)).round(1),
            (rng.random(n) < 0.7).astype(float),
        ),
        "multinomial": np.argmax(np.column_stack([eta, -eta, 0 * eta]) + noise, axis=1),
    }


FAMILY = pytest.mark.parametrize(
    "family", ["gaussian", "binomial", "cox", "multinomial"]
)


@FAMILY
def test_no_bit_depends_on_what_it_must_not(family):
    rng, X, eta = cohort()
    outcome = outcomes(rng, eta)[family]
    X = X.astype(np.float32).astype(np.float64)  # float32 holds every value
    subsamples = [np.sort(rng.permutation(80)[:45]) for _ in range(5)]
    settings = {"family": family, "n_penalties": 15, "penalty_floor": 0.2}
    first = fit_paths(X, outcome, subsamples=subsamples, **settings)
    others = [
        fit_paths(X.astype(np.float32), outcome, subsamples=subsamples, **settings),
        fit_paths(np.asfortranarray(X), outcome, subsamples=subsamples, **settings),
        fit_paths(X, outcome, subsamples=subsamples, threads=3, **settings),
        fit_paths(X, outcome, subsamples=subsamples[::-1], **settings),
    ]
    for k, other in enumerate(others):
        order = range(5) if k < 3 else range(4, -1, -1)
        for b, c in enumerate(order):
            assert (first.coefficient_values[b] == other.coefficient_values[c]).all()
            assert (first.entry_order[b] == other.entry_order[c]).all()
            assert (first.penalties[b] == other.penalties[c]).all()
    alone = fit_paths(X, outcome, subsamples=subsamples[2:3], **settings)
    assert (alone.coefficient_values[0] == first.coefficient_values[2]).all()


@FAMILY
def test_certificate_of_every_family(family):
    rng, X, eta = cohort(seed=1)
    outcome = outcomes(rng, eta)[family]
    fit = fit_paths(X, outcome, family=family, n_penalties=30, penalty_floor=0.05)
    assert np.nanmax(fit.certificate) <= 1e-6
    assert len(fit.entry_order[0]) > 5
    assert {0, 1} <= set(fit.entry_order[0][:8].tolist())


@FAMILY
def test_a_feature_in_other_units_changes_no_choice(family):
    rng, X, eta = cohort(seed=2)
    outcome = outcomes(rng, eta)[family]
    scaled = X * np.where(np.arange(300) % 3 == 0, 1000.0, 1.0)
    settings = {"family": family, "n_penalties": 12, "penalty_floor": 0.3}
    one = fit_paths(X, outcome, **settings)
    other = fit_paths(scaled, outcome, **settings)
    assert (one.entry_order[0] == other.entry_order[0]).all()
    a, b = one.coef(0, 11)[1], other.coef(0, 11)[1]
    units = np.where(np.arange(300) % 3 == 0, 1000.0, 1.0)
    units = units if a.ndim == 1 else units[:, None]
    np.testing.assert_allclose(a, b * units, rtol=1e-6, atol=1e-9)


@pytest.mark.parametrize("family", ["gaussian", "binomial", "multinomial", "breslow"])
def test_weights_are_repeated_rows(family):
    """Efron's ties are left out: a repeated row makes a tie that a weight does not."""
    rng, X, eta = cohort(n=40, p=30, seed=3)
    kind = "cox" if family == "breslow" else family
    outcome = outcomes(rng, eta)[kind]
    times = rng.integers(1, 4, 40)
    again = np.repeat(np.arange(40), times)
    settings = {"family": kind, "penalties": [0.1], "tol": 1e-9, "ties": "breslow"}
    weighted = fit_paths(X, outcome, weights=times.astype(float), **settings)
    repeated_outcome = (
        tuple(part[again] for part in outcome) if kind == "cox" else outcome[again]
    )
    repeated = fit_paths(X[again], repeated_outcome, **settings)
    np.testing.assert_allclose(
        weighted.coef(0, 0)[1], repeated.coef(0, 0)[1], atol=1e-6
    )


def test_a_class_that_a_subsample_lacks_takes_no_part():
    rng, X, eta = cohort(seed=4)
    labels = outcomes(rng, eta)["multinomial"]
    without = np.flatnonzero(labels != 2)
    settings = {"family": "multinomial", "penalties": [0.05], "tol": 1e-9}
    fit = fit_paths(X, labels, subsamples=[without], **settings)
    intercepts, coefficients = fit.coef(0, 0)
    assert intercepts[2] == -np.inf
    assert not coefficients[:, 2].any()
    alone = fit_paths(X[without], labels[without], **settings)
    np.testing.assert_allclose(coefficients[:, :2], alone.coef(0, 0)[1], atol=1e-7)


def test_what_cannot_be_fitted_is_refused():
    rng, X, eta = cohort(seed=5)
    kinds = outcomes(rng, eta)
    time, event = kinds["cox"]
    censored = np.flatnonzero(event == 0.0)[:5]
    with pytest.raises(FitError) as caught:
        fit_paths(X, (time, event), family="cox", subsamples=[censored])
    assert caught.value.code == "no-event-subsample"
    one = np.flatnonzero(kinds["multinomial"] == 1)[:5]
    with pytest.raises(FitError) as caught:
        fit_paths(X, kinds["multinomial"], family="multinomial", subsamples=[one])
    assert caught.value.code == "one-class-subsample"
    for outcome, code in (
        (time, "outcome-not-survival"),
        ((time, event + 1), "outcome-not-survival"),
        ((-time - 1, event), "outcome-not-survival"),
        ((time[:5], event), "vector-shape"),
    ):
        with pytest.raises(UsageError) as refused:
            fit_paths(X, outcome, family="cox")
        assert refused.value.code == code
    with pytest.raises(UsageError) as refused:
        fit_paths(X, (time, event), family="cox", strata=[1, 2])
    assert refused.value.code == "strata-shape"
    with pytest.raises(UsageError) as refused:
        fit_paths(X, (time, event), family="cox", ties="exact")
    assert refused.value.code == "ties-unknown"


def test_no_variation_in_the_outcome_picks_nothing():
    fit = fit_paths(np.eye(6), np.full(6, 3.0), family="gaussian", n_penalties=4)
    assert fit.largest_penalty[0] == 0.0
    assert fit.entry_order[0].size == 0
    assert fit.coef(0, 3)[0] == pytest.approx(3.0)


# small refits and ridge on everything


def columns(seed=6):
    rng, X, eta = cohort(n=90, p=20, seed=seed)
    Z = standardised(np.ascontiguousarray(X.T), np.arange(90), np.ones(90))[0]
    return rng, Z, outcomes(rng, eta)


def test_refits_against_scikit_learn():
    _rng, Z, kinds = columns()
    panel, penalty, n = np.arange(8), 0.03, 90
    grid = np.array([1.0, penalty])
    fit = fit_panels(Z, [panel], kinds["gaussian"], np.ones(n), grid, family="gaussian")
    ridge = Ridge(alpha=n * penalty).fit(Z[:8].T, kinds["gaussian"])
    np.testing.assert_allclose(fit.coefs[0, 1, 1:], ridge.coef_, atol=1e-9)
    assert fit.coefs[0, 1, 0] == pytest.approx(ridge.intercept_, abs=1e-9)
    labels = kinds["multinomial"]
    fit = fit_panels(Z, [panel], labels, np.ones(n), grid, family="multinomial")
    logistic = LogisticRegression(C=1 / (n * penalty), tol=1e-10, max_iter=5000)
    logistic.fit(Z[:8].T, labels)
    np.testing.assert_allclose(fit.coefs[0, 1, :, 1:], logistic.coef_, atol=1e-6)


@pytest.mark.parametrize("ties", ["efron", "breslow"])
def test_refit_of_cox_is_the_unpenalised_path_without_a_penalty(ties):
    _rng, Z, kinds = columns()
    fit = fit_panels(
        Z, [np.arange(3)], kinds["cox"], np.ones(90), np.array([1e-10]),
        family="cox", ties=ties,
    )  # fmt: skip
    path = fit_paths(
        Z[:3].T, kinds["cox"], family="cox", ties=ties, penalties=[1.0],
        feature_weights=[0, 0, 0], tol=1e-9,
    )  # fmt: skip
    np.testing.assert_allclose(fit.coefs[0, 0, 1:], path.coef(0, 0)[1], atol=1e-6)
    assert fit.coefs[0, 0, 0] == 0.0


@FAMILY
def test_ridge_on_all_features_equals_the_refit_of_all_columns(family):
    """Two ways to one model: n x n dual, and all columns as one panel."""
    _rng, Z, kinds = columns(seed=7)
    n, p = 90, 20
    rows = np.arange(n)
    kernel = kernel_matrix(ArraySource(Z.T), rows, np.ones(n))
    outcome = kinds[family]
    grid = np.array([0.1, 0.02])
    dual = ridge_predictions(
        kernel, outcome, np.ones(n), rows, rows, grid, family=family
    )
    fit = fit_panels(
        Z / np.sqrt(p), [np.arange(p)], outcome, np.ones(n), grid, family=family
    )
    primal = fit.linear_predictors(Z / np.sqrt(p))[0]
    if family == "multinomial":
        dual = dual - dual.mean(axis=1, keepdims=True)
        primal = primal - primal.mean(axis=1, keepdims=True)
    np.testing.assert_allclose(dual, primal, atol=2e-5)
