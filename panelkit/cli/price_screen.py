"""The screen of `panelkit price`: what it costs, what drives it, what it rests on."""

from collections.abc import Sequence
from decimal import Decimal
from typing import Final

from panelkit.cli.screen import console, show_table
from panelkit.records import (
    LINE_WORDS,
    RESEARCH_USE,
    Assumption,
    BreakEven,
    PanelCost,
    PriceAnswer,
    ScenarioAnswer,
    Spares,
    SplitCost,
)

__all__ = ["show_answer"]

MOST_NAMED: Final = 8
MOST_DRIVERS: Final = 8
MOST_QUESTIONS: Final = 3
MOST_STAIRS: Final = 14


def show_answer(answer: PriceAnswer, *, every_assumption: bool) -> None:
    """Print an answer.

    Parameters
    ----------
    answer : PriceAnswer
        Priced scenarios.
    every_assumption : bool
        Defaults that change nothing too.
    """
    for scenario in answer.scenarios:
        _say_panel(answer, scenario)
    _costs(answer)
    for scenario in answer.scenarios:
        _scenario(answer, scenario)
    if len(answer.scenarios) == 1:
        _drivers(answer, answer.scenarios[0])
        _stairs(answer, answer.scenarios[0])
    else:
        _comparison(answer)
    _variations(answer)
    if answer.spares is not None:
        _spares(answer, answer.spares)
    _notes(answer, every_assumption)


def _scenario(answer: PriceAnswer, scenario: ScenarioAnswer) -> None:
    _how(answer, scenario)
    if len(scenario.costs) + len(scenario.refusals) > 1:
        _platforms(answer, scenario)
    if scenario.split is not None:
        _split(scenario.split, scenario)


def _notes(answer: PriceAnswer, every_assumption: bool) -> None:
    """Print what has to be asked, noticed, assumed and kept in mind."""
    for question in answer.questions[:MOST_QUESTIONS]:
        _say(question.verdict)
    if len(answer.questions) > MOST_QUESTIONS:
        left = [each.marker for each in answer.questions[MOST_QUESTIONS:]]
        _say(f"Quotes are missing for {_names(left)} too.")
    for finding in answer.findings:
        if finding.severity != "info":
            _say(f"{finding.severity}: {finding.message}. {finding.next_step}.")
    _assumptions(answer, every_assumption)
    for finding in answer.findings.of("info"):
        _say(f"Note: {finding.message}. {finding.next_step}.")
    _say("Prices are as given, net of tax, without inflation. A repeat runs the whole "
         "panel again.")  # fmt: skip
    _say(RESEARCH_USE)


def _say(text: str) -> None:
    console().print(text, markup=False)


def _amount(amount: Decimal | None) -> str:
    return "-" if amount is None else f"{amount:,f}"


def _range(low: Decimal, high: Decimal) -> str:
    return _amount(low) if low == high else f"{low:,f} to {high:,f}"


def _names(names: Sequence[str]) -> str:
    shown = ", ".join(names[:MOST_NAMED])
    left = len(names) - MOST_NAMED
    return f"{shown} and {left} more" if left > 0 else shown


def _count(number: int, name: str) -> str:
    return f"{number:,} {name}{'' if number == 1 else 's'}"


def _say_panel(answer: PriceAnswer, scenario: ScenarioAnswer) -> None:
    head = f"{scenario.name}: " if len(answer.scenarios) > 1 else ""
    _say(
        f"{head}{_count(len(scenario.markers), 'marker')} on {scenario.cost.platform}: "
        f"{_names(scenario.markers)}"
    )


def _costs(answer: PriceAnswer) -> None:
    costs = [scenario.cost for scenario in answer.scenarios]
    names = list(dict.fromkeys(line.name for cost in costs for line in cost.lines))
    names = [name for name in names if any(cost.line(name) for cost in costs)]
    two = len(costs) > 1
    header = ["", *(s.name if two else answer.currency for s in answer.scenarios)]
    if two:
        header.append("saved by B")
    rows = [
        [LINE_WORDS.get(name, name), *(_line(cost, name) for cost in costs)]
        for name in names
    ]
    rows.append(["total", *(_range(c.total, c.total_high) for c in costs)])
    rows.append(
        ["per result",
         *(_range(c.cost_per_result, c.cost_per_result_high) for c in costs)]
    )  # fmt: skip
    rows.append(["one-off", *(_amount(cost.one_off) for cost in costs)])
    rows.append(["running, per year", *(_amount(cost.per_year) for cost in costs)])
    if not two:
        header.append("share")
        for row, name in zip(rows, names, strict=False):
            row.append(_share(costs[0], name))
        for row in rows[len(names) :]:
            row.append("")
    if two:
        saved = dict(answer.saved)
        keys = [*names, "total", "per_result", "one_off", "per_year"]
        for row, key in zip(rows, keys, strict=True):
            row.append(_amount(saved[key]))
    show_table(
        f"{_count(answer.samples, 'result')} over {answer.horizon_months} months"
        + (f", {answer.currency}" if two else ""),
        header,
        rows,
        right=tuple(range(1, len(header))),
    )


