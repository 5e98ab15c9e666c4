"""What a panel is worth when markers fail (section 3e)."""

from collections.abc import Callable, Sequence
from itertools import combinations

__all__ = ["expected_area", "overtaking_chance", "worst_single_loss"]

Area = Callable[[tuple[str, ...]], float]


def worst_single_loss(markers: Sequence[str], area: Area) -> float:
    """Return the lowest accuracy after the loss of one marker.

    Parameters
    ----------
    markers : sequence of str
        The panel, at least two markers.
    area : callable
        From the markers that are left to their accuracy, learnt anew.

    Returns
    -------
    float
        A panel survives one failure at a floor if this reaches the floor.
    """
    return min(area(tuple(m for m in markers if m != lost)) for lost in markers)


def expected_area(markers: Sequence[str], area: Area, chance: float) -> float:
    """Return the expected accuracy when each marker fails with one chance.

    Parameters
    ----------
    markers : sequence of str
        The panel; the sum goes over all its subsets, so at most about twelve.
    area : callable
        From the markers that are left to their accuracy; of none too.
    chance : float
        Of the failure of each, independently.

    Returns
    -------
    float
        Exact.
    """
    n = len(markers)
    return sum(
        chance ** (n - k) * (1 - chance) ** k * area(left)
        for k in range(n + 1)
        for left in combinations(markers, k)
    )


def overtaking_chance(
    nominal: Sequence[str], robust: Sequence[str], area: Area
) -> float | None:
    """Return the chance of failure from which a robust panel is the better one.

    Parameters
    ----------
    nominal, robust : sequence of str
        The panel that is best with all markers, and the one that bears losses.
    area : callable
        From markers to accuracy.

    Returns
    -------
    float or None
        By bisection below one half; None where the robust panel is not better there.
    """

    def behind(chance: float) -> bool:
        gain = expected_area(robust, area, chance)
        return gain < expected_area(nominal, area, chance)

    low, high = 0.0, 0.5
    if not behind(low) or behind(high):
        return None
    while high - low > 1e-9:
        middle = (low + high) / 2
        low, high = (middle, high) if behind(middle) else (low, middle)
    return (low + high) / 2
