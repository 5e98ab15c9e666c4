"""A maker that asks of each further marker what it adds to those chosen."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.makers.contract import Evidence

__all__ = ["by_forward_choice", "improve_by_swaps"]

SWAP_LIMIT = 10  # larger panels are grown, not swapped: too many pairs
ROUNDS = 3  # swaps of one panel
GAIN = 1e-9  # smaller gains are rounding


def by_forward_choice(
    evidence: Evidence, sizes: Sequence[int]
) -> list[NDArray[np.int64]]:
    """Return panels grown by the marker that adds most, mended by single swaps.

    What a marker adds is judged by the penalised loss of a refit on the training rows,
    given the markers chosen so far; of equals the smaller column. No claim is made that
    the best panel is found.
    """
    candidates = np.sort(evidence.candidates)
    panel = np.empty(0, np.int64)
    grown: dict[int, NDArray[np.int64]] = {0: panel}
    for size in range(1, min(max(sizes), len(candidates)) + 1):
        panel = _grow(evidence, candidates, panel)
        if size <= SWAP_LIMIT:
            panel = improve_by_swaps(evidence, candidates, panel)
        grown[size] = panel
    return [grown[min(size, len(candidates))] for size in sizes]


def _grow(
    evidence: Evidence, candidates: NDArray[np.int64], panel: NDArray[np.int64]
) -> NDArray[np.int64]:
    others = candidates[~np.isin(candidates, panel)]
    tried = [np.append(panel, feature) for feature in others]
    return tried[int(evidence.objective(tried).round(12).argmin())]


def improve_by_swaps(
    evidence: Evidence, candidates: NDArray[np.int64], panel: NDArray[np.int64]
) -> NDArray[np.int64]:
    """Return the panel after the single swaps that lower its loss most.

    Parameters
    ----------
    evidence : Evidence
        Its objective is used.
    candidates : ndarray of int64
        Features that may come in.
    panel : ndarray of int64
        Where to start.

    Returns
    -------
    ndarray of int64
        As many markers.
    """
    value = float(evidence.objective([panel])[0])
    for _round in range(ROUNDS):
        others = candidates[~np.isin(candidates, panel)]
        tried = [
            np.where(np.arange(len(panel)) == place, feature, panel)
            for place in range(len(panel))
            for feature in others
        ]
        if not tried:
            break
        values = evidence.objective(tried).round(12)
        best = int(values.argmin())
        if not values[best] < value - GAIN:
            break
        panel, value = tried[best], float(values[best])
    return panel
