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
    from panelkit.ingest import check_cohort, read_cohort
    from panelkit.workflow import check_study, draft_study, run_study

__all__ = [
    "PanelkitError",
    "cheapest_cover",
    "check_cohort",
    "check_study",
    "draft_study",
    "fit_paths",
    "programme_cost",
    "read_cohort",
    "run_study",
]

_HOMES = {
    "PanelkitError": "panelkit.errors",
    "cheapest_cover": "panelkit.costing",
    "check_cohort": "panelkit.ingest",
    "check_study": "panelkit.workflow",
    "draft_study": "panelkit.workflow",
    "fit_paths": "panelkit.fits",
    "programme_cost": "panelkit.costing",
    "read_cohort": "panelkit.ingest",
    "run_study": "panelkit.workflow",
}


def __getattr__(name: str) -> Any:
    """Load a public name from its home (PEP 562)."""
    if name not in _HOMES:
        message = f"module 'panelkit' has no attribute {name!r}"
        raise AttributeError(message)
    return getattr(importlib.import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    return sorted(__all__)
