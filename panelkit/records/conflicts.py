"""Markers that must be kept apart: in a pool, or in a panel."""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Literal

from panelkit.errors import InputDataError
from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["CONFLICT_COLUMNS", "NO_CONFLICTS", "Conflict", "Conflicts"]

CONFLICT_COLUMNS: Final = ("marker_a", "marker_b", "scope")
"""Columns of a conflict list."""

Scope = Literal["pool", "panel"]


@dataclass(frozen=True, slots=True)
class Conflict:
    """Two markers that must be kept apart.

    Attributes
    ----------
    marker_a, marker_b : str
        The pair, in either order.
    scope : {"pool", "panel"}
        Not in one pool (they disturb one another), or not in one panel.
    """

    marker_a: str
    marker_b: str
    scope: Scope = "pool"


@dataclass(frozen=True, slots=True, eq=False)
class Conflicts(Record):
    """All pairs of markers that must be kept apart.

    Attributes
    ----------
    pairs : tuple of Conflict
        In file order.
    """

    pairs: tuple[Conflict, ...] = ()

    def __post_init__(self) -> None:
        """Refuse a pair of one marker."""
        for pair in self.pairs:
            if pair.marker_a == pair.marker_b:
                raise InputDataError(
                    code="conflict-with-itself",
                    where="conflicts",
                    what=f"a marker is kept apart from itself (got {pair.marker_a!r})",
                    accepted="two different markers",
                    next_step="Correct or remove the pair",
                )
        Record.__post_init__(self)

    def among(
        self, markers: Iterable[str], scope: Scope
    ) -> tuple[tuple[str, str], ...]:
        """Return the pairs of one scope of which both markers are there.

        Parameters
        ----------
        markers : iterable of str
            A panel or a pool.
        scope : {"pool", "panel"}
            Which pairs.

        Returns
        -------
        tuple of (str, str)
            In file order.
        """
        there = set(markers)
        return tuple(
            (pair.marker_a, pair.marker_b)
            for pair in self.pairs
            if pair.scope == scope and {pair.marker_a, pair.marker_b} <= there
        )

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a pair, in the columns of a conflict list."""
        return frame(
            {
                name: [getattr(pair, name) for pair in self.pairs]
                for name in CONFLICT_COLUMNS
            }
        )


NO_CONFLICTS: Final = Conflicts()
"""Nothing has to be kept apart."""
