"""Whether any feature is left that could become a marker."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.ingest.wording import percent
from panelkit.records import Cohort, Finding

__all__ = ["check_usable"]

_TILE = 2048


def check_usable(cohort: Cohort, barred: NDArray[np.bool_]) -> list[Finding]:
    """Return the finding that says that no feature can become a marker, if none can.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    barred : ndarray of shape (n_features,), bool
        Features that may not: controls, references, those the study bars.

    Returns
    -------
    list of Finding
        ``no-usable-feature`` (stop), or nothing as soon as one usable feature is
        seen.
    """
    constant = gappy = 0
    limit = PREPARATION.max_missing_share
    free = np.flatnonzero(~barred)
    for start in range(0, len(free), _TILE):
        same, missing = _useless(cohort.values[free[start : start + _TILE]], limit)
        if not (same | missing).all():
            return []
        gappy += int(missing.sum())
        constant += int((same & ~missing).sum())
    reasons = (
        (int(barred.sum()), "may not enter a panel (controls, references, barred)"),
        (gappy, f"are missing in more than {percent(limit)} of the samples"),
        (constant, "have a single value wherever measured"),
    )
    listed = ", ".join(f"{count:,} {why}" for count, why in reasons if count)
    return [
        Finding(
            code="no-usable-feature",
            severity="stop",
            where="expression",
            message=f"none of the {cohort.n_features:,} features can become a marker: "
            f"{listed}",
            next_step="Check the file, its orientation, the roles in the feature sheet "
            "and the features that the study bars.",
        )
    ]


def _useless(
    rows: NDArray[np.floating[Any]], limit: float
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Return which features do not vary, and which are mostly missing."""
    missing = np.isnan(rows).mean(axis=1) > limit
    lowest, highest = np.fmin.reduce(rows, axis=1), np.fmax.reduce(rows, axis=1)
    return ~(lowest < highest), missing
