"""``panelkit size plates``: which sample goes into which well."""

from pathlib import Path

import click

from panelkit.cli.sizing_screen import show_answer, shown
from panelkit.config import SEED, SIZING
from panelkit.workflow import size_plates

__all__ = ["plates"]


@click.command("plates")
@click.argument("sheet", type=click.Path(path_type=Path))
@click.option(
    "--balance",
    required=True,
    metavar="COLUMN,...",
    help="Columns to spread evenly: outcome, site, ...",
)
@click.option("--subject", metavar="COLUMN", help="Whose samples stay together.")
@click.option("--wells", type=int, default=SIZING.wells, show_default=True)
@click.option(
    "--controls",
    type=int,
    default=SIZING.controls,
    show_default=True,
    help="Wells of a plate kept free.",
)
@click.option("--seed", type=int, default=SEED, show_default=True)
@shown
def plates(
    sheet: Path,
    balance: str,
    subject: str | None,
    wells: int,
    controls: int,
    seed: int,
    as_json: bool,
    out: Path | None,
) -> None:
    """Deal the samples of SHEET to plates at random, balanced, with a check."""
    answer = size_plates(
        sheet,
        [name.strip() for name in balance.split(",")],
        subject=subject,
        wells=wells,
        controls=controls,
        seed=seed,
    )
    show_answer(answer, as_json, out)
