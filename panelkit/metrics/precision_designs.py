"""Precision from nested designs, limits of verification, and total error."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import stats

from panelkit.errors import UsageError

__all__ = [
    "BiologicalGoals",
    "NestedPrecision",
    "biological_goals",
    "nested_precision",
    "one_way_precision",
    "reference_change_value",
    "sigma_metric",
    "total_error",
    "two_level_precision",
    "upper_verification_limit",
    "within_laboratory_df",
]

ONE_SIDED_FACTOR = 1.65  # as total error is usually printed


@dataclass(frozen=True, slots=True)
class NestedPrecision:
    """What a precision experiment shows.

    Attributes
    ----------
    mean : float
        Of all results; NaN where only mean squares were given.
    repeatability_sd, within_laboratory_sd : float
        Of one result within a run, and over runs and days.
    error_variance, run_variance, day_variance : float
        Components; negative estimates are set to 0.
    """

    mean: float
    repeatability_sd: float
    within_laboratory_sd: float
    error_variance: float
    run_variance: float
    day_variance: float


def nested_precision(
    ms_day: float, ms_run: float, ms_error: float, runs: int = 2, replicates: int = 2
) -> NestedPrecision:
    """Return the components of days, runs within days, and replicates.

    Parameters
    ----------
    ms_day, ms_run, ms_error : float
        Mean squares of the nested analysis of variance.
    runs, replicates : int
        Runs of a day, and results of a run.

    Returns
    -------
    NestedPrecision
        Without a mean.

    References
    ----------
    CLSI EP05-A3 (2014), single-site design of 20 days x 2 runs x 2 replicates; the
    formulas are those of any balanced nested design (Searle, S. R., Casella, G.,
    McCulloch, C. E. (1992). Variance Components, chapter 4).
    """
    run = max(0.0, (ms_run - ms_error) / replicates)
    day = max(0.0, (ms_day - ms_run) / (replicates * runs))
    return NestedPrecision(
        mean=math.nan,
        repeatability_sd=math.sqrt(ms_error),
        within_laboratory_sd=math.sqrt(ms_error + run + day),
        error_variance=ms_error,
        run_variance=run,
        day_variance=day,
    )


def two_level_precision(values: ArrayLike) -> NestedPrecision:
    """Return the components of results by day, run and replicate.

    Parameters
    ----------
    values : array_like of shape (n_days, n_runs, n_replicates)
        Balanced: no result missing.

    Returns
    -------
    NestedPrecision
        By `nested_precision`.

    Raises
    ------
    UsageError
        The results have another shape, or a day, run or replicate is alone.
    """
    results = _array(values, 3, "days, runs and replicates")
    days, runs, replicates = results.shape
    by_run = results.mean(axis=2)
    by_day = by_run.mean(axis=1)
    mean = float(results.mean())
    ms_error = float(((results - by_run[:, :, None]) ** 2).sum())
    ms_error /= days * runs * (replicates - 1)
    ms_run = float(replicates * ((by_run - by_day[:, None]) ** 2).sum())
    ms_run /= days * (runs - 1)
    ms_day = float(replicates * runs * ((by_day - mean) ** 2).sum()) / (days - 1)
    found = nested_precision(ms_day, ms_run, ms_error, runs, replicates)
    return NestedPrecision(
        mean,
        found.repeatability_sd,
        found.within_laboratory_sd,
        found.error_variance,
        found.run_variance,
        found.day_variance,
    )


def one_way_precision(values: ArrayLike) -> NestedPrecision:
    """Return the components of results by day and replicate.

    Parameters
    ----------
    values : array_like of shape (n_days, n_replicates)
        Balanced: no result missing.

    Returns
    -------
    NestedPrecision
        Days are the component `day_variance`; there is none of runs.

    Raises
    ------
    UsageError
        The results have another shape, or a day or replicate is alone.

    References
    ----------
    CLSI EP15-A3 (2014), 5 days x 5 replicates.
    """
    results = _array(values, 2, "days and replicates")
    days, replicates = results.shape
    by_day = results.mean(axis=1)
    within = float(((results - by_day[:, None]) ** 2).sum()) / (days * (replicates - 1))
    between = float(replicates * ((by_day - results.mean()) ** 2).sum()) / (days - 1)
    found = nested_precision(between, within, within, 1, replicates)
    return NestedPrecision(
        mean=float(results.mean()),
        repeatability_sd=found.repeatability_sd,
        within_laboratory_sd=found.within_laboratory_sd,
        error_variance=within,
        run_variance=0.0,
        day_variance=found.day_variance,
    )


def _array(values: ArrayLike, axes: int, names: str) -> NDArray[np.float64]:
    results = np.asarray(values, dtype=float)
    if results.ndim != axes or min(results.shape) < 2 or not np.isfinite(results).all():
        raise UsageError(
            code="design-unbalanced",
            where="values",
            what=f"the results are no full table of {names} "
            f"(got shape {results.shape})",
            accepted=f"a table of {names}, at least two of each, none missing",
            next_step="Complete the table, or leave incomplete days out",
        )
    return results


def within_laboratory_df(
    repeatability_sd: float, within_laboratory_sd: float, days: int, replicates: int
) -> float:
    """Return the degrees of freedom of a within-laboratory SD, by claimed ratio.

    Parameters
    ----------
    repeatability_sd, within_laboratory_sd : float
        The claims.
    days, replicates : int
        Of the experiment.

    Returns
    -------
    float
        Satterthwaite's, not rounded: published tables hold whole numbers.

    References
    ----------
    Satterthwaite, F. E. (1946). Biometrics Bulletin 2, 110-114; CLSI EP15-A3 (2014)
    for its use with claims, from memory.
    """
    error = repeatability_sd**2
    between = error + replicates * (within_laboratory_sd**2 - error)
    parts = (between / replicates) ** 2 / (days - 1)
    parts += ((replicates - 1) * error / replicates) ** 2 / (days * (replicates - 1))
    return within_laboratory_sd**4 / parts


def upper_verification_limit(claim: float, df: float, n_levels: int = 1) -> float:
    """Return the largest SD that still verifies a claimed SD.

    Parameters
    ----------
    claim : float
        Claimed SD.
    df : float
        Degrees of freedom of the SD found.
    n_levels : int
        Levels tested together, each at 5 % over their number.

    Returns
    -------
    float
        claim x sqrt(chi-square quantile / df).

    References
    ----------
    CLSI EP15-A3 (2014).
    """
    return claim * math.sqrt(float(stats.chi2.ppf(1 - 0.05 / n_levels, df)) / df)


def total_error(bias: float, cv: float) -> float:
    """Return |bias| + 1.65 CV, the error that 95 % of results stay below."""
    return abs(bias) + ONE_SIDED_FACTOR * cv


def sigma_metric(bias: float, cv: float, allowable: float) -> float:
    """Return how many CVs lie between the bias and the allowable total error."""
    return (allowable - abs(bias)) / cv


@dataclass(frozen=True, slots=True)
class BiologicalGoals:
    """Desirable performance from biological variation, all in per cent.

    Attributes
    ----------
    cv, bias, total_error : float
        Largest desirable values.
    """

    cv: float
    bias: float
    total_error: float


def biological_goals(cv_within: float, cv_between: float) -> BiologicalGoals:
    """Return the desirable performance from biological variation.

    Parameters
    ----------
    cv_within, cv_between : float
        Within and between people, in per cent.

    Returns
    -------
    BiologicalGoals
        In per cent.

    References
    ----------
    Fraser, C. G. (2001). Biological Variation: From Principles to Practice.
    """
    cv = 0.5 * cv_within
    bias = 0.25 * math.hypot(cv_within, cv_between)
    return BiologicalGoals(cv, bias, ONE_SIDED_FACTOR * cv + bias)


def reference_change_value(cv_analytical: float, cv_within: float) -> float:
    """Return the change of one person that is more than noise, in per cent (95 %)."""
    return 1.96 * math.sqrt(2) * math.hypot(cv_analytical, cv_within)
