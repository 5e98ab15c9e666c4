"""Companions: features that travel together."""

import numpy as np
from numpy.typing import NDArray
from scipy.cluster.hierarchy import fcluster, linkage
from scipy.spatial.distance import squareform
from scipy.stats import rankdata

from panelkit.records import Companions, MatrixSource, Stability

__all__ = [
    "correlations",
    "describe_companions",
    "group_companions",
    "group_frequencies",
]

MOST_PAIRS = 200  # pairs outside groups that are shown
OFTEN = 0.1  # frequency from which a feature outside a group is compared
STRIKING = 3.0  # |z| from which such a pair is shown


def correlations(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return Pearson's correlations of the rows.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        Prepared values, or their ranks for Spearman's.

    Returns
    -------
    ndarray of shape (n_features, n_features)
        0 with a constant feature.
    """
    centred = values - values.mean(axis=1, keepdims=True)
    length = np.sqrt((centred**2).sum(axis=1))
    constant = length <= 1e-12 * np.sqrt((values**2).sum(axis=1))
    centred /= np.where(constant, 1.0, length)[:, None]
    centred[constant] = 0.0
    found: NDArray[np.float64] = np.einsum("ij,kj->ik", centred, centred)
    return found


def group_companions(
    values: NDArray[np.float64], correlation: float
) -> NDArray[np.int64]:
    """Return the companion group of each feature.

    Complete linkage on 1 - |Pearson|: every pair of a group has at least the asked
    correlation, of either sign.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        Prepared values of the training rows.
    correlation : float
        Smallest absolute correlation within a group.

    Returns
    -------
    ndarray of shape (n_features,), int64
        0, 1, ... in order of the group's first feature. A constant feature is a
        group of its own.
    """
    n_features = len(values)
    if n_features < 2:
        return np.zeros(n_features, np.int64)
    distance = 1.0 - np.abs(correlations(values))
    np.fill_diagonal(distance, 0.0)
    distance = np.clip(0.5 * (distance + distance.T), 0.0, 1.0)
    tree = linkage(squareform(distance, checks=False), method="complete")
    labels = fcluster(tree, 1.0 - correlation + 1e-12, criterion="distance")
    _, first, code = np.unique(labels, return_index=True, return_inverse=True)
    rank = np.empty(len(first), np.int64)
    rank[np.argsort(first)] = np.arange(len(first))
    return rank[code]


def group_frequencies(
    groups: NDArray[np.int64], picked: NDArray[np.bool_]
) -> NDArray[np.float64]:
    """Return, for each feature, how often any member of its group was picked.

    Parameters
    ----------
    groups : ndarray of shape (n_features,), int64
        From `group_companions`.
    picked : ndarray of shape (n_subsamples, n_features), bool
        What each subsample picked.

    Returns
    -------
    ndarray of shape (n_features,), float64
        Shares of subsamples.
    """
    shares = np.array(
        [picked[:, groups == g].any(axis=1).mean() for g in range(groups.max() + 1)]
    )
    return shares[groups]


def describe_companions(
    source: MatrixSource, rows: NDArray[np.int64], stability: Stability
) -> Companions:
    """Return how the members of groups, and other striking pairs, go together.

    Parameters
    ----------
    source : MatrixSource
        Prepared matrix.
    rows : ndarray of int64
        Training rows.
    stability : Stability
        What was picked and grouped.

    Returns
    -------
    Companions
        Every pair within a companion group that was picked at all, then the pairs
        outside groups that are picked together, or instead of one another, far more
        often than chance.

    References
    ----------
    Spearman 1904, American Journal of Psychology 15:72.
    """
    frequency, group = stability.frequency, stability.group
    size = np.bincount(group[group >= 0], minlength=1)
    grouped = (group >= 0) & (size[np.maximum(group, 0)] > 1)
    members = grouped & (stability.group_frequency > 0.0)
    features = np.flatnonzero(members | (frequency >= OFTEN))
    values = np.array([source.column(int(j), rows) for j in features])
    values = values.reshape(len(features), len(rows))
    pearson = correlations(values)
    spearman = correlations(rankdata(values, axis=1) if len(values) else values)
    picked = stability.picked[:, features].astype(np.float64)
    n = len(picked)
    together = np.einsum("bi,bj->ij", picked, picked) / n
    share = frequency[features]
    expected = np.outer(share, share)
    variance = expected * (1.0 - expected) / n
    z = (together - expected) / np.sqrt(np.where(variance > 0.0, variance, np.inf))
    same = (group[features][:, None] == group[features]) & grouped[features][:, None]
    first, second = np.triu_indices(len(features), 1)
    inside = same[first, second]
    often = (share[first] >= OFTEN) & (share[second] >= OFTEN)
    strike = np.where(~inside & often, np.abs(z[first, second]), 0.0)
    most = np.argsort(-strike, kind="stable")[:MOST_PAIRS]
    kept = np.concatenate([np.flatnonzero(inside), most[strike[most] > STRIKING]])
    first, second = first[kept], second[kept]
    own = np.where(inside[kept], group[features[first]], -1)
    return Companions(
        first=features[first],
        second=features[second],
        group=own,
        pearson=pearson[first, second],
        spearman=spearman[first, second],
        together=together[first, second],
        expected=expected[first, second],
        z=z[first, second],
        vote_split=_split_votes(stability)[features[first]] & (own >= 0),
    )


def _split_votes(stability: Stability) -> NDArray[np.bool_]:
    """Return features of groups that reach the threshold where no member does."""
    threshold = stability.bound.threshold - 1e-12
    group = stability.group
    split = np.zeros(len(group), np.bool_)
    for g in np.unique(group[group >= 0]):
        members = group == g
        reached = stability.group_frequency[members].max() >= threshold
        split[members] = reached and stability.frequency[members].max() < threshold
    return split
