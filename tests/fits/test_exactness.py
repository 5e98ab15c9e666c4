"""No bit of a result depends on how the work was done.

The product in float32 proposes and float64 decides, so every way of computing the
product must end in the same bits. Bits are compared over all fields, so that one
changed sum anywhere shows.
"""

import numpy as np
import pytest

from panelkit.fits import engine, fit_paths, product, refits

N, P = 60, 700


@pytest.fixture
def cohort(draw_cohort):
    X, y, halves = draw_cohort(11, N, P, 9)
    X = X.astype(np.float32).astype(np.float64)  # both storages hold the same values
    halves[3] = halves[3][:-5]  # refits of unequal length share the block
    return X, y, halves


@pytest.fixture
def fit(cohort):
    """Return a function that fits the cohort, with some of it replaced."""

    def run(X=None, halves=None, **options):
        return fit_paths(
            cohort[0] if X is None else X,
            cohort[1],
            subsamples=cohort[2] if halves is None else halves,
            **{"n_penalties": 30, "penalty_floor": 0.02, **options},
        )

    return run


def one_refit(paths, b):
    """Return everything a refit has to say, without its place in the block."""
    borders = paths.coefficient_borders[b]
    return (
        paths.penalties[b].tobytes(),
        paths.largest_penalty[b].tobytes(),
        paths.certificate[b].tobytes(),
        paths.intercepts[b].tobytes(),
        paths.entry_order[b].tobytes(),
        paths.entries[b].tobytes(),
        borders.tobytes(),
        paths.coefficient_features[b].tobytes(),
        paths.coefficient_values[b].tobytes(),
    )


@pytest.mark.parametrize(
    "change",
    [
        lambda X: X.astype(np.float32),
        np.asfortranarray,
        lambda X: np.asfortranarray(X.astype(np.float32)),
        lambda X: np.repeat(X, 2, axis=1)[:, ::2],
        lambda X: X.astype(">f8"),
    ],
    ids=["float32", "fortran", "fortran float32", "strided", "byte order"],
)
def test_storage_does_not_matter(change, cohort, fit, bits):
    assert bits(fit(change(cohort[0]))) == bits(fit())


@pytest.mark.parametrize("threads", [2, 4])
def test_threads_do_not_matter(threads, fit, bits, monkeypatch):
    monkeypatch.setattr(product, "TILE", 64)  # more tiles than threads
    monkeypatch.setattr(engine, "CHUNK", 1)
    assert bits(fit(threads=threads)) == bits(fit())


@pytest.mark.parametrize("tile", [1, 37, 700, 10_000])
def test_tile_size_does_not_matter(tile, fit, bits, monkeypatch):
    expected = bits(fit())
    monkeypatch.setattr(product, "TILE", tile)
    assert bits(fit()) == expected


@pytest.mark.parametrize("limit", [0, 2**40])
@pytest.mark.parametrize("kind", [np.float32, np.float64])
def test_copy_for_the_product_does_not_matter(
    limit, kind, cohort, fit, bits, monkeypatch
):
    expected = bits(fit())
    monkeypatch.setattr(product, "COPY_LIMIT", limit)
    assert bits(fit(cohort[0].astype(kind))) == expected


def test_space_made_later_does_not_matter(fit, bits, monkeypatch):
    expected = bits(fit())
    monkeypatch.setattr(refits, "FIRST_WORKING", 1)
    assert bits(fit()) == expected


def test_a_subsample_alone_is_the_subsample_among_many(cohort, fit):
    together = fit()
    for b, rows in enumerate(cohort[2]):
        assert one_refit(fit(halves=[rows]), 0) == one_refit(together, b)


def test_order_of_subsamples_does_not_matter(cohort, fit):
    together = fit(max_markers=6)
    order = np.random.default_rng(0).permutation(len(cohort[2]))
    shuffled = fit(halves=[cohort[2][b] for b in order], max_markers=6)
    for place, b in enumerate(order):
        assert one_refit(shuffled, place) == one_refit(together, b)


def test_same_subsample_twice_gives_the_same_path_twice(cohort, fit):
    paths = fit(halves=[cohort[2][0], cohort[2][1], cohort[2][0]])
    assert one_refit(paths, 0) == one_refit(paths, 2)


LOOSE_START = (
    "at the first step features between the strong rule's limit and the largest "
    "gradient join the working set only if the float32 filter happens to let them "
    "through, and its margin grows with every row that the product reads"
)


def outside_changed(cohort, rows, size):
    X = cohort[0].copy()
    outside = np.setdiff1d(np.arange(N), rows)
    X[outside] = size * np.random.default_rng(2).normal(size=(len(outside), P))
    return X


