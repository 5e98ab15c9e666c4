"""What a laboratory wants to know of each marker, beyond its statistics."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.config import Study
from panelkit.errors import InputDataError, StudyFileError, name_some
from panelkit.ingest import read_price_list, replicate_agreement
from panelkit.records import ANY_MARKER, Cohort, PriceList

__all__ = ["MarkerFacts", "allowed_candidates", "marker_facts"]

LIMIT = "limit_of_detection"
ASSAYABLE = "assayable"


@dataclass(frozen=True, slots=True, eq=False)
class MarkerFacts:
    """Facts of every feature.

    Attributes
    ----------
    symbol : ndarray of shape (n_features,), object
        As the feature sheet writes it, or ``""``.
    assayable : ndarray of shape (n_features,), object
        Platforms with an assay, joined by ``;``; a platform where it is unknown has a
        question mark behind it.
    below_limit_share : ndarray of shape (n_features,)
        Share of measured values below the feature sheet's limit of detection; NaN
        where it gives none.
    replicate_icc : ndarray of shape (n_features,)
        Intraclass correlation of technical replicates; NaN where there are none.
    """

    symbol: NDArray[np.object_]
    assayable: NDArray[np.object_]
    below_limit_share: NDArray[np.float64]
    replicate_icc: NDArray[np.float64]


def marker_facts(plan: Study, cohort: Cohort) -> MarkerFacts:
    """Return what the feature sheet, the price list and replicates say of each marker.

    Parameters
    ----------
    plan : Study
        Names the price list.
    cohort : Cohort
        Analysed samples and their technical replicates.

    Returns
    -------
    MarkerFacts
        For every feature of the cohort.

    Raises
    ------
    InputDataError
        A limit of detection that is no number, or files that cannot be read.
    """
    blank = np.full(cohort.n_features, "", object)
    columns = cohort.feature_columns
    return MarkerFacts(
        symbol=columns.get("symbol", blank),
        assayable=_assayable(plan, cohort),
        below_limit_share=_below_limit(cohort),
        replicate_icc=_replicate_icc(cohort),
    )


def allowed_candidates(plan: Study, cohort: Cohort) -> NDArray[np.bool_] | None:
    """Return which features may be candidates: those assayable on the named platform.

    A feature is allowed unless the price list says "no" or has no row for it, nor one
    for any marker. A column ``assayable`` of the feature sheet (platforms joined by
    ``;``) stands above the price list.

    Parameters
    ----------
    plan : Study
        ``[shortlist] candidates_on``.
    cohort : Cohort
        With the feature sheet's columns.

    Returns
    -------
    ndarray of shape (n_features,), bool, or None
        None where no platform is named.

    Raises
    ------
    StudyFileError
        A platform of which nothing is known.
    """
    platform = plan.shortlist.candidates_on
    if platform is None:
        return None
    known = _statuses(plan, cohort)
    if platform not in known:
        raise StudyFileError(
            code="platform-unknown",
            where=f"{plan.path}, [shortlist], key 'candidates_on'",
            what=f"neither the feature sheet's column '{ASSAYABLE}' nor a price list "
            f"names this platform (got {platform!r})",
            accepted=f"one of {name_some(known)}"
            if known
            else "a platform with a price list, or one in that column",
            next_step="Correct the name, or add the platform's price list",
        )
    statuses: NDArray[np.bool_] = known[platform] != "no"
    return statuses


def _statuses(plan: Study, cohort: Cohort) -> dict[str, NDArray[np.object_]]:
    """Return ok, unknown or no of every feature, by platform."""
    known: dict[str, NDArray[np.object_]] = {}
    if plan.panels.prices is not None:
        prices = read_price_list(plan.file(plan.panels.prices))
        for platform in prices.platforms:
            known[platform] = _from_prices(prices, platform, cohort)
    written = cohort.feature_columns.get(ASSAYABLE)
    if written is not None:
        named = [
            {part.strip() for part in str(cell).split(";")} - {""} for cell in written
        ]
        for platform in sorted(set().union(*named)):
            known[platform] = np.array(
                ["ok" if platform in own else "no" for own in named], object
            )
    return known


def _from_prices(
    prices: PriceList, platform: str, cohort: Cohort
) -> NDArray[np.object_]:
    own = {row.marker: row.status for row in prices.quotes(platform)}
    rest = own.get(ANY_MARKER, "no")
    return np.array([own.get(str(name), rest) for name in cohort.features], object)


def _assayable(plan: Study, cohort: Cohort) -> NDArray[np.object_]:
    told = np.full(cohort.n_features, "", object)
    marks = {"ok": "", "unknown": "?"}
    for platform, statuses in _statuses(plan, cohort).items():
        for j in np.flatnonzero(statuses != "no"):
            name = f"{platform}{marks[statuses[j]]}"
            told[j] = f"{told[j]};{name}" if told[j] else name
    return told


def _below_limit(cohort: Cohort) -> NDArray[np.float64]:
    written = cohort.feature_columns.get(LIMIT)
    share = np.full(cohort.n_features, np.nan)
    if written is None:
        return share
    for j in np.flatnonzero(written != ""):
        try:
            limit = float(written[j])
        except ValueError:
            raise InputDataError(
                code="limit-not-numeric",
                where=f"feature sheet, column '{LIMIT}', {cohort.features[j]}",
                what=f"no number (got {str(written[j])!r})",
                accepted="a number on the scale of the matrix, or a blank cell",
                next_step="Correct the cell",
            ) from None
        measured = cohort.values[j][~np.isnan(cohort.values[j])]
        if len(measured):
            share[j] = (measured < limit).mean()
    return share


def _replicate_icc(cohort: Cohort) -> NDArray[np.float64]:
    agreement = replicate_agreement(cohort)
    if agreement is None:
        return np.full(cohort.n_features, np.nan)
    return agreement.icc
