"""``panelkit validate``: a locked panel on new people."""

import math
from pathlib import Path

import click

from panelkit.cli.screen import console, show_json, show_table
from panelkit.cli.sheet_options import sheet_options
from panelkit.records import Validation
from panelkit.workflow import SheetColumns, validate_panel, validation_content

__all__ = ["command"]


@click.command("validate")
@click.argument("panel", type=click.Path(path_type=Path))
@click.argument("table", type=click.Path(path_type=Path), required=False)
@click.argument("samples", type=click.Path(path_type=Path), required=False)
@sheet_options
@click.option("--subgroup", "subgroups", multiple=True, help="Column; may be repeated.")
@click.option("--plan", type=click.Path(path_type=Path), help="Written beforehand.")
@click.option("--prevalence", type=float, help="For predictive values.")
@click.option("--against", type=click.Path(path_type=Path), help="Another panel file.")
@click.option("--study", type=click.Path(path_type=Path), help="That set rows aside.")
@click.option("--open-set-aside", metavar="REASON", help="Open them; recorded before.")
@click.option("--out", type=click.Path(path_type=Path), required=True, help="A folder.")
@click.option("--json", "as_json", is_flag=True, help="Print the result as JSON.")
def command(  # noqa: PLR0913 - one argument an option
    panel: Path,
    table: Path | None,
    samples: Path | None,
    outcome: str | None,
    positive: str | None,
    negative: str | None,
    subject: str | None,
    replicate_of: str | None,
    subgroups: tuple[str, ...],
    plan: Path | None,
    prevalence: float | None,
    against: Path | None,
    study: Path | None,
    open_set_aside: str | None,
    out: Path,
    as_json: bool,
) -> None:
    """Judge the locked PANEL on the people of TABLE and SAMPLES."""
    found = validate_panel(
        panel,
        table,
        samples,
        out=out,
        columns=SheetColumns(
            outcome, positive, negative, subject, replicate_of, subgroups
        ),
        plan=plan,
        prevalence=prevalence,
        against=against,
        study=study,
        open_set_aside=open_set_aside,
    )
    if as_json:
        show_json(validation_content(found))
    else:
        _show(found, out)


def _number(value: float) -> str:
    return "" if math.isnan(value) else f"{value:.3f}"


def _show(found: Validation, out: Path) -> None:
    show_table(
        f"{found.panel}: {found.subjects} people, {found.cases} cases, "
        f"{found.controls} controls",
        ["measure", "of", "value", "low", "high", "samples", "note"],
        [
            [
                each.measure,
                each.of,
                _number(each.value),
                _number(each.low),
                _number(each.high),
                str(each.samples),
                each.note,
            ]
            for each in found.figures
        ],
        right=(2, 3, 4, 5),
    )
    show_table(
        "markers against the training rows, outcome held equal",
        ["marker", "shift", "low", "high", "spread ratio", "outside range"],
        [
            [
                each.feature,
                _number(each.shift),
                _number(each.shift_low),
                _number(each.shift_high),
                _number(each.spread_ratio),
                _number(each.outside_share),
            ]
            for each in found.shifts
        ],
        right=(1, 2, 3, 4, 5),
    )
    screen = console()
    for note in found.notes:
        screen.print(note, markup=False)
    screen.print(found.sentence, markup=False)
    screen.print(found.research_use, markup=False)
    screen.print(f"Written: {out}", markup=False)
