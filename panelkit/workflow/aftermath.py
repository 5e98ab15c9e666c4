"""What the chosen panel loses, gains and depends on: tables beside the answer."""

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import Study
from panelkit.costing import (
    HonestAccuracy,
    Judge,
    Primary,
    Selected,
    added_value_of,
    fragility_of,
    handling_of,
    learn_roles,
    learning_curve,
    stand_ins_of,
    subgroups_of,
)
from panelkit.records import Aftermath, Cohort, Handling, LearningPoint
from panelkit.runtime import BlockStore, RunFolder
from panelkit.workflow.check import CheckedStudy

__all__ = ["learn_aftermath", "write_aftermath"]

TABLES = {
    "stand_ins": "stand_ins.csv",
    "fragility": "fragility.csv",
    "subgroups": "subgroups.csv",
    "added_value": "added_value.csv",
    "handling": "handling.csv",
    "learning_curve": "learning_curve.csv",
}


def learn_aftermath(
    plan: Study,
    known: CheckedStudy,
    selected: Selected,
    primary: Primary,
    accuracy: HonestAccuracy,
    inputs: str,
    store: BlockStore,
    how: Mapping[str, Any],
) -> Aftermath:
    """Return stand-ins, fragility, subgroups, added value, handling, learning curve.

    Parameters
    ----------
    plan : Study
        Columns and settings.
    known : CheckedStudy
        Cohort, procedure, folds, prices.
    selected : Selected
        What was learnt on all samples.
    primary : Primary
        The chosen panel.
    accuracy : HonestAccuracy
        Out-of-fold predictions.
    inputs : str
        Hash of everything that determines the results.
    store : BlockStore
        Where finished folds are kept.
    how : mapping
        Threads and listener.

    Returns
    -------
    Aftermath
        Rows of six tables.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """
    cohort, data, draws = known.cohort, known.data, known.draws
    judge = Judge(
        data.task, data.subjects, data.weights, draws.folds, plan.accuracy.confidence
    )
    row = primary.taken.row
    whole, panel = accuracy.panels[row], selected.panels[row]
    losses = learn_roles(
        known.procedure,
        data,
        draws,
        accuracy,
        row,
        inputs,
        store,
        **how,
    )
    curve: tuple[LearningPoint, ...] = ()
    if plan.accuracy.learning_curve:
        curve = learning_curve(
            known.procedure,
            data,
            draws,
            primary.rule,
            primary.predictions,
            judge,
            inputs,
            store,
            **how,
        )
    return Aftermath(
        stand_ins=stand_ins_of(
            losses, whole, panel, selected, cohort.features, judge, known.pricer
        ),
        fragility=fragility_of(
            losses, whole, [str(cohort.features[j]) for j in panel], judge
        ),
        subgroups=subgroups_of(
            primary.predictions, judge, _columns(cohort, _group_columns(plan))
        ),
        added_value=added_value_of(accuracy, primary, judge),
        handling=_named(
            cohort,
            handling_of(
                primary.predictions, judge, _columns(cohort, plan.cohort.nuisance)
            ),
        ),
        learning_curve=curve,
    )


def _group_columns(plan: Study) -> list[str]:
    """Return the columns by which accuracy is looked at in parts."""
    section = plan.cohort
    named = [section.site, section.batch, *section.covariates, *section.nuisance]
    return list(dict.fromkeys(name for name in named if name is not None))


def _columns(cohort: Cohort, names: Sequence[str]) -> dict[str, NDArray[np.object_]]:
    return {name: cohort.sample_columns[name] for name in names}


def _named(cohort: Cohort, rows: tuple[Handling, ...]) -> tuple[Handling, ...]:
    """Return rows whose group is the class as written, or a quarter of a number."""
    names = () if cohort.outcome is None else cohort.outcome.groups[0]
    return tuple(
        replace(
            row,
            group=names[int(row.group)]
            if names
            else f"quarter {int(row.group) + 1} of the outcome",
        )
        for row in rows
    )


def write_aftermath(folder: RunFolder, found: Aftermath) -> None:
    """Write the tables; one without rows has its header only.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    for name, file in TABLES.items():
        rows = getattr(found, name)
        columns: list[str] = list(Aftermath.rows_of(name).__slots__)
        folder.table(file, columns, [[getattr(r, c) for c in columns] for r in rows])
