"""What the commands show: tables, progress, findings. The only place that prints."""

import json
import sys
import time
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import Any

import click
from rich import box
from rich.console import Console
from rich.markup import escape
from rich.progress import (
    BarColumn,
    MofNCompleteColumn,
    Progress,
    TaskID,
    TextColumn,
    TimeElapsedColumn,
    TimeRemainingColumn,
)
from rich.table import Table

from panelkit.records import Findings
from panelkit.runtime import Listener, silent
from panelkit.runtime import Progress as Event

__all__ = ["console", "show_findings", "show_json", "show_table", "watching"]

WIDE = 200  # columns where there is no terminal to fit into
_STYLES = {"stop": "bold reverse", "warning": "bold", "info": "dim"}


def console() -> Console:
    """Return the console of standard output, without colour off the terminal."""
    if sys.stdout.isatty():
        return Console(highlight=False)
    return Console(highlight=False, soft_wrap=True, width=WIDE)


def show_json(content: Mapping[str, Any]) -> None:
    """Print one JSON document."""
    click.echo(json.dumps(content, indent=2, sort_keys=True, ensure_ascii=False))


def show_table(
    title: str,
    header: Sequence[str],
    rows: Sequence[Sequence[str]],
    right: Sequence[int] = (),
) -> None:
    """Print a table.

    Parameters
    ----------
    title : str
        Shown above.
    header : sequence of str
        Column names.
    rows : sequence of sequence of str
        Cells; text of the data is shown as it is, never as markup.
    right : sequence of int
        Columns to be aligned to the right.
    """
    table = Table(
        title=title,
        box=box.SIMPLE_HEAD,
        title_justify="left",
        title_style="bold",
        padding=(0, 1),
        pad_edge=False,
    )
    for k, name in enumerate(header):
        table.add_column(name, justify="right" if k in right else "left", no_wrap=True)
    for row in rows:
        table.add_row(*(escape(cell) for cell in row))
    console().print(table)


def show_findings(findings: Findings) -> None:
    """Print findings, what stops first."""
    screen = console()
    for severity in ("stop", "warning", "info"):
        for item in findings:
            if item.severity == severity:
                screen.print(
                    f"[{_STYLES[severity]}]{severity:>7}[/]  {escape(item.code)}  "
                    f"({escape(item.where)})\n         {escape(item.message)}\n"
                    f"         Next: {escape(item.next_step)}"
                )


@contextmanager
def watching(quiet: bool) -> Iterator[Listener]:
    """Show progress with the time left while work goes on; quiet off the terminal.

    Parameters
    ----------
    quiet : bool
        Show nothing.

    Yields
    ------
    callable
        A listener for the work.
    """
    if quiet or not sys.stderr.isatty():
        yield silent if quiet else _say_stages()
        return
    bar = Progress(
        TextColumn("{task.description:<20}"),
        BarColumn(bar_width=30),
        MofNCompleteColumn(),
        TimeElapsedColumn(),
        TextColumn("left"),
        TimeRemainingColumn(),
        console=Console(stderr=True),
    )
    tasks: dict[str, TaskID] = {}
    with bar:

        def listen(event: Event) -> None:
            if event.stage not in tasks:
                tasks[event.stage] = bar.add_task(event.stage, total=event.total)
            bar.update(tasks[event.stage], completed=event.done, total=event.total)

        yield listen


def _say_stages() -> Listener:
    """Return a listener that writes one line when a stage is over."""
    started: dict[str, float] = {}

    def listen(event: Event) -> None:
        started.setdefault(event.stage, time.monotonic())
        if event.done == event.total:
            seconds = time.monotonic() - started[event.stage]
            click.echo(f"{event.stage}: done ({seconds:.1f} s)", err=True)

    return listen
