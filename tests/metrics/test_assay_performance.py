"""Analytical performance against worked figures, and against other programs.

Figures of EX16 and EX19 are those of the panelkit cost model, sections 4 and 5; the
formulas of published guidelines that they follow are named at the functions.
"""

import math

import numpy as np
import pytest
from scipy import stats

from panelkit.errors import UsageError
from panelkit.metrics import hanley_mcneil_se
from panelkit.metrics.assay_noise import (
    cq_ratio,
    cv_from_cq_sd,
    delta_cq_sd,
    efficiency_from_slope,
    excess_log2_sd,
    log2_sd_from_cv,
    slope_from_efficiency,
)
from panelkit.metrics.detection import (
    copies_for_detection,
    digital_copies,
    limit_of_blank,
    limit_of_blank_by_rank,
    limit_of_detection,
    limit_of_quantitation,
    percentile_multiplier,
    pooled_sd,
)
from panelkit.metrics.precision_designs import (
    biological_goals,
    nested_precision,
    one_way_precision,
    reference_change_value,
    sigma_metric,
    total_error,
    two_level_precision,
    upper_verification_limit,
    within_laboratory_df,
)
from panelkit.metrics.study_size import (
    auc_difference_se,
    group_size_for_half_width,
    group_size_not_worse,
    positives_for_share,
    sd_upper_factor,
    size_without_failure,
)

DAYS = [
    [98, 101, 99, 102, 100],
    [103, 105, 102, 104, 106],
    [97, 99, 98, 96, 100],
    [101, 100, 103, 102, 99],
    [104, 102, 101, 105, 103],
]


def test_limits_of_blank_and_detection():
    # EX16
    assert round(percentile_multiplier(60, 4), 4) == 1.6522
    assert round(percentile_multiplier(60, 4, 1.645), 4) == 1.6524
    blank = limit_of_blank(0.80, 0.30, 60, 4)
    assert round(blank, 4) == 1.2957
    pooled = pooled_sd([0.35, 0.40, 0.38, 0.42], [15] * 4)
    assert round(pooled, 4) == 0.3884
    assert round(limit_of_detection(blank, pooled, 60, 4), 4) == 1.9373
    assert round(limit_of_quantitation(0.20, 0.08, 0.50), 4) == 2.7277
    assert limit_of_quantitation(0.20, 0.25, 0.50) == math.inf


def test_limit_of_blank_by_rank():
    # EX16: of 60 results the mean of the 57th and 58th
    values = np.random.default_rng(1).permutation(np.arange(1.0, 61.0))
    assert limit_of_blank_by_rank(values.tolist()) == 57.5
    with pytest.raises(UsageError) as caught:
        limit_of_blank_by_rank([1.0] * 9)
    assert caught.value.code == "blanks-too-few"


def test_nested_precision():
    # EX16
    found = nested_precision(14, 8, 4)
    components = (found.error_variance, found.run_variance, found.day_variance)
    assert components == (4, 2, 1.5)
    assert round(found.repeatability_sd, 4) == 2.0
    assert round(found.within_laboratory_sd, 4) == 2.7386
    assert nested_precision(1, 2, 4).run_variance == 0  # no negative variance


def test_one_way_precision_and_its_limits():
    # EX16; mean squares against scipy's analysis of variance
    found = one_way_precision(DAYS)
    assert found.mean == pytest.approx(101.2)
    assert found.error_variance == pytest.approx(2.5)
    assert found.day_variance == pytest.approx(5.2)
    assert round(found.repeatability_sd, 4) == 1.5811
    assert round(found.within_laboratory_sd, 4) == 2.7749
    ratio = stats.f_oneway(*DAYS).statistic
    assert (5 * found.day_variance + 2.5) / 2.5 == pytest.approx(ratio)
    df = within_laboratory_df(1.5, 2.0, 5, 5)
    assert round(df, 2) == 11.66
    assert round(within_laboratory_df(1.0, 1.0, 5, 5), 1) == 23.8
    assert round(upper_verification_limit(1.5, 20), 4) == 1.8798
    limit = upper_verification_limit(2.0, df)
    assert round(limit, 4) == 2.6563
    assert found.repeatability_sd < 1.8798
    assert found.within_laboratory_sd > limit


