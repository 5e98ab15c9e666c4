"""The tables of a run folder."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import astuple, fields
from decimal import Decimal
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.costing import HonestAccuracy, PanelPricer, Primary, Task
from panelkit.ingest import replicate_agreement
from panelkit.records import (
    Choice,
    Cohort,
    Comparator,
    Dropped,
    Finding,
    Findings,
    Flow,
    FoldPlan,
    Frontier,
    FrontierRow,
    OutOfFold,
    RunSummary,
    ShortlistTable,
)
from panelkit.runtime import RunFolder

__all__ = [
    "choice_content",
    "frontier_content",
    "plain",
    "write_accuracy",
    "write_data_tables",
    "write_replicates",
    "write_results",
    "write_shortlist",
]


def _names(kind: type[Any]) -> list[str]:
    return [field.name for field in fields(kind)]


def write_data_tables(
    folder: RunFolder,
    findings: Findings,
    dropped: list[Dropped],
    flow: tuple[Flow, ...],
) -> None:
    """Write ``findings.csv``, ``dropped.csv`` and ``flow.csv``.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    folder.table("findings.csv", _names(Finding), [astuple(row) for row in findings])
    folder.table("dropped.csv", _names(Dropped), [astuple(row) for row in dropped])
    folder.table("flow.csv", _names(Flow), [astuple(row) for row in flow])


def write_replicates(folder: RunFolder, cohort: Cohort) -> None:
    """Write ``replicates.csv`` where samples were measured more than once.

    Raises
    ------
    RunFolderError
        The file cannot be written.
    """
    agreement = replicate_agreement(cohort)
    if agreement is not None:
        columns = agreement.columns
        folder.table(
            "replicates.csv", list(columns), zip(*columns.values(), strict=True)
        )


def write_accuracy(
    folder: RunFolder,
    cohort: Cohort,
    folds: FoldPlan,
    accuracy: HonestAccuracy,
    primary: Primary,
    task: Task,
    pricer: PanelPricer | None,
) -> None:
    """Write ``folds.csv``, ``predictions.csv`` and ``fold_panels.csv``.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    samples = cohort.samples
    repeats = range(folds.n_repeats)
    folder.table(
        "folds.csv",
        ["sample", "subject", "weight", "repeat", "fold"],
        (
            (
                samples[i],
                cohort.design.subject_ids[cohort.design.subject[i]],
                cohort.design.weights[i],
                r,
                f,
            )
            for r in repeats
            for i, f in enumerate(folds.test_fold[r])
        ),
    )
    columns, classes = task.columns(), getattr(task, "names", ())
    everything = (*accuracy.panels, primary.predictions, *accuracy.others.values())
    folder.table(
        "predictions.csv",
        [
            "sample",
            "repeat",
            "fold",
            "maker",
            "size",
            *(["class"] if classes else []),
            "score",
            *columns,
        ],
        _prediction_rows(everything, samples, folds, task, columns, classes),
    )
    folder.table(
        "fold_panels.csv",
        [
            "repeat",
            "fold",
            "maker",
            "size",
            "markers",
            "ridge_penalty",
            "platform",
            "cost_total",
            "chosen_by_primary",
        ],
        _fold_panels(cohort, folds, accuracy, primary, pricer),
    )


def _prediction_rows(
    everything: Sequence[OutOfFold],
    samples: NDArray[np.object_],
    folds: FoldPlan,
    task: Task,
    columns: Mapping[str, NDArray[Any]],
    classes: Sequence[str],
) -> Iterator[tuple[Any, ...]]:
    """Yield one row a prediction; one a class where there are several."""
    own = list(zip(*columns.values(), strict=True))
    for each in everything:
        scores = task.scores(each.predicted)
        for r in range(folds.n_repeats):
            for i, fold in enumerate(folds.test_fold[r]):
                lead = (samples[i], r, fold, each.maker, each.size)
                if not classes:
                    yield (*lead, scores[r, i], *own[i])
                for k, name in enumerate(classes):
                    yield (*lead, name, scores[r, k, i], *own[i])


def _fold_panels(
    cohort: Cohort,
    folds: FoldPlan,
    accuracy: HonestAccuracy,
    primary: Primary,
    pricer: PanelPricer | None,
) -> list[tuple[Any, ...]]:
    makers = list(dict.fromkeys(panels.maker for panels in accuracy.members))
    rows = []
    for panels in accuracy.members:
        for repeat, fold in np.ndindex(folds.n_repeats, folds.n_folds):
            members = panels.members[repeat, fold]
            markers = [str(cohort.features[j]) for j in members if j >= 0]
            chosen = (
                primary.chosen.size[repeat, fold] == panels.size
                and makers[primary.chosen.maker[repeat, fold]] == panels.maker
            )
            costs = pricer.costs(markers) if pricer is not None and chosen else ()
            rows.append(
                (
                    repeat,
                    fold,
                    panels.maker,
                    panels.size,
                    ";".join(markers),
                    panels.penalty[repeat, fold],
                    costs[0].platform if costs else None,
                    costs[0].total if costs else None,
                    bool(chosen),
                )
            )
    return rows


def write_results(folder: RunFolder, summary: RunSummary) -> None:
    """Write ``shortlist.csv``, ``frontier.csv``, ``comparators.csv``, ``choice.json``.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    write_shortlist(folder, summary.shortlist)
    _write_frontier(folder, summary.frontier)
    folder.table(
        "comparators.csv",
        _names(Comparator),
        [[getattr(row, n) for n in _names(Comparator)] for row in summary.comparators],
    )
    if summary.costs:
        folder.table(
            "costs.csv",
            ["platform", "line", "amount", "amount_high", "currency"],
            [
                (cost.platform, line.name, line.amount, line.amount_high, cost.currency)
                for cost in summary.costs
                for line in cost.lines
            ],
        )
    folder.json("choice.json", choice_content(summary.choice))


def write_shortlist(folder: RunFolder, table: ShortlistTable) -> None:
    """Write ``shortlist.csv``.

    Raises
    ------
    RunFolderError
        The file cannot be written.
    """
    names = _names(ShortlistTable)
    columns = [getattr(table, name) for name in names]
    folder.table("shortlist.csv", names, zip(*columns, strict=True))


def _write_frontier(folder: RunFolder, frontier: Frontier) -> None:
    names = _names(FrontierRow)
    folder.table(
        "frontier.csv",
        names,
        [
            [
                ";".join(row.markers) if name == "markers" else getattr(row, name)
                for name in names
            ]
            for row in frontier.rows
        ],
    )


def plain(value: object) -> object:
    """Return a value as JSON can carry it: no NaN, money as text."""
    if isinstance(value, float) and np.isnan(value):
        return None
    return str(value) if isinstance(value, Decimal) else value


def frontier_content(frontier: Frontier) -> list[dict[str, Any]]:
    """Return the frontier as plain values, a mapping a row."""
    names = _names(FrontierRow)
    return [
        {name: plain(getattr(row, name)) for name in names} for row in frontier.rows
    ]


def choice_content(choice: Choice) -> dict[str, Any]:
    """Return ``choice.json``: the headline, then every rule's choice."""
    headline = {
        n: plain(getattr(choice.headline, n)) for n in _names(type(choice.headline))
    }
    rules = []
    for rule in choice.rules:
        content = {name: plain(getattr(rule, name)) for name in _names(type(rule))}
        content["figures"] = {k: plain(v) for k, v in rule.figures.items()}
        rules.append(content)
    return {"headline": headline, "rules": rules}
