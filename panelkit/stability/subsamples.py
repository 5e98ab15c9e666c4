"""Complementary pairs: two halves of the subjects, stratified by outcome."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from panelkit.errors import FitError
from panelkit.records import SubsamplePlan

__all__ = ["draw_pairs", "outcome_strata", "resampling_units"]

SMALLEST_CLASS = 4  # units: two in each half


def outcome_strata(outcome: Any, family: str) -> NDArray[Any]:
    """Return what halves are stratified by.

    Parameters
    ----------
    outcome : ndarray of shape (n_samples,), or (time, event)
        As `fit_paths` takes it.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        Kind of outcome.

    Returns
    -------
    ndarray of shape (n_samples,)
        Classes; events for survival; zeros for a number.
    """
    if family == "cox":
        return np.asarray(outcome[1], np.float64)
    if family == "gaussian":
        return np.zeros(len(outcome))
    return np.asarray(outcome)


def resampling_units(
    subjects: NDArray[np.int64], matched_set: NDArray[np.int64] | None = None
) -> NDArray[np.int64]:
    """Return what goes to a half as a whole: subjects, joined by matched sets.

    Parameters
    ----------
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample.
    matched_set : ndarray of shape (n_samples,), int64, optional
        Matched set of each sample, -1 for none.

    Returns
    -------
    ndarray of shape (n_samples,), int64
        Code of each sample's unit. Sets that share a subject are one unit.
    """
    own = np.unique(subjects, return_inverse=True)[1].astype(np.int64)
    if matched_set is None:
        return own
    n_subjects = int(own.max()) + 1
    inside = matched_set >= 0
    codes = np.unique(matched_set[inside], return_inverse=True)[1] + n_subjects
    n_nodes = n_subjects + (int(codes.max()) + 1 - n_subjects if len(codes) else 0)
    links = coo_array(
        (np.ones(len(codes)), (own[inside], codes)), shape=(n_nodes, n_nodes)
    )
    labels = connected_components(links, directed=False)[1]
    return np.asarray(labels[own], np.int64)


def draw_pairs(
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    y: NDArray[Any],
    n_pairs: int,
    generator: np.random.Generator,
    *,
    site: NDArray[Any] | None = None,
    matched_set: NDArray[np.int64] | None = None,
    smallest_class: int = SMALLEST_CLASS,
) -> SubsamplePlan:
    """Draw complementary pairs of subsamples of the given rows.

    Within each class half of the subjects go to either side with all their rows; the
    odd one of a class, drawn by chance, sits out that pair. Matched sets go as a whole;
    those that hold several classes are halved on their own, by make-up. With sites,
    each half also gets its share of every site, as far as odd numbers allow.

    Parameters
    ----------
    rows : ndarray of int64
        Rows that may be used (a fold's training rows).
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample, or whatever else stays whole.
    y : ndarray of shape (n_samples,)
        Stratum of the outcome (`outcome_strata`).
    n_pairs : int
        Number of pairs.
    generator : numpy.random.Generator
        From the seed tree.
    site : ndarray of shape (n_samples,), optional
        Site of each sample; a unit counts with that of its first row.
    matched_set : ndarray of shape (n_samples,), int64, optional
        Matched set of each sample, -1 for none; joins subjects.
    smallest_class : int
        Fewest units of a class.

    Returns
    -------
    SubsamplePlan
        2 * n_pairs subsamples.

    Raises
    ------
    FitError
        Fewer than four subjects (or matched sets) in a class.

    References
    ----------
    Meinshausen & Buhlmann 2010, JRSS-B 72:417; Shah & Samworth 2013, JRSS-B 75:55.
    Stratified halves are outside the independent sampling of their theorems.
    """
    units = resampling_units(subjects, matched_set)[rows]
    strata, holding = _strata(rows, units, y, site)
    smallest = int(holding.min())
    if smallest < smallest_class:
        raise FitError(
            code="too-few-for-halves",
            where="subsamples of a training set (inner folds included)",
            what=f"{smallest} subjects of a class cannot be halved",
            accepted=f"at least {smallest_class} subjects (or matched sets) of each "
            "class in every training set",
            next_step="Set more folds and inner_folds, so that training sets are "
            "larger, or add people of the smaller class",
        )
    halves: list[NDArray[np.int64]] = []
    for _pair in range(n_pairs):
        left: list[NDArray[np.int64]] = []
        right: list[NDArray[np.int64]] = []
        for parts in strata:
            for side, chosen in zip(
                (left, right), _halved(parts, generator), strict=True
            ):
                side.append(chosen)
        halves.extend(
            rows[np.isin(units, np.concatenate(side))] for side in (left, right)
        )
    return SubsamplePlan(tuple(halves))


def _halved(
    parts: Sequence[NDArray[np.int64]], generator: np.random.Generator
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Halve each part; the odd ones of all parts are halved together."""
    left, right, odd = [], [], []
    for members in parts:
        mixed = generator.permutation(members)
        half = len(mixed) // 2
        left.append(mixed[:half])
        right.append(mixed[half : 2 * half])
        odd.append(mixed[2 * half :])
    if len(parts) > 1:
        mixed = generator.permutation(np.concatenate(odd))
        half = len(mixed) // 2
        left.append(mixed[:half])
        right.append(mixed[half : 2 * half])
    return np.concatenate(left), np.concatenate(right)


def _strata(
    rows: NDArray[np.int64],
    units: NDArray[np.int64],
    y: NDArray[Any],
    site: NDArray[Any] | None,
) -> tuple[list[list[NDArray[np.int64]]], NDArray[np.int64]]:
    """Return units by class and within it by site, and how many hold each class.

    Units that hold several classes (matched sets) are a stratum of their own, its parts
    by site and make-up.
    """
    own, first, place = np.unique(units, return_index=True, return_inverse=True)
    classes = np.unique(y[rows], return_inverse=True)[1]
    n_classes = int(classes.max()) + 1
    make_up = np.zeros((len(own), n_classes), np.int64)
    np.add.at(make_up, (place.ravel(), classes), 1)
    mixed = (make_up > 0).sum(axis=1) > 1
    label = np.where(mixed, n_classes, classes[first])
    part = np.zeros(len(own), np.int64)
    if site is not None:
        part = np.unique(np.asarray(site)[rows][first], return_inverse=True)[1]
    kinds = np.unique(make_up, axis=0, return_inverse=True)[1].ravel()
    part = np.where(mixed, part * (int(kinds.max()) + 1) + kinds, part)
    strata = [
        [
            own[(label == value) & (part == each)]
            for each in np.unique(part[label == value])
        ]
        for value in np.unique(label)
    ]
    return strata, (make_up > 0).sum(axis=0)
