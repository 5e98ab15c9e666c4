"""``panelkit size develop``, ``validate`` and ``compare``: people for models."""

from pathlib import Path

import click

from panelkit.cli.sizing_screen import costed, show_answer, shown
from panelkit.config import SIZING
from panelkit.workflow import size_comparison, size_development, size_validation

__all__ = ["compare", "develop", "validate"]


@click.command("develop")
@click.option(
    "--parameters", type=int, required=True, help="Everything that is looked at."
)
@click.option("--prevalence", type=float, help="Of a binary outcome.")
@click.option("--area", type=float, help="Expected area under the ROC curve; or:")
@click.option("--cox-snell", type=float, help="Expected Cox-Snell R2.")
@click.option("--rate", type=float, help="Survival: events per person and time.")
@click.option("--follow-up", type=float, help="Survival: mean follow-up.")
@costed
@shown
def develop(  # noqa: PLR0913 - one parameter an option is how click hands them over
    parameters: int,
    prevalence: float | None,
    area: float | None,
    cox_snell: float | None,
    rate: float | None,
    follow_up: float | None,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Find the people for developing a model of given parameters."""
    answer = size_development(
        parameters=parameters,
        prevalence=prevalence,
        area=area,
        cox_snell=cox_snell,
        rate=rate,
        follow_up=follow_up,
    )
    show_answer(answer, as_json, out, prices, markers)


@click.command("validate")
@click.option("--prevalence", type=float, help="Of a binary outcome.")
@click.option("--area", type=float, help="Expected area under the ROC curve.")
@click.option(
    "--threshold", type=float, help="Probability of treatment.  [the prevalence]"
)
@click.option("--r-squared", type=float, help="A number as outcome: expected R2.")
@costed
@shown
def validate(
    prevalence: float | None,
    area: float | None,
    threshold: float | None,
    r_squared: float | None,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Find the people for validating a locked model on a new cohort."""
    answer = size_validation(
        prevalence=prevalence, area=area, threshold=threshold, r_squared=r_squared
    )
    show_answer(answer, as_json, out, prices, markers)


@click.command("compare")
@click.option("--area", type=float, help="Of the first panel.")
@click.option("--other-area", type=float, help="Of the second panel.")
@click.option("--correlation", type=float, help="Of the two estimated areas.")
@click.option("--discordant", type=float, help="Share on whom panels disagree.")
@click.option("--difference", type=float, help="Of the two shares.")
@click.option("--power", type=float, default=SIZING.power, show_default=True)
@costed
@shown
def compare(  # noqa: PLR0913 - one parameter an option is how click hands them over
    area: float | None,
    other_area: float | None,
    correlation: float | None,
    discordant: float | None,
    difference: float | None,
    power: float,
    prices: Path | None,
    markers: tuple[str, ...],
    as_json: bool,
    out: Path | None,
) -> None:
    """Find the people that tell two panels apart, read on the same people."""
    answer = size_comparison(
        area=area,
        other_area=other_area,
        correlation=correlation,
        discordant=discordant,
        difference=difference,
        power=power,
    )
    show_answer(answer, as_json, out, prices, markers)
