"""Honest accuracy: the whole procedure learnt again in every fold."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.folds import draw_folds
from panelkit.costing.procedure import Procedure, ProcedureData, Split
from panelkit.records import FoldPanels, FoldPlan, OutOfFold, TunedChoice
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
    "Draws",
    "HonestAccuracy",
    "choose_for_everyone",
    "draw_everything",
    "estimate_accuracy",
]

PRIMARY = "primary-rule"
RIDGE = "ridge-on-all"


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
    """

    folds: FoldPlan
    splits: Mapping[tuple[int, int], Split]
    everyone: Split


@dataclass(frozen=True, slots=True, eq=False)
class HonestAccuracy:
    """Out-of-fold predictions and what each fold chose.

    Attributes
    ----------
    panels : tuple of OutOfFold
        One a maker and size, makers first.
    primary : OutOfFold
        Maker and size chosen by the primary rule inside each training set.
    ridge : OutOfFold
        Ridge on all features.
    members : tuple of FoldPanels
        The panels, in the order of `panels`.
    chosen : TunedChoice
        What the primary rule chose in each fold.
    """

    panels: tuple[OutOfFold, ...]
    primary: OutOfFold
    ridge: OutOfFold
    members: tuple[FoldPanels, ...]
    chosen: TunedChoice


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
    seed : int
        Root of the tree.
    n_folds, n_repeats, n_inner : int
        Outer folds and their repeats, unless the data bring folds; inner folds.
    subsamples, inner_subsamples : int
        Halves of the stability selection, outside and inside inner folds.

    Returns
    -------
    Draws
        Everything that is random in a run.

    Raises
    ------
    FitError
        Too few subjects in a class.
    """
    y, units = data.y, data.units

    def split(
        training: NDArray[np.int64], test: NDArray[np.int64], *place: str | int
    ) -> Split:
        inner = _inner_splits(
            data, training, seed, place, n_inner, inner_subsamples // 2
        )
        pairs = draw_pairs(
            training,
            units,
            y,
            subsamples // 2,
            generator(seed, "subsamples", *place),
        )
        return Split(training, test, pairs, inner)

    folds = data.folds
    if folds is None:
        draws = [generator(seed, "folds", repeat) for repeat in range(n_repeats)]
        folds = draw_folds(units, y, n_folds, draws)
    everyone = split(np.arange(len(y)), np.empty(0, np.int64), "everyone")
    splits = {
        (repeat, fold): split(*folds.split(repeat, fold), "fold", repeat, fold)
        for repeat in range(folds.n_repeats)
        for fold in range(folds.n_folds)
    }
    return Draws(folds, splits, everyone)


def _inner_splits(
    data: ProcedureData,
    training: NDArray[np.int64],
    seed: int,
    place: tuple[str | int, ...],
    n_inner: int,
    n_pairs: int,
) -> tuple[Split, ...]:
    own = np.unique(data.units[training], return_inverse=True)[1]
    plan = draw_folds(
        own, data.y[training], n_inner, [generator(seed, "inner-folds", *place)]
    )
    splits = []
    for fold in range(n_inner):
        teach, test = (training[rows] for rows in plan.split(0, fold))
        draws = generator(seed, "inner-subsamples", *place, fold)
        pairs = draw_pairs(teach, data.units, data.y, n_pairs, draws)
        splits.append(Split(teach, test, pairs))
    return tuple(splits)


def estimate_accuracy(
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    inputs: str,
    store: BlockStore,
    *,
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

    def task(split: Split) -> BlockResult:
        learnt = procedure.learn(data, split)
        members = np.full((len(learnt.selected.panels), width), -1, np.int64)
        for row, panel in zip(members, learnt.selected.panels, strict=True):
            row[: len(panel)] = panel
        return {
            "log_odds": learnt.log_odds,
            "members": members,
            "penalties": learnt.penalties,
            "chosen": np.array(learnt.chosen, np.int64),
            "ridge": procedure.ridge_on_all(data, split, learnt.selected.view),
        }

    names = {
        f"{repeat}-{fold}": split for (repeat, fold), split in draws.splits.items()
    }
    blocks = map_blocks(
        task,
        names,
        StageKey("accuracy", inputs),
        store,
        threads=threads,
        listener=listener,
    )
    return _assemble(procedure, draws.folds, blocks)


def choose_for_everyone(
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    inputs: str,
    store: BlockStore,
    *,
    threads: int = 1,
    listener: Listener = silent,
) -> int:
    """Return which panel the primary rule takes when all samples teach.

    The inner folds of all samples choose maker and size, as those of every training set
    do for the headline.

    Parameters
    ----------
    procedure, data, draws, inputs, store, threads, listener
        As for `estimate_accuracy`.

    Returns
    -------
    int
        Position among the panels, makers first.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """

    def task(split: Split) -> BlockResult:
        tuning = procedure.tune(data, split, threads)
        chosen = procedure.choose(tuning, len(split.inner))
        return {"chosen": np.array(chosen, np.int64)}

    blocks = map_blocks(
        task,
        {"everyone": draws.everyone},
        StageKey("choice", inputs),
        store,
        listener=listener,
    )
    maker, size = blocks["everyone"]["chosen"]
    return int(maker * len(procedure.sizes) + size)


def _assemble(
    procedure: Procedure, folds: FoldPlan, blocks: Mapping[str, BlockResult]
) -> HonestAccuracy:
    n_samples = folds.test_fold.shape[1]
    kinds = [(maker, size) for maker in procedure.makers for size in procedure.sizes]
    n_sizes = len(procedure.sizes)
    grid = (folds.n_repeats, folds.n_folds)
    log_odds = np.empty((len(kinds), folds.n_repeats, n_samples))
    primary, ridge = (np.empty((folds.n_repeats, n_samples)) for _ in range(2))
    members = np.empty((len(kinds), *grid, max(procedure.sizes)), np.int64)
    penalties = np.empty((len(kinds), *grid))
    chosen = np.empty((2, *grid), np.int64)
    for repeat in range(folds.n_repeats):
        for fold in range(folds.n_folds):
            block = blocks[f"{repeat}-{fold}"]
            test = folds.split(repeat, fold)[1]
            log_odds[:, repeat, test] = block["log_odds"]
            ridge[repeat, test] = block["ridge"]
            maker, size = block["chosen"]
            primary[repeat, test] = block["log_odds"][maker * n_sizes + size]
            members[:, repeat, fold] = block["members"]
            penalties[:, repeat, fold] = block["penalties"]
            chosen[:, repeat, fold] = maker, procedure.sizes[size]
    return HonestAccuracy(
        panels=tuple(
            OutOfFold(maker, size, log_odds[p]) for p, (maker, size) in enumerate(kinds)
        ),
        primary=OutOfFold(PRIMARY, 0, primary),
        ridge=OutOfFold(RIDGE, 0, ridge),
        members=tuple(
            FoldPanels(maker, size, members[p, ..., :size], penalties[p])
            for p, (maker, size) in enumerate(kinds)
        ),
        chosen=TunedChoice(chosen[0], chosen[1]),
    )
