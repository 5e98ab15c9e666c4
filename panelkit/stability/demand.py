"""What is asked of the shortlist: two of three figures, the third follows."""

import math
from dataclasses import dataclass

from panelkit.config import SHORTLIST
from panelkit.errors import StudyFileError
from panelkit.stability.bounds import (
    R_CONCAVE_FROM,
    bound_of,
)

__all__ = ["Demand", "markers_for", "settle_demand", "threshold_for"]

ROUNDING = 1e-12
LOWEST = {"worst-case": 0.5, "unimodal": 0.5, "r-concave": R_CONCAVE_FROM}


@dataclass(frozen=True, slots=True)
class Demand:
    """A settled demand.

    Attributes
    ----------
    markers : int
        Features a subsample may pick.
    threshold : float
        Selection frequency from which a feature is shortlisted.
    false_markers : float
        Value of the deciding bound at these two.
    bound : str
        The deciding bound: worst-case, unimodal or r-concave.
    capped : bool
        The rows of a subsample allowed fewer markers than the bound.
    """

    markers: int
    threshold: float
    false_markers: float
    bound: str
    capped: bool = False


def _keeps(value: float, tolerated: float) -> bool:
    return not math.isnan(value) and value <= tolerated * (1.0 + ROUNDING)


def markers_for(
    false_markers: float,
    threshold: float,
    n_features: int,
    *,
    bound: str = SHORTLIST.bound,
    n_pairs: int = SHORTLIST.subsamples // 2,
) -> int:
    """Return how many markers a subsample may pick to keep the bound.

    Parameters
    ----------
    false_markers : float
        Tolerated expected number of low-chance features in the shortlist.
    threshold : float
        Selection frequency from which a feature is shortlisted.
    n_features : int
        Features that enter every subsample.
    bound : {"worst-case", "unimodal", "r-concave"}
        Which bound has to be kept.
    n_pairs : int
        Complementary pairs; the worst case does not depend on them.

    Returns
    -------
    int
        The largest q whose bound is at most `false_markers`.

    Raises
    ------
    StudyFileError
        Not even one marker is possible; what would be is named.
    """

    def value(markers: int) -> float:
        return bound_of(bound, markers, threshold, n_features, n_pairs)

    one = value(1)
    if not _keeps(one, false_markers):
        raise _infeasible(false_markers, threshold, n_features, bound, n_pairs)
    if bound == "worst-case":
        return math.isqrt(math.floor(false_markers / one * (1.0 + ROUNDING)))
    low, high = 1, 2
    while high < n_features and _keeps(value(high), false_markers):
        low, high = high, 2 * high
    high = min(high, n_features + 1)
    while high - low > 1:
        middle = (low + high) // 2
        if _keeps(value(middle), false_markers):
            low = middle
        else:
            high = middle
    return low


def threshold_for(
    markers: int,
    false_markers: float,
    n_features: int,
    *,
    bound: str = SHORTLIST.bound,
    n_pairs: int = SHORTLIST.subsamples // 2,
) -> float:
    """Return the lowest threshold that keeps the bound.

    Parameters
    ----------
    markers : int
        Features picked in a subsample.
    false_markers : float
        Tolerated expected number of low-chance features in the shortlist.
    n_features : int
        Features that enter every subsample.
    bound : {"worst-case", "unimodal", "r-concave"}
        Which bound has to be kept.
    n_pairs : int
        Complementary pairs; the threshold lies on the grid of 1 / (2 n_pairs).

    Returns
    -------
    float
        Above 0.5 (r-concave: from 0.6) and at most 1.

    Raises
    ------
    StudyFileError
        No threshold up to 1 keeps it; the nearest demands that can be kept are named.
    """
    lowest = LOWEST[bound]
    first = math.ceil(2 * n_pairs * lowest - 1e-9)
    steps = [k for k in range(first, 2 * n_pairs + 1) if k > n_pairs]
    low, high = -1, len(steps)  # the bounds fall as the threshold rises
    while high - low > 1:
        middle = (low + high) // 2
        threshold = steps[middle] / (2 * n_pairs)
        if _keeps(
            bound_of(bound, markers, threshold, n_features, n_pairs), false_markers
        ):
            high = middle
        else:
            low = middle
    if high < len(steps):
        return steps[high] / (2 * n_pairs)
    least = bound_of(bound, markers, 1.0, n_features, n_pairs)
    fewer = _most_markers(false_markers, n_features, bound, n_pairs)
    raise StudyFileError(
        code="bound-infeasible",
        where="[shortlist] markers_per_subsample and false_markers",
        what=f"{markers} markers a subsample cannot keep {false_markers:g} false "
        f"markers with {n_features:,} features by the {bound} bound, not even with "
        "threshold 1",
        accepted=f"at most {fewer} markers a subsample with {false_markers:g} false "
        f"markers, or at least {least:.3g} false markers with {markers}",
        next_step="Lower markers_per_subsample or raise false_markers",
    )


