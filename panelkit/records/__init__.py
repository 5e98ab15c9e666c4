"""What crosses a border between stages: data only, frozen, read-only arrays."""

from panelkit.records.accuracy import (
    Comparator,
    FoldPanels,
    FoldPlan,
    OutOfFold,
    TunedChoice,
)
from panelkit.records.cohort import Cohort, Design, Outcome
from panelkit.records.findings import Dropped, Finding, Findings, Flow, Severity
from panelkit.records.fragility import (
    AddedValue,
    Aftermath,
    Fragility,
    Handling,
    LearningPoint,
    StandIn,
    Subgroup,
)
from panelkit.records.frontier import (
    Choice,
    Frontier,
    FrontierRow,
    Headline,
    RuleChoice,
)
from panelkit.records.matrix import MatrixSource
from panelkit.records.panel_cost import CostLine, PanelCost
from panelkit.records.paths import PathSet
from panelkit.records.preparation import RecipeState
from panelkit.records.prices import (
    ANY_MARKER,
    PRICE_COLUMNS,
    AssayPrice,
    PriceList,
    check_price_columns,
)
from panelkit.records.provenance import RunRecord
from panelkit.records.record import Record, frame, read_only
from panelkit.records.stability import (
    ErrorBound,
    ShortlistTable,
    Stability,
    SubsamplePlan,
)
from panelkit.records.summary import RESEARCH_USE, RunSummary

__all__ = [
    "ANY_MARKER",
    "PRICE_COLUMNS",
    "RESEARCH_USE",
    "AddedValue",
    "Aftermath",
    "AssayPrice",
    "Choice",
    "Cohort",
    "Comparator",
    "CostLine",
    "Design",
    "Dropped",
    "ErrorBound",
    "Finding",
    "Findings",
    "Flow",
    "FoldPanels",
    "FoldPlan",
    "Fragility",
    "Frontier",
    "FrontierRow",
    "Handling",
    "Headline",
    "LearningPoint",
    "MatrixSource",
    "OutOfFold",
    "Outcome",
    "PanelCost",
    "PathSet",
    "PriceList",
    "RecipeState",
    "Record",
    "RuleChoice",
    "RunRecord",
    "RunSummary",
    "Severity",
    "ShortlistTable",
    "Stability",
    "StandIn",
    "Subgroup",
    "SubsamplePlan",
    "TunedChoice",
    "check_price_columns",
    "frame",
    "read_only",
]
