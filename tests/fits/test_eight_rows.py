"""Published forms and printed solutions on eight rows (tests/reference/eight_rows.md).

The rows can fail a wrong engine: columns have unequal scales and means, one column
stays out, one enters late, and the tied outcomes leave no symmetry to hide behind.
"""

import csv
from pathlib import Path

import numpy as np
import pytest

from panelkit.fits import fit_paths

TABLE = Path(__file__).parents[1] / "reference" / "eight_rows.csv"
with TABLE.open(newline="") as file:
    CASES = {row["case"]: row for row in csv.DictReader(file)}


def numbers(row, *names):
    return np.array([float(row[name]) for name in names])


@pytest.mark.parametrize("case", CASES)
def test_solution_to_ten_decimals(case, eight, problem):
    row = CASES[case]
    weights = numbers(row, "weight_1", "weight_2", "weight_3", "weight_4")
    standardise = row["standardised"] == "1"
    y = getattr(eight, row["family"])
    penalty = float(row["penalty"])
    paths = fit_paths(
        eight.X,
        y,
        family=row["family"],
        penalties=[penalty],
        feature_weights=weights,
        standardise=standardise,
        tol=1e-12,
    )
    intercept, coef = paths.coef(0, 0)
    assert intercept == pytest.approx(float(row["intercept"]), abs=1e-9)
    assert coef == pytest.approx(numbers(row, "b1", "b2", "b3", "b4"), abs=1e-9)
    if row["objective"]:
        asked = problem(eight.X, y, row["family"], standardise=standardise)
        assert asked.objective(intercept, coef, penalty) == pytest.approx(
            float(row["objective"]), abs=1e-9
        )


# Largest penalties: largest |x'(y - mean)| / n, over the feature weight; exact
# arithmetic except where the deviation is irrational (scikit-learn 1.9.1)
LARGEST = [
    ("gaussian", False, (3.5, 2.15625, 1.875, 1.125)),
    ("gaussian", True, (7 / 3, 1.3680139854, 1.25, 0.75)),
    ("binomial", False, (0.5, 0.0625, 0.125, 0.125)),
    ("binomial", True, (1 / 3, None, None, None)),
]


@pytest.mark.parametrize(("family", "standardise", "expected"), LARGEST)
def test_largest_penalty_of_all_and_of_each_feature(
    family, standardise, expected, eight
):
    for only, value in enumerate((*expected, max(v for v in expected if v))):
        if value is None:
            continue
        weights = np.full(4, np.inf)
        weights[slice(None) if only == 4 else only] = 1.0
        paths = fit_paths(
            eight.X,
            getattr(eight, family),
            family=family,
            standardise=standardise,
            feature_weights=weights,
        )
        assert paths.largest_penalty[0] == pytest.approx(value, abs=1e-10)


def test_largest_penalty_is_taken_behind_the_unpenalised_feature(eight):
    # exact: 143/48, 61/48 and 13/6, left by the regression on the third column
    for only, value in ((0, 2.9791666667), (1, 1.2708333333), (3, 2.1666666667)):
        weights = np.array([np.inf, np.inf, 0.0, np.inf])
        weights[only] = 1.0
        paths = fit_paths(
            eight.X,
            eight.gaussian,
            family="gaussian",
            standardise=False,
            feature_weights=weights,
        )
        assert paths.largest_penalty[0] == pytest.approx(value, abs=1e-9)


def test_nothing_is_picked_at_the_largest_penalty_and_something_just_below(eight):
    paths = fit_paths(
        eight.X,
        eight.gaussian,
        family="gaussian",
        standardise=False,
        penalties=[4.0, 3.5, 3.5 * (1 - 1e-9)],
        tol=1e-12,
    )
    assert np.count_nonzero(paths.coef(0, 0)[1]) == 0
    assert np.count_nonzero(paths.coef(0, 1)[1]) == 0
    assert paths.coef(0, 1)[0] == eight.gaussian.mean()
    assert np.flatnonzero(paths.coef(0, 2)[1]).tolist() == [0]


def test_order_of_entry_along_the_exact_path(eight):
    # knots 7/2, 5/4, 109/216, 0.1178907195 and order x1, x3, x4, x2: exact rational
    # arithmetic, equal to scikit-learn 1.9.1 lars_path
    grid = np.array([3.4, 1.3, 1.2, 0.51, 0.5, 0.12, 0.11])
    paths = fit_paths(
        eight.X,
        eight.gaussian,
        family="gaussian",
        standardise=False,
        penalties=grid,
    )
    assert paths.entry_order[0].tolist() == [0, 2, 3, 1]
    assert paths.entries[0].tolist() == [0, 2, 4, 6]


