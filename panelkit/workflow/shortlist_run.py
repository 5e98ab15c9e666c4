"""`run_shortlist`: files in, shortlist and candidates out; no panels, no prices."""

import hashlib
import os
import platform
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from panelkit.config import Study, read_study
from panelkit.costing import Selected
from panelkit.records import (
    RESEARCH_USE,
    Findings,
    NullShortlist,
    ShortlistResults,
)
from panelkit.report import render_shortlist
from panelkit.runtime import Listener, Progress, RunFolder, silent, thread_count
from panelkit.stability import (
    NullDesign,
    compare_selectors,
    describe_companions,
    record_convergence,
    set_agreement,
    shuffle_null,
    trace_paths,
)
from panelkit.workflow.check import CheckedStudy, checked
from panelkit.workflow.cohort import refuse_stops
from panelkit.workflow.marker_facts import marker_facts
from panelkit.workflow.recipes import preparation_tables
from panelkit.workflow.record import record_bytes, run_record
from panelkit.workflow.shortlist import shortlist_table
from panelkit.workflow.shortlist_tables import write_shortlist_tables
from panelkit.workflow.summary import left_out, outcome_words
from panelkit.workflow.tables import (
    plain,
    write_data_tables,
    write_replicates,
    write_shortlist,
)

__all__ = ["ShortlistRun", "run_shortlist", "shortlist_content"]


@dataclass(frozen=True, slots=True)
class ShortlistRun:
    """A finished shortlist; stands for its folder wherever a path is wanted.

    Attributes
    ----------
    path : Path
        The run folder.
    results : ShortlistResults
        What is shown.
    """

    path: Path
    results: ShortlistResults

    def __fspath__(self) -> str:
        return str(self.path)


def run_shortlist(
    study: "str | os.PathLike[str] | Study",
    out: "str | os.PathLike[str]",
    *,
    threads: int | None = None,
    listener: Listener = silent,
) -> ShortlistRun:
    """Shortlist markers of a study and write the folder, without panels or prices.

    The folder is that of `run_study`: running the whole job there goes on from it.

    Parameters
    ----------
    study : path or Study
        The study file.
    out : path
        The run folder: new, empty, or of this same study, whose finished shuffles are
        then used.
    threads : int, optional
        Threads; None takes every processor. No bit of a result depends on it.
    listener : callable
        Told of progress.

    Returns
    -------
    ShortlistRun
        Path of the folder and what was found.

    Raises
    ------
    StudyFileError, InputDataError, FitError, RunFolderError
        With exit codes 2, 3, 4 and 7.
    """
    plan = study if isinstance(study, Study) else read_study(Path(study))
    n_threads = thread_count(threads)
    started = time.time()
    listener(Progress("reading", 0, 1))
    known = checked(plan)
    refuse_stops(known.cohort.findings)
    listener(Progress("reading", 1, 1))
    listener(Progress("shortlist", 0, 1))
    selected = known.procedure.select(known.data, known.draws.everyone, n_threads)
    hashes = {**(known.cohort.sources or {}), **known.price_hashes}
    recipes = preparation_tables(known.procedure.recipe, known.procedure.assay)
    record = run_record(plan, hashes, recipes, len(known.cohort.openings))
    content = record_bytes(record)
    folder = RunFolder(Path(out))
    resumed = folder.claim(content)
    folder.log("shortlist resumed" if resumed else "shortlist started")
    listener(Progress("shortlist", 1, 1))
    null = _null(plan, known, selected, folder, content, n_threads, listener)
    listener(Progress("details", 0, 1))
    results = _results(plan, known, selected, null, n_threads)
    listener(Progress("details", 1, 1))
    dropped = [*known.cohort.dropped, *left_out(known.cohort, selected)]
    write_data_tables(folder, results.findings, dropped, known.cohort.flow)
    write_replicates(folder, known.cohort)
    write_shortlist(folder, results.shortlist)
    write_shortlist_tables(folder, results)
    for name, file in render_shortlist(results).items():
        folder.write(name, file)
    folder.log("shortlist finished")
    folder.json(
        "timings.json",
        {
            "started": time.strftime("%Y-%m-%dT%H:%M:%S%z", time.localtime(started)),
            "total": round(time.time() - started, 3),
            "threads": n_threads,
            "machine": platform.machine(),
            "system": platform.system(),
            "resumed": resumed,
        },
    )
    return ShortlistRun(folder.path, results)


