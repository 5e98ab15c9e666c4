"""Agreement of sets: exact values of small matrices.

Nogueira, Sechidis & Brown 2018, JMLR 18(174):1 (variance from memory, equal to the
influence function's); Kuncheva 2007, IASTED AIA 390; arithmetic in fractions.
"""

import math

import numpy as np
import pytest

from panelkit.errors import UsageError
from panelkit.stability import (
    jaccard_agreement,
    kuncheva_agreement,
    nogueira_stability,
    set_agreement,
)


def sets(text):
    return np.array([[c == "1" for c in row] for row in text.split()])


Z1 = sets("110000 110000 101000 100100")
Z2 = sets("111000 110000 101010 000101")
VALUES = [
    (Z1, 3 / 8, 9 / 1024, 3 / 8, 4 / 9),
    (Z2, -1 / 7, 3046 / 60025, math.nan, 17 / 72),
    (sets("10 01 10 01"), -1 / 3, 0.0, -1 / 3, 1 / 3),
    (sets("1100 1100 1100"), 1.0, 0.0, 1.0, 1.0),
    (sets("1100 0011"), -1.0, 0.0, -1.0, 0.0),
]


@pytest.mark.parametrize(("z", "phi", "variance", "kuncheva", "jaccard"), VALUES)
def test_values(z, phi, variance, kuncheva, jaccard):
    found = nogueira_stability(z)
    assert found == pytest.approx((phi, variance), abs=1e-12)
    assert kuncheva_agreement(z) == pytest.approx(kuncheva, abs=1e-12, nan_ok=True)
    assert jaccard_agreement(z) == pytest.approx(jaccard, abs=1e-12)


@pytest.mark.parametrize(
    ("z", "low", "high"),
    [(Z1, 0.1912533764, 0.5587466236), (Z2, -0.5843736610, 0.2986593753)],
)
def test_interval(z, low, high):
    found = set_agreement(z)
    assert (found.low, found.high) == pytest.approx((low, high), abs=1e-9)
    assert "no test" in found.sentence()


@pytest.mark.parametrize("seed", range(5))
def test_sets_of_one_size_agree_with_kuncheva_and_with_itself(seed):
    draws = np.random.default_rng(seed)
    z = np.zeros((9, 30), bool)
    for row in z:
        row[draws.choice(30, 4, replace=False)] = True
    assert nogueira_stability(z)[0] == pytest.approx(kuncheva_agreement(z), abs=1e-12)
    mixed = z[draws.permutation(9)][:, draws.permutation(30)]
    assert nogueira_stability(mixed) == pytest.approx(nogueira_stability(z), abs=1e-12)


@pytest.mark.parametrize("seed", range(3))
def test_variance_is_that_of_the_influence_function(seed):
    """Numeric derivative by the weight of each set, divisors of n kept at n - 1."""
    draws = np.random.default_rng(seed)
    z = draws.random((8, 12)) < 0.3

    def phi(weight):
        share = weight @ z
        k = share.sum() / 12
        return 1 - (8 / 7) * (share * (1 - share)).mean() / (k * (1 - k))

    even = np.full(8, 1 / 8)
    step = 1e-6
    slopes = np.array(
        [
            (phi((1 - step) * even + step * e) - phi((1 + step) * even - step * e))
            / (2 * step)
            for e in np.eye(8)
        ]
    )
    assert nogueira_stability(z)[1] == pytest.approx((slopes**2).sum() / 64, rel=0.3)


def test_nothing_and_everything_are_undefined_not_perfect():
    for z in (np.zeros((3, 4), bool), np.ones((3, 4), bool)):
        assert math.isnan(nogueira_stability(z)[0])
        assert math.isnan(kuncheva_agreement(z))
    assert math.isnan(jaccard_agreement(np.zeros((3, 4), bool)))
    assert "No set agreement" in set_agreement(np.zeros((3, 4), bool)).sentence()


def test_pairs_of_empty_sets_are_left_out_of_jaccard():
    # of three pairs one is empty against empty; the other two have nothing in common
    assert jaccard_agreement(sets("000 000 100")) == 0.0


def test_two_sets_are_needed():
    with pytest.raises(UsageError):
        nogueira_stability(np.ones((1, 4), bool))
