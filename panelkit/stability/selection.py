"""Stability selection: which markers are picked again and again."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SHORTLIST
from panelkit.errors import InputDataError
from panelkit.fits import Univariate, fit_paths, rank_univariate
from panelkit.records import (
    ErrorBound,
    MatrixSource,
    PathSet,
    Stability,
    SubsamplePlan,
)
from panelkit.stability.bounds import markers_for, worst_case_bound
from panelkit.stability.companions import group_companions, group_frequencies

__all__ = ["ShortlistRules", "select_markers"]

POOL = 400  # features that are grouped: the most frequent and the most different
Z_95 = 1.959963984540054


@dataclass(frozen=True, slots=True)
class ShortlistRules:
    """How markers are shortlisted; the study file's [shortlist] section.

    Attributes
    ----------
    threshold : float
        Selection frequency from which a feature is shortlisted.
    false_markers : float
        Tolerated expected number of low-chance features in the shortlist.
    markers_per_subsample : int or None
        Given: `false_markers` follows from it. None: it follows from
        `false_markers`, at most half the rows of a subsample.
    candidates : int
        Companion groups, and univariate features, that become candidates.
    companion_correlation : float
        Smallest absolute correlation of companions.
    n_penalties : int
        Penalties of each path.
    penalty_floor : float
        Last penalty relative to the largest.
    """

    threshold: float = SHORTLIST.threshold
    false_markers: float = SHORTLIST.false_markers
    markers_per_subsample: int | None = None
    candidates: int = SHORTLIST.candidates
    companion_correlation: float = SHORTLIST.companion_correlation
    n_penalties: int = SHORTLIST.n_penalties
    penalty_floor: float = SHORTLIST.penalty_floor


def select_markers(  # noqa: PLR0913 - data, plan, rules: each is one thing
    source: MatrixSource,
    y: NDArray[np.float64],
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    rules: ShortlistRules,
    always: NDArray[np.int64] | None = None,
    threads: int = 1,
) -> Stability:
    """Repeat L1 fits over subsamples and say which features come back.

    Parameters
    ----------
    source : MatrixSource
        Prepared matrix; its `included` features enter every subsample.
    y : ndarray of shape (n_samples,)
        Outcome, 0 and 1.
    rows : ndarray of int64
        Training rows; the plan's rows are among them.
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample.
    weights : ndarray of shape (n_samples,)
        Observation weights.
    plan : SubsamplePlan
        Complementary pairs.
    rules : ShortlistRules
        Threshold, tolerated false markers, number of candidates.
    always : ndarray of int64, optional
        Features that are candidates whatever happens.
    threads : int
        Threads of the engine; no bit of the result depends on it.

    Returns
    -------
    Stability
        Frequencies, bound, shortlist, candidates.

    Raises
    ------
    InputDataError
        No feature passes the filter.
    FitError
        A subsample with one class, or a refit that did not converge.
    StudyFileError
        Rules that no number of markers can satisfy.

    References
    ----------
    Meinshausen & Buhlmann 2010, JRSS-B 72:417; Shah & Samworth 2013, JRSS-B 75:55.
    """
    n_included = int(source.included.sum())
    if not n_included:
        raise InputDataError(
            code="no-usable-feature",
            where="expression matrix",
            what="no feature passes the filter on the training rows",
            accepted="features that vary and are measured",
            next_step="Look at the findings of `panelkit check`",
        )
    asked = _markers_asked(rules, n_included, plan)
    paths = fit_paths(
        source,
        y,
        subsamples=plan.rows,
        n_penalties=rules.n_penalties,
        penalty_floor=rules.penalty_floor,
        max_markers=asked,
        weights=weights,
        threads=threads,
    )
    univariate = rank_univariate(source, y, rows, subjects, weights)
    frequency, low, high = _frequencies(paths)
    pool = _pool(frequency, univariate, always)
    group, group_frequency = _companions(source, rows, paths, pool, rules)
    realised = float(np.mean([len(picks) for picks in paths.entry_order]))
    ranked = np.lexsort((np.arange(len(frequency)), -np.abs(univariate.t), -frequency))
    return Stability(
        frequency=frequency,
        low=low,
        high=high,
        positive_share=_positive_share(paths),
        picks=paths.entry_order,
        bound=ErrorBound(
            rules.threshold,
            asked,
            realised,
            n_included,
            worst_case_bound(realised, rules.threshold, n_included),
        ),
        shortlist=ranked[frequency[ranked] >= rules.threshold - 1e-12],
        candidates=_candidates(
            ranked, group, group_frequency, univariate, rules, always
        ),
        group=group,
        group_frequency=group_frequency,
        t=univariate.t,
    )


def _markers_asked(rules: ShortlistRules, n_included: int, plan: SubsamplePlan) -> int:
    if rules.markers_per_subsample is not None:
        return rules.markers_per_subsample
    # A path saturates when its subsample separates: later picks are path order only.
    ceiling = max(1, min(len(rows) for rows in plan.rows) // 2)
    return min(ceiling, markers_for(rules.false_markers, rules.threshold, n_included))


def _frequencies(
    paths: PathSet,
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return frequency and a Wilson-type interval with pairs as units.

    The variance of a pair average gives the effective number of independent draws,
    at least one and at most two a pair.
    """
    picked = paths.ever_selected
    n_pairs = len(picked) // 2
    frequency = picked.mean(axis=0)
    pairs = 0.5 * (picked[0::2].astype(np.int8) + picked[1::2])
    spread = pairs.var(axis=0, ddof=1) if n_pairs > 1 else np.zeros(len(frequency))
    single = frequency * (1.0 - frequency)
    with np.errstate(invalid="ignore", divide="ignore"):
        draws = np.where(spread > 0.0, single / spread, 1.0)
    n = n_pairs * np.clip(draws, 1.0, 2.0)
    z2 = Z_95**2
    centre = (frequency + z2 / (2.0 * n)) / (1.0 + z2 / n)
    half = Z_95 * np.sqrt(single / n + z2 / (4.0 * n**2)) / (1.0 + z2 / n)
    low = np.minimum(np.clip(centre - half, 0.0, 1.0), frequency)
    high = np.maximum(np.clip(centre + half, 0.0, 1.0), frequency)
    return frequency, low, high


