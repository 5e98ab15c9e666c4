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
N_DRAWN: Final = 120
HIGHEST_PRICE: Final = 10**9


def break_even_volume(
    total_a: Callable[[int], Decimal | None],
    total_b: Callable[[int], Decimal | None],
    largest: int,
) -> BreakEven:
    """Return at which numbers of samples the cheaper scenario changes (F18).

    True costs go in steps and cross several times. No crossing is missed: totals do
    not fall when samples are added, so where one scenario costs less at the end of a
    stretch than the other at its beginning it is the cheaper one throughout, and every
    other stretch is halved down to single samples.

    Parameters
    ----------
    total_a, total_b : callable
        From the number of samples to the total, not falling; None where it cannot be
        run.
    largest : int
        Numbers from 1 to this are looked at.

    Returns
    -------
    BreakEven
        With every crossing. At equal totals the cheaper one stays what it was.
    """
    scan = _Scan(total_a, total_b)
    scan.look(1, largest)
    scan.sample(largest)
    crossings: list[Crossing] = []
    cheaper = ""
    first: int | None = None
    stays: int | None = None
    for number in sorted(scan.known):
        a, b = scan.known[number]
        if a is None or b is None:
            continue
        now = "A" if a < b else "B" if b < a else cheaper
        if cheaper and now != cheaper:
            crossings.append(Crossing(number, now, a - b))
        if now == "B" and cheaper != "B":
            first, stays = first or number, number
        cheaper = now
    both = [n for n in sorted(scan.known) if None not in scan.known[n]]
    return BreakEven(
        first=first,
        crossings=tuple(crossings),
        stays_from=stays if cheaper == "B" else None,
        largest=largest,
        samples=tuple(both),
        total_a=tuple(scan.known[n][0] or Decimal(0) for n in both),
        total_b=tuple(scan.known[n][1] or Decimal(0) for n in both),
    )


class _Scan:
    """Both totals at the numbers of samples that matter."""

    def __init__(
        self,
        total_a: Callable[[int], Decimal | None],
        total_b: Callable[[int], Decimal | None],
    ) -> None:
        self.totals = (total_a, total_b)
        self.known: dict[int, tuple[Decimal | None, Decimal | None]] = {}

    def at(self, number: int) -> tuple[Decimal | None, Decimal | None]:
        if number not in self.known:
            self.known[number] = (self.totals[0](number), self.totals[1](number))
        return self.known[number]

    def look(self, low: int, high: int) -> None:
        """Halve a stretch until one scenario is the cheaper one throughout."""
        a_low, b_low = self.at(low)
        a_high, b_high = self.at(high)
        if high - low <= 1:
            return
        if a_low is not None and b_low is not None:
            if a_high is not None and a_high < b_low:
                return
            if b_high is not None and b_high < a_low:
                return
        middle = (low + high) // 2
        self.look(low, middle)
        self.look(middle, high)

    def sample(self, largest: int) -> None:
        """Price some more, evenly, for the picture."""
        for k in range(1, N_DRAWN + 1):
            self.at(max(1, largest * k // N_DRAWN))


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
