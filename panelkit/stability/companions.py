"""Companions: features that travel together."""

import numpy as np
from numpy.typing import NDArray
from scipy.cluster.hierarchy import fcluster, linkage
from scipy.spatial.distance import squareform

__all__ = ["group_companions", "group_frequencies"]


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
    centred = values - values.mean(axis=1, keepdims=True)
    length = np.sqrt((centred**2).sum(axis=1))
    constant = length <= 1e-12 * np.sqrt((values**2).sum(axis=1))
    centred /= np.where(constant, 1.0, length)[:, None]
    centred[constant] = 0.0
    distance = 1.0 - np.abs(np.einsum("ij,kj->ik", centred, centred))
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
