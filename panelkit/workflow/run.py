"""`run_study`: files in, priced panels with honest accuracy out."""

import hashlib
import os
import platform
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from panelkit.config import Study, read_study
from panelkit.costing import (
    Draws,
    HonestAccuracy,
    Judge,
    PanelPricer,
    Procedure,
    ProcedureData,
    Selected,
    build_frontier,
    choose,
    compare,
    draw_everything,
    estimate_accuracy,
)
from panelkit.errors import InputDataError, StudyFileError
from panelkit.ingest import guess_scale
from panelkit.preparation import Recipe, default_steps
from panelkit.records import (
    RESEARCH_USE,
    Cohort,
    Dropped,
    Finding,
    Findings,
    PanelCost,
    RunRecord,
    RunSummary,
)
from panelkit.report import render
from panelkit.runtime import Listener, Progress, RunFolder, silent, thread_count
from panelkit.stability import ShortlistRules
from panelkit.workflow.check import check_study
from panelkit.workflow.cohort import (
    barred_features,
    feature_positions,
    load_prices,
    refuse_stops,
)
from panelkit.workflow.record import record_bytes, run_record
from panelkit.workflow.shortlist import shortlist_table
from panelkit.workflow.tables import (
    choice_content,
    frontier_content,
    write_accuracy,
    write_data_tables,
    write_results,
)

__all__ = ["Run", "run_content", "run_study"]


@dataclass(frozen=True, slots=True)
class Run:
    """A finished run; stands for its folder wherever a path is wanted.

    Attributes
    ----------
    path : Path
        The run folder.
    summary : RunSummary
        What the report shows.
    """

    path: Path
    summary: RunSummary

    def __fspath__(self) -> str:
        return str(self.path)


class _Clock:
    """Seconds spent in each stage, told to the listener and the log."""

    def __init__(self, folder: RunFolder, listener: Listener) -> None:
        self.seconds: dict[str, float] = {}
        self._folder = folder
        self._listener = listener

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        """Time a stage of one step."""
        self._listener(Progress(name, 0, 1))
        start = time.perf_counter()
        yield
        self.seconds[name] = round(time.perf_counter() - start, 3)
        self._folder.log(f"{name}: {self.seconds[name]:.2f} s")
        self._listener(Progress(name, 1, 1))


def run_study(
    study: "str | os.PathLike[str] | Study",
    out: "str | os.PathLike[str]",
    *,
    threads: int | None = None,
    listener: Listener = silent,
) -> Run:
    """Run the whole job of a study and write the run folder.

    Parameters
    ----------
    study : path or Study
        The study file.
    out : path
        The run folder: new, empty, or an earlier attempt at this same run, whose
        finished folds are then used.
    threads : int, optional
        Folds at work at the same time; None takes every processor. No bit of a
        result depends on it.
    listener : callable
        Told of progress.

    Returns
    -------
    Run
        Path of the run folder and its summary.

    Raises
    ------
    StudyFileError, InputDataError, FitError, NoPanelError, RunFolderError
        With exit codes 2, 3, 4, 5 and 7.
    """
    plan = study if isinstance(study, Study) else read_study(Path(study))
    n_threads = thread_count(threads)
    started = time.time()
    listener(Progress("reading", 0, 1))
    cohort = check_study(plan)
    pricer, price_hashes = load_prices(plan)[:2]
    reading = round(time.time() - started, 3)
    refuse_stops(cohort.findings)
    record = run_record(plan, {**(cohort.sources or {}), **price_hashes})
    content = record_bytes(record)
    folder = RunFolder(Path(out))
    resumed = folder.claim(content)
    clock = _Clock(folder, listener)
    clock.seconds["reading"] = reading
    folder.log("resumed" if resumed else "started")
    listener(Progress("reading", 1, 1))

    procedure, data, size_finding = _procedure(plan, cohort)
    draws = draw_everything(
        data,
        seed=plan.seed,
        n_folds=plan.accuracy.folds,
        n_repeats=plan.accuracy.repeats,
        n_inner=plan.accuracy.inner_folds,
        subsamples=plan.shortlist.subsamples,
        inner_subsamples=plan.accuracy.inner_subsamples,
    )
    with clock.stage("shortlist"):
        selected = procedure.select(data, draws.everyone, n_threads)
    findings = Findings((*cohort.findings, *size_finding))
    dropped = [*cohort.dropped, *_left_out(cohort, selected)]
    write_data_tables(folder, findings, dropped, cohort.flow)
    start = time.perf_counter()
    accuracy = estimate_accuracy(
        procedure,
        data,
        draws,
        hashlib.sha256(content).hexdigest(),
        folder.store(),
        threads=n_threads,
        listener=listener,
    )
    clock.seconds["accuracy"] = round(time.perf_counter() - start, 3)
    folder.log(f"accuracy: {clock.seconds['accuracy']:.2f} s")
    with clock.stage("pricing and choice"):
        summary = _summarise(
            plan, cohort, record, findings, procedure, data, draws, selected,
            accuracy, pricer,
        )  # fmt: skip
        write_accuracy(folder, cohort, draws.folds, accuracy, pricer)
        write_results(folder, summary)
    with clock.stage("report"):
        for name, page in render(summary).items():
            folder.write(name, page)
    folder.log("finished")
    folder.json(
        "timings.json",
        {
            "started": time.strftime("%Y-%m-%dT%H:%M:%S%z", time.localtime(started)),
            "seconds": clock.seconds,
            "total": round(time.time() - started, 3),
            "threads": n_threads,
            "machine": platform.machine(),
            "system": platform.system(),
            "resumed": resumed,
        },
    )
    return Run(folder.path, summary)