def _line(cost: PanelCost, name: str) -> str:
    for line in cost.lines:
        if line.name == name:
            return _range(line.amount, line.amount_high)
    return _amount(Decimal(0))


def _share(cost: PanelCost, name: str) -> str:
    return f"{100 * float(cost.line(name) / cost.total):.0f} %" if cost.total else ""


def _how(answer: PriceAnswer, scenario: ScenarioAnswer) -> None:
    cost = scenario.cost
    head = f"{scenario.name}: " if len(answer.scenarios) > 1 else ""
    parts = []
    if cost.runs:
        fits = ", ".join(f"{n:,}" for n in dict.fromkeys(cost.samples_per_run))
        parts.append(
            f"{_count(cost.runs, 'run')} of {cost.positions_per_run:,} positions, "
            f"{100 * float(cost.fill):.0f} % full; {_count(cost.pools, 'pool')} a "
            f"sample, {fits} samples in a run"
        )
    parts.append(
        f"{cost.samples_run:,} samples run for {float(cost.results):,.1f} results"
    )
    for kit in cost.kits:
        unwanted = f", {len(kit.unwanted)} unwanted" if kit.unwanted else ""
        parts.append(
            f"{_count(kit.units, 'unit')} of kit {kit.kit} for "
            f"{_names(kit.covers)}{unwanted}"
        )
    if cost.kits:
        parts.append(
            "the cheapest choice of kits, proved" if cost.proved else "not proved"
        )
    _say(f"{head}{'; '.join(parts)}.")


def _platforms(answer: PriceAnswer, scenario: ScenarioAnswer) -> None:
    rows = [
        [
            cost.platform,
            _range(cost.total, cost.total_high),
            _range(cost.cost_per_result, cost.cost_per_result_high),
            f"{cost.runs:,}",
            "cheapest" if cost is scenario.cost else "",
        ]
        for cost in scenario.costs
    ]
    rows += [[name, "cannot", "", "", reason] for name, reason in scenario.refusals]
    head = f"{scenario.name}, by platform" if len(answer.scenarios) > 1 else "Platforms"
    show_table(
        head, ["platform", "total", "per result", "runs", ""], rows, right=(1, 2, 3)
    )


def _split(split: SplitCost, scenario: ScenarioAnswer) -> None:
    if len(split.parts) == 1:
        _say(
            f"No split over platforms is cheaper than {split.parts[0].platform} alone"
            + (" (all were priced)." if split.proved else " (not proved).")
        )
        return
    parts = [
        f"{_names(names)} on {cost.platform}"
        for cost, names in zip(split.parts, split.markers, strict=True)
    ]
    _say(
        f"Split over platforms: {'; '.join(parts)}: {_amount(split.total)}, "
        f"{_amount(scenario.cost.total - split.total)} less than on one"
        + (" (all splits were priced)." if split.proved else " (not proved).")
    )


def _drivers(answer: PriceAnswer, scenario: ScenarioAnswer) -> None:
    if len(scenario.drivers) < 2:
        return
    rows = [
        [
            each.marker,
            _amount(each.saving),
            _amount(each.own_one_off),
            _amount(each.own_reagent),
            each.by_kit,
        ]
        for each in scenario.drivers[:MOST_DRIVERS]
    ]
    n, least = len(scenario.drivers), scenario.drivers[-1].saving
    if n > 2 and least == scenario.drivers[0].saving:
        _say(
            f"Leaving out any one of the {n} markers saves the same: {_amount(least)} "
            f"{answer.currency}."
        )
        return
    few = f"; the first {MOST_DRIVERS} of {n}" if n > MOST_DRIVERS else ""
    show_table(
        f"Leaving one marker out saves (savings are no shares of the total){few}",
        ["marker", "saves", "its development", "its reagent", "kit"],
        rows,
        right=(1, 2, 3),
    )


