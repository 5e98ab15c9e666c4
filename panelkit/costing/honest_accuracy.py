"""Honest accuracy: the whole procedure learnt again in every fold."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.comparisons import Comparison, FoldWork
from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.folds import draw_folds
from panelkit.costing.procedure import CandidateFacts, Procedure
from panelkit.records import FoldPanels, FoldPlan, OutOfFold, SubsamplePlan
from panelkit.runtime import (
    BlockResult,
    BlockStore,
    Listener,
    StageKey,
    generator,
    map_blocks,
    silent,
)
from panelkit.stability import draw_pairs

__all__ = [
    "DrawRules",
    "Draws",
    "Everyone",
    "HonestAccuracy",
    "draw_everything",
    "draw_split",
    "estimate_accuracy",
    "tune_on_everyone",
]

PREDICTED = "predicted "  # names of blocks' arrays that hold predictions of others
FIGURE = "figure "
FACT = "fact "


@dataclass(frozen=True, slots=True)
class DrawRules:
    """How folds and subsamples are drawn.

    Attributes
    ----------
    seed : int
        Root of the seed tree.
    n_folds, n_repeats, n_inner : int
        Outer folds, their repeats, inner folds.
    subsamples, inner_subsamples : int
        Halves of the stability selection, outside and inside inner folds.
    """

    seed: int
    n_folds: int
    n_repeats: int
    n_inner: int
    subsamples: int
    inner_subsamples: int


@dataclass(frozen=True, slots=True, eq=False)
class Draws:
    """Every fold and subsample of a run, drawn before the first fit.

    Attributes
    ----------
    folds : FoldPlan
        Outer folds.
    splits : mapping of (repeat, fold) to Split
        Each outer fold with its pairs and inner folds.
    everyone : Split
        All rows teach, none is tested: for the printed panels.
    rules : DrawRules
        How they were drawn.
    """

    folds: FoldPlan
    splits: Mapping[tuple[int, int], Split]
    everyone: Split
    rules: DrawRules


@dataclass(frozen=True, slots=True, eq=False)
class HonestAccuracy:
    """Out-of-fold predictions, and what each fold's training rows said of the curve.

    Attributes
    ----------
    panels : tuple of OutOfFold
        One a maker and size, makers first.
    members : tuple of FoldPanels
        The panels, in the order of `panels`.
    inner_metric : ndarray of shape (n_repeats, n_folds, n_inner, n_panels)
        The metric in the inner folds of each training set.
    others : mapping of str to OutOfFold
        Predictions of what is compared.
    figures : mapping of str to ndarray of shape (n_repeats, n_folds, ...)
        Further figures of each fold.
    facts : mapping of (repeat, fold) to CandidateFacts
        What the makers of each fold were given.
    """

    panels: tuple[OutOfFold, ...]
    members: tuple[FoldPanels, ...]
    inner_metric: NDArray[np.float64]
    others: Mapping[str, OutOfFold]
    figures: Mapping[str, NDArray[np.float64]]
    facts: Mapping[tuple[int, int], CandidateFacts]


@dataclass(frozen=True, slots=True, eq=False)
class Everyone:
    """What the inner folds of all samples say.

    Attributes
    ----------
    metric : ndarray of shape (n_inner, n_panels)
        The metric in each inner fold.
    penalties : ndarray of shape (n_panels,)
        Ridge penalty of each panel learnt on all samples.
    """

    metric: NDArray[np.float64]
    penalties: NDArray[np.float64]


def draw_everything(
    data: ProcedureData,
    *,
    seed: int,
    n_folds: int,
    n_repeats: int,
    n_inner: int,
    subsamples: int,
    inner_subsamples: int,
) -> Draws:
    """Draw all folds and subsamples of a run from its seed tree.

    Parameters
    ----------
    data : ProcedureData
        Outcome and subjects are used, no value of the matrix.
    seed, n_folds, n_repeats, n_inner, subsamples, inner_subsamples : int
        As in `DrawRules`.

    Returns
    -------
    Draws
        Everything that is random in a run.

    Raises
    ------
    FitError
        Too few subjects in a class.
    """
    rules = DrawRules(seed, n_folds, n_repeats, n_inner, subsamples, inner_subsamples)
    folds = data.folds
    if folds is None:
        draws = [generator(seed, "folds", repeat) for repeat in range(n_repeats)]
        folds = draw_folds(data.units, data.task.strata, n_folds, draws)
    nobody = np.empty(0, np.int64)
    return Draws(
        folds,
        {
            (repeat, fold): draw_split(
                data, *folds.split(repeat, fold), ("fold", repeat, fold), rules
            )
            for repeat in range(folds.n_repeats)
            for fold in range(folds.n_folds)
        },
        draw_split(data, np.arange(data.n_samples), nobody, ("everyone",), rules),
        rules,
    )


def draw_split(
    data: ProcedureData,
    training: NDArray[np.int64],
    test: NDArray[np.int64],
    place: tuple[str | int, ...],
    rules: DrawRules,
) -> Split:
    """Draw the pairs and inner folds of some training rows.

    Parameters
    ----------
    data : ProcedureData
        Outcome and subjects are used.
    training, test : ndarray of int64
        Rows.
    place : tuple of str or int
        Where in the seed tree.
    rules : DrawRules
        How many of each.

    Returns
    -------
    Split
        With everything that is random in it.

    Raises
    ------
    FitError
        Too few subjects in a class.
    """
    own = np.unique(data.units[training], return_inverse=True)[1]
    plan = draw_folds(
        own,
        data.task.strata[training],
        rules.n_inner,
        [generator(rules.seed, "inner-folds", *place)],
    )

    def pairs(rows: NDArray[np.int64], halves: int, *where: str | int) -> SubsamplePlan:
        return draw_pairs(
            rows,
            data.units,
            data.task.strata,
            halves // 2,
            generator(rules.seed, *where),
            site=data.pair_site,
        )

    inner = []
    for fold in range(rules.n_inner):
        teach, judged = (training[rows] for rows in plan.split(0, fold))
        halves = pairs(teach, rules.inner_subsamples, "inner-subsamples", *place, fold)
        inner.append(Split(teach, judged, halves))
    own_pairs = pairs(training, rules.subsamples, "subsamples", *place)
    return Split(training, test, own_pairs, tuple(inner))


def estimate_accuracy(
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    inputs: str,
    store: BlockStore,
    *,
    comparisons: Sequence[Comparison] = (),
    threads: int = 1,
    listener: Listener = silent,
) -> HonestAccuracy:
    """Learn the whole procedure in every fold and predict the rows left out.

    Parameters
    ----------
    procedure : Procedure
        What is repeated.
    data : ProcedureData
        What it is repeated on.
    draws : Draws
        Folds and subsamples.
    inputs : str
        Hash of everything that determines the results.
    store : BlockStore
        Where finished folds are kept.
    comparisons : sequence of Comparison
        What else is learnt on the same folds.
    threads : int
        Folds at work at the same time.
    listener : callable
        Told of each finished fold.

    Returns
    -------
    HonestAccuracy
        Predictions for every sample and repeat; no model saw the sample's subject.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """
    width = max(procedure.sizes)

    def task(place: tuple[int, int]) -> BlockResult:
        split = draws.splits[place]
        learnt = procedure.learn(data, split)
        members = np.full((len(learnt.selected.panels), width), -1, np.int64)
        for row, panel in zip(members, learnt.selected.panels, strict=True):
            row[: len(panel)] = panel
        found: dict[str, NDArray[Any]] = {
            "predicted": learnt.predicted,
            "members": members,
            "penalties": learnt.penalties,
            **_stored(CandidateFacts.of(learnt.selected.stability)),
            "inner metric": learnt.tuning.metric.reshape(len(split.inner), -1),
        }
        work = FoldWork(procedure, data, split, learnt, repeat=place[0])
        for comparison in comparisons:
            learnt_too = comparison(work)
            for name, predicted in learnt_too.predicted.items():
                found[PREDICTED + name] = predicted
            for name, figure in learnt_too.figures.items():
                found[FIGURE + name] = figure
        return found

    names = {f"{repeat}-{fold}": (repeat, fold) for repeat, fold in draws.splits}
    blocks = map_blocks(
        task,
        names,
        StageKey("accuracy", inputs),
        store,
        threads=threads,
        listener=listener,
    )
    return _assemble(procedure, data, draws.folds, blocks)


