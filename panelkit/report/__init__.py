"""The report of a run: one page, its figures and the numbers behind them."""

from panelkit.report.page import render

__all__ = ["render"]
