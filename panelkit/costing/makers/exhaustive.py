"""A maker that tries every panel of a short list."""

from collections.abc import Sequence
from itertools import combinations
from math import comb

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.makers.contract import Evidence
from panelkit.costing.makers.forward import improve_by_swaps
from panelkit.costing.makers.ranking import frequency_order

__all__ = ["LIMIT", "by_trying_all"]

LIMIT = 2000
"""Panels of one size that are tried; the short list shrinks with the size."""


def by_trying_all(evidence: Evidence, sizes: Sequence[int]) -> list[NDArray[np.int64]]:
    """Return the best of all panels of the most frequent candidates.

    For each size the longest list of most frequent candidates is taken of which at
    most 2,000 panels can be formed. Exact for the penalised loss on the training rows
    of that list, no more.
    """
    ranked = frequency_order(evidence)
    return [_best(evidence, ranked, min(size, len(ranked))) for size in sizes]


def _best(
    evidence: Evidence, ranked: NDArray[np.int64], size: int
) -> NDArray[np.int64]:
    length = size
    while length < len(ranked) and comb(length + 1, size) <= LIMIT:
        length += 1
    short = np.sort(ranked[:length])
    if length == size:
        return improve_by_swaps(evidence, np.sort(ranked), short)
    tried = [np.array(panel, np.int64) for panel in combinations(short, size)]
    return tried[int(evidence.objective(tried).round(12).argmin())]
