"""`validate_panel` and `recalibrate_panel`: a locked panel meets new people."""

import hashlib
import os
from collections.abc import Mapping
from dataclasses import asdict, fields, replace
from pathlib import Path
from typing import Any, NoReturn

import numpy as np

from panelkit import lock
from panelkit.config import ValidationPlan, read_validation_plan
from panelkit.errors import InputDataError, RunFolderError, UsageError
from panelkit.lock import Changed, panel_bytes
from panelkit.records import (
    MarkerShift,
    PanelContent,
    Validation,
    ValidationFigure,
)
from panelkit.runtime import RunFolder, generator, hash_of_file, write_whole
from panelkit.workflow.locked_panel import LockedPanel, ScoredTable, score_bytes
from panelkit.workflow.new_people import (
    SheetColumns,
    joined,
    people_of,
    scored_cohort,
)
from panelkit.workflow.set_aside import open_set_aside as opened_rows

__all__ = ["recalibrate_panel", "validate_panel", "validation_content"]

File = str | os.PathLike[str]


def validate_panel(  # noqa: PLR0913 - who judges, by what, against what
    panel: File,
    table: File | None = None,
    samples: File | None = None,
    *,
    out: File,
    columns: SheetColumns | None = None,
    plan: File | None = None,
    prevalence: float | None = None,
    against: File | None = None,
    study: File | None = None,
    open_set_aside: str | None = None,
) -> Validation:
    """Judge a locked panel on people who did not teach it, and write the figures.

    Samples are scored, and the score file is written, before the sample sheet is
    opened.

    Parameters
    ----------
    panel : path
        The panel file.
    table, samples : path, optional
        Expression or assay values, and the sample sheet with outcomes.
    out : path
        A folder: ``validation.json``, ``figures.csv``, ``shifts.csv``, ``scores.csv``.
    columns : SheetColumns, optional
        Columns of the sheet where they are not those of the panel's study.
    plan : path, optional
        A TOML file written beforehand; without one the validation is exploratory.
    prevalence : float, optional
        For predictive values and net benefit.
    against : path, optional
        Another panel file, compared on the same people.
    study : path, optional
        With `open_set_aside`: the study whose rows set aside judge the panel.
    open_set_aside : str, optional
        The reason for opening them; recorded before.

    Returns
    -------
    Validation
        Figures, shifts, verdict.

    Raises
    ------
    UsageError, StudyFileError, InputDataError, FitError, PanelFileError, RunFolderError
        With exit codes 2, 2, 3, 4, 6 and 7.
    """
    asked = SheetColumns() if columns is None else columns
    first = LockedPanel.read(panel)
    second = None if against is None else LockedPanel.read(against)
    wanted: tuple[ValidationPlan, str] | None = None
    if plan is not None:
        wanted = read_validation_plan(Path(plan)), hash_of_file(Path(plan))
        lock.refuse_other_plan(first.content, wanted[0])
        more = (*asked.subgroups, *wanted[0].subgroups)
        asked = replace(asked, subgroups=tuple(dict.fromkeys(more)))
    folder = _folder(out)
    other: tuple[PanelContent, lock.Scores] | None = None
    if open_set_aside is not None or study is not None:
        if open_set_aside is None or study is None or table is not None:
            _refuse_opening()
        cohort = opened_rows(study, open_set_aside)
        scored = scored_cohort(first, cohort)
        digest = _write_scores(folder, scored)
        people = people_of(first.content, cohort, scored.table, asked.subgroups)
        scores, notes = scored.scores, ["Rows that the study had set aside."]
        if second is not None:
            other = second.content, scored_cohort(second, cohort).scores
    else:
        if table is None or samples is None:
            _refuse_opening()
        scored = first.score(table)
        digest = _write_scores(folder, scored)
        scores, people, notes = joined(scored, samples, asked)
        if second is not None:
            again = joined(second.score(table), samples, asked)[0]
            other = second.content, again
    notes = [*notes, *lock.refuse_overlap(first.content, people)]
    if second is not None:
        lock.refuse_overlap(second.content, replace(people, values=np.empty((0, 0))))
    found = lock.validate_panel(
        first.content,
        scores,
        people,
        digest,
        plan=wanted,
        prevalence=float("nan") if prevalence is None else prevalence,
        against=other,
        noticed=notes,
    )
    _write(folder, found)
    return found


