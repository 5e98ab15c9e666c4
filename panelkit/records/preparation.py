"""What a recipe has learnt from training rows."""

import hashlib
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record

__all__ = ["RecipeState"]


@dataclass(frozen=True, slots=True, eq=False)
class RecipeState(Record):
    """Everything that preparation learnt from training rows, and nothing else.

    Attributes
    ----------
    fill : ndarray of shape (n_features,), float64
        What stands for a missing value; 0 where the feature is left out.
    included : ndarray of shape (n_features,), bool
        False for features left out.
    reasons : ndarray of shape (n_features,), object
        Why a feature was left out; ``""`` for included ones.
    """

    fill: NDArray[np.float64]
    included: NDArray[np.bool_]
    reasons: NDArray[np.object_]

    def digest(self) -> str:
        """Return the SHA-256 of the learnt values, hexadecimal."""
        digest = hashlib.sha256()
        for array in (self.fill, self.included):
            digest.update(np.ascontiguousarray(array).tobytes())
        digest.update("\n".join(self.reasons).encode())
        return digest.hexdigest()