def _null(
    plan: Study,
    known: CheckedStudy,
    selected: Selected,
    folder: RunFolder,
    content: bytes,
    threads: int,
    listener: Listener,
) -> NullShortlist | None:
    if not plan.shortlist.shuffles:
        return None
    data, design = known.data, known.cohort.design
    labels = (design.site, design.matched_set)
    return shuffle_null(
        selected.view,
        data.task.outcome(),
        known.draws.everyone.training,
        data.subjects,
        data.weights,
        known.procedure.rules,
        selected.stability,
        n_shuffles=plan.shortlist.shuffles,
        seed=plan.seed,
        inputs=hashlib.sha256(content).hexdigest(),
        store=folder.store(),
        family=data.task.family,
        design=NullDesign(
            within=tuple(each for each in labels if each is not None),
            pair_site=data.pair_site,
            matched_set=design.matched_set,
        ),
        threads=threads,
        listener=listener,
    )


def _results(
    plan: Study,
    known: CheckedStudy,
    selected: Selected,
    null: NullShortlist | None,
    threads: int,
) -> ShortlistResults:
    cohort, data, rules = known.cohort, known.data, known.procedure.rules
    stability, view = selected.stability, selected.view
    rows, pairs = known.draws.everyone.training, known.draws.everyone.pairs
    facts = marker_facts(plan, cohort)
    return ShortlistResults(
        study=plan.path.name,
        outcome=outcome_words(cohort),
        n_samples=cohort.n_samples,
        n_subjects=cohort.design.n_subjects,
        features=cohort.features,
        n_candidates_asked=rules.candidates,
        findings=Findings((*cohort.findings, *known.size_findings)).ordered(),
        bound=stability.bound,
        shortlist=shortlist_table(
            data, selected, cohort.features, plan.accuracy.confidence, facts
        ),
        paths=trace_paths(
            view,
            data.task.outcome(),
            data.weights,
            pairs,
            rules,
            family=data.task.family,
            threads=threads,
        ),
        convergence=record_convergence(stability, plan.shortlist.precision),
        companions=describe_companions(view, rows, stability),
        null=null,
        selectors=compare_selectors(
            view,
            data.task.outcome(),
            rows,
            data.subjects,
            data.weights,
            pairs,
            rules,
            threads,
            family=data.task.family,
        ),
        agreement=set_agreement(stability.picked[:, view.included]),
    )


def shortlist_content(run: ShortlistRun) -> dict[str, Any]:
    """Return a finished shortlist as plain values."""
    results = run.results
    table, bound, null = results.shortlist, results.bound, results.null
    return {
        "outcome": results.outcome,
        "samples": results.n_samples,
        "subjects": results.n_subjects,
        "features": len(results.features),
        "shortlist": [str(name) for name in table.feature[table.picked]],
        "candidates": [str(name) for name in table.feature[table.candidate]],
        "bound": {name: plain(getattr(bound, name)) for name in bound.__slots__},
        "top": {
            "feature": str(table.feature[0]),
            "frequency": float(table.frequency[0]),
        }
        if len(table.feature)
        else None,
        "shuffles": None
        if null is None
        else {
            "number": null.n_shuffles,
            "p_top": null.p_top,
            "p_length": null.p_length,
            "mean_length": float(null.length.mean()),
            "median_top": float(np.median(null.top_frequency)),
        },
        "agreement": plain(results.agreement.stability),
        "sentences": results.sentences(),
        "folder": str(run.path),
        "research_use": RESEARCH_USE,
    }
