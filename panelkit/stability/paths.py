"""Frequencies at equal relative penalty: what happens along the path."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.fits import Family, fit_paths
from panelkit.records import MatrixSource, PathFrequencies, PathSet, SubsamplePlan
from panelkit.stability.selection import ShortlistRules

__all__ = ["trace_paths"]

N_SHOWN = 15


def trace_paths(
    source: MatrixSource,
    y: Any,
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    rules: ShortlistRules,
    *,
    family: Family = "binomial",
    threads: int = 1,
) -> PathFrequencies:
    """Return how often features are in the model at each relative penalty.

    Unlike the picks of the shortlist no refit is stopped at a number of markers.

    Parameters
    ----------
    source, y, weights, plan, rules, family, threads
        As for `select_markers`; the univariate selector is traced by the lasso.

    Returns
    -------
    PathFrequencies
        Of the features that are most frequent somewhere on the path.

    Raises
    ------
    FitError
        A subsample that cannot be fitted.

    References
    ----------
    Meinshausen & Buhlmann 2010, JRSS-B 72:417, figure 1.
    """
    paths = fit_paths(
        source,
        y,
        subsamples=plan.rows,
        family=family,
        n_penalties=rules.n_penalties,
        penalty_floor=rules.penalty_floor,
        mixing=rules.l1_share if rules.selector == "elastic-net" else 1.0,
        weights=weights,
        threads=threads,
    )
    n_refits, n_penalties = paths.penalties.shape
    counts = np.zeros((n_penalties, paths.n_features), np.int32)
    for b in range(n_refits):
        step = np.repeat(np.arange(n_penalties), np.diff(paths.coefficient_borders[b]))
        counts[step, paths.coefficient_features[b]] += 1
    share = counts / n_refits
    shown = np.argsort(-share.max(axis=0), kind="stable")[:N_SHOWN]
    shown = shown[share[:, shown].max(axis=0) > 0.0]
    relative = paths.penalties / paths.largest_penalty[:, None]
    return PathFrequencies(
        relative_penalty=np.nanmean(relative, axis=0),
        features=shown,
        frequency=share[:, shown],
        n_active=share.sum(axis=1),
        separated_share=_separated(source, y, plan, paths)
        if family == "binomial"
        else np.full(n_penalties, np.nan),
    )


def _separated(
    source: MatrixSource, y: NDArray[np.float64], plan: SubsamplePlan, paths: PathSet
) -> NDArray[np.float64]:
    """Return the share of refits that tell their own rows apart without an error."""
    n_refits, n_penalties = paths.penalties.shape
    apart = np.zeros(n_penalties)
    for b, rows in enumerate(plan.rows):
        features, at = np.unique(paths.coefficient_features[b], return_inverse=True)
        step = np.repeat(np.arange(n_penalties), np.diff(paths.coefficient_borders[b]))
        coefficients = np.zeros((n_penalties, len(features)))
        coefficients[step, at.ravel()] = paths.coefficient_values[b]
        values = np.array([source.column(int(j), rows) for j in features])
        values = values.reshape(len(features), len(rows))
        score = paths.intercepts[b][:, None] + np.einsum(
            "kj,ji->ki", coefficients, values
        )
        case = y[rows] > 0.5
        apart += score[:, case].min(axis=1) > score[:, ~case].max(axis=1)
    return np.asarray(apart / n_refits, np.float64)
