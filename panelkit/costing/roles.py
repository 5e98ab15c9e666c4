"""What a panel loses with each of its markers, by role inside the outer folds.

The printed panel's own markers cannot be judged on the cohort that chose them. So each
outer fold's own panel, made by the same maker at the same size, loses the marker in
each role in turn, and what that costs is measured on the fold's test rows.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.honest_accuracy import Draws, HonestAccuracy
from panelkit.costing.makers import Evidence, maker_named
from panelkit.costing.procedure import CandidateFacts, Procedure
from panelkit.costing.refits import columns_of
from panelkit.fits import fit_panels
from panelkit.preparation import DesignView
from panelkit.records import OutOfFold
from panelkit.runtime import (
    BlockResult,
    BlockStore,
    Listener,
    StageKey,
    map_blocks,
    silent,
)

__all__ = ["VARIANTS", "RoleLosses", "closest_companion", "learn_roles", "refill"]

VARIANTS = ("lost-refitted", "lost-imputed", "refilled", "companion")
"""The marker is lost and the rest refitted; lost and set to its training mean; replaced
by what the maker would take without it; replaced by its closest companion."""
TILE = 4096


@dataclass(frozen=True, slots=True, eq=False)
class RoleLosses:
    """Out-of-fold predictions of panels that lost a marker.

    Attributes
    ----------
    predictions : mapping of (str, int) to OutOfFold
        By variant and role, role 0 the maker's first choice.
    replaced_by : ndarray of shape (n_variants, n_roles, n_repeats, n_folds), int64
        The feature that came in, -1 for none.
    """

    predictions: Mapping[tuple[str, int], OutOfFold]
    replaced_by: NDArray[np.int64]


def refill(
    evidence: Evidence, maker: str, panel: NDArray[np.int64], feature: int
) -> NDArray[np.int64]:
    """Return the panel that the maker takes where one of its markers is forbidden.

    Parameters
    ----------
    evidence : Evidence
        What was learnt on the training rows; frequencies are not learnt again.
    maker : str
        Name of the maker.
    panel : ndarray of int64
        Its panel with the marker.
    feature : int
        The marker that cannot be had.

    Returns
    -------
    ndarray of int64
        As many markers where there are candidates enough.
    """
    return maker_named(maker)(evidence.without(feature), [len(panel)])[0]


def closest_companion(
    view: DesignView,
    panel: NDArray[np.int64],
    feature: int,
    rows: NDArray[np.int64],
) -> tuple[int, float]:
    """Return the feature outside a panel that is most correlated with a marker.

    Parameters
    ----------
    view : DesignView
        Preparation learnt on the rows.
    panel : ndarray of int64
        Its markers cannot stand in.
    feature : int
        The marker.
    rows : ndarray of int64
        Training rows.

    Returns
    -------
    companion : int
        Of equals the first column; -1 where no other feature varies.
    correlation : float
        Pearson, with its sign.
    """
    own = view.column(feature, rows)
    own = own - own.mean()
    length = float(np.sqrt((own**2).sum()))
    best, found = -1, 0.0
    everything = np.flatnonzero(view.included)
    everything = everything[~np.isin(everything, panel)]
    for start in range(0, len(everything), TILE):
        features = everything[start : start + TILE]
        values = view.columns(features, rows)
        values -= values.mean(axis=1, keepdims=True)
        lengths = np.sqrt((values**2).sum(axis=1)) * length
        with np.errstate(invalid="ignore", divide="ignore"):
            r = np.where(lengths > 0.0, (values * own).sum(axis=1) / lengths, 0.0)
        place = int(np.abs(r).round(12).argmax()) if len(r) else 0
        if len(r) and abs(r[place]) > abs(found) + 1e-12:
            best, found = int(features[place]), float(r[place])
    return best, found


def learn_roles(  # noqa: PLR0913 - what was learnt, and how work runs
    procedure: Procedure,
    data: ProcedureData,
    draws: Draws,
    accuracy: HonestAccuracy,
    row: int,
    inputs: str,
    store: BlockStore,
    *,
    threads: int = 1,
    listener: Listener = silent,
) -> RoleLosses:
    """Take each marker from each fold's panel in turn and predict the test rows.

    Parameters
    ----------
    procedure, data, draws, inputs, store, threads, listener
        As for `estimate_accuracy`.
    accuracy : HonestAccuracy
        Each fold's panels, and what its makers were given.
    row : int
        Which maker and size.

    Returns
    -------
    RoleLosses
        Predictions by variant and role.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """
    panels = accuracy.members[row]

    def task(place: tuple[int, int]) -> BlockResult:
        repeat, fold = place
        panel = panels.members[repeat, fold]
        return _of_fold(
            procedure,
            data,
            draws.splits[place],
            accuracy.facts[place],
            panels.maker,
            panel[panel >= 0],
            panels.size,
            float(panels.penalty[repeat, fold]),
        )

    names = {f"{repeat}-{fold}": (repeat, fold) for repeat, fold in draws.splits}
    blocks = map_blocks(
        task,
        names,
        StageKey(f"roles-{panels.maker}-{panels.size}", inputs),
        store,
        threads=threads,
        listener=listener,
    )
    folds = draws.folds
    shape = (folds.n_repeats, *data.task.predictors, data.n_samples)
    predicted = np.full((len(VARIANTS), panels.size, *shape), np.nan)
    replaced = np.full(
        (len(VARIANTS), panels.size, folds.n_repeats, folds.n_folds), -1, np.int64
    )
    for repeat, fold in np.ndindex(folds.n_repeats, folds.n_folds):
        block = blocks[f"{repeat}-{fold}"]
        test = folds.split(repeat, fold)[1]
        predicted[:, :, repeat, ..., test] = np.moveaxis(block["predicted"], -1, 0)
        replaced[:, :, repeat, fold] = block["replaced by"]
    return RoleLosses(
        {
            (variant, role): OutOfFold(variant, role, predicted[v, role])
            for v, variant in enumerate(VARIANTS)
            for role in range(panels.size)
        },
        replaced,
    )


def _of_fold(
    procedure: Procedure,
    data: ProcedureData,
    split: Split,
    facts: CandidateFacts,
    maker: str,
    panel: NDArray[np.int64],
    size: int,
    penalty: float,
) -> BlockResult:
    _state, view = procedure.recipe.prepare(
        data.base, split.training, data.barred, data.context
    )
    evidence = procedure.evidence(facts, view, data, split.training)
    shape = (len(VARIANTS), size, *data.task.predictors, len(split.test))
    predicted = np.full(shape, np.nan)
    replaced = np.full((len(VARIANTS), size), -1, np.int64)
    fewer, refilled, swapped = [], [], []
    for role, feature in enumerate(panel):
        fewer.append(panel[panel != feature])
        instead = refill(evidence, maker, panel, int(feature))
        refilled.append(instead)
        came = instead[~np.isin(instead, panel)]
        replaced[2, role] = came[0] if len(came) else -1
        companion, _r = closest_companion(view, panel, int(feature), split.training)
        replaced[3, role] = companion
        swapped.append(
            panel[panel != feature]
            if companion < 0
            else np.where(panel == feature, companion, panel)
        )
    roles = len(panel)
    both = [*fewer, *refilled, *swapped]
    grid = np.full((len(both), 1), penalty)
    found = procedure.predict(view, data, split, grid, both)[:, 0]
    predicted[0, :roles] = found[:roles]
    predicted[2, :roles] = found[roles : 2 * roles]
    predicted[3, :roles] = found[2 * roles :]
    predicted[1, :roles] = _imputed(procedure, view, data, split, panel, penalty)
    return {"predicted": predicted, "replaced by": replaced}


def _imputed(
    procedure: Procedure,
    view: DesignView,
    data: ProcedureData,
    split: Split,
    panel: NDArray[np.int64],
    penalty: float,
) -> NDArray[np.float64]:
    """Return predictions by the whole panel's model with each marker at its mean."""
    features = np.sort(panel)
    markers = procedure.markers(view, data, split.training)
    columns = columns_of(markers, features, data, split)
    fits = fit_panels(
        columns.taught,
        [np.searchsorted(features, panel)],
        data.task.outcome(split.training),
        data.weights[split.training],
        np.array([penalty]),
        family=data.task.family,
    )
    found = []
    for role in range(len(panel)):
        without = columns.tested.copy()
        without[np.searchsorted(features, panel[role])] = 0.0  # the training mean
        found.append(fits.linear_predictors(without)[0, 0])
    return np.array(found)
