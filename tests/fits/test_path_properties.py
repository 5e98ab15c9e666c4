"""What must hold whatever the numbers are: scaling, weights, twins, stopping."""

import numpy as np
import pytest

from panelkit.errors import FitError
from panelkit.fits import ArraySource, fit_paths
from panelkit.preparation import DesignView, Recipe


@pytest.mark.parametrize("family", ["gaussian", "binomial"])
def test_weights_stand_for_repeated_rows(family, problem, draw_cohort):
    X, y, _ = draw_cohort(21, 30, 60, family=family)
    times = np.random.default_rng(21).integers(1, 4, 30)
    grid = fit_paths(X, y, family=family, weights=times, n_penalties=6).penalties[0]
    one = fit_paths(X, y, family=family, weights=times, penalties=grid[1:], tol=1e-10)
    many = fit_paths(
        np.repeat(X, times, axis=0),
        np.repeat(y, times),
        family=family,
        penalties=grid[1:],
        tol=1e-10,
    )
    asked = problem(np.repeat(X, times, axis=0), np.repeat(y, times), family)
    for k in range(5):
        assert one.coef(0, k)[1] == pytest.approx(many.coef(0, k)[1], abs=1e-6)
        assert asked.objective(*one.coef(0, k), grid[k + 1]) == pytest.approx(
            asked.objective(*many.coef(0, k), grid[k + 1]), rel=1e-12
        )


def test_size_of_the_weights_does_not_matter(bits, draw_cohort):
    X, y, _ = draw_cohort(22, 30, 60)
    weights = np.random.default_rng(22).uniform(0.5, 2.0, 30)
    one = fit_paths(X, y, weights=weights, n_penalties=10)
    assert bits(fit_paths(X, y, weights=weights * 8.0, n_penalties=10)) == bits(one)


@pytest.mark.parametrize("family", ["gaussian", "binomial"])
def test_scale_and_offset_of_a_feature_leave_predictions(family, draw_cohort):
    X, y, _ = draw_cohort(23, 40, 90, family=family)
    moved = X.copy()
    moved[:, 0] = moved[:, 0] * 1000.0 + 50.0
    moved[:, 1] = -moved[:, 1]
    one = fit_paths(X, y, family=family, n_penalties=8, tol=1e-10)
    other = fit_paths(moved, y, family=family, n_penalties=8, tol=1e-10)
    assert {0, 1} <= set(one.entry_order[0].tolist())
    for k in range(8):
        (a, u), (b, v) = one.coef(0, k), other.coef(0, k)
        assert b + moved @ v == pytest.approx(a + X @ u, abs=1e-6)


def test_feature_weights_equal_rescaled_columns(draw_cohort):
    # weight v on x equals weight 1 on x / v where columns keep their own scale
    X, y, _ = draw_cohort(24, 40, 30)
    v = np.random.default_rng(24).uniform(0.5, 2.0, 30)
    grid = [0.2, 0.1, 0.05]
    one = fit_paths(
        X, y, feature_weights=v, penalties=grid, standardise=False, tol=1e-10
    )
    other = fit_paths(X / v, y, penalties=grid, standardise=False, tol=1e-10)
    for k in range(3):
        assert one.coef(0, k)[1] == pytest.approx(other.coef(0, k)[1] / v, abs=1e-7)


def test_order_of_rows_does_not_matter(draw_cohort):
    X, y, _ = draw_cohort(25, 40, 100)
    order = np.random.default_rng(25).permutation(40)
    one = fit_paths(X, y, n_penalties=10, tol=1e-10)
    other = fit_paths(X[order], y[order], n_penalties=10, tol=1e-10)
    for k in range(10):
        assert other.coef(0, k)[1] == pytest.approx(one.coef(0, k)[1], abs=1e-6)


@pytest.mark.parametrize(
    "n_penalties",
    [
        40,
        pytest.param(
            10,
        ),
    ],
)
def test_order_of_columns_does_not_matter(n_penalties, draw_cohort):
    X, y, _ = draw_cohort(26, 40, 100)
    order = np.random.default_rng(26).permutation(100)
    one = fit_paths(X, y, n_penalties=n_penalties, penalty_floor=0.01, tol=1e-10)
    other = fit_paths(
        X[:, order], y, n_penalties=n_penalties, penalty_floor=0.01, tol=1e-10
    )
    for k in range(n_penalties):
        assert other.coef(0, k)[1] == pytest.approx(one.coef(0, k)[1][order], abs=1e-6)
    assert order[other.entry_order[0]].tolist() == one.entry_order[0].tolist()


@pytest.mark.parametrize(
    "n_penalties",
    [
        40,
        pytest.param(
            10,
        ),
    ],
)
def test_entries_of_one_step_go_by_their_gradient_one_step_before(
    n_penalties, problem, draw_cohort
):
    X, y, _ = draw_cohort(26, 40, 100)
    paths = fit_paths(X, y, n_penalties=n_penalties, penalty_floor=0.01, tol=1e-10)
    Z, _, _, share, _ = problem(X, y).columns()
    order, steps = paths.entry_order[0], paths.entries[0]
    assert (np.diff(steps) == 0).sum() > 5
    for k in np.unique(steps):
        intercept, coef = paths.coef(0, k - 1)
        chance = problem(X, y).expected(intercept + X @ coef)
        gradient = np.abs(Z.T @ (share * (y - chance)))[order[steps == k]]
        assert (np.diff(gradient) <= 1e-9).all()


