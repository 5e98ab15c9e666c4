"""Accuracy of risk scores for times that may be censored."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError

__all__ = [
    "censoring_curve",
    "concordance",
    "horizon_auc",
    "horizon_brier",
    "uno_concordance",
]


def _usable(
    time: NDArray[np.float64],
    event: NDArray[np.float64],
    strata: NDArray[np.int64] | None,
) -> NDArray[np.bool_]:
    """Return whether sample i is known to fail before sample j, (n, n)."""
    failed = event[:, None] > 0.5
    earlier = time[:, None] < time[None, :]
    same = (time[:, None] == time[None, :]) & (event[None, :] < 0.5)
    usable = failed & (earlier | same)
    if strata is not None:
        usable &= strata[:, None] == strata[None, :]
    return np.asarray(usable, np.bool_)


def _concordant(risk: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return 1 where i has the higher risk than j, one half for ties."""
    above = risk[:, None] > risk[None, :]
    tied = risk[:, None] == risk[None, :]
    return np.asarray(above + 0.5 * tied, np.float64)


def concordance(
    risk: NDArray[np.float64],
    time: NDArray[np.float64],
    event: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
    strata: NDArray[np.int64] | None = None,
) -> tuple[float, NDArray[np.float64]]:
    """Return Harrell's concordance of risk scores, and each sample's influence.

    A pair counts when it is known who fails first: the shorter time is an event; of
    two equal times exactly one is an event, which counts as the earlier. Tied risks
    count one half.

    Parameters
    ----------
    risk : ndarray of shape (n_samples,)
        Higher means earlier failure.
    time, event : ndarray of shape (n_samples,)
        Follow-up time; 1 for an event, 0 for censored.
    weights : ndarray of shape (n_samples,), optional
        Observation weights; a pair counts with the product.
    strata : ndarray of shape (n_samples,), int64, optional
        Only pairs within a stratum (a matched set, a site) count.

    Returns
    -------
    concordance : float
        Between 0 and 1; NaN where a score is missing.
    influence : ndarray of shape (n_samples,)
        First-order influence of each sample; sums to zero.

    Raises
    ------
    FitError
        No pair can be compared.

    References
    ----------
    Harrell et al. 1982, JAMA 247:2543; Harrell, Lee & Mark 1996, Stat Med 15:361.
    """
    pairs = _usable(time, event, strata).astype(np.float64)
    if weights is not None:
        pairs *= weights[:, None] * weights[None, :]
    total = float(pairs.sum())
    if not total > 0.0:
        raise FitError(
            code="no-comparable-pair",
            where="concordance",
            what=f"no pair of {len(time)} samples can be ordered "
            f"({int(event.sum())} events)",
            accepted="an event before another sample's time",
            next_step="Use fewer folds, so that each holds events",
        )
    if np.isnan(risk).any():
        return float("nan"), np.full(len(risk), np.nan)
    hits = pairs * _concordant(risk)
    value = float(hits.sum()) / total
    ends = hits.sum(axis=0) + hits.sum(axis=1)
    possible = pairs.sum(axis=0) + pairs.sum(axis=1)
    return value, (ends - value * possible) / total


