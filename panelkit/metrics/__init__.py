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
from panelkit.metrics.rank_tests import (
    auc_score_interval,
    false_discovery_adjusted,
    fisher_exact_many,
    holm_adjusted,
    rank_sum_p,
)
from panelkit.metrics.reliability import (
    LimitsOfAgreement,
    Reliability,
    coefficient_of_variation,
    limits_of_agreement,
    reliability,
)

__all__ = [
    "CrossValidated",
    "LimitsOfAgreement",
    "Reliability",
    "auc",
    "auc_placements",
    "auc_score_interval",
    "brier",
    "calibration_slope",
    "coefficient_of_variation",
    "contingency_table",
    "corrected_se",
    "cramers_v",
    "cramers_v_corrected",
    "cross_validated_auc",
    "false_discovery_adjusted",
    "fisher_exact_many",
    "holm_adjusted",
    "limits_of_agreement",
    "log_loss",
    "naive_se",
    "paired_interval",
    "rank_sum_p",
    "reliability",
]
