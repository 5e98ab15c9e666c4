"""Complementary pairs: two halves of the subjects, stratified by outcome."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.records import SubsamplePlan
from panelkit.stability.units import unit_strata

__all__ = ["draw_pairs"]

SMALLEST_CLASS = 4  # subjects: two in each half


def draw_pairs(
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    y: NDArray[np.float64],
    n_pairs: int,
    generator: np.random.Generator,
) -> SubsamplePlan:
    """Draw complementary pairs of subsamples of the given rows.

    Within each class half of the subjects go to either side with all their rows; the
    odd one of a class, drawn by chance, sits out that pair.

    Parameters
    ----------
    rows : ndarray of int64
        Rows that may be used (a fold's training rows).
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample, or the matched set that holds its subject.
    y : ndarray of shape (n_samples,)
        Outcome, 0 and 1; units that hold both classes are halved on their own.
    n_pairs : int
        Number of pairs.
    generator : numpy.random.Generator
        From the seed tree.

    Returns
    -------
    SubsamplePlan
        2 * n_pairs subsamples.

    Raises
    ------
    FitError
        Fewer than four subjects in a class.

    References
    ----------
    Meinshausen & Buhlmann 2010, JRSS-B 72:417; Shah & Samworth 2013, JRSS-B 75:55.
    Stratified halves are outside the independent sampling of their theorems.
    """
    classes, holding = unit_strata(subjects[rows], y[rows])
    smallest = int(holding.min())
    if smallest < SMALLEST_CLASS:
        raise FitError(
            code="too-few-for-halves",
            where="subsamples of a training set (inner folds included)",
            what=f"{smallest} subjects of a class cannot be halved",
            accepted=f"at least {SMALLEST_CLASS} subjects of each class in every "
            "training set",
            next_step="Set more folds and inner_folds, so that training sets are "
            "larger, or add people of the smaller class",
        )
    halves: list[NDArray[np.int64]] = []
    for _pair in range(n_pairs):
        left: list[NDArray[np.int64]] = []
        right: list[NDArray[np.int64]] = []
        for members in classes:
            mixed = generator.permutation(members)
            half = len(mixed) // 2
            left.append(mixed[:half])
            right.append(mixed[half : 2 * half])
        halves.extend(
            rows[np.isin(subjects[rows], np.concatenate(side))]
            for side in (left, right)
        )
    return SubsamplePlan(tuple(halves))
