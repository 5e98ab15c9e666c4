"""What the numbers of a cohort show: gaps, constants, copies, floors, absurd cells."""

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.ingest.scale import ScaleGuess
from panelkit.ingest.survey import Survey
from panelkit.ingest.usable import check_usable
from panelkit.ingest.wording import counted, figure, percent, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_values"]

WHERE = "expression"

FLOORED = 0.01
"""Share of cells at the smallest value from which on it is taken for a limit."""
FEATURE_FLOORED = 0.2
"""The same within a feature; measurements with decimals do not repeat by chance."""
N_CELLS = 5


def check_values(cohort: Cohort, survey: Survey, scale: ScaleGuess) -> list[Finding]:
    """Return what the matrix itself shows.

    Parameters
    ----------
    cohort : Cohort
        The cohort.
    survey : Survey
        One pass over its values.
    scale : ScaleGuess
        Scale of its values.

    Returns
    -------
    list of Finding
        Mostly missing, constant and copied features, absurd cells, floors, control
        and reference features, and whether any feature is left.
    """
    return [
        *check_usable(cohort, _role_is(cohort, "control", "reference")),
        *_absurd(cohort, survey, scale),
        *_not_counts(cohort, survey, scale),
        *_mostly_missing(cohort, survey),
        *_constant(cohort, survey),
        *_copies(cohort, survey),
        *_floor(cohort, survey, scale),
        *_roles(cohort),
    ]


def _cells(cohort: Cohort, wrong: NDArray[np.bool_], rows: NDArray[np.int64]) -> str:
    """Return the first cells by feature, sample and value."""
    places = np.argwhere(wrong)
    shown = [
        f"feature {str(cohort.features[rows[row]])!r}, sample "
        f"{str(cohort.samples[sample])!r}: {cohort.values[rows[row], sample]:.6g}"
        for row, sample in places[:N_CELLS]
    ]
    more = f" and {len(places) - N_CELLS} more" if len(places) > N_CELLS else ""
    return "; ".join(shown) + more


def _wrong_cells(
    cohort: Cohort, features: NDArray[np.bool_], low: float, high: float
) -> tuple[int, str]:
    """Return how many cells lie outside the limits, and the first of them."""
    rows = np.flatnonzero(features)
    # a few hundred rows name five cells as well as all would
    block = cohort.values[rows[:500]]
    outside = (block < low) | (block > high)
    count = int(outside.sum())
    for start in range(500, len(rows), 500):
        block = cohort.values[rows[start : start + 500]]
        count += int(((block < low) | (block > high)).sum())
    return count, _cells(cohort, outside, rows)


def _absurd(cohort: Cohort, survey: Survey, scale: ScaleGuess) -> list[Finding]:
    if not scale.evidence:
        return []
    low, high = scale.absurd_below, scale.absurd_above
    hit = (survey.lowest < low) | (survey.highest > high)
    if not hit.any():
        return []
    count, cells = _wrong_cells(cohort, hit, low, high)
    return [
        Finding(
            code="value-absurd",
            severity="stop",
            where=WHERE,
            message=f"{counted(count, 'cell lies', 'cells lie')} far outside the range "
            f"of the others (98 % lie between {figure(scale.evidence['low'])} and "
            f"{figure(scale.evidence['high'])}): {cells}",
            next_step="Correct these cells, or leave them blank where they mean "
            "missing.",
        )
    ]


def _not_counts(cohort: Cohort, survey: Survey, scale: ScaleGuess) -> list[Finding]:
    """Return single negative or broken numbers among counts or linear values."""
    if scale.kind == "linear" and scale.evidence["share_negative"] >= 0.001:
        return []  # background was subtracted: such values belong to the method
    findings = []
    negative = survey.lowest < 0
    if scale.kind in ("counts", "linear") and negative.any():
        count, cells = _wrong_cells(cohort, negative, 0.0, np.inf)
        findings.append(
            Finding(
                code="values-negative",
                severity="warning",
                where=WHERE,
                message=f"{counted(count, 'value is', 'values are')} negative among "
                f"values that cannot be: {cells}",
                next_step="Correct them, or leave them blank where they mean missing.",
            )
        )
    return findings