def _most_markers(
    false_markers: float, n_features: int, bound: str, n_pairs: int
) -> int:
    """Return how many markers threshold 1 would allow, 0 for none."""
    if not _keeps(bound_of(bound, 1, 1.0, n_features, n_pairs), false_markers):
        return 0
    return markers_for(false_markers, 1.0, n_features, bound=bound, n_pairs=n_pairs)


def _infeasible(
    false_markers: float, threshold: float, n_features: int, bound: str, n_pairs: int
) -> StudyFileError:
    one = bound_of(bound, 1, threshold, n_features, n_pairs)
    nearest = f"at least {one:.3g} false markers at threshold {threshold:g}"
    if _keeps(bound_of(bound, 1, 1.0, n_features, n_pairs), false_markers):
        other = threshold_for(
            1, false_markers, n_features, bound=bound, n_pairs=n_pairs
        )
        nearest += f", or threshold {other:g} and above with {false_markers:g}"
    return StudyFileError(
        code="bound-infeasible",
        where="[shortlist] false_markers",
        what=f"{false_markers:g} cannot be kept with {n_features:,} features and "
        f"threshold {threshold:g} by the {bound} bound, not even with one marker a "
        "subsample",
        accepted=nearest,
        next_step="Raise false_markers or the threshold",
    )


def settle_demand(
    *,
    markers: int | None,
    threshold: float | None,
    false_markers: float | None,
    n_features: int,
    n_pairs: int,
    bound: str = SHORTLIST.bound,
    most_markers: int | None = None,
) -> Demand:
    """Return all three figures of a demand that gives two.

    Parameters
    ----------
    markers : int or None
        Features a subsample may pick.
    threshold : float or None
        Selection frequency from which a feature is shortlisted.
    false_markers : float or None
        Tolerated expected number of low-chance features in the shortlist.
    n_features : int
        Features that enter every subsample.
    n_pairs : int
        Complementary pairs.
    bound : {"worst-case", "unimodal", "r-concave"}
        Which bound decides.
    most_markers : int, optional
        Ceiling of the markers where they follow: a path saturates when its subsample
        separates, and later picks are path order only.

    Returns
    -------
    Demand
        The third figure filled in.

    Raises
    ------
    StudyFileError
        All three are given or fewer than two, or no figure satisfies the two.
    """
    given = [markers is not None, threshold is not None, false_markers is not None]
    if sum(given) != 2:
        raise StudyFileError(
            code="demand-not-two-of-three",
            where="[shortlist] threshold, markers_per_subsample, false_markers",
            what=f"{sum(given)} of the three are given",
            accepted="two of them, the third follows",
            next_step="Take one out" if all(given) else "Give two",
        )
    if markers is not None and markers > n_features:
        raise StudyFileError(
            code="markers-above-features",
            where="[shortlist] markers_per_subsample",
            what=f"{markers} of {n_features:,} features",
            accepted=f"at most {n_features:,}, the features that enter",
            next_step="Lower markers_per_subsample",
        )
    if markers is None:
        assert threshold is not None
        assert false_markers is not None
        allowed = markers_for(
            false_markers, threshold, n_features, bound=bound, n_pairs=n_pairs
        )
        ceiling = allowed if most_markers is None else most_markers
        markers = max(1, min(allowed, ceiling, n_features))
        value = bound_of(bound, markers, threshold, n_features, n_pairs)
        return Demand(markers, threshold, value, bound, markers < allowed)
    if threshold is None:
        assert false_markers is not None
        threshold = threshold_for(
            markers, false_markers, n_features, bound=bound, n_pairs=n_pairs
        )
    value = bound_of(bound, markers, threshold, n_features, n_pairs)
    if math.isnan(value):
        raise StudyFileError(
            code="bound-undefined",
            where="[shortlist] bound",
            what=f"the {bound} bound is not defined for {markers} of {n_features:,} "
            f"features a subsample at threshold {threshold:g}",
            accepted="a share of at most 0.57 of the features, and a threshold not "
            "next to one half",
            next_step="Lower markers_per_subsample, or set bound = 'worst-case'",
        )
    return Demand(markers, threshold, value, bound)
