"""The recipes that a study asks for, and what they may read beside the values."""

from typing import Any

from panelkit.config import Study
from panelkit.ingest import guess_scale
from panelkit.preparation import Recipe, default_steps, fitted_to_scale
from panelkit.records import Cohort, Finding, RecipeContext

__all__ = ["assay_findings", "context_of", "preparation_tables", "recipes_of"]


def recipes_of(plan: Study, cohort: Cohort) -> tuple[Recipe, Recipe | None]:
    """Return the discovery part and, where the study names one, the assay part.

    Parameters
    ----------
    plan : Study
        Its [preparation].
    cohort : Cohort
        Its scale decides where the study does not.

    Returns
    -------
    discovery : Recipe
        Default steps follow the scale that was found.
    assay : Recipe or None
        None: panels are fitted with the discovery part.

    Raises
    ------
    StudyFileError
        A recipe that cannot be meant.
    """
    section = plan.preparation
    scale = guess_scale(cohort.values).kind
    settings = (section.log2_offset, section.max_missing_share)
    entries = section.discovery
    if entries is None:
        entries = default_steps(scale)
    discovery = Recipe(fitted_to_scale(entries, scale), *settings)
    if section.assay is None:
        return discovery, None
    assay = Recipe(fitted_to_scale(section.assay, scale), *settings, part="assay")
    return discovery, assay


def context_of(cohort: Cohort) -> RecipeContext:
    """Return what a recipe may read of a cohort beside its values."""
    columns = cohort.feature_columns
    return RecipeContext(
        features=cohort.features,
        samples=cohort.samples,
        role=columns.get("role"),
        analyte=columns.get("analyte"),
        batch=cohort.design.batch,
    )


def preparation_tables(discovery: Recipe, assay: Recipe | None) -> dict[str, Any]:
    """Return the recipes as a study file writes them, every parameter given."""
    return {
        "discovery": discovery.tables(),
        "assay": None if assay is None else assay.tables(),
    }


def assay_findings(discovery: Recipe) -> list[Finding]:
    """Return the finding that a panel's assays alone cannot do the recipe, if so."""
    wrong = [step.name for step in discovery.chain if not step.assay]
    if not wrong:
        return []
    return [
        Finding(
            "recipe-not-assay-ready",
            "info",
            "[preparation] discovery",
            f"{', '.join(wrong)} cannot be done on one new sample with a panel's "
            "assays alone; accuracy is that of panels read from whole samples",
            "Name [preparation] assay to have accuracy with the panel's assays alone, "
            "and to be able to lock a panel",
        )
    ]
