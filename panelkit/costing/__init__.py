"""Panels, what they cost, and what their accuracy honestly is."""

from panelkit.costing.attrition import choose_spares, order_count
from panelkit.costing.backup_cover import cheapest_backups
from panelkit.costing.break_even import (
    break_even_hint,
    break_even_price,
    break_even_volume,
    payback_months,
)
from panelkit.costing.choice import choose
from panelkit.costing.comparators import compare
from panelkit.costing.cover import Cover, CoverKit, cheapest_cover
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
from panelkit.costing.split import cheapest_split
from panelkit.costing.steps import drivers, next_step_down, staircase
from panelkit.costing.tuning import choose_within_one_se, within_one_se
from panelkit.costing.verification import VerificationPlan, development_cost

__all__ = [
    "MAKERS",
    "Cover",
    "CoverKit",
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
    "VerificationPlan",
    "break_even_hint",
    "break_even_price",
    "break_even_volume",
    "build_frontier",
    "cheapest_backups",
    "cheapest_cover",
    "cheapest_split",
    "choose",
    "choose_for_everyone",
    "choose_spares",
    "choose_within_one_se",
    "compare",
    "development_cost",
    "draw_everything",
    "draw_folds",
    "drivers",
    "estimate_accuracy",
    "evidence_of",
    "format_money",
    "given_folds",
    "maker_named",
    "next_step_down",
    "order_count",
    "payback_months",
    "programme_cost",
    "round_money",
    "staircase",
    "within_one_se",
]
