"""The order of the stages."""

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

__all__ = [
    "PriceRequest",
    "PriceSource",
    "Run",
    "ShortlistRun",
    "check_study",
    "draft_study",
    "open_set_aside",
    "price_content",
    "price_panels",
    "run_content",
    "run_shortlist",
    "run_study",
    "shortlist_content",
    "write_prices",
]
