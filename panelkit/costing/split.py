"""One panel on several platforms: which marker is read where."""

from collections.abc import Iterator, Sequence
from decimal import Decimal
from fractions import Fraction
from itertools import product
from math import comb, prod
from typing import Final

from panelkit.costing.money import round_money
from panelkit.costing.panel_prices import PanelPricer
from panelkit.records import AssayPrice, PanelCost, SplitCost

__all__ = ["cheapest_split"]

MOST_SPLITS: Final = 5_000
"""Ways to split a panel that are all looked at; beyond, moves of single markers."""

Assignment = dict[str, str]
Kind = tuple[object, ...]


def cheapest_split(pricer: PanelPricer, markers: Sequence[str]) -> SplitCost | None:
    """Return the cheapest way to read a panel on any number of the platforms.

    Markers whose rows are equal on every platform are interchangeable, so only their
    numbers matter; where that leaves few enough splits all of them are priced, and
    otherwise markers are moved one by one until nothing becomes cheaper.

    Parameters
    ----------
    pricer : PanelPricer
        Prices panels.
    markers : sequence of str
        The panel.

    Returns
    -------
    SplitCost or None
        Also where one platform alone is cheapest; None where no split can be run.
    """
    kinds = _kinds(pricer, markers)
    if any(not places for _, places in kinds):
        return None
    n_splits = prod(
        comb(len(names) + len(places) - 1, len(places) - 1) for names, places in kinds
    )
    everything = n_splits <= MOST_SPLITS
    found = (
        min(_all_splits(kinds), key=lambda each: _rank(pricer, markers, each))
        if everything
        else _by_moves(pricer, markers, kinds)
    )
    parts = _parts(pricer, markers, found)
    if parts is None:
        return None
    kits = [kit for cost in parts for kit in cost.kits]
    # kits are chosen within each part, so two parts might have shared one
    return _record(pricer, markers, found, parts, everything and not kits)


def _kinds(
    pricer: PanelPricer, markers: Sequence[str]
) -> list[tuple[list[str], list[str]]]:
    """Return groups of interchangeable markers, and where each may be read."""
    by_kind: dict[Kind, tuple[list[str], list[str]]] = {}
    paired = {
        name
        for pair in pricer.conflicts.pairs
        for name in (pair.marker_a, pair.marker_b)
    }
    for marker in markers:
        rows = {
            name: pricer.prices.for_panel([marker], name)[0]
            for name in pricer.platforms
        }
        places = [
            name
            for name in pricer.platforms
            if isinstance(pricer.attempt([marker], name), PanelCost)
        ]
        alone = marker if marker in paired else ""
        kind = (alone, *(_terms(rows[name]) for name in pricer.platforms), *places)
        by_kind.setdefault(kind, ([], places))[0].append(marker)
    return list(by_kind.values())


def _terms(row: AssayPrice) -> Kind:
    return (
        row.status, row.dev, row.test, row.pack, row.pack_price, row.tiers,
        row.incremental, row.slots, row.pool_class, row.channel, row.fail_rate,
    )  # fmt: skip


def _all_splits(kinds: Sequence[tuple[list[str], list[str]]]) -> Iterator[Assignment]:
    for counts in product(
        *(list(_counts(len(names), len(places))) for names, places in kinds)
    ):
        found: Assignment = {}
        for (names, places), numbers in zip(kinds, counts, strict=True):
            left = iter(names)
            for place, number in zip(places, numbers, strict=True):
                found |= {next(left): place for _ in range(number)}
        yield found


def _counts(things: int, parts: int) -> Iterator[tuple[int, ...]]:
    if parts == 1:
        yield (things,)
        return
    for first in range(things, -1, -1):
        for rest in _counts(things - first, parts - 1):
            yield (first, *rest)


def _by_moves(
    pricer: PanelPricer,
    markers: Sequence[str],
    kinds: Sequence[tuple[list[str], list[str]]],
) -> Assignment:
    """Return a split that no move of one marker makes cheaper, from several starts."""
    able = {name: places for names, places in kinds for name in names}
    starts = [
        {name: place if place in able[name] else able[name][0] for name in markers}
        for place in pricer.platforms
    ]
    best = min(
        (_improved(pricer, markers, start, able) for start in starts),
        key=lambda each: _rank(pricer, markers, each),
    )
    return best


def _improved(
    pricer: PanelPricer,
    markers: Sequence[str],
    start: Assignment,
    able: dict[str, list[str]],
) -> Assignment:
    here, rank = start, _rank(pricer, markers, start)
    while True:
        moves = [
            {**here, name: place}
            for name in markers
            for place in able[name]
            if place != here[name]
        ]
        if not moves:
            return here
        best = min(moves, key=lambda each: _rank(pricer, markers, each))
        new = _rank(pricer, markers, best)
        if new >= rank:
            return here
        here, rank = best, new


Rank = tuple[bool, Decimal, int]


def _rank(pricer: PanelPricer, markers: Sequence[str], found: Assignment) -> Rank:
    """Return what is compared: can it be run, its total, on how many platforms."""
    parts = _parts(pricer, markers, found)
    if parts is None:
        return (True, Decimal(0), 0)
    return (False, _sum(parts, high=False), len(parts))


def _parts(
    pricer: PanelPricer, markers: Sequence[str], found: Assignment
) -> list[PanelCost] | None:
    if not _may_be_together(pricer, markers):
        return None
    parts = []
    for place in pricer.platforms:
        own = [name for name in markers if found[name] == place]
        if own:
            cost = pricer.attempt(own, place)
            if not isinstance(cost, PanelCost):
                return None
            parts.append(cost)
    return parts


def _may_be_together(pricer: PanelPricer, markers: Sequence[str]) -> bool:
    return not pricer.conflicts.among(markers, "panel")


def _sum(parts: Sequence[PanelCost], *, high: bool) -> Decimal:
    """Add the parts up; collection is paid once."""
    totals = [cost.total_high if high else cost.total for cost in parts]
    again = sum((cost.line("collection") for cost in parts[1:]), Decimal(0))
    return sum(totals, Decimal(0)) - again


def _record(
    pricer: PanelPricer,
    markers: Sequence[str],
    found: Assignment,
    parts: Sequence[PanelCost],
    proved: bool,
) -> SplitCost:
    samples = pricer.programme.samples
    results = Fraction(samples)
    for cost in parts:
        results *= cost.results / samples
    total = _sum(parts, high=False)
    return SplitCost(
        parts=tuple(parts),
        markers=tuple(
            tuple(name for name in markers if found[name] == cost.platform)
            for cost in parts
        ),
        total=total,
        total_high=_sum(parts, high=True),
        results=results,
        cost_per_result=round_money(
            Fraction(total) / results, pricer.programme.currency
        ),
        proved=proved,
    )
