"""What holds for every combination of steps: one value, no leak, each row by itself."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from panelkit.preparation import STEP_KINDS, Recipe
from panelkit.preparation.step import FILL, FILTER, SCALE
from panelkit.records import RecipeContext

N_FEATURES = 14
PARAMETERS = {  # small enough that filters and neighbours bite on a small matrix
    "variance": {"number": 6},
    "detection": {"level": 2.0, "samples": 2},
    "prevalence": {"share": 0.4, "above": 1.0},
    "neighbours": {"k": 2},
    "reference-ratio": {"references": 2},
    "replicate-reliability": {"least": 0.1},
}
RULES = ("highest-mean", "highest-variance", "median")
COUNT_STEPS = ("log-cpm", "median-of-ratios", "trimmed-mean", "upper-quartile")


def names_of(place):
    return [name for name, kind in STEP_KINDS.items() if kind.place == place]


def entry(name, draw):
    table = {"step": name, **PARAMETERS.get(name, {})}
    if name == "collapse":
        table["rule"] = draw(st.sampled_from(RULES))
    if name == "reference-ratio":
        table["measure"] = draw(
            st.sampled_from(("pairwise-variation", "variance-components"))
        )
    return table


@st.composite
def recipes(draw):
    """Return the entries of a recipe: at most one scale, any of the rest, one fill."""
    early = draw(st.sampled_from([[], ["prevalence"], ["detection", "prevalence"]]))
    scale = draw(st.sampled_from([None, *names_of(SCALE)]))
    middle = [
        name
        for name in ("quantile", "median-difference", "batch-centre", "reference-ratio")
        if draw(st.booleans())
    ]
    late = [
        name for name in names_of(FILTER) if name not in early and draw(st.booleans())
    ]
    collapse = ["collapse"] if draw(st.booleans()) else []
    fill = draw(st.sampled_from(names_of(FILL)))
    behind = [name for name in late if draw(st.booleans())]
    before = [name for name in late if name not in behind]
    listed = [*early, scale, *middle, *before, *collapse, fill, *behind]
    return [entry(name, draw) for name in listed if name]


def cohort_for(entries, seed, n, kind):
    """Return a matrix that the recipe can take, and what is known beside it."""
    rng = np.random.default_rng(seed)
    names = {each["step"] for each in entries}
    values = rng.poisson(rng.lognormal(3, 1, (N_FEATURES, 1)), (N_FEATURES, n)) + 0.0
    gaps = rng.random(values.shape) < 0.15
    values[0], gaps[0] = 7.0, False  # constant, and without a zero
    values[1:4] += 1.0
    if "m-values" in names:
        values = rng.beta(1, 2, values.shape)
    elif not names & {*COUNT_STEPS, "log2"}:
        values = rng.normal(8, 2, values.shape).round(1)  # with ties
    gaps[1:4] = False
    values[gaps] = np.nan
    values[5] = np.nan
    role = np.full(N_FEATURES, "marker", object)
    role[[1, 2, 3]] = "reference"
    known = RecipeContext(
        features=np.array([f"F{j}" for j in range(N_FEATURES)], object),
        samples=np.array([f"S{i}" for i in range(n)], object),
        role=role,
        analyte=np.array([f"A{j // 3}" for j in range(N_FEATURES)], object),
        batch=rng.choice(np.array(["p1", "p2", "p3"], object), n),
        replicate=np.arange(n, dtype=np.int64) % 2,
    )
    return np.ascontiguousarray(values.astype(kind)), known


def free():
    return np.full(N_FEATURES, "", object)


cases = given(
    entries=recipes(),
    seed=st.integers(0, 2**16),
    n=st.integers(12, 15),
    kind=st.sampled_from([np.float32, np.float64]),
)
often = settings(derandomize=True, deadline=None, max_examples=150, database=None)


@often
@cases
def test_column_of_a_view_is_the_recipe_applied_bit_for_bit(entries, seed, n, kind):
    """Applied to some rows alone, in another order: the same bits as all at once."""
    values, known = cohort_for(entries, seed, n, kind)
    recipe = Recipe(entries)
    base = recipe.base(values)
    rng = np.random.default_rng(seed)
    training = np.sort(rng.permutation(n)[: n - 3])
    state, made = recipe.prepare(base, training, free(), known)
    again = recipe.view(state, base, known)
    rows = rng.permutation(n)[:5]
    applied = recipe.apply(state, base, rows, known)
    assert not np.isnan(applied[state.included]).any()
    for j in range(N_FEATURES):
        assert made.column(j, rows).tobytes() == applied[j].tobytes()
        assert again.column(j, rows).tobytes() == applied[j].tobytes()


@often
@cases
def test_one_row_alone_equals_many(entries, seed, n, kind):
    """From the cohort's raw values on: sums, sorts and logarithms have one order."""
    values, known = cohort_for(entries, seed, n, kind)
    recipe = Recipe(entries)
    base = recipe.base(values)
    training = np.arange(n - 3)
    state = recipe.learn(base, training, free(), known)
    many = recipe.apply(state, base, np.arange(n), known)
    for i in (0, n - 1):
        alone = recipe.base(np.ascontiguousarray(values[:, i : i + 1]))
        one = recipe.apply(state, alone, np.array([0]), known.at(np.array([i])))
        assert one[:, 0].tobytes() == np.ascontiguousarray(many[:, i]).tobytes()


