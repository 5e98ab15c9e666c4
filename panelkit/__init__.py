"""panelkit: small, affordable biomarker panels from wide omics data.

Public names are loaded when they are first used, so that importing the package costs
next to nothing.
"""

import importlib
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from panelkit.costing import cheapest_cover, programme_cost
    from panelkit.errors import PanelkitError
    from panelkit.fits import fit_paths
    from panelkit.ingest import check_cohort, read_cohort, read_openings
    from panelkit.stability import StabilitySelector
    from panelkit.workflow import (
        LockedPanel,
        check_study,
        draft_study,
        lock_panel,
        open_set_aside,
        recalibrate_panel,
        run_shortlist,
        run_study,
        score_table,
        validate_panel,
    )

__all__ = [
    "LockedPanel",
    "PanelkitError",
    "StabilitySelector",
    "cheapest_cover",
    "check_cohort",
    "check_study",
    "draft_study",
    "fit_paths",
    "lock_panel",
    "open_set_aside",
    "programme_cost",
    "read_cohort",
    "read_openings",
    "recalibrate_panel",
    "run_shortlist",
    "run_study",
    "score_table",
    "validate_panel",
]

_HOMES = {
    "LockedPanel": "panelkit.workflow",
    "PanelkitError": "panelkit.errors",
    "StabilitySelector": "panelkit.stability",
    "cheapest_cover": "panelkit.costing",
    "check_cohort": "panelkit.ingest",
    "check_study": "panelkit.workflow",
    "draft_study": "panelkit.workflow",
    "fit_paths": "panelkit.fits",
    "lock_panel": "panelkit.workflow",
    "open_set_aside": "panelkit.workflow",
    "programme_cost": "panelkit.costing",
    "read_cohort": "panelkit.ingest",
    "read_openings": "panelkit.ingest",
    "run_shortlist": "panelkit.workflow",
    "recalibrate_panel": "panelkit.workflow",
    "run_study": "panelkit.workflow",
    "score_table": "panelkit.workflow",
    "validate_panel": "panelkit.workflow",
}


def __getattr__(name: str) -> Any:
    """Load a public name from its home (PEP 562)."""
    if name not in _HOMES:
        message = f"module 'panelkit' has no attribute {name!r}"
        raise AttributeError(message)
    return getattr(importlib.import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    return sorted(__all__)