def censoring_curve(
    time: NDArray[np.float64], event: NDArray[np.float64], at: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return the chance of still being under observation just before given times.

    Parameters
    ----------
    time, event : ndarray of shape (n_samples,)
        Follow-up; 1 for an event, 0 for censored.
    at : ndarray of shape (n_times,)
        Times; the left limit is taken.

    Returns
    -------
    ndarray of shape (n_times,)
        Kaplan-Meier estimate with censoring as the event; events of the same time come
        first.

    References
    ----------
    Kaplan & Meier 1958, J Am Stat Assoc 53:457.
    """
    moments = np.unique(time[event < 0.5])
    remaining = np.ones(len(moments) + 1)
    for k, moment in enumerate(moments):
        gone = int(((time == moment) & (event < 0.5)).sum())
        # those with an event at this very time are no longer at risk of censoring
        at_risk = int((time > moment).sum()) + gone
        remaining[k + 1] = remaining[k] * (1.0 - gone / at_risk)
    return np.asarray(remaining[np.searchsorted(moments, at, "left")], np.float64)


def uno_concordance(
    risk: NDArray[np.float64],
    time: NDArray[np.float64],
    event: NDArray[np.float64],
    horizon: float,
) -> float:
    """Return Uno's concordance: pairs weighted against censoring, up to a horizon.

    Parameters
    ----------
    risk, time, event
        As for `concordance`.
    horizon : float
        Events from this time on are left out.

    Returns
    -------
    float
        Between 0 and 1.

    Raises
    ------
    FitError
        No event before the horizon, or nobody under observation there.

    References
    ----------
    Uno et al. 2011, Stat Med 30:1105.
    """
    early = (event > 0.5) & (time < horizon)
    under = censoring_curve(time, event, time)
    if not early.any() or not under[early].min() > 0.0:
        raise _no_event(horizon)
    weight = np.zeros(len(time))
    weight[early] = 1.0 / under[early] ** 2
    pairs = weight[:, None] * _usable(time, event, None)
    return float((pairs * _concordant(risk)).sum() / pairs.sum())


def _weights_at(
    time: NDArray[np.float64], event: NDArray[np.float64], horizon: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return inverse-censoring weights of those who failed, and of those beyond."""
    failed = (time <= horizon) & (event > 0.5)
    beyond = time > horizon
    if not failed.any() or not beyond.any():
        raise _no_event(horizon)
    under = censoring_curve(time, event, time)
    # under observation at the horizon: those censored exactly there have left
    at_horizon = censoring_curve(time, event, np.nextafter([horizon], np.inf))[0]
    weight_failed = np.where(failed, 1.0 / np.where(failed, under, 1.0), 0.0)
    return weight_failed, np.where(beyond, 1.0 / at_horizon, 0.0)


def _no_event(horizon: float) -> FitError:
    return FitError(
        code="horizon-without-events",
        where="accuracy at the horizon",
        what=f"no event before {horizon:g}, or nobody is followed beyond it",
        accepted="a horizon with events before it and samples after it",
        next_step="Name another [cohort] horizon",
    )


def horizon_brier(
    chance: NDArray[np.float64],
    time: NDArray[np.float64],
    event: NDArray[np.float64],
    horizon: float,
) -> float:
    """Return the Brier score of predicted chances of an event by the horizon.

    Parameters
    ----------
    chance : ndarray of shape (n_samples,)
        Predicted chance of an event by the horizon.
    time, event
        As for `concordance`.
    horizon : float
        Time.

    Returns
    -------
    float
        Weighted against censoring.

    Raises
    ------
    FitError
        No event before the horizon, or nobody beyond it.

    References
    ----------
    Graf et al. 1999, Stat Med 18:2529.
    """
    failed, beyond = _weights_at(time, event, horizon)
    return float((failed * (1.0 - chance) ** 2 + beyond * chance**2).sum() / len(time))


def horizon_auc(
    risk: NDArray[np.float64],
    time: NDArray[np.float64],
    event: NDArray[np.float64],
    horizon: float,
) -> float:
    """Return the area under the ROC curve of events by the horizon against none.

    Parameters
    ----------
    risk, time, event
        As for `concordance`.
    horizon : float
        Samples with an event by then are cases, those followed beyond it controls;
        weights make up for the censored.

    Returns
    -------
    float
        Between 0 and 1.

    Raises
    ------
    FitError
        No event before the horizon, or nobody beyond it.

    References
    ----------
    Uno et al. 2007, J Am Stat Assoc 102:527; Hung & Chiang 2010, Can J Stat 38:8.
    """
    failed, beyond = _weights_at(time, event, horizon)
    pairs = failed[:, None] * beyond[None, :]
    return float((pairs * _concordant(risk)).sum() / pairs.sum())
