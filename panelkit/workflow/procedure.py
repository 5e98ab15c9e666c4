"""What is repeated in every fold, as a study asks for it."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from panelkit.config import Study
from panelkit.costing import (
    BinaryTask,
    ClassesTask,
    Comparison,
    Draws,
    NumberTask,
    Procedure,
    ProcedureData,
    RandomPanels,
    Rule,
    SurvivalTask,
    Task,
    comparisons_for,
    draw_everything,
    given_folds,
    maker_named,
)
from panelkit.errors import InputDataError, StudyFileError
from panelkit.records import Cohort, Finding, FoldPlan, Outcome
from panelkit.runtime import generator
from panelkit.stability import ShortlistRules
from panelkit.workflow.cohort import barred_features, feature_positions
from panelkit.workflow.columns import coded_columns
from panelkit.workflow.marker_facts import allowed_candidates
from panelkit.workflow.recipes import assay_findings, context_of, recipes_of

__all__ = [
    "comparisons_of",
    "draws_of",
    "primary_rule",
    "procedure_of",
    "secondary_rules",
]


def procedure_of(
    plan: Study, cohort: Cohort
) -> tuple[Procedure, ProcedureData, list[Finding]]:
    """Return what is repeated in every fold, and the data it is repeated on.

    Parameters
    ----------
    plan : Study
        Recipe, rules, makers, sizes.
    cohort : Cohort
        With an outcome.

    Returns
    -------
    procedure : Procedure
        Sizes above the number of candidates are left out; none are left where no
        feature is usable, which a finding says.
    data : ProcedureData
        The matrix after the per-sample steps.
    findings : list of Finding
        What was left out.

    Raises
    ------
    InputDataError
        The cohort has no outcome, or not a feature that the study names.
    StudyFileError
        No size is possible.
    """
    if cohort.outcome is None:
        raise InputDataError(
            code="outcome-missing",
            where="cohort",
            what="it has no outcome",
            accepted="an outcome: outcome with positive, or time and event",
            next_step="Name outcome and positive",
        )
    context = context_of(cohort)
    recipe, assay = recipes_of(plan, cohort)
    for part in (recipe, assay):
        if part is not None:
            part.check(context)
    section = plan.shortlist
    rules = ShortlistRules(
        threshold=section.threshold,
        false_markers=section.false_markers,
        markers_per_subsample=section.markers_per_subsample,
        bound=section.bound,
        selector=section.selector,
        l1_share=section.l1_share,
        candidates=section.candidates,
        companion_correlation=section.companion_correlation,
        n_penalties=section.n_penalties,
        penalty_floor=section.penalty_floor,
    )
    for name in plan.panels.makers:
        maker_named(name)
    barred = barred_features(plan, cohort)
    always = feature_positions(
        cohort, section.always, f"{plan.path}, [shortlist], key 'always'"
    )
    if (barred[always] != "").any():
        first = always[barred[always] != ""][0]
        raise InputDataError(
            code="always-barred",
            where=f"{plan.path}, [shortlist], key 'always'",
            what=f"{cohort.features[first]} may not enter a panel: {barred[first]}",
            accepted="features that may be markers",
            next_step="Remove it, or change its role in the feature sheet",
        )
    data = ProcedureData(
        base=recipe.base(cohort.values),
        task=task_of(cohort.outcome),
        weights=cohort.design.weights,
        subjects=cohort.design.subject,
        barred=barred,
        always=always,
        covariates=coded_columns(cohort, plan.cohort.covariates),
        nuisance=coded_columns(cohort, plan.cohort.nuisance),
        controls=_controls(cohort),
        own=_own_list(plan, cohort, barred),
        context=context,
        values=None if assay is None else cohort.values,
        blocks=cohort.design.blocks,
        folds=_outer_folds(plan, cohort),
        allowed=allowed_candidates(plan, cohort),
        pair_site=_pair_site(plan, cohort),
    )
    free = (barred == "") & (True if data.allowed is None else data.allowed)
    usable = min(section.candidates, int(free.sum()))
    sizes = tuple(size for size in plan.panels.sizes if size <= usable)
    if not sizes and usable:  # without any feature a finding has said so
        raise StudyFileError(
            code="sizes-too-large",
            where=f"{plan.path}, [panels], key 'sizes'",
            what=f"every size is above {usable}",
            accepted=f"sizes up to {usable}, the number of candidates that there "
            "surely are",
            next_step="Name smaller sizes, or raise [shortlist] candidates",
        )
    finding = [] if assay is not None else assay_findings(recipe)
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
    procedure = Procedure(recipe, rules, plan.panels.makers, sizes, assay=assay)
    return procedure, data, finding


def _pair_site(plan: Study, cohort: Cohort) -> NDArray[np.object_] | None:
    """Return the sites by which halves are stratified, None where they are not.

    Raises
    ------
    StudyFileError
        Sites are asked for and none are named.
    """
    if not plan.shortlist.stratify_by_site:
        return None
    if cohort.design.site is None:
        raise StudyFileError(
            code="site-missing",
            where=f"{plan.path}, [shortlist], key 'stratify_by_site'",
            what="the study names no site",
            accepted="a column of the sample sheet as [cohort] site",
            next_step="Name it, or take the key out",
        )
    return cohort.design.site


def task_of(outcome: Outcome) -> Task:
    """Return what is predicted, and how predictions of it are judged."""
    if outcome.kind == "classes":
        return ClassesTask(outcome.values.astype(np.int64), outcome.classes)
    if outcome.kind == "number":
        return NumberTask(outcome.values)
    if outcome.event is not None:
        return SurvivalTask(outcome.values, outcome.event.astype(np.float64))
    return BinaryTask(outcome.values)


def _outer_folds(plan: Study, cohort: Cohort) -> FoldPlan | None:
    """Return the user's own folds, or one a site; None has them drawn.

    Raises
    ------
    StudyFileError
        Fewer than two sites, or everybody of a class at one of them.
    """
    site = cohort.design.site
    if plan.accuracy.leave_out is None or site is None:
        fold = cohort.design.fold
        return None if fold is None else given_folds(fold)
    sites, codes = np.unique(site.astype(str), return_inverse=True)
    units = cohort.design.blocks
    spread = [len(np.unique(codes[units == unit])) for unit in np.unique(units)]
    if len(sites) < 2 or max(spread) > 1:
        raise StudyFileError(
            code="sites-cannot-be-folds",
            where=f"{plan.path}, [accuracy], key 'leave_out'",
            what=f"{len(sites)} sites, {sum(n > 1 for n in spread)} people (or matched "
            "sets) at several of them",
            accepted="at least two sites, each person at one",
            next_step="Correct the sites, or draw folds instead",
        )
    return given_folds(codes.astype(np.int64))


def _own_list(
    plan: Study, cohort: Cohort, barred: NDArray[np.object_]
) -> NDArray[np.int64] | None:
    """Return the features of the maker ``own``.

    Raises
    ------
    InputDataError
        A marker that the cohort does not have, or that may not enter a panel.
    """
    if not plan.panels.own:
        return None
    where = f"{plan.path}, [panels], key 'own'"
    own = feature_positions(cohort, plan.panels.own, where)
    if (barred[own] != "").any():
        first = own[barred[own] != ""][0]
        raise InputDataError(
            code="own-barred",
            where=where,
            what=f"{cohort.features[first]} may not enter a panel: {barred[first]}",
            accepted="features that may be markers",
            next_step="Remove it, or change its role in the feature sheet",
        )
    return own


def _controls(cohort: Cohort) -> NDArray[np.int64]:
    """Return the control features of the feature sheet."""
    roles = cohort.feature_columns.get("role")
    if roles is None:
        return np.empty(0, np.int64)
    return np.flatnonzero(np.array([str(role) == "control" for role in roles]))


def draws_of(plan: Study, data: ProcedureData) -> Draws:
    """Return every fold and subsample that a study asks for.

    Parameters
    ----------
    plan : Study
        Seed, folds, repeats, subsamples.
    data : ProcedureData
        Outcome and subjects.

    Returns
    -------
    Draws
        Drawn before the first fit.

    Raises
    ------
    FitError
        Too few subjects in a class.
    """
    return draw_everything(
        data,
        seed=plan.seed,
        n_folds=plan.accuracy.folds,
        n_repeats=plan.accuracy.repeats,
        n_inner=plan.accuracy.inner_folds,
        subsamples=plan.shortlist.subsamples,
        inner_subsamples=plan.accuracy.inner_subsamples,
    )


def comparisons_of(
    plan: Study, procedure: Procedure, data: ProcedureData
) -> Sequence[Comparison]:
    """Return what is learnt beside the panels in every fold."""
    usable = np.flatnonzero(data.barred == "")
    random = RandomPanels.drawn(
        procedure.sizes,
        usable,
        plan.accuracy.random_panels,
        2 * plan.shortlist.candidates + len(data.always),
        generator(plan.seed, "random-panels"),
    )
    return comparisons_for(data, random)


def primary_rule(plan: Study) -> Rule:
    """Return the rule of the headline."""
    choice = plan.choice
    return Rule(
        choice.rule,
        margin=choice.demand("margin") or 0.0,
        budget=choice.demand("budget"),
        required_accuracy=choice.demand("required_accuracy"),
    )


def secondary_rules(plan: Study) -> list[Rule]:
    """Return the rules that are shown beside the primary one."""
    own = primary_rule(plan)
    names = ["smallest-within-one-se", "cheapest-within-one-se"]
    if own.margin:
        names += ["smallest-within-margin", "cheapest-within-margin"]
    if own.budget is not None:
        names.append("best-under-budget")
    if own.required_accuracy is not None:
        names.append("cheapest-above-accuracy")
    return [replace(own, name=name) for name in names]
