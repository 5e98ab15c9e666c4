"""``panelkit draft``: a commented study file from the data."""

from pathlib import Path

import click

from panelkit.errors import UsageError
from panelkit.runtime import write_whole
from panelkit.workflow import draft_study

__all__ = ["command"]


@click.command("draft")
@click.argument("expression", type=click.Path(path_type=Path))
@click.argument("samples", type=click.Path(path_type=Path), required=False)
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    help="Study file to write; printed when left out.",
)
def command(expression: Path, samples: Path | None, out: Path | None) -> None:
    """Look at EXPRESSION and SAMPLES and write a commented study file."""
    if out is not None and out.exists():
        raise UsageError(
            code="file-exists",
            where=str(out),
            what="a file of that name is there already",
            accepted="a new file",
            next_step="Name another file, or remove this one",
        )
    folder = None if out is None else out.resolve().parent
    text = draft_study(expression, samples, folder=folder)
    if out is None:
        click.echo(text, nl=False)
        return
    with write_whole(out) as file:
        file.write(text.encode())
    click.echo(
        f"Wrote {out}. Read the lines marked 'Check', then: panelkit check {out}"
    )
