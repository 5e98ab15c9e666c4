"""``panelkit check``: what was noticed about the data."""

from dataclasses import asdict
from pathlib import Path

import click

from panelkit.cli.screen import console, show_findings, show_json, show_table
from panelkit.errors import InputDataError
from panelkit.workflow import check_study

__all__ = ["command"]


@click.command("check")
@click.argument("study", type=click.Path(path_type=Path))
@click.option("--json", "as_json", is_flag=True, help="Print the findings as JSON.")
@click.option("--quiet", is_flag=True, help="Print nothing; the exit code tells.")
def command(study: Path, as_json: bool, quiet: bool) -> None:
    """Read the data of STUDY and say what was noticed; 3 when results would mislead."""
    cohort = check_study(study)
    if as_json:
        show_json(
            {
                "findings": [asdict(item) for item in cohort.findings],
                "flow": [asdict(row) for row in cohort.flow],
            }
        )
    elif not quiet:
        show_findings(cohort.findings)
        show_table(
            "participant flow",
            [
                "class",
                "received",
                "matched",
                "with outcome",
                "kept",
                "analysed",
                "set aside",
            ],
            [
                [str(value) or "(none)" for value in asdict(row).values()]
                for row in cohort.flow
            ],
            right=(1, 2, 3, 4, 5, 6),
        )
        console().print(
            f"{cohort.n_samples} samples of {cohort.design.n_subjects} subjects, "
            f"{cohort.n_features:,} features.",
            markup=False,
        )
    stops = cohort.findings.of("stop")
    if stops and quiet:
        click.get_current_context().exit(InputDataError.exit_code)
    if stops:
        raise InputDataError(
            code="stop-found",
            where=str(study),
            what=f"{len(stops)} finding(s) say that results would mislead",
            accepted="no `stop` finding, or a written reason for each under [cohort] "
            "accept",
            next_step="Read the findings above",
        )
