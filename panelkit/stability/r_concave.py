"""The largest tail of an r-concave distribution with a given mean."""

import math

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import UsageError

__all__ = ["r_concave_tail"]

GRID = 40  # places of the coarse search for each support
GOLDEN = 0.5 * (math.sqrt(5.0) - 1.0)
FARTHEST = 60.0  # log shift, also times s, where the family is at its limit


def r_concave_tail(mean: float, cutoff: float, n_draws: int, exponent: float) -> float:
    """Return the largest P(X >= cutoff) over r-concave distributions on a grid.

    X lies on 0, 1/B, ..., 1, has at most the given mean, a support without gaps, and
    its probabilities to the power `exponent` are a convex sequence. A maximiser has
    probabilities proportional to (a + i)^(1 / exponent) for i = 0..k and anything up to
    the next of them at k + 1; the mean is exact. a is searched for every k.

    Parameters
    ----------
    mean : float
        Largest mean.
    cutoff : float
        Between 0 and 1.
    n_draws : int
        B, the grid's steps.
    exponent : float
        Below 0: -1/2 and -1/4 are those of the bound.

    Returns
    -------
    float
        D(mean, cutoff, B, exponent); 1 where the cut-off is at most twice the mean,
        which is safe.

    Raises
    ------
    UsageError
        An exponent that is not below 0.

    References
    ----------
    Shah & Samworth 2013, JRSS-B 75:55, equation 8 and appendix; computed here from the
    definition.
    """
    if not exponent < 0.0:
        raise UsageError(
            code="exponent-not-negative",
            where="exponent",
            what=f"not below 0 (got {exponent:g})",
            accepted="-1/2 and -1/4 for the published bound",
            next_step="Give a negative exponent",
        )
    if mean <= 0.0:
        return 0.0 if cutoff > 0.0 else 1.0
    if cutoff <= 2.0 * mean:
        return 1.0
    first = math.ceil(cutoff * n_draws - 1e-9)
    family = _Family(mean * n_draws, first, n_draws, -1.0 / exponent)
    return max(family.best(last) for last in range(max(first - 1, 0), n_draws))


class _Family:
    """Tails of the extremal distributions of one mean and cut-off."""

    def __init__(self, mean: float, first: int, n_draws: int, power: float) -> None:
        self.mean = mean
        self.first = first
        self.power = power
        self.steps = np.arange(n_draws + 2, dtype=np.float64)

    def weights(self, log_shift: NDArray[np.float64], last: int) -> NDArray[np.float64]:
        """Return (1 + i / a)^-s for i = 0..last, one row a shift."""
        ratio = self.steps[: last + 1] * np.exp(-log_shift)[:, None]
        found: NDArray[np.float64] = np.exp(-self.power * np.log1p(ratio))
        return found

    def shift_of_mean(self, last: int) -> float:
        """Return the log shift at which the plain family on 0..last has the mean.

        The mean grows with the shift, to `last` / 2.
        """
        low, high = -min(600.0, FARTHEST * max(1.0, 1.0 / self.power)), FARTHEST
        if self.mean >= 0.5 * last:
            return high
        steps = self.steps[: last + 1]
        for _ in range(80):
            middle = 0.5 * (low + high)
            weights = self.weights(np.array([middle]), last)[0]
            if (steps * weights).sum() < self.mean * weights.sum():
                low = middle
            else:
                high = middle
        return 0.5 * (low + high)

    def tail(self, log_shift: NDArray[np.float64], last: int) -> NDArray[np.float64]:
        """Return P(X >= cut-off) with the mass at last + 1 that keeps the mean."""
        weights = self.weights(log_shift, last)
        below = weights[:, : self.first].sum(axis=1)
        distance = (last + 1.0 - self.steps[: last + 1]) * weights
        found: NDArray[np.float64] = 1.0 - (last + 1.0 - self.mean) * below / (
            distance.sum(axis=1)
        )
        return found

    def best(self, last: int) -> float:
        """Return the largest tail with atoms up to last + 1."""
        low, high = self.shift_of_mean(last + 1), self.shift_of_mean(last)
        places = np.linspace(low, high, GRID)
        tails = self.tail(places, last)
        top = int(tails.argmax())
        left = places[max(top - 1, 0)]
        right = places[min(top + 1, GRID - 1)]
        inner = right - GOLDEN * (right - left), left + GOLDEN * (right - left)
        values = self.tail(np.array(inner), last)
        for _ in range(60):
            if values[0] < values[1]:
                left, inner = (
                    inner[0],
                    (inner[1], inner[0] + GOLDEN * (right - inner[0])),
                )
            else:
                right, inner = (
                    inner[1],
                    (inner[1] - GOLDEN * (inner[1] - left), inner[0]),
                )
            values = self.tail(np.array(inner), last)
        return float(max(tails[top], values.max()))
