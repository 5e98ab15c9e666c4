"""Reference features: the two published measures, and ratios to those chosen.

Check values were worked out from the published formulas; those of the second measure
are from memory of its paper.
"""

import numpy as np
import pytest

from panelkit.errors import InputDataError
from panelkit.preparation import Recipe
from panelkit.preparation.references import (
    factor_variation,
    pairwise_variation,
    stability_order,
    variance_components,
)
from panelkit.records import RecipeContext

FOUR = np.log2([(8, 16, 32, 8), (4, 9, 15, 4), (10, 22, 38, 9), (5, 5, 40, 20)])
FIVE = np.log2(
    [
        (8, 16, 32, 8, 9, 18),
        (4, 8, 16, 4, 7, 12),
        (10, 22, 38, 9, 10, 19),
        (5, 5, 40, 20, 12, 11),
        (6, 13, 22, 7, 6, 14),
    ]
)


def test_pairwise_variation():
    """Vandesompele et al. 2002: the measure M, of four and of the three best."""
    expected = [0.5079457666, 0.5191466873, 0.5375952890, 1.3582675738]
    assert pairwise_variation(FOUR) == pytest.approx(expected, abs=1e-9)
    expected = [0.1164214256, 0.0932182003, 0.0999906279]
    assert pairwise_variation(FOUR[:3]) == pytest.approx(expected, abs=1e-9)
    assert pairwise_variation(FOUR[1:3]) == pytest.approx([0.0767874026] * 2, abs=1e-9)


def test_the_least_stable_are_dropped_one_by_one():
    """The fourth goes first, then the first; the last two cannot be told apart."""
    order = stability_order(FOUR, "pairwise-variation")
    assert order.tolist() == [1, 2, 0, 3]
    found = factor_variation(FOUR, order)
    assert found == pytest.approx([0.0367056426, 0.3394635043], abs=1e-9)


def test_variance_components():
    """Andersen, Jensen & Orntoft 2004, one group of samples."""
    expected = [-0.0177317356, 0.0714829720, 0.0734480434, 1.1522248127, 0.0199865844]
    assert variance_components(FIVE) == pytest.approx(expected, abs=1e-9)
    assert stability_order(FIVE, "variance-components").tolist() == [0, 4, 1, 2, 3]


def test_variance_components_are_unbiased():
    """Simulated with variances 0.04, 0.25, 1; the mean of 400 is within 3 errors."""
    rng = np.random.default_rng(0)
    truth = np.array([0.04, 0.25, 1.0, 0.25])
    found = []
    for _ in range(400):
        common = rng.normal(0, 2, 12)
        own = rng.normal(size=(4, 12)) * np.sqrt(truth)[:, None]
        found.append(variance_components(common + own + rng.normal(8, 1, (4, 1))))
    error = np.std(found, axis=0) / 20
    assert (np.abs(np.mean(found, axis=0) - truth) < 3 * error).all()


def test_the_mean_log_of_references_is_the_mean_cycle_of_threshold():
    """Delta Ct: targets 24 and 22.5, references (18, 19) and (17.6, 18.8).

    Cycles are minus log2; delta delta Ct is -1.2 and the fold 2.2973967100.
    """
    cycles = np.array([[24, 22.5], [18, 17.6], [19, 18.8]])
    recipe = Recipe(
        ({"step": "reference-ratio", "features": ["R1", "R2"]}, "median-fill"),
        part="assay",
    )
    known = RecipeContext(features=np.array(["T", "R1", "R2"], object))
    state = recipe.learn(-cycles, np.arange(2), np.full(3, "", object), known)
    done = recipe.apply(state, -cycles, np.arange(2), known)
    assert -done[0] == pytest.approx([5.5, 4.3])
    assert 2.0 ** (done[0, 1] - done[0, 0]) == pytest.approx(2.2973967100, abs=1e-9)


def test_references_are_chosen_in_each_fold_on_its_training_rows(context):
    """Each half of the rows has another unstable reference."""
    rng = np.random.default_rng(1)
    logs = rng.normal(8, 1, (10, 40))
    logs[:4] = rng.normal(8, 1, 40) + rng.normal(0, 0.05, (4, 40))
    logs[0, :20] += rng.normal(0, 2, 20)
    logs[3, 20:] += rng.normal(0, 2, 20)
    recipe = Recipe(("reference-ratio", "median-fill"))
    known, free = context(10, 40), np.full(10, "", object)
    first, second = (
        recipe.learn(logs, rows, free, known).steps[0].arrays["references"].tolist()
        for rows in (np.arange(20), np.arange(20, 40))
    )
    assert first == [1, 2, 3]
    assert second == [0, 1, 2]


def test_a_missing_reference_takes_its_training_median(context):
    rng = np.random.default_rng(2)
    logs = rng.normal(8, 1, (6, 9))
    logs[1, 8] = np.nan
    recipe = Recipe(({"step": "reference-ratio", "references": 4}, "median-fill"))
    known, free = context(6, 9), np.full(6, "", object)
    state = recipe.learn(logs, np.arange(8), free, known)
    done = recipe.apply(state, logs, np.array([8]), known)
    mean = np.mean([logs[0, 8], np.median(logs[1, :8]), logs[2, 8], logs[3, 8]])
    assert done[5, 0] == pytest.approx(logs[5, 8] - mean)


@pytest.mark.parametrize(
    ("code", "entry", "known"),
    [
        ("no-references", "reference-ratio", RecipeContext()),
        (
            "unknown-reference",
            {"step": "reference-ratio", "features": ["ACTX"]},
            RecipeContext(features=np.array(["A", "B"], object)),
        ),
    ],
)
def test_references_that_are_not_there(code, entry, known):
    recipe = Recipe((entry, "median-fill"))
    with pytest.raises(InputDataError) as caught:
        recipe.check(known)
    assert caught.value.code == code


def test_an_unmeasured_reference_is_named(context):
    logs = np.ones((5, 6))
    logs[2] = np.nan
    with pytest.raises(InputDataError) as caught:
        Recipe(("reference-ratio", "median-fill")).learn(
            logs, np.arange(6), np.full(5, "", object), context(5, 6)
        )
    assert caught.value.code == "reference-not-measured"
    assert "F2" in caught.value.what
