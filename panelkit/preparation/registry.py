"""The steps that a recipe can name: where a new step is entered."""

from collections.abc import Mapping
from typing import Any, Final

from panelkit.preparation.batch import BatchCentre
from panelkit.preparation.collapse import Collapse
from panelkit.preparation.counts import (
    LogCpm,
    MedianOfRatios,
    TrimmedMean,
    UpperQuartile,
)
from panelkit.preparation.filter import (
    Detection,
    MeasuredAndVarying,
    Prevalence,
    ReplicateReliability,
    Variance,
)
from panelkit.preparation.levels import MedianDifference, Quantile
from panelkit.preparation.missing import (
    BelowLimit,
    HalfMinimum,
    MedianFill,
    Neighbours,
)
from panelkit.preparation.references import ReferenceRatio
from panelkit.preparation.scale import Log2, MValues

__all__ = ["STEP_KINDS"]

STEP_KINDS: Final[Mapping[str, Any]] = {
    kind.name: kind
    for kind in (
        Log2,
        MValues,
        LogCpm,
        MedianOfRatios,
        TrimmedMean,
        UpperQuartile,
        Quantile,
        MedianDifference,
        BatchCentre,
        ReferenceRatio,
        Collapse,
        MeasuredAndVarying,
        Variance,
        Prevalence,
        Detection,
        ReplicateReliability,
        MedianFill,
        HalfMinimum,
        BelowLimit,
        Neighbours,
    )
}
"""Name to kind, each a frozen dataclass of its parameters that keeps `Step`."""
