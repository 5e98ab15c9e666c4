"""Buying reactions: one price, packs, tiers, and what a missing quote may be (F12).

Formula numbers are those of the panelkit cost model.
"""

import statistics
from collections.abc import Callable, Sequence
from fractions import Fraction
from typing import Literal

from panelkit.costing.geometry import ceil_ratio
from panelkit.errors import InputDataError, name_some
from panelkit.records import AssayPrice

__all__ = ["Bound", "Buy", "Offers", "purchase_cost", "reagent_price"]

MIN_QUOTES = 3  # fewer say nothing about what a missing quote may be

Bound = Literal["low", "middle", "high"]
Buy = Callable[[int], Fraction]


def purchase_cost(assay: AssayPrice, reactions: int) -> Fraction | None:
    """Return the price of a number of reactions bought at once (F12).

    All-units tiers carry the right to buy up: to order the quantity from which a
    lower price holds and leave the rest unused, so that more never costs less.

    Parameters
    ----------
    assay : AssayPrice
        Its pack, tiers or price of one reaction.
    reactions : int
        How many are needed.

    Returns
    -------
    Fraction or None
        The exact price; None where the assay has no reagent quote.
    """
    price = reagent_price(assay)
    if price is None:
        return None
    return price(reactions) if callable(price) else reactions * price


def reagent_price(assay: AssayPrice) -> Fraction | Buy | None:
    """Return the price of one reaction, or the price as a function of quantity."""
    if assay.tiers:
        steps = [(quantity, Fraction(price)) for quantity, price in assay.tiers]
        if assay.incremental:
            return lambda reactions: _by_bracket(steps, reactions)
        return lambda reactions: min(
            max(reactions, quantity) * price for quantity, price in steps
        )
    if assay.pack is not None and assay.pack_price is not None:
        size, pack_price = assay.pack, Fraction(assay.pack_price)
        return lambda reactions: ceil_ratio(reactions, size) * pack_price
    return None if assay.test is None else Fraction(assay.test)


def _by_bracket(steps: Sequence[tuple[int, Fraction]], reactions: int) -> Fraction:
    ends = [quantity - 1 for quantity, _ in steps[1:]] + [reactions]
    total = Fraction(0)
    for (start, price), end in zip(steps, ends, strict=True):
        total += max(0, min(reactions, end) - start + 1) * price
    return total


class Offers:
    """Prices of the panel's assays; missing ones from the platform's quotes."""

    def __init__(
        self, quotes: Sequence[AssayPrice], missing: Sequence[AssayPrice]
    ) -> None:
        usable = [quote for quote in quotes if quote.status != "no" and missing]
        self.devs = [Fraction(q.dev) for q in usable if q.dev is not None]
        priced = [reagent_price(quote) for quote in usable if quote.has_reagent_quote]
        self.flat = [price for price in priced if isinstance(price, Fraction)]
        self.stepped = [price for price in priced if callable(price)]
        if any(assay.dev is None for assay in missing):
            _check_number(len(self.devs), "dev", missing)
        if not all(assay.has_reagent_quote for assay in missing):
            _check_number(len(priced), "test", missing)

    def dev(self, assay: AssayPrice, bound: Bound) -> Fraction:
        """Return the one-off cost of an assay."""
        return _of_bound(self.devs, bound) if assay.dev is None else Fraction(assay.dev)

    def reagent(self, assay: AssayPrice, bound: Bound) -> Fraction | Buy:
        """Return the price of one reaction, or the price as a function of quantity."""
        own = reagent_price(assay)
        if own is not None:
            return own
        flat, stepped = self.flat, self.stepped
        if not stepped:
            return _of_bound(flat, bound)
        if flat and bound != "middle":
            flat = [_of_bound(flat, bound)]
        # Packs and tiers have no price of one reaction, so quotes are compared at
        # the quantity that is bought.
        return lambda reactions: _of_bound(
            [reactions * price for price in flat] + [buy(reactions) for buy in stepped],
            bound,
        )


def _check_number(n_quotes: int, column: str, missing: Sequence[AssayPrice]) -> None:
    if n_quotes < MIN_QUOTES:
        raise InputDataError(
            code="quotes-too-few",
            where=f"quotes, column '{column}'",
            what=f"too few quotes to bound {name_some(a.marker for a in missing)} "
            f"(got {n_quotes})",
            accepted=f"at least {MIN_QUOTES} quotes on the platform",
            next_step="Ask for quotes of these assays or of others like them",
        )


def _of_bound(values: Sequence[Fraction], bound: Bound) -> Fraction:
    if bound == "low":
        return min(values)
    return max(values) if bound == "high" else statistics.median(values)
