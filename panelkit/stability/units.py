"""What is drawn as a whole: subjects, or matched sets with all their subjects."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["unit_strata"]


def unit_strata(
    units: NDArray[np.int64], labels: NDArray[Any]
) -> tuple[list[NDArray[np.int64]], NDArray[np.int64]]:
    """Return the units by the labels that they hold, and how many hold each label.

    Parameters
    ----------
    units : ndarray of shape (n_rows,), int64
        Unit of each row.
    labels : ndarray of shape (n_rows,)
        What is kept in proportion, such as the class.

    Returns
    -------
    strata : list of ndarray of int64
        Units that hold one label alone, label by label, then units that hold several,
        by which; ascending within a stratum.
    holding : ndarray of shape (n_labels,), int64
        Units with a row of each label.
    """
    own, place = np.unique(units, return_inverse=True)
    known, code = np.unique(labels, return_inverse=True)
    holds = np.zeros((len(own), len(known)), np.bool_)
    holds[place, code] = True
    kinds, kind = np.unique(holds, axis=0, return_inverse=True)
    several = kinds.sum(axis=1)
    # one label alone first, in order of the labels
    order = sorted(range(len(kinds)), key=lambda k: (several[k], (~kinds[k]).tolist()))
    strata = [own[kind.ravel() == k] for k in order]
    return strata, holds.sum(axis=0).astype(np.int64)
