"""All findings of a cohort in one list."""

from typing import Any

from panelkit.ingest.alignment import near_equal_ids
from panelkit.ingest.design_checks import check_design, check_level_shift, check_ties
from panelkit.ingest.scale import guess_scale, scale_finding
from panelkit.ingest.sheet import Sheet
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
        Each once, in the order of the work: reading, values, design.

    Raises
    ------
    InputDataError
        When the study names a nuisance column that does not exist.
    """
    nuisance = getattr(getattr(study, "cohort", None), "nuisance", ()) or ()
    known = Sheet("samples", cohort.samples, cohort.sample_columns)
    for name in nuisance:
        known.column(name, "nuisance")
    scale = guess_scale(cohort.values)
    made: list[Finding] = [
        *cohort.findings,
        *near_equal_ids(list(cohort.samples), "sample ids"),
        *near_equal_ids(list(cohort.features), "feature ids"),
        *check_values(cohort),
        scale_finding(scale, "expression"),
        *check_design(cohort),
        *check_ties(cohort, nuisance),
        *check_level_shift(cohort, scale),
    ]
    return Findings(tuple(dict.fromkeys(made)))
