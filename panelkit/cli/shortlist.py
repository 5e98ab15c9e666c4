"""``panelkit shortlist``: which markers are picked again and again."""

from pathlib import Path

import click

from panelkit.cli.screen import console, show_json, show_table, watching
from panelkit.records import RESEARCH_USE
from panelkit.workflow import ShortlistRun, run_shortlist, shortlist_content

__all__ = ["command"]

MOST_ROWS = 15


@click.command("shortlist")
@click.argument("study", type=click.Path(path_type=Path))
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    required=True,
    help="Run folder: new, empty, or an earlier attempt at the same study.",
)
@click.option("--threads", type=int, help="Threads.  [all processors]")
@click.option("--quiet", is_flag=True, help="Show no progress and no table.")
@click.option("--json", "as_json", is_flag=True, help="Print the result as JSON.")
def command(
    study: Path, out: Path, threads: int | None, quiet: bool, as_json: bool
) -> None:
    """Shortlist markers of STUDY: no panels, no prices, no accuracy."""
    with watching(quiet or as_json) as listener:
        run = run_shortlist(study, out, threads=threads, listener=listener)
    if as_json:
        show_json(shortlist_content(run))
    elif not quiet:
        _show(run)


def _show(run: ShortlistRun) -> None:
    results = run.results
    table = results.shortlist
    n_rows = min(MOST_ROWS, len(table.feature))
    show_table(
        f"{results.outcome}; {results.n_subjects} people, "
        f"{len(results.features):,} features",
        [
            "feature", "symbol", "frequency", "interval", "sign", "group freq.",
            "difference", "AUC (apparent)", "mark",
        ],
        [_row(run, i) for i in range(n_rows)],
        right=(2, 5, 6, 7),
    )  # fmt: skip
    screen = console()
    if len(table.feature) > n_rows:
        screen.print(
            f"The first {n_rows} of {len(table.feature):,} features that were ever "
            "picked or are candidates.",
            markup=False,
        )
    screen.print()
    for finding in results.findings.of("stop") + results.findings.of("warning"):
        screen.print(
            f"{finding.severity}: {finding.code}: {finding.message}", markup=False
        )
    for sentence in results.sentences():
        screen.print(sentence, markup=False)
    for other in results.selectors:
        named = [str(results.features[j]) for j in other.shortlist[:5]]
        screen.print(
            f"{other.selector}: shortlist {', '.join(named) or 'empty'}; most frequent "
            f"{results.features[other.top_feature]} ({other.top_frequency:.2f}); set "
            f"agreement {other.agreement.stability:.2f}",
            markup=False,
        )
    screen.print(RESEARCH_USE, markup=False)
    screen.print(f"Folder: {run.path}", markup=False)


def _row(run: ShortlistRun, i: int) -> list[str]:
    table = run.results.shortlist
    mark = "candidate only" if table.candidate[i] else ""
    return [
        str(table.feature[i]),
        str(table.symbol[i]),
        f"{table.frequency[i]:.2f}",
        f"{table.frequency_low[i]:.2f}-{table.frequency_high[i]:.2f}",
        str(table.sign[i]),
        f"{table.group_frequency[i]:.2f}",
        f"{table.difference[i]:.3g}",
        f"{table.single_marker_auc[i]:.3f}",
        "shortlist" if table.picked[i] else mark,
    ]
