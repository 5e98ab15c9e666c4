"""Makers that rank the candidates once and take the first ones."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.makers.contract import Evidence

__all__ = ["by_difference", "by_frequency", "by_group", "frequency_order"]


def frequency_order(evidence: Evidence) -> NDArray[np.int64]:
    """Return candidates, most frequent first; ties by |t|, then by column."""
    candidates = evidence.candidates
    order = np.lexsort(
        (candidates, -np.abs(evidence.t[candidates]), -evidence.frequency[candidates])
    )
    return candidates[order]


def by_frequency(evidence: Evidence, sizes: Sequence[int]) -> list[NDArray[np.int64]]:
    """Return the candidates picked most often; ties by |t|, then by column."""
    ranked = frequency_order(evidence)
    return [ranked[:size] for size in sizes]


def by_difference(evidence: Evidence, sizes: Sequence[int]) -> list[NDArray[np.int64]]:
    """Return the candidates with the largest |t|; ties by column."""
    candidates = evidence.candidates
    order = np.lexsort((candidates, -np.abs(evidence.t[candidates])))
    return [candidates[order][:size] for size in sizes]


def by_group(evidence: Evidence, sizes: Sequence[int]) -> list[NDArray[np.int64]]:
    """Return one member of each companion group, the groups picked most often first.

    The member is the most reliable between technical replicates where that is known,
    then the cheapest, then the one picked most often: companions carry nearly the same
    message, so the laboratory's reasons decide. Where groups run out, further members
    follow in order of frequency.
    """
    group, shares = evidence.group, evidence.group_frequency
    if group is None or shares is None:
        return by_frequency(evidence, sizes)
    ranked = frequency_order(evidence)
    # a feature that was not grouped is a group of its own
    code = np.where(group[ranked] >= 0, group[ranked], -1 - ranked)
    share = np.where(group[ranked] >= 0, shares[ranked], evidence.frequency[ranked])
    unreliable = -_known(evidence.reliability, ranked)
    dear = _known(evidence.price, ranked)
    place = np.arange(len(ranked))
    within = np.lexsort((place, dear, unreliable))
    _, first = np.unique(code[within], return_index=True)
    leaders = within[first]
    leaders = leaders[np.lexsort((leaders, -share[leaders]))]
    order = np.concatenate([leaders, np.setdiff1d(place, leaders)])
    return [ranked[order][:size] for size in sizes]


def _known(
    values: NDArray[np.float64] | None, features: NDArray[np.int64]
) -> NDArray[np.float64]:
    """Return values of features; what is unknown counts as the median of the known."""
    if values is None:
        return np.zeros(len(features))
    own = values[features]
    unknown = np.isnan(own)
    if unknown.all():
        return np.zeros(len(features))
    return np.where(unknown, np.median(own[~unknown]), own)
