"""Preparation learns on training rows and applies to any rows."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from panelkit.errors import InputDataError, StudyFileError
from panelkit.preparation import (
    DEFAULT_REASONS,
    DesignView,
    Recipe,
    default_steps,
)
from panelkit.preparation.filter import MeasuredAndVarying
from panelkit.preparation.missing import medians
from panelkit.preparation.values import starting_values
from panelkit.records import RecipeContext

LEARNT = ("filter", "median-fill")


def fill_with_median(values, rows):
    return medians(starting_values(values), rows)


def filter_features(values, rows, max_missing_share):
    step = MeasuredAndVarying(max_missing_share)
    return step.learn(starting_values(values), rows, RecipeContext())["reasons"]


def free(n_features):
    return np.full(n_features, "", object)


def matrix(seed=0, p=40, n=25, missing=0.2, kind=np.float64):
    """Return features by samples with gaps and one feature never measured."""
    draws = np.random.default_rng(seed)
    values = draws.lognormal(3.0, 1.0, (p, n)).astype(kind)
    values[draws.random((p, n)) < missing] = np.nan
    values[0] = np.nan
    return values


# what is learnt


@pytest.mark.parametrize("kind", [np.float32, np.float64])
@pytest.mark.parametrize("n_rows", [1, 8, 13])  # odd and even numbers of values
def test_fill_is_the_median_of_the_measured_values(kind, n_rows, monkeypatch):
    monkeypatch.setattr("panelkit.preparation.values.TILE", 7)
    values = matrix(kind=kind)
    rows = np.random.default_rng(1).permutation(25)[:n_rows]
    found = fill_with_median(values, rows)
    for j in range(1, 40):
        own = values[j, rows].astype(np.float64)
        if np.isnan(own).all():
            assert np.isnan(found[j])
        else:
            assert found[j] == np.nanmedian(own)
    assert np.isnan(found[0])


def test_feature_never_measured_is_left_out_with_its_reason():
    state = Recipe(("median-fill",)).learn(matrix(), np.arange(25), free(40))
    assert not state.included[0]
    assert state.reasons[0] == "not measured on any training row"
    assert state.fill[0] == 0.0
    assert state.included[1:].all()
    assert (state.reasons[1:] == "").all()


def test_filter_leaves_out_constants_and_the_mostly_missing():
    nan = np.nan
    values = np.array(
        [
            [1.0, 2.0, 3.0, 4.0, 9.0],
            [5.0, 5.0, 5.0, 5.0, 9.0],  # constant on the training rows
            [5.0, nan, nan, nan, 9.0],  # missing in 3 of 4
            [1.0, 2.0, nan, nan, 9.0],  # missing in just 1 of 2: stays
            [7.0, nan, 7.0, nan, 9.0],  # constant where measured
        ]
    )
    found = filter_features(values, np.arange(4), 0.5)
    assert found.tolist() == [
        "",
        "constant on the training rows",
        "missing in more than 50% of the training rows",
        "",
        "constant on the training rows",
    ]


def test_share_of_missing_is_taken_over_the_training_rows():
    values = np.ones((1, 10))
    values[0, :4] = [1.0, 2.0, np.nan, np.nan]
    values[0, 5:] = np.nan
    assert filter_features(values, np.arange(4), 0.5)[0] == ""
    assert filter_features(values, np.arange(4), 0.49)[0] != ""


def test_barred_features_keep_the_reason_they_came_with():
    barred = free(40)
    barred[[0, 3]] = "barred by the study", "a control"
    before = barred.copy()
    state = Recipe(LEARNT).learn(matrix(), np.arange(25), barred)
    assert state.reasons[0] == "barred by the study"
    assert state.reasons[3] == "a control"
    assert not state.included[[0, 3]].any()
    assert barred.tolist() == before.tolist()  # what was given is not written to


def test_filter_does_not_run_unless_asked():
    values = np.ones((2, 6))
    values[1] = np.arange(6)
    rows = np.arange(6)
    assert Recipe(("median-fill",)).learn(values, rows, free(2)).included.all()
    assert Recipe(LEARNT).learn(values, rows, free(2)).included.tolist() == [0, 1]


def test_missing_values_are_filled_with_what_training_rows_taught():
    values = np.array([[1.0, 3.0, 10.0, np.nan, np.nan]])
    recipe = Recipe(LEARNT)
    state = recipe.learn(values, np.array([0, 1, 2]), free(1))
    assert recipe.apply(state, values, np.arange(5)).tolist() == [[1, 3, 10, 3, 3]]


# leakage


@pytest.mark.parametrize("steps", [LEARNT, ("median-fill",), ("median-fill", "filter")])
@pytest.mark.parametrize("held_out", ["random", "huge", "missing", "constant"])
def test_held_out_values_change_no_bit_of_the_state(steps, held_out, monkeypatch):
    # some features are constant or missing by one row only, so that a single value
    # read from another row would turn them
    monkeypatch.setattr("panelkit.preparation.values.TILE", 8)
    values = matrix(2)
    training = np.sort(np.random.default_rng(2).permutation(25)[:16])
    values[1, training] = 4.0
    values[2, training] = np.where(np.arange(16) < 8, np.nan, values[2, training])
    values[3, training] = np.nan
    others = np.setdiff1d(np.arange(25), training)
    changed = values.copy()
    changed[:, others] = {
        "random": np.random.default_rng(3).normal(size=(40, 9)),
        "huge": 1e300,
        "missing": np.nan,
        "constant": 4.0,
    }[held_out]
    recipe = Recipe(steps)
    one = recipe.learn(values, training, free(40))
    other = recipe.learn(changed, training, free(40))
    assert one.digest() == other.digest()
    assert one.fill.tobytes() == other.fill.tobytes()
    assert one.included.tobytes() == other.included.tobytes()
    assert one.reasons.tolist() == other.reasons.tolist()
    # the test can fail: the changed rows teach something else
    assert recipe.learn(changed, others, free(40)).digest() != one.digest()


def test_order_of_training_rows_does_not_matter():
    values = matrix(4)
    rows = np.arange(3, 20)
    recipe = Recipe(LEARNT)
    one = recipe.learn(values, rows, free(40))
    assert one.digest() == recipe.learn(values, rows[::-1], free(40)).digest()


def test_digest_tells_states_apart():
    values = matrix(5)
    one = Recipe(LEARNT).learn(values, np.arange(20), free(40))
    values[5] += 1.0
    other = Recipe(LEARNT).learn(values, np.arange(20), free(40))
    assert other.fill[5] == pytest.approx(one.fill[5] + 1.0)
    assert one.digest() != other.digest()
    barred = free(40)
    barred[7] = "barred"
    assert (
        Recipe(LEARNT).learn(values, np.arange(20), barred).digest() != other.digest()
    )


# one definition of a prepared value

cells = st.one_of(
    st.floats(-1e6, 1e6, width=32), st.just(float("nan")), st.sampled_from([0.0, -0.0])
)


@settings(derandomize=True, deadline=None, max_examples=80, database=None)
@given(data=st.data())
def test_column_equals_apply_bit_for_bit(data):
    shape = data.draw(st.tuples(st.integers(1, 5), st.integers(2, 9)))
    kind = data.draw(st.sampled_from([np.float32, np.float64]))
    base = data.draw(hnp.arrays(kind, shape, elements=cells))
    n = shape[1]
    training = np.array(data.draw(st.lists(st.integers(0, n - 1), min_size=1)))
    rows = np.array(data.draw(st.lists(st.integers(0, n - 1), min_size=1)))
    recipe = Recipe(data.draw(st.sampled_from([LEARNT, ("median-fill",)])))
    state = recipe.learn(base, np.unique(training), free(shape[0]))
    applied = recipe.apply(state, base, rows)
    view = recipe.view(state, base)
    assert applied.dtype == np.float64
    assert not np.isnan(applied).any()
    for j in range(shape[0]):
        assert view.column(j, rows).tobytes() == applied[j].tobytes()
    assert view.columns(np.arange(shape[0]), rows).tobytes() == applied.tobytes()


def test_view_shares_the_base():
    base = matrix(6)
    recipe = Recipe(LEARNT)
    view = recipe.view(recipe.learn(base, np.arange(20), free(40)), base)
    assert isinstance(view, DesignView)
    assert np.shares_memory(view.base, base)
    assert view.fill is view.state.fill
    assert view.included is view.state.included


# per-sample steps


def test_logarithm_is_taken_of_each_value_and_the_cohort_is_left_alone(monkeypatch):
    monkeypatch.setattr("panelkit.preparation.scale.TILE", 7)
    values = matrix(7)
    before = values.copy()
    recipe = Recipe(("log2", *LEARNT), log2_offset=0.5)
    base = recipe.base(values)
    assert base == pytest.approx(np.log2(before + 0.5), rel=1e-15, nan_ok=True)
    assert values.tobytes() == before.tobytes()
    assert base.flags.c_contiguous


@pytest.mark.parametrize("kind", [np.float32, np.float64])
def test_base_keeps_its_type_and_each_sample_to_itself(kind):
    values = matrix(8, kind=kind)
    recipe = Recipe(("log2", *LEARNT))
    base = recipe.base(values)
    assert base.dtype == kind
    for i in (0, 11, 24):
        alone = recipe.base(values[:, i : i + 1])
        assert alone[:, 0].tobytes() == base[:, i].copy().tobytes()


def test_without_per_sample_steps_the_base_is_the_matrix_itself():
    values = matrix(9)
    assert np.shares_memory(Recipe(LEARNT).base(values), values)
    assert Recipe(LEARNT).base(values.T).flags.c_contiguous


def test_logarithm_of_what_has_none_is_refused():
    values = np.array([[3.0, -1.0], [2.0, np.nan]])
    with pytest.raises(InputDataError) as caught:
        Recipe(("log2", "median-fill"), log2_offset=1.0).base(values)
    assert caught.value.code == "negative-before-log2"
    assert caught.value.exit_code == 3
    assert "-1" in caught.value.what
    assert Recipe(("log2", "median-fill"), log2_offset=1.5).base(values)[0, 1] == -1.0


def test_logarithm_of_nothing_is_nothing():
    assert np.isnan(Recipe(("log2", "median-fill")).base(np.full((2, 3), np.nan))).all()


# recipes that cannot be meant


@pytest.mark.parametrize(
    ("code", "steps"),
    [
        ("unknown-step", ("log",)),
        ("unknown-step", ("log2", "quantiles")),
        ("step-order", ("filter", "log2")),
        ("step-order", ("log2", "median-fill", "log2")),
        ("step-missing-or-repeated", ("log2", "filter")),
        ("step-missing-or-repeated", ("log2", "log2", "median-fill")),
    ],
)
def test_wrong_steps_are_refused(code, steps):
    with pytest.raises(StudyFileError) as caught:
        Recipe(steps)
    assert caught.value.code == code
    assert caught.value.where == "[preparation] discovery"


def test_a_step_written_twice_is_refused():
    with pytest.raises(StudyFileError):
        Recipe(("log2", "log2", "filter"))


@pytest.mark.parametrize(
    ("scale", "first"),
    [
        ("linear", ("log2",)),
        ("counts", ("log-cpm",)),
        ("log2", ()),
        ("z-scores", ()),
        ("beta-values", ()),
        ("unknown", ()),
    ],
)
def test_default_steps_follow_the_scale(scale, first):
    steps = default_steps(scale)
    assert steps[:-2] == first
    assert scale in DEFAULT_REASONS
    assert steps[-2:] == LEARNT
    Recipe(steps)