@pytest.mark.parametrize(
    ("penalty", "expected", "intercept"),
    [
        # budget form of the lasso (Tibshirani 1996), exact rational arithmetic:
        # |b| sums to 0.5, 1, 1.25, 2 at these penalties
        (2.375, (0.5, 0, 0, 0), 1.5),
        (1.25, (1, 0, 0, 0), 1.25),
        (0.890625, (1.125, 0, 0.125, 0), 1.125),
        (0.2762195122, (1.1934959350, 0, 0.5317073171, 0.2747967480), 0.75),
    ],
)
def test_solutions_at_round_budgets(penalty, expected, intercept, eight):
    paths = fit_paths(
        eight.X,
        eight.gaussian,
        family="gaussian",
        standardise=False,
        penalties=[penalty],
        tol=1e-12,
    )
    found = paths.coef(0, 0)
    assert found[0] == pytest.approx(intercept, abs=1e-9)
    assert found[1] == pytest.approx(np.array(expected), abs=1e-9)


def test_orthonormal_columns_are_soft_thresholded():
    # Tibshirani 1996, section 2.2; z = (1.5, 0, 0.5), exact arithmetic
    X = np.array([[1, 1, 1], [-1, 1, -1], [1, -1, -1], [-1, -1, 1]], float)
    y = np.array([3.0, -1.0, 2.0, 0.0])
    paths = fit_paths(X, y, family="gaussian", penalties=[0.5, 0.25], tol=1e-12)
    assert paths.coef(0, 0)[0] == pytest.approx(1.0)
    assert paths.coef(0, 0)[1] == pytest.approx(np.array([1.0, 0.0, 0.0]), abs=1e-10)
    assert paths.coef(0, 1)[1] == pytest.approx(np.array([1.25, 0.0, 0.25]), abs=1e-10)


@pytest.mark.parametrize("n_penalties", [2, 7])
def test_relative_grid_runs_from_the_largest_penalty_to_the_floor(eight, n_penalties):
    paths = fit_paths(
        eight.X,
        eight.gaussian,
        family="gaussian",
        n_penalties=n_penalties,
        penalty_floor=0.05,
    )
    expected = 7 / 3 * np.logspace(0, np.log10(0.05), n_penalties)
    assert paths.penalties[0] == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("penalties", [None, [5.0, 3.0]])
def test_unpenalised_feature_stays_in_at_and_above_the_largest_penalty(
    penalties, eight
):
    # least squares on the third column alone: slope 1.875 / 2.25, exact arithmetic
    paths = fit_paths(
        eight.X,
        eight.gaussian,
        family="gaussian",
        standardise=False,
        feature_weights=[1, 1, 0, 1],
        penalties=penalties,
    )
    intercept, coef = paths.coef(0, 0)
    assert coef == pytest.approx(np.array([0, 0, 5 / 6, 0]), abs=1e-8)
    assert intercept == pytest.approx(1.75 - 0.5 * 5 / 6, abs=1e-8)


def test_unpenalised_features_are_not_counted_as_picked(eight):
    paths = fit_paths(
        eight.X, eight.gaussian, family="gaussian", feature_weights=[1, 1, 0, 1]
    )
    assert sorted(paths.entry_order[0].tolist()) == [0, 1, 3]
    assert paths.ever_selected[0].tolist() == [True, True, False, True]
    assert (paths.coef(0, 1)[1] != 0.0).tolist() == [True, False, True, False]


def test_excluded_feature_equals_a_missing_column(eight):
    # the excluded first column is the strongest, so a leak would show at once
    kept = fit_paths(
        eight.X[:, 1:], eight.binomial, penalties=[0.1, 0.02], standardise=False
    )
    paths = fit_paths(
        eight.X,
        eight.binomial,
        penalties=[0.1, 0.02],
        standardise=False,
        feature_weights=[np.inf, 1, 1, 1],
    )
    for k in range(2):
        assert paths.coef(0, k)[0] == kept.coef(0, k)[0]
        assert paths.coef(0, k)[1].tolist() == [0.0, *kept.coef(0, k)[1]]
