"""All findings of a cohort in one list."""

from dataclasses import replace
from typing import Any

import numpy as np

from panelkit.ingest.control_checks import check_controls
from panelkit.ingest.design_checks import check_design, check_level_shift
from panelkit.ingest.id_checks import check_ids
from panelkit.ingest.missing_checks import check_missing, missing_groups
from panelkit.ingest.replicate_checks import check_replicates
from panelkit.ingest.sample_checks import check_samples
from panelkit.ingest.scale import ScaleGuess, guess_scale, scale_finding
from panelkit.ingest.sex_check import check_sex
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.subject_hints import check_subject_named
from panelkit.ingest.survey import Survey, survey_values
from panelkit.ingest.tie_checks import check_ties
from panelkit.ingest.value_checks import check_values
from panelkit.records import Cohort, Finding, Findings

__all__ = ["check_cohort"]


def check_cohort(cohort: Cohort, study: Any = None) -> Findings:
    """Return all findings of a cohort: those made while reading, and its checks.

    Parameters
    ----------
    cohort : Cohort
        Read by `read_cohort`, or built by hand.
    study : Study or None
        Its `cohort.nuisance` names further columns to hold against the outcome.

    Returns
    -------
    Findings
        Each once; what stops first, then warnings, then information, each in the
        order of the work: reading, ids, values, samples, design.

    Raises
    ------
    InputDataError
        When the study names a nuisance column that does not exist.
    """
    nuisance = getattr(getattr(study, "cohort", None), "nuisance", ()) or ()
    known = Sheet("samples", cohort.samples, cohort.sample_columns)
    for name in nuisance:
        known.column(name, "nuisance")
    survey = survey_values(cohort.values, missing_groups(cohort))
    scale = _with_extremes(guess_scale(cohort.values), survey)
    made: list[Finding] = [
        *cohort.findings,
        *check_ids(list(cohort.samples), list(cohort.features)),
        *check_values(cohort, survey, scale),
        *check_missing(cohort, survey),
        scale_finding(scale, "expression"),
        *check_samples(cohort, scale),
        *check_sex(cohort, scale),
        *check_controls(cohort),
        *check_replicates(cohort, scale),
        *check_design(cohort),
        *check_subject_named(cohort),
        *check_ties(cohort, nuisance),
        *check_level_shift(cohort, scale),
    ]
    return Findings(tuple(made)).ordered()


def _with_extremes(scale: ScaleGuess, survey: Survey) -> ScaleGuess:
    """Return the guess with the extremes of all features, not only those looked at."""
    if not scale.evidence:
        return scale
    extremes = {
        "minimum": float(np.nanmin(survey.lowest)),
        "maximum": float(np.nanmax(survey.highest)),
    }
    return replace(scale, evidence={**scale.evidence, **extremes})
