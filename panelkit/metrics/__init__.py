"""Arrays in, numbers out."""

from panelkit.metrics.association import (
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)
from panelkit.metrics.calibration import brier, calibration_slope, log_loss
from panelkit.metrics.discrimination import auc, auc_placements
from panelkit.metrics.intervals import (
    CrossValidated,
    corrected_se,
    cross_validated_auc,
    naive_se,
    paired_interval,
)

__all__ = [
    "CrossValidated",
    "auc",
    "auc_placements",
    "brier",
    "calibration_slope",
    "contingency_table",
    "corrected_se",
    "cramers_v",
    "cramers_v_corrected",
    "cross_validated_auc",
    "log_loss",
    "naive_se",
    "paired_interval",
]
