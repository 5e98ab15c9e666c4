"""The univariate ranking, the lasso and the elastic net through the same subsamples."""

from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.fits import Family
from panelkit.records import MatrixSource, SelectorResult, SubsamplePlan
from panelkit.stability.agreement import set_agreement
from panelkit.stability.selection import SELECTORS, ShortlistRules, select_markers

__all__ = ["compare_selectors"]


def compare_selectors(  # noqa: PLR0913 - data, plan, rules: each is one thing
    source: MatrixSource,
    y: Any,
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    rules: ShortlistRules,
    threads: int = 1,
    *,
    family: Family = "binomial",
) -> tuple[SelectorResult, ...]:
    """Return what each selector shortlists from the same subsamples, and how stably.

    Parameters
    ----------
    source, y, rows, subjects, weights, plan, rules, threads, family
        As for `select_markers`; `rules.selector` is replaced by each selector.

    Returns
    -------
    tuple of SelectorResult
        lasso, elastic net, univariate.

    Raises
    ------
    FitError
        A subsample that cannot be fitted.
    """
    found = []
    for selector in SELECTORS:
        stability = select_markers(
            source,
            y,
            rows,
            subjects,
            weights,
            plan,
            replace(rules, selector=selector),
            threads=threads,
            family=family,
        )
        top = int(np.lexsort((-np.abs(stability.t), -stability.frequency))[0])
        found.append(
            SelectorResult(
                selector=selector,
                bound=stability.bound,
                shortlist=stability.shortlist,
                top_feature=top,
                top_frequency=float(stability.frequency[top]),
                agreement=set_agreement(stability.picked[:, source.included]),
            )
        )
    return tuple(found)
