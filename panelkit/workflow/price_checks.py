"""What is noticed about kits and conflicts beside a price list."""

from collections.abc import Iterator, Sequence

from panelkit.config import KitSection
from panelkit.errors import name_some
from panelkit.records import ANY_MARKER, Conflicts, Finding, PriceList

__all__ = ["conflict_findings", "kit_findings"]


def _known(prices: PriceList) -> set[str]:
    rows = {row.marker for row in prices.rows}
    return rows | set(prices.analytes) | set(prices.analytes.values())


def kit_findings(
    kits: Sequence[KitSection], prices: PriceList, where: str
) -> Iterator[Finding]:
    """Return a warning for each kit of markers that nothing else names.

    Parameters
    ----------
    kits : sequence of KitSection
        As read.
    prices : PriceList
        Names markers; with a row for any marker every name is known.
    where : str
        The file of the kits.

    Yields
    ------
    Finding
        ``kit-marker-unknown``.
    """
    known = _known(prices)
    if ANY_MARKER in known:
        return
    for kit in kits:
        strangers = [name for name in kit.markers if name not in known]
        if strangers:
            yield Finding(
                code="kit-marker-unknown",
                severity="warning",
                where=f"{where}, [[kit]] '{kit.id}'",
                message=f"{len(strangers)} of its {len(kit.markers)} markers are not "
                f"in the price list: {name_some(strangers)}",
                next_step="Check the spelling; they count as unwanted",
            )


def conflict_findings(
    pairs: Conflicts, prices: PriceList, where: str
) -> Iterator[Finding]:
    """Return a warning for pairs of markers that nothing else names.

    Parameters
    ----------
    pairs : Conflicts
        As read.
    prices : PriceList
        Names markers; with a row for any marker every name is known.
    where : str
        The file of the pairs.

    Yields
    ------
    Finding
        ``conflict-marker-unknown``.
    """
    known = _known(prices)
    named = {name for p in pairs.pairs for name in (p.marker_a, p.marker_b)}
    strangers = sorted(named - known)
    if strangers and ANY_MARKER not in known:
        yield Finding(
            code="conflict-marker-unknown",
            severity="warning",
            where=where,
            message=f"{len(strangers)} markers are not in the price list: "
            f"{name_some(strangers)}",
            next_step="Check the spelling",
        )
