"""`check_study`: read and check, nothing else."""

import os
from dataclasses import replace
from pathlib import Path

from panelkit.config import Study, read_study
from panelkit.records import Cohort, Finding, Findings
from panelkit.workflow.cohort import load_cohort, load_prices
from panelkit.workflow.procedure import draws_of, procedure_of

__all__ = ["check_study"]

NEVER_ACCEPTED = ("subject-in-both-classes",)  # folds and halves need one class each


def check_study(study: "str | os.PathLike[str] | Study") -> Cohort:
    """Return the checked cohort of a study, its findings complete.

    A `stop` finding that the study accepts with a written reason becomes a warning
    that carries the reason.

    Parameters
    ----------
    study : path or Study
        The study file.

    Returns
    -------
    Cohort
        With the findings of the price list among its own.

    Raises
    ------
    StudyFileError, InputDataError, FitError
        With exit codes 2, 3 and 4.
    """
    plan = study if isinstance(study, Study) else read_study(Path(study))
    cohort = load_cohort(plan)
    _procedure, data, _findings = procedure_of(plan, cohort)
    draws_of(plan, data)
    _pricer, _hashes, price_findings = load_prices(plan)
    findings = (*cohort.findings, *price_findings)
    settled = tuple(_settled(item, plan) for item in findings)
    return replace(cohort, findings=Findings(settled))


def _settled(item: Finding, plan: Study) -> Finding:
    reason = plan.cohort.accept.get(item.code, "")
    if item.severity != "stop" or not reason or item.code in NEVER_ACCEPTED:
        return item
    return Finding(
        item.code,
        "warning",
        item.where,
        f"{item.message} (accepted by the study: {reason})",
        item.next_step,
    )
