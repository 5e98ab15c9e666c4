"""The frozen steps give one sample what the recipe gives the cohort."""

import numpy as np
import pytest

from panelkit.errors import StudyFileError
from panelkit.lock.assay_part import assay_obstacles, freeze_assay
from panelkit.lock.scoring import prepared_sample
from panelkit.preparation import Recipe
from panelkit.records import RecipeContext

N, P = 24, 7
NAMES = np.array([f"F{j}" for j in range(P)], object)
CONTEXT = RecipeContext(
    features=NAMES,
    role=np.array(["marker"] * 5 + ["reference"] * 2, object),
    batch=np.array(["a", "b"] * (N // 2), object),
)
MARKERS = np.array([3, 0])


def values(share):
    draws = np.random.default_rng(4)
    found = draws.random((P, N)) if share else 2.0 ** draws.normal(8, 1, (P, N))
    found[draws.random(found.shape) < 0.1] = np.nan
    return found


def frozen_values(discovery, assay, found):
    """Prepared markers of each sample, one by one, and by the recipe."""
    rows, barred = np.arange(N), np.full(P, "", object)
    base = np.asarray(found, np.float32).astype(float)
    state = discovery.learn(discovery.base(base), rows, barred, CONTEXT)
    frozen = freeze_assay(discovery, assay, state, found, MARKERS, CONTEXT)
    measured = np.concatenate([MARKERS, frozen.reference_rows])
    own = np.array(
        [
            prepared_sample(
                frozen.steps, frozen.references, frozen.features, column, "here"
            )
            for column in found[measured].T.tolist()
        ]
    ).T
    own = np.where(np.isnan(own), frozen.fill[:, None], own)
    recipe = discovery if assay is None else assay
    _state, view = recipe.prepare(recipe.base(base), rows, barred, CONTEXT)
    return own, view.columns(MARKERS, rows)


@pytest.mark.parametrize(
    ("steps", "share"),
    [
        (["median-fill"], False),
        (["log2", "median-fill"], False),
        ([{"step": "log2", "offset": 0.5}, "half-minimum"], False),
        (["log2", "below-limit"], False),
        (["m-values", "median-fill"], True),
        (["log2", "reference-ratio", "median-fill"], False),
        (["log2", {"step": "reference-ratio", "references": 1}, "median-fill"], False),
        (["log2", "filter", "variance", "median-fill"], False),
    ],
)
def test_frozen_is_learnt(steps, share):
    own, expected = frozen_values(Recipe(steps), None, values(share))
    assert own == pytest.approx(expected, abs=1e-9)


def test_the_assay_part_is_what_is_frozen():
    discovery = Recipe(["log2", "quantile", "median-fill"])
    assay = Recipe(["log2", "reference-ratio", "median-fill"], part="assay")
    own, expected = frozen_values(discovery, assay, values(share=False))
    assert own == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize(
    ("steps", "words"),
    [
        (["log-cpm", "median-fill"], "'log-cpm'"),
        (["log2", "quantile", "median-fill"], "'quantile'"),
        (["log2", "median-difference", "median-fill"], "'median-difference'"),
        (["log2", "batch-centre", "median-fill"], "'batch-centre'"),
        (["log2", "neighbours"], "'neighbours'"),
    ],
)
def test_what_one_new_sample_cannot_do_is_refused_and_named(steps, words):
    recipe, found = Recipe(steps), values(share=False)
    if steps[0] == "log-cpm":
        found = np.floor(np.nan_to_num(found, nan=3.0))
    rows = np.arange(N)
    state = recipe.learn(recipe.base(found), rows, np.full(P, "", object), CONTEXT)
    with pytest.raises(StudyFileError, match=words):
        freeze_assay(recipe, None, state, found, MARKERS, CONTEXT)
    obstacles = assay_obstacles(recipe, None, state, MARKERS, CONTEXT)
    assert any(words in each for each in obstacles)


def test_there_is_no_obstacle_where_nothing_is_refused():
    recipe, found = Recipe(["log2", "median-fill"]), values(share=False)
    rows = np.arange(N)
    state = recipe.learn(recipe.base(found), rows, np.full(P, "", object), CONTEXT)
    assert assay_obstacles(recipe, None, state, MARKERS, CONTEXT) == ()
