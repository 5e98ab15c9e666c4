"""Locked panels of a run: those that it writes, and `lock_panel`."""

import json
import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any, Final

import numpy as np

from panelkit.config import LOCK, Study, read_study
from panelkit.costing import Everyone, HonestAccuracy, Primary, Selected
from panelkit.errors import InputDataError, UsageError, name_some
from panelkit.lock import (
    ChosenPanel,
    OutOfFoldRows,
    TaughtOn,
    cutoff_rule,
    freeze_panel,
    panel_bytes,
    read_panel,
    reasons_against,
    with_cutoffs,
)
from panelkit.records import Aftermath, PanelContent, RecipeState, RunSummary
from panelkit.runtime import RunFolder, generator, write_whole
from panelkit.workflow.check import CheckedStudy, checked
from panelkit.workflow.past_run import PastRun, log_odds_of

__all__ = ["lock_panel", "write_panels"]

PANELS: Final = "panels"


def taught_on(
    plan: Study, known: CheckedStudy, state: RecipeState, record: Mapping[str, Any]
) -> TaughtOn:
    """Return what every panel of a run is refitted on.

    Raises
    ------
    InputDataError
        The outcome is not binary.
    """
    cohort, data = known.cohort, known.data
    outcome = cohort.outcome
    if outcome is None or outcome.kind != "binary":
        raise InputDataError(
            code="lock-not-binary",
            where="outcome",
            what="panels can be locked for two classes only so far (got "
            f"{'none' if outcome is None else outcome.kind})",
            accepted="a binary outcome",
            next_step="Name outcome and positive",
        )
    prevalence = cohort.design.prevalence
    return TaughtOn(
        values=cohort.values,
        context=data.context,
        units=cohort.feature_columns.get("unit"),
        discovery=known.procedure.recipe,
        assay=known.procedure.assay,
        state=state,
        outcome=outcome.values,
        weights=cohort.design.weights,
        subjects=cohort.design.subject,
        subject_ids=cohort.design.subject_ids,
        column=outcome.column,
        negative=outcome.negative,
        positive=outcome.positive,
        design=cohort.design.kind,
        prevalence=float("nan") if prevalence is None else prevalence,
        study=plan.path.name,
        record=record,
        seed=plan.seed,
    )


def write_panels(  # noqa: PLR0913 - a panel file holds something of everything
    folder: RunFolder,
    plan: Study,
    known: CheckedStudy,
    selected: Selected,
    everyone: Everyone,
    accuracy: HonestAccuracy,
    primary: Primary,
    found: tuple[RunSummary, Aftermath],
    record: bytes,
) -> None:
    """Write ``panels/NAME.json`` for each chosen panel that can be locked.

    ``panels/penalties.csv`` holds the tuned ridge penalty of every panel of the
    frontier; ``panels/not_locked.csv`` why a chosen one could not be locked.

    Raises
    ------
    RunFolderError
        A file cannot be written.
    """
    summary, aftermath = found
    rows = summary.frontier.rows
    folder.table(
        f"{PANELS}/penalties.csv",
        ["panel", "ridge_penalty"],
        [
            (row.panel, penalty)
            for row, penalty in zip(rows, everyone.penalties, strict=True)
        ],
    )
    outcome = known.cohort.outcome
    if outcome is None or outcome.kind != "binary":
        folder.table(
            f"{PANELS}/not_locked.csv",
            ["panel", "reason"],
            [
                (rule.panel, "panels are locked for two classes only so far")
                for rule in summary.choice.rules
                if rule.panel
            ],
        )
        return
    taught = taught_on(plan, known, selected.view.state, json.loads(record))
    refused: list[tuple[str, str]] = []
    cutoffs = [cutoff_rule(text) for text in LOCK.cutoffs]
    names = [row.panel for row in rows]
    chosen = [rule.panel for rule in summary.choice.rules]
    for name in dict.fromkeys(filter(None, chosen)):  # a rule may have found none
        at = names.index(name)
        nested = name == chosen[0]
        shown = summary.choice.headline if nested else rows[at]
        panel = ChosenPanel(
            name=name,
            markers=selected.panels[at],
            penalty=float(everyone.penalties[at]),
            out_of_fold=log_odds_of(
                known.data.task.scores(
                    (primary.predictions if nested else accuracy.panels[at]).predicted
                )
            ),
            metric_of=shown.metric_of,
            metric=shown.metric,
            metric_low=shown.metric_low,
            metric_high=shown.metric_high,
            losses=_losses(aftermath) if nested else {},
        )
        if reasons := reasons_against(panel, taught):
            refused += [(name, reason) for reason in reasons]
            continue
        draws = generator(plan.seed, "cut-off", name)
        locked = freeze_panel(panel, taught, cutoffs, draws)
        folder.write(f"{PANELS}/{name}.json", panel_bytes(locked))
    folder.table(f"{PANELS}/not_locked.csv", ["panel", "reason"], refused)


def _losses(aftermath: Aftermath) -> dict[str, tuple[float, float, float, float]]:
    return {
        row.marker: (row.metric, row.loss, row.loss_low, row.loss_high)
        for row in aftermath.fragility
        if row.event == "lost-refitted"
    }