def test_swapped_classes_turn_every_sign(draw_cohort):
    X, y, _ = draw_cohort(27, 40, 100)
    one = fit_paths(X, y, n_penalties=10, tol=1e-10)
    other = fit_paths(X, 1.0 - y, n_penalties=10, tol=1e-10)
    for k in range(10):
        assert other.coef(0, k)[1] == pytest.approx(-one.coef(0, k)[1], abs=1e-7)
        assert other.coef(0, k)[0] == pytest.approx(-one.coef(0, k)[0], abs=1e-6)


def test_twins_share_what_a_single_column_gets(problem, draw_cohort):
    # the solution is not unique: only the sum and the objective are
    X, y, _ = draw_cohort(28, 40, 50)
    doubled = np.column_stack([X, X[:, 1]])
    grid = fit_paths(X, y, n_penalties=6).penalties[0, 1:]
    one = fit_paths(X, y, penalties=grid, tol=1e-10)
    two = fit_paths(doubled, y, penalties=grid, tol=1e-10)
    assert one.entry_order[0][0] == 1
    for k in range(5):
        single, pair = one.coef(0, k)[1], two.coef(0, k)[1]
        assert pair[1] + pair[50] == pytest.approx(single[1], abs=1e-7)
        assert np.delete(pair, [1, 50]) == pytest.approx(np.delete(single, 1), abs=1e-7)
        assert problem(doubled, y).objective(*two.coef(0, k), grid[k]) == pytest.approx(
            problem(X, y).objective(*one.coef(0, k), grid[k]), rel=1e-12
        )


def test_constant_columns_stay_out_and_disturb_nothing(bits, draw_cohort):
    X, y, halves = draw_cohort(29, 40, 60, 3)
    wide = np.column_stack([X, np.full(40, 3.7), np.zeros(40), np.full(40, 1e6)])
    paths = fit_paths(wide, y, subsamples=halves, n_penalties=12)
    plain = fit_paths(X, y, subsamples=halves, n_penalties=12)
    assert not paths.ever_selected[:, 60:].any()
    for b in range(3):
        for k in range(12):
            assert paths.coef(b, k)[1][:60].tobytes() == plain.coef(b, k)[1].tobytes()


def test_column_constant_in_one_subsample_only(problem, draw_cohort):
    X, y, _ = draw_cohort(30, 40, 20)
    X[:20, 0] = 2.0
    y[:20] = np.arange(20) % 2
    halves = [np.arange(20), np.arange(10, 40)]
    paths = fit_paths(X, y, subsamples=halves, n_penalties=12, penalty_floor=0.05)
    assert not paths.ever_selected[0, 0]
    for b, rows in enumerate(halves):
        for k in range(12):
            found = paths.coef(b, k)
            penalty = paths.penalties[b, k]
            assert problem(X[rows], y[rows]).violation(*found, penalty) <= 1.1e-6


def test_nearly_constant_column_around_a_large_mean(problem, draw_cohort):
    X, y, _ = draw_cohort(31, 40, 20)
    X[:, 0] = 1000.0 + 1e-3 * (X[:, 0] - X[:, 0].mean())
    paths = fit_paths(X, y, n_penalties=12, penalty_floor=0.05)
    assert 0 in paths.entry_order[0]
    for k in range(12):
        found = paths.coef(0, k)
        assert problem(X, y).violation(*found, paths.penalties[0, k]) <= 1e-5


@pytest.mark.parametrize("max_markers", [1, 3, 7])
def test_path_stops_at_max_markers(max_markers, draw_cohort):
    X, y, halves = draw_cohort(32, 60, 300, 5)
    full = fit_paths(X, y, subsamples=halves, n_penalties=60)
    short = fit_paths(X, y, subsamples=halves, n_penalties=60, max_markers=max_markers)
    for b in range(5):
        assert len(short.entry_order[b]) == max_markers
        assert (
            short.entry_order[b].tolist() == full.entry_order[b][:max_markers].tolist()
        )
        assert short.entries[b].tolist() == full.entries[b][:max_markers].tolist()
        last = short.entries[b][-1]
        assert not np.isnan(short.penalties[b, : last + 1]).any()
        assert np.isnan(short.penalties[b, last + 1 :]).all()
        for k in range(last + 1):
            assert short.coef(b, k)[1].tobytes() == full.coef(b, k)[1].tobytes()
        after = short.coef(b, last + 1)
        assert np.isnan(after[0])
        assert np.isnan(after[1]).all()


