"""What several checks ask of a cohort."""

import numpy as np
from numpy.typing import NDArray

from panelkit.records import Cohort

__all__ = ["Text", "binary_outcome", "one_row_a_subject"]

Text = NDArray[np.object_]


def binary_outcome(cohort: Cohort) -> NDArray[np.float64] | None:
    """Return 1 for the positive class and 0 for the negative, None without classes.

    Parameters
    ----------
    cohort : Cohort
        The cohort.

    Returns
    -------
    ndarray of shape (n_samples,) or None
        None also for outcomes of another kind.
    """
    outcome = cohort.outcome
    if outcome is None or outcome.kind != "binary":
        return None
    return outcome.values


def one_row_a_subject(cohort: Cohort) -> NDArray[np.int64]:
    """Return the first sample of each subject: independent units for a test.

    Parameters
    ----------
    cohort : Cohort
        The cohort.

    Returns
    -------
    ndarray of shape (n_subjects,), int64
        Positions of samples.
    """
    _, first = np.unique(cohort.design.subject, return_index=True)
    return np.asarray(first, dtype=np.int64)
