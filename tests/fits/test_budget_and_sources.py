"""The L1 budget, matrices on disk, and views with low-rank corrections."""

import mmap

import numpy as np
import pytest

from panelkit.errors import UsageError
from panelkit.fits import (
    ArraySource,
    fit_budget,
    fit_paths,
    open_feature_major,
    rank_univariate,
    write_feature_major,
)
from panelkit.preparation import DesignView
from panelkit.records import RecipeState


@pytest.mark.parametrize(
    ("budget", "coefficients", "penalty", "intercept"),
    [
        # scikit-learn LARS on the eight rows; exact fractions at 0.5, 1 and 1.25
        (0.5, [0.5, 0, 0, 0], 2.375, 1.5),
        (1.0, [1, 0, 0, 0], 1.25, 1.25),
        (1.25, [1.125, 0, 0.125, 0], 0.890625, 1.125),
        (2.0, [1.1934959350, 0, 0.5317073171, 0.2747967480], 0.2762195122, 0.75),
        (
            2.5,
            [1.1488366367, 0.0462883171, 0.7850547827, 0.5198202634],
            0.0895605072,
            0.5057860396,
        ),
        # least squares from 3.0255603506 on
        (
            4.0,
            [1.1517651756, 0.1926199122, 0.9889355716, 0.6922396913],
            0.0,
            0.2612973137,
        ),
        (0.0, [0, 0, 0, 0], 3.5, 1.75),
    ],
)
def test_budget_of_a_gaussian_path(eight, budget, coefficients, penalty, intercept):
    fit = fit_budget(
        eight.X, eight.gaussian, budget, family="gaussian", standardise=False
    )
    np.testing.assert_allclose(fit.coefficients, coefficients, atol=1e-8)
    assert fit.penalty == pytest.approx(penalty, abs=1e-7)
    assert fit.intercept == pytest.approx(intercept, abs=1e-8)
    assert fit.norm <= budget * (1 + 1e-8) + 1e-12 or penalty == 0.0


def test_budget_of_a_binomial_path(eight):
    # scikit-learn saga: the L1 norm at penalty 0.1
    fit = fit_budget(eight.X, eight.binomial, 1.9889652865, standardise=False)
    assert fit.penalty == pytest.approx(0.1, abs=1e-8)
    np.testing.assert_allclose(
        fit.coefficients,
        [1.3720671212, 0.4335759392, -0.1833222261, 0],
        atol=1e-7,
    )


def test_budget_is_well_posed_for_separable_data():
    """Without a penalty there is no finite solution; with a budget there is one."""
    x = np.linspace(-1.0, 1.0, 20)
    y = (x > 0).astype(float)
    fit = fit_budget(x[:, None], y, 7.0, standardise=False)
    assert fit.norm == pytest.approx(7.0, rel=1e-8)
    assert fit.penalty > 0.0


@pytest.mark.parametrize("budget", [-1.0, np.nan, np.inf, "much"])
def test_wrong_budgets(eight, budget):
    with pytest.raises(UsageError) as caught:
        fit_budget(eight.X, eight.gaussian, budget, family="gaussian")
    assert caught.value.code == "budget-out-of-range"


def wide(n=40, p=700, seed=0):
    rng = np.random.default_rng(seed)
    X = rng.standard_normal((n, p))
    y = (X[:, 3] + rng.standard_normal(n) > 0).astype(float)
    return rng, X, y


def same(a, b):
    for x, z in zip(a.coefficient_values, b.coefficient_values, strict=True):
        assert (x == z).all()
    assert np.array_equal(a.penalties, b.penalties, equal_nan=True)
    assert np.array_equal(a.certificate, b.certificate, equal_nan=True)


@pytest.mark.parametrize("kind", [np.float32, np.float64])
def test_a_matrix_on_disk_gives_the_same_bits(tmp_path, kind):
    _rng, X, y = wide()
    X = X.astype(kind)
    path = write_feature_major(X, tmp_path / "matrix.npy")
    source = open_feature_major(path)
    owner = source.base
    while isinstance(owner, np.ndarray) and not isinstance(owner, np.memmap):
        owner = owner.base
    assert isinstance(owner, np.memmap | mmap.mmap)  # not loaded
    assert source.base.dtype == kind
    same(fit_paths(source, y, n_penalties=20), fit_paths(X, y, n_penalties=20))


