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
    subjects: NDArray[np.int64],
    y: NDArray[np.float64],
    n_folds: int,
    generators: list[np.random.Generator],
) -> FoldPlan:
    """Draw repeated folds; a subject is never in training and test at once.

    Parameters
    ----------
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample, or the matched set that holds its subject.
    y : ndarray of shape (n_samples,)
        Outcome, 0 and 1; units that hold both classes are spread on their own.
    n_folds : int
        Folds a repeat.
    generators : list of numpy.random.Generator
        One a repeat, from the seed tree.

    Returns
    -------
    FoldPlan
        Units of one class, and units of both, differ by at most one between folds.

    Raises
    ------
    FitError
        Fewer subjects than folds in a class.
    """
    classes, holding = unit_strata(subjects, y)
    smallest = int(holding.min())
    if n_folds < 2 or smallest < n_folds:
        raise FitError(
            code="too-few-for-folds",
            where="[accuracy] folds or inner_folds",
            what=f"{n_folds} folds for {smallest} subjects in the smaller class",
            accepted="at least 2 folds, and a subject of each class in every fold",
            next_step="Use fewer folds, or add subjects of the smaller class",
        )
    plan = np.empty((len(generators), len(y)), np.int64)
    for repeat, generator in enumerate(generators):
        fold_of = np.empty(int(subjects.max()) + 1, np.int64)
        shift = 0
        for members in classes:
            mixed = generator.permutation(members)
            fold_of[mixed] = (np.arange(len(mixed)) + shift) % n_folds
            shift += len(mixed)  # the classes' larger folds fall on different folds
        plan[repeat] = fold_of[subjects]
    return FoldPlan(plan, n_folds)
