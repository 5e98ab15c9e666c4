"""What a maker is given and what it hands back."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

__all__ = ["Evidence", "Maker"]


def _no_fits(panels: Sequence[NDArray[np.int64]]) -> NDArray[np.float64]:
    return np.zeros(len(panels))


def _no_path(weights: NDArray[np.float64]) -> NDArray[np.int64]:
    return np.empty(0, np.int64)


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """What a maker may know, learnt on training rows alone.

    Attributes
    ----------
    candidates : ndarray of int64
        Features that may be chosen.
    frequency : ndarray of shape (n_features,)
        How often (or, on a single half, how early) each feature was picked.
    t : ndarray of shape (n_features,)
        Univariate statistic; larger sizes are stronger.
    group : ndarray of shape (n_features,), int64, or None
        Companion group, -1 for features that were not grouped.
    group_frequency : ndarray of shape (n_features,) or None
        How often a member of the feature's group was picked.
    price : ndarray of shape (n_features,) or None
        What each marker costs alone, NaN where unknown; None: nothing is priced.
    reliability : ndarray of shape (n_features,) or None
        Intraclass correlation of technical replicates, NaN where unknown.
    own : ndarray of int64 or None
        The user's own list, in the order given; None where there is none.
    objective : callable
        Panels (arrays of features) to the penalised loss of each one's fit on the
        training rows: smaller is better there, and too good elsewhere.
    entry_order : callable
        Feature weights to candidates in the order in which an L1 path picks them.
    """

    candidates: NDArray[np.int64]
    frequency: NDArray[np.float64]
    t: NDArray[np.float64]
    group: NDArray[np.int64] | None = None
    group_frequency: NDArray[np.float64] | None = None
    price: NDArray[np.float64] | None = None
    reliability: NDArray[np.float64] | None = None
    own: NDArray[np.int64] | None = None
    objective: Callable[[Sequence[NDArray[np.int64]]], NDArray[np.float64]] = field(
        default=_no_fits
    )
    entry_order: Callable[[NDArray[np.float64]], NDArray[np.int64]] = field(
        default=_no_path
    )

    def without(self, feature: int) -> "Evidence":
        """Return the same evidence with one candidate forbidden."""
        return replace(self, candidates=self.candidates[self.candidates != feature])


class Maker(Protocol):
    """Proposes panels; the same procedure in every fold."""

    def __call__(
        self, evidence: Evidence, sizes: Sequence[int]
    ) -> list[NDArray[np.int64]]:
        """Return a panel for each size: at most that many of the candidates."""
        ...
