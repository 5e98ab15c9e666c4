"""Sizes for developing, validating and comparing models."""

import math

import numpy as np
import pytest
from scipy import integrate, stats
from sklearn.metrics import log_loss

from panelkit.errors import UsageError
from panelkit.sizing import (
    area_to_cox_snell,
    cases_for_areas,
    develop_binary,
    develop_survival,
    exact_mcnemar_power,
    largest_cox_snell,
    mcnemar_power,
    pairs_for_mcnemar,
    people_for_area,
    people_for_benefit,
    people_for_ratio,
    people_for_slope,
    sensitivity_at,
    slope_information,
    slope_information_of_area,
    validate_continuous,
)


@pytest.mark.parametrize(
    ("prevalence", "parameters", "r2", "criteria", "people", "three"),
    [
        # Riley et al. 2020, BMJ 368:m441: pre-eclampsia; from memory, done again
        (0.05, 30, 0.05, (72.9904, 543.413, 5248.5711, 1769.55), 5249, 5249),
        # Riley et al. 2019, Stat Med 38:1276: Chagas; 4.80 events a parameter printed
        (0.174, 24, 0.288, (220.85, 800.19, 622.306, 661.097), 801, 662),
        # by the formulas alone
        (0.5, 10, 0.25, (384.16, 587.752, 307.293, 226.172), 588, 385),
        (0.2, 15, 0.1, (245.8624, 553.194, 1273.528, 442.418), 1274, 1274),
    ],
)
def test_development_of_a_binary_outcome(
    prevalence, parameters, r2, criteria, people, three
):
    found = develop_binary(prevalence, parameters, r2)
    shown = (
        found.overall_risk,
        found.prediction_error,
        found.shrinkage,
        found.optimism,
    )
    assert shown == pytest.approx(criteria, rel=1e-5)
    assert (found.people, found.people_three) == (people, three)


def test_events_per_parameter_as_published():
    """Riley et al. 2019, Stat Med 38:1276: 4.8 (Chagas), at least 23 (VTE)."""
    chagas = develop_binary(0.174, 24, 0.288)
    assert chagas.people_three * 0.174 / 24 == pytest.approx(4.80, abs=0.005)
    clot = develop_survival(0.065, 2.07, 30, 0.051)
    assert clot.people == 5143  # from memory
    assert clot.shrinkage == pytest.approx(5142.6593, abs=1e-4)
    assert clot.optimism == pytest.approx(906.93, abs=0.005)
    assert clot.events_per_parameter == pytest.approx(23.07, abs=0.005)


def test_largest_r2():
    """Riley et al. 2020, table (rounded, from memory)."""
    listed = {
        0.5: 0.75, 0.4: 0.7397, 0.3: 0.7053, 0.2: 0.6324, 0.1: 0.4780, 0.05: 0.3277,
        0.01: 0.1060,
    }  # fmt: skip
    for prevalence, value in listed.items():
        assert largest_cox_snell(prevalence) == pytest.approx(value, abs=5e-5)


def test_r2_of_an_area_is_that_of_simulated_people():
    """A million people with a calibrated normal score; SE of R2 about 0.0005."""
    prevalence, area = 0.2, 0.8
    draws = np.random.default_rng(2)
    case = draws.random(1_000_000) < prevalence
    sd = math.sqrt(2) * stats.norm.ppf(area)
    score = math.log(0.25) + np.where(case, 0.5, -0.5) * sd**2
    score += sd * draws.normal(size=len(case))
    model = log_loss(case, 1 / (1 + np.exp(-score)))
    share = case.mean()
    null = -(share * math.log(share) + (1 - share) * math.log(1 - share))
    seen = 1 - math.exp(-2 * (null - model))
    assert area_to_cox_snell(area, prevalence) == pytest.approx(seen, abs=0.002)


def test_validation_of_a_binary_outcome():
    """Riley et al. 2021, Stat Med 40:4230: formulas from memory, values by hand."""
    assert people_for_ratio(0.018, 1.0) == pytest.approx(905.06, abs=0.005)
    assert people_for_ratio(0.2, 0.2) == pytest.approx(1541.75, abs=0.005)
    assert people_for_area(0.8, 0.018) == 4252
    assert people_for_area(0.8, 0.2) == 471
    assert people_for_area(0.75, 0.3) == 433
    assert people_for_area(0.9, 0.1, 0.05) == 1737
    assert people_for_benefit(0.8, 0.7, 0.2, 0.2) == pytest.approx(624.26, abs=0.005)


