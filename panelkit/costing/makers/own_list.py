"""The user's own markers, in the user's own order."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.makers.contract import Evidence
from panelkit.errors import StudyFileError

__all__ = ["by_own_list"]


def by_own_list(evidence: Evidence, sizes: Sequence[int]) -> list[NDArray[np.int64]]:
    """Return the first markers of the user's own list.

    Its accuracy is honest only where the list was made without these data: nothing is
    learnt here that a held-out person could be kept from.

    Raises
    ------
    StudyFileError
        No list is given.
    """
    if evidence.own is None:
        raise StudyFileError(
            code="own-list-missing",
            where="[panels] makers, 'own'",
            what="no list of markers is given",
            accepted="[panels] own = [...] beside the maker 'own'",
            next_step="Name the markers, or leave the maker out",
        )
    return [evidence.own[:size] for size in sizes]
