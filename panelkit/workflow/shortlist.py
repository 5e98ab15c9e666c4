"""The shortlist as a table, with what the laboratory wants to know of each marker."""

import numpy as np
from numpy.typing import NDArray
from scipy.stats import t as student

from panelkit.costing import ProcedureData, Selected
from panelkit.fits import rank_univariate
from panelkit.metrics import auc
from panelkit.records import ShortlistTable
from panelkit.workflow.marker_facts import MarkerFacts

__all__ = ["shortlist_table"]


def shortlist_table(
    data: ProcedureData,
    selected: Selected,
    features: NDArray[np.object_],
    confidence: float,
    facts: MarkerFacts,
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
    facts : MarkerFacts
        Symbols, assays, limits, replicates.

    Returns
    -------
    ShortlistTable
        For two classes: differences are positive minus negative class with Welch's
        interval, subjects being the independent units; the single-marker area is
        apparent. NaN for other outcomes, whose sign is that of the coefficients.

    References
    ----------
    Welch 1947, Biometrika 34:28.
    """
    stability = selected.stability
    rows = np.arange(data.n_samples)
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
    positive = stability.positive_share[shown]
    if data.task.family == "binomial":
        difference, half, area = _of_two_classes(
            data, selected, shown, values, confidence
        )
        higher = difference > 0.0
    else:
        difference = half = area = np.full(len(shown), np.nan)
        higher = np.nan_to_num(positive, nan=0.5) >= 0.5
    sign = np.where(higher, "+", "-").astype(object)
    if data.task.predictors:
        sign[:] = ""  # several classes: a marker points to each in its own way
    return ShortlistTable(
        feature=features[shown],
        frequency=stability.frequency[shown],
        frequency_low=stability.low[shown],
        frequency_high=stability.high[shown],
        sign=sign,
        sign_share=np.where(higher, positive, 1.0 - positive),
        group=stability.group[shown],
        group_frequency=np.where(
            stability.group[shown] >= 0,
            stability.group_frequency[shown],
            stability.frequency[shown],
        ),
        picked=picked[shown],
        candidate=candidate[shown],
        mean_level=values.mean(axis=1),
        difference=difference,
        difference_low=difference - half,
        difference_high=difference + half,
        single_marker_auc=np.where(higher, area, 1.0 - area),
        missing_share=np.isnan(data.base[shown]).mean(axis=1),
        below_limit_share=facts.below_limit_share[shown],
        replicate_icc=facts.replicate_icc[shown],
        symbol=facts.symbol[shown],
        assayable=facts.assayable[shown],
    )


def _of_two_classes(
    data: ProcedureData,
    selected: Selected,
    shown: NDArray[np.int64],
    values: NDArray[np.float64],
    confidence: float,
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return difference, half width of its interval, and area, of features shown."""
    y, rows = data.task.outcome(), np.arange(data.n_samples)
    ranked = rank_univariate(selected.view, y, rows, data.subjects, data.weights)
    difference = ranked.means[shown, 1] - ranked.means[shown, 0]
    half = _half_width(data, ranked.variances[shown], confidence)
    area = np.array([auc(column, y, data.weights) for column in values])
    return difference, half, area


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
