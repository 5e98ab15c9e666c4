"""How the headline would stand with fewer people: what more people may bring."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.frontier import Judge
from panelkit.costing.honest_accuracy import DrawRules, Draws, draw_split
from panelkit.costing.primary import curve_of_folds
from panelkit.costing.procedure import Procedure
from panelkit.costing.rules import Rule, pick
from panelkit.errors import FitError
from panelkit.metrics import CrossValidated, corrected_se, paired_interval
from panelkit.records import FoldPlan, LearningPoint, OutOfFold
from panelkit.runtime import (
    BlockResult,
    BlockStore,
    Listener,
    StageKey,
    generator,
    map_blocks,
    silent,
)
from panelkit.stability import unit_strata

__all__ = ["SHARES", "learning_curve"]

SHARES = (0.4, 0.6, 0.8)
"""Shares of the training subjects, beside all of them."""


def thinned(
    split: Split,
    data: ProcedureData,
    share: float,
    place: tuple[str | int, ...],
    rules: DrawRules,
) -> Split:
    """Return a fold whose training subjects are thinned within each stratum.

    Raises
    ------
    FitError
        Too few subjects are left.
    """
    training = split.training
    strata, _ = unit_strata(data.units[training], data.task.strata[training])
    draws = generator(rules.seed, "learning-curve", *place)
    kept: list[NDArray[np.int64]] = []
    for units in strata:
        members = draws.permutation(units)
        kept.append(members[: max(1, round(share * len(members)))])
    rows = training[np.isin(data.units[training], np.concatenate(kept))]
    # as many halves as inside the inner folds: a curve needs no finer frequencies
    fewer = replace(rules, subsamples=rules.inner_subsamples)
    return draw_split(data, rows, split.test, ("learning-curve", *place), fewer)


def learning_curve(  # noqa: PLR0913 - what was learnt, and how work runs
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    rule: Rule,
    whole: OutOfFold,
    judge: Judge,
    inputs: str,
    store: BlockStore,
    *,
    threads: int = 1,
    listener: Listener = silent,
) -> tuple[LearningPoint, ...]:
    """Repeat the nested figure with fewer training subjects.

    The first repeat's folds are used: the test rows stay the same, the training
    subjects are thinned within each class, and everything is learnt and chosen again.

    Parameters
    ----------
    procedure, data, draws, inputs, store, threads, listener
        As for `estimate_accuracy`.
    rule : Rule
        The primary rule; where it weighs money, the most accurate panel is taken
        instead.
    whole : OutOfFold
        The primary rule's predictions with all training subjects.
    judge : Judge
        Outcome, subjects, folds.

    Returns
    -------
    tuple of LearningPoint
        Ascending; the last one is all training subjects. Shares that leave too few
        people to learn from are left out.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """
    folds = FoldPlan(draws.folds.test_fold[:1], draws.folds.n_folds)
    plain = Rule("smallest-within-one-se") if rule.needs_prices else rule
    splits: dict[str, Split] = {}
    shares = []
    for share in SHARES:
        try:
            splits |= {
                f"{share:g}-{fold}": thinned(
                    draws.splits[0, fold],
                    data,
                    share,
                    (round(100 * share), fold),
                    draws.rules,
                )
                for fold in range(folds.n_folds)
            }
        except FitError:  # too few people are left to halve or to fold
            continue
        shares.append(share)

    def task(split: Split) -> BlockResult:
        learnt = procedure.learn(data, split)
        metric = learnt.tuning.metric.reshape(len(split.inner), -1)
        taken = pick(plain, curve_of_folds(procedure, metric))
        return {"predicted": learnt.predicted[taken.row]}

    blocks = map_blocks(
        task,
        splits,
        StageKey("learning-curve", inputs),
        store,
        threads=threads,
        listener=listener,
    )
    thin: list[tuple[float, float, CrossValidated]] = []
    first = Judge(data.task, data.subjects, data.weights, folds, judge.confidence)
    for share in shares:
        predicted = np.full((1, *data.task.predictors, data.n_samples), np.nan)
        n_subjects = []
        for fold in range(folds.n_folds):
            name = f"{share:g}-{fold}"
            test = folds.split(0, fold)[1]
            predicted[0][..., test] = blocks[name]["predicted"]
            n_subjects.append(len(np.unique(data.subjects[splits[name].training])))
        one = OutOfFold("learning-curve", 0, predicted)
        thin.append((share, float(np.mean(n_subjects)), first.metric(one)))
    everyone = float(
        np.mean(
            [
                len(np.unique(data.subjects[draws.splits[0, fold].training]))
                for fold in range(folds.n_folds)
            ]
        )
    )
    all_of_them = first.metric(OutOfFold("learning-curve", 0, whole.predicted[:1]))
    points = [_point(*each, first, all_of_them) for each in thin]
    return (*points, _point(1.0, everyone, all_of_them, first, None))


def _point(
    share: float,
    n_subjects: float,
    found: CrossValidated,
    judge: Judge,
    whole: CrossValidated | None,
) -> LearningPoint:
    """Return a point; with what the whole has beyond it, unless it is the whole."""
    gain = (float("nan"),) * 3
    if whole is not None:
        gain = paired_interval(
            (whole.per_fold - found.per_fold).ravel(),
            judge.test_to_train,
            judge.confidence,
        )
    return LearningPoint(
        share,
        float(n_subjects),
        found.mean,
        found.low,
        found.high,
        corrected_se(found.per_fold, judge.test_to_train),
        *gain,
    )
