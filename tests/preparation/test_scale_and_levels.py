"""Logarithms, M-values, quantile normalisation, median differences."""

import numpy as np
import pytest

from panelkit.errors import InputDataError
from panelkit.preparation import Recipe
from panelkit.preparation.levels import MedianDifference, Quantile, normalised_to
from panelkit.preparation.scale import MValues

TARGET = np.array([2, 3, 14 / 3, 17 / 3])
SAMPLES = {  # the widely shown example of four features in three samples, from memory
    (5, 2, 3, 4): (17 / 3, 2, 3, 14 / 3),
    (4, 1, 4, 2): (31 / 6, 2, 31 / 6, 3),  # ties by the mean at their ranks
    (3, 4, 6, 8): (2, 3, 14 / 3, 17 / 3),
}


def test_quantile_target_and_ties(values_of, nothing):
    """Bolstad et al. 2003."""
    values = values_of(np.array(list(SAMPLES)).T)
    learnt = Quantile().learn(values, np.arange(3), nothing)
    assert learnt["target"] == pytest.approx(TARGET, rel=1e-15)
    done = Quantile().apply(values, learnt, nothing).matrix
    assert pytest.approx(np.array(list(SAMPLES.values())), rel=1e-7) == done.T
    for sample, expected in SAMPLES.items():
        found = normalised_to(TARGET, np.array(sample, float))
        assert found == pytest.approx(expected, rel=1e-15)


def test_quantile_leaves_missing_values_missing_and_the_order_as_it_was():
    rng = np.random.default_rng(0)
    target = np.sort(rng.normal(size=200))
    sample = rng.lognormal(size=200)
    sample[rng.random(200) < 0.3] = np.nan
    found = normalised_to(target, sample)
    gap = np.isnan(sample)
    assert (np.isnan(found) == gap).all()
    assert (np.argsort(found[~gap]) == np.argsort(sample[~gap])).all()
    assert found[~gap].min() >= target[0]
    assert np.median(found[~gap]) == pytest.approx(np.median(target), abs=0.02)
    assert np.isnan(normalised_to(target, np.full(200, np.nan))).all()


def test_after_quantiles_every_training_sample_has_the_target(values_of, nothing):
    values = values_of(np.random.default_rng(1).lognormal(3, 1, (50, 8)))
    learnt = Quantile().learn(values, np.arange(5), nothing)
    done = Quantile().apply(values, learnt, nothing).matrix
    assert np.sort(done, axis=0) == pytest.approx(
        np.tile(learnt["target"][:, None], 8), rel=1e-6
    )


def test_median_difference_takes_a_sample_s_factor_out(values_of, nothing):
    rng = np.random.default_rng(2)
    logs = rng.normal(8, 2, (101, 6))
    logs[:, 5] = logs[:, 0] + 3.0
    values = values_of(logs)
    learnt = MedianDifference().learn(values, np.arange(5), nothing)
    done = MedianDifference().apply(values, learnt, nothing)
    assert done.part(slice(None))[:, 5] == pytest.approx(done.part(slice(None))[:, 0])
    residual = done.part(slice(None)) - logs[:, :5].mean(axis=1)[:, None]
    assert np.median(residual, axis=0) == pytest.approx(0, abs=1e-12)


def test_m_values():
    """Du et al. 2010: log2 of beta over one minus beta; the offset keeps 0 finite."""
    betas = np.array([[0.0, 0.2, 0.5, 0.8, 1.0]])
    done = Recipe(({"step": "m-values", "offset": 0.01}, "median-fill")).base(betas)
    expected = np.log2(np.array([0.01, 0.21, 0.51, 0.81, 1.01]))
    expected -= np.log2(np.array([1.01, 0.81, 0.51, 0.21, 0.01]))
    assert done[0] == pytest.approx(expected, abs=1e-12)
    assert done[0, 2] == 0.0
    assert done[0, 1] == pytest.approx(-done[0, 3])
    small = np.array([[0.2]])
    MValues(1e-12).change(small)
    assert small[0, 0] == pytest.approx(-2.0, abs=1e-9)  # log2(0.2 / 0.8)


@pytest.mark.parametrize("wrong", [-0.1, 1.01])
def test_m_values_of_no_share_are_refused(wrong):
    with pytest.raises(InputDataError) as caught:
        MValues().change(np.array([[0.2, wrong]]))
    assert caught.value.code == "no-share"


@pytest.mark.parametrize("seed", range(3))
def test_both_ways_of_ordering_give_the_same(seed):
    """Zeros of both signs, ties, infinities of neither, gaps."""
    rng = np.random.default_rng(seed)
    sample = rng.normal(0, 2, 300).round(1).astype(np.float32)
    sample[rng.random(300) < 0.1] = np.nan
    sample[:4] = [0.0, -0.0, 0.0, -np.nan]
    target = np.sort(rng.normal(size=300))
    narrow = normalised_to(target, sample)
    wide = normalised_to(target, sample.astype(np.float64))
    assert narrow.tobytes() == wide.tobytes()