def _stairs(answer: PriceAnswer, scenario: ScenarioAnswer) -> None:
    own = len(scenario.markers)
    stairs = scenario.stairs
    start = max(0, min(own - MOST_STAIRS // 2, len(stairs) - MOST_STAIRS))
    rows = [
        [
            f"{each.size}{' *' if each.size == own else ''}",
            _amount(each.total),
            _amount(each.cost_per_result),
            _amount(each.marginal),
            each.step,
        ]
        for each in stairs[start : start + MOST_STAIRS]
    ]
    show_table(
        "Cost against size, in the order given (* this panel)",
        ["markers", "total", "per result", "the last one adds", "needs more"],
        rows,
        right=(0, 1, 2, 3),
    )
    down = scenario.step_down
    if down is None:
        _say("No smaller panel saves a step.")
    else:
        _say(
            f"Next step down: remove {_count(down.remove, 'marker')} "
            f"({_names(down.markers)}) to save {down.saves}: {_amount(down.saving)} "
            f"{answer.currency}."
        )


def _comparison(answer: PriceAnswer) -> None:
    _say(answer.ranking)
    if answer.break_even is not None:
        _say(_break_even(answer.break_even))
    if answer.change_cost is not None:
        cost = _amount(answer.change_cost)
        if answer.payback is None:
            _say(f"A change that costs {cost} is never paid back: B saves nothing.")
        else:
            months = _count(answer.payback, "month")
            _say(f"A change that costs {cost} has paid for itself after {months}.")


def _break_even(found: BreakEven) -> str:
    if found.first is None:
        return f"B is not cheaper at any number of samples up to {found.largest:,}."
    if found.stays_from == 1:
        return f"B is cheaper at every number of samples up to {found.largest:,}."
    text = f"Break-even: B is cheaper for the first time at {found.first:,} samples"
    if found.crossings:
        changes = [f"{each.samples:,} ({each.cheaper})" for each in found.crossings]
        text += f"; the cheaper one changes at {_names(changes)}"
    if found.stays_from is not None:
        text += (
            f"; from {found.stays_from:,} on B stays cheaper up to {found.largest:,}"
        )
    return f"{text}."


def _variations(answer: PriceAnswer) -> None:
    two = len(answer.scenarios) > 1
    for key in dict.fromkeys(each.key for each in answer.variations):
        rows = [
            [
                *([each.scenario] if two else []),
                each.value,
                each.platform or "none can run it",
                _amount(each.total),
                _amount(each.cost_per_result),
                f"{each.runs:,}",
                f"{100 * float(each.fill):.1f} %",
                f"{each.groups}",
            ]
            for each in answer.variations
            if each.key == key
        ]
        header = [*(["scenario"] if two else []), key, "platform", "total",
                  "per result", "runs", "full", "runs a sample"]  # fmt: skip
        right = tuple(i for i in range(len(header)) if header[i] != "platform")
        show_table(f"Other values of {key}", header, rows, right=right)


def _spares(answer: PriceAnswer, spares: Spares) -> None:
    chance = f"{100 * spares.probability:g} %"
    without = f"{100 * spares.reached_without:.1f} %"
    if not spares.enough:
        _say(
            f"Even with all {_count(len(spares.spares), 'stand-in')} ordered, "
            f"{spares.wanted} assays work with {100 * spares.reached:.1f} %, below "
            f"the {chance} asked for."
        )
    elif not spares.spares:
        _say(f"No spare is needed: {spares.wanted} assays work with {without}.")
    else:
        _say(
            f"Order {spares.order} assays so that {spares.wanted} work with {chance}: "
            f"{_count(len(spares.spares), 'spare')} ({_names(spares.spares)}) raise it "
            f"from {without} to {100 * spares.reached:.1f} %."
        )
    if spares.spend is not None and spares.spend_one_by_one is not None:
        _say(
            f"Development of all at once {_amount(spares.spend)} {answer.currency}; if "
            f"spares are ordered only once they are needed, "
            f"{_amount(spares.spend_one_by_one)} is expected."
        )


def _assumptions(answer: PriceAnswer, every: bool) -> None:
    for scenario in answer.scenarios:
        grouped: dict[str, list[Assumption]] = {}
        for each in scenario.assumptions:
            if not every and (each.source == "file" or _is_nothing(each)):
                continue
            grouped.setdefault(each.source, []).append(each)
        if not grouped:
            continue
        head = f" of {scenario.name}" if len(answer.scenarios) > 1 else ""
        if head and scenario is not answer.scenarios[0] and not every:
            first = set(answer.scenarios[0].assumptions)
            grouped = {
                source: fresh
                for source, kept in grouped.items()
                if (fresh := [each for each in kept if each not in first])
            }
        if grouped:
            _say(f"Assumptions{head}")
        for source, kept in grouped.items():
            _say(f"  {source}: {_said(kept)}")


def _said(kept: Sequence[Assumption]) -> str:
    """Return keys and values; those of a platform behind its name."""
    places: dict[str, list[str]] = {}
    for each in kept:
        place, _dot, key = each.key.rpartition(".")
        places.setdefault(place, []).append(f"{key} {each.value}")
    return "; ".join(
        (f"{place}: " if place else "") + ", ".join(said)
        for place, said in places.items()
    )


def _is_nothing(assumption: Assumption) -> bool:
    """Whether a default adds nothing to the cost: no price, no limit."""
    return assumption.source == "default" and assumption.value in ("0", "none", "")
