"""Error bounds of the shortlist, and what has to be asked to keep them."""

import math

from panelkit.errors import StudyFileError

__all__ = ["markers_for", "worst_case_bound"]


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
    if not 0.5 < threshold <= 1.0:
        raise StudyFileError(
            code="threshold-out-of-range",
            where="[shortlist] threshold",
            what=f"no bound holds there (got {threshold:g})",
            accepted="above 0.5 and at most 1",
            next_step="Use 0.6 to 0.9",
        )
    return markers**2 / ((2.0 * threshold - 1.0) * n_features)


def markers_for(false_markers: float, threshold: float, n_features: int) -> int:
    """Return how many markers a subsample may pick to keep the bound.

    Parameters
    ----------
    false_markers : float
        Tolerated expected number of low-chance features in the shortlist.
    threshold : float
        Selection frequency from which a feature is shortlisted.
    n_features : int
        Features that enter every subsample.

    Returns
    -------
    int
        The largest q whose worst-case bound is at most `false_markers`.

    Raises
    ------
    StudyFileError
        Not even one marker is possible.
    """
    one = worst_case_bound(1.0, threshold, n_features)
    markers = math.isqrt(math.floor(false_markers / one * (1.0 + 1e-12)))
    if markers < 1:
        raise StudyFileError(
            code="bound-infeasible",
            where="[shortlist] false_markers",
            what=f"{false_markers:g} cannot be kept with {n_features:,} features and "
            f"threshold {threshold:g}, not even with one marker a subsample",
            accepted=f"at least {one:.3g} here",
            next_step="Raise false_markers or the threshold",
        )
    return markers
