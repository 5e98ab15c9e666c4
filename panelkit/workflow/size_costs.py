"""What studies of several sizes cost by the prices of a programme."""

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

from panelkit.errors import UsageError
from panelkit.records import SizingAnswer, SizingTable
from panelkit.workflow.price_inputs import (
    PriceSource,
    apply_settings,
    load_priceable,
)

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
        No panel is named, or nothing says what it costs.
    StudyFileError, InputDataError
        A file cannot be used.
    """
    if study is None:
        return answer
    if not markers:
        raise UsageError(
            code="size-not-priced",
            where="--markers",
            what="the people are to be priced and no panel is named",
            accepted="the markers of the panel, parted by commas",
            next_step="Add --markers, or ask without --prices",
        )
    pricer = load_priceable(PriceSource(file=study)).pricer
    people: set[int] = set()
    for table in answer.tables:
        if table.header[0] == "people":
            people |= {round(float(row[0] or 0)) for row in table.rows}
    asked = answer.figures.get("people")
    if isinstance(asked, int | float):
        people.add(round(asked))
    found = {}
    for n in sorted(people):
        one, _ = apply_settings(pricer, [("samples", str(n))])
        costs = one.costs(list(markers))
        if costs:
            best = costs[0]
            found[n] = (str(best.total), str(best.cost_per_result), best.platform)
    currency = pricer.programme.currency
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
