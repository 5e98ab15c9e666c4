"""Designs that fail: how many assays to order, and which spares (exact).

The number of assays that work is Poisson-binomial: a sum of independent yes-or-no
draws of unequal chances. Its distribution is built by adding one assay at a time.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from math import prod
from typing import Final

from panelkit.config import PRICING
from panelkit.costing.money import round_money
from panelkit.errors import UsageError
from panelkit.records import AssayPrice, Spares

__all__ = [
    "chance_of_at_least",
    "choose_spares",
    "landing_distribution",
    "order_count",
    "spare_pays",
]

MOST_SETS: Final = 20_000
MOST_ORDERED: Final = 10_000


def landing_distribution(chances: Sequence[Fraction]) -> tuple[Fraction, ...]:
    """Return the chance that exactly 0, 1, ... of several assays work.

    Parameters
    ----------
    chances : sequence of Fraction
        Chance of each assay; the assays are independent.

    Returns
    -------
    tuple of Fraction
        One more than there are assays; they add up to 1.

    References
    ----------
    Wang, Y. H. (1993). On the number of successes in independent trials. Statistica
    Sinica 3, 295-312.
    """
    spread = [Fraction(1)]
    for chance in chances:
        grown = [Fraction(0), *(chance * each for each in spread)]
        for number, each in enumerate(spread):
            grown[number] += (1 - chance) * each
        spread = grown
    return tuple(spread)


def chance_of_at_least(chances: Sequence[Fraction], wanted: int) -> Fraction:
    """Return the chance that at least so many of several assays work.

    Parameters
    ----------
    chances : sequence of Fraction
        Chance of each assay.
    wanted : int
        How many must work.

    Returns
    -------
    Fraction
        Exact.
    """
    return sum(landing_distribution(chances)[max(wanted, 0) :], Fraction(0))


def order_count(success: Fraction, wanted: int, probability: Fraction) -> int:
    """Return how many assays of one chance to order so that enough of them work.

    Parameters
    ----------
    success : Fraction
        Chance of each, above 0.
    wanted : int
        How many must work, at least 1.
    probability : Fraction
        With which, below 1 unless the assays never fail.

    Returns
    -------
    int
        The smallest number.

    Raises
    ------
    UsageError
        The probability cannot be reached, or only by thousands of assays.
    """
    none = 1 - success
    spread = [Fraction(1)] + [Fraction(0)] * wanted  # the last: enough work
    for ordered in range(1, MOST_ORDERED + 1):
        enough = spread[-1] + success * spread[-2]
        spread = [
            none * spread[n] + (success * spread[n - 1] if n else 0)
            for n in range(wanted)
        ] + [enough]
        if enough >= probability:
            return ordered
    raise UsageError(
        code="probability-out-of-reach",
        where="probability",
        what=f"{MOST_ORDERED:,} assays do not reach it (got {float(probability):g})",
        accepted="a probability below 1, and a chance of success above 0",
        next_step="Lower the probability",
    )


@dataclass(frozen=True, slots=True)
class _Spare:
    name: str
    chance: Fraction
    dev: Fraction
    slot: str  # the marker it stands in for alone; empty: for any


def choose_spares(
    panel: Sequence[AssayPrice],
    candidates: Sequence[AssayPrice],
    success: Decimal,
    currency: str,
    *,
    wanted: int | None = None,
    probability: float | Decimal = PRICING.probability,
) -> Spares:
    """Return the cheapest stand-ins to order so that enough assays work.

    A candidate that is declared the stand-in of a marker of the panel counts where
    that marker fails; any other fills any gap.

    Parameters
    ----------
    panel : sequence of AssayPrice
        Assays that are ordered in any case.
    candidates : sequence of AssayPrice
        Stand-ins, in order of preference.
    success : Decimal
        Chance of assays whose row names none.
    currency : str
        ISO 4217 code, for rounding.
    wanted : int, optional
        How many must work; the whole panel when left out.
    probability : float or Decimal
        With which.

    Returns
    -------
    Spares
        The set that costs least to develop; where a quote is missing, the fewest.

    Raises
    ------
    UsageError
        The number wanted or the probability makes no sense.
    """
    need = len(panel) if wanted is None else wanted
    level = Fraction(str(probability))
    if not 1 <= need <= len(panel) + len(candidates) or not 0 < level <= 1:
        raise UsageError(
            code="spares-refused",
            where="wanted and probability",
            what=f"{need} working assays with probability {float(level):g} cannot be "
            f"asked of {len(panel)} assays and {len(candidates)} stand-ins",
            accepted="at least 1 and at most all of them; a probability above 0, to 1",
            next_step="Correct the numbers",
        )
    priced = all(row.dev is not None for row in (*panel, *candidates))
    slots = {row.marker: _chance(row, success) for row in panel}
    spares = [
        _Spare(
            row.marker,
            _chance(row, success),
            Fraction(row.dev) if priced and row.dev is not None else Fraction(1),
            row.backup_of if row.backup_of in slots else "",
        )
        for row in candidates
    ]
    search = _SpareSearch(slots, spares, need, level)
    taken = search.best()
    own = sum((Fraction(row.dev) for row in panel if row.dev is not None), Fraction(0))
    at_once = own + sum((spare.dev for spare in taken), Fraction(0))
    expected = own + _one_by_one(slots, taken, need)
    reached = _reached(slots, taken, need)
    return Spares(
        wanted=need,
        probability=float(level),
        order=len(panel) + len(taken),
        spares=tuple(spare.name for spare in taken),
        reached=float(reached),
        reached_without=float(_reached(slots, (), need)),
        spend=round_money(at_once, currency) if priced else None,
        spend_one_by_one=round_money(expected, currency) if priced else None,
        proved=search.complete,
        enough=reached >= level,
    )


def spare_pays(dev: Decimal, chance: Decimal, loss: Decimal) -> tuple[bool, Decimal]:
    """Return whether a verified spare is worth its price, and from which chance on.

    Parameters
    ----------
    dev : Decimal
        What the spare costs to develop.
    chance : Decimal
        Chance that it is needed.
    loss : Decimal
        What is lost if it is needed and not there.

    Returns
    -------
    tuple of (bool, Decimal)
        Whether chance times loss is more than the price; the chance at which it is
        the same, at most 1.
    """
    if loss <= 0:
        return False, Decimal(1)
    threshold = dev / loss
    return chance * loss > dev, min(threshold, Decimal(1))


def _chance(row: AssayPrice, success: Decimal) -> Fraction:
    own = row.design_success
    return Fraction(success if own is None else own)


def _reached(
    slots: Mapping[str, Fraction], taken: Sequence[_Spare], need: int
) -> Fraction:
    """Return the chance that slots with own stand-ins, and the others, suffice."""
    filled = []
    for marker, chance in slots.items():
        own = [spare.chance for spare in taken if spare.slot == marker]
        filled.append(1 - prod((1 - each for each in own), start=1 - chance))
    others = [spare.chance for spare in taken if not spare.slot]
    return chance_of_at_least([*filled, *others], need)


def _one_by_one(
    slots: Mapping[str, Fraction], taken: Sequence[_Spare], need: int
) -> Fraction:
    """Return the expected price of spares that are ordered only once one is needed."""
    spent = Fraction(0)
    gone: list[_Spare] = []
    for spare in sorted(taken, key=lambda each: not each.slot):
        if spare.slot:
            before = [s.chance for s in gone if s.slot == spare.slot]
            needed = prod((1 - each for each in before), start=1 - slots[spare.slot])
        else:
            needed = 1 - _reached(slots, gone, need)
        spent += needed * spare.dev
        gone.append(spare)
    return spent


class _SpareSearch:
    """Sets of spares by price; one that a cheaper one outdoes waits for it."""

    def __init__(
        self,
        slots: Mapping[str, Fraction],
        spares: Sequence[_Spare],
        need: int,
        level: Fraction,
    ) -> None:
        self.slots = slots
        self.need = need
        self.level = level
        self.spares = sorted(spares, key=lambda spare: (spare.dev, -spare.chance))
        self.complete = True
        self.looked = 0
        self.found: tuple[Fraction, int, tuple[_Spare, ...]] | None = None

    def best(self) -> tuple[_Spare, ...]:
        everything = tuple(self.spares)
        if _reached(self.slots, everything, self.need) < self.level:
            return everything
        self._greedy()
        self._visit(0, (), Fraction(0))
        return self.found[2] if self.found else everything

    def _greedy(self) -> None:
        """Begin with a good set: most chance first, then what is not needed out."""
        taken: list[_Spare] = []
        for spare in sorted(self.spares, key=lambda each: -each.chance):
            if _reached(self.slots, taken, self.need) >= self.level:
                break
            taken.append(spare)
        for spare in sorted(taken, key=lambda each: -each.dev):
            rest = [each for each in taken if each is not spare]
            if _reached(self.slots, rest, self.need) >= self.level:
                taken = rest
        self._keep(tuple(taken), sum((each.dev for each in taken), Fraction(0)))

    def _keep(self, taken: tuple[_Spare, ...], spent: Fraction) -> None:
        key = (spent, len(taken))
        if self.found is None or key < self.found[:2]:
            self.found = (*key, taken)

    def _visit(self, place: int, taken: tuple[_Spare, ...], spent: Fraction) -> None:
        self.looked += 1
        if self.looked > MOST_SETS:
            self.complete = False
            return
        if self.found is not None and (spent, len(taken)) >= self.found[:2]:
            return
        if _reached(self.slots, taken, self.need) >= self.level:
            self._keep(taken, spent)
            return
        if place == len(self.spares):
            return
        spare = self.spares[place]
        if not self._outdone(spare, place, taken):
            self._visit(place + 1, (*taken, spare), spent + spare.dev)
        self._visit(place + 1, taken, spent)

    def _outdone(self, spare: _Spare, place: int, taken: tuple[_Spare, ...]) -> bool:
        """Whether a spare at least as good and no dearer was left out before it."""
        return any(
            other.slot == spare.slot
            and other.chance >= spare.chance
            and other not in taken
            for other in self.spares[:place]
        )
