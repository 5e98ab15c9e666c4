"""``panelkit size learning`` and ``detect``: what more people bring to a search."""

from pathlib import Path

import click

from panelkit.cli.screen import watching
from panelkit.cli.sizing_screen import costed, numbers, show_answer, shown
from panelkit.config import SEED, SIZING
from panelkit.workflow import size_detection, size_learning

__all__ = ["detect", "learning"]


@click.command("learning")
@click.argument("run", type=click.Path(path_type=Path))
@click.option("--target", type=float, help="Nested metric that is wanted.")
@click.option("--seed", type=int, default=SEED, show_default=True)
@costed
@shown
def learning(
    run: Path,
    target: float | None,
    seed: int,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Say what more people would bring, by the learning curve of the folder RUN."""
    show_answer(size_learning(run, target, seed), as_json, out, prices, markers)


@click.command("detect")
@click.option(
    "--people",
    callback=numbers(int),
    required=True,
    metavar="N,N,...",
    help="Numbers of people.",
)
@click.option(
    "--differences",
    callback=numbers(float),
    required=True,
    metavar="D,D,...",
    help="Of true markers, in within-class SD.",
)
@click.option("--prevalence", type=float, required=True, help="Share of cases.")
@click.option("--features", type=int, default=SIZING.features, show_default=True)
@click.option(
    "--true-markers", type=int, default=SIZING.true_markers, show_default=True
)
@click.option(
    "--simulations",
    type=int,
    default=SIZING.simulations,
    show_default=True,
    help="Invented cohorts each.",
)
@click.option("--seed", type=int, default=SEED, show_default=True)
@click.option("--threads", type=click.IntRange(1, 1024), default=1, show_default=True)
@click.option("--quiet", is_flag=True, help="Show no progress.")
@costed
@shown
def detect(  # noqa: PLR0913 - one parameter an option is how click hands them over
    people: tuple[int, ...],
    differences: tuple[float, ...],
    prevalence: float,
    features: int,
    true_markers: int,
    simulations: int,
    seed: int,
    threads: int,
    quiet: bool,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Say which differences a shortlist finds, by simulation."""
    with watching(quiet or as_json) as listener:
        answer = size_detection(
            people,
            differences,
            prevalence=prevalence,
            features=features,
            true_markers=true_markers,
            simulations=simulations,
            seed=seed,
            threads=threads,
            listener=listener,
        )
    show_answer(answer, as_json, out, prices, markers)
