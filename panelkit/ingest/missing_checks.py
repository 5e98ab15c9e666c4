"""Where values are missing, and whether the gaps themselves tell the outcome."""

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cohort_views import Text, binary_outcome, one_row_a_subject
from panelkit.ingest.survey import Survey
from panelkit.ingest.wording import counted, figure, percent, quoted
from panelkit.metrics import (
    auc,
    auc_score_interval,
    false_discovery_adjusted,
    fisher_exact_many,
    rank_sum_p,
)
from panelkit.records import Cohort, Finding

__all__ = ["check_missing", "missing_groups"]

WHERE = "expression"
CONFIDENCE = 0.95
FALSE_DISCOVERY = 0.05
TIED_P = 0.01
UNEVEN = 0.1
"""Difference of missing shares among levels that is worth a warning."""


def missing_groups(cohort: Cohort) -> NDArray[np.bool_]:
    """Return the samples whose gaps are counted together.

    Parameters
    ----------
    cohort : Cohort
        The cohort.

    Returns
    -------
    ndarray of shape (n_samples, 2), bool
        One row a subject: all of them, and those of the positive class.
    """
    chosen = np.zeros((cohort.n_samples, 2), dtype=bool)
    rows = one_row_a_subject(cohort)
    chosen[rows, 0] = True
    positive = binary_outcome(cohort)
    if positive is not None:
        chosen[rows, 1] = positive[rows] == 1.0
    return chosen


def check_missing(cohort: Cohort, survey: Survey) -> list[Finding]:
    """Return how much is missing, where, and whether it goes along with the outcome.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    survey : Survey
        One pass over its values, with the groups of `missing_groups`.

    Returns
    -------
    list of Finding
        ``values-missing``, ``missing-by-...`` for class, site and batch, and
        ``missing-tied-to-outcome``.
    """
    if not survey.n_missing:
        return []
    return [
        *_overall(cohort, survey),
        *_by_level(cohort, survey),
        *_tied(cohort, survey),
    ]


def _overall(cohort: Cohort, survey: Survey) -> list[Finding]:
    incomplete = survey.missing_of_feature > 0
    shares = survey.missing_of_sample / cohort.n_features
    worst = int(np.argmax(shares))
    return [
        Finding(
            code="values-missing",
            severity="info",
            where=WHERE,
            message=f"{percent(survey.n_missing / cohort.values.size)} of the values "
            f"are missing ({survey.n_missing:,}, in "
            f"{counted(int(incomplete.sum()), 'feature', 'features')}; between "
            f"{percent(float(shares.min()))} and {percent(float(shares.max()))} of a "
            f"sample, most in {str(cohort.samples[worst])!r})",
            next_step="Check why; they are imputed from training rows.",
        )
    ]


def _by_level(cohort: Cohort, survey: Survey) -> list[Finding]:
    columns: list[tuple[str, Text | None]] = [
        ("class", _class_names(cohort)),
        ("site", cohort.design.site),
        ("batch", cohort.design.batch),
    ]
    return [
        finding
        for role, column in columns
        if column is not None
        for finding in _level_shares(cohort, survey, role, column)
    ]


def _class_names(cohort: Cohort) -> Text | None:
    positive, outcome = binary_outcome(cohort), cohort.outcome
    if positive is None or outcome is None:
        return None
    return np.where(positive == 1.0, outcome.positive, outcome.negative).astype(object)


def _level_shares(
    cohort: Cohort, survey: Survey, role: str, column: Text
) -> list[Finding]:
    of_sample = survey.missing_of_sample / cohort.n_features
    shares = {
        level: float(of_sample[column == level].mean()) for level in sorted(set(column))
    }
    if len(shares) < 2:
        return []
    order = sorted(shares, key=lambda level: -shares[level])
    uneven = shares[order[0]] - shares[order[-1]] > UNEVEN
    shown = order if len(order) <= 5 else [*order[:2], *order[-2:]]
    listed = ", ".join(f"{level!r} {percent(shares[level])}" for level in shown)
    more = f" and {len(order) - 4} between them" if len(order) > 5 else ""
    return [
        Finding(
            code=f"missing-by-{role}",
            severity="warning" if uneven else "info",
            where=WHERE,
            message=f"missing share by {role}: {listed}{more}",
            next_step="Ask what was done differently where more is missing."
            if uneven
            else "Nothing; the shares are alike.",
        )
    ]


def _tied(cohort: Cohort, survey: Survey) -> list[Finding]:
    positive = binary_outcome(cohort)
    if positive is None or cohort.outcome is None:
        return []
    rows = one_row_a_subject(cohort)
    cases = int(positive[rows].sum())
    controls = len(rows) - cases
    if min(cases, controls) < 2:
        return []
    of_sample = survey.missing_of_sample[rows] / cohort.n_features
    p_sample = rank_sum_p(of_sample, positive[rows])
    totals, hits = survey.missing_of_group.T
    tested = (totals > 0) & (totals < len(rows))
    adjusted = np.ones(cohort.n_features)
    if tested.any():
        adjusted[tested] = false_discovery_adjusted(
            fisher_exact_many(hits[tested], totals[tested], cases, controls)
        )
    told = np.flatnonzero(adjusted <= FALSE_DISCOVERY)
    if p_sample >= TIED_P and not len(told):
        return []
    area = auc(of_sample, positive[rows])
    low, high = auc_score_interval(area, cases, controls, CONFIDENCE)
    told = told[np.argsort(adjusted[told], kind="stable")]
    named = f" ({quoted(cohort.features[told])})" if len(told) else ""
    return [
        Finding(
            code="missing-tied-to-outcome",
            severity="warning",
            where=WHERE,
            message=f"gaps tell the classes apart: the missing share of a sample has "
            f"an AUC for {cohort.outcome.positive!r} of {figure(area)} ({figure(low)} "
            f"to {figure(high)}, rank-sum p {figure(p_sample)}), and {len(told):,} of "
            f"{int(tested.sum()):,} features with gaps differ by Fisher's exact test "
            f"at a false discovery rate of {percent(FALSE_DISCOVERY)}{named}; one "
            "sample a subject",
            next_step="Find out whether missing means below the limit of detection or "
            "another handling of one class: a panel can learn the gaps.",
        )
    ]
