"""Normalisation of counts against published formulas and another library.

Twelve features in four samples (counts typed in below). Where a value is not said to
come from another source it was worked out from the published formula by hand and from
memory of it; rnanorm 2.2.0 is a general library of count normalisations.
"""

import numpy as np
import pytest
from scipy.stats import rankdata

from panelkit.errors import InputDataError
from panelkit.preparation import Recipe
from panelkit.preparation.counts import (
    LogCpm,
    MedianOfRatios,
    TrimmedMean,
    UpperQuartile,
    _trimmed,
    library_sizes,
    upper_quantiles,
)

COUNTS = [
    (10, 12, 20, 8),
    (100, 90, 210, 70),
    (55, 60, 100, 50),
    (0, 3, 1, 0),
    (400, 420, 900, 350),
    (30, 25, 300, 20),
    (250, 260, 480, 240),
    (80, 75, 170, 60),
    (15, 18, 25, 14),
    (60, 70, 110, 0),
    (500, 450, 1000, 420),
    (5, 9, 12, 4),
]
NEW = (20, 150, 110, 2, 800, 60, 520, 140, 30, 120, 900, 10)
EVERYONE = np.arange(4)


@pytest.fixture
def counts(values_of):
    return values_of(COUNTS)


def prepared(step, values, context, rows=EVERYONE):
    learnt = step.learn(values, rows, context)
    return step.apply(values, learnt, context).matrix.astype(np.float64)


def test_library_sizes(counts):
    assert library_sizes(counts, EVERYONE).tolist() == [1505, 1492, 3328, 1236]


def test_log_counts_per_million_with_a_prior_in_proportion(counts, nothing):
    """Prior 2; zeros of the fourth feature become equal in samples 0 and 3."""
    found = prepared(LogCpm(2.0), counts, nothing)
    expected = [12.9080762357, 13.1487527773, 12.7839705955, 12.8754904056]
    assert found[0] == pytest.approx(expected, rel=1e-7)  # the matrix is float32
    assert found[3, [0, 3]] == pytest.approx([10.0441575368] * 2, rel=1e-7)
    assert found[3, 0] == found[3, 3]


def test_the_prior_is_scaled_by_the_training_mean(counts, nothing):
    """Learnt on two samples, a third is sized by their mean of 1498.5."""
    found = prepared(LogCpm(2.0), counts, nothing, np.array([0, 1]))
    prior = 2.0 * 3328 / 1498.5
    expected = np.log2((20 + prior) / (3328 + 2 * prior) * 1e6)
    assert found[0, 2] == pytest.approx(expected, rel=1e-7)


def test_medians_of_ratios(counts, nothing):
    """Anders & Huber 2010: ten features have no zero."""
    step = MedianOfRatios()
    learnt = step.learn(counts, EVERYONE, nothing)
    assert learnt["used"].sum() == 10
    sizes = [0.8526942287, 0.8797672729, 1.7819155185, 0.7046745921]
    assert step.sizes(counts, EVERYONE, learnt) == pytest.approx(sizes, abs=1e-9)


def test_medians_of_ratios_of_a_new_sample_against_frozen_means(
    counts, values_of, nothing
):
    learnt = MedianOfRatios().learn(counts, EVERYONE, nothing)
    new = values_of([[count] for count in NEW])
    size = MedianOfRatios().sizes(new, np.array([0]), learnt)
    assert size == pytest.approx([1.6456022450], abs=1e-9)
    done = MedianOfRatios(0.5).apply(new, learnt, nothing).matrix[0, 0]
    assert done == pytest.approx(np.log2(20 / 1.6456022450 + 0.5), rel=1e-6)


def test_medians_of_ratios_need_a_feature_without_zeros(values_of, nothing):
    holes = values_of([[0, 3], [4, 0]])
    with pytest.raises(InputDataError) as caught:
        MedianOfRatios().learn(holes, np.arange(2), nothing)
    assert caught.value.code == "no-feature-without-zero"


def test_upper_quartiles(counts, nothing):
    """Bullard et al. 2010; the factors as rnanorm 2.2.0 scales them to product 1."""
    step = UpperQuartile()
    learnt = step.learn(counts, EVERYONE, nothing)
    height = upper_quantiles(counts, EVERYONE, learnt["used"], 0.75)
    assert height.tolist() == [137.5, 132.5, 345, 112.5]
    factor = height / library_sizes(counts, EVERYONE)
    factor /= np.exp(np.log(factor).mean())
    expected = [0.9767207801, 0.9494044970, 1.1082557847, 0.9730569996]
    assert factor == pytest.approx(expected, abs=1e-9)
    sizes = step.sizes(counts, EVERYONE, learnt)
    effective = factor * library_sizes(counts, EVERYONE)
    assert sizes == pytest.approx(effective / effective.mean(), rel=1e-12)


