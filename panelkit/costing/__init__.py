"""Panels, what they cost, and what their accuracy honestly is."""

from panelkit.costing.added_value import added_value_of, handling_of
from panelkit.costing.attrition import choose_spares, order_count
from panelkit.costing.backup_cover import cheapest_backups
from panelkit.costing.break_even import (
    break_even_hint,
    break_even_price,
    break_even_volume,
    payback_months,
)
from panelkit.costing.choice import choose
from panelkit.costing.comparators import compare, no_better_than_random
from panelkit.costing.comparisons import (
    Comparison,
    FoldWork,
    LearntToo,
    RandomPanels,
    comparisons_for,
)
from panelkit.costing.cover import Cover, CoverKit, cheapest_cover
from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.folds import draw_folds, given_folds
from panelkit.costing.frontier import Judge, build_frontier
from panelkit.costing.honest_accuracy import (
    Draws,
    Everyone,
    HonestAccuracy,
    draw_everything,
    estimate_accuracy,
    tune_on_everyone,
)
from panelkit.costing.learning_curve import learning_curve
from panelkit.costing.makers import (
    MAKERS,
    USING_PRICES,
    Evidence,
    Maker,
    maker_named,
    register_maker,
)
from panelkit.costing.money import format_money, round_money
from panelkit.costing.panel_prices import PanelPricer
from panelkit.costing.pricing import programme_cost
from panelkit.costing.primary import (
    PRIMARY,
    Primary,
    apply_rule,
    choose_for_everyone,
)
from panelkit.costing.procedure import Learnt, Procedure, Selected
from panelkit.costing.roles import RoleLosses, learn_roles
from panelkit.costing.rules import (
    RULES,
    Curve,
    Pick,
    Rule,
    pick,
    within_margin,
    within_one_se,
)
from panelkit.costing.split import cheapest_split
from panelkit.costing.steps import drivers, next_step_down, staircase
from panelkit.costing.subgroups import subgroups_of
from panelkit.costing.tasks import (
    BinaryTask,
    ClassesTask,
    NumberTask,
    SurvivalTask,
    Task,
)
from panelkit.costing.verification import VerificationPlan, development_cost
from panelkit.costing.weaknesses import fragility_of, stand_ins_of

__all__ = [
    "MAKERS",
    "PRIMARY",
    "RULES",
    "USING_PRICES",
    "BinaryTask",
    "ClassesTask",
    "Comparison",
    "Cover",
    "CoverKit",
    "Curve",
    "Draws",
    "Everyone",
    "Evidence",
    "FoldWork",
    "HonestAccuracy",
    "Judge",
    "Learnt",
    "LearntToo",
    "Maker",
    "NumberTask",
    "PanelPricer",
    "Pick",
    "Primary",
    "Procedure",
    "ProcedureData",
    "RandomPanels",
    "RoleLosses",
    "Rule",
    "Selected",
    "Split",
    "SurvivalTask",
    "Task",
    "VerificationPlan",
    "added_value_of",
    "apply_rule",
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
    "compare",
    "comparisons_for",
    "development_cost",
    "draw_everything",
    "draw_folds",
    "drivers",
    "estimate_accuracy",
    "format_money",
    "fragility_of",
    "given_folds",
    "handling_of",
    "learn_roles",
    "learning_curve",
    "maker_named",
    "next_step_down",
    "no_better_than_random",
    "order_count",
    "payback_months",
    "pick",
    "programme_cost",
    "register_maker",
    "round_money",
    "staircase",
    "stand_ins_of",
    "subgroups_of",
    "tune_on_everyone",
    "within_margin",
    "within_one_se",
]
