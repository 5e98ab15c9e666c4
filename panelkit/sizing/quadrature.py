"""Expectations over a linear predictor: normal, or normal in each class."""

import math
from collections.abc import Callable
from statistics import NormalDist

import numpy as np

__all__ = ["class_predictors", "expected_over_classes", "expected_over_normal"]

NODES, WEIGHTS = np.polynomial.hermite_e.hermegauss(200)
SHARES = WEIGHTS / WEIGHTS.sum()


def expected_over_normal(
    function: Callable[[float], float], mean: float, sd: float
) -> float:
    """Return the expectation of a function of a normal predictor.

    Parameters
    ----------
    function : callable
        Of one number.
    mean, sd : float
        Of the predictor.

    Returns
    -------
    float
        By Gauss-Hermite quadrature with 200 nodes.
    """
    return math.fsum(
        share * function(mean + sd * node)
        for node, share in zip(NODES.tolist(), SHARES.tolist(), strict=True)
        if share > 0.0
    )


def class_predictors(area: float, prevalence: float) -> tuple[float, float, float]:
    """Return a calibrated predictor's mean in controls and cases, and its SD.

    With one SD in both classes, Bayes' rule makes the log-odds of the outcome linear
    with slope one exactly where the difference of the means is the variance.

    Parameters
    ----------
    area : float
        Above one half.
    prevalence : float
        Share of cases.

    Returns
    -------
    controls, cases, sd : float
        Of the linear predictor.
    """
    sd = math.sqrt(2.0) * NormalDist().inv_cdf(area)
    odds = math.log(prevalence / (1.0 - prevalence))
    return odds - sd**2 / 2.0, odds + sd**2 / 2.0, sd


def expected_over_classes(
    function: Callable[[float, bool], float], area: float, prevalence: float
) -> float:
    """Return the expectation of a function of a calibrated predictor and the class.

    Parameters
    ----------
    function : callable
        Of the predictor and whether the person is a case.
    area, prevalence : float
        As for `class_predictors`.

    Returns
    -------
    float
        Over cases and controls.
    """
    controls, cases, sd = class_predictors(area, prevalence)
    return prevalence * expected_over_normal(lambda x: function(x, True), cases, sd) + (
        1.0 - prevalence
    ) * expected_over_normal(lambda x: function(x, False), controls, sd)
