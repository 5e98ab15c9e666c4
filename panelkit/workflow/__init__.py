"""The order of the stages."""

from panelkit.workflow.bridge import (
    PanelSource,
    bridge_choice,
    bridge_limits,
    bridge_loss,
    bridge_replicates,
    bridge_samples,
)
from panelkit.workflow.check import check_study
from panelkit.workflow.draft import draft_study
from panelkit.workflow.price import PriceRequest, price_panels
from panelkit.workflow.price_content import price_content
from panelkit.workflow.price_files import write_prices
from panelkit.workflow.price_inputs import PriceSource
from panelkit.workflow.run import Run, run_content, run_study
from panelkit.workflow.set_aside import open_set_aside
from panelkit.workflow.shortlist_run import (
    ShortlistRun,
    run_shortlist,
    shortlist_content,
)
from panelkit.workflow.size import (
    size_accuracy,
    size_area,
    size_comparison,
    size_detection,
    size_development,
    size_learning,
    size_plates,
    size_validation,
)
from panelkit.workflow.size_costs import with_costs
from panelkit.workflow.size_files import sizing_content, write_sizing

__all__ = [
    "PanelSource",
    "PriceRequest",
    "PriceSource",
    "Run",
    "ShortlistRun",
    "bridge_choice",
    "bridge_limits",
    "bridge_loss",
    "bridge_replicates",
    "bridge_samples",
    "check_study",
    "draft_study",
    "open_set_aside",
    "price_content",
    "price_panels",
    "run_content",
    "run_shortlist",
    "run_study",
    "shortlist_content",
    "size_accuracy",
    "size_area",
    "size_comparison",
    "size_detection",
    "size_development",
    "size_learning",
    "size_plates",
    "size_validation",
    "sizing_content",
    "with_costs",
    "write_prices",
    "write_sizing",
]
