"""``panelkit size``: how large the next cohort has to be."""

import importlib
from typing import Final

import click

__all__ = ["command"]

QUESTIONS: Final = {
    "accuracy": "size_measures",
    "area": "size_measures",
    "develop": "size_models",
    "learning": "size_search",
    "validate": "size_models",
    "compare": "size_models",
    "detect": "size_search",
    "plates": "size_plates",
}


class _Questions(click.Group):
    """A group whose questions are loaded when they are asked."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the questions in the order of the work."""
        return list(QUESTIONS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Load a question."""
        if cmd_name not in QUESTIONS:
            return None
        module = importlib.import_module(f"panelkit.cli.{QUESTIONS[cmd_name]}")
        found: click.Command = getattr(module, cmd_name)
        return found


@click.group("size", cls=_Questions)
def command() -> None:
    """Say how large the next cohort has to be; every assumption is printed.

    \b
    For example:
      panelkit size accuracy --sensitivity 0.9 --specificity 0.85 --half-width 0.1 --prevalence 0.2
      panelkit size validate --prevalence 0.2 --area 0.8
      panelkit size plates samples.csv --balance outcome,site --subject person
    """  # noqa: D301, E501 - click reads this sign as: keep the lines
