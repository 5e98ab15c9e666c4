"""Reading a conflict list: pairs of markers that must be kept apart."""

from pathlib import Path
from typing import Literal, cast

from panelkit.errors import InputDataError, name_some
from panelkit.ingest.csv_rows import read_header, read_lines, take_cells
from panelkit.records import CONFLICT_COLUMNS, Conflict, Conflicts

__all__ = ["read_conflicts"]

Scope = Literal["pool", "panel"]
NEEDED_COLUMNS = ("marker_a", "marker_b")


def read_conflicts(path: str | Path) -> Conflicts:
    """Return the pairs of markers that a CSV file keeps apart.

    Parameters
    ----------
    path : str or Path
        A comma-separated file with the columns marker_a, marker_b and, where it is
        not always ``pool``, scope.

    Returns
    -------
    Conflicts
        In file order.

    Raises
    ------
    InputDataError
        If the file cannot be read, a column is unknown or missing, a scope is
        unknown, a name is empty, a pair is listed twice or is of one marker.
    """
    name = str(path)
    lines = read_lines(path)
    header, head = read_header(lines, name, NEEDED_COLUMNS, CONFLICT_COLUMNS)
    if strangers := [column for column in header if column not in CONFLICT_COLUMNS]:
        raise InputDataError(
            code="column-unknown",
            where=f"{head}, column '{strangers[0]}'",
            what=f"a conflict list has no such column (got {name_some(strangers)})",
            accepted=f"the columns are {', '.join(CONFLICT_COLUMNS)}",
            next_step="Rename or remove the column",
        )
    pairs: list[Conflict] = []
    places: dict[tuple[frozenset[str], str], int] = {}
    for number, cells in lines:
        where = f"{name}, line {number}"
        pair = _pair(take_cells(cells, header, name, number), where)
        key = (frozenset((pair.marker_a, pair.marker_b)), pair.scope)
        if key in places:
            raise InputDataError(
                code="conflict-repeated",
                where=where,
                what=f"{pair.marker_a} and {pair.marker_b} are there already "
                f"(first on line {places[key]})",
                accepted="each pair once, in either order",
                next_step="Remove one of the lines",
            )
        places[key] = number
        pairs.append(pair)
    return Conflicts(tuple(pairs))


def _pair(cells: dict[str, str], where: str) -> Conflict:
    scope = cells.get("scope") or "pool"
    if scope not in ("pool", "panel"):
        raise InputDataError(
            code="choice-unknown",
            where=f"{where}, column 'scope'",
            what=f"the cell holds no known word (got {scope!r})",
            accepted="accepted are pool, panel, or an empty cell for pool",
            next_step="Correct the cell",
        )
    first, second = cells["marker_a"], cells["marker_b"]
    if not first or not second or first == second:
        raise InputDataError(
            code="conflict-with-itself",
            where=where,
            what=f"the line names no two markers (got {first!r} and {second!r})",
            accepted="two different markers",
            next_step="Correct or remove the line",
        )
    return Conflict(first, second, cast("Scope", scope))
