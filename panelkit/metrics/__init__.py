"""Arrays in, numbers out."""

from panelkit.metrics.assay_noise import cv_from_log2_sd, log2_sd_from_cv
from panelkit.metrics.association import (
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)
from panelkit.metrics.auc_variance import (
    binormal_auc_variance,
    normal_scores_auc_se,
)
from panelkit.metrics.calibration import brier, calibration_slope, log_loss
from panelkit.metrics.cross_validated import Measure, cross_validate
from panelkit.metrics.discrimination import areas, auc, auc_placements
from panelkit.metrics.intervals import (
    CrossValidated,
    corrected_se,
    cross_validated_auc,
    naive_se,
    paired_interval,
)
from panelkit.metrics.numeric import linear_slope, r_squared, root_mean_square
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
from panelkit.metrics.several_classes import (
    class_areas,
    hand_till,
    log_loss_of_classes,
    softmax,
)
from panelkit.metrics.study_size import auc_standard_error
from panelkit.metrics.survival import (
    censoring_curve,
    concordance,
    horizon_auc,
    horizon_brier,
    uno_concordance,
)
from panelkit.metrics.utility import balanced_accuracy, best_threshold, net_benefit

__all__ = [
    "CrossValidated",
    "LimitsOfAgreement",
    "Measure",
    "Reliability",
    "areas",
    "auc",
    "auc_placements",
    "auc_score_interval",
    "auc_standard_error",
    "balanced_accuracy",
    "best_threshold",
    "binormal_auc_variance",
    "brier",
    "calibration_slope",
    "censoring_curve",
    "class_areas",
    "coefficient_of_variation",
    "concordance",
    "contingency_table",
    "corrected_se",
    "cramers_v",
    "cramers_v_corrected",
    "cross_validate",
    "cross_validated_auc",
    "cv_from_log2_sd",
    "false_discovery_adjusted",
    "fisher_exact_many",
    "hand_till",
    "holm_adjusted",
    "horizon_auc",
    "horizon_brier",
    "limits_of_agreement",
    "linear_slope",
    "log2_sd_from_cv",
    "log_loss",
    "log_loss_of_classes",
    "naive_se",
    "net_benefit",
    "normal_scores_auc_se",
    "paired_interval",
    "r_squared",
    "rank_sum_p",
    "reliability",
    "root_mean_square",
    "softmax",
    "uno_concordance",
]