def _mostly_missing(cohort: Cohort, survey: Survey) -> list[Finding]:
    findings = []
    limit = PREPARATION.max_missing_share
    sides = (
        ("features", survey.missing_of_feature / cohort.n_samples, cohort.features),
        ("samples", survey.missing_of_sample / cohort.n_features, cohort.samples),
    )
    for kind, shares, names in sides:
        hit = shares > limit
        if hit.any():
            findings.append(
                Finding(
                    code=f"{kind}-mostly-missing",
                    severity="warning",
                    where=WHERE,
                    message=f"more than {percent(limit)} of the values are missing "
                    f"in {hit.sum():,} of {len(names):,} {kind}: {quoted(names[hit])}",
                    next_step="Leave them out unless missing means below detection.",
                )
            )
    return findings


def _constant(cohort: Cohort, survey: Survey) -> list[Finding]:
    if not survey.constant.any():
        return []
    names = cohort.features[survey.constant]
    return [
        Finding(
            code="features-constant",
            severity="info",
            where=WHERE,
            message=f"{counted(len(names), 'feature has', 'features have')} a single "
            f"value wherever measured: {quoted(names)}",
            next_step="Nothing; they cannot be selected.",
        )
    ]


def _copies(cohort: Cohort, survey: Survey) -> list[Finding]:
    if not survey.copies:
        return []
    names = cohort.features
    pairs = [f"{names[later]} = {names[earlier]}" for earlier, later in survey.copies]
    return [
        Finding(
            code="features-copied",
            severity="warning",
            where=WHERE,
            message=f"{counted(len(pairs), 'feature has', 'features have')} exactly "
            f"the values of another one: {quoted(pairs)}",
            next_step="Keep one of each set: copies share their selections and look "
            "less stable than they are.",
        )
    ]


def _floor(cohort: Cohort, survey: Survey, scale: ScaleGuess) -> list[Finding]:
    """Return limits that show as many cells at one smallest value.

    Counts are left out: their zeros are counts.
    """
    if scale.kind in ("counts", "unknown") or survey.constant.all():
        return []
    measured = cohort.n_samples - survey.missing_of_feature
    bottom = np.nanmin(survey.lowest)
    common = int(survey.at_lowest[survey.lowest == bottom].sum())
    share = common / max(1, int(measured.sum()))
    own = survey.at_lowest / np.maximum(measured, 1)
    # three equal smallest values are few, whatever share they are
    floored = (own > FEATURE_FLOORED) & (survey.at_lowest > 3) & ~survey.constant
    if share > FLOORED:
        seen = (
            f"{percent(share)} of the values equal the smallest one, "
            f"{figure(float(bottom))}"
        )
    elif floored.any():
        seen = (
            f"{counted(int(floored.sum()), 'feature has', 'features have')} more than "
            f"{percent(FEATURE_FLOORED)} of the values at the feature's smallest: "
            f"{quoted(cohort.features[floored])}"
        )
    else:
        return []
    return [
        Finding(
            code="values-at-floor",
            severity="info",
            where=WHERE,
            message=f"{seen}, which points to values below a limit",
            next_step="Check whether it is a limit of detection: differences below it "
            "cannot be seen, and a floor of the new assay may lie elsewhere.",
        )
    ]


def _role_is(cohort: Cohort, *roles: str) -> NDArray[np.bool_]:
    given = cohort.feature_columns.get("role")
    if given is None:
        return np.zeros(cohort.n_features, dtype=bool)
    return np.isin(given.astype(str), roles)


def _roles(cohort: Cohort) -> list[Finding]:
    findings = []
    for role in ("control", "reference"):
        names = cohort.features[_role_is(cohort, role)]
        if len(names):
            findings.append(
                Finding(
                    code=f"{role}-features",
                    severity="info",
                    where="features, column 'role'",
                    message=f"{counted(len(names), 'feature has', 'features have')} "
                    f"the role {role}: {quoted(names)}",
                    next_step="Nothing; they are not offered as markers.",
                )
            )
    return findings
