"""A run's results as the report and the terminal show them."""

import numpy as np

from panelkit.config import Study
from panelkit.costing import (
    Draws,
    HonestAccuracy,
    Judge,
    PanelPricer,
    Primary,
    Procedure,
    ProcedureData,
    Selected,
    build_frontier,
    choose,
    compare,
)
from panelkit.records import (
    Aftermath,
    Cohort,
    Dropped,
    Findings,
    PanelCost,
    RunRecord,
    RunSummary,
)
from panelkit.workflow.fold_costs import costs_of_folds
from panelkit.workflow.marker_facts import marker_facts
from panelkit.workflow.procedure import secondary_rules
from panelkit.workflow.shortlist import shortlist_table

__all__ = ["left_out", "outcome_words", "summarise"]


def summarise(  # noqa: PLR0913 - everything that a report shows comes together here
    plan: Study,
    cohort: Cohort,
    record: RunRecord,
    findings: Findings,
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    selected: Selected,
    primary: Primary,
    accuracy: HonestAccuracy,
    pricer: PanelPricer | None,
    aftermath: Aftermath,
) -> RunSummary:
    """Return everything that a report shows of a run, ready-made.

    Raises
    ------
    InputDataError
        A price that is needed is missing.
    """
    confidence = plan.accuracy.confidence
    judge = Judge(data.task, data.subjects, data.weights, draws.folds, confidence)
    frontier, per_fold = build_frontier(
        accuracy, judge, selected.panels, cohort.features, pricer
    )
    choice, frontier = choose(
        frontier,
        per_fold,
        judge,
        primary=primary,
        secondary=secondary_rules(plan),
        currency="" if pricer is None else pricer.programme.currency,
    )
    costs: tuple[PanelCost, ...] = ()
    if pricer is not None:
        costs = pricer.costs(frontier.rows[primary.taken.row].markers)
    n_included = int(selected.view.included.sum())
    return RunSummary(
        study=plan.path.name,
        outcome=outcome_words(cohort),
        n_samples=cohort.n_samples,
        n_subjects=cohort.design.n_subjects,
        n_features=cohort.n_features,
        scheme=_scheme(plan, data, draws),
        confidence=confidence,
        preparation=procedure.recipe.words(),
        findings=findings,
        flow=cohort.flow,
        bound=selected.stability.bound,
        shortlist=shortlist_table(
            data,
            selected,
            cohort.features,
            confidence,
            marker_facts(plan, cohort),
        ),
        frontier=frontier,
        choice=choice,
        comparators=compare(accuracy, judge, primary, n_included),
        costs=costs,
        statement=plan.statement.model_dump(),
        provenance={
            "panelkit": record.panelkit,
            "seed": str(plan.seed),
            **{f"input: {role}": digest for role, digest in record.inputs.items()},
            **record.versions,
        },
        aftermath=aftermath,
        metric=data.task.metric,
        metric_words=data.task.metric_words,
        no_skill=data.task.no_skill,
        fold_costs=costs_of_folds(cohort, accuracy, primary, pricer),
    )


def left_out(cohort: Cohort, selected: Selected) -> list[Dropped]:
    """Return the features that the preparation left out, with the reasons."""
    reasons = selected.view.state.reasons
    return [
        Dropped("feature", str(cohort.features[j]), "preparation", str(reasons[j]))
        for j in np.flatnonzero(reasons != "")
    ]


def outcome_words(cohort: Cohort) -> str:
    """Return column, classes and their sizes, or what was measured."""
    outcome = cohort.outcome
    if outcome is None:
        return ""
    unit = f" {outcome.unit}" if outcome.unit else ""
    if outcome.kind == "classes":
        names, codes = outcome.groups
        sizes = np.bincount(codes, minlength=len(names))
        told = ", ".join(f"{n} ({k})" for n, k in zip(names, sizes, strict=True))
        return f"{outcome.column}: {told}"
    if outcome.kind == "number":
        low, high = float(outcome.values.min()), float(outcome.values.max())
        return f"{outcome.column}: {low:.4g} to {high:.4g}{unit}"
    if outcome.event is not None:
        return (
            f"{outcome.column}: {int(outcome.event.sum())} events among "
            f"{len(outcome.values)} samples, times up to "
            f"{float(outcome.values.max()):.4g}{unit}"
        )
    n_positive = int(outcome.values.sum())
    return (
        f"{outcome.column}: {outcome.positive} ({n_positive} samples) against "
        f"{outcome.negative} ({len(outcome.values) - n_positive})"
    )


def _scheme(plan: Study, data: ProcedureData, draws: Draws) -> str:
    section = plan.accuracy
    if section.leave_out is not None:
        outer = (
            f"{draws.folds.n_folds} folds, each a {section.leave_out} of the column "
            f"{plan.cohort.site!r}"
        )
    elif plan.cohort.folds is None:
        outer = (
            f"{section.folds} folds, drawn {section.repeats} times, stratified by "
            "outcome and grouped by subject"
        )
        if plan.cohort.matched_set is not None:
            outer += " and matched set"
    else:
        outer = (
            f"{draws.folds.n_folds} folds given by the column {plan.cohort.folds!r} of "
            "the sample sheet"
        )
    return (
        f"{outer}; preparation, shortlist, candidates, panels, tuning "
        f"and coefficients learnt anew in every fold, with {section.inner_folds} inner "
        f"folds ({section.inner_subsamples} subsamples in each) for tuning and for the "
        f"primary rule; every subject counts once; {data.task.metric_words} within "
        "test folds, averaged"
    )