def test_two_level_precision_finds_what_was_put_in():
    # Mean squares by hand through cell means; then what a large experiment shows
    random = np.random.default_rng(7)
    days, runs, replicates = 4000, 2, 2
    values = (
        100
        + 1.5 * random.standard_normal((days, 1, 1))
        + 1.0 * random.standard_normal((days, runs, 1))
        + 2.0 * random.standard_normal((days, runs, replicates))
    )
    found = two_level_precision(values)
    assert found.day_variance == pytest.approx(2.25, rel=0.1)
    assert found.run_variance == pytest.approx(1.0, rel=0.15)
    assert found.error_variance == pytest.approx(4.0, rel=0.05)
    assert found.mean == pytest.approx(100, abs=0.2)
    for wrong in (DAYS, [[[1.0, 2.0]]], [[[1.0, math.nan], [1.0, 2.0]]] * 2):
        with pytest.raises(UsageError) as caught:
            two_level_precision(wrong)
        assert caught.value.code == "design-unbalanced"


def test_efficiency_and_noise_of_cq():
    # EX16
    slopes = [round(slope_from_efficiency(e), 3) for e in (0.9, 1.0, 1.1)]
    assert slopes == [-3.587, -3.322, -3.103]
    assert round(efficiency_from_slope(-3.45), 4) == 0.9492
    assert [round(100 * cv_from_cq_sd(s), 2) for s in (0.10, 0.25, 0.50)] == [
        6.94, 17.46, 35.72,
    ]  # fmt: skip
    sds = [round(delta_cq_sd(0.20, 0.15, 0.20, n, 2), 4) for n in range(1, 6)]
    assert sds == [0.2669, 0.2136, 0.1926, 0.1811, 0.1739]
    with pytest.raises(UsageError) as caught:
        efficiency_from_slope(3.3)
    assert caught.value.code == "slope-not-falling"


def test_ratio_to_a_calibrator():
    # EX16
    references = [(20.0, 20.4), (21.5, 21.6), (19.1, 19.3)]
    plain = cq_ratio((24.10, 26.30), references)
    assert round(plain, 4) == 3.9086
    assert round(-math.log2(plain), 4) == -1.9667
    corrected = cq_ratio((24.10, 26.30), references, 0.95, [1.00, 0.98, 0.93])
    assert round(corrected, 4) == 3.7069


def test_log2_noise_is_that_of_a_log_normal():
    # the CV of a log-normal quantity, by simulation
    sd = log2_sd_from_cv(0.30)
    assert round(sd, 4) == 0.4235
    draws = 2 ** (sd * np.random.default_rng(5).standard_normal(400_000))
    assert draws.std() / draws.mean() == pytest.approx(0.30, rel=0.02)
    assert log2_sd_from_cv(0.30, 4) == pytest.approx(sd / 2)
    assert excess_log2_sd(0.5, 0.3) == pytest.approx(0.4)
    assert excess_log2_sd(0.3, 0.5) == 0


def test_digital_pcr():
    # EX16
    assert round(copies_for_detection(0.95), 2) == 3.00
    found = digital_copies(4000, 20_000, 0.85)
    assert round(found.copies_per_partition, 5) == 0.22314
    assert round(found.per_microlitre, 2) == 262.52
    assert round(100 * found.relative_se, 3) == 1.584
    for positive in (0, 20_000):
        with pytest.raises(UsageError) as caught:
            digital_copies(positive, 20_000, 0.85)
        assert caught.value.code == "partitions-alike"


def test_total_error_and_goals():
    # EX16
    assert total_error(-3, 4) == pytest.approx(9.6)
    assert sigma_metric(3, 4, 15) == 3.0
    goals = biological_goals(12, 25)
    assert (goals.cv, round(goals.bias, 2), round(goals.total_error, 2)) == (
        6.0, 6.93, 16.83,
    )  # fmt: skip
    assert round(reference_change_value(6, 12), 2) == 37.19


def test_sizes_of_verification_studies():
    # EX19
    assert round(hanley_mcneil_se(0.85, 100, 100), 5) == 0.02752
    assert group_size_for_half_width(0.85, 0.05) == 117
    sizes = [
        group_size_not_worse(0.85, 0.86, 0.03, r) for r in (0, 0.5, 0.8, 0.9, 0.95)
    ]
    assert sizes == [2253, 1128, 452, 227, 115]
    equal = [group_size_not_worse(0.86, 0.86, 0.03, r) for r in (0.8, 0.9)]
    assert equal == [195, 98]
    assert positives_for_share(0.85, 0.05) == 196
    assert (size_without_failure(0.95), size_without_failure(0.90)) == (59, 29)
    factors = [round(sd_upper_factor(df), 4) for df in (4, 9, 20, 40)]
    assert factors == [2.3724, 1.6452, 1.3576, 1.2284]
    assert auc_difference_se(0.03, 0.04, 0.0) == pytest.approx(0.05)


def test_designs_without_repeats_are_refused():
    with pytest.raises(UsageError) as caught:
        percentile_multiplier(4, 4)
    assert caught.value.code == "replicates-missing"