def _positive_share(paths: PathSet) -> NDArray[np.float64]:
    """Return the share of picks with a positive coefficient at the last penalty."""
    positive = np.zeros(paths.n_features)
    negative = np.zeros(paths.n_features)
    for features, values, picks in zip(
        paths.coefficient_features,
        paths.coefficient_values,
        paths.entry_order,
        strict=True,
    ):
        # a feature's last stored value decides; later assignments win
        last = np.zeros(paths.n_features)
        last[features] = values
        positive[picks] += last[picks] > 0
        negative[picks] += last[picks] < 0
    with np.errstate(invalid="ignore"):
        return positive / (positive + negative)


def _pool(
    frequency: NDArray[np.float64],
    univariate: Univariate,
    always: NDArray[np.int64] | None,
) -> NDArray[np.int64]:
    """Return the features worth grouping, in column order."""
    often = np.argsort(-frequency, kind="stable")[: POOL // 2]
    forced = np.empty(0, np.int64) if always is None else always
    return np.unique(
        np.concatenate(
            [often[frequency[often] > 0.0], univariate.order[: POOL // 2], forced]
        )
    )


def _companions(
    source: MatrixSource,
    rows: NDArray[np.int64],
    paths: PathSet,
    pool: NDArray[np.int64],
    rules: ShortlistRules,
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    group = np.full(paths.n_features, -1, np.int64)
    shares = np.zeros(paths.n_features)
    values = np.array([source.column(int(feature), rows) for feature in pool])
    code = group_companions(values, rules.companion_correlation)
    group[pool] = code
    shares[pool] = group_frequencies(code, paths.ever_selected[:, pool])
    return group, shares


def _candidates(
    ranked: NDArray[np.int64],
    group: NDArray[np.int64],
    group_frequency: NDArray[np.float64],
    univariate: Univariate,
    rules: ShortlistRules,
    always: NDArray[np.int64] | None,
) -> NDArray[np.int64]:
    """Return candidates: the best member of each top group, then univariate, forced."""
    grouped = ranked[group[ranked] >= 0]
    _, first = np.unique(group[grouped], return_index=True)
    leaders = grouped[np.sort(first)]  # most frequent member of each group
    leaders = leaders[np.argsort(-group_frequency[leaders], kind="stable")]
    leaders = leaders[group_frequency[leaders] > 0.0][: rules.candidates]
    best = univariate.order[: rules.candidates]
    best = best[univariate.t[best] != 0.0]
    forced = np.empty(0, np.int64) if always is None else always
    together = np.concatenate([leaders, best, forced])
    _, first = np.unique(together, return_index=True)
    return together[np.sort(first)]
