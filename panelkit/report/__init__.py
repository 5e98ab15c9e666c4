"""The report of a run: one page, its figures and the numbers behind them."""

from panelkit.report.page import render
from panelkit.report.shortlist_pictures import render_shortlist

__all__ = ["render", "render_shortlist"]
