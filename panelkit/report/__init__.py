"""The report of a run: one page, its figures and the numbers behind them."""

from panelkit.report.page import render
from panelkit.report.price_pictures import draw_prices
from panelkit.report.price_workbook import price_workbook
from panelkit.report.shortlist_pictures import render_shortlist
from panelkit.report.sizing_pictures import draw_sizing, sizing_tables

__all__ = [
    "draw_prices",
    "draw_sizing",
    "price_workbook",
    "render",
    "render_shortlist",
    "sizing_tables",
]
