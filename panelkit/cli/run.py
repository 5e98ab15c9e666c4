"""``panelkit run``: the whole job."""

import math
from pathlib import Path

import click

from panelkit.cli.screen import console, show_json, show_table, watching
from panelkit.records import RESEARCH_USE, FrontierRow, RunSummary
from panelkit.workflow import Run, run_content, run_study

__all__ = ["command"]


@click.command("run")
@click.argument("study", type=click.Path(path_type=Path))
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    required=True,
    help="Run folder: new, empty, or an unfinished run of the same study.",
)
@click.option("--threads", type=int, help="Folds at work at a time.  [all processors]")
@click.option("--quiet", is_flag=True, help="Show no progress and no table.")
@click.option("--json", "as_json", is_flag=True, help="Print the result as JSON.")
def command(
    study: Path, out: Path, threads: int | None, quiet: bool, as_json: bool
) -> None:
    """Run the whole job of STUDY and write the run folder."""
    with watching(quiet or as_json) as listener:
        run = run_study(study, out, threads=threads, listener=listener)
    if as_json:
        show_json(run_content(run))
    elif not quiet:
        _show(run)


def _show(run: Run) -> None:
    summary = run.summary
    show_table(
        f"{summary.outcome}; {summary.n_subjects} people, "
        f"{summary.n_features:,} features; accuracy: {summary.metric_words}",
        ["size", "maker", "accuracy", "interval", "slope", *_price(summary)],
        [_row(row, bool(summary.costs)) for row in _worth_showing(summary)],
        right=(0, 2, 4, 5, 6),
    )
    screen = console()
    taken = summary.choice.rules[0].panel
    markers = {row.panel: row.markers for row in summary.frontier.rows}[taken]
    screen.print(f"{taken}: {', '.join(markers)}", markup=False)
    screen.print()
    for finding in summary.findings.of("stop") + summary.findings.of("warning"):
        screen.print(
            f"{finding.severity}: {finding.code}: {finding.message}", markup=False
        )
    screen.print()
    headline = summary.choice.headline
    screen.print(headline.sentence, markup=False)
    if summary.doubt:
        screen.print(summary.doubt)
    screen.print(summary.choice.rules[0].sentence, markup=False)
    for other in summary.comparators[:2]:
        screen.print(other.sentence, markup=False)
    if not summary.shortlist.picked.any():
        screen.print("The shortlist is empty: every marker is a candidate only.")
    for cost in summary.costs[:1]:
        for finding in cost.findings:
            screen.print(f"{finding.severity}: {finding.message}", markup=False)
    screen.print(RESEARCH_USE, markup=False)
    screen.print(f"Report: {run.path / 'report.html'}", markup=False)


_SHORT = {
    "smallest-within-one-se": "primary",
    "smallest-within-one-se-on-curve": "smallest on curve",
    "cheapest-within-one-se-on-curve": "cheapest on curve",
}


def _price(summary: RunSummary) -> list[str]:
    if not summary.costs:
        return ["chosen as"]
    return [f"{summary.costs[0].currency}/result", "platform", "chosen as"]


def _worth_showing(summary: RunSummary) -> list[FrontierRow]:
    """Return the frontier's rows and what was chosen, smallest first."""
    rows = [row for row in summary.frontier.rows if row.on_frontier or row.chosen_by]
    return sorted(rows, key=lambda row: (row.size, row.maker))


def _row(row: FrontierRow, priced: bool) -> list[str]:
    cells = [
        str(row.size),
        row.maker,
        f"{row.metric:.3f}",
        "none"
        if math.isnan(row.metric_low)
        else f"{row.metric_low:.3f}-{row.metric_high:.3f}",
        "none" if math.isnan(row.slope) else f"{row.slope:.2f}",
    ]
    if priced:
        price = "not to be had" if row.cost_per_result is None else row.cost_per_result
        cells += [str(price), row.platform]
    return [
        *cells,
        ", ".join(_SHORT.get(rule, rule) for rule in row.chosen_by.split(";")),
    ]
