"""Technical replicates: repeated measurements, and how well they agree."""

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["ReplicateAgreement", "Replicates"]


@dataclass(frozen=True, slots=True, eq=False)
class Replicates(Record):
    """Repeated measurements of analysed samples; never analysed themselves.

    Attributes
    ----------
    samples : ndarray of shape (n_replicates,), object
        Their own ids.
    of : ndarray of shape (n_replicates,), int64
        Position, in the cohort, of the sample that was measured again.
    values : ndarray of shape (n_features, n_replicates), float32 or float64
        In the order of the cohort's features, NaN where missing.
    """

    samples: NDArray[np.object_]
    of: NDArray[np.int64]
    values: NDArray[np.floating[Any]]


@dataclass(frozen=True, slots=True, eq=False)
class ReplicateAgreement(Record):
    """How well replicates agree, one entry a feature (`replicates.csv`).

    Attributes
    ----------
    features : ndarray of shape (n_features,), object
        Feature ids.
    n_samples, n_measurements : ndarray of shape (n_features,), int64
        Samples measured more than once, and all their measurements without a gap.
    mean : ndarray of shape (n_features,)
        Mean level of these measurements.
    icc : ndarray of shape (n_features,)
        Intraclass correlation of a single measurement, one-way random effects.
    within_sd : ndarray of shape (n_features,)
        Standard deviation among measurements of the same sample.
    cv : ndarray of shape (n_features,)
        Coefficient of variation on the scale before logarithms, as a fraction.
    difference, difference_low, difference_high : ndarray of shape (n_features,)
        Mean difference, replicate minus sample, and 95 % limits of agreement.
    in_log2 : bool
        Whether levels and differences are in log2.
    """

    features: NDArray[np.object_]
    n_samples: NDArray[np.int64]
    n_measurements: NDArray[np.int64]
    mean: NDArray[np.float64]
    icc: NDArray[np.float64]
    within_sd: NDArray[np.float64]
    cv: NDArray[np.float64]
    difference: NDArray[np.float64]
    difference_low: NDArray[np.float64]
    difference_high: NDArray[np.float64]
    in_log2: bool

    @property
    def columns(self) -> dict[str, NDArray[Any]]:
        """Column name to values; `cv_percent` is the coefficient in per cent."""
        return {
            "feature": self.features,
            "n_samples": self.n_samples,
            "n_measurements": self.n_measurements,
            "mean": self.mean,
            "icc": self.icc,
            "within_sd": self.within_sd,
            "cv_percent": 100.0 * self.cv,
            "difference": self.difference,
            "difference_low": self.difference_low,
            "difference_high": self.difference_high,
        }

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a feature, with the columns of `replicates.csv`."""
        return frame(self.columns)