def lock_panel(
    run: "str | os.PathLike[str]",
    out: "str | os.PathLike[str]",
    *,
    rule: str | None = None,
    panel: str | None = None,
    cutoffs: Sequence[str] = LOCK.cutoffs,
    study: "str | os.PathLike[str] | None" = None,
    prevalence: float | None = None,
    assay_cv: float = 0.0,
) -> PanelContent:
    """Lock a panel of a run and write its file.

    Parameters
    ----------
    run : path
        The run folder.
    out : path
        The panel file.
    rule : str, optional
        A rule of ``choice.json``; None without `panel`: the primary one.
    panel : str, optional
        A panel of the frontier, ``maker-size``.
    cutoffs : sequence of str
        ``youden``, ``sensitivity=0.9``, ``specificity-lower-limit=0.9``, ...; chosen on
        the recalibrated out-of-fold chances.
    study : path, optional
        The study file of the run: its data are read again and the panel is refitted.
        Needed for panels that no rule chose.
    prevalence : float, optional
        For predictive values; None: the study's own, if it states one.
    assay_cv : float
        Coefficient of variation of the new assay beyond that of the training data, a
        share; widens the grey zone.

    Returns
    -------
    PanelContent
        As written.

    Raises
    ------
    UsageError, StudyFileError, InputDataError, PanelFileError, RunFolderError
        With exit codes 2, 2, 3, 6 and 7.
    """
    _check(prevalence, assay_cv)
    rules = [cutoff_rule(text) for text in cutoffs]
    past = PastRun(Path(run))
    name = past.panel_named(rule, panel)
    share = float("nan") if prevalence is None else prevalence
    draws = generator(past.seed, "cut-off", name)
    seen = past.out_of_fold(name)
    if study is None:
        file = past.path / PANELS / f"{name}.json"
        if not file.exists():
            _refuse_unwritten(past, name)
        content = read_panel(file)
    else:
        plan = read_study(Path(study))
        content = _refitted(plan, past, name, seen)
    content = with_cutoffs(
        content, seen, rules, draws, prevalence=share, assay_cv=assay_cv
    )
    with write_whole(Path(out)) as written:
        written.write(panel_bytes(content))
    return content


def _check(prevalence: float | None, assay_cv: float) -> None:
    if prevalence is not None and not 0.0 < prevalence < 1.0:
        raise UsageError(
            code="prevalence-outside",
            where="prevalence",
            what=f"no share of people (got {prevalence:g})",
            accepted="a share above 0 and below 1",
            next_step="State the prevalence where the test is meant to be used",
        )
    if not 0.0 <= assay_cv < 2.0:
        raise UsageError(
            code="assay-cv-outside",
            where="assay_cv",
            what=f"no coefficient of variation (got {assay_cv:g})",
            accepted="a share from 0, for example 0.1 for 10 %",
            next_step="State it as a share",
        )


def _refuse_unwritten(past: PastRun, name: str) -> None:
    reasons = [
        row["reason"]
        for row in past.rows(f"{PANELS}/not_locked.csv")
        if row["panel"] == name
    ]
    written = sorted(file.stem for file in (past.path / PANELS).glob("*.json"))
    raise UsageError(
        code="panel-not-locked",
        where=f"{past.path}, panel {name}",
        what=reasons[0] if reasons else "the run wrote no file for it",
        accepted=f"panels that it wrote: {name_some(written) or 'none'}; or any panel "
        "of the frontier whose preparation its assays can do, with the study file",
        next_step="Name the study file by --study, or correct its [preparation] assay"
        if not reasons
        else "Correct what is said, run again, and lock then",
    )


def _refitted(
    plan: Study, past: PastRun, name: str, seen: OutOfFoldRows
) -> PanelContent:
    """Return a panel refitted on the study's data, which must be those of the run."""
    known = checked(plan)
    past.refuse_other_study(plan, known)
    procedure, data = known.procedure, known.data
    state = procedure.recipe.learn(
        data.base, np.arange(data.n_samples), data.barred, data.context
    )
    taught = taught_on(plan, known, state, past.record)
    row = past.frontier_row(name)
    place = {str(feature): j for j, feature in enumerate(known.cohort.features)}
    markers = [place[feature] for feature in row["markers"].split(";")]
    headline = past.headline(name)
    shown: Mapping[str, Any] = row if headline is None else headline
    losses = {
        each["marker"]: tuple(
            _number(each[key]) for key in ("metric", "loss", "loss_low", "loss_high")
        )
        for each in past.rows("fragility.csv")
        if headline is not None and each["event"] == "lost-refitted"
    }
    panel = ChosenPanel(
        name=name,
        markers=np.array(markers, np.int64),
        penalty=past.penalty(name),
        out_of_fold=seen.log_odds,
        metric_of=str(shown["metric_of"]),
        metric=_number(shown["metric"]),
        metric_low=_number(shown["metric_low"]),
        metric_high=_number(shown["metric_high"]),
        losses=losses,  # type: ignore[arg-type]  # four keys give four numbers
    )
    return freeze_panel(panel, taught, [], generator(plan.seed, "cut-off", name))


def _number(value: object) -> float:
    return float("nan") if value in (None, "") else float(str(value))
