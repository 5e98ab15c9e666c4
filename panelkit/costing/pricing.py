"""What one panel costs on one platform over a programme.

Formula numbers F1 to F13 are those of the panelkit cost model. Every sum is an
exact fraction; each line is rounded once, and the total adds the rounded lines.
"""

import math
import statistics
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Literal

from panelkit.config import (
    USUAL_REFERENCES,
    PlatformSection,
    ProgrammeSection,
    platform_section,
    programme_section,
)
from panelkit.costing.geometry import (
    Layout,
    Pool,
    PoolPlan,
    ceil_ratio,
    find_layouts,
    plan_pools,
)
from panelkit.costing.money import from_minor_units, minor_units, round_money
from panelkit.errors import (
    InputDataError,
    NoPanelError,
    StudyFileError,
    UsageError,
    name_some,
)
from panelkit.records import (
    ANY_MARKER,
    AssayPrice,
    CostLine,
    Finding,
    Findings,
    PanelCost,
)

__all__ = ["programme_cost", "purchase_cost", "samples_run_and_results"]

MIN_QUOTES = 3  # fewer say nothing about what a missing quote may be
LINE_NAMES = (
    "collection",
    "setup",
    "development",
    "runs",
    "samples",
    "positions",
    "assays",
    "lots",
)
ONE_OFF_LINES = ("setup", "development")

Assay = AssayPrice | Mapping[str, object]
Bound = Literal["low", "middle", "high"]
Buy = Callable[[int], Fraction]


def programme_cost(
    programme: ProgrammeSection | Mapping[str, object],
    platform: PlatformSection | Mapping[str, object],
    assays: Iterable[Assay],
    *,
    quotes: Iterable[Assay] | None = None,
) -> PanelCost:
    """Return what a panel costs on a platform, line by line (F1 to F13).

    Parameters
    ----------
    programme : ProgrammeSection or mapping of str to object
        What is to be measured; a mapping holds the keys of ``[programme]``.
    platform : PlatformSection or mapping of str to object
        How; a mapping holds the keys of ``[platform.NAME]``.
    assays : iterable of AssayPrice or mapping of str to object
        The panel's markers and the platform's references, in file order; a mapping
        is a row of the price list. See `PriceList.for_panel`.
    quotes : iterable of AssayPrice or mapping of str to object, optional
        All rows of the platform, from which missing prices are bounded or imputed
        (see `PriceList.quotes`); the panel's own assays when left out.

    Returns
    -------
    PanelCost
        The lines, totals and step figures.

    Raises
    ------
    StudyFileError
        If the programme or the platform cannot be used.
    UsageError
        If the assays are no panel of one platform.
    InputDataError
        If a row cannot be used, or missing prices are refused or cannot be bounded.
    NoPanelError
        If the panel cannot be made, does not fit, or may not enter for want of a
        price.
    """
    plan_programme = programme_section(programme)
    plan_platform = platform_section(platform)
    panel = _as_panel(assays)
    missing = _missing(plan_programme, panel)
    known = panel.assays if quotes is None else _as_assays(quotes, "quotes")
    offers = _Offers(known, missing)
    job = _Job(plan_programme, plan_platform, panel, offers)
    bounded = bool(missing) and plan_programme.missing_price == "bound"
    low, layout = job.cheapest("low" if bounded else "middle")
    high = job.cheapest("high")[0] if bounded else low
    return job.record(layout, low, high, tuple(a.marker for a in missing))


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
    price = _reagent(assay)
    if price is None:
        return None
    return price(reactions) if callable(price) else reactions * price


def _reagent(assay: AssayPrice) -> Fraction | Buy | None:
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


@dataclass(frozen=True, slots=True)
class _Panel:
    platform: str
    markers: tuple[AssayPrice, ...]
    references: tuple[AssayPrice, ...]

    @property
    def assays(self) -> tuple[AssayPrice, ...]:
        return self.markers + self.references


def _as_assays(rows: Iterable[Assay], argument: str) -> list[AssayPrice]:
    if isinstance(rows, Mapping | str):
        raise UsageError(
            code="rows-expected",
            where=argument,
            what=f"one row alone is no list of rows (got {type(rows).__name__})",
            accepted="a list of rows of the price list",
            next_step="Put the rows in a list",
        )
    assays = []
    for number, row in enumerate(rows, start=1):
        if not isinstance(row, AssayPrice | Mapping):
            raise UsageError(
                code="row-expected",
                where=f"{argument}, row {number}",
                what=f"the row has no columns (got {type(row).__name__})",
                accepted="a mapping from column to cell, or an AssayPrice",
                next_step="Pass rows of the price list",
            )
        if isinstance(row, Mapping):
            row = AssayPrice.from_row(row, where=f"{argument}, row {number}")
        assays.append(row)
    return assays


