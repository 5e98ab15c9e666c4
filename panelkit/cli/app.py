"""The command line: which command, and what happens to errors.

This is the only place that catches `PanelkitError`. Commands are loaded when they
are called, so that ``panelkit --help`` starts at once.
"""

import importlib
import sys
from typing import Final

import click

from panelkit.errors import Interrupted, PanelkitError

__all__ = ["main"]

COMMANDS: Final = {
    "draft": "Write a commented study file by looking at the data.",
    "check": "Read the data of a study and say what was noticed.",
    "shortlist": "Say which markers are picked again and again; no panels.",
    "price": "Price marker lists on platforms; needs no expression data.",
    "run": "Run the whole job: priced panels with honest accuracy.",
    "lock": "Lock a panel of a run, with its cut-offs, into a panel file.",
    "score": "Score new samples by a locked panel.",
    "validate": "Judge a locked panel on people who did not teach it.",
    "recalibrate": "Fit a locked panel's chances to new people.",
    "size": "How large the next cohort has to be; samples to plates.",
    "bridge": "What the assay has to reach; joining two platforms.",
}


class _LazyGroup(click.Group):
    """A group whose commands are modules of this package."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the commands in the order of the work."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Load a command."""
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"panelkit.cli.{cmd_name}")
        command: click.Command = module.command
        return command

    def format_commands(
        self, ctx: click.Context, formatter: click.HelpFormatter
    ) -> None:
        """List commands without loading them."""
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


@click.group(cls=_LazyGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="panelkit", message="panelkit %(version)s")
def panelkit() -> None:
    """Find small, affordable biomarker panels in wide omics data.

    Exit codes: 0 done; 1 a bug of ours; 2 usage or study file; 3 input data (also a
    `check` that finds a `stop`); 4 fit; 5 no panel meets the demand; 6 panel file;
    7 run folder or resources; 130 interrupted.

    For research and planning only.
    """


def main(arguments: list[str] | None = None) -> None:
    """Run the command line and leave with its exit code.

    Parameters
    ----------
    arguments : list of str, optional
        None reads the process's own.
    """
    try:
        code = panelkit.main(arguments, prog_name="panelkit", standalone_mode=False)
    except PanelkitError as error:
        click.echo(f"{type(error).__name__} ({error.code}): {error}", err=True)
        sys.exit(error.exit_code)
    except click.ClickException as error:
        error.show()
        sys.exit(2)
    except (click.Abort, KeyboardInterrupt):
        click.echo(
            "Interrupted. Finished folds are kept: run the same command to go on.",
            err=True,
        )
        sys.exit(Interrupted.exit_code)
    sys.exit(code if isinstance(code, int) else 0)
