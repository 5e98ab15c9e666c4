"""Folds: repeated, stratified by outcome, grouped by subject."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.records import FoldPlan

__all__ = ["draw_folds"]


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
        Subject of each sample.
    y : ndarray of shape (n_samples,)
        Outcome, 0 and 1; a subject counts with the class of its first sample.
    n_folds : int
        Folds a repeat.
    generators : list of numpy.random.Generator
        One a repeat, from the seed tree.

    Returns
    -------
    FoldPlan
        Subjects of each class differ by at most one between folds.

    Raises
    ------
    FitError
        Fewer subjects than folds in a class.
    """
    own, first = np.unique(subjects, return_index=True)
    classes = [own[y[first] == value] for value in (0.0, 1.0)]
    smallest = min(len(members) for members in classes)
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
        fold_of = np.empty(int(own.max()) + 1, np.int64)
        shift = 0
        for members in classes:
            mixed = generator.permutation(members)
            fold_of[mixed] = (np.arange(len(mixed)) + shift) % n_folds
            shift += len(mixed)  # the classes' larger folds fall on different folds
        plan[repeat] = fold_of[subjects]
    return FoldPlan(plan, n_folds)