def _as_panel(rows: Iterable[Assay]) -> _Panel:
    assays = _as_assays(rows, "assays")
    _check_names(assays)
    impossible = [assay.marker for assay in assays if assay.status == "no"]
    if impossible:
        raise NoPanelError(
            code="marker-cannot-be-assayed",
            where="assays, column 'status'",
            what=f"these cannot be assayed here (got {name_some(impossible)})",
            accepted="assays with status ok or unknown",
            next_step="Leave them out, name stand-ins, or take another platform",
        )
    platforms = sorted({assay.platform for assay in assays})
    if len(platforms) > 1:
        raise UsageError(
            code="platforms-mixed",
            where="assays, column 'platform'",
            what=f"the rows are of several platforms (got {name_some(platforms)})",
            accepted="rows of one platform",
            next_step="Price each platform on its own",
        )
    markers = tuple(assay for assay in assays if assay.role == "marker")
    if not markers:
        raise UsageError(
            code="panel-empty",
            where="assays",
            what=f"the panel has no marker (got {len(assays)} references)",
            accepted="at least one row with role 'marker'",
            next_step="Add the markers of the panel",
        )
    references = tuple(assay for assay in assays if assay.role == "reference")
    return _Panel(platforms[0], markers, references)


def _check_names(assays: Sequence[AssayPrice]) -> None:
    names = [assay.marker for assay in assays]
    if ANY_MARKER in names:
        raise UsageError(
            code="marker-unnamed",
            where="assays, column 'marker'",
            what=f"'{ANY_MARKER}' prices other markers and is none itself "
            f"(got {ANY_MARKER!r})",
            accepted="rows of named markers",
            next_step="Name the markers; PriceList.for_panel looks up their prices",
        )
    repeated = sorted({name for name in names if names.count(name) > 1})
    if repeated:
        raise UsageError(
            code="marker-repeated",
            where="assays, column 'marker'",
            what=f"assays are listed twice (got {name_some(repeated)})",
            accepted="one row for each marker and reference",
            next_step="Remove the repeated rows",
        )


def _missing(programme: ProgrammeSection, panel: _Panel) -> list[AssayPrice]:
    missing = [assay for assay in panel.assays if assay.is_missing_quote]
    named = name_some(assay.marker for assay in missing)
    if missing and programme.missing_price == "refuse":
        raise InputDataError(
            code="price-missing",
            where="assays, columns 'dev' and 'test'",
            what=f"{len(missing)} assays have no complete quote (got {named})",
            accepted="a one-off cost, and a test price, pack or tiers, for each",
            next_step='Ask for quotes, or set missing_price = "bound"',
        )
    if missing and programme.missing_price == "exclude":
        raise NoPanelError(
            code="marker-without-price",
            where="assays, columns 'dev' and 'test'",
            what=f"assays without a complete quote may not enter a panel (got {named})",
            accepted="panels of priced assays, since missing_price is 'exclude'",
            next_step='Leave them out, or set missing_price = "bound"',
        )
    return missing


class _Offers:
    """Prices of the panel's assays; missing ones from the platform's quotes."""

    def __init__(
        self, quotes: Sequence[AssayPrice], missing: Sequence[AssayPrice]
    ) -> None:
        usable = [quote for quote in quotes if quote.status != "no" and missing]
        self.devs = [Fraction(q.dev) for q in usable if q.dev is not None]
        priced = [_reagent(quote) for quote in usable if quote.has_reagent_quote]
        self.flat = [price for price in priced if isinstance(price, Fraction)]
        self.stepped = [price for price in priced if callable(price)]
        if any(assay.dev is None for assay in missing):
            _check_number(len(self.devs), "dev", missing)
        if not all(assay.has_reagent_quote for assay in missing):
            _check_number(len(priced), "test", missing)

    def dev(self, assay: AssayPrice, bound: Bound) -> Fraction:
        return _of_bound(self.devs, bound) if assay.dev is None else Fraction(assay.dev)

    def reagent(self, assay: AssayPrice, bound: Bound) -> Fraction | Buy:
        own = _reagent(assay)
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


