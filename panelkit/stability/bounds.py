"""Error bounds of the shortlist: how many low-chance features it may hold.

All of them speak of features whose chance of being picked is at most q / p, the
average. They differ in what they assume of how the picks are distributed.
"""

import math
from typing import Final, Literal, get_args

from panelkit.errors import StudyFileError, UsageError, name_some
from panelkit.stability.r_concave import r_concave_tail

__all__ = [
    "BOUNDS",
    "R_CONCAVE_FROM",
    "BoundKind",
    "attained_threshold",
    "bound_of",
    "r_concave_bound",
    "unimodal_bound",
    "unimodal_factor",
    "worst_case_bound",
]

BoundKind = Literal["worst-case", "unimodal", "r-concave"]
BOUNDS: Final[tuple[BoundKind, ...]] = get_args(BoundKind)
R_CONCAVE_FROM: Final = 0.6  # below it plain noise was seen to exceed the bound
LARGEST_MEAN: Final = 1.0 / math.sqrt(3.0)
ROUNDING: Final = 1e-9


def _check_threshold(threshold: float, kind: str = "worst-case") -> None:
    if threshold <= 1.0:
        r_concave = kind == "r-concave"
        if threshold >= R_CONCAVE_FROM - ROUNDING or (
            threshold > 0.5 and not r_concave
        ):
            return
    least = "0.6 or more" if kind == "r-concave" else "above 0.5"
    raise StudyFileError(
        code="threshold-out-of-range",
        where="[shortlist] threshold",
        what=f"the {kind} bound does not hold there (got {threshold:g})",
        accepted=f"{least} and at most 1",
        next_step="Use 0.6 to 0.9",
    )


def attained_threshold(threshold: float, n_pairs: int) -> float:
    """Return the lowest frequency on the grid of 1 / (2 pairs) that passes.

    Parameters
    ----------
    threshold : float
        As asked.
    n_pairs : int
        Complementary pairs; frequencies are multiples of 1 / (2 n_pairs).

    Returns
    -------
    float
        At least `threshold`; using it in a bound is exact.

    References
    ----------
    Shah & Samworth 2013, JRSS-B 75:55.
    """
    return min(1.0, math.ceil(2 * n_pairs * threshold - ROUNDING) / (2 * n_pairs))


def worst_case_bound(markers: float, threshold: float, n_features: int) -> float:
    """Return the largest expected number of low-chance features in the shortlist.

    Parameters
    ----------
    markers : float
        Mean number of features picked in a subsample.
    threshold : float
        Selection frequency from which a feature is shortlisted, above 0.5 to 1.
    n_features : int
        Features that entered every subsample.

    Returns
    -------
    float
        q^2 / ((2 threshold - 1) p); no assumption on the selection.

    Raises
    ------
    StudyFileError
        A threshold of 0.5 or less, or above 1.

    References
    ----------
    Meinshausen & Buhlmann 2010, JRSS-B 72:417, theorem 1; Shah & Samworth 2013,
    JRSS-B 75:55, theorem 1.
    """
    _check_threshold(threshold)
    return markers**2 / ((2.0 * threshold - 1.0) * n_features)


def unimodal_factor(threshold: float, n_pairs: int) -> float:
    """Return C(threshold, B) of the unimodal bound, which is C q^2 / p.

    Parameters
    ----------
    threshold : float
        Selection frequency on the grid of 1 / (2 n_pairs).
    n_pairs : int
        Complementary pairs, B.

    Returns
    -------
    float
        1 / (2 (2 t - 1 - 1 / (2 B))) up to t = 3/4, then
        4 (1 - t + 1 / (2 B)) / (1 + 1 / B); infinite where the first has no value.

    Raises
    ------
    StudyFileError
        A threshold of 0.5 or less, or above 1.

    References
    ----------
    Shah & Samworth 2013, JRSS-B 75:55, theorem 2.
    """
    _check_threshold(threshold)
    step = 1.0 / (2.0 * n_pairs)
    if threshold > 0.75 + ROUNDING:
        return 4.0 * (1.0 - threshold + step) / (1.0 + 2.0 * step)
    room = 2.0 * threshold - 1.0 - step
    return 1.0 / (2.0 * room) if room > ROUNDING else math.inf


def unimodal_bound(
    markers: float, threshold: float, n_features: int, n_pairs: int
) -> float:
    """Return the bound for picks whose distribution over pairs has one mode.

    Parameters
    ----------
    markers : float
        Mean number of features picked in a subsample.
    threshold : float
        Selection frequency from which a feature is shortlisted; the attained one is
        used.
    n_features : int
        Features that entered every subsample.
    n_pairs : int
        Complementary pairs.

    Returns
    -------
    float
        C q^2 / p at the attained threshold. NaN where the theorem does not hold: an
        average chance above 1 / sqrt(3), or a threshold too close to one half.

    Raises
    ------
    StudyFileError
        A threshold of 0.5 or less, or above 1.

    References
    ----------
    Shah & Samworth 2013, JRSS-B 75:55, theorem 2.
    """
    attained = attained_threshold(threshold, n_pairs)
    factor = unimodal_factor(attained, n_pairs)
    mean = markers / n_features
    lowest = min(0.5 + mean**2, 0.5 + 1.0 / (2.0 * n_pairs) + 0.75 * mean**2)
    if mean > LARGEST_MEAN or attained <= lowest or not math.isfinite(factor):
        return math.nan
    return factor * markers**2 / n_features


def r_concave_bound(
    markers: float, threshold: float, n_features: int, n_pairs: int
) -> float:
    """Return the bound for r-concave picks: sharper, and it assumes more.

    Parameters
    ----------
    markers : float
        Mean number of features picked in a subsample.
    threshold : float
        Selection frequency from which a feature is shortlisted, 0.6 or more; the
        attained one is used.
    n_features : int
        Features that entered every subsample.
    n_pairs : int
        Complementary pairs.

    Returns
    -------
    float
        min(D(q^2/p^2, 2 t - 1, B, -1/2), D(q/p, t, 2 B, -1/4)) p.

    Raises
    ------
    StudyFileError
        A threshold below 0.6, where noise was seen to exceed this bound, or above 1.

    References
    ----------
    Shah & Samworth 2013, JRSS-B 75:55, equation 8.
    """
    _check_threshold(threshold, "r-concave")
    attained = attained_threshold(threshold, n_pairs)
    mean = markers / n_features
    simultaneous = r_concave_tail(mean**2, 2.0 * attained - 1.0, n_pairs, -0.5)
    single = r_concave_tail(mean, attained, 2 * n_pairs, -0.25)
    return min(simultaneous, single) * n_features


def bound_of(
    kind: str, markers: float, threshold: float, n_features: int, n_pairs: int
) -> float:
    """Return one of the bounds by its name.

    Parameters
    ----------
    kind : {"worst-case", "unimodal", "r-concave"}
        Which.
    markers, threshold, n_features, n_pairs
        As for the bounds themselves.

    Returns
    -------
    float
        Expected number of low-chance features in the shortlist at most.

    Raises
    ------
    UsageError
        No bound of that name.
    StudyFileError
        A threshold for which it does not hold.
    """
    if kind == "worst-case":
        return worst_case_bound(markers, threshold, n_features)
    if kind == "unimodal":
        return unimodal_bound(markers, threshold, n_features, n_pairs)
    if kind == "r-concave":
        return r_concave_bound(markers, threshold, n_features, n_pairs)
    raise UsageError(
        code="unknown-bound",
        where="bound",
        what=f"no such bound (got {kind!r})",
        accepted=f"bounds are {name_some(BOUNDS)}",
        next_step="Correct the name",
    )
