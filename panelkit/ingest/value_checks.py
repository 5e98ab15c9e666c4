"""What the numbers of a cohort show: gaps, constants, copies, scale, controls."""

import hashlib
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.ingest.wording import counted, percent, quoted
from panelkit.records import Cohort, Finding

__all__ = ["check_values"]

WHERE = "expression"

_TILE = 2048
"""Features looked at together, so that no copy of the matrix is needed."""


@dataclass(frozen=True, slots=True, eq=False)
class _Survey:
    """What one pass over the matrix tells about each feature and sample."""

    missing_of_feature: NDArray[np.int64]
    missing_of_sample: NDArray[np.int64]
    constant: NDArray[np.bool_]
    copies: list[tuple[int, int]]


def check_values(cohort: Cohort) -> list[Finding]:
    """Return what the matrix itself shows.

    Parameters
    ----------
    cohort : Cohort
        The cohort.

    Returns
    -------
    list of Finding
        Missing values, constant and copied features, control features.
    """
    survey = _survey(cohort.values)
    return [
        *_missing(cohort, survey),
        *_constant(cohort, survey),
        *_copies(cohort, survey),
        *_controls(cohort),
    ]


def _survey(values: NDArray[np.floating[Any]]) -> _Survey:
    n_features, n_samples = values.shape
    missing_of_feature = np.zeros(n_features, dtype=np.int64)
    missing_of_sample = np.zeros(n_samples, dtype=np.int64)
    constant = np.zeros(n_features, dtype=bool)
    first: dict[bytes, int] = {}
    copies = []
    for start in range(0, n_features, _TILE):
        tile = values[start : start + _TILE]
        stop = start + len(tile)
        missing = np.isnan(tile)
        missing_of_feature[start:stop] = missing.sum(axis=1)
        missing_of_sample += missing.sum(axis=0)
        # fmin and fmax pass over NaN; where all is missing NaN is not equal to NaN
        constant[start:stop] = np.fmin.reduce(tile, axis=1) == np.fmax.reduce(
            tile, axis=1
        )
        comparable = np.ascontiguousarray(tile + 0.0)  # -0.0 becomes 0.0
        for offset, row in enumerate(comparable):
            place = start + offset
            if constant[place] or missing_of_feature[place] == n_samples:
                continue
            digest = hashlib.blake2b(row, digest_size=16).digest()
            earlier = first.setdefault(digest, place)
            if earlier != place:
                copies.append((earlier, place))
    return _Survey(missing_of_feature, missing_of_sample, constant, copies)


def _missing(cohort: Cohort, survey: _Survey) -> list[Finding]:
    total = int(survey.missing_of_feature.sum())
    if not total:
        return []
    incomplete = int(np.count_nonzero(survey.missing_of_feature))
    findings = [
        Finding(
            code="values-missing",
            severity="info",
            where=WHERE,
            message=f"{percent(total / cohort.values.size)} of the values are missing "
            f"({total:,}, in "
            f"{counted(incomplete, 'feature', 'features')})",
            next_step="Check why; they are imputed from training rows.",
        )
    ]
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


def _constant(cohort: Cohort, survey: _Survey) -> list[Finding]:
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


def _copies(cohort: Cohort, survey: _Survey) -> list[Finding]:
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


def _controls(cohort: Cohort) -> list[Finding]:
    roles = cohort.feature_columns.get("role")
    findings = []
    for role in ("control", "reference") if roles is not None else ():
        names = cohort.features[np.asarray(roles == role, dtype=bool)]
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
