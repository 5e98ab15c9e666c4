"""``panelkit bridge``: what the assay has to reach, and joining two platforms."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from panelkit.cli.sizing_screen import show_answer, shown
from panelkit.config import SEED, SIZING
from panelkit.workflow import (
    PanelSource,
    bridge_choice,
    bridge_limits,
    bridge_loss,
    bridge_replicates,
    bridge_samples,
)

__all__ = ["command"]

FOLDER = click.Path(path_type=Path)


def _panel(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add the ways to state a panel."""
    for decorate in (
        click.option("--correlation", type=float, default=0.0, show_default=True,
                     help="Of any two markers within a class."),
        click.option("--sd", type=float, help="With --size: SD of a marker, log2."),
        click.option("--size", type=int, help="So many markers alike."),
        click.option("--area", type=float, help="Of the panel.  [that of RUN]"),
        click.option("--marker", "markers", multiple=True,
                     metavar="NAME=DIFFERENCE:SD[:WEIGHT]", help="Log2 scale."),
        click.option("--panel", help="Of RUN.  [the chosen one]"),
        click.argument("run", type=FOLDER, required=False),
    ):  # fmt: skip
        command = decorate(command)
    return command


def _source(options: dict[str, Any]) -> PanelSource:
    names = ("run", "panel", "markers", "area", "size", "sd", "correlation")
    return PanelSource(**{name: options.pop(name) for name in names})


_LOSS = click.option("--loss", type=float, required=True, help="Of area, accepted.")
_CV = click.option("--cv", type=float, required=True, help="Added, within plates (%).")
_BETWEEN = click.option(
    "--between", type=float, default=0.0, show_default=True, help="Between plates (%)."
)
_PLATES = click.option("--plates", type=int, default=SIZING.plates, show_default=True)
_SEED = click.option("--seed", type=int, default=SEED, show_default=True)


@click.group("bridge")
def command() -> None:
    """Say what the assay has to reach for a panel, and how to join two platforms.

    \b
    The panel is that of a run folder, or stated:
      panelkit bridge limits my-run --loss 0.02
      panelkit bridge loss --size 8 --area 0.85 --sd 0.8 --cv 20
      panelkit bridge replicates --marker IL6=0.9:1.1 --marker CRP=0.7:1.0 --cv 30 --loss 0.01
      panelkit bridge samples --cv 10 --other-cv 15 --shift 0.1 --expected 0.95
    """  # noqa: D301, E501 - click reads this sign as: keep the lines


@command.command("limits")
@_panel
@_LOSS
@_PLATES
@_SEED
@shown
def limits(
    loss: float, plates: int, seed: int, as_json: bool, out: Path | None, **panel: Any
) -> None:
    """Print the assay requirement sheet for an accepted loss of area."""
    answer = bridge_limits(_source(panel), loss, plates, seed)
    show_answer(answer, as_json, out)


@command.command("loss")
@_panel
@_CV
@_BETWEEN
@click.option("--replicates", type=int, default=1, show_default=True)
@_PLATES
@_SEED
@shown
def loss_of_error(
    cv: float,
    between: float,
    replicates: int,
    plates: int,
    seed: int,
    as_json: bool,
    out: Path | None,
    **panel: Any,
) -> None:
    """Say what a stated error costs the panel."""
    answer = bridge_loss(_source(panel), cv, between, replicates, plates, seed)
    show_answer(answer, as_json, out)


@command.command("replicates")
@_panel
@_LOSS
@_CV
@_BETWEEN
@_PLATES
@shown
def replicates(
    loss: float,
    cv: float,
    between: float,
    plates: int,
    as_json: bool,
    out: Path | None,
    **panel: Any,
) -> None:
    """Say how many replicates keep the loss of area."""
    answer = bridge_replicates(_source(panel), loss, cv, between, plates)
    show_answer(answer, as_json, out)


@command.command("samples")
@click.option("--cv", type=float, required=True, help="Of the first platform (%).")
@click.option("--other-cv", type=float, required=True, help="Of the second (%).")
@click.option("--shift", type=float, required=True, help="To be known so well, log2.")
@click.option("--expected", type=float, required=True, help="Correlation of the two.")
@shown
def samples(
    cv: float,
    other_cv: float,
    shift: float,
    expected: float,
    as_json: bool,
    out: Path | None,
) -> None:
    """Say how many samples to measure on both platforms."""
    answer = bridge_samples(cv, other_cv, shift, expected)
    show_answer(answer, as_json, out)


@command.command("choose")
@click.argument("study", type=FOLDER)
@click.argument("run", type=FOLDER)
@click.option("--size", type=int, required=True, help="Samples wanted.")
@click.option("--panel", help="Of RUN.  [the chosen one]")
@shown
def choose(
    study: Path,
    run: Path,
    size: int,
    panel: str | None,
    as_json: bool,
    out: Path | None,
) -> None:
    """Choose which samples of STUDY to measure on both platforms."""
    show_answer(bridge_choice(study, run, size, panel), as_json, out)
