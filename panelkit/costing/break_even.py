"""From which volume, price or month on a choice pays (F18 to F20).

Formula numbers are those of the panelkit cost model.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from decimal import Decimal
from fractions import Fraction
from typing import Final

from panelkit.config import MINOR_DIGITS
from panelkit.costing.panel_prices import PanelPricer
from panelkit.records import (
    AssayPrice,
    BreakEven,
    Crossing,
    PanelCost,
    PriceList,
)

__all__ = [
    "break_even_hint",
    "break_even_price",
    "break_even_volume",
    "payback_months",
]

FINER: Final = 4  # digits that a unit price may have beyond the minor unit
HIGHEST_PRICE: Final = 10**9


def break_even_volume(
    total_a: Callable[[int], Decimal | None],
    total_b: Callable[[int], Decimal | None],
    largest: int,
) -> BreakEven:
    """Return at which numbers of samples the cheaper scenario changes (F18).

    True costs go in steps and cross several times, so every number is priced.

    Parameters
    ----------
    total_a, total_b : callable
        From the number of samples to the total; None where it cannot be run.
    largest : int
        Numbers from 1 to this are priced.

    Returns
    -------
    BreakEven
        With every crossing. At equal totals the cheaper one stays what it was.
    """
    samples: list[int] = []
    totals: list[tuple[Decimal, Decimal]] = []
    for number in range(1, largest + 1):
        a, b = total_a(number), total_b(number)
        if a is not None and b is not None:
            samples.append(number)
            totals.append((a, b))
    crossings: list[Crossing] = []
    cheaper = ""
    for number, (a, b) in zip(samples, totals, strict=True):
        now = "A" if a < b else "B" if b < a else cheaper
        if cheaper and now != cheaper:
            crossings.append(Crossing(number, now, a - b))
        cheaper = now
    first = next((n for n, (a, b) in zip(samples, totals, strict=True) if b < a), None)
    stays = None
    if cheaper == "B":
        stays = crossings[-1].samples if crossings else first
    return BreakEven(
        first=first,
        crossings=tuple(crossings),
        stays_from=stays,
        samples=tuple(samples),
        total_a=tuple(a for a, _ in totals),
        total_b=tuple(b for _, b in totals),
    )


def break_even_hint(
    fixed_a: Fraction, each_a: Fraction, fixed_b: Fraction, each_b: Fraction
) -> Fraction | None:
    """Return where two straight lines of cost cross: a hint, since costs go in steps.

    Parameters
    ----------
    fixed_a, each_a, fixed_b, each_b : Fraction
        Fixed cost and cost of a sample, of A and B.

    Returns
    -------
    Fraction or None
        Number of samples (F18); None for parallel lines.
    """
    if each_a == each_b:
        return None
    return (fixed_b - fixed_a) / (each_a - each_b)


def break_even_price(
    pricer: PanelPricer,
    markers: Sequence[str],
    platform: str,
    marker: str,
    other_total: Decimal,
) -> Decimal | None:
    """Return the price of a reaction up to which a panel is no dearer than another.

    Parameters
    ----------
    pricer : PanelPricer
        Prices the panel.
    markers : sequence of str
        The panel.
    platform : str
        Where.
    marker : str
        The marker without a quote.
    other_total : Decimal
        What the other panel costs.

    Returns
    -------
    Decimal or None
        The quotient (other total - total at price 0) / reactions (F19), rounded half
        up to the minor unit and four digits more. Where the layout itself changes with
        the price, the totals are asked until the price is found. Below 0: the panel
        never wins. None where the price decides nothing: the panel cannot be run, or
        buys no reaction of this marker.
    """
    currency = pricer.programme.currency
    unit = Fraction(1, 10 ** (MINOR_DIGITS[currency] + FINER))

    def cost_at(price: Fraction) -> PanelCost | None:
        quoted = pricer.repriced(
            _with_price(pricer.prices, marker, platform, price)
        ).attempt(markers, platform)
        return quoted if isinstance(quoted, PanelCost) else None

    free = cost_at(Fraction(0))
    if free is None or marker not in free.assays:
        return None
    room = Fraction(other_total - free.total)
    reactions = free.reactions[free.assays.index(marker)]
    price = room / reactions
    if price > 0:
        here = cost_at(_rounded(price, unit))
        if here is None or here.reactions != free.reactions or here.kits != free.kits:
            price = _searched(cost_at, other_total, unit)
    return _decimal(_rounded(price, unit), MINOR_DIGITS[currency] + FINER)


def _searched(
    cost_at: Callable[[Fraction], PanelCost | None], other: Decimal, unit: Fraction
) -> Fraction:
    """Return the highest price at which the panel costs no more: totals only rise."""
    low, high = 0, int(HIGHEST_PRICE / unit)
    while high - low > 1:
        middle = (low + high) // 2
        cost = cost_at(middle * unit)
        if cost is not None and cost.total <= other:
            low = middle
        else:
            high = middle
    return low * unit


def _rounded(price: Fraction, unit: Fraction) -> Fraction:
    steps = abs(price) / unit
    whole = math.floor(steps + Fraction(1, 2)) * unit
    return -whole if price < 0 else whole


def _decimal(value: Fraction, digits: int) -> Decimal:
    units = value * 10**digits
    whole = abs(int(units))
    sign = int(value < 0)
    return Decimal((sign, tuple(int(d) for d in str(whole)), -digits))


def _with_price(
    prices: PriceList, marker: str, platform: str, price: Fraction
) -> PriceList:
    """Return the list with a price of one marker; its own missing dev stays missing."""
    amount = _decimal(price, 30).normalize()
    rows = []
    found = False
    for row in prices.rows:
        if (row.marker, row.platform) == (marker, platform):
            row, found = replace(row, test=amount), True
        rows.append(row)
    if not found:
        base = prices.for_panel([marker], platform)[0]
        rows.append(
            replace(
                AssayPrice(marker, platform),
                status=base.status,
                dev=base.dev,
                test=amount,
            )
        )
    return PriceList(tuple(rows), prices.findings)


def payback_months(change: Decimal, saving_per_year: Decimal) -> int | None:
    """Return after how many months a change has paid for itself (F20).

    Parameters
    ----------
    change : Decimal
        One-off cost of the change.
    saving_per_year : Decimal
        What it saves.

    Returns
    -------
    int or None
        Rounded up; None where nothing is saved.
    """
    if saving_per_year <= 0:
        return None
    return math.ceil(Fraction(change) / (Fraction(saving_per_year) / 12))
