"""The cohort: what ingest hands to everything else."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.records.assays import AssayMap
from panelkit.records.findings import Dropped, Findings, Flow
from panelkit.records.openings import Opening
from panelkit.records.outcome import Outcome
from panelkit.records.record import Record
from panelkit.records.replicates import Replicates

if TYPE_CHECKING:
    import anndata
    import pandas as pd

__all__ = ["Cohort", "Design", "DesignKind"]

DesignKind = Literal["cohort", "case-control", "matched"]


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
    kind : {"cohort", "case-control", "matched"}
        How people came into the study.
    prevalence : float or None
        Share of the positive class among the people that the test is meant for.
    matched_set : ndarray of shape (n_samples,), int64, or None
        Code of each sample's matched set, in order of first row; -1 for none.
    matched_set_ids : ndarray of shape (n_sets,), object, or None
        The sets as written.
    run_order : ndarray of shape (n_samples,), float64, or None
        Place in the order of measurement, NaN where blank.
    fold : ndarray of shape (n_samples,), int64, or None
        The user's own fold of each sample, in order of first row.
    fold_ids : ndarray of shape (n_folds,), object, or None
        These folds as written.
    """

    subject: NDArray[np.int64]
    subject_ids: NDArray[np.object_]
    weights: NDArray[np.float64]
    site: NDArray[np.object_] | None = None
    batch: NDArray[np.object_] | None = None
    kind: DesignKind = "cohort"
    prevalence: float | None = None
    matched_set: NDArray[np.int64] | None = None
    matched_set_ids: NDArray[np.object_] | None = None
    run_order: NDArray[np.float64] | None = None
    fold: NDArray[np.int64] | None = None
    fold_ids: NDArray[np.object_] | None = None

    @property
    def n_subjects(self) -> int:
        """Number of subjects."""
        return len(self.subject_ids)

    @property
    def blocks(self) -> NDArray[np.int64]:
        """Code of what must stay together in folds and halves, of shape (n_samples,).

        Subjects, joined where they share a matched set; in order of first row.
        """
        if self.matched_set is None:
            return self.subject
        block = self.subject.copy()
        for code in np.unique(self.matched_set[self.matched_set >= 0]):
            joined = np.unique(block[self.matched_set == code])
            block[np.isin(block, joined)] = joined[0]
        first = {code: place for place, code in enumerate(dict.fromkeys(block))}
        return np.array([first[code] for code in block], np.int64)


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
    assays : AssayMap or None
        Feature to analyte to assay, when such a sheet was given; `feature_columns`
        then has `analyte` and `assay`.
    set_aside : int
        Rows of the sample sheet that were left unread.
    openings : tuple of Opening
        Every opening so far of the rows that were set aside.
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
    assays: AssayMap | None = None
    set_aside: int = 0
    openings: tuple[Opening, ...] = ()

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
