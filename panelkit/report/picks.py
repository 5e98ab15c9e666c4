"""What the report picks out of a summary: the chosen row, marks, orders, currency."""

from panelkit.records import CostLine, FrontierRow, PanelCost, RuleChoice, RunSummary

__all__ = [
    "MARKS",
    "SLOPE_FLOOR",
    "chosen_cost",
    "chosen_row",
    "currency",
    "is_priced",
    "mark_of",
    "ordered_rules",
    "primary_rule",
    "row_named",
    "shared_lines",
]

MARKS = {True: "error-controlled", False: "candidate only"}
SLOPE_FLOOR = 0.5  # below it predicted chances mislead: DESIGN, honest accuracy


def ordered_rules(summary: RunSummary) -> list[RuleChoice]:
    """Return the rules, the primary first, the others in their order."""
    return sorted(summary.choice.rules, key=lambda rule: not rule.primary)


def primary_rule(summary: RunSummary) -> RuleChoice | None:
    """Return the primary rule, else the first; None where there is no rule."""
    rules = ordered_rules(summary)
    return rules[0] if rules else None


def row_named(summary: RunSummary, panel: str) -> FrontierRow | None:
    """Return the row of a panel; None where no row has the name."""
    rows = (row for row in summary.frontier.rows if row.panel == panel)
    return next(rows, None)


def chosen_row(summary: RunSummary) -> FrontierRow | None:
    """Return the row that the primary rule chose; None where it chose none."""
    rule = primary_rule(summary)
    return None if rule is None else row_named(summary, rule.panel)


def chosen_cost(summary: RunSummary) -> PanelCost | None:
    """Return the cost of the chosen panel that its row of the frontier shows."""
    row = chosen_row(summary)
    if row is None or row.cost_per_result is None:
        return None
    shown = (row.platform, row.cost_per_result)
    costs = (
        cost for cost in summary.costs if (cost.platform, cost.cost_per_result) == shown
    )
    return next(costs, None)


def mark_of(summary: RunSummary) -> dict[str, bool]:
    """Return which features are in the shortlist, by id."""
    table = summary.shortlist
    return {
        str(name): bool(picked)
        for name, picked in zip(table.feature, table.picked, strict=True)
    }


def is_priced(summary: RunSummary) -> bool:
    """Return whether any row of the frontier has a cost per result."""
    return any(row.cost_per_result is not None for row in summary.frontier.rows)


def currency(summary: RunSummary) -> str:
    """Return the code of the currency, or words where no cost carries it."""
    return summary.costs[0].currency if summary.costs else "programme's currency"


def shared_lines(
    costs: tuple[PanelCost, ...],
) -> list[tuple[str, list[CostLine | None]]]:
    """Return the cost lines side by side.

    Parameters
    ----------
    costs : tuple of PanelCost
        One a platform.

    Returns
    -------
    list of (str, list of CostLine or None)
        Every line's name, in order of first appearance, with its line on each
        platform; None where a platform has no such line.
    """
    tables = [{line.name: line for line in cost.lines} for cost in costs]
    names = dict.fromkeys(name for table in tables for name in table)
    return [(name, [table.get(name) for table in tables]) for name in names]
