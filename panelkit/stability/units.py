"""What is drawn as a whole: subjects, or matched sets with all their subjects."""

import numpy as np
from numpy.typing import NDArray

__all__ = ["unit_strata"]


def unit_strata(
    units: NDArray[np.int64], y: NDArray[np.float64]
) -> tuple[list[NDArray[np.int64]], NDArray[np.int64]]:
    """Return the units by the classes that they hold, and how many hold each class.

    Parameters
    ----------
    units : ndarray of shape (n_rows,), int64
        Unit of each row.
    y : ndarray of shape (n_rows,)
        Outcome, 0 and 1.

    Returns
    -------
    strata : list of ndarray of int64
        Units of class 0 alone, of class 1 alone, and, where there are any, of both;
        ascending.
    holding : ndarray of shape (2,), int64
        Units with a row of class 0, and with one of class 1.
    """
    own, place = np.unique(units, return_inverse=True)
    rows = np.bincount(place)
    positive = np.bincount(place, weights=y)
    none, every = positive == 0, positive == rows
    strata = [own[none], own[every]]
    if not (none | every).all():
        strata.append(own[~none & ~every])
    holding = np.array([(~every).sum(), (~none).sum()], np.int64)
    return strata, holding
