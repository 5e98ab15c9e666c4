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
from panelkit.workflow.lock import lock_panel
from panelkit.workflow.locked_panel import LockedPanel, ScoredTable, score_table
from panelkit.workflow.new_people import SheetColumns
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
from panelkit.workflow.validate import (
    recalibrate_panel,
    validate_panel,
    validation_content,
)

__all__ = [
    "LockedPanel",
    "PanelSource",
    "PriceRequest",
    "PriceSource",
    "Run",
    "ScoredTable",
    "SheetColumns",
    "ShortlistRun",
    "bridge_choice",
    "bridge_limits",
    "bridge_loss",
    "bridge_replicates",
    "bridge_samples",
    "check_study",
    "draft_study",
    "lock_panel",
    "open_set_aside",
    "price_content",
    "price_panels",
    "recalibrate_panel",
    "run_content",
    "run_shortlist",
    "run_study",
    "score_table",
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
    "validate_panel",
    "validation_content",
    "with_costs",
    "write_prices",
    "write_sizing",
]
