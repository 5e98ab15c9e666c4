"""What a panel's assays alone can do, and recipes that cannot be meant."""

import numpy as np
import pytest

from panelkit.config import PREPARATION
from panelkit.errors import StudyFileError
from panelkit.preparation import (
    STEP_KINDS,
    Recipe,
    assay_ready,
    fitted_to_scale,
    refuse_unready,
)

MARKERS = np.array([5, 9])


@pytest.fixture
def counts():
    return np.random.default_rng(0).poisson(50.0, (12, 20)) + 1.0


def learnt(entries, values, known):
    recipe = Recipe(entries)
    state = recipe.learn(
        recipe.base(values), np.arange(15), np.full(len(values), "", object), known
    )
    return recipe, state


READY = [
    ("log2", "filter", "median-fill"),
    ("log2", "batch-centre", "variance", "half-minimum"),
    ("log2", "reference-ratio", "below-limit"),
    ("prevalence", "log2", {"step": "collapse", "rule": "highest-mean"}, "median-fill"),
]


@pytest.mark.parametrize("entries", READY)
def test_single_markers_and_references_suffice(entries, counts, context):
    known = context(12, 20)
    recipe, state = learnt(entries, counts, known)
    assert assay_ready(recipe, state, MARKERS, known) == ()
    refuse_unready(recipe, state, MARKERS, known)


@pytest.mark.parametrize(
    ("entries", "step", "count"),
    [
        (("log-cpm", "median-fill"), "log-cpm", 10),
        (("median-of-ratios", "median-fill"), "median-of-ratios", 10),
        (("trimmed-mean", "median-fill"), "trimmed-mean", 10),
        (("upper-quartile", "median-fill"), "upper-quartile", 10),
        (("log2", "quantile", "median-fill"), "quantile", 10),
        (("log2", "median-difference", "median-fill"), "median-difference", 10),
        (("log2", "neighbours"), "neighbours", 10),
    ],
)
def test_steps_that_read_other_features_are_refused(
    entries, step, count, counts, context
):
    known = context(12, 20)
    recipe, state = learnt(entries, counts, known)
    reasons = assay_ready(recipe, state, MARKERS, known)
    assert len(reasons) == 1
    assert f"'{step}' needs {count} features" in reasons[0]
    assert "F0, F1, F2, F3, F4 and 5 more" in reasons[0]
    with pytest.raises(StudyFileError) as caught:
        refuse_unready(recipe, state, MARKERS, known)
    assert caught.value.code == "recipe-not-assay-ready"
    assert step in caught.value.what


def test_a_median_of_probes_needs_the_probes_of_the_markers_only(counts, context):
    """Feature 9 shares its analyte with 8; feature 5 stands for itself."""
    known = context(12, 20)
    assert known.analyte[9] == known.analyte[8]
    entries = ("log2", {"step": "collapse", "rule": "median"}, "median-fill")
    recipe, state = learnt(entries, counts, known)
    reasons = assay_ready(recipe, state, np.array([5, 8]), known)
    assert reasons == (
        "step 'collapse' needs 1 features that the panel does not measure: F9",
    )
    assert assay_ready(recipe, state, np.array([5]), known) == ()


def test_every_ready_step_gives_the_same_from_its_own_features(counts, context):
    """The claim itself: with all other features gone the markers keep their bits."""
    known = context(12, 20)
    for entries in READY[:3]:
        recipe, state = learnt(entries, counts, known)
        whole = recipe.apply(state, recipe.base(counts), np.arange(20), known)
        alone = np.full_like(counts, np.nan)
        keep = [*MARKERS, 0, 1, 2, 3]  # 0 to 3 have the role of references
        alone[keep] = counts[keep]
        part = recipe.apply(state, recipe.base(alone), np.arange(20), known)
        assert part[MARKERS].tobytes() == whole[MARKERS].tobytes()


