"""Metrics of censored times.

The values of the ten samples: scikit-survival 0.28, R survival 3.5-3 and lifelines 0.30
agree with the definitions worked by hand.
"""

import numpy as np
import pytest

from panelkit.errors import FitError
from panelkit.metrics import (
    auc,
    brier,
    censoring_curve,
    concordance,
    horizon_auc,
    horizon_brier,
    uno_concordance,
)

EVENT = np.array([1, 1, 0, 1, 0, 1, 1, 1, 0, 0.0])
RISK = np.array([2.0, 1.1, 1.5, 0.9, 0.4, 2.5, 1.1, 1.3, 0.2, 0.8])
TIED = np.array([5, 8, 3, 8, 10, 2, 5, 9, 12, 7.0])
UNTIED = np.array([5, 8, 3, 6, 10, 2, 4, 9, 12, 7.0])


def test_harrell_with_and_without_ties():
    assert concordance(RISK, TIED, EVENT)[0] == pytest.approx(0.8793103448, abs=1e-10)
    assert concordance(RISK, UNTIED, EVENT)[0] == pytest.approx(0.828125)


@pytest.mark.parametrize(
    ("time", "horizon", "expected"),
    [
        (TIED, 9.5, 0.8570081254),
        (TIED, 8.5, 0.8421684817),
        (UNTIED, 9.5, 0.8158616326),
        (UNTIED, 8.5, 0.7965509205),
    ],
)
def test_uno(time, horizon, expected):
    found = uno_concordance(RISK, time, EVENT, horizon)
    assert found == pytest.approx(expected, abs=1e-10)


def test_concordance_against_lifelines_on_random_times():
    utils = pytest.importorskip("lifelines.utils")
    draws = np.random.default_rng(0)
    for _ in range(20):
        time = draws.integers(1, 20, 60).astype(float)
        event = (draws.uniform(size=60) < 0.6).astype(float)
        risk = draws.normal(size=60).round(1)
        assert concordance(risk, time, event)[0] == pytest.approx(
            utils.concordance_index(time, -risk, event)
        )


def test_influence_is_the_derivative_by_a_samples_weight():
    share = np.ones(10)
    value, influence = concordance(RISK, TIED, EVENT, share)
    for i in range(10):
        more = share.copy()
        more[i] += 1e-6
        change = (concordance(RISK, TIED, EVENT, more)[0] - value) / 1e-6
        assert influence[i] == pytest.approx(change, abs=1e-5)


def test_only_pairs_within_a_stratum_count():
    strata = np.array([0, 0, 0, 0, 0, 1, 1, 1, 1, 1])
    hits = usable = 0.0
    for i in range(10):
        for j in range(10):
            if strata[i] == strata[j] and EVENT[i] and UNTIED[i] < UNTIED[j]:
                usable += 1
                hits += (RISK[i] > RISK[j]) + 0.5 * (RISK[i] == RISK[j])
    within = concordance(RISK, UNTIED, EVENT, strata=strata)[0]
    assert within == pytest.approx(hits / usable)
    assert within != pytest.approx(concordance(RISK, UNTIED, EVENT)[0], abs=1e-3)


def test_without_censoring_the_horizon_figures_are_the_plain_ones():
    draws = np.random.default_rng(3)
    time = draws.exponential(size=50)
    event = np.ones(50)
    chance = draws.uniform(size=50)
    horizon = float(np.median(time)) + 1e-9
    failed = (time <= horizon) * 1.0
    assert horizon_brier(chance, time, event, horizon) == pytest.approx(
        brier(chance, failed)
    )
    assert horizon_auc(chance, time, event, horizon) == pytest.approx(
        auc(chance, failed)
    )


def test_horizon_figures_against_scikit_survival():
    sksurv = pytest.importorskip("sksurv.metrics")
    util = pytest.importorskip("sksurv.util")
    draws = np.random.default_rng(4)
    time = draws.exponential(10.0, 120)
    event = draws.uniform(size=120) < 0.6
    chance = draws.uniform(size=120)
    record = util.Surv.from_arrays(event, time)
    horizon = 8.0
    _, expected = sksurv.brier_score(record, record, 1.0 - chance[:, None], [horizon])
    assert horizon_brier(chance, time, event * 1.0, horizon) == pytest.approx(
        expected[0]
    )
    area, _ = sksurv.cumulative_dynamic_auc(record, record, chance, [horizon])
    assert horizon_auc(chance, time, event * 1.0, horizon) == pytest.approx(area[0])


def test_censoring_curve_takes_the_left_limit():
    time = np.array([1.0, 2.0, 2.0, 3.0])
    event = np.array([1.0, 0.0, 1.0, 0.0])
    at = np.array([1.0, 2.0, 2.5, 3.5])
    # at time 2 one of two still at risk of censoring leaves
    assert censoring_curve(time, event, at) == pytest.approx([1.0, 1.0, 0.5, 0.0])


def test_what_cannot_be_compared_is_refused():
    with pytest.raises(FitError, match="no pair"):
        concordance(RISK, TIED, np.zeros(10))
    with pytest.raises(FitError, match="horizon"):
        horizon_brier(RISK, TIED, EVENT, 1.0)
    with pytest.raises(FitError, match="horizon"):
        uno_concordance(RISK, TIED, EVENT, 1.0)
