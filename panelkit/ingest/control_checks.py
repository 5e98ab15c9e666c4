"""Whether control features tell the outcome, which they must not."""

import numpy as np

from panelkit.ingest.cohort_views import binary_outcome, one_row_a_subject
from panelkit.ingest.wording import counted, figure
from panelkit.metrics import auc, auc_score_interval, holm_adjusted, rank_sum_p
from panelkit.records import Cohort, Finding

__all__ = ["check_controls"]

CONFIDENCE = 0.95
LEVEL = 0.05


def check_controls(cohort: Cohort) -> list[Finding]:
    """Return the control features that tell the classes apart.

    Parameters
    ----------
    cohort : Cohort
        With the role ``control`` in its feature sheet; otherwise nothing is checked.

    Returns
    -------
    list of Finding
        ``controls-predict-outcome`` where Holm-adjusted p-values of rank-sum tests,
        on one sample a subject, reach 0.05.
    """
    roles, positive = cohort.feature_columns.get("role"), binary_outcome(cohort)
    if roles is None or positive is None or cohort.outcome is None:
        return []
    own = one_row_a_subject(cohort)
    results = []
    for feature in np.flatnonzero(np.asarray(roles == "control", dtype=bool)):
        scores = np.asarray(cohort.values[feature, own], dtype=np.float64)
        seen = np.isfinite(scores)
        outcome = positive[own][seen]
        if len(np.unique(outcome)) == 2:
            area = auc(scores[seen], outcome)
            cases = int(outcome.sum())
            low, high = auc_score_interval(
                area, cases, len(outcome) - cases, CONFIDENCE
            )
            results.append(
                (rank_sum_p(scores[seen], outcome), feature, area, low, high)
            )
    if not results:
        return []
    adjusted = holm_adjusted(np.array([p for p, *_ in results]))
    order = np.argsort(adjusted, kind="stable")
    told = [
        f"{str(cohort.features[feature])!r} AUC {figure(area)} ({figure(low)} to "
        f"{figure(high)})"
        for k in order
        if adjusted[k] <= LEVEL
        for _, feature, area, low, high in [results[k]]
    ]
    if not told:
        return []
    more = f" and {len(told) - 5} more" if len(told) > 5 else ""
    return [
        Finding(
            code="controls-predict-outcome",
            severity="warning",
            where="features, column 'role'",
            message=f"{len(told)} of {counted(len(results), 'control', 'controls')} "
            f"tell {cohort.outcome.positive!r} from {cohort.outcome.negative!r} "
            f"(rank-sum tests, Holm-adjusted p at most {LEVEL:g}): "
            f"{'; '.join(told[:5])}{more}",
            next_step="Look for a difference in handling, amount or run between the "
            "classes: markers can show the same.",
        )
    ]
