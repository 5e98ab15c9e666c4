"""`check_study`: read and check, nothing else."""

import os
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from panelkit.config import Study, read_study
from panelkit.costing import (
    USING_PRICES,
    Draws,
    PanelPricer,
    Procedure,
    ProcedureData,
)
from panelkit.ingest import check_usable
from panelkit.records import Cohort, Finding, Findings
from panelkit.workflow.cohort import NEVER_ACCEPTED, load_cohort, load_prices
from panelkit.workflow.marker_facts import marker_facts
from panelkit.workflow.procedure import draws_of, procedure_of

__all__ = ["CheckedStudy", "check_study", "checked"]


@dataclass(frozen=True, slots=True, eq=False)
class CheckedStudy:
    """What a study becomes once its files are read, before anything is fitted.

    Attributes
    ----------
    cohort : Cohort
        With the findings of the price list among its own.
    procedure : Procedure
        What is repeated in every fold.
    data : ProcedureData
        What it is repeated on.
    size_findings : tuple of Finding
        Panel sizes that were left out.
    draws : Draws
        Every fold and subsample.
    pricer : PanelPricer or None
        None: nothing is priced.
    price_hashes : mapping of str to str
        Hashes of the files that prices came from.
    """

    cohort: Cohort
    procedure: Procedure
    data: ProcedureData
    size_findings: tuple[Finding, ...]
    draws: Draws
    pricer: PanelPricer | None
    price_hashes: Mapping[str, str]


def check_study(study: "str | os.PathLike[str] | Study") -> Cohort:
    """Return the checked cohort of a study, its findings complete.

    A `stop` finding that the study accepts with a written reason becomes a warning
    that carries the reason; an acceptance that changes nothing is itself a finding.

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
    return checked(plan).cohort


def checked(plan: Study) -> CheckedStudy:
    """Return the checked cohort of a study and all that is known before the first fit.

    Parameters
    ----------
    plan : Study
        The study.

    Returns
    -------
    CheckedStudy
        Its cohort may still hold `stop` findings.

    Raises
    ------
    StudyFileError, InputDataError, FitError
        With exit codes 2, 3 and 4.
    """
    cohort = load_cohort(plan)
    procedure, data, size_findings = procedure_of(plan, cohort)
    draws = draws_of(plan, data)
    pricer, price_hashes, price_findings = load_prices(plan, cohort)
    data = replace(
        data,
        price=_prices_alone(plan, cohort, pricer),
        reliability=marker_facts(plan, cohort).replicate_icc,
    )
    more = tuple(price_findings)
    if not any(item.code == "no-usable-feature" for item in cohort.findings):
        more = (*more, *check_usable(cohort, data.barred != ""))
    return CheckedStudy(
        _settled_findings(plan, cohort, more),
        procedure,
        data,
        tuple(size_findings),
        draws,
        pricer,
        price_hashes,
    )


def _prices_alone(
    plan: Study, cohort: Cohort, pricer: PanelPricer | None
) -> NDArray[np.float64] | None:
    """Return what each marker costs alone, where a maker weighs it."""
    if pricer is None or not set(USING_PRICES) & set(plan.panels.makers):
        return None
    return pricer.alone([str(feature) for feature in cohort.features])


def _settled_findings(plan: Study, cohort: Cohort, found: Iterable[Finding]) -> Cohort:
    """Return the cohort with further findings, those accepted settled."""
    findings = (*cohort.findings, *found)
    settled = tuple(_settled(item, plan) for item in findings)
    idle = tuple(_idle_acceptances(findings, plan))
    return replace(cohort, findings=Findings((*settled, *idle)).ordered())


def _idle_acceptances(findings: Iterable[Finding], plan: Study) -> Iterator[Finding]:
    stops = {item.code for item in findings if item.severity == "stop"}
    for code, reason in plan.cohort.accept.items():
        if code in NEVER_ACCEPTED:
            why = "this finding can't be accepted"
        elif code not in stops:
            why = "no `stop` finding of this cohort has this code"
        elif not reason.strip():
            why = "it gives no reason"
        else:
            continue
        yield Finding(
            code="acceptance-without-effect",
            severity="warning",
            where=f"the study file, [cohort] accept, {code}",
            message=f"The acceptance of {code} changes nothing: {why}",
            next_step="Correct the code or the reason, or take the entry out.",
        )


def _settled(item: Finding, plan: Study) -> Finding:
    reason = plan.cohort.accept.get(item.code, "").strip()
    if item.severity != "stop" or not reason or item.code in NEVER_ACCEPTED:
        return item
    return Finding(
        item.code,
        "warning",
        item.where,
        f"{item.message} (accepted by the study: {reason})",
        item.next_step,
    )