def tune_on_everyone(
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    inputs: str,
    store: BlockStore,
    *,
    threads: int = 1,
    listener: Listener = silent,
) -> Everyone:
    """Return what the inner folds of all samples say of each maker and size.

    They choose and tune the printed panels as those of every training set do for the
    headline.

    Parameters
    ----------
    procedure, data, draws, inputs, store, threads, listener
        As for `estimate_accuracy`.

    Returns
    -------
    Everyone
        Metric and penalties.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """
    n_inner = len(draws.everyone.inner)

    def task(split: Split) -> BlockResult:
        tuning = procedure.tune(data, split, threads)
        return {
            "metric": tuning.metric.reshape(n_inner, -1),
            "penalties": procedure.penalties(tuning, n_inner),
        }

    block = map_blocks(
        task,
        {"everyone": draws.everyone},
        StageKey("choice", inputs),
        store,
        listener=listener,
    )["everyone"]
    return Everyone(block["metric"], block["penalties"])


def _stored(facts: CandidateFacts) -> dict[str, NDArray[Any]]:
    """Return facts as arrays of a block."""
    return {
        f"{FACT}{field.name}": getattr(facts, field.name) for field in fields(facts)
    }


def _facts_of(block: BlockResult) -> CandidateFacts:
    return CandidateFacts(
        **{each.name: block[f"{FACT}{each.name}"] for each in fields(CandidateFacts)}
    )


