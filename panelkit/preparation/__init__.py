"""Steps that learn on training rows and apply to any rows."""

from panelkit.preparation.covariates import CovariateCoding, learn_covariates
from panelkit.preparation.default_steps import (
    DEFAULT_REASONS,
    default_steps,
    fitted_to_scale,
)
from panelkit.preparation.readiness import (
    UNFROZEN,
    assay_ready,
    frozen_recipe,
    reference_features,
    refuse_unready,
)
from panelkit.preparation.recipe import Recipe
from panelkit.preparation.registry import STEP_KINDS
from panelkit.preparation.step import Step
from panelkit.preparation.view import DesignView

__all__ = [
    "DEFAULT_REASONS",
    "STEP_KINDS",
    "UNFROZEN",
    "CovariateCoding",
    "DesignView",
    "Recipe",
    "Step",
    "assay_ready",
    "default_steps",
    "fitted_to_scale",
    "frozen_recipe",
    "learn_covariates",
    "reference_features",
    "refuse_unready",
]
