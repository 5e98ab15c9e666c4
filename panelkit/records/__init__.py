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
from panelkit.records.conflicts import (
    CONFLICT_COLUMNS,
    NO_CONFLICTS,
    Conflict,
    Conflicts,
)
from panelkit.records.cost_answers import (
    BreakEven,
    Crossing,
    Driver,
    PriceQuestion,
    Spares,
    SplitCost,
    Stair,
    StepDown,
)
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
from panelkit.records.locked import (
    AssayStep,
    CutOff,
    Fallback,
    HonestFigures,
    PanelContent,
    PanelMarker,
    PanelReference,
    Parent,
    TrainingRows,
)
from panelkit.records.matrix import MatrixSource
from panelkit.records.openings import Opening
from panelkit.records.outcome import Outcome, OutcomeKind
from panelkit.records.panel_cost import LINE_WORDS, CostLine, KitPurchase, PanelCost
from panelkit.records.paths import PathSet
from panelkit.records.preparation import RecipeContext, RecipeState, StepState
from panelkit.records.price_answer import (
    Assumption,
    CostSheet,
    PriceAnswer,
    ScenarioAnswer,
    SheetAssay,
    Variation,
)
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
from panelkit.records.shortlist_results import ShortlistResults
from panelkit.records.sizing import SizingAnswer, SizingCurve, SizingSeries, SizingTable
from panelkit.records.stability import (
    ErrorBound,
    ShortlistTable,
    Stability,
    SubsamplePlan,
)
from panelkit.records.stability_details import (
    Agreement,
    Companions,
    Convergence,
    NullShortlist,
    PathFrequencies,
    SelectorResult,
)
from panelkit.records.summary import RESEARCH_USE, CostOfFolds, RunSummary
from panelkit.records.validation import (
    MarkerShift,
    Validation,
    ValidationFigure,
    Verdict,
)

__all__ = [
    "ANY_MARKER",
    "CONFLICT_COLUMNS",
    "LINE_WORDS",
    "NO_CONFLICTS",
    "PRICE_COLUMNS",
    "RESEARCH_USE",
    "AddedValue",
    "Aftermath",
    "Agreement",
    "AssayMap",
    "AssayPrice",
    "AssayStep",
    "Assumption",
    "BreakEven",
    "Choice",
    "Cohort",
    "Companions",
    "Comparator",
    "Conflict",
    "Conflicts",
    "Convergence",
    "CostLine",
    "CostOfFolds",
    "CostSheet",
    "Crossing",
    "CutOff",
    "Design",
    "DesignKind",
    "Driver",
    "Dropped",
    "ErrorBound",
    "Fallback",
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
    "HonestFigures",
    "KitPurchase",
    "LearningPoint",
    "MarkerShift",
    "MatrixSource",
    "NullShortlist",
    "Opening",
    "OutOfFold",
    "Outcome",
    "OutcomeKind",
    "PanelContent",
    "PanelCost",
    "PanelMarker",
    "PanelReference",
    "Parent",
    "PathFrequencies",
    "PathSet",
    "PriceAnswer",
    "PriceList",
    "PriceQuestion",
    "RecipeContext",
    "RecipeState",
    "Record",
    "ReplicateAgreement",
    "Replicates",
    "RuleChoice",
    "RunRecord",
    "RunSummary",
    "ScenarioAnswer",
    "SelectorResult",
    "Severity",
    "SheetAssay",
    "ShortlistResults",
    "ShortlistTable",
    "SizingAnswer",
    "SizingCurve",
    "SizingSeries",
    "SizingTable",
    "Spares",
    "SplitCost",
    "Stability",
    "Stair",
    "StandIn",
    "StepDown",
    "StepState",
    "Subgroup",
    "SubsamplePlan",
    "TrainingRows",
    "TunedChoice",
    "Validation",
    "ValidationFigure",
    "Variation",
    "Verdict",
    "check_price_columns",
    "frame",
    "read_only",
]
