"""Agreement of repeated measurements against published tables."""

import numpy as np
import pytest

from panelkit.metrics import (
    coefficient_of_variation,
    limits_of_agreement,
    reliability,
)

# Shrout & Fleiss 1979, Psychological Bulletin 86:420, table 2: six targets, four judges
JUDGES = np.array(
    [[9, 2, 5, 8], [6, 1, 3, 2], [8, 4, 6, 8],
     [7, 1, 2, 6], [10, 5, 6, 9], [6, 2, 4, 7]],
    dtype=float,
)  # fmt: skip

# Bland & Altman 1986, Lancet 327:307, table 1: peak flow (l/min) of 17 people, twice by
# a large and twice by a mini meter
LARGE = [
    [494, 395, 516, 434, 476, 557, 413, 442, 650,
     433, 417, 656, 267, 478, 178, 423, 427],
    [490, 397, 512, 401, 470, 611, 415, 431, 638,
     429, 420, 633, 275, 492, 165, 372, 421],
]  # fmt: skip
MINI = [
    [512, 430, 520, 428, 500, 600, 364, 380, 658,
     445, 432, 626, 260, 477, 259, 350, 451],
    [525, 415, 508, 444, 500, 625, 460, 390, 642,
     432, 420, 605, 227, 467, 268, 370, 443],
]  # fmt: skip
TWO_SD = 0.954499736  # the paper's limits are two standard deviations either side


def twice(first, second):
    values = np.column_stack([first, second]).astype(float).reshape(1, -1)
    return reliability(values, np.repeat(np.arange(len(first)), 2))


def test_six_targets_and_four_judges():
    """Table 4 of the paper: mean squares 11.24 and 6.26, ICC(1,1) .17."""
    found = reliability(JUDGES.reshape(1, -1), np.repeat(np.arange(6), 4))
    assert found.between[0] == pytest.approx(11.24, abs=0.005)
    assert found.within[0] == pytest.approx(6.26, abs=0.005)
    assert found.icc[0] == pytest.approx(0.17, abs=0.005)
    assert (found.n_sets[0], found.n_measurements[0]) == (6, 24)


def test_peak_flow_within_subject_deviations():
    """The paper's 15.3 l/min for the large and 19.9 for the mini meter."""
    assert twice(*LARGE).within_sd[0] == pytest.approx(15.3, abs=0.05)
    assert twice(*MINI).within_sd[0] == pytest.approx(19.9, abs=0.05)


def test_peak_flow_limits_of_agreement():
    """The paper: mean difference -2.1, SD 38.8, limits -79.7 and 75.5 l/min."""
    limits = limits_of_agreement(np.array([LARGE[0]]), np.array([MINI[0]]), TWO_SD)
    assert limits.difference[0] == pytest.approx(-2.1, abs=0.05)
    assert limits.sd[0] == pytest.approx(38.8, abs=0.05)
    # the paper computes its limits from the rounded mean and deviation
    assert limits.low[0] == pytest.approx(-79.7, abs=0.1)
    assert limits.high[0] == pytest.approx(75.5, abs=0.1)


def test_repeatability_of_pairs_is_that_of_their_differences():
    """Within-subject SD times root 2 = root mean squared difference, by definition."""
    differences = np.subtract(*LARGE)
    expected = np.sqrt(np.mean(differences**2) / 2)
    assert twice(*LARGE).within_sd[0] == pytest.approx(expected)


def test_icc_recovers_the_share_it_was_drawn_with():
    draws = np.random.default_rng(0)
    level = draws.normal(0, 2, (400, 60, 1))
    values = (level + draws.normal(0, 1, (400, 60, 3))).reshape(400, -1)
    sets = np.repeat(np.arange(60), 3)
    assert np.mean(reliability(values, sets).icc) == pytest.approx(0.8, abs=0.01)
    values[draws.random(values.shape) < 0.2] = np.nan
    assert np.mean(reliability(values, sets).icc) == pytest.approx(0.8, abs=0.015)
    noise = reliability(draws.normal(size=(400, 180)), sets)
    assert np.mean(noise.icc) == pytest.approx(0.0, abs=0.01)


def test_a_gap_is_the_same_as_no_measurement():
    values = JUDGES.reshape(1, -1)
    sets = np.repeat(np.arange(6), 4)
    gaps = values.copy()
    gaps[0, [3, 10]] = np.nan
    kept = np.isfinite(gaps[0])
    left_out = reliability(values[:, kept], sets[kept])
    assert reliability(gaps, sets).icc[0] == pytest.approx(left_out.icc[0], abs=1e-12)


def test_without_degrees_of_freedom_nothing_is_said():
    one_each = reliability(np.array([[1.0, 2.0, 3.0]]), np.arange(3))
    assert np.isnan(one_each.within[0])
    assert np.isnan(one_each.icc[0])
    one_set = reliability(np.array([[1.0, 2.0]]), np.array([0, 0]))
    assert np.isnan(one_set.icc[0])
    assert one_set.within_sd[0] == pytest.approx(np.sqrt(0.5))
    limits = limits_of_agreement(np.array([[1.0]]), np.array([[2.0]]), 0.95)
    assert np.isnan(limits.low[0])


def test_coefficient_of_variation_of_logarithms():
    """Handbook identity sd(ln x) = sqrt(ln(1 + c^2)) of the log-normal, both ways."""
    cv = np.array([0.05, 0.1, 0.2, 0.5])
    in_log2 = np.sqrt(np.log1p(cv**2)) / np.log(2.0)
    # 10 %: 0.1439107709; 50 %: 0.6815013324 (worked by hand from the identity)
    assert in_log2[[1, 3]] == pytest.approx([0.1439107709, 0.6815013324], abs=1e-10)
    found = coefficient_of_variation(in_log2, np.zeros(4), in_log2=True)
    assert found == pytest.approx(cv, abs=1e-12)


def test_coefficient_of_variation_needs_a_positive_mean():
    found = coefficient_of_variation(
        np.array([1.0, 1.0]), np.array([4.0, -4.0]), in_log2=False
    )
    assert found[0] == 0.25
    assert np.isnan(found[1])