@pytest.mark.parametrize("size", [0.0, 1e3, 1e9, 1e25])
def test_rows_of_no_subsample_cannot_be_felt(size, cohort, fit, bits):
    rows = np.sort(np.random.default_rng(1).permutation(N)[:40])
    changed = outside_changed(cohort, rows, size)
    assert bits(fit(changed, halves=[rows])) == bits(fit(halves=[rows]))


@pytest.mark.parametrize("size", [1e3, 1e9, 1e18])
def test_rows_of_no_subsample_cannot_be_felt_without_a_copy(
    size, cohort, fit, bits, monkeypatch
):
    monkeypatch.setattr(product, "COPY_LIMIT", 0)
    rows = np.sort(np.random.default_rng(1).permutation(N)[:40])
    changed = outside_changed(cohort, rows, size)
    assert bits(fit(changed, halves=[rows])) == bits(fit(halves=[rows]))


def test_rows_of_another_subsample_cannot_be_felt(cohort, fit):
    # the same refit, beside one that reads samples a thousand times larger
    rows = np.sort(np.random.default_rng(1).permutation(N)[:40])
    changed = outside_changed(cohort, rows, 1e3)
    beside = fit(changed, halves=[rows, np.arange(N)])
    assert one_refit(beside, 0) == one_refit(fit(halves=[rows]), 0)


@pytest.mark.filterwarnings("ignore::RuntimeWarning")  # float32 overflows: see reason
def test_huge_rows_outside_the_subsample_cannot_be_felt(cohort, fit, bits, monkeypatch):
    monkeypatch.setattr(product, "COPY_LIMIT", 0)
    rows = np.arange(5, 55)
    changed = cohort[0].copy()
    changed[55:] = 1e20
    assert bits(fit(changed, halves=[rows])) == bits(fit(halves=[rows]))


def test_the_matrix_is_never_written_to(cohort, fit):
    X = cohort[0].astype(np.float32)
    before = X.tobytes()
    X.flags.writeable = False
    fit(X)
    assert X.tobytes() == before


def test_results_are_read_only(fit):
    paths = fit(n_penalties=3)
    with pytest.raises(ValueError, match="read-only"):
        paths.penalties[0, 0] = 0.0
    with pytest.raises(ValueError, match="read-only"):
        paths.coefficient_values[0][:] = 0.0


def test_column_that_float32_cannot_tell_apart_is_still_picked(cohort, fit):
    first = fit().entry_order[0][0]
    moved = cohort[0].copy()
    moved[:, first] += 2.0**33
    assert np.ptp(moved[:, first]) > 0.0
    assert np.ptp(moved[:, first].astype(np.float32)) == 0.0
    assert fit(moved).entry_order[0][0] == first


def test_largest_penalty_survives_flattering_rounding():
    # around 2^24 float32 holds even numbers only: rounding turns a middling column
    # into the outcome itself, and the truly best column stays below the false top
    draws = np.random.default_rng(0)
    y = np.repeat([0.0, 1.0], 20)
    middling = np.where(y == 0.0, 0.999, 1.001 + 1.99 * (np.arange(40) % 2))
    X = np.column_stack([middling, y + 0.3 * draws.normal(size=40)])
    there = X + np.array([2.0**24, 0.0])
    assert np.corrcoef(there[:, 0].astype(np.float32), y)[0, 1] > 0.9999
    found = fit_paths(there, y).largest_penalty[0]
    assert found == pytest.approx(fit_paths(X, y).largest_penalty[0], rel=1e-6)


@pytest.mark.filterwarnings("ignore::RuntimeWarning")  # float32 overflows: see reason
@pytest.mark.parametrize(
    "factor",
    [
        2.0**-30,
        2.0**30,
        pytest.param(
            2.0**-44,
        ),
        pytest.param(
            2.0**66,
        ),
    ],
)
def test_scaling_a_column_by_a_power_of_two_changes_no_bit(factor, cohort, fit):
    # such a scaling is exact, so standardised columns have the same bits
    expected = fit()
    first = expected.entry_order[0][0]
    X = cohort[0].copy()
    X[:, first] *= factor
    found = fit(X)
    assert found.certificate.tobytes() == expected.certificate.tobytes()
    for b in range(expected.n_subsamples):
        assert found.entry_order[b].tobytes() == expected.entry_order[b].tobytes()
        for k in range(30):
            coef = found.coef(b, k)[1].copy()
            coef[first] *= factor
            assert coef.tobytes() == expected.coef(b, k)[1].tobytes()
