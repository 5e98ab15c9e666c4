"""Which markers are picked again and again, and what that is worth."""

from typing import TYPE_CHECKING, Any

from panelkit.stability.agreement import (
    jaccard_agreement,
    kuncheva_agreement,
    nogueira_stability,
    set_agreement,
)
from panelkit.stability.bounds import (
    BOUNDS,
    attained_threshold,
    bound_of,
    r_concave_bound,
    unimodal_bound,
    unimodal_factor,
    worst_case_bound,
)
from panelkit.stability.companions import describe_companions, group_companions
from panelkit.stability.demand import (
    Demand,
    markers_for,
    settle_demand,
    threshold_for,
)
from panelkit.stability.null import (
    NullDesign,
    permutation_p,
    shuffle_null,
    shuffled_outcome,
)
from panelkit.stability.paths import trace_paths
from panelkit.stability.r_concave import r_concave_tail
from panelkit.stability.ranking import (
    cox_score_statistics,
    f_statistics,
    feature_statistics,
)
from panelkit.stability.selection import SELECTORS, ShortlistRules, select_markers
from panelkit.stability.selectors import compare_selectors
from panelkit.stability.subsamples import draw_pairs, outcome_strata, resampling_units
from panelkit.stability.tally import pairs_needed, record_convergence
from panelkit.stability.units import unit_strata

if TYPE_CHECKING:
    from panelkit.stability.sklearn_selector import StabilitySelector

__all__ = [
    "BOUNDS",
    "SELECTORS",
    "Demand",
    "NullDesign",
    "ShortlistRules",
    "StabilitySelector",
    "attained_threshold",
    "bound_of",
    "compare_selectors",
    "cox_score_statistics",
    "describe_companions",
    "draw_pairs",
    "f_statistics",
    "feature_statistics",
    "group_companions",
    "jaccard_agreement",
    "kuncheva_agreement",
    "markers_for",
    "nogueira_stability",
    "outcome_strata",
    "pairs_needed",
    "permutation_p",
    "r_concave_bound",
    "r_concave_tail",
    "record_convergence",
    "resampling_units",
    "select_markers",
    "set_agreement",
    "settle_demand",
    "shuffle_null",
    "shuffled_outcome",
    "threshold_for",
    "trace_paths",
    "unimodal_bound",
    "unimodal_factor",
    "unit_strata",
    "worst_case_bound",
]


def __getattr__(name: str) -> Any:
    """Load the selector when it is first used: scikit-learn is slow to import."""
    if name == "StabilitySelector":
        from panelkit.stability.sklearn_selector import StabilitySelector

        return StabilitySelector
    message = f"module 'panelkit.stability' has no attribute {name!r}"
    raise AttributeError(message)
