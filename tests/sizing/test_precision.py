"""Sizes by precision: sensitivity, specificity, area.

Buderer 1996, Acad Emerg Med 3:895: the formula; its rounding rule could not be read, so
both are held, with values by exact fractions.
"""

import math
from statistics import NormalDist

import numpy as np
import pytest
from scipy import stats

from panelkit.errors import UsageError
from panelkit.metrics import (
    binormal_auc_variance,
    hanley_mcneil_se,
    normal_scores_auc_se,
)
from panelkit.sizing import (
    area_size_binormal,
    area_size_hanley_mcneil,
    area_size_normal_scores,
    buderer_size,
    wilson_size,
    wilson_width,
)

Z = NormalDist().inv_cdf(0.975)


@pytest.mark.parametrize(
    ("share", "half_width", "class_share", "exact", "late", "early"),
    [
        (0.90, 0.10, 0.20, 34.5744, 173, 175),
        (0.85, 0.10, 0.80, 48.9804, 62, 62),
        (0.95, 0.05, 0.10, 72.9904, 730, 730),
        (0.90, 0.05, 0.90, 138.2976, 154, 155),
        (0.90, 0.05, 0.50, 138.2976, 277, 278),
        (0.85, 0.07, 0.25, 99.96, 400, 400),
        (0.80, 0.07, 0.75, 125.44, 168, 168),
        (0.85, 0.05, 0.20, 195.9216, 980, 980),
    ],
)
def test_normal_formula_and_both_roundings(
    share, half_width, class_share, exact, late, early
):
    found = buderer_size(share, half_width, class_share)
    assert found.exact == pytest.approx(exact, rel=1e-12)
    assert (found.cohort_late, found.cohort_early) == (late, early)


def test_no_person_comes_from_a_rounding_error():
    """z^2 p (1 - p) / w^2 is 100 exactly here; floats may say 100.00000000000001."""
    assert buderer_size(0.5, 0.1, 0.25, z=2.0).people == 100
    assert buderer_size(0.5, 0.1, 0.25, z=2.0).cohort_late == 400


def test_wilson_size_is_the_smallest():
    assert wilson_size(0.9, 0.05, 0.1).people == 141
    assert wilson_width(0.9, 141, Z) == pytest.approx(0.0999901739, abs=1e-10)
    assert wilson_width(0.9, 140, Z) == pytest.approx(0.1003528458, abs=1e-10)


@pytest.mark.parametrize(("hits", "n"), [(9, 10), (81, 90), (3, 40)])
def test_wilson_width_is_that_of_another_library(hits, n):
    low, high = stats.binomtest(hits, n).proportion_ci(0.95, "wilson")
    assert wilson_width(hits / n, n, Z) == pytest.approx(high - low, rel=1e-10)


@pytest.mark.parametrize(
    ("area", "ratio", "width", "expected"),
    [
        (0.8, 1.0, 0.10, (151, 151)),
        (0.8, 3.0, 0.10, (124, 372)),
        (0.9, 1.0, 0.10, (79, 79)),
        (0.75, 2.0, 0.15, (69, 138)),
        (0.85, 1.0, 0.10, (117, 117)),
    ],
)
def test_area_by_hanley_and_mcneil(area, ratio, width, expected):
    """Hanley & McNeil 1982, Radiology 143:29: the variance, searched by hand."""
    found = area_size_hanley_mcneil(area, width, ratio)
    assert found == expected
    assert 2 * Z * hanley_mcneil_se(area, *found) <= width
    fewer = found[0] - 1
    assert 2 * Z * hanley_mcneil_se(area, fewer, math.ceil(ratio * fewer)) > width


def test_area_by_the_binormal_variance():
    """Obuchowski's formula is quoted from memory; its arithmetic was done by hand."""
    assert binormal_auc_variance(0.8, 1) == pytest.approx(0.1194606781, abs=1e-10)
    assert binormal_auc_variance(0.9, 2) == pytest.approx(0.0576202326, abs=1e-10)
    assert binormal_auc_variance(0.75, 1) == pytest.approx(0.1348029495, abs=1e-10)
    exact, cases, controls = area_size_binormal(0.8, 0.1)
    assert exact == pytest.approx(183.56, abs=0.005)
    assert (cases, controls) == (184, 184)


@pytest.mark.parametrize(
    ("area", "n_cases", "n_controls"), [(0.8, 100, 100), (0.9, 40, 120)]
)
def test_variances_against_simulated_studies(area, n_cases, n_controls):
    """3,000 studies of normal scores; the SE of their SD is 1.3 %.

    The exact form has to agree; Obuchowski's approximation is on the safe side.
    """
    draws = np.random.default_rng(1)
    shift = math.sqrt(2) * NormalDist().inv_cdf(area)
    cases = draws.normal(shift, 1, (3000, n_cases))
    controls = draws.normal(0, 1, (3000, n_controls))
    areas = [
        stats.mannwhitneyu(a, b)[0] / (n_cases * n_controls)
        for a, b in zip(cases, controls, strict=True)
    ]
    seen = np.std(areas)
    assert normal_scores_auc_se(area, n_cases, n_controls) == pytest.approx(
        seen, rel=0.04
    )
    approximate = binormal_auc_variance(area, n_controls / n_cases) / n_cases
    assert seen < math.sqrt(approximate) < 1.5 * seen


def test_a_counted_area_by_another_quadrature():
    """Two cases exceed one control: a bivariate normal orthant, correlation 0.5."""
    point = [NormalDist().inv_cdf(0.8)] * 2
    both = stats.multivariate_normal([0, 0], [[1, 0.5], [0.5, 1]]).cdf(point)
    variance = (0.16 + 148 * (both - 0.64)) / (50 * 100)
    assert normal_scores_auc_se(0.8, 50, 100) == pytest.approx(
        math.sqrt(variance), rel=1e-6
    )
    cases, controls = area_size_normal_scores(0.8, 0.1)
    assert 2 * Z * normal_scores_auc_se(0.8, cases, controls) <= 0.1
    assert 2 * Z * normal_scores_auc_se(0.8, cases - 1, controls - 1) > 0.1


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: buderer_size(1.2, 0.1, 0.2), "got 1.2"),
        (lambda: buderer_size(0.9, 0.0, 0.2), "half-width"),
        (lambda: wilson_size(0.9, 0.1, 0.0), "share of the class"),
        (lambda: wilson_size(0.9, math.nan, 0.2), "got nan"),
        (lambda: area_size_hanley_mcneil(0.5, 0.1), "area"),
        (lambda: area_size_hanley_mcneil(0.8, 0.1, 0.0), "controls per case"),
        (lambda: area_size_hanley_mcneil(0.8, 1e-6), "1,000,000,000"),
    ],
)
def test_nonsense_is_refused(call, words):
    with pytest.raises(UsageError, match=words):
        call()