def test_trimmed_means_of_m_values(counts, nothing):
    """Robinson & Oshlack 2010; scaled to product 1 as in rnanorm 2.2.0."""
    step = TrimmedMean()
    learnt = step.learn(counts, EVERYONE, nothing)
    assert learnt["reference"].tolist() == [row[0] for row in COUNTS]  # sample 0
    factor = step.factors(counts, EVERYONE, learnt)
    expected = [1.0018549303, 1.0583703216, 0.9050705093, 1.0420176927]
    assert factor == pytest.approx(expected, abs=1e-9)
    raw = factor * learnt["constant"][0]
    assert raw == pytest.approx([1, 1.0564107533, 0.9033947750, 1.0400884012], abs=1e-9)


@pytest.mark.parametrize("seed", range(5))
def test_factors_agree_with_a_general_library(seed, values_of, nothing):
    """300 features with zeros: trims, ties and the choice of the reference show."""
    rnanorm = pytest.importorskip("rnanorm")
    rng = np.random.default_rng(seed)
    counts = rng.negative_binomial(2, 2 / (2 + rng.lognormal(3, 2, (300, 1))), (300, 9))
    counts = np.round(counts * rng.uniform(0.4, 2.5, 9)).astype(float)
    values, rows = values_of(counts), np.arange(9)
    step = TrimmedMean()
    learnt = step.learn(values, rows, nothing)
    theirs = rnanorm.TMM().fit(counts.T).get_norm_factors(counts.T)
    assert step.factors(values, rows, learnt) == pytest.approx(theirs, rel=1e-10)
    learnt = UpperQuartile().learn(values, rows, nothing)
    sizes = UpperQuartile().sizes(values, rows, learnt)
    theirs = rnanorm.UQ().fit(counts.T).get_norm_factors(counts.T)
    theirs = theirs * counts.sum(axis=0)
    assert sizes == pytest.approx(theirs / theirs.mean(), rel=1e-10)


@pytest.mark.parametrize(
    "step", [LogCpm(), MedianOfRatios(), TrimmedMean(), UpperQuartile()]
)
def test_a_deeper_library_of_the_same_mixture_gives_the_same_values(
    step, values_of, nothing
):
    """Without normalisation a tenfold library would differ by 3.3 everywhere."""
    rng = np.random.default_rng(1)
    one = rng.integers(50, 5000, (200, 6)).astype(float)
    both = np.concatenate([one, 10 * one[:, :1]], axis=1)
    found = prepared(step, values_of(both), nothing, np.arange(6))
    assert found[:, 6] == pytest.approx(found[:, 0], abs=0.06)
    assert np.abs(found[:, 1] - found[:, 0]).max() > 1.0


@pytest.mark.parametrize("name", ["log-cpm", "trimmed-mean", "upper-quartile"])
def test_a_sample_without_counts_is_refused_by_name(name, context):
    counts = np.array(COUNTS, float)
    counts[:, 2] = 0.0
    with pytest.raises(InputDataError) as caught:
        Recipe((name, "median-fill")).learn(
            counts, EVERYONE, np.full(12, "", object), context(12, 4)
        )
    assert caught.value.code == "sample-without-counts"
    assert "S2" in caught.value.what


def test_negative_counts_are_refused(values_of, nothing):
    with pytest.raises(InputDataError) as caught:
        LogCpm().learn(values_of([[3, -1]]), np.arange(2), nothing)
    assert caught.value.code == "negative-count"


@pytest.mark.parametrize("share", [0.0, 0.05, 0.3, 0.45])
def test_trimming_is_by_mean_ranks(share):
    """Whole numbers, so that cuts fall inside ties; `rankdata` gives mean ranks."""
    rng = np.random.default_rng(int(100 * share))
    for _ in range(50):
        values = rng.integers(0, 6, rng.integers(1, 30)).astype(float)
        rank, cut = rankdata(values), int(share * len(values))
        expected = (rank >= cut + 1) & (rank <= len(values) - cut)
        assert _trimmed(values, share).tolist() == expected.tolist()
