"""Arrays in, numbers out."""

from panelkit.metrics.agreement import (
    Recalibration,
    calibration_in_the_large,
    observed_over_expected,
    recalibration,
    scaled_brier,
    spiegelhalter_z,
)
from panelkit.metrics.assay_noise import cv_from_log2_sd, log2_sd_from_cv
from panelkit.metrics.association import (
    contingency_table,
    cramers_v,
    cramers_v_corrected,
)
from panelkit.metrics.auc_variance import binormal_auc_variance, normal_scores_auc_se
from panelkit.metrics.calibration import brier, calibration_slope, log_loss
from panelkit.metrics.cross_validated import Measure, cross_validate
from panelkit.metrics.delong import Areas, area_interval, delong, hanley_mcneil_se
from panelkit.metrics.discrimination import areas, auc, auc_placements
from panelkit.metrics.intervals import (
    CrossValidated,
    corrected_se,
    cross_validated_auc,
    naive_se,
    paired_interval,
)
from panelkit.metrics.numeric import linear_slope, r_squared, root_mean_square
from panelkit.metrics.proportions import (
    LikelihoodRatio,
    clopper_pearson,
    likelihood_ratios,
    lower_limit,
    mcnemar_exact,
    needed_without_a_miss,
    predictive_values,
    wilson,
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
from panelkit.metrics.several_classes import (
    class_areas,
    hand_till,
    log_loss_of_classes,
    softmax,
)
from panelkit.metrics.survival import (
    censoring_curve,
    concordance,
    horizon_auc,
    horizon_brier,
    uno_concordance,
)
from panelkit.metrics.utility import balanced_accuracy, best_threshold, net_benefit

__all__ = [
    "Areas",
    "CrossValidated",
    "LikelihoodRatio",
    "LimitsOfAgreement",
    "Measure",
    "Recalibration",
    "Reliability",
    "area_interval",
    "areas",
    "auc",
    "auc_placements",
    "auc_score_interval",
    "balanced_accuracy",
    "best_threshold",
    "binormal_auc_variance",
    "brier",
    "calibration_in_the_large",
    "calibration_slope",
    "censoring_curve",
    "class_areas",
    "clopper_pearson",
    "coefficient_of_variation",
    "concordance",
    "contingency_table",
    "corrected_se",
    "cramers_v",
    "cramers_v_corrected",
    "cross_validate",
    "cross_validated_auc",
    "cv_from_log2_sd",
    "delong",
    "false_discovery_adjusted",
    "fisher_exact_many",
    "hand_till",
    "hanley_mcneil_se",
    "holm_adjusted",
    "horizon_auc",
    "horizon_brier",
    "likelihood_ratios",
    "limits_of_agreement",
    "linear_slope",
    "log2_sd_from_cv",
    "log_loss",
    "log_loss_of_classes",
    "lower_limit",
    "mcnemar_exact",
    "naive_se",
    "needed_without_a_miss",
    "net_benefit",
    "normal_scores_auc_se",
    "observed_over_expected",
    "paired_interval",
    "predictive_values",
    "r_squared",
    "rank_sum_p",
    "recalibration",
    "reliability",
    "root_mean_square",
    "scaled_brier",
    "softmax",
    "spiegelhalter_z",
    "uno_concordance",
    "wilson",
]
