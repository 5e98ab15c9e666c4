"""A maker whose penalties follow what each marker costs."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.makers.contract import Evidence
from panelkit.errors import StudyFileError

__all__ = ["by_weighted_price", "price_weights"]

POWER = 0.5  # between ignoring prices (0) and weighing in proportion to them (1)
CLIP = 4.0


def price_weights(
    prices: NDArray[np.float64], power: float = POWER, clip: float = CLIP
) -> NDArray[np.float64]:
    """Return the feature weights of an L1 penalty from what each marker costs.

    Parameters
    ----------
    prices : ndarray of shape (n_markers,)
        What each marker costs by itself; NaN where unknown.
    power : float
        0 ignores prices, 1 weighs in proportion.
    clip : float
        Largest weight; the smallest is its inverse.

    Returns
    -------
    ndarray of shape (n_markers,)
        Around the geometric mean of the known prices; 1 where the price is unknown.
    """
    known = np.isfinite(prices) & (prices > 0.0)
    weights = np.ones(len(prices))
    if known.any():
        centre = np.exp(np.log(prices[known]).mean())
        weights[known] = (prices[known] / centre) ** power
    weights[np.isfinite(prices) & (prices <= 0.0)] = 1.0 / clip
    return np.clip(weights, 1.0 / clip, clip)


def by_weighted_price(
    evidence: Evidence, sizes: Sequence[int]
) -> list[NDArray[np.int64]]:
    """Return candidates in the order in which a price-weighted L1 path picks them.

    One fit of all training rows; the panels are refitted without the weights.
    Candidates that the path never picks follow by frequency.

    Raises
    ------
    StudyFileError
        Nothing is priced.
    """
    if evidence.price is None:
        raise StudyFileError(
            code="maker-needs-prices",
            where="[panels] makers, 'price-weighted'",
            what="nothing is priced",
            accepted="a study with [programme], platforms and [panels] prices",
            next_step="Add prices, or leave the maker out",
        )
    candidates = np.sort(evidence.candidates)
    weights = np.full(len(evidence.frequency), np.inf)
    weights[candidates] = price_weights(evidence.price[candidates])
    picked = evidence.entry_order(weights)
    rest = candidates[~np.isin(candidates, picked)]
    rest = rest[np.lexsort((rest, -evidence.frequency[rest]))]
    order = np.concatenate([picked, rest])
    return [order[:size] for size in sizes]
