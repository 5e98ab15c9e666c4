"""Options that say what the columns of a sample sheet of new people are."""

from collections.abc import Callable
from typing import Any

import click

__all__ = ["sheet_options"]


def sheet_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """Return a command with the options of a sample sheet."""
    for option in (
        click.option("--replicate-of", help="Column of technical replicates."),
        click.option("--subject", help="Column of the person."),
        click.option("--negative", help="The other class.  [the panel's]"),
        click.option("--positive", help="Class that scores point to.  [the panel's]"),
        click.option("--outcome", help="Column of the outcome.  [the panel's]"),
    ):
        command = option(command)
    return command