@often
@cases
def test_nothing_of_a_held_out_row_is_learnt(entries, seed, n, kind):
    """Other values, other gaps, other batches of the held-out rows: the same state."""
    values, known = cohort_for(entries, seed, n, kind)
    recipe = Recipe(entries)
    rng = np.random.default_rng(seed + 1)
    order = rng.permutation(n)
    training, held_out = order[: n - 4], order[n - 4 :]
    one = recipe.learn(recipe.base(values), training, free(), known)
    changed = values.copy()
    top = 1.0 if any(each["step"] == "m-values" for each in entries) else 400.0
    other = rng.uniform(top / 400.0, top, (N_FEATURES, 4))
    other[rng.random(other.shape) < 0.2] = np.nan
    other[1] = top  # no sample without counts
    changed[:, held_out] = other
    batch = known.batch.copy()
    batch[held_out] = "another"
    strange = RecipeContext(
        known.features, known.samples, known.role, known.analyte, batch, known.replicate
    )
    two = recipe.learn(recipe.base(changed), training, free(), strange)
    assert one.digest() == two.digest()
    assert one.reasons.tolist() == two.reasons.tolist()


@pytest.mark.parametrize("name", STEP_KINDS)
def test_a_training_row_does_teach_each_step(name):
    """The leak test would pass on steps that learn nothing."""
    kind = STEP_KINDS[name]
    if kind.place == SCALE and name in ("log2", "m-values"):
        pytest.skip("learns nothing")
    entries = [{"step": name, **PARAMETERS.get(name, {})}]
    if name == "filter":
        entries[0]["max_missing_share"] = 0.1
    if kind.place != FILL:
        entries.append({"step": "median-fill"})
    digests = set()
    for seed in range(6):
        values, known = cohort_for(entries, seed, 12, np.float64)
        values[6] = np.where(np.arange(12) <= 2 * seed, 0.5, 30.0)
        values[7:9] = values[6] + np.arange(12) * (seed % 2) + [[0.0], [40.0]]
        state = Recipe(entries).learn(values, np.arange(12), free(), known)
        arrays = [
            array.tobytes()
            for each in state.steps
            for array in each.arrays.values()
            if array.dtype != object
        ]
        fill = state.fill.tobytes() if kind.place == FILL else b""
        digests.add((*arrays, fill, tuple(state.reasons)))
    assert len(digests) > 1


def test_folds_share_the_matrix_where_steps_allow_it():
    """Masks, shifts and fills of single features need no matrix of the fold's own."""
    shared = [
        ("log2", "median-difference", "batch-centre", "reference-ratio"),
        ("m-values", "batch-centre"),
        ("filter", "variance", "collapse"),
        (),
    ]
    for steps in shared:
        entries = [entry(name, lambda _: RULES[0]) for name in steps]
        for each in entries:
            each.pop("measure", None)
        for fill in ("median-fill", "half-minimum", "below-limit"):
            full = [*entries, {"step": fill}]
            values, known = cohort_for(full, 1, 12, np.float32)
            recipe = Recipe(full)
            base = recipe.base(values)
            view = recipe.prepare(base, np.arange(9), free(), known)[1]
            assert view.base is base
    for own in (*COUNT_STEPS, "quantile"):
        full = [{"step": own}, {"step": "median-fill"}]
        values, known = cohort_for(full, 1, 12, np.float64)
        recipe = Recipe(full)
        base = recipe.base(values)
        view = recipe.prepare(base, np.arange(9), free(), known)[1]
        assert view.base.dtype == np.float32
        assert not np.shares_memory(view.base, base)
