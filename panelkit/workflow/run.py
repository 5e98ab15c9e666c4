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

from panelkit.config import Study, read_study
from panelkit.costing import estimate_accuracy, tune_on_everyone
from panelkit.errors import NoPanelError
from panelkit.records import (
    RESEARCH_USE,
    Findings,
    RunSummary,
)
from panelkit.report import render
from panelkit.runtime import Listener, Progress, RunFolder, silent, thread_count
from panelkit.workflow.aftermath import learn_aftermath, write_aftermath
from panelkit.workflow.check import checked
from panelkit.workflow.cohort import refuse_stops
from panelkit.workflow.lock import write_panels
from panelkit.workflow.primary import primary_of
from panelkit.workflow.procedure import comparisons_of
from panelkit.workflow.recipes import preparation_tables
from panelkit.workflow.record import record_bytes, run_record, without_prices
from panelkit.workflow.summary import left_out, summarise
from panelkit.workflow.tables import (
    choice_content,
    frontier_content,
    write_accuracy,
    write_data_tables,
    write_replicates,
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
    known = checked(plan)
    cohort, pricer = known.cohort, known.pricer
    procedure, data, draws = known.procedure, known.data, known.draws
    reading = round(time.time() - started, 3)
    refuse_stops(cohort.findings)
    listener(Progress("reading", 1, 1))
    listener(Progress("shortlist", 0, 1))
    start = time.perf_counter()
    selected = procedure.select(data, draws.everyone, n_threads)
    if pricer is not None:  # a price that is missing is told before the long work
        for panel in selected.panels:
            pricer.costs([str(cohort.features[j]) for j in panel])
    record = run_record(
        plan,
        {**(cohort.sources or {}), **known.price_hashes},
        preparation_tables(procedure.recipe, procedure.assay),
        len(cohort.openings),
    )
    content = record_bytes(record)
    folder = RunFolder(Path(out))
    resumed = folder.claim(content, without_prices)
    clock = _Clock(folder, listener)
    clock.seconds["reading"] = reading
    clock.seconds["shortlist"] = round(time.perf_counter() - start, 3)
    folder.log("resumed" if resumed else "started")
    listener(Progress("shortlist", 1, 1))
    findings = Findings((*cohort.findings, *known.size_findings)).ordered()
    dropped = [*cohort.dropped, *left_out(cohort, selected)]
    write_data_tables(folder, findings, dropped, cohort.flow)
    write_replicates(folder, cohort)
    work = without_prices(content)
    inputs, store = hashlib.sha256(work).hexdigest(), folder.store()
    how: dict[str, Any] = {"threads": n_threads, "listener": listener}
    start = time.perf_counter()
    everyone = tune_on_everyone(procedure, data, draws, inputs, store, **how)
    clock.seconds["choice"] = round(time.perf_counter() - start, 3)
    start = time.perf_counter()
    accuracy = estimate_accuracy(
        procedure,
        data,
        draws,
        inputs,
        store,
        comparisons=comparisons_of(plan, procedure, data),
        **how,
    )
    clock.seconds["accuracy"] = round(time.perf_counter() - start, 3)
    folder.log(f"accuracy: {clock.seconds['accuracy']:.2f} s")
    primary = primary_of(plan, known, selected, everyone, accuracy)
    start = time.perf_counter()
    aftermath = learn_aftermath(
        plan, known, selected, primary, accuracy, inputs, store, how
    )
    clock.seconds["stand-ins and learning curve"] = round(
        time.perf_counter() - start, 3
    )
    with clock.stage("pricing and choice"):
        summary = summarise(
            plan, cohort, record, findings, procedure, data, draws, selected,
            primary, accuracy, pricer, aftermath,
        )  # fmt: skip
        write_accuracy(
            folder, cohort, draws.folds, accuracy, primary, data.task, pricer
        )
        write_results(folder, summary)
        write_aftermath(folder, aftermath)
    with clock.stage("locking"):
        write_panels(
            folder, plan, known, selected, everyone, accuracy, primary,
            (summary, aftermath), content,
        )  # fmt: skip
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
    if not primary.taken.met:
        first = summary.choice.rules[0]
        raise NoPanelError(
            code="no-panel-meets-rule",
            where=f"{plan.path}, [choice], rule {first.rule}",
            what=first.sentence.split(". ")[0],
            accepted="a demand that a panel of the study meets",
            next_step=f"Read {folder.path / 'report.html'}; change the demand or offer "
            "other panels",
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
