"""Numbers, money and ids in words that are safe to show."""

import math
import unicodedata
from collections.abc import Sequence
from decimal import Decimal
from itertools import groupby

from markupsafe import Markup, escape

__all__ = [
    "NO_INTERVAL",
    "by_group",
    "decimals",
    "identifier",
    "interval",
    "money",
    "printable",
    "shorten",
    "three_figures",
]

NOT_ESTIMATED = "not estimated"
NO_INTERVAL = "no interval"
HIDDEN = {"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"}
"""Unicode categories without a shape of their own: controls, direction marks."""


def printable(text: str, *, keep: str = "\n\t") -> str:
    """Return text with every invisible or direction-changing sign spelt out.

    Parameters
    ----------
    text : str
        Anything, also from a file of the user.
    keep : str
        Signs that stay as they are.

    Returns
    -------
    str
        The right-to-left override, for example, becomes ``[U+202E]``, so that two
        ids that differ only in such a sign look different.
    """
    return "".join(
        f"[U+{ord(sign):04X}]"
        if sign not in keep and unicodedata.category(sign) in HIDDEN
        else sign
        for sign in text
    )


def identifier(name: object) -> Markup:
    """Return a feature id as HTML: escaped, isolated in direction, free to wrap.

    Parameters
    ----------
    name : object
        The id.

    Returns
    -------
    Markup
        A ``bdi`` element.
    """
    shown = escape(printable(str(name), keep=""))
    return Markup('<bdi class="id">{}</bdi>').format(shown)


def shorten(name: str, longest: int) -> str:
    """Return an id of at most `longest` signs, with its middle left out if need be."""
    shown = printable(name, keep="")
    if len(shown) <= longest:
        return shown
    head = (longest - 1 + 1) // 2
    return f"{shown[:head]}…{shown[head + 1 - longest :]}"


def three_figures(value: float) -> str:
    """Return a number for a sentence: three figures, whole from 1,000.

    Parameters
    ----------
    value : float
        Any number; NaN is said in words.

    Returns
    -------
    str
        ``0.810``, ``12.0``, ``1,882`` or ``"not estimated"``.
    """
    if not math.isfinite(value):
        return NOT_ESTIMATED
    if abs(value) >= 999.5:
        return f"{value:,.0f}"
    return f"{value:#.3g}".rstrip(".")


def by_group(numbers: Sequence[int]) -> str:
    """Return numbers with runs of equals counted: ``3 x 189, 1 x 94``."""
    runs = [(number, len(list(group))) for number, group in groupby(numbers)]
    return ", ".join(
        f"{number:,}" if count == 1 else f"{count} x {number:,}"
        for number, count in runs
    )


def decimals(value: float, places: int = 3) -> str:
    """Return a number for a table column, all with the same decimals."""
    return f"{value:,.{places}f}" if math.isfinite(value) else NOT_ESTIMATED


def interval(low: float, high: float, places: int | None = None) -> str:
    """Return an interval in words.

    Parameters
    ----------
    low, high : float
        Its ends; NaN where there is none.
    places : int or None
        Decimals; None for three figures.

    Returns
    -------
    str
        ``"0.751 to 0.868"`` or ``"no interval"``.
    """
    if not (math.isfinite(low) and math.isfinite(high)):
        return NO_INTERVAL
    if places is None:
        return f"{three_figures(low)} to {three_figures(high)}"
    return f"{decimals(low, places)} to {decimals(high, places)}"


def money(amount: Decimal | None, high: Decimal | None = None) -> str:
    """Return an amount to its last minor unit; a range where the upper end differs.

    Parameters
    ----------
    amount : Decimal or None
        Rounded to the minor unit; None where nothing was priced.
    high : Decimal or None
        Upper end, where a price is missing.

    Returns
    -------
    str
        ``"1,250.00"``, ``"1,250.00 to 1,310.00"`` or ``"not priced"``.
    """
    if amount is None:
        return "not priced"
    if high is None or high == amount:
        return f"{amount:,f}"
    return f"{amount:,f} to {high:,f}"
