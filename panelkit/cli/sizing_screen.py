"""How an answer about sizes or assays is shown."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from panelkit.cli.screen import console, show_json, show_table
from panelkit.errors import UsageError
from panelkit.records import SizingAnswer, SizingTable
from panelkit.workflow import sizing_content, with_costs, write_sizing

__all__ = ["costed", "numbers", "show_answer", "shown"]

MOST_ROWS = 20


def shown(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add what every question has: JSON, and a folder for files."""
    for option in (
        click.option("--json", "as_json", is_flag=True, help="Print JSON."),
        click.option(
            "--out",
            type=click.Path(path_type=Path),
            metavar="FOLDER",
            help="Write tables (CSV), the picture (SVG) and JSON here.",
        ),
    ):
        command = option(command)
    return command


def costed(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add what prices numbers of people: a study file and the panel's markers."""
    for option in (
        click.option(
            "--markers",
            callback=lambda _c, _p, text: tuple(text.split(",")) if text else (),
            metavar="A,B,...",
            help="With --prices: the panel.",
        ),
        click.option(
            "--prices",
            type=click.Path(path_type=Path),
            metavar="STUDY",
            help="Study file whose programme and price list price the people.",
        ),
    ):
        command = option(command)
    return command


def numbers(
    kind: Callable[[str], Any],
) -> Callable[[click.Context, click.Parameter, str], tuple[Any, ...]]:
    """Return a reader of numbers that commas part."""

    def read(
        _context: click.Context, option: click.Parameter, text: str
    ) -> tuple[Any, ...]:
        try:
            return tuple(kind(part) for part in text.split(","))
        except ValueError:
            raise UsageError(
                code="numbers-unreadable",
                where=option.opts[0],
                what=f"these are no numbers (got {text!r})",
                accepted="numbers parted by commas, such as 100,200",
                next_step="Correct the list",
            ) from None

    return read


def show_answer(
    answer: SizingAnswer,
    as_json: bool,
    out: Path | None,
    prices: Path | None = None,
    markers: tuple[str, ...] = (),
) -> None:
    """Show an answer and write its files where that is asked for."""
    priced = with_costs(answer, prices, markers)
    written = [] if out is None else write_sizing(priced, out)
    if as_json:
        show_json(sizing_content(priced))
        return
    screen = console()
    screen.print(f"{priced.question}\n\n{priced.sentence}\n", markup=False)
    for table in priced.tables:
        _show(table)
    screen.print("What this rests on", style="bold")
    for key, value in priced.inputs.items():
        if value is not None:
            screen.print(f"  {key} = {_cell(value)}", markup=False)
    for words in priced.assumptions:
        screen.print(f"  - {words}", markup=False)
    screen.print("Sources: " + "; ".join(priced.sources), markup=False)
    if written:
        screen.print(f"Written to {out}: {', '.join(written)}.", markup=False)


def _show(table: SizingTable) -> None:
    rows = [[_cell(value) for value in row] for row in table.rows[:MOST_ROWS]]
    texts = {
        place
        for row in table.rows
        for place, value in enumerate(row)
        if isinstance(value, str)
    }
    right = [place for place in range(len(table.header)) if place not in texts]
    names = [name.replace("_", " ") for name in table.header]
    show_table(table.title, names, rows, right)
    if len(table.rows) > MOST_ROWS:
        console().print(
            f"... and {len(table.rows) - MOST_ROWS} more rows: --out FOLDER writes "
            "all.\n"
        )


def _cell(value: object) -> str:
    if value is None:
        return "-"
    if isinstance(value, float):
        return f"{value:,.0f}" if abs(value) >= 1000.0 else f"{value:.4g}"
    return f"{value:,}" if isinstance(value, int) else str(value)