def test_last_step_is_trimmed_by_gradient_then_column():
    # orthonormal columns enter at |z|: 1.5 for three of them, in one step; the
    # step before tells them apart by nothing, so the column order decides
    H = np.array([[1.0]])
    for _ in range(3):
        H = np.block([[H, H], [H, -H]])
    X = H[:, 1:]
    y = X[:, [5, 2, 4]].sum(axis=1) * 1.5 + X[:, 6] * 1.6
    paths = fit_paths(
        X, y, family="gaussian", penalties=[2.0, 1.0], max_markers=3, standardise=False
    )
    assert paths.entry_order[0].tolist() == [6, 2, 4]
    assert paths.entries[0].tolist() == [1, 1, 1]


def test_order_of_entry_is_the_order_of_first_non_zero_steps(draw_cohort):
    X, y, halves = draw_cohort(33, 60, 200, 3)
    paths = fit_paths(X, y, subsamples=halves, n_penalties=40)
    for b in range(3):
        seen = {}
        for k in range(40):
            for j in np.flatnonzero(paths.coef(b, k)[1]):
                seen.setdefault(int(j), k)
        assert dict(
            zip(paths.entry_order[b].tolist(), paths.entries[b].tolist(), strict=True)
        ) == (seen)
        assert (np.diff(paths.entries[b]) >= 0).all()
        assert paths.ever_selected[b].sum() == len(seen)


def test_frame_has_a_row_a_pick(draw_cohort):
    X, y, halves = draw_cohort(34, 40, 50, 2)
    paths = fit_paths(X, y, subsamples=halves, n_penalties=20, max_markers=4)
    table = paths.to_frame()
    assert table["feature"].tolist() == np.concatenate(paths.entry_order).tolist()
    assert table["position"].tolist() == [0, 1, 2, 3, 0, 1, 2, 3]
    assert (
        table["penalty"].tolist()
        == paths.penalties[table["subsample"], table["step"]].tolist()
    )


def test_constant_gaussian_outcome_gives_the_mean_and_nothing_else(draw_cohort):
    X, _, _ = draw_cohort(35, 20, 10)
    paths = fit_paths(X, np.full(20, 2.5), family="gaussian", n_penalties=5)
    assert paths.largest_penalty[0] == 0.0
    assert paths.coef(0, 4)[0] == 2.5
    assert not paths.ever_selected.any()


def test_one_class_subsample_is_refused_by_number(draw_cohort):
    X, y, _ = draw_cohort(36, 20, 10)
    with pytest.raises(FitError) as caught:
        fit_paths(X, y, subsamples=[np.arange(20), np.flatnonzero(y == 1.0)])
    assert caught.value.code == "one-class-subsample"
    assert caught.value.exit_code == 4
    assert caught.value.where == "subsamples 1"


def test_nothing_unconverged_passes_silently(draw_cohort):
    X, y, _ = draw_cohort(37, 40, 30)
    with pytest.raises(FitError) as caught:
        fit_paths(X, y, tol=1e-300)
    assert caught.value.code == "not-converged"


@pytest.mark.parametrize("kind", [np.float32, np.float64])
@pytest.mark.parametrize("copy_limit", [0, 2**40])
def test_missing_cells_equal_the_filled_matrix(
    kind, copy_limit, bits, draw_cohort, monkeypatch
):
    monkeypatch.setattr("panelkit.fits.product.COPY_LIMIT", copy_limit)
    X, y, halves = draw_cohort(38, 50, 300, 4)
    base = np.ascontiguousarray(X.T).astype(kind)
    base[np.random.default_rng(38).random(base.shape) < 0.1] = np.nan
    recipe = Recipe(("filter", "median-fill"))
    rows = np.arange(5, 50)
    state = recipe.learn(base, rows, np.full(300, "", object))
    halves = [half[half >= 5] for half in halves]
    view = DesignView(base, state)
    filled = recipe.apply(state, base, np.arange(50)).T
    assert np.isnan(base).mean() > 0.05
    one = fit_paths(view, y, subsamples=halves, n_penalties=15)
    two = fit_paths(filled, y, subsamples=halves, n_penalties=15)
    assert bits(one) == bits(two)


def test_features_left_out_by_a_view_equal_missing_columns(draw_cohort):
    X, y, halves = draw_cohort(39, 50, 120, 3)
    source = ArraySource(X)
    source.included[:3] = False  # the signals themselves
    one = fit_paths(source, y, subsamples=halves, n_penalties=15)
    two = fit_paths(X[:, 3:], y, subsamples=halves, n_penalties=15)
    assert not one.ever_selected[:, :3].any()
    for b in range(3):
        assert (one.entry_order[b] - 3).tolist() == two.entry_order[b].tolist()
        for k in range(15):
            assert one.coef(b, k)[1][3:].tobytes() == two.coef(b, k)[1].tobytes()


def test_column_of_an_array_is_float64_of_the_stored_values(draw_cohort):
    X, _, _ = draw_cohort(40, 12, 4)
    source = ArraySource(X.astype(np.float32))
    column = source.column(2, np.array([5, 1]))
    assert column.dtype == np.float64
    assert column.tolist() == X.astype(np.float32)[[5, 1], 2].tolist()
