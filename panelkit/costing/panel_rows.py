"""Rows of a price list as the assays of one panel, checked."""

from collections.abc import Iterable, Mapping, Sequence

from panelkit.config import ProgrammeSection
from panelkit.costing.direct_cost import Panel
from panelkit.errors import InputDataError, NoPanelError, UsageError, name_some
from panelkit.records import ANY_MARKER, AssayPrice, Conflicts

__all__ = [
    "Assay",
    "as_assays",
    "as_panel",
    "can_be_direct",
    "check_conflicts",
    "check_makeable",
    "missing_quotes",
]

Assay = AssayPrice | Mapping[str, object]


def as_assays(rows: Iterable[Assay], argument: str) -> list[AssayPrice]:
    """Return rows of a price list as assays.

    Raises
    ------
    UsageError
        They are no list of rows.
    InputDataError
        A cell is not what its column accepts.
    """
    if isinstance(rows, Mapping | str):
        raise UsageError(
            code="rows-expected",
            where=argument,
            what=f"one row alone is no list of rows (got {type(rows).__name__})",
            accepted="a list of rows of the price list",
            next_step="Put the rows in a list",
        )
    assays = []
    for number, row in enumerate(rows, start=1):
        if not isinstance(row, AssayPrice | Mapping):
            raise UsageError(
                code="row-expected",
                where=f"{argument}, row {number}",
                what=f"the row has no columns (got {type(row).__name__})",
                accepted="a mapping from column to cell, or an AssayPrice",
                next_step="Pass rows of the price list",
            )
        if isinstance(row, Mapping):
            row = AssayPrice.from_row(row, where=f"{argument}, row {number}")
        assays.append(row)
    return assays


def as_panel(rows: Iterable[Assay]) -> Panel:
    """Return rows of a price list as one panel.

    Raises
    ------
    UsageError
        A marker is unnamed or repeated, rows are of several platforms, or no row is a
        marker.
    """
    assays = as_assays(rows, "assays")
    _check_names(assays)
    platforms = sorted({assay.platform for assay in assays})
    if len(platforms) > 1:
        raise UsageError(
            code="platforms-mixed",
            where="assays, column 'platform'",
            what=f"the rows are of several platforms (got {name_some(platforms)})",
            accepted="rows of one platform",
            next_step="Price each platform on its own",
        )
    markers = tuple(assay for assay in assays if assay.role == "marker")
    if not markers:
        raise UsageError(
            code="panel-empty",
            where="assays",
            what=f"the panel has no marker (got {len(assays)} references)",
            accepted="at least one row with role 'marker'",
            next_step="Add the markers of the panel",
        )
    references = tuple(assay for assay in assays if assay.role == "reference")
    return Panel(platforms[0], markers, references)


def _check_names(assays: Sequence[AssayPrice]) -> None:
    names = [assay.marker for assay in assays]
    if ANY_MARKER in names:
        raise UsageError(
            code="marker-unnamed",
            where="assays, column 'marker'",
            what=f"'{ANY_MARKER}' prices other markers and is none itself "
            f"(got {ANY_MARKER!r})",
            accepted="rows of named markers",
            next_step="Name the markers; PriceList.for_panel looks up their prices",
        )
    repeated = sorted({name for name in names if names.count(name) > 1})
    if repeated:
        raise UsageError(
            code="marker-repeated",
            where="assays, column 'marker'",
            what=f"assays are listed twice (got {name_some(repeated)})",
            accepted="one row for each marker and reference",
            next_step="Remove the repeated rows",
        )


def check_makeable(panel: Panel) -> None:
    """Refuse a panel of which an assay cannot be made on its platform.

    Raises
    ------
    NoPanelError
        At least one has status ``no``.
    """
    impossible = [assay.marker for assay in panel.assays if assay.status == "no"]
    if impossible:
        raise NoPanelError(
            code="marker-cannot-be-assayed",
            where="assays, column 'status'",
            what=f"these cannot be assayed here (got {name_some(impossible)})",
            accepted="assays with status ok or unknown",
            next_step="Leave them out, name stand-ins, or take another platform",
        )


def check_conflicts(panel: Panel, conflicts: Conflicts) -> None:
    """Refuse a panel of two markers that must not be in one.

    Raises
    ------
    NoPanelError
        The first such pair is named.
    """
    pairs = conflicts.among((assay.marker for assay in panel.markers), "panel")
    if pairs:
        raise NoPanelError(
            code="markers-exclude-each-other",
            where="conflicts, scope 'panel'",
            what=f"{pairs[0][0]} and {pairs[0][1]} must not be in one panel "
            f"(got {len(pairs)} such pairs)",
            accepted="at most one marker of each pair",
            next_step="Leave one of the two out",
        )


def can_be_direct(programme: ProgrammeSection, assay: AssayPrice) -> bool:
    """Return whether an assay may be run by itself: makeable and, if asked, priced."""
    priced = not assay.is_missing_quote
    priced = priced or programme.missing_price in ("bound", "impute")
    return assay.status != "no" and priced


def missing_quotes(programme: ProgrammeSection, panel: Panel) -> list[AssayPrice]:
    """Return the assays without a complete quote, where the policy accepts them.

    Raises
    ------
    InputDataError
        Prices are missing and the programme refuses that.
    NoPanelError
        Such markers may not enter a panel.
    """
    missing = [assay for assay in panel.assays if assay.is_missing_quote]
    named = name_some(assay.marker for assay in missing)
    if missing and programme.missing_price == "refuse":
        raise InputDataError(
            code="price-missing",
            where="assays, columns 'dev' and 'test'",
            what=f"{len(missing)} assays have no complete quote (got {named})",
            accepted="a one-off cost, and a test price, pack or tiers, for each",
            next_step='Ask for quotes, or set missing_price = "bound"',
        )
    if missing and programme.missing_price == "exclude":
        raise NoPanelError(
            code="marker-without-price",
            where="assays, columns 'dev' and 'test'",
            what=f"assays without a complete quote may not enter a panel (got {named})",
            accepted="panels of priced assays, since missing_price is 'exclude'",
            next_step='Leave them out, or set missing_price = "bound"',
        )
    return missing
