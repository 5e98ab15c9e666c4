"""``panelkit size accuracy`` and ``area``: precision of a locked test's figures."""

from pathlib import Path

import click

from panelkit.cli.sizing_screen import costed, show_answer, shown
from panelkit.config import SIZING
from panelkit.workflow import size_accuracy, size_area

__all__ = ["accuracy", "area"]


@click.command("accuracy")
@click.option("--sensitivity", type=float, required=True, help="Expected.")
@click.option("--specificity", type=float, required=True, help="Expected.")
@click.option("--half-width", type=float, required=True, help="Of both intervals.")
@click.option("--prevalence", type=float, required=True, help="Share of cases.")
@click.option("--confidence", type=float, default=SIZING.confidence, show_default=True)
@costed
@shown
def accuracy(  # noqa: PLR0913 - one parameter an option is how click hands them over
    sensitivity: float,
    specificity: float,
    half_width: float,
    prevalence: float,
    confidence: float,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Find the people that measure sensitivity and specificity well enough."""
    answer = size_accuracy(sensitivity, specificity, half_width, prevalence, confidence)
    show_answer(answer, as_json, out, prices, markers)


@click.command("area")
@click.option("--area", "expected", type=float, required=True, help="Expected.")
@click.option("--width", type=float, required=True, help="Full width of its interval.")
@click.option(
    "--controls-per-case",
    type=float,
    default=SIZING.controls_per_case,
    show_default=True,
)
@click.option("--confidence", type=float, default=SIZING.confidence, show_default=True)
@costed
@shown
def area(
    expected: float,
    width: float,
    controls_per_case: float,
    confidence: float,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Find the people that measure an area under the ROC curve well enough."""
    answer = size_area(expected, width, controls_per_case, confidence)
    show_answer(answer, as_json, out, prices, markers)
