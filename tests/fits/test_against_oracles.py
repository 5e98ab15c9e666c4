"""The engine against a slow reference solver, scikit-learn and its own certificate."""

import inspect

import numpy as np
import pytest
from sklearn.linear_model import Lasso, LogisticRegression

from panelkit.fits import fit_paths

SHAPES = [
    # n, p: more rows than columns, more columns than rows
    (40, 8),
    (30, 70),
]


@pytest.mark.parametrize("seed", [0, 1])
@pytest.mark.parametrize(("n", "p"), SHAPES)
@pytest.mark.parametrize("family", ["gaussian", "binomial"])
@pytest.mark.parametrize(
    ("mixing", "weighted", "penalised", "standardise"),
    [
        (1.0, False, False, True),
        (1.0, True, False, True),
        (0.4, True, True, True),
        (0.7, False, True, False),
    ],
)
def test_solutions_equal_the_reference_solver(
    seed, n, p, family, mixing, weighted, penalised, standardise, problem, draw_cohort
):
    # proximal gradient steps in NumPy share nothing with prox-Newton descent
    X, y, _ = draw_cohort(seed, n, p, family=family)
    draws = np.random.default_rng([seed, n, p])
    weights = draws.uniform(0.2, 3.0, n) if weighted else None
    feature_weights = draws.uniform(0.5, 2.0, p) if penalised else None
    if penalised:
        feature_weights[[1, 4]] = 0.0, np.inf
    asked = problem(X, y, family, weights, feature_weights, mixing, standardise)
    options = {
        "family": family,
        "mixing": mixing,
        "weights": weights,
        "feature_weights": feature_weights,
        "standardise": standardise,
    }
    largest = fit_paths(X, y, **options).largest_penalty[0]
    grid = largest * np.array([0.7, 0.3, 0.1])
    paths = fit_paths(X, y, penalties=grid, tol=1e-9, **options)
    for k, penalty in enumerate(grid):
        expected = asked.solve(penalty)
        found = paths.coef(0, k)
        assert asked.objective(*found, penalty) == pytest.approx(
            asked.objective(*expected, penalty), rel=1e-10
        )
        _, _, deviation, _, _ = asked.columns()
        difference = (found[1] - expected[1]) * deviation
        assert np.abs(difference).max() < 1e-5
        assert asked.violation(*found, penalty) < 1e-8


def _l1_logistic(penalty, n):
    """Return scikit-learn's L1 logistic regression, by the name its version uses."""
    default = inspect.signature(LogisticRegression).parameters["penalty"].default
    named = {"l1_ratio": 1.0} if default == "deprecated" else {"penalty": "l1"}
    return LogisticRegression(
        solver="saga", C=1.0 / (n * penalty), tol=1e-9, max_iter=50_000, **named
    )


@pytest.mark.parametrize("penalty", [0.1, 0.03])
def test_objective_is_at_most_that_of_scikit_learn_logistic(
    penalty, problem, draw_cohort
):
    X, y, _ = draw_cohort(3, 50, 12)
    X = (X - X.mean(0)) / X.std(0)
    other = _l1_logistic(penalty, 50)
    other.random_state = 0
    other.fit(X, y)
    asked = problem(X, y)
    best = asked.objective(other.intercept_[0], other.coef_[0], penalty)
    found = fit_paths(X, y, penalties=[penalty], tol=1e-9).coef(0, 0)
    assert asked.objective(*found, penalty) == pytest.approx(best, rel=1e-8)
    assert asked.objective(*found, penalty) <= best * (1.0 + 1e-12)
    assert np.flatnonzero(found[1]).tolist() == np.flatnonzero(other.coef_[0]).tolist()


@pytest.mark.parametrize(("n", "p"), SHAPES)
def test_coefficients_equal_scikit_learn_lasso(n, p, draw_cohort):
    X, y, _ = draw_cohort(4, n, p, family="gaussian")
    paths = fit_paths(
        X, y, family="gaussian", standardise=False, n_penalties=4, penalty_floor=0.1
    )
    for k in range(1, 4):
        lasso = Lasso(paths.penalties[0, k], tol=1e-12, max_iter=100_000).fit(X, y)
        intercept, coef = paths.coef(0, k)
        assert coef == pytest.approx(lasso.coef_, abs=1e-5)
        assert intercept == pytest.approx(lasso.intercept_, abs=1e-4)


