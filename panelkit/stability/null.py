"""What the same selection shortlists when nothing is to be found in this cohort."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError, UsageError
from panelkit.fits import Family
from panelkit.metrics import false_discovery_adjusted
from panelkit.records import MatrixSource, NullShortlist, Stability
from panelkit.runtime import (
    BlockResult,
    BlockStore,
    Listener,
    StageKey,
    generator,
    map_blocks,
    silent,
)
from panelkit.stability.selection import ShortlistRules, select_markers
from panelkit.stability.subsamples import draw_pairs, outcome_strata

__all__ = [
    "EACH_FEATURE_FROM",
    "NullDesign",
    "permutation_p",
    "shuffle_null",
    "shuffled_outcome",
]

EACH_FEATURE_FROM: Final = 1000  # shuffles from which every feature gets a p-value
BLOCK: Final = 5  # shuffles that are remembered together


@dataclass(frozen=True, slots=True, eq=False)
class NullDesign:
    """How people may be shuffled and halved.

    Attributes
    ----------
    within : tuple of ndarray of shape (n_samples,)
        Labels (site, stratum, matched set) inside whose combinations outcomes are
        shuffled; none for everybody with everybody.
    pair_site : ndarray of shape (n_samples,), or None
        Site by which halves are stratified.
    matched_set : ndarray of shape (n_samples,), int64, or None
        Matched set of each sample, -1 for none.
    """

    within: tuple[NDArray[Any], ...] = ()
    pair_site: NDArray[Any] | None = None
    matched_set: NDArray[np.int64] | None = None


def permutation_p(
    observed: NDArray[np.float64], null: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return p-values by shuffles: (1 + how many reach the observed) / (1 + shuffles).

    Parameters
    ----------
    observed : ndarray of any shape
        Larger is stronger.
    null : ndarray of shape (n_shuffles,)
        Of the shuffles.

    Returns
    -------
    ndarray of the shape of `observed`
        Never 0.

    References
    ----------
    Phipson & Smyth 2010, Statistical Applications in Genetics and Molecular Biology
    9:39. With the largest of all features in each shuffle it holds for all at once:
    Westfall & Young 1993, Resampling-Based Multiple Testing.
    """
    ordered = np.sort(null)
    reached = len(null) - np.searchsorted(ordered, np.asarray(observed) - 1e-12, "left")
    return np.asarray((1.0 + reached) / (1.0 + len(null)), np.float64)


def shuffled_outcome(
    outcome: Any,
    family: str,
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    within: tuple[NDArray[Any], ...],
    draws: np.random.Generator,
) -> Any:
    """Return the outcome with people shuffled; a person's rows keep one outcome.

    Parameters
    ----------
    outcome : ndarray of shape (n_samples,), or (time, event)
        As `fit_paths` takes it; time and event stay together.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        Kind of outcome.
    rows : ndarray of int64
        Rows whose people are shuffled; other rows keep theirs.
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample; it has the outcome of its first row.
    within : tuple of ndarray of shape (n_samples,)
        Labels inside whose combinations people change places.
    draws : numpy.random.Generator
        From the seed tree.

    Returns
    -------
    ndarray of shape (n_samples,), or (time, event)
        The same outcomes, with other people.

    Raises
    ------
    FitError
        No two people with different outcomes may change places.
    """
    parts = outcome if family == "cox" else (outcome,)
    parts = tuple(np.asarray(part) for part in parts)
    _, first, unit = np.unique(subjects[rows], return_index=True, return_inverse=True)
    blocks = np.zeros(len(first), np.int64)
    for labels in within:
        code = np.unique(np.asarray(labels)[rows][first], return_inverse=True)[1]
        blocks = blocks * (int(code.max()) + 1) + code
    own = [part[rows][first] for part in parts]
    place = np.arange(len(first))
    free = False
    for block in np.unique(blocks):
        here = np.flatnonzero(blocks == block)
        free = free or any(len(np.unique(part[here])) > 1 for part in own)
        place[here] = draws.permutation(here)
    if not free:
        raise FitError(
            code="nothing-to-shuffle",
            where="shuffles of the shortlist",
            what="no two people of one site, stratum and matched set differ in outcome",
            accepted="at least one such pair of people",
            next_step="Set [shortlist] shuffles = 0",
        )
    moved = []
    for part, values in zip(parts, own, strict=True):
        changed = part.copy()
        changed[rows] = values[place][unit.ravel()]
        moved.append(changed)
    return tuple(moved) if family == "cox" else moved[0]