@pytest.mark.parametrize(
    ("part", "code", "steps"),
    [
        ("discovery", "unknown-step", ("log3", "median-fill")),
        ("discovery", "unknown-step", ({"name": "log2"}, "median-fill")),
        ("discovery", "step-order", ("filter", "log2", "median-fill")),
        ("discovery", "step-order", ("quantile", "log2", "median-fill")),
        ("discovery", "step-order", ("median-fill", "batch-centre")),
        ("discovery", "step-order", ("collapse", "quantile", "median-fill")),
        ("discovery", "step-missing-or-repeated", ("median-fill", "half-minimum")),
        ("discovery", "step-missing-or-repeated", ("log2",)),
        ("discovery", "scale-twice", ("log2", "log-cpm", "median-fill")),
        ("assay", "step-not-for-assay", ("log-cpm", "median-fill")),
        ("assay", "step-not-for-assay", ("log2", "filter", "median-fill")),
        ("assay", "step-not-for-assay", ("log2", "neighbours")),
    ],
)
def test_recipes_that_cannot_be_meant(part, code, steps):
    with pytest.raises(StudyFileError) as caught:
        Recipe(steps, part=part)
    assert caught.value.code == code
    assert caught.value.where == f"[preparation] {part}"
    assert caught.value.exit_code == 2


@pytest.mark.parametrize(
    ("table", "code", "said"),
    [
        ({"step": "log-cpm", "priors": 2}, "step-parameter-unknown", "'prior'"),
        ({"step": "quantile", "to": 2}, "step-parameter-unknown", "are none"),
        ({"step": "log-cpm", "prior": 0}, "step-parameter-refused", "above 0"),
        ({"step": "log-cpm", "prior": True}, "step-parameter-refused", "True"),
        ({"step": "log2", "offset": -1.0}, "step-parameter-refused", "at least 0"),
        ({"step": "variance", "number": 2.5}, "step-parameter-refused", "whole"),
        ({"step": "collapse", "rule": "mean"}, "step-parameter-refused", "median"),
        (
            {"step": "reference-ratio", "features": "ACTB"},
            "step-parameter-refused",
            "a list of feature ids",
        ),
        (
            {"step": "upper-quartile", "quantile": 1.5},
            "step-parameter-refused",
            "at most 1",
        ),
    ],
)
def test_parameters_that_cannot_be_meant(table, code, said):
    with pytest.raises(StudyFileError) as caught:
        Recipe((table,))
    assert caught.value.code == code
    assert said in str(caught.value)
    assert table["step"] in caught.value.where


def test_every_parameter_is_written_out_and_reads_back_the_same():
    for name in STEP_KINDS:
        entries = [name] if STEP_KINDS[name].place == "fill" else [name, "median-fill"]
        recipe = Recipe(entries)
        assert Recipe(recipe.tables()).chain == recipe.chain
        assert recipe.tables()[0]["step"] == name
        assert all(": " in line for line in recipe.words())
    assert Recipe(("log2", "filter", "median-fill")).tables() == [
        {"step": "log2", "offset": PREPARATION.log2_offset},
        {"step": "filter", "max_missing_share": PREPARATION.max_missing_share},
        {"step": "median-fill"},
    ]


def test_settings_of_the_section_count_where_an_entry_gives_none():
    plain = Recipe(("log2", "median-fill"), log2_offset=0.5)
    own = Recipe(({"step": "log2", "offset": 3}, "median-fill"), log2_offset=0.5)
    assert plain.tables()[0]["offset"] == 0.5
    assert own.tables()[0]["offset"] == 3.0
    assert isinstance(own.tables()[0]["offset"], float)


def test_fills_are_told_the_scale():
    assert fitted_to_scale(("half-minimum",), "linear") == (
        {"step": "half-minimum", "scale": "linear"},
    )
    assert fitted_to_scale(("log2", "half-minimum"), "linear")[1] == "half-minimum"
    assert fitted_to_scale(("below-limit",), "log2") == ("below-limit",)
    own = {"step": "below-limit", "scale": "log2"}
    assert fitted_to_scale((own,), "linear") == (own,)
