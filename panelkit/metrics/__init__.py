"""Arrays in, numbers out."""

from panelkit.metrics.association import (
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)
from panelkit.metrics.calibration import brier, calibration_slope, log_loss
from panelkit.metrics.discrimination import auc, auc_influence
from panelkit.metrics.intervals import (
    CrossValidated,
    corrected_se,
    cross_validated_auc,
    naive_se,
)

__all__ = [
    "CrossValidated",
    "auc",
    "auc_influence",
    "brier",
    "calibration_slope",
    "contingency_table",
    "corrected_se",
    "cramers_v",
    "cramers_v_corrected",
    "cross_validated_auc",
    "log_loss",
    "naive_se",
]
