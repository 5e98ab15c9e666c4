"""``panelkit score``: new samples by a locked panel."""

from pathlib import Path

import click

from panelkit.cli.screen import console, show_json
from panelkit.workflow import score_table

__all__ = ["command"]


@click.command("score")
@click.argument("panel", type=click.Path(path_type=Path))
@click.argument("table", type=click.Path(path_type=Path))
@click.option("--out", type=click.Path(path_type=Path), required=True)
@click.option("--unit", help="Unit of the values; refused where it is another one.")
@click.option("--json", "as_json", is_flag=True, help="Print the result as JSON.")
def command(
    panel: Path, table: Path, out: Path, unit: str | None, as_json: bool
) -> None:
    """Score the samples of TABLE by the locked PANEL."""
    found = score_table(panel, table, out, unit=unit)
    if as_json:
        show_json(found)
        return
    screen = console()
    screen.print(
        f"{found['samples']} samples scored by {found['panel']}; {found['flagged']} "
        f"with flags, {found['without_score']} without a score.",
        markup=False,
    )
    for caution in found["cautions"]:
        screen.print(caution, markup=False)
    screen.print(f"Written: {out}, {out}.json", markup=False)
