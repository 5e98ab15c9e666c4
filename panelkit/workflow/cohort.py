"""From a study file to its cohort and its prices."""

from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from panelkit.config import Study
from panelkit.costing import PanelPricer
from panelkit.errors import InputDataError, StudyFileError, name_some
from panelkit.ingest import read_cohort, read_conflicts, read_price_list
from panelkit.records import NO_CONFLICTS, Cohort, Findings, PriceList
from panelkit.runtime import hash_of_file
from panelkit.workflow.price_checks import conflict_findings, kit_findings

__all__ = [
    "NEVER_ACCEPTED",
    "barred_features",
    "feature_positions",
    "load_cohort",
    "load_prices",
    "refuse_stops",
]

NEVER_ACCEPTED = (
    "no-usable-feature",  # there is nothing to fit
    "subject-in-both-classes",  # folds and halves need one class each
)


def load_cohort(study: Study, *, open_set_aside: str | None = None) -> Cohort:
    """Return the checked cohort of a study.

    Parameters
    ----------
    study : Study
        The study.
    open_set_aside : str or None
        The reason for reading the rows that were set aside, and no other.

    Raises
    ------
    StudyFileError
        The study names no outcome.
    InputDataError
        The data cannot be used.
    """
    section = study.cohort
    if section.outcome is None and section.time is None and section.event is None:
        raise StudyFileError(
            code="outcome-missing",
            where=f"{study.path}, [cohort], key 'outcome'",
            what="no outcome is named",
            accepted="a column of the sample sheet: outcome with positive, classes or "
            "kind; or time with event",
            next_step="Add outcome and positive, or time and event",
        )

    def path(name: str | None) -> Path | None:
        return None if name is None else study.file(name)

    named = section.expression
    return read_cohort(
        study.file(named)
        if isinstance(named, str)
        else [study.file(name) for name in named],
        path(section.samples),
        outcome=section.outcome,
        positive=section.positive,
        negative=section.negative,
        kind=section.kind,
        classes=section.classes,
        unit=section.unit,
        time=section.time,
        event=section.event,
        event_value=section.event_value,
        censored_value=section.censored_value,
        horizon=section.horizon,
        time_unit=section.time_unit,
        subject=section.subject,
        site=section.site,
        batch=section.batch,
        matched_set=section.matched_set,
        run_order=section.run_order,
        replicate_of=section.replicate_of,
        folds=section.folds,
        design=study.design.kind,
        prevalence=study.design.prevalence,
        features=path(section.features),
        assays=path(section.assays),
        platforms=tuple(study.platforms) or None,
        keep=section.keep or None,
        set_aside=section.set_aside or None,
        open_set_aside=open_set_aside,
        openings=path(section.openings),
        orientation=section.orientation,
        covariates=section.covariates,
        nuisance=section.nuisance,
        max_bad_cells=section.max_bad_cells,
        format=section.format,
        layer=section.layer,
        sheet=section.sheet,
        row_names=path(section.row_names),
        column_names=path(section.column_names),
        join=section.join,
    )


def refuse_stops(findings: Findings) -> None:
    """Refuse to go on while there is a `stop` finding.

    Raises
    ------
    InputDataError
        A finding says that results would mislead.
    """
    if stops := findings.of("stop"):
        first = stops[0]
        next_step = first.next_step.rstrip(".")
        accepted = "a cohort without a `stop` finding"
        if first.code not in NEVER_ACCEPTED:
            accepted += ", or a written reason for each"
            next_step += "; or write the reason as [cohort] "
            next_step += f'accept = {{ "{first.code}" = "..." }}'
        raise InputDataError(
            code=first.code,
            where=first.where,
            what=f"results would mislead: {first.message.rstrip('.')}",
            accepted=accepted,
            next_step=next_step,
        )


PRICED_BY = ("assay", "analyte", "symbol")
"""Columns of features by which a list may price them, the closest first."""


def _priced_as(cohort: Cohort, study: Study, prices: PriceList) -> dict[str, str]:
    """Return the assay, analyte or symbol of each feature that prices or kits name."""
    known = {row.marker for row in prices.rows}
    known |= {name for kit in study.kits for name in kit.markers}
    found: dict[str, str] = {}
    for column in PRICED_BY:
        names = cohort.feature_columns.get(column, ())
        for feature, name in zip(cohort.features, names, strict=False):
            if name in known:
                found.setdefault(str(feature), str(name))
    return found


def load_prices(
    study: Study, cohort: Cohort
) -> tuple[PanelPricer | None, dict[str, str], Findings]:
    """Return what prices panels, the hashes of its files, and what was noticed.

    Raises
    ------
    InputDataError
        The price list cannot be used.
    """
    if study.programme is None or study.panels.prices is None:
        return None, {}, Findings()
    path = study.file(study.panels.prices)
    prices = read_price_list(path)
    prices = replace(prices, analytes=_priced_as(cohort, study, prices))
    unknown = [name for name in study.platforms if name not in prices.platforms]
    if unknown:
        raise InputDataError(
            code="platform-without-prices",
            where=f"{path}, column 'platform'",
            what=f"no row for platform {name_some(unknown)}",
            accepted="rows for every platform of the study (the list has "
            f"{name_some(prices.platforms)})",
            next_step="Add a row for each marker, or one with marker '*'",
        )
    hashes = {"prices": hash_of_file(path)}
    conflicts = NO_CONFLICTS
    if study.panels.conflicts is not None:
        kept_apart = study.file(study.panels.conflicts)
        conflicts = read_conflicts(kept_apart)
        hashes["conflicts"] = hash_of_file(kept_apart)
    pricer = PanelPricer(
        study.programme, study.platforms, prices, study.kits, conflicts
    )
    noticed = [
        *prices.findings,
        *kit_findings(study.kits, prices, "study and platform files"),
        *conflict_findings(conflicts, prices, "conflict list"),
    ]
    return pricer, hashes, Findings(tuple(noticed))


def feature_positions(
    cohort: Cohort, names: tuple[str, ...], where: str
) -> NDArray[np.int64]:
    """Return the positions of features by their ids.

    Raises
    ------
    InputDataError
        An id that the matrix does not have.
    """
    known = {name: k for k, name in enumerate(cohort.features)}
    unknown = [name for name in names if name not in known]
    if unknown:
        raise InputDataError(
            code="unknown-feature",
            where=where,
            what=f"the matrix has no feature {name_some(unknown)}",
            accepted="feature ids as the expression matrix writes them",
            next_step="Correct the ids",
        )
    return np.array([known[name] for name in names], np.int64)


def barred_features(study: Study, cohort: Cohort) -> NDArray[np.object_]:
    """Return why each feature may not enter a panel, ``""`` for those that may.

    Raises
    ------
    InputDataError
        The study bars a feature that the matrix does not have.
    """
    reasons = np.full(cohort.n_features, "", object)
    roles = cohort.feature_columns.get("role")
    if roles is not None:
        for role in ("control", "reference"):
            reasons[roles == role] = f"its role is {role}"
    assayable = cohort.feature_columns.get("assayable")
    if assayable is not None:
        own = set(study.platforms)
        cannot = [
            not (own & set(names) if own else any(names))
            for names in (cell.split(";") for cell in assayable)
        ]
        reasons[np.array(cannot, bool) & (reasons == "")] = (
            "the feature sheet names no platform on which it is assayable"
        )
    where = f"{study.path}, [shortlist], key 'never'"
    reasons[feature_positions(cohort, study.shortlist.never, where)] = (
        "named under [shortlist] never"
    )
    return reasons
