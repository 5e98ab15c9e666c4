"""Which assay measures which feature."""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["AssayMap"]


@dataclass(frozen=True, slots=True, eq=False)
class AssayMap(Record):
    """Feature to analyte to assay: many features may share one of either.

    Attributes
    ----------
    feature : ndarray of shape (n_rows,), object
        Feature ids (probes, peptides, transcripts), each once.
    analyte : ndarray of shape (n_rows,), object
        What the feature stands for: a gene, a protein, a metabolite.
    assay : ndarray of shape (n_rows,), object
        What is ordered to measure it; ``""`` where none is known.
    """

    feature: NDArray[np.object_]
    analyte: NDArray[np.object_]
    assay: NDArray[np.object_]

    def columns(self, features: Iterable[str]) -> dict[str, NDArray[np.object_]]:
        """Return `analyte` and `assay` of the given features, ``""`` for unknown."""
        place = {name: row for row, name in enumerate(self.feature)}
        rows = [place.get(name, -1) for name in features]
        return {
            "analyte": np.array([self.analyte[r] if r >= 0 else "" for r in rows], "O"),
            "assay": np.array([self.assay[r] if r >= 0 else "" for r in rows], "O"),
        }

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a feature: feature, analyte, assay."""
        return frame({name: getattr(self, name) for name in self.__slots__})
