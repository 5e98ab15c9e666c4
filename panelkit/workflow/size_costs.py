"""What studies of several sizes cost by the prices of a programme."""

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

from panelkit.config import read_study
from panelkit.costing import PanelPricer
from panelkit.errors import UsageError
from panelkit.ingest import read_price_list
from panelkit.records import SizingAnswer, SizingTable

__all__ = ["with_costs"]


def with_costs(
    answer: SizingAnswer, study: Path | None, markers: Sequence[str]
) -> SizingAnswer:
    """Return an answer whose numbers of people are priced.

    Parameters
    ----------
    answer : SizingAnswer
        With a table ``range`` that has a column ``people``.
    study : Path or None
        Study file with [programme], platforms and [panels] prices; None leaves the
        answer as it is.
    markers : sequence of str
        The panel.

    Returns
    -------
    SizingAnswer
        With ``cost_total``, ``cost_per_result`` and ``platform`` in that table, for the
        cheapest platform.

    Raises
    ------
    UsageError
        Nothing says what is measured, or what it costs.
    StudyFileError, InputDataError
        A file cannot be used.
    """
    if study is None:
        return answer
    plan = read_study(study)
    if plan.programme is None or plan.panels.prices is None or not markers:
        raise UsageError(
            code="size-not-priced",
            where="--prices" if markers else "--markers",
            what="nothing says what the assays cost"
            if markers
            else "the study is to be priced and no panel is named",
            accepted="a study file with [programme], platforms and [panels] prices, "
            "and "
            "the markers",
            next_step="Add them, or ask without prices",
        )
    prices = read_price_list(plan.file(plan.panels.prices))
    people: set[int] = set()
    for table in answer.tables:
        if table.header[0] == "people":
            people |= {round(float(row[0] or 0)) for row in table.rows}
    asked = answer.figures.get("people")
    if isinstance(asked, int | float):
        people.add(round(asked))
    found = {}
    for n in sorted(people):
        programme = plan.programme.model_copy(update={"samples": n})
        costs = PanelPricer(programme, plan.platforms, prices).costs(list(markers))
        if costs:
            best = costs[0]
            found[n] = (str(best.total), str(best.cost_per_result), best.platform)
    currency = plan.programme.currency
    tables = tuple(
        _priced(table, found, currency) if table.header[0] == "people" else table
        for table in answer.tables
    )
    figures = dict(answer.figures)
    sentence = answer.sentence
    if isinstance(asked, int | float) and round(asked) in found:
        total, _, platform = found[round(asked)]
        figures |= {"cost_total": total, "currency": currency, "platform": platform}
        sentence += f" Assays for them cost {total} {currency} on {platform}."
    return replace(
        answer,
        sentence=sentence,
        figures=figures,
        tables=tables,
        inputs={**answer.inputs, "prices": study.name, "markers": len(markers)},
        assumptions=(
            *answer.assumptions,
            f"Costs are those of {study.name}: one result for each person, on the "
            "cheapest platform, with its repeats, controls and the programme's cost of "
            "collecting a sample; nothing else of a study (staff, ethics, visits) is "
            "in "
            "them.",
        ),
    )


def _priced(
    table: SizingTable, found: dict[int, tuple[str, str, str]], currency: str
) -> SizingTable:
    nothing = (None, None, None)
    return replace(
        table,
        header=(
            *table.header,
            f"cost_total_{currency}",
            f"cost_per_result_{currency}",
            "platform",
        ),
        rows=tuple(
            (*row, *found.get(round(float(row[0] or 0)), nothing)) for row in table.rows
        ),
    )
