"""The cohort: what ingest hands to everything else."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.records.findings import Dropped, Findings, Flow
from panelkit.records.record import Record, frame
from panelkit.records.replicates import Replicates

if TYPE_CHECKING:
    import anndata
    import pandas as pd

__all__ = ["Cohort", "Design", "Outcome"]


@dataclass(frozen=True, slots=True, eq=False)
class Outcome(Record):
    """The clinical outcome of each analysed sample.

    Attributes
    ----------
    kind : {"binary"}
        Kind of outcome.
    column : str
        Column of the sample sheet.
    negative, positive : str
        The classes as written; scores point to `positive`.
    values : ndarray of shape (n_samples,), float64
        1.0 for `positive`, 0.0 for `negative`.
    """

    kind: Literal["binary"]
    column: str
    negative: str
    positive: str
    values: NDArray[np.float64]

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a sample: class and value."""
        names = np.where(self.values == 1.0, self.positive, self.negative)
        return frame({"outcome_class": names, "value": self.values})


@dataclass(frozen=True, slots=True, eq=False)
class Design(Record):
    """How the samples belong together.

    Attributes
    ----------
    subject : ndarray of shape (n_samples,), int64
        Code of each sample's subject, 0 to n_subjects - 1 in order of first row.
    subject_ids : ndarray of shape (n_subjects,), object
        The subjects as written (sample ids when no subject column was named).
    weights : ndarray of shape (n_samples,), float64
        Observation weights, 1 / rows of the subject, scaled to sum to 1.
    site, batch : ndarray of shape (n_samples,), object, or None
        As written in the sample sheet.
    """

    subject: NDArray[np.int64]
    subject_ids: NDArray[np.object_]
    weights: NDArray[np.float64]
    site: NDArray[np.object_] | None = None
    batch: NDArray[np.object_] | None = None

    @property
    def n_subjects(self) -> int:
        """Number of subjects."""
        return len(self.subject_ids)


@dataclass(frozen=True, slots=True, eq=False)
class Cohort(Record):
    """A checked cohort: analysed samples, features, outcome, and what was noticed.

    Attributes
    ----------
    values : ndarray of shape (n_features, n_samples), float32 or float64
        The expression matrix, feature-major (C-contiguous), NaN where missing.
    features : ndarray of shape (n_features,), object
        Feature ids, text, in file order.
    samples : ndarray of shape (n_samples,), object
        Sample ids, text, in the order of the sample sheet.
    outcome : Outcome or None
        None when no outcome was asked for.
    design : Design
        Subjects, weights, site and batch.
    sample_columns : mapping of str to ndarray of shape (n_samples,), object
        The sample sheet's columns for the analysed samples, as text.
    feature_columns : mapping of str to ndarray of shape (n_features,), object
        The feature sheet's columns (may be empty), as text.
    findings : Findings
        What was noticed while reading and checking.
    dropped : tuple of Dropped
        Everything left out so far.
    flow : tuple of Flow
        Participant flow, one entry a class.
    sources : mapping of str to str
        Role of each input file to its SHA-256, for the record.
    replicates : Replicates or None
        Repeated measurements of analysed samples, when they were named.
    """

    values: NDArray[np.floating[Any]]
    features: NDArray[np.object_]
    samples: NDArray[np.object_]
    outcome: Outcome | None
    design: Design
    sample_columns: Mapping[str, NDArray[np.object_]]
    feature_columns: Mapping[str, NDArray[np.object_]]
    findings: Findings
    dropped: tuple[Dropped, ...] = ()
    flow: tuple[Flow, ...] = ()
    sources: Mapping[str, str] | None = None
    replicates: Replicates | None = None

    @property
    def X(self) -> NDArray[np.floating[Any]]:
        """Expression matrix of shape (n_samples, n_features); a view."""
        return self.values.T

    @property
    def n_samples(self) -> int:
        """Number of analysed samples."""
        return len(self.samples)

    @property
    def n_features(self) -> int:
        """Number of features."""
        return len(self.features)

    def to_frame(self) -> "pd.DataFrame":
        """Return the expression matrix as a data frame, samples by features."""
        import pandas as pd  # slow to import; records stay light

        return pd.DataFrame(self.X, index=self.samples, columns=self.features)

    def to_anndata(self) -> "anndata.AnnData":
        """Return an AnnData object: X, obs (sample sheet), var (feature sheet)."""
        import anndata
        import pandas as pd

        obs = pd.DataFrame(dict(self.sample_columns), index=self.samples)
        var = pd.DataFrame(dict(self.feature_columns), index=self.features)
        return anndata.AnnData(X=np.ascontiguousarray(self.X), obs=obs, var=var)
