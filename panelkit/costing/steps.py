"""Steps and drivers of a panel's cost (F15 to F17).

Formula numbers are those of the panelkit cost model.
"""

from collections.abc import Sequence
from decimal import Decimal
from fractions import Fraction

from panelkit.config import PlatformSection
from panelkit.costing.money import round_money
from panelkit.costing.panel_prices import PanelPricer
from panelkit.costing.purchase import purchase_cost
from panelkit.records import Driver, PanelCost, Stair, StepDown

__all__ = ["drivers", "next_step_down", "staircase"]


def staircase(
    pricer: PanelPricer, markers: Sequence[str], platform: str
) -> tuple[Stair, ...]:
    """Return the cost of the first 1, 2, ... markers of an order (F15).

    Parameters
    ----------
    pricer : PanelPricer
        Prices them.
    markers : sequence of str
        In the order in which they would be added.
    platform : str
        Where.

    Returns
    -------
    tuple of Stair
        One for each size.
    """
    stairs = []
    before: PanelCost | None = None
    for size in range(1, len(markers) + 1):
        cost = _cost(pricer, markers[:size], platform)
        both = cost is not None and before is not None
        stairs.append(
            Stair(
                size=size,
                marker=markers[size - 1],
                total=cost.total if cost else None,
                cost_per_result=cost.cost_per_result if cost else None,
                marginal=cost.total - before.total if cost and before else None,
                step=_more(before, cost, pricer.platforms[platform])
                if both and cost and before
                else "",
            )
        )
        before = cost
    return tuple(stairs)


def next_step_down(
    pricer: PanelPricer, markers: Sequence[str], platform: str
) -> StepDown | None:
    """Return how many of the last markers to leave out to save a step (F17).

    Parameters
    ----------
    pricer : PanelPricer
        Prices panels.
    markers : sequence of str
        The panel, those to be left out first at the end.
    platform : str
        Where.

    Returns
    -------
    StepDown or None
        None where no smaller panel needs fewer pools, runs, preparations or units of
        kits, nor falls into a lower tier.
    """
    whole = _cost(pricer, markers, platform)
    if whole is None:
        return None
    for size in range(len(markers) - 1, 0, -1):
        cost = _cost(pricer, markers[:size], platform)
        if cost is None:
            continue
        saves = _more(cost, whole, pricer.platforms[platform])
        if saves:
            return StepDown(
                remove=len(markers) - size,
                markers=tuple(markers[size:]),
                saves=saves,
                saving=whole.total - cost.total,
            )
    return None


def drivers(
    pricer: PanelPricer, markers: Sequence[str], platform: str
) -> tuple[Driver, ...]:
    """Return what leaving each marker out saves, the largest saving first (F16).

    Parameters
    ----------
    pricer : PanelPricer
        Prices panels; kits and layout are chosen anew without each marker.
    markers : sequence of str
        The panel.
    platform : str
        Where.

    Returns
    -------
    tuple of Driver
        Equal savings in the panel's order. The saving is None for a panel of one.
    """
    whole = _cost(pricer, markers, platform)
    if whole is None:
        return ()
    rows = {row.marker: row for row in pricer.prices.for_panel(list(markers), platform)}
    bought = dict(zip(whole.assays, whole.reactions, strict=True))
    found = []
    for marker in markers:
        others = [name for name in markers if name != marker]
        rest = _cost(pricer, others, platform) if others else None
        one_off = reagent = _money(Fraction(0), whole)
        if marker in bought:
            each = purchase_cost(rows[marker], bought[marker] // whole.lots)
            dev = rows[marker].dev
            reagent = _money(None if each is None else whole.lots * each, whole)
            one_off = _money(None if dev is None else Fraction(dev), whole)
        found.append(
            Driver(
                marker=marker,
                saving=None if rest is None else whole.total - rest.total,
                own_one_off=one_off,
                own_reagent=reagent,
                by_kit=", ".join(k.kit for k in whole.kits if marker in k.covers),
            )
        )
    return tuple(sorted(found, key=lambda each: -(each.saving or 0)))


def _money(amount: Fraction | None, cost: PanelCost) -> Decimal | None:
    return None if amount is None else round_money(amount, cost.currency)


def _cost(
    pricer: PanelPricer, markers: Sequence[str], platform: str
) -> PanelCost | None:
    found = pricer.attempt(markers, platform)
    return found if isinstance(found, PanelCost) else None


def _more(small: PanelCost, large: PanelCost, platform: PlatformSection) -> str:
    """Return what the larger panel needs more of, in words."""
    parts = [
        _count(large.pools - small.pools, "pool"),
        _count(large.runs - small.runs, "run"),
        _count(large.preparations - small.preparations, "preparation", " a sample"),
        _count(_units(large) - _units(small), "kit unit"),
    ]
    if _tier(platform, large) > _tier(platform, small):
        parts.append("a price tier")
    return ", ".join(part for part in parts if part)


def _count(number: int, name: str, behind: str = "") -> str:
    if number <= 0:
        return ""
    return f"{number:,} {name}{'' if number == 1 else 's'}{behind}"


def _units(cost: PanelCost) -> int:
    return sum(kit.units for kit in cost.kits)


def _tier(platform: PlatformSection, cost: PanelCost) -> int:
    tiers = platform.position_cost
    if isinstance(tiers, Decimal):
        return 0
    return sum(cost.fullest_pool > slots for slots, _ in tiers)
