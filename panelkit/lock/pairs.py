"""Two locked panels on the same people."""

import numpy as np
from numpy.typing import NDArray

from panelkit.lock.scoring import chance_of
from panelkit.metrics import delong, mcnemar_exact
from panelkit.records import PanelContent, ValidationFigure

__all__ = ["pair_figures"]

Scored = tuple[PanelContent, NDArray[np.float64]]
NOTHING = float("nan")


def pair_figures(
    first: Scored,
    second: Scored,
    y: NDArray[np.float64],
    subjects: NDArray[np.int64],
    confidence: float,
) -> list[ValidationFigure]:
    """Return how two panels compare.

    Parameters
    ----------
    first, second : tuple of PanelContent and ndarray of shape (n_samples,)
        Panels with the log-odds of the same samples.
    y, subjects : ndarray of shape (n_samples,)
        0 and 1; subject codes.
    confidence : float
        Of the interval.

    Returns
    -------
    list of ValidationFigure
        Paired difference of areas; exact McNemar tests of the calls at the panels'
        first cut-offs, in cases and in controls.

    Raises
    ------
    FitError
        One class only.
    """
    of = f"against {second[0].name}"
    n, cases = len(y), int(y.sum())
    found = delong(np.array([first[1], second[1]]), y, subjects)
    gap, low, high, p = found.difference(confidence)
    figures = [
        ValidationFigure(
            "auc", f"{second[0].name}, the other panel", float(found.areas[1]),
            NOTHING, NOTHING, n, cases, "", "on the same people",
        ),
        ValidationFigure(
            "auc-difference", of, gap, low, high, n, cases, "paired DeLong", ""
        ),
        ValidationFigure(
            "auc-difference-p", of, p, NOTHING, NOTHING, n, cases, "paired DeLong", ""
        ),
    ]  # fmt: skip
    if not first[0].cutoffs or not second[0].cutoffs:
        return figures
    calls = [
        np.array([chance_of(v) for v in scores.tolist()]) >= panel.cutoffs[0].chance
        for panel, scores in (first, second)
    ]
    for name, value in (("sensitivity", 1.0), ("specificity", 0.0)):
        own = y == value
        right = [call[own] == (value == 1.0) for call in calls]
        alone = int((right[0] & ~right[1]).sum()), int((right[1] & ~right[0]).sum())
        figures.append(
            ValidationFigure(
                f"{name}-difference-p", of, mcnemar_exact(*alone), NOTHING, NOTHING,
                int(own.sum()), int(y[own].sum()), "McNemar, exact",
                f"{alone[0]} right by this panel alone, {alone[1]} by the other alone",
            )
        )  # fmt: skip
    return figures