def run_content(run: Run) -> dict[str, Any]:
    """Return a finished run as plain values: choice, frontier, where the report is."""
    summary = run.summary
    return {
        **choice_content(summary.choice),
        "outcome": summary.outcome,
        "samples": summary.n_samples,
        "subjects": summary.n_subjects,
        "features": summary.n_features,
        "shortlist": [
            str(name)
            for name, picked in zip(
                summary.shortlist.feature, summary.shortlist.picked, strict=True
            )
            if picked
        ],
        "frontier": frontier_content(summary.frontier),
        "report": str(run.path / "report.html"),
        "research_use": RESEARCH_USE,
    }


def _procedure(
    plan: Study, cohort: Cohort
) -> tuple[Procedure, ProcedureData, list[Finding]]:
    """Return what is repeated in every fold, and the data it is repeated on."""
    if cohort.outcome is None:
        raise InputDataError(
            code="outcome-missing",
            where="cohort",
            what="it has no outcome",
            accepted="a binary outcome",
            next_step="Name outcome and positive",
        )
    steps = plan.preparation.discovery
    if steps is None:
        steps = default_steps(guess_scale(cohort.values).kind)
    recipe = Recipe(
        steps, plan.preparation.log2_offset, plan.preparation.max_missing_share
    )
    section = plan.shortlist
    rules = ShortlistRules(
        threshold=section.threshold,
        false_markers=section.false_markers,
        markers_per_subsample=section.markers_per_subsample,
        candidates=section.candidates,
        companion_correlation=section.companion_correlation,
        n_penalties=section.n_penalties,
        penalty_floor=section.penalty_floor,
    )
    barred = barred_features(plan, cohort)
    data = ProcedureData(
        base=recipe.base(cohort.values),
        y=cohort.outcome.values,
        weights=cohort.design.weights,
        subjects=cohort.design.subject,
        barred=barred,
        always=feature_positions(
            cohort, section.always, f"{plan.path}, [shortlist], key 'always'"
        ),
    )
    usable = min(section.candidates, int((barred == "").sum()))
    sizes = tuple(size for size in plan.panels.sizes if size <= usable)
    if not sizes:
        raise StudyFileError(
            code="sizes-too-large",
            where=f"{plan.path}, [panels], key 'sizes'",
            what=f"every size is above {usable}",
            accepted=f"sizes up to {usable}, the number of candidates that there "
            "surely are",
            next_step="Name smaller sizes, or raise [shortlist] candidates",
        )
    finding = []
    if left := [size for size in plan.panels.sizes if size > usable]:
        finding.append(
            Finding(
                "sizes-left-out",
                "info",
                "[panels] sizes",
                f"sizes {', '.join(map(str, left))} are above the {usable} candidates "
                "that there surely are, and were left out",
                "Raise [shortlist] candidates to have them",
            )
        )
    return Procedure(recipe, rules, plan.panels.makers, sizes), data, finding


def _left_out(cohort: Cohort, selected: Selected) -> list[Dropped]:
    reasons = selected.view.state.reasons
    return [
        Dropped("feature", str(cohort.features[j]), "preparation", str(reasons[j]))
        for j in np.flatnonzero(reasons != "")
    ]


def _summarise(  # noqa: PLR0913 - everything that a report shows comes together here
    plan: Study,
    cohort: Cohort,
    record: RunRecord,
    findings: Findings,
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    selected: Selected,
    accuracy: HonestAccuracy,
    pricer: PanelPricer | None,
) -> RunSummary:
    confidence = plan.accuracy.confidence
    judge = Judge(data.y, data.subjects, draws.folds, confidence)
    frontier, per_fold = build_frontier(
        accuracy, judge, selected.panels, cohort.features, pricer
    )
    choice, frontier = choose(
        frontier, per_fold, accuracy, judge, plan.choice.primary is not None
    )
    costs: tuple[PanelCost, ...] = ()
    if pricer is not None:
        taken = {row.panel: row for row in frontier.rows}[choice.rules[0].panel]
        costs = pricer.costs(taken.markers)
    n_included = int(selected.view.included.sum())
    return RunSummary(
        study=plan.path.name,
        outcome=_outcome_words(cohort),
        n_samples=cohort.n_samples,
        n_subjects=cohort.design.n_subjects,
        n_features=cohort.n_features,
        scheme=_scheme(plan),
        preparation=procedure.recipe.steps,
        findings=findings,
        flow=cohort.flow,
        bound=selected.stability.bound,
        shortlist=shortlist_table(data, selected, cohort.features, confidence),
        frontier=frontier,
        choice=choice,
        comparators=compare(accuracy, judge, n_included),
        costs=costs,
        statement=plan.statement.model_dump(),
        provenance={
            "panelkit": record.panelkit,
            "seed": str(plan.seed),
            **{f"input: {role}": digest for role, digest in record.inputs.items()},
            **record.versions,
        },
    )


def _outcome_words(cohort: Cohort) -> str:
    outcome = cohort.outcome
    if outcome is None:
        return ""
    n_positive = int(outcome.values.sum())
    return (
        f"{outcome.column}: {outcome.positive} ({n_positive} samples) against "
        f"{outcome.negative} ({len(outcome.values) - n_positive})"
    )


def _scheme(plan: Study) -> str:
    section = plan.accuracy
    return (
        f"{section.folds} folds, drawn {section.repeats} times, stratified by outcome "
        "and grouped by subject; preparation, shortlist, candidates, panels, tuning "
        f"and coefficients learnt anew in every fold, with {section.inner_folds} inner "
        "folds for tuning and for the primary rule; area under the ROC curve within "
        "test folds, averaged"
    )
