"""The shortlist as a table, with what the laboratory wants to know of each marker."""

import numpy as np
from numpy.typing import NDArray
from scipy.stats import t as student

from panelkit.costing import ProcedureData, Selected
from panelkit.fits import rank_univariate
from panelkit.metrics import auc
from panelkit.records import ShortlistTable

__all__ = ["shortlist_table"]


def shortlist_table(
    data: ProcedureData,
    selected: Selected,
    features: NDArray[np.object_],
    confidence: float,
) -> ShortlistTable:
    """Return every feature that was ever picked or is a candidate, best first.

    Parameters
    ----------
    data : ProcedureData
        Outcome, subjects, weights.
    selected : Selected
        Stability selection on all analysed samples.
    features : ndarray of shape (n_features,), object
        Feature ids.
    confidence : float
        Of the interval of the difference.

    Returns
    -------
    ShortlistTable
        Differences are positive minus negative class with Welch's interval, subjects
        being the independent units; the single-marker area is apparent.

    References
    ----------
    Welch 1947, Biometrika 34:28.
    """
    stability = selected.stability
    y = data.task.outcome()
    rows = np.arange(data.n_samples)
    ranked = rank_univariate(selected.view, y, rows, data.subjects, data.weights)
    candidate = np.zeros(len(features), np.bool_)
    candidate[stability.candidates] = True
    picked = np.zeros(len(features), np.bool_)
    picked[stability.shortlist] = True
    shown = np.flatnonzero(candidate | (stability.frequency > 0.0))
    order = np.lexsort(
        (shown, -np.abs(stability.t[shown]), -stability.frequency[shown])
    )
    shown = shown[order]
    values = selected.view.columns(shown, rows)
    share = data.weights / data.weights.sum()
    difference = ranked.means[shown, 1] - ranked.means[shown, 0]
    half = _half_width(data, ranked.variances[shown], confidence)
    higher = difference > 0.0
    area = np.array([auc(column, y, data.weights) for column in values])
    positive = stability.positive_share[shown]
    return ShortlistTable(
        feature=features[shown],
        frequency=stability.frequency[shown],
        frequency_low=stability.low[shown],
        frequency_high=stability.high[shown],
        sign=np.where(higher, "+", "-").astype(object),
        sign_share=np.where(higher, positive, 1.0 - positive),
        group=stability.group[shown],
        group_frequency=np.where(
            stability.group[shown] >= 0,
            stability.group_frequency[shown],
            stability.frequency[shown],
        ),
        picked=picked[shown],
        candidate=candidate[shown],
        mean_level=(values * share).sum(axis=1),
        difference=difference,
        difference_low=difference - half,
        difference_high=difference + half,
        single_marker_auc=np.where(higher, area, 1.0 - area),
        missing_share=np.isnan(data.base[shown]).mean(axis=1),
    )


def _half_width(
    data: ProcedureData, variances: NDArray[np.float64], confidence: float
) -> NDArray[np.float64]:
    """Return the half width of Welch's interval of a difference of two means."""
    units = np.array(
        [len(np.unique(data.subjects[data.task.strata == value])) for value in (0, 1)]
    )
    parts = variances / units
    total = parts.sum(axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        freedom = total**2 / (parts**2 / (units - 1)).sum(axis=1)
    quantile = student.ppf(0.5 + 0.5 * confidence, np.maximum(freedom, 1.0))
    return np.asarray(quantile * np.sqrt(total), np.float64)
