"""An answer of `panelkit price` as plain values, for programs."""

from decimal import Decimal
from typing import Any

from panelkit.records import (
    RESEARCH_USE,
    BreakEven,
    PanelCost,
    PriceAnswer,
    ScenarioAnswer,
    SplitCost,
)

__all__ = ["price_content"]


def price_content(answer: PriceAnswer) -> dict[str, Any]:
    """Return an answer as what JSON can hold; amounts are text, so none is rounded.

    Parameters
    ----------
    answer : PriceAnswer
        Priced scenarios.

    Returns
    -------
    dict
        Keys in a fixed order.
    """
    content: dict[str, Any] = {
        "currency": answer.currency,
        "samples": answer.samples,
        "horizon_months": answer.horizon_months,
        "scenarios": {s.name: _scenario(s) for s in answer.scenarios},
    }
    if answer.saved:
        content["saved"] = {name: str(amount) for name, amount in answer.saved}
        content["ranking"] = answer.ranking
    if answer.break_even is not None:
        content["break_even"] = _break_even(answer.break_even)
    if answer.change_cost is not None:
        content["payback"] = {
            "change_cost": str(answer.change_cost),
            "months": answer.payback,
        }
    content["missing_quotes"] = [
        {
            "marker": each.marker,
            "platform": each.platform,
            "break_even_price": _text(each.break_even),
            "verdict": each.verdict,
        }
        for each in answer.questions
    ]
    if answer.variations:
        content["variations"] = [
            {
                "scenario": each.scenario,
                "key": each.key,
                "value": each.value,
                "platform": each.platform,
                "total": _text(each.total),
                "cost_per_result": _text(each.cost_per_result),
                "runs": each.runs,
                "fill": round(float(each.fill), 4),
                "groups": each.groups,
            }
            for each in answer.variations
        ]
    if answer.spares is not None:
        spares = answer.spares
        content["spares"] = {
            "wanted": spares.wanted,
            "probability": spares.probability,
            "order": spares.order,
            "spares": list(spares.spares),
            "reached": round(spares.reached, 6),
            "reached_without": round(spares.reached_without, 6),
            "spend": _text(spares.spend),
            "spend_one_by_one": _text(spares.spend_one_by_one),
            "enough": spares.enough,
            "proved": spares.proved,
        }
    content["findings"] = [
        {
            "code": each.code,
            "severity": each.severity,
            "where": each.where,
            "message": each.message,
            "next_step": each.next_step,
        }
        for each in answer.findings
    ]
    content["research_use"] = RESEARCH_USE
    return content


def _text(amount: Decimal | None) -> str | None:
    return None if amount is None else f"{amount:f}"


def _scenario(scenario: ScenarioAnswer) -> dict[str, Any]:
    down = scenario.step_down
    return {
        "markers": list(scenario.markers),
        "cheapest": scenario.cost.platform,
        "platforms": {cost.platform: _cost(cost) for cost in scenario.costs},
        "refused": dict(scenario.refusals),
        "split": None if scenario.split is None else _split(scenario.split),
        "step_down": None
        if down is None
        else {
            "remove": down.remove,
            "markers": list(down.markers),
            "saves": down.saves,
            "saving": str(down.saving),
        },
        "stairs": [
            {
                "size": each.size,
                "marker": each.marker,
                "total": _text(each.total),
                "cost_per_result": _text(each.cost_per_result),
                "marginal": _text(each.marginal),
                "step": each.step,
            }
            for each in scenario.stairs
        ],
        "drivers": [
            {
                "marker": each.marker,
                "saving": _text(each.saving),
                "own_one_off": _text(each.own_one_off),
                "own_reagent": _text(each.own_reagent),
                "by_kit": each.by_kit,
            }
            for each in scenario.drivers
        ],
        "assumptions": [
            {"key": each.key, "value": each.value, "source": each.source}
            for each in scenario.assumptions
        ],
    }


def _cost(cost: PanelCost) -> dict[str, Any]:
    return {
        "lines": {line.name: str(line.amount) for line in cost.lines},
        "total": str(cost.total),
        "total_high": str(cost.total_high),
        "cost_per_result": str(cost.cost_per_result),
        "cost_per_result_high": str(cost.cost_per_result_high),
        "one_off": str(cost.one_off),
        "recurring": str(cost.recurring),
        "per_year": str(cost.per_year),
        "samples_run": cost.samples_run,
        "results": str(cost.results),
        "pools": cost.pools,
        "groups": list(cost.groups),
        "samples_per_run": list(cost.samples_per_run),
        "runs": cost.runs,
        "fill": round(float(cost.fill), 4),
        "filled_positions": cost.filled_positions,
        "control_positions": cost.control_positions,
        "preparations": cost.preparations,
        "assays": list(cost.assays),
        "kits": [
            {
                "kit": kit.kit,
                "units": kit.units,
                "once": str(kit.once),
                "cost": str(kit.cost),
                "covers": list(kit.covers),
                "unwanted": list(kit.unwanted),
            }
            for kit in cost.kits
        ],
        "proved": cost.proved,
        "bound": _text(cost.bound),
        "missing_quotes": list(cost.missing_quotes),
    }


def _split(split: SplitCost) -> dict[str, Any]:
    return {
        "parts": {
            cost.platform: {"markers": list(names), "total": str(cost.total)}
            for cost, names in zip(split.parts, split.markers, strict=True)
        },
        "total": str(split.total),
        "total_high": str(split.total_high),
        "cost_per_result": str(split.cost_per_result),
        "proved": split.proved,
    }


def _break_even(found: BreakEven) -> dict[str, Any]:
    return {
        "first": found.first,
        "stays_from": found.stays_from,
        "largest": found.largest,
        "crossings": [
            {
                "samples": each.samples,
                "cheaper": each.cheaper,
                "difference": str(each.difference),
            }
            for each in found.crossings
        ],
    }
