"""Whether a recipe can be done on one new sample with the panel's assays alone."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import StudyFileError, name_some
from panelkit.preparation.recipe import Recipe
from panelkit.preparation.step import COLLAPSE, FILTER
from panelkit.records import RecipeContext, RecipeState

__all__ = [
    "UNFROZEN",
    "assay_ready",
    "frozen_recipe",
    "reference_features",
    "refuse_unready",
]

UNFROZEN = (FILTER, COLLAPSE)
"""Places of steps that decide which features are in, and change no value."""


def reference_features(recipe: Recipe, state: RecipeState) -> NDArray[np.int64]:
    """Return the reference features that a recipe divides by: assays of their own.

    Parameters
    ----------
    recipe : Recipe
        The recipe.
    state : RecipeState
        What it learnt.

    Returns
    -------
    ndarray of int64
        Ascending; empty for a recipe without references.
    """
    found = [
        step.arrays["references"] for step in state.steps if "references" in step.arrays
    ]
    del recipe
    return np.unique(np.concatenate([np.empty(0, np.int64), *found])).astype(np.int64)


def assay_ready(
    recipe: Recipe,
    state: RecipeState,
    markers: NDArray[np.int64],
    context: RecipeContext | None = None,
) -> tuple[str, ...]:
    """Return why a recipe cannot be done with a panel's assays alone.

    Allowed are the markers, the reference features that the recipe chose, and frozen
    constants of single markers.

    Parameters
    ----------
    recipe : Recipe
        Discovery or assay part.
    state : RecipeState
        What it learnt.
    markers : ndarray of int64
        The panel.
    context : RecipeContext, optional
        For the features' names.

    Returns
    -------
    tuple of str
        One reason a step that needs other features, with the features named; empty for
        a recipe that can be locked.
    """
    names = RecipeContext() if context is None else context
    allowed = np.union1d(markers, reference_features(recipe, state))
    learnt = {each.step: each.arrays for each in state.steps}
    reasons = []
    for step in recipe.chain:
        arrays = learnt.get(step.name, {})
        needed = np.setdiff1d(
            step.needs(arrays, markers) if arrays else np.empty(0, np.int64), allowed
        )
        if len(needed):
            listed = name_some([names.name(int(j)) for j in needed])
            reasons.append(
                f"step '{step.name}' needs {len(needed)} features that the panel does "
                f"not measure: {listed}"
            )
    return tuple(reasons)


def frozen_recipe(recipe: Recipe) -> Recipe:
    """Return the steps that one new sample goes through, as an assay part.

    Parameters
    ----------
    recipe : Recipe
        A discovery part that `refuse_unready` lets pass.

    Returns
    -------
    Recipe
        Without filters and choices among features: they decide what is in, and change
        no value.

    Raises
    ------
    StudyFileError
        A step that one new sample cannot do with the panel's assays alone.
    """
    steps = [step for step in recipe.chain if step.place not in UNFROZEN]
    wrong = [step.name for step in steps if not step.assay]
    if wrong:
        raise StudyFileError(
            code="recipe-not-assay-ready",
            where=f"[preparation] {recipe.part}",
            what=f"step '{wrong[0]}' cannot be done on one new sample with a panel's "
            "assays alone",
            accepted="steps that use the panel's markers, reference features and "
            "frozen constants of single markers",
            next_step="Name such steps under [preparation] assay, for example 'log2', "
            "'reference-ratio' and 'median-fill'",
        )
    return Recipe(steps, part="assay")


def refuse_unready(
    recipe: Recipe,
    state: RecipeState,
    markers: NDArray[np.int64],
    context: RecipeContext | None = None,
) -> None:
    """Refuse a recipe that cannot be done with a panel's assays alone.

    Parameters
    ----------
    recipe, state, markers, context
        As for `assay_ready`.

    Raises
    ------
    StudyFileError
        Naming the first such step and its features.
    """
    reasons = assay_ready(recipe, state, markers, context)
    if reasons:
        raise StudyFileError(
            code="recipe-not-assay-ready",
            where=f"[preparation] {recipe.part}",
            what=reasons[0],
            accepted="steps that use the panel's markers, reference features and "
            "frozen constants of single markers",
            next_step="Name such steps under [preparation] assay, for example 'log2', "
            "'reference-ratio' and 'median-fill'",
        )
