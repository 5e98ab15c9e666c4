"""Makers: procedures that propose a panel of a given size."""

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import StudyFileError, name_some
from panelkit.records import Stability

__all__ = ["MAKERS", "Evidence", "Maker", "evidence_of", "maker_named"]


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """What a maker may know, learnt on training rows alone.

    Attributes
    ----------
    candidates : ndarray of int64
        Features that may be chosen.
    frequency : ndarray of shape (n_features,)
        How often (or, on a single half, how early) each feature was picked.
    t : ndarray of shape (n_features,)
        Welch's t.
    """

    candidates: NDArray[np.int64]
    frequency: NDArray[np.float64]
    t: NDArray[np.float64]


class Maker(Protocol):
    """Proposes panels; the same procedure in every fold."""

    def __call__(self, evidence: Evidence, size: int) -> NDArray[np.int64]:
        """Return at most `size` of the candidates, first choice first."""
        ...


def by_frequency(evidence: Evidence, size: int) -> NDArray[np.int64]:
    """Return the candidates picked most often; ties by |t|, then by column."""
    candidates = evidence.candidates
    order = np.lexsort(
        (candidates, -np.abs(evidence.t[candidates]), -evidence.frequency[candidates])
    )
    return candidates[order][:size]


def by_difference(evidence: Evidence, size: int) -> NDArray[np.int64]:
    """Return the candidates with the largest |t|; ties by column."""
    candidates = evidence.candidates
    order = np.lexsort((candidates, -np.abs(evidence.t[candidates])))
    return candidates[order][:size]


MAKERS: dict[str, Maker] = {"frequency": by_frequency, "univariate": by_difference}


def maker_named(name: str) -> Maker:
    """Return a maker by its name.

    Raises
    ------
    StudyFileError
        No maker of that name.
    """
    if name not in MAKERS:
        raise StudyFileError(
            code="unknown-maker",
            where="[panels] makers",
            what=f"no such maker (got {name!r})",
            accepted=f"makers are {name_some(MAKERS)}",
            next_step="Correct the name",
        )
    return MAKERS[name]


def evidence_of(stability: Stability) -> Evidence:
    """Return what makers may know of a stability selection."""
    return Evidence(stability.candidates, stability.frequency, stability.t)
