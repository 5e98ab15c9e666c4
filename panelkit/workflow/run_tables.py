"""What a finished run says that later questions need: its panel, its learning curve."""

import csv
import json
import math
from dataclasses import dataclass
from pathlib import Path
from statistics import NormalDist

from panelkit.errors import InputDataError, RunFolderError, name_some
from panelkit.records import LearningPoint

__all__ = ["RunPanel", "read_learning_curve", "read_run_panel", "read_run_table"]

FARTHEST = 0.9995  # an apparent area of 1 says no SD
NEAREST = 0.51  # nor does one of one half


@dataclass(frozen=True, slots=True)
class RunPanel:
    """A panel of a run as assay planning needs it.

    Attributes
    ----------
    markers : tuple of str
        Features.
    differences, sds : tuple of float
        Cases less controls and within-class SD, on the scale of the fits.
    area : float
        Honest area: of the procedure that proposed the panel.
    name : str
        Of the panel in ``frontier.csv``.
    """

    markers: tuple[str, ...]
    differences: tuple[float, ...]
    sds: tuple[float, ...]
    area: float
    name: str


def read_run_table(run: Path, name: str) -> list[dict[str, str]]:
    """Return the rows of a table of a run folder.

    Parameters
    ----------
    run : Path
        The run folder.
    name : str
        File name of the table.

    Returns
    -------
    list of dict
        Cells as text by column.

    Raises
    ------
    RunFolderError
        There is no such table, or it cannot be read.
    """
    path = run / name
    try:
        with path.open(encoding="utf-8", newline="") as file:
            rows = list(csv.DictReader(file))
    except (OSError, UnicodeDecodeError) as error:
        raise RunFolderError(
            code="run-table-missing",
            where=str(path),
            what=f"it cannot be read ({type(error).__name__})",
            accepted="the folder of a finished run",
            next_step="Name the folder that `panelkit run` wrote with --out",
        ) from None
    if not rows:
        raise RunFolderError(
            code="run-table-empty",
            where=str(path),
            what="it has no rows",
            accepted="a run whose study asked for what this table holds",
            next_step="Run the study again, with [accuracy] learning_curve = true "
            "where "
            "a learning curve is wanted",
        )
    return rows


def _number(row: dict[str, str], column: str, where: Path) -> float:
    text = row.get(column)
    try:
        return float(text) if text else math.nan
    except ValueError:
        raise RunFolderError(
            code="run-table-damaged",
            where=f"{where}, column '{column}'",
            what=f"this is no number (got {text!r})",
            accepted="the table as the run wrote it",
            next_step="Run the study again",
        ) from None


def read_learning_curve(run: Path) -> tuple[LearningPoint, ...]:
    """Return the learning curve of a run.

    Raises
    ------
    RunFolderError
        The run has none.
    """
    name = "learning_curve.csv"
    return tuple(
        LearningPoint(
            **{
                column: _number(row, column, run / name)
                for column in (
                    "share",
                    "n_subjects",
                    "metric",
                    "metric_low",
                    "metric_high",
                    "metric_se_corrected",
                )
            }
        )
        for row in read_run_table(run, name)
    )


def read_run_panel(run: Path, panel: str | None = None) -> RunPanel:
    """Return a panel of a run with differences and SD of its markers.

    Parameters
    ----------
    run : Path
        The run folder.
    panel : str, optional
        Its name in ``frontier.csv``; None takes the chosen one.

    Returns
    -------
    RunPanel
        The SD of a marker is its difference over the distance that goes with its
        single-marker area.

    Raises
    ------
    RunFolderError
        Not the folder of a finished run.
    InputDataError
        No such panel.
    """
    rows = read_run_table(run, "frontier.csv")
    chosen = [
        row
        for row in rows
        if (row.get("panel") == panel if panel else bool(row.get("chosen_by")))
    ]
    if not chosen:
        raise InputDataError(
            code="panel-unknown",
            where=str(run / "frontier.csv"),
            what=f"no panel is called {panel!r}" if panel else "no panel was chosen",
            accepted=f"one of {name_some(row.get('panel') for row in rows)}",
            next_step="Name it by --panel",
        )
    row = chosen[0] if panel else _primary(run, chosen)
    markers = tuple(str(row.get("markers", "")).split(";"))
    listed = {each["feature"]: each for each in read_run_table(run, "shortlist.csv")}
    if missing := [name for name in markers if name not in listed]:
        raise InputDataError(
            code="marker-without-row",
            where=str(run / "shortlist.csv"),
            what=f"no row for {name_some(missing)}",
            accepted="a row for every marker of the panel",
            next_step="Give the markers by --marker NAME=DIFFERENCE:SD",
        )
    found = [_effect(listed[name], run) for name in markers]
    return RunPanel(
        markers,
        tuple(difference for difference, _ in found),
        tuple(sd for _, sd in found),
        _number(row, "metric", run / "frontier.csv"),
        str(row.get("panel")),
    )


def _primary(run: Path, rows: list[dict[str, str]]) -> dict[str, str]:
    """Return the row that the primary rule chose, which choice.json names first."""
    try:
        rules = json.loads((run / "choice.json").read_text(encoding="utf-8"))["rules"]
        wanted = str(rules[0]["panel"])
    except (OSError, ValueError, KeyError, IndexError, TypeError):
        return rows[0]
    return next((row for row in rows if row.get("panel") == wanted), rows[0])


def _effect(row: dict[str, str], run: Path) -> tuple[float, float]:
    where = run / "shortlist.csv"
    difference = _number(row, "difference", where)
    area = _number(row, "single_marker_auc", where)
    area = min(FARTHEST, max(area, 1.0 - area, NEAREST))
    distance = math.sqrt(2.0) * NormalDist().inv_cdf(area)
    return difference, abs(difference) / distance