def test_calibration_slope():
    found = slope_information(-1.75, 1.47)
    shown = (found.intercept, found.cross, found.slope, found.prevalence)
    expected = (0.1289711512, -0.1237464066, 0.2784381316, 0.2186656359)
    assert shown == pytest.approx(expected, abs=1e-9)
    assert people_for_slope(found) == pytest.approx(2405.44, abs=0.005)
    assert people_for_slope(found, 0.4) == pytest.approx(601.36, abs=0.005)
    for (mean, sd), n in {
        (0.0, 1.0): 2663.63,
        (-2.0, 1.0): 4319.81,
        (-5.0, 2.5): 4553.88,
    }.items():
        assert people_for_slope(slope_information(mean, sd)) == pytest.approx(
            n, abs=0.005
        )


def test_information_of_an_area_by_another_quadrature():
    prevalence, area = 0.2, 0.8
    sd = math.sqrt(2) * stats.norm.ppf(area)
    odds = math.log(0.25)

    def density(x):
        cases = stats.norm.pdf(x, odds + sd**2 / 2, sd)
        return prevalence * cases + 0.8 * stats.norm.pdf(x, odds - sd**2 / 2, sd)

    for power, name in enumerate(("intercept", "cross", "slope")):
        value, _ = integrate.quad(
            lambda x, k=power: x**k * density(x) / (2 + 2 * np.cosh(x)), -14, 12
        )
        found = getattr(slope_information_of_area(area, prevalence), name)
        assert found == pytest.approx(value, abs=1e-7)


def test_calibrated_classes_at_their_threshold():
    """At the prevalence, a predictor with one SD has sensitivity equal specificity."""
    sensitivity, specificity = sensitivity_at(0.8, 0.2, 0.2)
    assert sensitivity == pytest.approx(specificity, abs=1e-12)
    assert sensitivity == pytest.approx(
        stats.norm.cdf(stats.norm.ppf(0.8) / math.sqrt(2)), abs=1e-12
    )


def test_validation_of_a_number():
    """Archer et al. 2021, Stat Med 40:133: formulas from memory, values by hand."""
    half, most = validate_continuous(0.5), validate_continuous(0.9)
    assert half.r_squared == pytest.approx(768.32, abs=0.005)
    assert half.slope == pytest.approx(385.16, abs=0.005)
    assert half.people == 769
    assert most.r_squared == pytest.approx(55.32, abs=0.005)
    assert most.slope == pytest.approx(43.68, abs=0.005)


@pytest.mark.parametrize(
    ("first", "second", "power", "expected"),
    [
        (0.15, 0.05, 0.8, 154.5986),
        (0.15, 0.05, 0.9, 205.9621),
        (0.20, 0.10, 0.8, 233.0945),
        (0.20, 0.10, 0.9, 311.0472),
        (0.12, 0.04, 0.8, 193.8473),
        (0.12, 0.04, 0.9, 258.5058),
    ],
)
def test_pairs_for_mcnemar(first, second, power, expected):
    """Connor 1987, Biometrics 43:207, with discordant shares `first` and `second`."""
    found = pairs_for_mcnemar(first + second, first - second, power)
    assert found == pytest.approx(expected, abs=1e-4)
    turned = mcnemar_power(found, first + second, first - second)
    assert turned == pytest.approx(power, abs=1e-9)


def test_exact_mcnemar_power():
    assert exact_mcnemar_power(155, 0.2, 0.1) == pytest.approx(0.7617, abs=5e-5)
    draws = np.random.default_rng(3)
    counts = draws.multinomial(60, [0.3, 0.1, 0.6], size=4000)
    seen = np.mean(
        [stats.binomtest(b, b + c).pvalue <= 0.05 for b, c, _ in counts if b + c]
    )
    assert exact_mcnemar_power(60, 0.4, 0.2) == pytest.approx(seen, abs=0.025)


def test_cases_for_paired_areas():
    """Obuchowski & McClish 1997, Stat Med 16:1529: from memory, value by hand."""
    found = cases_for_areas(0.80, 0.88, 0.5)
    assert found == pytest.approx(139.94, abs=0.005)
    assert cases_for_areas(0.80, 0.88, 0.9) < found


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: develop_binary(0.0, 5, 0.1), "prevalence"),
        (lambda: develop_binary(0.2, 0, 0.1), "parameters"),
        (lambda: develop_binary(0.2, 5, 0.7), "0.632"),
        (lambda: develop_survival(0.0, 2.0, 5, 0.1), "event rate"),
        (lambda: people_for_ratio(0.2, 0.0), "width"),
        (lambda: people_for_area(1.0, 0.2), "area"),
        (lambda: validate_continuous(1.2), "got 1.2"),
        (lambda: pairs_for_mcnemar(0.1, 0.2), "cannot differ"),
        (lambda: pairs_for_mcnemar(0.1, 0.0), "cannot differ"),
        (lambda: cases_for_areas(0.8, 0.8, 0.5), "equal areas"),
        (lambda: cases_for_areas(0.8, 0.9, 1.0), "correlation"),
    ],
)
def test_nonsense_is_refused(call, words):
    with pytest.raises(UsageError, match=words):
        call()