@pytest.mark.parametrize("family", ["gaussian", "binomial"])
@pytest.mark.parametrize(
    ("n", "p", "tol"), [(120, 15, 1e-6), (40, 1500, 1e-6), (40, 1500, 1e-9)]
)
def test_certificate_holds_for_every_feature_refit_and_penalty(
    n, p, tol, family, problem, draw_cohort
):
    # recomputed from the definition; a screening rule that loses a feature fails here
    X, y, halves = draw_cohort(5, n, p, 4, family)
    X[:, -1] = 7.0  # never picked, in no refit
    paths = fit_paths(
        X, y, subsamples=halves, family=family, n_penalties=20, tol=tol, mixing=0.9
    )
    assert np.nanmax(paths.certificate) <= tol
    for b, rows in enumerate(halves):
        asked = problem(X[rows], y[rows], family, mixing=0.9)
        for k in range(20):
            violation = asked.violation(*paths.coef(b, k), paths.penalties[b, k])
            assert violation <= tol + 1e-9
            assert violation == pytest.approx(paths.certificate[b, k], abs=1e-9)


def test_certificate_with_feature_and_observation_weights(problem, draw_cohort):
    X, y, halves = draw_cohort(6, 60, 300, 3)
    draws = np.random.default_rng(6)
    weights = draws.uniform(0.5, 2.0, 60)
    feature_weights = draws.choice([0.5, 1.0, 4.0, np.inf], 300)
    paths = fit_paths(
        X,
        y,
        subsamples=halves,
        weights=weights,
        feature_weights=feature_weights,
        n_penalties=15,
        penalty_floor=0.05,
    )
    for b, rows in enumerate(halves):
        asked = problem(X[rows], y[rows], "binomial", weights[rows], feature_weights)
        for k in range(15):
            assert (
                asked.violation(*paths.coef(b, k), paths.penalties[b, k])
                <= 1e-6 / 0.5 + 1e-9  # a violation counts in units of the weight
            )


@pytest.mark.parametrize("family", ["gaussian", "binomial"])
def test_path_goes_on_when_every_feature_is_in(family, problem, draw_cohort):
    X, y, _ = draw_cohort(5, 60, 4, family=family)
    paths = fit_paths(X, y, family=family, n_penalties=10)
    assert not np.isnan(paths.penalties).any()
    for k in range(10):
        found = paths.coef(0, k)
        assert problem(X, y, family).violation(*found, paths.penalties[0, k]) <= 1e-6


def test_a_coarse_grid_finds_what_a_fine_one_finds(problem, draw_cohort):
    # the strong rule discards by the step's length: a wrong discard that the
    # optimality check missed would part the two paths
    X, y, _ = draw_cohort(7, 50, 800)
    largest = fit_paths(X, y).largest_penalty[0]
    fine = largest * np.logspace(-0.02, -1.5, 75)
    coarse = fine[[20, 50, 74]]
    on_fine = fit_paths(X, y, penalties=fine, tol=1e-9)
    on_coarse = fit_paths(X, y, penalties=coarse, tol=1e-9)
    asked = problem(X, y)
    for k, at in enumerate((20, 50, 74)):
        one, other = on_coarse.coef(0, k), on_fine.coef(0, at)
        assert np.flatnonzero(one[1]).tolist() == np.flatnonzero(other[1]).tolist()
        assert one[1] * X.std(0) == pytest.approx(other[1] * X.std(0), abs=1e-6)
        assert asked.objective(*one, coarse[k]) == pytest.approx(
            asked.objective(*other, coarse[k]), rel=1e-10
        )


def test_certificate_along_a_single_giant_step(problem, draw_cohort):
    # one step to 1 % of the largest penalty: the strong rule can promise nothing
    X, y, _ = draw_cohort(8, 30, 500)
    largest = fit_paths(X, y).largest_penalty[0]
    paths = fit_paths(X, y, penalties=[0.01 * largest])
    assert np.count_nonzero(paths.coef(0, 0)[1]) > 5
    assert problem(X, y).violation(*paths.coef(0, 0), 0.01 * largest) <= 1e-6 + 1e-9


@pytest.mark.parametrize(("n", "p"), [(60, 10), (40, 400)])
def test_separable_outcome_is_solved_down_to_the_floor(n, p, problem):
    # no finite unpenalised solution exists; every penalised one does
    draws = np.random.default_rng(9)
    X = draws.normal(size=(n, p))
    y = (X[:, 0] > 0).astype(float)
    paths = fit_paths(X, y)
    assert not np.isnan(paths.penalties).any()
    asked = problem(X, y)
    for k in (1, 50, 99):
        found = paths.coef(0, k)
        assert np.isfinite(found[1]).all()
        assert asked.violation(*found, paths.penalties[0, k]) <= 1e-6 + 1e-9
