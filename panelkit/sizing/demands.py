"""What may be asked: shares, widths, counts, each refused in one sentence."""

import math
from collections.abc import Callable

from panelkit.errors import UsageError

__all__ = [
    "LARGEST",
    "check_area",
    "check_between",
    "check_count",
    "check_positive",
    "check_share",
    "smallest",
]

LARGEST = 10**9


def check_between(name: str, value: float, low: float, high: float) -> None:
    """Refuse a value that is not strictly between two bounds.

    Raises
    ------
    UsageError
        Not a number, or outside.
    """
    if not (math.isfinite(value) and low < value < high):
        raise UsageError(
            code="value-out-of-range",
            where=name,
            what=f"no study can have this value (got {value:g})",
            accepted=f"a number above {low:g} and below {high:g}",
            next_step=f"Correct the {name}",
        )


def check_share(name: str, value: float) -> None:
    """Refuse a share that is not strictly between 0 and 1.

    Raises
    ------
    UsageError
        Not a number, or outside.
    """
    if math.isfinite(value) and 1.0 < value <= 100.0:
        raise UsageError(
            code="share-above-one",
            where=name,
            what=f"a share lies between 0 and 1 (got {value:g})",
            accepted="a number above 0 and below 1",
            next_step=f"Write {value:g} % as {value / 100:g}, if that is what is meant",
        )
    check_between(name, value, 0.0, 1.0)


def check_area(name: str, value: float) -> None:
    """Refuse an area under the ROC curve that is not above one half and below 1.

    Raises
    ------
    UsageError
        Not a number, or outside.
    """
    check_between(name, value, 0.5, 1.0)


def check_positive(name: str, value: float) -> None:
    """Refuse what is not a finite number above 0.

    Raises
    ------
    UsageError
        Not a number, 0 or less.
    """
    if not (math.isfinite(value) and value > 0.0):
        raise UsageError(
            code="value-not-positive",
            where=name,
            what=f"it has to be more than nothing (got {value:g})",
            accepted="a number above 0",
            next_step=f"Correct the {name}",
        )


def check_count(name: str, value: int, least: int = 1) -> None:
    """Refuse a count below the least or beyond anything that can be meant.

    Raises
    ------
    UsageError
        Outside.
    """
    if not least <= value <= LARGEST:
        raise UsageError(
            code="count-out-of-range",
            where=name,
            what=f"this number cannot be meant (got {value})",
            accepted=f"a whole number from {least} to {LARGEST:,}",
            next_step=f"Correct the {name}",
        )


def smallest(enough: Callable[[int], bool], what: str, start: int = 2) -> int:
    """Return the smallest whole number from `start` on that is enough.

    `enough` has to stay true once it is.

    Raises
    ------
    UsageError
        None up to a thousand million is.
    """
    high = start
    while not enough(high):
        if high > LARGEST:
            raise UsageError(
                code="size-out-of-reach",
                where=what,
                what=f"more than {LARGEST:,} people would be needed",
                accepted="a demand that some study can meet",
                next_step="Ask for a wider interval or a larger difference",
            )
        high *= 2
    low = max(start - 1, high // 2)
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if enough(middle) else (middle, high)
    return high
