"""What a recipe has learnt from training rows, and what it knows beside the values."""

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record

__all__ = ["RecipeContext", "RecipeState", "StepState"]


@dataclass(frozen=True, slots=True, eq=False)
class RecipeContext(Record):
    """What steps may read beside the values; never an outcome.

    Attributes
    ----------
    features : ndarray of shape (n_features,), object, or None
        Feature ids, for choosing and naming features.
    samples : ndarray of shape (n_samples,), object, or None
        Sample ids, for naming samples.
    role : ndarray of shape (n_features,), object, or None
        ``marker``, ``control`` or ``reference``.
    analyte : ndarray of shape (n_features,), object, or None
        What a feature measures; ``""`` for a feature that stands for itself.
    batch : ndarray of shape (n_samples,), object, or None
        Batch of each sample.
    replicate : ndarray of shape (n_samples,), int64, or None
        Equal codes for measurements of one specimen; -1 for none.
    """

    features: NDArray[np.object_] | None = None
    samples: NDArray[np.object_] | None = None
    role: NDArray[np.object_] | None = None
    analyte: NDArray[np.object_] | None = None
    batch: NDArray[np.object_] | None = None
    replicate: NDArray[np.int64] | None = None

    def at(self, rows: NDArray[np.int64]) -> "RecipeContext":
        """Return what is known of some samples."""
        return RecipeContext(
            features=self.features,
            samples=None if self.samples is None else self.samples[rows],
            role=self.role,
            analyte=self.analyte,
            batch=None if self.batch is None else self.batch[rows],
            replicate=None if self.replicate is None else self.replicate[rows],
        )

    def among(self, features: NDArray[np.int64]) -> "RecipeContext":
        """Return what is known when only some features are at hand."""
        return RecipeContext(
            features=None if self.features is None else self.features[features],
            samples=self.samples,
            role=None if self.role is None else self.role[features],
            analyte=None if self.analyte is None else self.analyte[features],
            batch=self.batch,
            replicate=self.replicate,
        )

    def name(self, feature: int) -> str:
        """Return a feature's id, or its position where ids are not known."""
        return f"feature {feature}" if self.features is None else self.features[feature]


@dataclass(frozen=True, slots=True, eq=False)
class StepState(Record):
    """What one step learnt from training rows.

    Attributes
    ----------
    step : str
        Name of the step.
    arrays : mapping of str to ndarray
        Named by the step.
    """

    step: str
    arrays: Mapping[str, NDArray[np.generic]]


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
    steps : tuple of StepState
        What each step of the recipe that changes values with the fold has learnt, in
        order; fills and filters are in the fields above.
    """

    fill: NDArray[np.float64]
    included: NDArray[np.bool_]
    reasons: NDArray[np.object_]
    steps: tuple[StepState, ...] = field(default=())

    def digest(self) -> str:
        """Return the SHA-256 of the learnt values, hexadecimal."""
        digest = hashlib.sha256()
        for values in (self.fill, self.included):
            digest.update(np.ascontiguousarray(values).tobytes())
        digest.update("\n".join(self.reasons).encode())
        for state in self.steps:
            digest.update(state.step.encode())
            for name, array in sorted(state.arrays.items()):
                digest.update(name.encode())
                if array.dtype == object:
                    digest.update("\n".join(map(str, array.ravel())).encode())
                else:
                    digest.update(np.ascontiguousarray(array).tobytes())
        return digest.hexdigest()
