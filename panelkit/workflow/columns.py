"""Columns of the sample sheet as numbers, for models and checks."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.records import Cohort

__all__ = ["coded_columns"]


def coded_columns(cohort: Cohort, names: Sequence[str]) -> NDArray[np.float64]:
    """Return columns of the sample sheet as numbers, outcome unseen.

    Parameters
    ----------
    cohort : Cohort
        Its sample columns.
    names : sequence of str
        Which of them.

    Returns
    -------
    ndarray of shape (n_columns, n_samples)
        A column of numbers stays one, with an indicator beside it where cells are
        blank (they count as 0 then); any other column gets one indicator for each
        value but the first.
    """
    rows: list[NDArray[np.float64]] = []
    for name in names:
        text = np.array([str(cell).strip() for cell in cohort.sample_columns[name]])
        blank = text == ""
        try:
            numbers = np.array([float(cell) if cell else 0.0 for cell in text])
        except ValueError:
            values = np.unique(text)
            rows += [(text == value).astype(np.float64) for value in values[1:]]
            continue
        rows.append(numbers)
        if blank.any():
            rows.append(blank.astype(np.float64))
    return np.array(rows).reshape(len(rows), cohort.n_samples)
