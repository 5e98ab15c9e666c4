"""Samples to be measured on two platforms: how many, and which."""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SIZING
from panelkit.errors import UsageError
from panelkit.sizing.demands import (
    check_between,
    check_count,
    check_positive,
    smallest,
)
from panelkit.sizing.precision import normal_quantile

__all__ = ["BridgingSize", "bridging_size", "choose_bridging_set", "widths_of"]


@dataclass(frozen=True, slots=True)
class BridgingSize:
    """Samples by each demand, and the largest.

    Attributes
    ----------
    shift : int
        For the mean difference of the platforms.
    concordance : int
        For their correlation.
    limits : int
        For the limits of agreement.
    samples : int
        The largest.
    """

    shift: int
    concordance: int
    limits: int
    samples: int


def bridging_size(
    difference_sd: float,
    shift: float,
    correlation: float,
    correlation_width: float = SIZING.concordance_width,
    limits_width: float = SIZING.limits_width,
    confidence: float = SIZING.confidence,
) -> BridgingSize:
    """Return how many samples to measure on two platforms, for one marker.

    Parameters
    ----------
    difference_sd : float
        SD of the difference of the two readings of a sample.
    shift : float
        Half-width wanted of the interval of the mean difference.
    correlation : float
        Expected, of the two platforms.
    correlation_width : float
        Full width wanted of its interval.
    limits_width : float
        Half-width wanted of the interval of a limit of agreement, in SD of the
        differences.
    confidence : float
        Two-sided.

    Returns
    -------
    BridgingSize
        Student's t for the mean difference, Fisher's z for the correlation.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Bland & Altman 1999, Stat Methods Med Res 8:135, section 2 (limits of agreement);
    Bonett & Wright 2000, Psychometrika 65:23 (correlation).
    """
    check_positive("SD of the differences", difference_sd)
    check_positive("shift", shift)
    check_between("correlation", correlation, -1.0, 1.0)
    check_between("width of the correlation", correlation_width, 0.0, 2.0)
    check_positive("width of the limits of agreement", limits_width)

    def met(which: int, wanted: float) -> Callable[[int], bool]:
        return lambda n: (
            widths_of(n, difference_sd, correlation, confidence)[which] <= wanted
        )

    by_shift = smallest(met(0, shift), "shift", 4)
    by_correlation = smallest(met(1, correlation_width), "width of the correlation", 4)
    by_limits = smallest(met(2, limits_width), "width of the limits of agreement", 4)
    return BridgingSize(
        by_shift, by_correlation, by_limits, max(by_shift, by_correlation, by_limits)
    )


def widths_of(
    n: int, difference_sd: float, correlation: float, confidence: float
) -> tuple[float, float, float]:
    """Return how well n samples, at least 4, tell how two platforms differ.

    Parameters
    ----------
    n : int
        Samples.
    difference_sd, correlation, confidence : float
        As for `bridging_size`.

    Returns
    -------
    shift, correlation, limits : float
        Half-width of the mean difference; full width of the correlation; half-width of
        a limit of agreement in SD of the differences.

    References
    ----------
    Bland & Altman 1999, Stat Methods Med Res 8:135; Bonett & Wright 2000,
    Psychometrika 65:23.
    """
    from scipy import stats

    z = normal_quantile(confidence)
    t = float(stats.t.ppf(0.5 + confidence / 2.0, n - 1))
    centre = math.atanh(correlation)
    half = z / math.sqrt(n - 3) if n > 3 else math.inf
    return (
        t * difference_sd / math.sqrt(n),
        math.tanh(centre + half) - math.tanh(centre - half),
        z * math.sqrt(1.0 / n + z * z / (2.0 * (n - 1))),
    )


def choose_bridging_set(
    values: NDArray[np.float64], outcome: NDArray[np.float64], size: int
) -> NDArray[np.int64]:
    """Return samples that span every marker's range in both classes.

    Parameters
    ----------
    values : ndarray of shape (n_samples, n_markers)
        Of the panel's markers on the discovery platform; finite.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    size : int
        Samples wanted.

    Returns
    -------
    ndarray of shape (size,), int64
        In the order chosen: lowest and highest of each marker first, then always the
        sample farthest from those chosen, of the class that is behind its share.

    Raises
    ------
    UsageError
        More samples than there are.

    References
    ----------
    Gonzalez 1985, Theor Comput Sci 38:293: the farthest-first rule is within twice the
    best covering radius.
    """
    check_count("size of the bridging set", size, 2)
    n_samples = len(values)
    if size > n_samples:
        raise UsageError(
            code="bridging-set-too-large",
            where="size of the bridging set",
            what=f"{size} samples are wanted of {n_samples}",
            accepted=f"at most {n_samples}",
            next_step="Ask for fewer, or use the size of the cohort",
        )
    spread = values.std(axis=0)
    scaled = (values - values.mean(axis=0)) / np.where(spread > 0.0, spread, 1.0)
    ends = np.column_stack([scaled.argmin(axis=0), scaled.argmax(axis=0)]).ravel()
    chosen = [int(k) for k in dict.fromkeys(ends.tolist())][:size]
    nearest = np.full(n_samples, np.inf)
    for k in chosen:
        nearest = np.minimum(nearest, ((scaled - scaled[k]) ** 2).sum(axis=1))
    share = float(outcome.mean())
    while len(chosen) < size:
        left = np.ones(n_samples, np.bool_)
        left[chosen] = False
        wanted = float(outcome[chosen].sum() < share * (len(chosen) + 1))
        own = left & (outcome == wanted)
        able = own if own.any() else left
        best = int(np.flatnonzero(able)[np.argmax(nearest[able])])
        chosen.append(best)
        nearest = np.minimum(nearest, ((scaled - scaled[best]) ** 2).sum(axis=1))
    return np.array(chosen, np.int64)