def _assemble(
    procedure: Procedure,
    data: ProcedureData,
    folds: FoldPlan,
    blocks: Mapping[str, BlockResult],
) -> HonestAccuracy:
    kinds = procedure.kinds
    grid = (folds.n_repeats, folds.n_folds)
    lead = data.task.predictors
    shape = (folds.n_repeats, *lead, data.n_samples)
    first = blocks["0-0"]
    predicted = np.full((len(kinds), *shape), np.nan)
    others = {
        name.removeprefix(PREDICTED): np.full(shape, np.nan)
        for name in first
        if name.startswith(PREDICTED)
    }
    members = np.empty((len(kinds), *grid, max(procedure.sizes)), np.int64)
    penalties = np.empty((len(kinds), *grid))
    for repeat, fold in np.ndindex(*grid):
        block = blocks[f"{repeat}-{fold}"]
        test = folds.split(repeat, fold)[1]
        predicted[:, repeat, ..., test] = np.moveaxis(block["predicted"], -1, 0)
        for name, array in others.items():
            array[repeat, ..., test] = np.moveaxis(block[PREDICTED + name], -1, 0)
        members[:, repeat, fold] = block["members"]
        penalties[:, repeat, fold] = block["penalties"]

    def gathered(name: str) -> NDArray[np.float64]:
        rows = [
            [blocks[f"{repeat}-{fold}"][name] for fold in range(folds.n_folds)]
            for repeat in range(folds.n_repeats)
        ]
        return np.array(rows)

    return HonestAccuracy(
        panels=tuple(
            OutOfFold(maker, size, predicted[p])
            for p, (maker, size) in enumerate(kinds)
        ),
        members=tuple(
            FoldPanels(maker, size, members[p, ..., :size], penalties[p])
            for p, (maker, size) in enumerate(kinds)
        ),
        inner_metric=gathered("inner metric"),
        others={name: OutOfFold(name, 0, array) for name, array in others.items()},
        figures={
            name.removeprefix(FIGURE): gathered(name)
            for name in first
            if name.startswith(FIGURE)
        },
        facts={
            place: _facts_of(blocks[f"{place[0]}-{place[1]}"])
            for place in np.ndindex(*grid)
        },
    )
