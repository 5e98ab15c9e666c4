"""Panels, what they cost, and what their accuracy honestly is."""

from panelkit.costing.folds import draw_folds
from panelkit.costing.makers import MAKERS, Evidence, Maker, evidence_of, maker_named
from panelkit.costing.money import format_money, round_money
from panelkit.costing.procedure import (
    Learnt,
    Procedure,
    ProcedureData,
    Selected,
    Split,
)
from panelkit.costing.programme_cost import programme_cost
from panelkit.costing.tuning import choose_within_one_se, within_one_se

__all__ = [
    "MAKERS",
    "Evidence",
    "Learnt",
    "Maker",
    "Procedure",
    "ProcedureData",
    "Selected",
    "Split",
    "choose_within_one_se",
    "draw_folds",
    "evidence_of",
    "format_money",
    "maker_named",
    "programme_cost",
    "round_money",
    "within_one_se",
]
