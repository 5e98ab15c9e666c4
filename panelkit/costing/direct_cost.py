"""Assays run one by one or in pools on one platform, line by line (F1 to F13).

Formula numbers are those of the panelkit cost model. Every sum is an exact fraction;
each line is rounded once.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Final, Literal

from panelkit.config import PlatformSection, ProgrammeSection
from panelkit.costing.geometry import (
    Layout,
    Pool,
    PoolPlan,
    ceil_ratio,
    find_layouts,
    plan_pools,
)
from panelkit.costing.money import minor_units
from panelkit.costing.purchase import Bound, Buy, Offers
from panelkit.errors import StudyFileError
from panelkit.records import AssayPrice, Conflicts

__all__ = ["LINE_NAMES", "DirectCost", "Panel", "Priced", "samples_run_and_results"]

LINE_NAMES: Final = (
    "collection",
    "setup",
    "development",
    "runs",
    "samples",
    "positions",
    "assays",
    "lots",
)


@dataclass(frozen=True, slots=True)
class Panel:
    """The assays of one panel on one platform.

    Attributes
    ----------
    platform : str
        Its name.
    markers, references : tuple of AssayPrice
        In file order.
    """

    platform: str
    markers: tuple[AssayPrice, ...]
    references: tuple[AssayPrice, ...]

    @property
    def assays(self) -> tuple[AssayPrice, ...]:
        """Markers, then references."""
        return self.markers + self.references


@dataclass(frozen=True, slots=True)
class Priced:
    """Lines in minor units at one bound of missing prices, and the layout behind them.

    Attributes
    ----------
    lines : dict of str to int
        By `LINE_NAMES`.
    layout : Layout
        The cheapest.
    """

    lines: dict[str, int]
    layout: Layout

    @property
    def total(self) -> int:
        """Sum of the rounded lines."""
        return sum(self.lines.values())


def samples_run_and_results(
    samples: int, failure: Fraction, repeat_mode: Literal["none", "once", "until"]
) -> tuple[int, Fraction]:
    """Return the samples to run and the results to expect of them (F2).

    Parameters
    ----------
    samples : int
        Results wanted.
    failure : Fraction
        Chance that a panel run fails, 0 to below 1.
    repeat_mode : {"none", "once", "until"}
        Whether failed samples are run again, once, or until they succeed.

    Returns
    -------
    tuple of (int, Fraction)
        Samples run, a whole number; results expected, exactly.
    """
    if repeat_mode == "none":
        return samples, samples * (1 - failure)
    if repeat_mode == "once":
        return math.ceil(samples * (1 + failure)), samples * (1 - failure**2)
    return math.ceil(samples / (1 - failure)), Fraction(samples)


class DirectCost:
    """One panel on one platform, ready to be priced."""

    def __init__(
        self,
        programme: ProgrammeSection,
        platform: PlatformSection,
        panel: Panel,
        offers: Offers,
        samples: tuple[int, Fraction],
        conflicts: Conflicts,
    ) -> None:
        self.programme = programme
        self.platform = platform
        self.panel = panel
        self.offers = offers
        self.samples_run, self.results = samples
        self.plan = plan_pools(platform, panel.markers, panel.references, conflicts)
        self.layouts = find_layouts(
            platform, self.plan, self.samples_run, programme.deliveries
        )
        self.overage = 1 + Fraction(platform.overage)
        positions = platform.replicates * len(self.plan.pools)
        feeds = platform.prep_positions
        self.preparations = ceil_ratio(positions, feeds) if feeds else 0
        months = platform.lot_months
        self.lots = ceil_ratio(programme.horizon_months, months) if months else 1

    def cheapest(self, bound: Bound) -> Priced:
        """Return the lines in minor units, and the layout, of the lowest total.

        Of equal totals the first wins, which has the fewest groups (F6).
        """
        fixed = self._fixed_lines(bound)
        reagents = _Reagents(self.plan, self.offers, bound)
        priced = []
        for layout in self.layouts:
            exact = {**fixed, **self._layout_lines(layout, reagents)}
            lines = {
                name: minor_units(exact[name], self.programme.currency)
                for name in LINE_NAMES
            }
            priced.append(Priced(lines, layout))
        return min(priced, key=lambda each: each.total)

    def reactions(self, layout: Layout) -> tuple[int, ...]:
        """Return the reactions bought of each assay, all lots (F10, F11)."""
        filled = self.platform.replicates * self.samples_run
        controls = self.platform.controls_per_pool
        bought: dict[str, int] = {}
        for group, runs in zip(layout.groups, layout.runs, strict=True):
            each = self._reactions_per_lot(filled + controls * runs)
            bought |= {assay.marker: each for pool in group for assay in pool.assays}
        if self.plan.everywhere:
            each = self._reactions_everywhere(layout)
            bought |= {assay.marker: each for assay in self.plan.everywhere}
        return tuple(self.lots * bought[assay.marker] for assay in self.panel.assays)

    def pool_of(self) -> tuple[int, ...]:
        """Return the pool of each assay, -1 for references that are in every pool."""
        place = {
            assay.marker: number
            for number, pool in enumerate(self.plan.pools)
            for assay in pool.assays
        }
        return tuple(place.get(assay.marker, -1) for assay in self.panel.assays)

    def _fixed_lines(self, bound: Bound) -> dict[str, Fraction]:
        """Return the lines that do not depend on the spread over runs (F13)."""
        platform = self.platform
        sample = Fraction(platform.sample_cost)
        sample += self.preparations * Fraction(platform.prep_cost)
        pool_setup = len(self.plan.pools) * Fraction(platform.pool_setup)
        collection = Fraction(self.programme.collection_cost)
        devs = [self.offers.dev(assay, bound) for assay in self.panel.assays]
        return {
            "collection": self.programme.samples * collection,
            "setup": Fraction(platform.setup) + pool_setup,
            "development": sum(devs, Fraction(0)),
            "samples": self.samples_run * sample,
            "lots": (self.lots - 1) * Fraction(platform.lot_cost),
        }

    def _layout_lines(
        self, layout: Layout, reagents: "_Reagents"
    ) -> dict[str, Fraction]:
        """Return the lines that depend on the spread over runs (F10 to F13)."""
        platform = self.platform
        filled = platform.replicates * self.samples_run
        controls = platform.controls_per_pool
        bought = Fraction(0)
        for group, runs in zip(layout.groups, layout.runs, strict=True):
            each = self._reactions_per_lot(filled + controls * runs)
            bought += sum((reagents.of_pool(pool, each) for pool in group), Fraction(0))
        if self.plan.everywhere:
            bought += reagents.of_everywhere(self._reactions_everywhere(layout))
        return {
            "runs": sum(layout.runs) * Fraction(platform.run_cost),
            "positions": self.overage * self._positions(layout),
            "assays": self.lots * bought,
        }

    def _reactions_everywhere(self, layout: Layout) -> int:
        filled = self.platform.replicates * self.samples_run * len(self.plan.pools)
        pool_runs = sum(
            size * runs for size, runs in zip(layout.sizes, layout.runs, strict=True)
        )
        return self._reactions_per_lot(
            filled + self.platform.controls_per_pool * pool_runs
        )

    def _reactions_per_lot(self, positions: int) -> int:
        return ceil_ratio(math.ceil(self.overage * positions), self.lots)

    def _positions(self, layout: Layout) -> Fraction:
        """Return the cost of the filled positions, before overage.

        With tiers each position is paid by the slots of its own pool; controls that
        belong to the run as a whole are paid like the run's fullest pool.
        """
        platform = self.platform
        tiers = platform.position_cost
        if isinstance(tiers, Decimal):
            return layout.filled * Fraction(tiers)
        total = Fraction(0)
        for group, runs in zip(layout.groups, layout.runs, strict=True):
            each = platform.replicates * self.samples_run
            each += platform.controls_per_pool * runs
            prices = [_tier_price(tiers, pool) for pool in group]
            fullest = max(group, key=lambda pool: pool.slots)
            total += each * sum(prices, Fraction(0))
            total += platform.controls_per_run * runs * _tier_price(tiers, fullest)
        return total


class _Reagents:
    """Reagent prices by pool: prices of one reaction are summed once."""

    def __init__(self, plan: PoolPlan, offers: Offers, bound: Bound) -> None:
        self.offers = offers
        self.bound: Bound = bound
        self.pools = {id(pool): self._split(pool.assays) for pool in plan.pools}
        self.everywhere = self._split(plan.everywhere)

    def of_pool(self, pool: Pool, reactions: int) -> Fraction:
        return _bought(*self.pools[id(pool)], reactions)

    def of_everywhere(self, reactions: int) -> Fraction:
        return _bought(*self.everywhere, reactions)

    def _split(self, assays: Sequence[AssayPrice]) -> tuple[Fraction, list[Buy]]:
        prices = [self.offers.reagent(assay, self.bound) for assay in assays]
        flat = sum((p for p in prices if isinstance(p, Fraction)), Fraction(0))
        return flat, [price for price in prices if callable(price)]


def _bought(flat: Fraction, others: Sequence[Buy], reactions: int) -> Fraction:
    return sum((buy(reactions) for buy in others), reactions * flat)


def _tier_price(tiers: Sequence[tuple[int, Decimal]], pool: Pool) -> Fraction:
    for slots, price in tiers:
        if pool.slots <= slots:
            return Fraction(price)
    raise StudyFileError(
        code="position-tiers-too-short",
        where="platform, key 'position_cost'",
        what=f"no tier holds the fullest pool (got {pool.slots} slots, "
        f"tiers up to {tiers[-1][0]})",
        accepted="tiers that reach the slots of every pool, references included",
        next_step="Add a tier or lower plex",
    )
