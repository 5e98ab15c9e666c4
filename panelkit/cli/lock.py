"""``panelkit lock``: from a run to a panel file."""

from pathlib import Path

import click

from panelkit.cli.screen import console, show_json, show_table
from panelkit.config import LOCK
from panelkit.records import PanelContent
from panelkit.workflow import lock_panel

__all__ = ["command"]


@click.command("lock")
@click.argument("run", type=click.Path(path_type=Path))
@click.option("--rule", help="A rule of choice.json.  [the primary rule]")
@click.option("--panel", help="A panel of the frontier, MAKER-SIZE.")
@click.option(
    "--cutoff",
    "cutoffs",
    multiple=True,
    help="youden, or KIND=VALUE: sensitivity, specificity, either with "
    "-lower-limit, net-benefit; may be repeated.  "
    f"[{', '.join(LOCK.cutoffs)}]",
)
@click.option("--study", type=click.Path(path_type=Path), help="Refit on its data.")
@click.option("--prevalence", type=float, help="For predictive values.")
@click.option("--assay-cv", type=float, default=0.0, help="Added error of the assay.")
@click.option("--out", type=click.Path(path_type=Path), required=True)
@click.option("--json", "as_json", is_flag=True, help="Print the result as JSON.")
def command(  # noqa: PLR0913 - one argument an option
    run: Path,
    rule: str | None,
    panel: str | None,
    cutoffs: tuple[str, ...],
    study: Path | None,
    prevalence: float | None,
    assay_cv: float,
    out: Path,
    as_json: bool,
) -> None:
    """Lock a panel of the finished RUN."""
    found = lock_panel(
        run,
        out,
        rule=rule,
        panel=panel,
        cutoffs=cutoffs or LOCK.cutoffs,
        study=study,
        prevalence=prevalence,
        assay_cv=assay_cv,
    )
    if as_json:
        show_json(
            {
                "panel": found.name,
                "file": str(out),
                "content_sha256": found.content_sha256,
                "markers": list(found.features),
                "shrinkage": found.honest.shrinkage,
                "cutoffs": [
                    {"name": cut.name, "chance": cut.chance} for cut in found.cutoffs
                ],
                "cautions": list(found.cautions),
            }
        )
    else:
        _show(found, out)


def _show(found: PanelContent, out: Path) -> None:
    show_table(
        f"{found.name}: chance of {found.outcome} = {found.positive}",
        ["marker", "analyte", "unit", "coefficient", "training range"],
        [
            [
                marker.feature,
                marker.analyte,
                marker.unit,
                f"{marker.coefficient:+.4g}",
                f"{marker.measured_low:.4g} to {marker.measured_high:.4g}",
            ]
            for marker in found.markers
        ],
        right=(3,),
    )
    screen = console()
    for step in found.steps:
        screen.print(f"preparation: {step.words}", markup=False)
    screen.print(found.honest.sentence, markup=False)
    for cut in found.cutoffs:
        screen.print(cut.sentence, markup=False)
    for caution in found.cautions:
        screen.print(caution, markup=False)
    screen.print(f"Written: {out} (hash {found.content_sha256[:16]}...)", markup=False)
