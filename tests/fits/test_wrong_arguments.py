"""Arguments that cannot be meant: one clear error each, with its code."""

import numpy as np
import pytest

from panelkit.errors import UsageError
from panelkit.fits import fit_paths

N, P = 20, 6


@pytest.fixture
def arguments():
    draws = np.random.default_rng(0)
    return {"X": draws.normal(size=(N, P)), "outcome": np.arange(N) % 2}


REFUSED = [
    ("vector-shape", {"outcome": np.zeros(N - 1)}),
    ("vector-shape", {"outcome": np.full(N, np.nan)}),
    ("vector-shape", {"outcome": np.zeros((N, 1))}),
    ("outcome-not-binary", {"outcome": np.arange(N) % 3}),
    ("family-not-supported", {"family": "poisson"}),
    ("matrix-not-numeric", {"X": [["a", "b"]] * N}),
    ("matrix-not-numeric", {"X": object()}),
    ("matrix-shape", {"X": np.zeros(N)}),
    ("matrix-shape", {"X": np.zeros((N, 0))}),
    ("matrix-shape", {"X": np.zeros((N, 2, 2))}),
    ("matrix-not-finite", {"X": np.where(np.eye(N, P) == 1, np.nan, 1.0)}),
    ("matrix-not-finite", {"X": np.where(np.eye(N, P) == 1, np.inf, 1.0)}),
    ("weights-not-positive", {"weights": np.zeros(N)}),
    ("weights-not-positive", {"weights": np.full(N, -1.0)}),
    ("vector-shape", {"weights": np.ones(3)}),
    ("vector-shape", {"weights": np.full(N, np.nan)}),
    ("feature-weights", {"feature_weights": np.ones(P + 1)}),
    ("feature-weights", {"feature_weights": np.full(P, -0.1)}),
    ("feature-weights", {"feature_weights": np.full(P, np.nan)}),
    ("mixing-out-of-range", {"mixing": 0.0}),
    ("mixing-out-of-range", {"mixing": 1.01}),
    ("mixing-out-of-range", {"mixing": float("nan")}),
    ("subsample-rows", {"subsamples": [[0, 0, 1]]}),
    ("subsample-rows", {"subsamples": [[0, N]]}),
    ("subsample-rows", {"subsamples": [[-1, 2]]}),
    ("subsample-rows", {"subsamples": [[0]]}),
    ("subsample-rows", {"subsamples": [[]]}),
    ("subsample-rows", {"subsamples": [[0.0, 1.0]]}),
    ("subsample-rows", {"subsamples": [np.arange(N) > 3]}),
    ("subsample-rows", {"subsamples": [0, 1, 2]}),
    ("no-subsamples", {"subsamples": []}),
    ("penalties-not-descending", {"penalties": [0.1, 0.2]}),
    ("penalties-not-descending", {"penalties": [0.1, 0.1]}),
    ("penalties-not-descending", {"penalties": [0.1, 0.0]}),
    ("penalties-not-descending", {"penalties": []}),
    ("penalties-not-descending", {"penalties": [np.nan, 0.1]}),
    ("penalty-grid", {"n_penalties": 1}),
    ("penalty-grid", {"penalty_floor": 1.0}),
    ("penalty-grid", {"penalty_floor": 0.0}),
]


@pytest.mark.parametrize(("code", "change"), REFUSED)
def test_refused_with_its_code(code, change, arguments):
    with pytest.raises(UsageError) as caught:
        fit_paths(**{**arguments, **change})
    assert caught.value.code == code
    assert caught.value.exit_code == 2
    parts = caught.value.as_dict()
    assert all(parts.values())


# What comes back today instead of a UsageError
NOT_YET = [
    ({"outcome": ["a"] * N}, "a bare ValueError"),
    ({"weights": ["a"] * N}, "a bare ValueError"),
    ({"feature_weights": ["a"] * P}, "a bare ValueError"),
    ({"penalties": ["a"]}, "a bare ValueError"),
    ({"penalties": [[0.2, 0.1]]}, "an IndexError behind the fit"),
    ({"penalties": [np.inf, 0.1]}, "a RuntimeWarning from inf - inf"),
    ({"family": ["binomial"]}, "a TypeError: unhashable list"),
    ({"mixing": "a"}, "a bare TypeError"),
    ({"subsamples": 5}, "a bare TypeError"),
    ({"threads": 0}, "a bare ValueError of the thread pool"),
    ({"max_markers": -1}, "an order of entry made of zeros, no error"),
    ({"max_markers": 0}, "a path that stops at once, no error"),
    ({"max_markers": 2.5}, "a bare TypeError"),
    ({"n_penalties": 2.5}, "a bare TypeError"),
    ({"tol": 0.0}, "a FitError after 200 steps"),
    ({"tol": float("nan")}, "a FitError after 200 steps"),
    ({"tol": 5.0}, "solutions whose certificate is 5, no error"),
]


@pytest.mark.parametrize(
    "change",
    [pytest.param(change) for change, instead in NOT_YET],
)
def test_refused_as_a_call_that_cannot_be_meant(change, arguments):
    with pytest.raises(UsageError):
        fit_paths(**{**arguments, **change})


def test_cell_that_is_not_finite_is_named(arguments):
    arguments["X"][7, 4] = np.nan
    with pytest.raises(UsageError) as caught:
        fit_paths(**arguments)
    assert caught.value.where == "X, row 7, column 4"


@pytest.mark.parametrize("kind", [np.int64, np.int8, np.uint16, bool, np.float16])
def test_other_numbers_become_float64(kind, bits):
    X = np.random.default_rng(1).integers(0, 2, (N, P)).astype(kind)
    y = np.arange(N) % 2
    assert bits(fit_paths(X, y)) == bits(fit_paths(X.astype(float), y))


def test_indices_of_any_integer_type_serve(arguments, bits):
    rows = np.arange(3, N)
    expected = bits(fit_paths(**arguments, subsamples=[rows]))
    for kind in (np.uint8, np.int32, np.uint64):
        assert bits(fit_paths(**arguments, subsamples=[rows.astype(kind)])) == expected
    assert bits(fit_paths(**arguments, subsamples=[rows.tolist()])) == expected
