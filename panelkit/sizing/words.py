"""Numbers in the sentences of an answer, and the range of sizes around it."""

import math
from collections.abc import Sequence

from panelkit.sizing.demands import LARGEST

__all__ = ["SMALL_PRINT", "figures", "largest_of", "percent", "sizes_around", "whole"]

FACTORS = (0.25, 0.5, 0.75, 1.0, 1.25, 1.5, 2.0, 3.0)
LEAST_SIZE = 10

SMALL_PRINT = (
    "Nobody drops out, and every sample gives a result: add what is usually lost.",
    "For research and planning only; a statistician has to agree to a study's size.",
)


def figures(value: float) -> str:
    """Return a number with three figures, whole from 1,000."""
    if not math.isfinite(value):
        return "no limit" if value > 0 else "unknown"
    return f"{value:,.0f}" if abs(value) >= 1000.0 else f"{value:.3g}"


def percent(share: float) -> str:
    """Return a share in percent with three figures."""
    return "no limit" if math.isinf(share) else f"{figures(100.0 * share)} %"


def whole(number: float) -> str:
    """Return a count with separators between thousands."""
    return f"{number:,.0f}"


def sizes_around(people: int) -> list[int]:
    """Return rising numbers of people around an answer, itself among them."""
    sizes = {max(LEAST_SIZE, math.ceil(factor * people)) for factor in FACTORS}
    return sorted(min(size, LARGEST) for size in sizes | {people})


def largest_of(demands: Sequence[tuple[str, float]]) -> str:
    """Return the name of the demand that needs most."""
    return max(demands, key=lambda each: -1.0 if math.isnan(each[1]) else each[1])[0]
