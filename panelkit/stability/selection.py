"""Stability selection: which markers are picked again and again."""

import math
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SHORTLIST
from panelkit.errors import InputDataError, StudyFileError, name_some
from panelkit.fits import Family, fit_paths
from panelkit.records import ErrorBound, MatrixSource, Stability, SubsamplePlan
from panelkit.stability.bounds import (
    r_concave_bound,
    unimodal_bound,
    worst_case_bound,
)
from panelkit.stability.companions import group_companions, group_frequencies
from panelkit.stability.demand import Demand, settle_demand
from panelkit.stability.ranking import feature_statistics
from panelkit.stability.tally import frequency_intervals, positive_share

__all__ = [
    "SELECTORS",
    "Picks",
    "ShortlistRules",
    "pick_markers",
    "picked_matrix",
    "select_markers",
]

SELECTORS: Final = ("lasso", "elastic-net", "univariate")
POOL = 400  # features that are grouped: the most frequent and the most different


@dataclass(frozen=True, slots=True)
class ShortlistRules:
    """How markers are shortlisted; the study file's [shortlist] section.

    Attributes
    ----------
    threshold : float or None
        Selection frequency from which a feature is shortlisted. None: it follows from
        the next two.
    false_markers : float or None
        Tolerated expected number of low-chance features in the shortlist. With
        `markers_per_subsample` and a threshold it follows from those.
    markers_per_subsample : int or None
        How many features a subsample may pick. None: it follows from the other two, at
        most half the rows of a subsample.
    bound : {"worst-case", "unimodal", "r-concave"}
        The bound that decides.
    selector : {"lasso", "elastic-net", "univariate"}
        What picks in a subsample.
    l1_share : float
        Share of the L1 part of the elastic net.
    candidates : int
        Companion groups, and univariate features, that become candidates.
    companion_correlation : float
        Smallest absolute correlation of companions.
    n_penalties : int
        Penalties of each path.
    penalty_floor : float
        Last penalty relative to the largest.
    """

    threshold: float | None = SHORTLIST.threshold
    false_markers: float | None = SHORTLIST.false_markers
    markers_per_subsample: int | None = None
    bound: str = SHORTLIST.bound
    selector: str = SHORTLIST.selector
    l1_share: float = SHORTLIST.l1_share
    candidates: int = SHORTLIST.candidates
    companion_correlation: float = SHORTLIST.companion_correlation
    n_penalties: int = SHORTLIST.n_penalties
    penalty_floor: float = SHORTLIST.penalty_floor

    def demand(self, n_features: int, plan: SubsamplePlan) -> Demand:
        """Return markers, threshold and false markers for a number of features.

        Parameters
        ----------
        n_features : int
            Features that enter every subsample.
        plan : SubsamplePlan
            Complementary pairs.

        Returns
        -------
        Demand
            The third figure filled in.

        Raises
        ------
        StudyFileError
            No figure satisfies the other two.
        """
        markers = self.markers_per_subsample
        both = markers is not None and self.threshold is not None
        return settle_demand(
            markers=markers if markers is None else min(markers, n_features),
            threshold=self.threshold,
            false_markers=None if both else self.false_markers,
            n_features=n_features,
            n_pairs=plan.n_pairs,
            bound=self.bound,
            most_markers=max(1, min(len(rows) for rows in plan.rows) // 2),
        )


@dataclass(frozen=True, slots=True, eq=False)
class Picks:
    """What each subsample picked.

    Attributes
    ----------
    order : tuple of ndarray of int64
        Features of each subsample, first pick first.
    positive_share : ndarray of shape (n_features,)
        Share of the picks with a positive sign; NaN where never picked.
    """

    order: tuple[NDArray[np.int64], ...]
    positive_share: NDArray[np.float64]


def select_markers(  # noqa: PLR0913 - data, plan, rules: each is one thing
    source: MatrixSource,
    y: Any,
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    rules: ShortlistRules,
    always: NDArray[np.int64] | None = None,
    threads: int = 1,
    *,
    family: Family = "binomial",
    allowed: NDArray[np.bool_] | None = None,
) -> Stability:
    """Repeat fits over subsamples and say which features come back.

    Parameters
    ----------
    source : MatrixSource
        Prepared matrix; its `included` features enter every subsample.
    y : ndarray of shape (n_samples,), or (time, event)
        Outcome, as `fit_paths` takes it.
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
    family : {"binomial", "gaussian", "cox", "multinomial"}
        Kind of outcome.
    allowed : ndarray of shape (n_features,), bool, optional
        Features that may be candidates: those that a platform can assay. It changes no
        frequency and no shortlist.

    Returns
    -------
    Stability
        Frequencies, bounds, shortlist, candidates.

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
    demand = rules.demand(n_included, plan)
    picks = pick_markers(
        source, y, family, subjects, weights, plan, rules, demand.markers, threads
    )
    t = feature_statistics(source, y, family, rows, subjects, weights)
    univariate = np.argsort(-np.abs(t), kind="stable")
    picked = picked_matrix(picks.order, len(t))
    frequency, low, high = frequency_intervals(picked)
    pool = _pool(frequency, univariate, always)
    group, group_frequency = _companions(source, rows, picked, pool, rules)
    ranked = np.lexsort((np.arange(len(frequency)), -np.abs(t), -frequency))
    open_to = np.ones(len(t), np.bool_) if allowed is None else allowed
    return Stability(
        frequency=frequency,
        low=low,
        high=high,
        simultaneous=(picked[0::2] & picked[1::2]).mean(axis=0),
        positive_share=picks.positive_share,
        picks=picks.order,
        bound=_bound(demand, picks, n_included, plan),
        shortlist=ranked[frequency[ranked] >= demand.threshold - 1e-12],
        candidates=_candidates(
            ranked[open_to[ranked]],
            group,
            group_frequency,
            univariate[open_to[univariate] & (t[univariate] != 0.0)],
            rules.candidates,
            always,
        ),
        group=group,
        group_frequency=group_frequency,
        t=t,
    )


def picked_matrix(
    order: tuple[NDArray[np.int64], ...], n_features: int
) -> NDArray[np.bool_]:
    """Return whether each subsample picked each feature."""
    picked = np.zeros((len(order), n_features), np.bool_)
    for row, features in zip(picked, order, strict=True):
        row[features] = True
    return picked


def pick_markers(  # noqa: PLR0913 - data, plan, rules: each is one thing
    source: MatrixSource,
    y: Any,
    family: Family,
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    rules: ShortlistRules,
    markers: int,
    threads: int = 1,
) -> Picks:
    """Return the first markers of every subsample by the asked selector.

    Parameters
    ----------
    source, y, family, subjects, weights, plan, rules, threads
        As for `select_markers`.
    markers : int
        How many a subsample may pick.

    Returns
    -------
    Picks
        Order of entry, and signs.

    Raises
    ------
    FitError
        A subsample that cannot be fitted.
    StudyFileError
        An unknown selector.
    """
    if rules.selector not in SELECTORS:
        raise StudyFileError(
            code="unknown-selector",
            where="[shortlist] selector",
            what=f"no such selector (got {rules.selector!r})",
            accepted=f"selectors are {name_some(SELECTORS)}",
            next_step="Correct the name",
        )
    if rules.selector == "univariate":
        return _pick_univariate(source, y, family, subjects, weights, plan, markers)
    paths = fit_paths(
        source,
        y,
        subsamples=plan.rows,
        family=family,
        n_penalties=rules.n_penalties,
        penalty_floor=rules.penalty_floor,
        max_markers=markers,
        mixing=rules.l1_share if rules.selector == "elastic-net" else 1.0,
        weights=weights,
        threads=threads,
    )
    return Picks(paths.entry_order, positive_share(paths))


def _pick_univariate(
    source: MatrixSource,
    y: Any,
    family: Family,
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    markers: int,
) -> Picks:
    """Return the features with the largest statistics of every subsample."""
    n_features = len(source.included)
    positive, negative = np.zeros(n_features), np.zeros(n_features)
    order = []
    for rows in plan.rows:
        t = feature_statistics(source, y, family, rows, subjects, weights)
        first = np.argsort(-np.abs(t), kind="stable")[:markers]
        first = first[t[first] != 0.0]
        order.append(first)
        positive[first] += t[first] > 0.0
        negative[first] += t[first] < 0.0
    if family == "multinomial":
        return Picks(tuple(order), np.full(n_features, np.nan))
    with np.errstate(invalid="ignore"):
        return Picks(tuple(order), positive / (positive + negative))


def _bound(
    demand: Demand, picks: Picks, n_features: int, plan: SubsamplePlan
) -> ErrorBound:
    sizes = np.array([len(features) for features in picks.order])
    realised = float(sizes.mean())
    at = (realised, demand.threshold, n_features, plan.n_pairs)
    return ErrorBound(
        threshold=demand.threshold,
        asked=demand.markers,
        realised=realised,
        n_features=n_features,
        worst_case=worst_case_bound(*at[:3]),
        unimodal=unimodal_bound(*at),
        r_concave=r_concave_bound(*at) if demand.bound == "r-concave" else math.nan,
        decides=demand.bound,
        n_pairs=plan.n_pairs,
        full_share=float((sizes >= demand.markers).mean()),
    )


def _pool(
    frequency: NDArray[np.float64],
    univariate: NDArray[np.int64],
    always: NDArray[np.int64] | None,
) -> NDArray[np.int64]:
    """Return the features worth grouping, in column order."""
    often = np.argsort(-frequency, kind="stable")[: POOL // 2]
    forced = np.empty(0, np.int64) if always is None else always
    return np.unique(
        np.concatenate([often[frequency[often] > 0.0], univariate[: POOL // 2], forced])
    )


def _companions(
    source: MatrixSource,
    rows: NDArray[np.int64],
    picked: NDArray[np.bool_],
    pool: NDArray[np.int64],
    rules: ShortlistRules,
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    group = np.full(picked.shape[1], -1, np.int64)
    shares = np.zeros(picked.shape[1])
    values = np.array([source.column(int(feature), rows) for feature in pool])
    code = group_companions(values, rules.companion_correlation)
    group[pool] = code
    shares[pool] = group_frequencies(code, picked[:, pool])
    return group, shares


def _candidates(
    ranked: NDArray[np.int64],
    group: NDArray[np.int64],
    group_frequency: NDArray[np.float64],
    univariate: NDArray[np.int64],
    n_candidates: int,
    always: NDArray[np.int64] | None,
) -> NDArray[np.int64]:
    """Return candidates: the best member of each top group, then univariate, forced."""
    grouped = ranked[group[ranked] >= 0]
    _, first = np.unique(group[grouped], return_index=True)
    leaders = grouped[np.sort(first)]  # most frequent member of each group
    leaders = leaders[np.argsort(-group_frequency[leaders], kind="stable")]
    leaders = leaders[group_frequency[leaders] > 0.0][:n_candidates]
    forced = np.empty(0, np.int64) if always is None else always
    together = np.concatenate([leaders, univariate[:n_candidates], forced])
    _, first = np.unique(together, return_index=True)
    return together[np.sort(first)]