def test_a_memory_map_by_samples_is_read(tmp_path):
    _rng, X, y = wide()
    path = tmp_path / "by_samples.npy"
    np.save(path, X)
    mapped = np.load(path, mmap_mode="r")
    same(fit_paths(mapped, y, n_penalties=10), fit_paths(X, y, n_penalties=10))


def test_whole_numbers_become_floats_on_disk(tmp_path):
    counts = np.arange(12).reshape(3, 4)
    path = write_feature_major(counts, tmp_path / "counts.npy")
    assert open_feature_major(path).base.tolist() == counts.T.tolist()


def test_wrong_files_are_refused(tmp_path):
    (tmp_path / "junk.npy").write_bytes(b"no matrix at all")
    with pytest.raises(UsageError) as caught:
        open_feature_major(tmp_path / "junk.npy")
    assert caught.value.code == "file-unreadable"
    with pytest.raises(UsageError):
        write_feature_major(np.arange(3), tmp_path / "flat.npy")
    holes = np.ones((3, 2))
    holes[1, 1] = np.nan
    path = write_feature_major(holes, tmp_path / "holes.npy")
    with pytest.raises(UsageError) as caught:
        open_feature_major(path)
    assert caught.value.code == "matrix-not-finite"


@pytest.fixture
def corrected():
    """A view with missing cells, features left out and a shift of rank three."""
    rng, X, y = wide(seed=1)
    base = np.ascontiguousarray(X.T)
    base[rng.random(base.shape) < 0.06] = np.nan
    included = rng.random(len(base)) > 0.1
    state = RecipeState(
        fill=rng.standard_normal(len(base)),
        included=included,
        reasons=np.where(included, "", "left out").astype(object),
    )
    left = rng.standard_normal((len(base), 3))
    right = rng.standard_normal((3, base.shape[1]))
    return DesignView(base, state, (left, right)), y, rng


@pytest.mark.parametrize("limit", [0, 2**40])
@pytest.mark.parametrize("tile", [64, 2048])
def test_a_corrected_view_equals_the_matrix_it_stands_for(
    corrected, limit, tile, monkeypatch
):
    """A shift that is added to filled cells, or left out of the filter, shows here."""
    monkeypatch.setattr("panelkit.fits.product.COPY_LIMIT", limit)
    monkeypatch.setattr("panelkit.fits.product.TILE", tile)
    view, y, rng = corrected
    n_features, n_samples = view.base.shape
    matrix = view.columns(np.arange(n_features), np.arange(n_samples)).T
    barred = np.where(view.included, 1.0, np.inf)
    subsamples = [np.sort(rng.permutation(n_samples)[:22]) for _ in range(4)]
    settings = {"subsamples": subsamples, "n_penalties": 15}
    same(
        fit_paths(view, y, **settings),
        fit_paths(matrix, y, feature_weights=barred, **settings),
    )
    weights = np.ones(n_samples)
    rows, subjects = np.arange(n_samples), np.arange(n_samples)
    by_view = rank_univariate(view, y, rows, subjects, weights).t
    by_matrix = rank_univariate(ArraySource(matrix), y, rows, subjects, weights).t
    assert (by_view[view.included] == by_matrix[view.included]).all()


def test_one_column_of_a_view_is_its_part_of_the_matrix(corrected):
    view, _y, _rng = corrected
    rows = np.array([5, 1, 7])
    gaps = np.isnan(view.base)
    matrix = view.columns(np.arange(len(view.base)), rows)
    for feature in (0, 9, 699):
        assert (view.column(feature, rows) == matrix[feature]).all()
    feature, sample = np.argwhere(gaps)[0]
    filled = view.column(int(feature), np.array([sample]))[0]
    assert filled == view.fill[feature]
