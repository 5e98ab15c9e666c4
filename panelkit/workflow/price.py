"""`price_panels`: what given marker lists cost, without expression data."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction

from panelkit.config import MINOR_DIGITS, PRICING, PlatformSection, ProgrammeSection
from panelkit.costing import (
    PanelPricer,
    break_even_price,
    break_even_volume,
    cheapest_split,
    choose_spares,
    drivers,
    next_step_down,
    payback_months,
    staircase,
)
from panelkit.errors import NoPanelError, UsageError, name_some
from panelkit.records import (
    ANY_MARKER,
    AssayPrice,
    BreakEven,
    CostSheet,
    Finding,
    Findings,
    PanelCost,
    PriceAnswer,
    PriceQuestion,
    ScenarioAnswer,
    SheetAssay,
    Spares,
    Variation,
)
from panelkit.workflow.marker_lists import count_of, markers_of
from panelkit.workflow.price_inputs import (
    Priceable,
    PriceSource,
    apply_settings,
    load_priceable,
)

__all__ = ["PriceRequest", "price_panels"]


@dataclass(frozen=True, slots=True)
class PriceRequest:
    """What `panelkit price` is asked.

    Attributes
    ----------
    markers : tuple of str
        The panel: names, files of names, or one number.
    source : PriceSource
        Where prices come from.
    against : tuple of str
        Markers of scenario B; empty for those of A.
    against_platforms : tuple of str
        Platforms of B; empty for those of A.
    against_settings : tuple of (str, str)
        Keys that B sets anew.
    compare : bool
        Whether there is a scenario B.
    vary : tuple of (str, tuple of str)
        Keys with the values that each takes.
    break_even : int or None
        Up to how many samples the break-even is looked for; 0 for twice the
        programme's.
    change_cost : str or None
        One-off cost of going from A to B.
    split : bool
        Whether to look for the cheapest split over the platforms.
    land : int or None
        How many designs must work; 0 for all of the panel.
    chance : float
        With which probability.
    spares : tuple of str
        Stand-ins; empty for those that the price list declares, else its others.
    """

    markers: tuple[str, ...]
    source: PriceSource
    against: tuple[str, ...] = ()
    against_platforms: tuple[str, ...] = ()
    against_settings: tuple[tuple[str, str], ...] = ()
    compare: bool = False
    vary: tuple[tuple[str, tuple[str, ...]], ...] = ()
    break_even: int | None = None
    change_cost: str | None = None
    split: bool = False
    land: int | None = None
    chance: float = PRICING.probability
    spares: tuple[str, ...] = field(default=())


def price_panels(request: PriceRequest) -> PriceAnswer:
    """Return everything that was asked about the cost of one panel, or of two.

    Parameters
    ----------
    request : PriceRequest
        Panels, prices, questions.

    Returns
    -------
    PriceAnswer
        Numbers only; nothing is written.

    Raises
    ------
    UsageError
        What is asked makes no sense.
    StudyFileError, InputDataError
        A file cannot be used.
    NoPanelError
        No platform can run a panel.
    """
    here = load_priceable(request.source)
    markers = _meant(request.markers, here.pricer)
    one = _scenario("A", here, markers, request.split)
    scenarios = [one]
    pricers = [here.pricer]
    if request.compare:
        there = _other(request, here)
        others = (
            _meant(request.against, there.pricer, markers)
            if (request.against)
            else markers
        )
        scenarios.append(_scenario("B", there, others, request.split))
        pricers.append(there.pricer)
        _check_currency(pricers)
    programme = here.pricer.programme
    questions = _questions(scenarios, pricers)
    break_even = _break_even(request, scenarios, pricers)
    saved = _saved(scenarios)
    change = _amount(request.change_cost)
    return PriceAnswer(
        currency=programme.currency,
        samples=programme.samples,
        horizon_months=programme.horizon_months,
        scenarios=tuple(scenarios),
        saved=saved,
        ranking=_ranking(scenarios),
        break_even=break_even,
        payback=_payback(change, saved),
        change_cost=change,
        questions=questions,
        variations=_variations(request, scenarios, pricers),
        spares=_spares(request, here.pricer, one),
        findings=_findings(here, scenarios),
    )


def _meant(
    words: Sequence[str], pricer: PanelPricer, first: Sequence[str] = ()
) -> tuple[str, ...]:
    return markers_of(words, pricer.prices, pricer.platforms, first)


def _scenario(
    name: str, source: Priceable, markers: tuple[str, ...], split: bool
) -> ScenarioAnswer:
    pricer = source.pricer
    _check_known(pricer, markers)
    found = {place: pricer.attempt(markers, place) for place in pricer.platforms}
    refusals = {p: r for p, r in found.items() if isinstance(r, NoPanelError)}
    costs = pricer.costs(markers)
    parted = cheapest_split(pricer, markers) if split else None
    if not costs:
        raise _refusal(name, len(markers), refusals)
    best = costs[0]
    return ScenarioAnswer(
        name=name,
        markers=markers,
        costs=costs,
        refusals=tuple((p, f"{r.where}: {r.what}") for p, r in refusals.items()),
        split=parted,
        stairs=staircase(
            pricer, _further(pricer, markers, best.platform), best.platform
        ),
        step_down=next_step_down(pricer, markers, best.platform),
        drivers=drivers(pricer, markers, best.platform),
        assumptions=source.assumptions,
        sheet=_sheet(name, pricer, markers, best),
    )


def _refusal(
    name: str, size: int, refusals: Mapping[str, NoPanelError]
) -> NoPanelError:
    """Return why no platform runs a panel: the reason itself where there is one."""
    first = next(iter(refusals.values()))
    if len(refusals) == 1:
        return first
    return NoPanelError(
        code="no-platform-runs-it",
        where=f"scenario {name}, {size} markers",
        what=f"none of {name_some(refusals)} can run the panel "
        f"({first.where}: {first.what})",
        accepted="a panel that at least one platform can run",
        next_step=first.next_step,
    )


def _check_known(pricer: PanelPricer, markers: Sequence[str]) -> None:
    """Refuse names that no row, no kit and no row for any marker stands for."""
    rows = {r.marker for name in pricer.platforms for r in pricer.prices.quotes(name)}
    if ANY_MARKER in rows:
        return
    rows |= {name for kit in pricer.kits for name in kit.markers}
    if strangers := [name for name in markers if name not in rows]:
        raise UsageError(
            code="marker-not-sold",
            where="markers",
            what=f"nobody sells {name_some(strangers)} (no row of the price list and "
            "no kit names them)",
            accepted="markers of the price list; an empty price is a missing quote",
            next_step="Check the spelling, or add rows without a price",
        )


def _further(
    pricer: PanelPricer, markers: tuple[str, ...], place: str
) -> tuple[str, ...]:
    """Return the panel and some more markers, for the staircase."""
    rows = pricer.prices.quotes(place)
    more = [
        row.marker
        for row in rows
        if row.role == "marker"
        and row.marker != ANY_MARKER
        and row.status != "no"
        and not row.is_missing_quote
    ]
    if any(row.marker == ANY_MARKER for row in rows):
        more += [f"further-{k}" for k in range(1, PRICING.stairs_beyond + 1)]
    fresh = [name for name in dict.fromkeys(more) if name not in markers]
    return markers + tuple(fresh[: PRICING.stairs_beyond])


def _other(request: PriceRequest, here: Priceable) -> Priceable:
    """Return what prices scenario B: the same files, with other keys or platforms."""
    places = request.against_platforms or request.source.platforms
    source = PriceSource(
        file=request.source.file,
        prices=request.source.prices,
        conflicts=request.source.conflicts,
        family=request.source.family,
        samples=request.source.samples,
        currency=request.source.currency,
        reaction=request.source.reaction,
        development=request.source.development,
        settings=(*request.source.settings, *request.against_settings),
        platforms=places,
    )
    return load_priceable(source)


def _check_currency(pricers: Sequence[PanelPricer]) -> None:
    codes = [pricer.programme.currency for pricer in pricers]
    if len(set(codes)) > 1:
        raise UsageError(
            code="currencies-mixed",
            where="scenario B, currency",
            what=f"the scenarios are in different currencies (got {name_some(codes)})",
            accepted="one currency: nothing is converted",
            next_step="Convert the prices of one of them",
        )


def _saved(scenarios: Sequence[ScenarioAnswer]) -> tuple[tuple[str, Decimal], ...]:
    if len(scenarios) < 2:
        return ()
    a, b = (scenario.cost for scenario in scenarios)
    names = dict.fromkeys(line.name for cost in (a, b) for line in cost.lines)
    lines = [(name, a.line(name) - b.line(name)) for name in names]
    return (
        *lines,
        ("total", a.total - b.total),
        ("one_off", a.one_off - b.one_off),
        ("recurring", a.recurring - b.recurring),
        ("per_year", a.per_year - b.per_year),
        ("per_result", a.cost_per_result - b.cost_per_result),
    )


def _ranking(scenarios: Sequence[ScenarioAnswer]) -> str:
    """Return which scenario is cheaper, where missing quotes leave that decided."""
    if len(scenarios) < 2:
        return ""
    a, b = (scenario.cost for scenario in scenarios)
    if a.total == b.total and a.total_high == b.total_high:
        return "A and B cost the same."
    missing = a.missing_quotes or b.missing_quotes
    if not missing:
        gap = f"{abs(a.total - b.total):,f} {a.currency}"
        return f"{'A' if a.total < b.total else 'B'} is cheaper, by {gap}."
    if a.total_high < b.total:
        return "A is cheaper, whatever the missing quotes turn out to be."
    if b.total_high < a.total:
        return "B is cheaper, whatever the missing quotes turn out to be."
    same = set(a.missing_quotes) == set(b.missing_quotes)
    if same and (a.total - b.total) * (a.total_high - b.total_high) > 0:
        # both intervals move with the same quotes: compared at common values
        cheaper = "A" if a.total < b.total else "B"
        return f"{cheaper} is cheaper at the lowest and at the highest quote alike."
    return "Needs a quote: which is cheaper depends on prices that are missing."


def _break_even(
    request: PriceRequest,
    scenarios: Sequence[ScenarioAnswer],
    pricers: Sequence[PanelPricer],
) -> BreakEven | None:
    if request.break_even is None:
        return None
    if len(scenarios) < 2:
        raise UsageError(
            code="break-even-alone",
            where="--break-even",
            what="a break-even takes two scenarios (got one)",
            accepted="--against, --against-platform or --against-set beside it",
            next_step="Say what to compare with",
        )
    largest = request.break_even or 2 * pricers[0].programme.samples

    def total_of(k: int, samples: int) -> Decimal | None:
        costs = pricers[k].changed(samples=samples).costs(scenarios[k].markers)
        return costs[0].total if costs else None

    return break_even_volume(
        lambda n: total_of(0, n), lambda n: total_of(1, n), largest
    )


def _amount(text: str | None) -> Decimal | None:
    if text is None:
        return None
    row = AssayPrice.from_row({"marker": "change", "dev": text}, where="--change-cost")
    return row.dev


def _payback(
    change: Decimal | None, saved: Sequence[tuple[str, Decimal]]
) -> int | None:
    if change is None:
        return None
    if not saved:
        raise UsageError(
            code="payback-alone",
            where="--change-cost",
            what="a change goes from one scenario to another (got one)",
            accepted="--against, --against-platform or --against-set beside it",
            next_step="Say what to change to",
        )
    return payback_months(change, dict(saved)["per_year"])


def _questions(
    scenarios: Sequence[ScenarioAnswer], pricers: Sequence[PanelPricer]
) -> tuple[PriceQuestion, ...]:
    """Return the quotes that are missing, and what each would have to be (F19)."""
    found = []
    for k, (scenario, pricer) in enumerate(zip(scenarios, pricers, strict=True)):
        other = scenarios[1 - k].cost if len(scenarios) > 1 else None
        found += [
            _question(pricer, scenario, marker, other)
            for marker in scenario.cost.missing_quotes
        ]
    decided = [each for each in found if each.break_even is not None]
    return (*decided, *(each for each in found if each.break_even is None))


def _question(
    pricer: PanelPricer,
    scenario: ScenarioAnswer,
    marker: str,
    other: PanelCost | None,
) -> PriceQuestion:
    place = scenario.cost.platform
    row = pricer.prices.for_panel([marker], place)[0]
    shared = other is not None and marker in other.missing_quotes
    if other is None or shared or row.has_reagent_quote:
        width = scenario.cost.total_high - scenario.cost.total
        verdict = (
            f"Ask for a quote of {marker} on {place}: missing quotes move scenario "
            f"{scenario.name} by up to {width:,f} {scenario.cost.currency}."
        )
        return PriceQuestion(marker, place, None, verdict)
    price = break_even_price(pricer, scenario.markers, place, marker, other.total)
    highest = max(
        (q.test for q in pricer.prices.quotes(place) if q.test is not None),
        default=None,
    )
    mine, theirs = scenario.name, "B" if scenario.name == "A" else "A"
    code = scenario.cost.currency
    if price is None:
        verdict = f"No price of {marker} decides between A and B."
    elif price < 0:
        verdict = f"{mine} never wins: it is dearer even if {marker} cost nothing."
    elif highest is not None and price > highest:
        verdict = (
            f"{mine} wins at any plausible price of {marker}: up to {price:f} {code} a "
            f"reaction, above the highest quote of {highest:f}."
        )
    else:
        short = f"{price:.{MINOR_DIGITS[code]}f} {code}"
        verdict = (
            f"Ask for a quote of {marker} on {place}: below {short} a reaction take "
            f"{mine}, above it {theirs}."
        )
    return PriceQuestion(marker, place, price, verdict)


def _variations(
    request: PriceRequest,
    scenarios: Sequence[ScenarioAnswer],
    pricers: Sequence[PanelPricer],
) -> tuple[Variation, ...]:
    found = []
    for key, values in request.vary:
        for value in values:
            for scenario, pricer in zip(scenarios, pricers, strict=True):
                changed, _given = apply_settings(pricer, [(key, value)])
                costs = changed.costs(scenario.markers)
                best = costs[0] if costs else None
                found.append(
                    Variation(
                        scenario=scenario.name,
                        key=key,
                        value=value,
                        platform=best.platform if best else "",
                        total=best.total if best else None,
                        cost_per_result=best.cost_per_result if best else None,
                        runs=best.runs if best else 0,
                        fill=best.fill if best else Fraction(0),
                        groups=len(best.groups) if best else 0,
                    )
                )
    return tuple(found)


def _spares(
    request: PriceRequest, pricer: PanelPricer, scenario: ScenarioAnswer
) -> Spares | None:
    if request.land is None:
        return None
    place = scenario.cost.platform
    panel = [
        row
        for row in pricer.prices.for_panel(scenario.markers, place)
        if row.role == "marker" and row.marker in scenario.cost.assays
    ]
    return choose_spares(
        panel,
        _stand_ins(request, pricer, scenario.markers, place),
        pricer.platforms[place].design_success,
        pricer.programme.currency,
        wanted=request.land or len(panel),
        probability=request.chance,
    )


def _stand_ins(
    request: PriceRequest,
    pricer: PanelPricer,
    markers: Sequence[str],
    place: str,
) -> list[AssayPrice]:
    """Return the stand-ins: named, declared, or the other markers of the list."""
    prices = pricer.prices
    if request.spares and count_of(request.spares) is None:
        names: list[str] = list(_meant(request.spares, pricer))
        return list(prices.for_panel(names, place))[: len(names)]
    rows = [
        row
        for row in prices.quotes(place)
        if row.role == "marker" and row.status != "no" and row.marker not in markers
    ]
    own = [row for row in rows if row.marker != ANY_MARKER]
    declared = [row for row in own if row.backup_of in markers]
    if declared:
        return declared
    if own:
        return own
    number = count_of(request.spares) or len(markers)
    names = [f"spare-{k}" for k in range(1, number + 1)]
    return list(prices.for_panel(names, place))[: len(names)] if rows else []


def _findings(here: Priceable, scenarios: Sequence[ScenarioAnswer]) -> Findings:
    noticed = list(here.findings)
    seen = {(each.code, each.message) for each in noticed}
    for scenario in scenarios:
        for each in scenario.cost.findings:
            if (each.code, each.message) not in seen:
                seen.add((each.code, each.message))
                noticed.append(each)
        if not scenario.cost.proved:
            noticed.append(
                Finding(
                    code="cover-not-proved",
                    severity="warning",
                    where=f"scenario {scenario.name}, kits",
                    message="the cheapest choice of kits is not proved: no cover costs "
                    f"less than {scenario.cost.bound:,f}",
                    next_step="Read the total as an upper bound, or leave kits out",
                )
            )
    if here.pricer.programme.deliveries == 1:
        noticed.append(
            Finding(
                code="one-delivery",
                severity="info",
                where="programme, key 'deliveries'",
                message="all samples are taken to arrive at once, which fills runs "
                "best; a weekly rhythm costs more",
                next_step="Say --set deliveries=52, or how many there are",
            )
        )
    return Findings(tuple(noticed))


def _sheet(
    name: str, pricer: PanelPricer, markers: Sequence[str], cost: PanelCost
) -> CostSheet:
    platform, programme = pricer.platforms[cost.platform], pricer.programme
    rows = {r.marker: r for r in pricer.prices.for_panel(list(markers), cost.platform)}
    inputs: list[tuple[str, Decimal | int | str]] = [
        (key, getattr(programme, key))
        for key in ProgrammeSection.model_fields
        if key not in ("repeat_rate", "missing_price", "sample_volume")
    ]
    inputs.append(("repeat_rate", platform.effective_repeat_rate(programme)))
    inputs += [
        (key, getattr(platform, key))
        for key in PlatformSection.model_fields
        if key not in _NOT_ON_THE_SHEET
    ]
    tiers = platform.position_cost
    return CostSheet(
        name=name,
        cost=cost,
        digits=MINOR_DIGITS[cost.currency],
        inputs=tuple(inputs),
        position_tiers=((0, tiers),) if isinstance(tiers, Decimal) else tiers,
        groups=cost.groups,
        assays=tuple(
            _sheet_assay(rows[assay], pool)
            for assay, pool in zip(cost.assays, cost.pool_of, strict=True)
        ),
    )


_NOT_ON_THE_SHEET = (
    "family",
    "plex",
    "groups",
    "refs_scope",
    "repeat_rate",
    "position_cost",
    "max_positions_per_sample",
    "pool_volume",
    "design_success",
)


def _sheet_assay(row: AssayPrice, pool: int) -> SheetAssay:
    return SheetAssay(
        name=row.marker,
        role=row.role,
        pool=pool + 1,
        dev=row.dev,
        test=row.test,
        pack=row.pack,
        pack_price=row.pack_price,
        tiers=row.tiers,
        incremental=row.incremental,
        fail_rate=row.fail_rate,
        slots=row.slots,
    )