class _Job:
    """One panel on one platform, ready to be priced."""

    def __init__(
        self,
        programme: ProgrammeSection,
        platform: PlatformSection,
        panel: _Panel,
        offers: _Offers,
    ) -> None:
        self.programme = programme
        self.platform = platform
        self.panel = panel
        self.offers = offers
        success = 1 - Fraction(platform.effective_repeat_rate(programme))
        for assay in panel.assays:
            success *= 1 - Fraction(assay.fail_rate)
        self.samples_run, self.results = samples_run_and_results(
            programme.samples, 1 - success, programme.repeat_mode
        )
        self.plan = plan_pools(platform, panel.markers, panel.references)
        self.layouts = find_layouts(
            platform, self.plan, self.samples_run, programme.deliveries
        )
        self.overage = 1 + Fraction(platform.overage)
        positions = platform.replicates * len(self.plan.pools)
        feeds = platform.prep_positions
        self.preparations = ceil_ratio(positions, feeds) if feeds else 0
        months = platform.lot_months
        self.lots = ceil_ratio(programme.horizon_months, months) if months else 1

    def cheapest(self, bound: Bound) -> tuple[dict[str, int], Layout]:
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
            priced.append((lines, layout))
        return min(priced, key=lambda pair: sum(pair[0].values()))

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
            n_pools = len(self.plan.pools)
            pool_runs = sum(
                size * runs
                for size, runs in zip(layout.sizes, layout.runs, strict=True)
            )
            each = self._reactions_per_lot(filled * n_pools + controls * pool_runs)
            bought += reagents.of_everywhere(each)
        return {
            "runs": sum(layout.runs) * Fraction(platform.run_cost),
            "positions": self.overage * self._positions(layout),
            "assays": self.lots * bought,
        }

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

    def record(
        self,
        layout: Layout,
        low: dict[str, int],
        high: dict[str, int],
        missing: tuple[str, ...],
    ) -> PanelCost:
        """Return the priced panel as a record."""
        currency = self.programme.currency
        total, total_high = sum(low.values()), sum(high.values())
        one_off = sum(low[name] for name in ONE_OFF_LINES)

        def money(units: int) -> Decimal:
            return from_minor_units(units, currency)

        def share(units: int, parts: Fraction) -> Decimal:
            return round_money(Fraction(money(units)) / parts, currency)

        return PanelCost(
            currency=currency,
            platform=self.panel.platform,
            lines=tuple(
                CostLine(name, money(low[name]), money(high[name]))
                for name in LINE_NAMES
            ),
            total=money(total),
            total_high=money(total_high),
            cost_per_result=share(total, self.results),
            cost_per_result_high=share(total_high, self.results),
            one_off=money(one_off),
            recurring=money(total - one_off),
            per_year=share(
                total - one_off, Fraction(self.programme.horizon_months, 12)
            ),
            samples_run=self.samples_run,
            results=self.results,
            pools=len(self.plan.pools),
            groups=layout.sizes,
            samples_per_run=layout.samples_per_run,
            runs=sum(layout.runs),
            positions_per_run=layout.positions_per_run,
            filled_positions=layout.filled,
            control_positions=layout.controls,
            preparations=self.preparations,
            missing_quotes=missing,
            findings=_findings(self.platform, self.panel),
        )


class _Reagents:
    """Reagent prices by pool: prices of one reaction are summed once."""

    def __init__(self, plan: PoolPlan, offers: _Offers, bound: Bound) -> None:
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


def _findings(platform: PlatformSection, panel: _Panel) -> Findings:
    found = []
    unknown = [assay.marker for assay in panel.assays if assay.status == "unknown"]
    if unknown:
        found.append(
            Finding(
                code="assay-status-unknown",
                severity="warning",
                where="price list, column 'status'",
                message=f"of the panel's {len(panel.assays)} assays it is not known "
                f"whether the platform can run {name_some(unknown)}",
                next_step="Ask whether they can be made, then write ok or no",
            )
        )
    usual = USUAL_REFERENCES[platform.family] if platform.family else 0
    if len(panel.references) < usual:
        found.append(
            Finding(
                code="references-few",
                severity="warning",
                where="price list, column 'role'",
                message=f"{len(panel.references)} references, where {usual} are "
                f"usual for {platform.family}",
                next_step="Add references, or say how results are normalised",
            )
        )
    return Findings(tuple(found))