def _refuse_opening() -> NoReturn:
    raise UsageError(
        code="nobody-to-validate-on",
        where="table, samples, study, open_set_aside",
        what="it is not clear who is to judge the panel",
        accepted="a table and a sample sheet; or a study and the reason for opening "
        "the rows that it set aside",
        next_step="Name TABLE and SAMPLES, or --study and --open-set-aside REASON",
    )


def _folder(out: File) -> RunFolder:
    path = Path(out)
    own = (path / "validation.json").exists()
    if path.exists() and (not path.is_dir() or (any(path.iterdir()) and not own)):
        raise RunFolderError(
            code="folder-not-empty",
            where=str(path),
            what="it is not empty and holds no validation",
            accepted="a folder that is new, empty, or holds an earlier validation",
            next_step="Name another folder by --out",
        )
    return RunFolder(path)


def _write_scores(folder: RunFolder, scored: ScoredTable) -> str:
    data = score_bytes(scored)
    folder.write("scores.csv", data)
    return hashlib.sha256(data).hexdigest()


def _write(folder: RunFolder, found: Validation) -> None:
    for name, kind, rows in (
        ("figures.csv", ValidationFigure, found.figures),
        ("shifts.csv", MarkerShift, found.shifts),
    ):
        columns = [field.name for field in fields(kind)]
        folder.table(name, columns, [[getattr(r, c) for c in columns] for r in rows])
    folder.json("validation.json", validation_content(found))


def validation_content(found: Validation) -> Mapping[str, Any]:
    """Return a validation as plain values, what is not estimable as None."""

    def plain(value: Any) -> Any:
        if isinstance(value, dict):
            return {key: plain(item) for key, item in value.items()}
        if isinstance(value, list | tuple):
            return [plain(item) for item in value]
        if isinstance(value, float) and not np.isfinite(value):
            return None
        return value

    content: dict[str, Any] = plain(asdict(found))
    return content


def recalibrate_panel(
    panel: File,
    table: File,
    samples: File,
    out: File,
    *,
    changed: Changed = "intercept",
    columns: SheetColumns | None = None,
) -> PanelContent:
    """Fit a panel's chances to new people and write a new panel file.

    Parameters
    ----------
    panel, table, samples : path
        Panel file; values; sample sheet with outcomes.
    out : path
        The new panel file, which names its parent.
    changed : {"intercept", "intercept and slope"}
        What is fitted; markers and their order stay.
    columns : SheetColumns, optional
        Columns of the sheet where they are not those of the panel's study.

    Returns
    -------
    PanelContent
        As written.

    Raises
    ------
    UsageError, InputDataError, FitError, PanelFileError, RunFolderError
        With exit codes 2, 3, 4, 6 and 7.
    """
    if Path(out).exists() and Path(out).samefile(Path(panel)):
        raise UsageError(
            code="parent-overwritten",
            where=str(out),
            what="the new panel file would take the place of its parent",
            accepted="another name",
            next_step="Name another file by --out",
        )
    parent = LockedPanel.read(panel)
    asked = SheetColumns() if columns is None else columns
    scores, people, _notes = joined(parent.score(table), samples, asked)
    lock.refuse_overlap(parent.content, people)
    scored = ~np.isnan(scores.log_odds)
    if not scored.any():
        raise InputDataError(
            code="nothing-scored",
            where=str(table),
            what="no sample has a score",
            accepted="samples with measured markers",
            next_step="Check the table",
        )
    found = lock.recalibrate_panel(
        parent.content,
        scores.log_odds[scored],
        people.outcome[scored],
        people.subjects[scored],
        changed,
        generator(parent.content.seed, "recalibration"),
    )
    with write_whole(Path(out)) as file:
        file.write(panel_bytes(found))
    return found