def shuffle_null(  # noqa: PLR0913 - data, rules and how work runs: each is one thing
    source: MatrixSource,
    y: Any,
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
    rules: ShortlistRules,
    observed: Stability,
    *,
    n_shuffles: int,
    seed: int,
    inputs: str,
    store: BlockStore,
    family: Family = "binomial",
    design: NullDesign | None = None,
    threads: int = 1,
    listener: Listener = silent,
) -> NullShortlist:
    """Repeat the selection with people shuffled, anew drawn halves included.

    Parameters
    ----------
    source, y, rows, subjects, weights, rules, family
        As for `select_markers`. The preparation has not seen the outcome, so it stays.
    observed : Stability
        Of the real outcome, with as many pairs as every shuffle gets.
    n_shuffles : int
        At least 1; p-values are at least 1 / (n_shuffles + 1).
    seed : int
        Root of the seed tree.
    inputs : str
        Hash of everything that determines the results.
    store : BlockStore
        Where finished blocks of shuffles are kept.
    design : NullDesign, optional
        Within what people are shuffled and how halves are drawn.
    threads : int
        Blocks at work at the same time.
    listener : callable
        Told of each finished block.

    Returns
    -------
    NullShortlist
        Lengths and top frequencies of the shuffles, p-values.

    Raises
    ------
    UsageError
        No shuffle is asked for.
    FitError
        A fit that is not possible, or nothing that could be shuffled.

    References
    ----------
    Phipson & Smyth 2010, SAGMB 9:39; Westfall & Young 1993 (largest statistic).
    """
    if n_shuffles < 1:
        raise UsageError(
            code="no-shuffles",
            where="n_shuffles",
            what=f"too few (got {n_shuffles})",
            accepted="at least 1",
            next_step="Ask for 50 or more",
        )
    how = NullDesign() if design is None else design
    each = n_shuffles >= EACH_FEATURE_FROM
    n_pairs = observed.bound.n_pairs

    def shuffle(number: int) -> Stability:
        moved = shuffled_outcome(
            y, family, rows, subjects, how.within, generator(seed, "shuffle", number)
        )
        plan = draw_pairs(
            rows,
            subjects,
            outcome_strata(moved, family),
            n_pairs,
            generator(seed, "shuffle-pairs", number),
            site=how.pair_site,
            matched_set=how.matched_set,
        )
        return select_markers(
            source, moved, rows, subjects, weights, plan, rules, family=family
        )

    def task(numbers: range) -> BlockResult:
        reached = np.zeros(len(observed.frequency) if each else 0, np.int64)
        rest = []
        for number in numbers:
            found = shuffle(number)
            rest.append(
                (
                    len(found.shortlist),
                    found.frequency.max(),
                    max(found.group_frequency.max(), found.frequency.max()),
                )
            )
            if each:
                reached += found.frequency >= observed.frequency - 1e-12
        return {"rest": np.array(rest, np.float64), "reached": reached}

    blocks = map_blocks(
        task,
        {
            str(start): range(start, min(start + BLOCK, n_shuffles))
            for start in range(0, n_shuffles, BLOCK)
        },
        StageKey("shuffles", f"{inputs} {n_shuffles}" if each else inputs),
        store,
        threads=threads,
        listener=listener,
    )
    return _assemble(observed, source.included, blocks, each)


def _assemble(
    observed: Stability,
    included: NDArray[np.bool_],
    blocks: Mapping[str, BlockResult],
    each: bool,
) -> NullShortlist:
    rest = np.concatenate([block["rest"] for block in blocks.values()])
    top, top_group = rest[:, 1], rest[:, 2]
    n_shuffles = len(rest)
    real = float(observed.frequency.max())
    real_group = max(real, float(observed.group_frequency.max()))
    feature_p, feature_q = (np.full(len(observed.frequency), np.nan) for _ in "pq")
    if each:
        reached = np.array([block["reached"] for block in blocks.values()])
        feature_p[:] = (1.0 + reached.sum(axis=0)) / (1.0 + n_shuffles)
        feature_q[included] = false_discovery_adjusted(feature_p[included])
    length = rest[:, 0].astype(np.int64)
    size = len(observed.shortlist)
    return NullShortlist(
        length=length,
        top_frequency=top,
        top_group_frequency=top_group,
        observed_length=size,
        observed_top=real,
        observed_top_group=real_group,
        p_top=float(permutation_p(np.array(real), top)),
        p_top_group=float(permutation_p(np.array(real_group), top_group)),
        p_length=float(permutation_p(np.array(float(size)), rest[:, 0])),
        adjusted_p=permutation_p(observed.frequency, top),
        feature_p=feature_p,
        feature_q=feature_q,
    )
