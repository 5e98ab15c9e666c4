"""What crosses a border between stages: data only, frozen, read-only arrays."""

from panelkit.records.accuracy import (
    Comparator,
    FoldPanels,
    FoldPlan,
    OutOfFold,
    TunedChoice,
)
from panelkit.records.assays import AssayMap
from panelkit.records.cohort import Cohort, Design, DesignKind
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
from panelkit.records.openings import Opening
from panelkit.records.outcome import Outcome, OutcomeKind
from panelkit.records.panel_cost import CostLine, PanelCost
from panelkit.records.paths import PathSet
from panelkit.records.preparation import RecipeContext, RecipeState, StepState
from panelkit.records.prices import (
    ANY_MARKER,
    PRICE_COLUMNS,
    AssayPrice,
    PriceList,
    check_price_columns,
)
from panelkit.records.provenance import RunRecord
from panelkit.records.record import Record, frame, read_only
from panelkit.records.replicates import ReplicateAgreement, Replicates
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
    "AssayMap",
    "AssayPrice",
    "Choice",
    "Cohort",
    "Comparator",
    "CostLine",
    "Design",
    "DesignKind",
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
    "Opening",
    "OutOfFold",
    "Outcome",
    "OutcomeKind",
    "PanelCost",
    "PathSet",
    "PriceList",
    "RecipeContext",
    "RecipeState",
    "Record",
    "ReplicateAgreement",
    "Replicates",
    "RuleChoice",
    "RunRecord",
    "RunSummary",
    "Severity",
    "ShortlistTable",
    "Stability",
    "StandIn",
    "StepState",
    "Subgroup",
    "SubsamplePlan",
    "TunedChoice",
    "check_price_columns",
    "frame",
    "read_only",
]
