"""The assay part of a recipe, frozen: what one new sample goes through."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import StudyFileError
from panelkit.preparation import (
    UNFROZEN,
    Recipe,
    assay_ready,
    frozen_recipe,
    reference_features,
    refuse_unready,
)
from panelkit.records import AssayStep, PanelReference, RecipeContext, RecipeState

__all__ = ["FrozenAssay", "assay_obstacles", "freeze_assay"]

WITH_OFFSET = ("log2", "m-values")
FILLS = ("median-fill", "half-minimum", "below-limit")


@dataclass(frozen=True, slots=True, eq=False)
class FrozenAssay:
    """Steps with all that they learnt, for the assays of one panel.

    Attributes
    ----------
    steps : tuple of AssayStep
        In order; the fill comes last.
    references : tuple of PanelReference
        Assays that markers are divided by.
    reference_rows : ndarray of int64
        Their positions among the study's features.
    features : tuple of str
        Markers, then references.
    fill : ndarray of shape (n_markers,)
        What stands for a missing prepared value.
    """

    steps: tuple[AssayStep, ...]
    references: tuple[PanelReference, ...]
    reference_rows: NDArray[np.int64]
    features: tuple[str, ...]
    fill: NDArray[np.float64]


def assay_obstacles(
    discovery: Recipe,
    assay: Recipe | None,
    state: RecipeState,
    markers: NDArray[np.int64],
    context: RecipeContext,
) -> tuple[str, ...]:
    """Return why a panel's preparation cannot be frozen.

    Parameters
    ----------
    discovery, assay, state, markers, context
        As for `freeze_assay`.

    Returns
    -------
    tuple of str
        Empty where `freeze_assay` will not refuse.
    """
    found = () if assay is not None else assay_ready(discovery, state, markers, context)
    recipe = discovery if assay is None else assay
    freezable = (*WITH_OFFSET, *FILLS, "reference-ratio")
    wrong = [
        step.name
        for step in recipe.chain
        if step.place not in UNFROZEN and step.name not in freezable
    ]
    return (*found, *(f"step '{name}' cannot be frozen" for name in wrong))


def freeze_assay(
    discovery: Recipe,
    assay: Recipe | None,
    state: RecipeState,
    values: NDArray[np.floating[Any]],
    markers: NDArray[np.int64],
    context: RecipeContext,
) -> FrozenAssay:
    """Return the frozen steps of a panel, learnt on all rows.

    Parameters
    ----------
    discovery : Recipe
        Frozen where there is no assay part.
    assay : Recipe or None
        The assay part.
    state : RecipeState
        What the discovery part learnt from all rows.
    values : ndarray of shape (n_features, n_samples)
        As read.
    markers : ndarray of int64
        The panel, in its own order.
    context : RecipeContext
        Names, roles, analytes.

    Returns
    -------
    FrozenAssay
        Needs the panel's markers and the references, nothing else.

    Raises
    ------
    StudyFileError
        The discovery part needs other features; the first such step is named.
    """
    if assay is None:
        refuse_unready(discovery, state, markers, context)
        assay = frozen_recipe(discovery)
    measured = np.union1d(markers, assay.reference_candidates(context))
    rounded = np.asarray(values[measured], np.float32).astype(np.float64)
    learnt = assay.learn(
        assay.base(rounded),
        np.arange(values.shape[1]),
        np.full(len(measured), "", object),
        context.among(measured),
    )
    chosen = reference_features(assay, learnt)
    references: tuple[PanelReference, ...] = ()
    for step in learnt.steps:
        if "references" in step.arrays:
            fills = np.asarray(step.arrays["fill"], np.float64).tolist()
            own = measured[step.arrays["references"]]
            references = tuple(
                PanelReference(context.name(int(j)), fill)
                for j, fill in zip(own, fills, strict=True)
            )
    rows = measured[chosen]
    return FrozenAssay(
        steps=_steps(assay),
        references=references,
        reference_rows=rows,
        features=tuple(context.name(int(j)) for j in (*markers, *rows)),
        fill=learnt.fill[np.searchsorted(measured, markers)],
    )


def _steps(assay: Recipe) -> tuple[AssayStep, ...]:
    found = []
    for step, table in zip(assay.chain, assay.tables(), strict=True):
        if step.name in WITH_OFFSET:
            parameters = {"offset": float(table["offset"])}
            found.append(AssayStep(step.name, step.words(), parameters))
        elif step.name == "reference-ratio":
            found.append(AssayStep(step.name, step.words(), {}))
        elif step.name not in FILLS:
            raise StudyFileError(
                code="step-not-frozen",
                where=f"[preparation] {assay.part}",
                what=f"step '{step.name}' cannot be frozen in a panel file: a new "
                "sample belongs to no batch of the study",
                accepted="logarithms, M-values, ratios to references, and a fill of "
                "single markers",
                next_step="Take references into the panel for what batches change",
            )
        else:
            found.append(AssayStep("fill", f"{step.name}: {step.words()}", {}))
    return tuple(found)
