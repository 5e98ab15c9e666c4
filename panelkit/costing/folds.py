"""Folds: repeated, stratified by outcome, grouped by subject."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.records import FoldPlan
from panelkit.stability import unit_strata

__all__ = ["draw_folds", "given_folds"]


def given_folds(fold: NDArray[np.int64]) -> FoldPlan:
    """Return the user's own folds, once.

    Parameters
    ----------
    fold : ndarray of shape (n_samples,), int64
        Fold in which each sample is tested, 0 to n_folds - 1; checked when it was
        read.

    Returns
    -------
    FoldPlan
        One repeat: there is nothing to draw anew.
    """
    return FoldPlan(fold[None, :].astype(np.int64), int(fold.max()) + 1)


def draw_folds(
    units: NDArray[np.int64],
    strata: NDArray[np.int64],
    n_folds: int,
    generators: list[np.random.Generator],
) -> FoldPlan:
    """Draw repeated folds; a unit is never in training and test at once.

    Parameters
    ----------
    units : ndarray of shape (n_samples,), int64
        What stays together: the subject of each sample, or its matched set.
    strata : ndarray of shape (n_samples,), int64
        Labels kept in proportion, such as the outcome; a unit counts with the label of
        its first sample.
    n_folds : int
        Folds a repeat.
    generators : list of numpy.random.Generator
        One a repeat, from the seed tree.

    Returns
    -------
    FoldPlan
        Units of each stratum differ by at most one between folds.

    Raises
    ------
    FitError
        Fewer units than folds in a stratum.
    """
    members, holding = unit_strata(units, strata)
    smallest = int(holding.min())
    if n_folds < 2 or smallest < n_folds:
        raise FitError(
            code="too-few-for-folds",
            where="[accuracy] folds or inner_folds",
            what=f"{n_folds} folds for {smallest} subjects in the smaller class",
            accepted="at least 2 folds, and a subject of each class in every fold",
            next_step="Use fewer folds, or add subjects of the smaller class",
        )
    plan = np.empty((len(generators), len(strata)), np.int64)
    for repeat, generator in enumerate(generators):
        fold_of = np.empty(int(units.max()) + 1, np.int64)
        shift = 0
        for each in members:
            mixed = generator.permutation(each)
            fold_of[mixed] = (np.arange(len(mixed)) + shift) % n_folds
            shift += len(mixed)  # the strata's larger folds fall on different folds
        plan[repeat] = fold_of[units]
    return FoldPlan(plan, n_folds)
