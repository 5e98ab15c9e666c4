"""Panels, what they cost, and what their accuracy honestly is."""

from panelkit.costing.choice import choose
from panelkit.costing.comparators import compare
from panelkit.costing.folds import draw_folds, given_folds
from panelkit.costing.frontier import Judge, build_frontier
from panelkit.costing.honest_accuracy import (
    Draws,
    HonestAccuracy,
    choose_for_everyone,
    draw_everything,
    estimate_accuracy,
)
from panelkit.costing.makers import MAKERS, Evidence, Maker, evidence_of, maker_named
from panelkit.costing.money import format_money, round_money
from panelkit.costing.panel_prices import PanelPricer
from panelkit.costing.pricing import programme_cost
from panelkit.costing.procedure import (
    Learnt,
    Procedure,
    ProcedureData,
    Selected,
    Split,
)
from panelkit.costing.tuning import choose_within_one_se, within_one_se

__all__ = [
    "MAKERS",
    "Draws",
    "Evidence",
    "HonestAccuracy",
    "Judge",
    "Learnt",
    "Maker",
    "PanelPricer",
    "Procedure",
    "ProcedureData",
    "Selected",
    "Split",
    "build_frontier",
    "choose",
    "choose_for_everyone",
    "choose_within_one_se",
    "compare",
    "draw_everything",
    "draw_folds",
    "estimate_accuracy",
    "evidence_of",
    "format_money",
    "given_folds",
    "maker_named",
    "programme_cost",
    "round_money",
    "within_one_se",
]
