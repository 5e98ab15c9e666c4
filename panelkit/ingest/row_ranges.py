"""Ranges of numbers or dates in which cells of the sample sheet may lie."""

import datetime
import re
from calendar import monthrange
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import is_missing
from panelkit.ingest.outcome_number import numbers_of
from panelkit.ingest.sheet import Text
from panelkit.ingest.wording import figure

__all__ = ["BOUNDS", "Range", "read_range"]

BOUNDS: Final = ("min", "max", "from", "to")
_DATE = re.compile(r"(\d{4})(?:-(\d{2})(?:-(\d{2}))?)?(?:[T ]\d{2}:\d{2}\S*)?")
_FIRST, _LAST = (1, 1, 1), (9999, 12, 31)

Day = tuple[int, int, int]


@dataclass(frozen=True, slots=True)
class Range:
    """A range, both ends included.

    Attributes
    ----------
    low, high : float or None
        Ends of a range of numbers.
    first, last : tuple of int or None
        Ends of a range of dates: year, month, day.
    words : str
        The range in words: "at least 18 and at most 65".
    """

    low: float | None
    high: float | None
    first: Day | None
    last: Day | None
    words: str

    @property
    def kind(self) -> str:
        """What the cells have to be: numbers or dates."""
        return "dates" if self.first is not None else "numbers"

    def holds(self, cells: Text) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Return which cells lie inside, and which cannot be read.

        Parameters
        ----------
        cells : ndarray of shape (n_rows,), object
            As written. A date may be a month or a year: it lies inside when all of it
            does.

        Returns
        -------
        inside, unreadable : ndarray of shape (n_rows,), bool
            A missing cell is neither.
        """
        missing = np.array([is_missing(cell) for cell in cells], bool)
        if self.first is None:
            numbers = numbers_of(cells)
            low = -np.inf if self.low is None else self.low
            high = np.inf if self.high is None else self.high
            return (numbers >= low) & (numbers <= high), np.isnan(numbers) & ~missing
        spans = [_span(cell) for cell in cells]
        inside = [
            span is not None and self.first <= span[0] and span[1] <= (self.last or ())
            for span in spans
        ]
        unreadable = np.array([span is None for span in spans], bool)
        return np.array(inside, bool), unreadable & ~missing


def read_range(wanted: Mapping[str, Any]) -> Range | None:
    """Return the range that a mapping describes, None when it describes none.

    Parameters
    ----------
    wanted : mapping
        `min`, `max` or both, numbers; or `from`, `to` or both, numbers or dates
        (a date, or text as ``"2019"``, ``"2019-06"`` or ``"2019-06-30"``).

    Returns
    -------
    Range or None
        None also when it holds nothing, or its ends are of two kinds.
    """
    pairs = [("min", "max"), ("from", "to")]
    chosen = [pair for pair in pairs if wanted and set(wanted) <= set(pair)]
    if not chosen:
        return None
    low, high = (wanted.get(name) for name in chosen[0])
    dated = {
        isinstance(end, str | datetime.date) for end in (low, high) if end is not None
    }
    if chosen[0] == pairs[1] and True in dated:
        return _dates(low, high) if dated == {True} else None
    return _numbers(low, high)


def _numbers(low: Any, high: Any) -> Range | None:
    ends: list[float | None] = []
    for end in (low, high):
        try:
            ends.append(None if end is None else float(end))
        except (TypeError, ValueError):
            return None
    first, last = ends
    if first is not None and last is not None and not first <= last:
        return None
    if any(end is not None and np.isnan(end) for end in ends):
        return None
    bounds = [] if first is None else [f"at least {_plain(first)}"]
    bounds += [] if last is None else [f"at most {_plain(last)}"]
    return Range(first, last, None, None, " and ".join(bounds))


def _plain(value: float) -> str:
    # a year is no quantity: 2019, never 2,019
    return str(int(value)) if value.is_integer() and value < 1e6 else figure(value)


def _dates(first: Any, last: Any) -> Range | None:
    # the day alone counts, also of a date with a clock
    ends = [None if end is None else _span(str(end)) for end in (first, last)]
    if any(
        given is not None and end is None
        for given, end in zip((first, last), ends, strict=True)
    ):
        return None
    start = _FIRST if ends[0] is None else ends[0][0]
    stop = _LAST if ends[1] is None else ends[1][1]
    if start > stop:
        return None
    bounds = [] if first is None else [f"from {first}"]
    bounds += [] if last is None else [f"to {last}"]
    return Range(None, None, start, stop, " ".join(bounds))


def _span(text: str) -> tuple[Day, Day] | None:
    """Return first and last day of a date, month or year; None for anything else."""
    match = _DATE.fullmatch(text.strip())
    if match is None:
        return None
    year, month, day = (None if part is None else int(part) for part in match.groups())
    assert year is not None  # the pattern wants it
    if year < 1 or (month is not None and not 1 <= month <= 12):
        return None
    last_month = month or 12
    last_day = monthrange(year, last_month)[1]
    if day is not None and not 1 <= day <= last_day:
        return None
    return (year, month or 1, day or 1), (year, last_month, day or last_day)
