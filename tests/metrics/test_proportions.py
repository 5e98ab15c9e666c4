"""Proportions against published tables and scipy's own intervals."""

import math

import pytest
from scipy.stats import binomtest

from panelkit.errors import UsageError
from panelkit.metrics import (
    clopper_pearson,
    likelihood_ratios,
    lower_limit,
    mcnemar_exact,
    needed_without_a_miss,
    predictive_values,
    wilson,
)

# Newcombe 1998, Stat Med 17:857, Table I has the first four, to four digits
TABLE = [
    (81, 263, 0.25528852, 0.36620958, 0.25273675, 0.36762192),
    (15, 148, 0.06238640, 0.16048724, 0.05784401, 0.16165049),
    (0, 20, 0.0, 0.16112516, 0.0, 0.16843347),
    (1, 29, 0.00611321, 0.17175522, 0.00087265, 0.17764430),
    (18, 20, 0.69896635, 0.97213352, 0.68301729, 0.98765147),
    (10, 10, 0.72246720, 1.0, 0.69150289, 1.0),
    (45, 50, 0.78639769, 0.95652424, 0.78186463, 0.96672491),
]


@pytest.mark.parametrize(("k", "n", "w_low", "w_high", "c_low", "c_high"), TABLE)
def test_published_intervals(k, n, w_low, w_high, c_low, c_high):
    assert wilson(k, n, 0.95) == pytest.approx((w_low, w_high), abs=5e-9)
    assert clopper_pearson(k, n, 0.95) == pytest.approx((c_low, c_high), abs=5e-9)


@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.99])
@pytest.mark.parametrize("k", range(0, 14, 3))
def test_another_library_agrees(k, confidence):
    test = binomtest(k, 13)
    for mine, method in ((wilson, "wilson"), (clopper_pearson, "exact")):
        theirs = test.proportion_ci(confidence, method)
        expected = (theirs.low, theirs.high)
        assert mine(k, 13, confidence) == pytest.approx(expected, abs=1e-12)


def test_nobody_has_no_interval():
    assert all(
        math.isnan(end) for end in (*wilson(0, 0, 0.95), *clopper_pearson(0, 0, 0.95))
    )


def test_people_without_a_miss_that_a_limit_needs():
    """0.95 ** 59 = 0.0485, 0.95 ** 58 = 0.0510 (arithmetic)."""
    assert needed_without_a_miss(0.95, 0.95) == 59
    assert lower_limit(59, 59, 0.95) >= 0.95 > lower_limit(58, 58, 0.95)
    assert needed_without_a_miss(0.5, 0.5) == 1  # an exact power asks for no more


def test_likelihood_ratios_and_predictive_values():
    """Simel, Samsa & Matchar 1991, J Clin Epidemiol 44:763 (formula), by hand."""
    positive, negative = likelihood_ratios(45, 5, 80, 20, 0.95)
    assert positive.value == pytest.approx(4.5)
    assert (positive.low, positive.high) == pytest.approx(
        (3.0082035772, 6.7315922877), abs=5e-10
    )
    assert negative.value == pytest.approx(0.125)
    assert (negative.low, negative.high) == pytest.approx(
        (0.0541098780, 0.2887642810), abs=5e-10
    )
    for prevalence, expected in (
        (0.5, (9 / 11, 8 / 9)),
        (0.1, (1 / 3, 72 / 73)),
        (0.01, (1 / 23, 792 / 793)),
        (1 / 3, (9 / 13, 16 / 17)),
    ):
        assert predictive_values(0.9, 0.8, prevalence) == pytest.approx(expected)


def test_empty_cells_give_no_interval():
    positive, negative = likelihood_ratios(10, 0, 10, 0, 0.95)
    assert math.isinf(positive.value)
    assert negative.value == 0.0
    assert math.isnan(positive.low)
    assert math.isnan(negative.high)


@pytest.mark.parametrize("prevalence", [0.0, 1.0, -0.1, float("nan")])
def test_a_prevalence_is_a_share(prevalence):
    with pytest.raises(UsageError, match="no share of people"):
        predictive_values(0.9, 0.8, prevalence)


def test_mcnemar():
    """By the binomial tail: 2 * (1 + 10 + 45) / 1024 for 8 against 2 of 10."""
    assert mcnemar_exact(8, 2) == pytest.approx(2 * 56 / 1024)
    assert mcnemar_exact(2, 8) == mcnemar_exact(8, 2)
    assert mcnemar_exact(0, 0) == 1.0
