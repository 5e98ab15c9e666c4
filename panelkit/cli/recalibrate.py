"""``panelkit recalibrate``: chances fitted to new people."""

from pathlib import Path

import click

from panelkit.cli.screen import console, show_json
from panelkit.cli.sheet_options import sheet_options
from panelkit.workflow import SheetColumns, recalibrate_panel

__all__ = ["command"]


@click.command("recalibrate")
@click.argument("panel", type=click.Path(path_type=Path))
@click.argument("table", type=click.Path(path_type=Path))
@click.argument("samples", type=click.Path(path_type=Path))
@sheet_options
@click.option("--slope", is_flag=True, help="Fit intercept and slope.  [intercept]")
@click.option("--out", type=click.Path(path_type=Path), required=True)
@click.option("--json", "as_json", is_flag=True, help="Print the result as JSON.")
def command(  # noqa: PLR0913 - one argument an option
    panel: Path,
    table: Path,
    samples: Path,
    outcome: str | None,
    positive: str | None,
    negative: str | None,
    subject: str | None,
    replicate_of: str | None,
    slope: bool,
    out: Path,
    as_json: bool,
) -> None:
    """Fit the chances of PANEL to the people of TABLE and SAMPLES."""
    found = recalibrate_panel(
        panel,
        table,
        samples,
        out,
        changed="intercept and slope" if slope else "intercept",
        columns=SheetColumns(outcome, positive, negative, subject, replicate_of),
    )
    parent = found.parent
    sentence = "" if parent is None else parent.sentence
    if as_json:
        show_json(
            {
                "file": str(out),
                "content_sha256": found.content_sha256,
                "parent_sha256": "" if parent is None else parent.sha256,
                "intercept": 0.0 if parent is None else parent.intercept,
                "slope": 1.0 if parent is None else parent.slope,
                "sentence": sentence,
                "cautions": list(found.cautions),
            }
        )
        return
    screen = console()
    screen.print(sentence, markup=False)
    for caution in found.cautions:
        screen.print(caution, markup=False)
    screen.print(f"Written: {out}", markup=False)
