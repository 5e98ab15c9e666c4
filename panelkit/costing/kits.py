"""What kits cost, and which of them a panel should buy (F14, section 3a).

Formula numbers are those of the panelkit cost model.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Final

from panelkit.config import KitSection, ProgrammeSection
from panelkit.costing.geometry import ceil_ratio

__all__ = ["KitChoice", "KitOffer", "choose_kits", "kit_units", "offer_of"]

MOST_PRICINGS: Final = 20_000
"""Sets of single assays that are priced before a choice is left unproved."""


@dataclass(frozen=True, slots=True)
class KitOffer:
    """One kit for one programme.

    Attributes
    ----------
    section : KitSection
        The kit.
    units : int
        How many it takes.
    once, price : Fraction
        Onboarding, and the units.
    """

    section: KitSection
    units: int
    once: Fraction
    price: Fraction

    @property
    def cost(self) -> Fraction:
        """The whole price (F14)."""
        return self.once + self.price


@dataclass(frozen=True, slots=True)
class KitChoice:
    """Which kits are bought, and whether that is proved to be cheapest.

    Attributes
    ----------
    kits : tuple of KitOffer
        In the order of the file.
    direct : frozenset of str
        Markers that are left for single assays.
    total : int
        In minor units, all lines.
    proved : bool
        Whether nothing is cheaper.
    bound : int
        What nothing can undercut, in minor units.
    """

    kits: tuple[KitOffer, ...]
    direct: frozenset[str]
    total: int
    proved: bool
    bound: int


def kit_units(kit: KitSection, samples_run: int, deliveries: int, lots: int) -> int:
    """Return the units that the samples of a programme take (F14).

    Parameters
    ----------
    kit : KitSection
        Gives tests per unit, and whether a part-used one waits for a later delivery.
    samples_run : int
        Samples run, repeats included.
    deliveries : int
        Occasions on which they arrive, in parts that differ by at most one.
    lots : int
        Purchases over the programme that the shelf life asks for.

    Returns
    -------
    int
        Whole units.
    """
    tests = kit.tests_per_unit
    if kit.splittable or deliveries < lots:
        return lots * ceil_ratio(ceil_ratio(samples_run, lots), tests)
    size, larger = divmod(samples_run, deliveries)
    units = larger * ceil_ratio(size + 1, tests)
    return units + (deliveries - larger) * ceil_ratio(size, tests)


def offer_of(
    kit: KitSection, programme: ProgrammeSection, samples_run: int
) -> KitOffer:
    """Return a kit with its price for a programme (F12, F14).

    Parameters
    ----------
    kit : KitSection
        The kit.
    programme : ProgrammeSection
        Gives deliveries and horizon.
    samples_run : int
        Samples run, repeats included.

    Returns
    -------
    KitOffer
        Units bought in each lot with the right to buy up.
    """
    months = kit.shelf_months
    lots = ceil_ratio(programme.horizon_months, months) if months else 1
    units = kit_units(kit, samples_run, programme.deliveries, lots)
    each = ceil_ratio(units, lots)
    price = min(max(each, least) * Fraction(p) for least, p in kit.price_tiers)
    return KitOffer(kit, units, Fraction(kit.once), lots * price)


def choose_kits(
    markers: Sequence[str],
    offers: Sequence[KitOffer],
    direct_total: Callable[[frozenset[str]], int | None],
    rounded: Callable[[Fraction], int],
    allowed: Callable[[tuple[KitOffer, ...], frozenset[str]], bool],
) -> KitChoice | None:
    """Return the cheapest kits for a panel, the rest of it run by single assays.

    A marker that a kit measures has no assay of its own beside it. The search goes
    through sets of kits and cuts a branch once its kits and the single assays that no
    further kit can spare cost more than the best found: single assays never become
    cheaper when a marker is added.

    Parameters
    ----------
    markers : sequence of str
        The panel.
    offers : sequence of KitOffer
        Kits that may be bought.
    direct_total : callable
        From the markers left for single assays to the sum of their lines in minor
        units, or None where that cannot be done.
    rounded : callable
        From the exact cost of kits to minor units.
    allowed : callable
        Whether kits can be bought together with single assays of these markers.

    Returns
    -------
    KitChoice or None
        First by cost, then by fewest kits and assays bought, then by fewest analytes
        that are not wanted, then by the ids; None where nothing can be done.
    """
    return _Search(markers, offers, direct_total, rounded, allowed).best()


Key = tuple[int, int, int, tuple[str, ...]]


class _Search:
    def __init__(
        self,
        markers: Sequence[str],
        offers: Sequence[KitOffer],
        direct_total: Callable[[frozenset[str]], int | None],
        rounded: Callable[[Fraction], int],
        allowed: Callable[[tuple[KitOffer, ...], frozenset[str]], bool],
    ) -> None:
        self.wanted = frozenset(markers)
        self.rounded = rounded
        self.allowed = allowed
        self._direct = direct_total
        self._known: dict[frozenset[str], int | None] = {}
        self.cover = {
            o.section.id: self.wanted & set(o.section.markers) for o in offers
        }
        self.offers = self._worth_a_look(offers)
        # what the kits from here on could spare
        self.rest = [frozenset[str]()]
        for offer in reversed(self.offers):
            self.rest.insert(0, self.rest[0] | self.cover[offer.section.id])
        self.key: Key | None = None
        self.taken: tuple[KitOffer, ...] = ()
        self.complete = True

    def _worth_a_look(self, offers: Sequence[KitOffer]) -> list[KitOffer]:
        """Drop kits that measure nothing wanted, or less than a cheaper one does."""
        cover = self.cover

        def worse(one: KitOffer, other: KitOffer) -> bool:
            free = not (one.section.excludes or other.section.excludes)
            return (
                free
                and cover[one.section.id] <= cover[other.section.id]
                and other.cost < one.cost
                and other.section.volume <= one.section.volume
            )

        useful = [offer for offer in offers if cover[offer.section.id]]
        named = {name for offer in useful for name in offer.section.excludes}
        kept = [
            one
            for one in useful
            if not any(
                worse(one, other) and other.section.id not in named for other in useful
            )
        ]
        return sorted(
            kept, key=lambda o: (o.cost / len(cover[o.section.id]), o.section.id)
        )

    def best(self) -> KitChoice | None:
        bound = self._total((), self.wanted - self.rest[0]) or 0
        self._visit(0, (), self.wanted)
        if self.key is None:
            return None
        total = self.key[0]
        by_id = sorted(self.taken, key=lambda offer: offer.section.id)
        left = self._left(self.taken)
        return KitChoice(
            kits=tuple(by_id),
            direct=left,
            total=total,
            proved=self.complete,
            bound=total if self.complete else bound,
        )

    def _visit(
        self, place: int, taken: tuple[KitOffer, ...], left: frozenset[str]
    ) -> None:
        if len(self._known) >= MOST_PRICINGS:
            self.complete = False
            return
        least = self._total(taken, left - self.rest[place])
        if least is None or (self.key is not None and least > self.key[0]):
            return
        if place == len(self.offers):
            self._consider(taken, left)
            return
        offer = self.offers[place]
        covered = self.cover[offer.section.id]
        if left & covered and self.allowed((*taken, offer), frozenset()):
            self._visit(place + 1, (*taken, offer), left - covered)
        self._visit(place + 1, taken, left)

    def _consider(self, taken: tuple[KitOffer, ...], left: frozenset[str]) -> None:
        total = self._total(taken, left)
        if total is None or not self.allowed(taken, left):
            return
        ids = tuple(sorted([offer.section.id for offer in taken] + list(left)))
        unwanted = sum(len(set(offer.section.markers) - self.wanted) for offer in taken)
        key = (total, len(taken) + len(left), unwanted, ids)
        if self.key is None or key < self.key:
            self.key, self.taken = key, taken

    def _left(self, taken: Sequence[KitOffer]) -> frozenset[str]:
        spared = [self.cover[offer.section.id] for offer in taken]
        return self.wanted.difference(*spared)

    def _total(self, taken: Sequence[KitOffer], left: frozenset[str]) -> int | None:
        if left not in self._known:
            self._known[left] = self._direct(left)
        direct = self._known[left]
        if direct is None:
            return None
        return direct + self.rounded(sum((o.cost for o in taken), Fraction(0)))
