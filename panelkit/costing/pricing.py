"""What one panel costs on one platform over a programme, kits included.

Formula numbers F1 to F14 are those of the panelkit cost model. Every sum is an exact
fraction; each line is rounded once, and the total adds the rounded lines.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from itertools import combinations

from panelkit.config import (
    USUAL_REFERENCES,
    KitSection,
    PlatformSection,
    ProgrammeSection,
    kit_sections,
    platform_section,
    programme_section,
)
from panelkit.costing.direct_cost import (
    LINE_NAMES,
    DirectCost,
    Panel,
    Priced,
    samples_run_and_results,
)
from panelkit.costing.geometry import Layout
from panelkit.costing.kits import KitChoice, KitOffer, choose_kits, offer_of
from panelkit.costing.money import from_minor_units, minor_units, round_money
from panelkit.costing.panel_rows import (
    Assay,
    as_assays,
    as_panel,
    can_be_direct,
    check_conflicts,
    check_makeable,
    missing_quotes,
)
from panelkit.costing.purchase import Bound, Offers, purchase_cost
from panelkit.errors import InputDataError, NoPanelError, name_some
from panelkit.records import (
    NO_CONFLICTS,
    AssayPrice,
    Conflicts,
    CostLine,
    Finding,
    Findings,
    KitPurchase,
    PanelCost,
)

__all__ = ["programme_cost", "purchase_cost", "samples_run_and_results"]

ONE_OFF_LINES = ("setup", "development")
KIT_LINE = "kits"


def programme_cost(
    programme: ProgrammeSection | Mapping[str, object],
    platform: PlatformSection | Mapping[str, object],
    assays: Iterable[Assay],
    *,
    quotes: Iterable[Assay] | None = None,
    kits: Iterable[KitSection | Mapping[str, object]] = (),
    conflicts: Conflicts = NO_CONFLICTS,
) -> PanelCost:
    """Return what a panel costs on a platform, line by line (F1 to F14).

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
    kits : iterable of KitSection or mapping of str to object
        Kits that may be bought instead of assays; the cheapest choice is taken.
    conflicts : Conflicts
        Markers that must be kept apart.

    Returns
    -------
    PanelCost
        The lines, totals and step figures.

    Raises
    ------
    StudyFileError
        If the programme, the platform or a kit cannot be used.
    UsageError
        If the assays are no panel of one platform.
    InputDataError
        If a row cannot be used, or missing prices are refused or cannot be bounded.
    NoPanelError
        If the panel cannot be made, does not fit, is of markers that exclude each
        other, or may not enter for want of a price.
    """
    panel = as_panel(assays)
    job = _PanelJob(
        programme=programme_section(programme),
        platform=platform_section(platform),
        panel=panel,
        quotes=panel.assays if quotes is None else tuple(as_assays(quotes, "quotes")),
        kits=kit_sections(kits),
        conflicts=conflicts,
    )
    check_conflicts(panel, conflicts)
    return job.cost()


@dataclass(frozen=True, slots=True)
class _Bought:
    """A panel at one bound of missing prices."""

    direct: frozenset[str]
    priced: Priced
    kits: tuple[KitOffer, ...]
    kit_units: int
    proved: bool
    bound: int

    @property
    def total(self) -> int:
        return self.priced.total + self.kit_units


class _PanelJob:
    """One panel on one platform, by single assays and kits."""

    def __init__(
        self,
        programme: ProgrammeSection,
        platform: PlatformSection,
        panel: Panel,
        quotes: Sequence[AssayPrice],
        kits: Sequence[KitSection],
        conflicts: Conflicts,
    ) -> None:
        self.programme = programme
        self.platform = platform
        self.panel = panel
        self.quotes = quotes
        self.conflicts = conflicts
        self.markers = tuple(assay.marker for assay in panel.markers)
        self.everything = frozenset(self.markers)
        self.kits = [kit for kit in kits if self.everything & set(kit.markers)]
        self._jobs: dict[frozenset[str], DirectCost] = {}

    def cost(self) -> PanelCost:
        """Return the priced panel as a record."""
        if not self.kits:
            return self._without_kits()
        low = self._with_kits("low" if self._may_be_bounded() else "middle")
        if low is None:
            return self._without_kits()  # it says why the panel cannot be had
        bounded = any(
            assay.is_missing_quote for assay in self._panel_of(low.direct).assays
        )
        high = self._with_kits("high") if bounded and self._may_be_bounded() else low
        return self._record(low, high or low)

    def _may_be_bounded(self) -> bool:
        return self.programme.missing_price == "bound"

    def _without_kits(self) -> PanelCost:
        check_makeable(self.panel)
        missing = missing_quotes(self.programme, self.panel)
        bounded = bool(missing) and self._may_be_bounded()
        low = self._direct_only("low" if bounded else "middle")
        return self._record(low, self._direct_only("high") if bounded else low)

    def _direct_only(self, bound: Bound) -> _Bought:
        priced = self._job(self.everything).cheapest(bound)
        if not self._allowed((), self.everything):
            raise NoPanelError(
                code="sample-volume-exceeded",
                where="programme, key 'sample_volume'",
                what=f"{len(self._job(self.everything).plan.pools)} pools need more "
                f"of a sample than there is (got {self.programme.sample_volume})",
                accepted="panels whose pools stay within the volume of a sample",
                next_step="Take fewer markers or pools, or collect more",
            )
        total = priced.total
        return _Bought(self.everything, priced, (), 0, True, total)

    def _with_kits(self, bound: Bound) -> _Bought | None:
        # Whether references are run moves the share that fails, so kits are priced
        # for a panel that runs them; without them it is a few samples fewer.
        samples_run = self._samples(bool(self.panel.references))[0]
        offers = [offer_of(kit, self.programme, samples_run) for kit in self.kits]
        priced: dict[frozenset[str], Priced] = {}

        def direct_total(markers: frozenset[str]) -> int | None:
            if markers not in priced:
                found = self._priced(markers, bound)
                if found is None:
                    return None
                priced[markers] = found
            return priced[markers].total

        choice = choose_kits(
            self.markers, offers, direct_total, self._units, self._allowed
        )
        if choice is None:
            return None
        return self._bought(choice, priced[choice.direct])

    def _bought(self, choice: KitChoice, priced: Priced) -> _Bought:
        cost = sum((offer.cost for offer in choice.kits), Fraction(0))
        return _Bought(
            direct=choice.direct,
            priced=priced,
            kits=choice.kits,
            kit_units=self._units(cost),
            proved=choice.proved,
            bound=choice.bound,
        )

    def _priced(self, markers: frozenset[str], bound: Bound) -> Priced | None:
        """Return the lines of single assays, or None where they cannot be run."""
        if not markers:
            return self._nothing_direct()
        panel = self._panel_of(markers)
        if not all(can_be_direct(self.programme, assay) for assay in panel.assays):
            return None
        try:
            return self._job(markers).cheapest(bound)
        except (NoPanelError, InputDataError):  # no room, or too few quotes
            return None

    def _nothing_direct(self) -> Priced:
        collection = self.programme.samples * Fraction(self.programme.collection_cost)
        lines = dict.fromkeys(LINE_NAMES, 0)
        lines["collection"] = self._units(collection)
        return Priced(lines, Layout((), (), (), self.platform.positions, 0, 0))

    def _panel_of(self, markers: frozenset[str]) -> Panel:
        own = tuple(a for a in self.panel.markers if a.marker in markers)
        references = self.panel.references if own else ()
        return Panel(self.panel.platform, own, references)

    def _job(self, markers: frozenset[str]) -> DirectCost:
        if markers not in self._jobs:
            panel = self._panel_of(markers)
            missing = [assay for assay in panel.assays if assay.is_missing_quote]
            self._jobs[markers] = DirectCost(
                self.programme,
                self.platform,
                panel,
                Offers(self.quotes, missing),
                self._samples(bool(panel.references)),
                self.conflicts,
            )
        return self._jobs[markers]

    def _samples(self, with_references: bool) -> tuple[int, Fraction]:
        """Return samples run and results expected: all markers can fail (F1, F2)."""
        success = 1 - Fraction(self.platform.effective_repeat_rate(self.programme))
        references = self.panel.references if with_references else ()
        for assay in (*self.panel.markers, *references):
            success *= 1 - Fraction(assay.fail_rate)
        programme = self.programme
        return samples_run_and_results(
            programme.samples, 1 - success, programme.repeat_mode
        )

    def _allowed(self, kits: tuple[KitOffer, ...], direct: frozenset[str]) -> bool:
        for one, other in combinations((offer.section for offer in kits), 2):
            if one.id in other.excludes or other.id in one.excludes:
                return False
        limit = Fraction(self.programme.sample_volume)
        if not limit:
            return True
        volume = sum((Fraction(offer.section.volume) for offer in kits), Fraction(0))
        if direct:
            pools = len(self._job(direct).plan.pools)
            volume += pools * Fraction(self.platform.pool_volume)
        return volume <= limit

    def _units(self, amount: Fraction) -> int:
        return minor_units(amount, self.programme.currency)

    def _record(self, low: _Bought, high: _Bought) -> PanelCost:
        currency = self.programme.currency
        job = self._job(low.direct) if low.direct else None
        layout = low.priced.layout
        with_references = bool(self.panel.references) and (
            bool(low.direct) or bool(low.kits)
        )
        samples_run, results = self._samples(with_references)
        total, total_high = low.total, high.total
        one_off = sum(low.priced.lines[name] for name in ONE_OFF_LINES)
        one_off += self._units(sum((kit.once for kit in low.kits), Fraction(0)))

        def money(units: int) -> Decimal:
            return from_minor_units(units, currency)

        def share(units: int, parts: Fraction) -> Decimal:
            return round_money(Fraction(money(units)) / parts, currency)

        lines = [
            CostLine(
                name, money(low.priced.lines[name]), money(high.priced.lines[name])
            )
            for name in LINE_NAMES
        ]
        if low.kits or high.kits:
            lines.append(
                CostLine(KIT_LINE, money(low.kit_units), money(high.kit_units))
            )
        direct = self._panel_of(low.direct)
        return PanelCost(
            currency=currency,
            platform=self.panel.platform,
            lines=tuple(lines),
            total=money(total),
            total_high=money(total_high),
            cost_per_result=share(total, results),
            cost_per_result_high=share(total_high, results),
            one_off=money(one_off),
            recurring=money(total - one_off),
            per_year=share(
                total - one_off, Fraction(self.programme.horizon_months, 12)
            ),
            samples_run=samples_run,
            results=results,
            pools=len(job.plan.pools) if job else 0,
            groups=layout.sizes,
            samples_per_run=layout.samples_per_run,
            runs=sum(layout.runs),
            positions_per_run=layout.positions_per_run,
            filled_positions=layout.filled,
            control_positions=layout.controls,
            preparations=job.preparations if job else 0,
            missing_quotes=tuple(
                assay.marker for assay in direct.assays if assay.is_missing_quote
            ),
            assays=tuple(assay.marker for assay in direct.assays),
            reactions=job.reactions(layout) if job else (),
            pool_of=job.pool_of() if job else (),
            fullest_pool=max(pool.slots for pool in job.plan.pools) if job else 0,
            lots=job.lots if job else 1,
            kits=tuple(self._purchase(offer) for offer in low.kits),
            proved=low.proved and high.proved,
            bound=None if low.proved else money(low.bound),
            findings=_findings(self.platform, direct),
        )

    def _purchase(self, offer: KitOffer) -> KitPurchase:
        currency = self.programme.currency
        return KitPurchase(
            kit=offer.section.id,
            units=offer.units,
            once=round_money(offer.once, currency),
            cost=round_money(offer.cost, currency),
            covers=tuple(m for m in self.markers if m in offer.section.markers),
            unwanted=tuple(
                m for m in offer.section.markers if m not in self.everything
            ),
        )


def _findings(platform: PlatformSection, panel: Panel) -> Findings:
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
    if panel.markers and len(panel.references) < usual:
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
