"""What a procedure works on, and which rows teach and are tested."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.tasks import Task
from panelkit.records import FoldPlan, RecipeContext, SubsamplePlan

__all__ = ["ProcedureData", "Split"]


NOTHING_KNOWN = RecipeContext()


def _none() -> NDArray[np.float64]:
    return np.empty((0, 0))


@dataclass(frozen=True, slots=True, eq=False)
class ProcedureData:
    """The data that a procedure works on, shared by all folds.

    Attributes
    ----------
    base : ndarray of shape (n_features, n_samples)
        What the folds share: after the steps that learn nothing.
    task : Task
        Outcome, loss and metric.
    weights : ndarray of shape (n_samples,)
        Observation weights.
    subjects : ndarray of shape (n_samples,), int64
        Subject codes.
    barred : ndarray of shape (n_features,), object
        Reason why a feature may not be used, or ``""``.
    always : ndarray of int64
        Features that are candidates whatever happens.
    covariates, nuisance : ndarray of shape (n_columns, n_samples)
        Coded columns that travel with the panel, and that must not explain it.
    controls : ndarray of int64
        Control features: they must not predict the outcome.
    price : ndarray of shape (n_features,) or None
        What each marker costs alone; NaN where unknown.
    reliability : ndarray of shape (n_features,) or None
        Intraclass correlation of technical replicates; NaN where unknown.
    own : ndarray of int64 or None
        The user's own list of markers, in the order given.
    context : RecipeContext
        What preparation may read beside the values.
    values : ndarray of shape (n_features, n_samples), or None
        As read, for an assay part; None where there is none.
    blocks : ndarray of shape (n_samples,), int64, or None
        What stays together in folds and halves; None for the subjects.
    folds : FoldPlan or None
        The user's own outer folds; None has them drawn.
    allowed : ndarray of shape (n_features,), bool, or None
        Features that may be candidates; None for all.
    pair_site : ndarray of shape (n_samples,), object, or None
        Site by which halves are stratified.
    """

    base: NDArray[np.floating[Any]]
    task: Task
    weights: NDArray[np.float64]
    subjects: NDArray[np.int64]
    barred: NDArray[np.object_]
    always: NDArray[np.int64]
    covariates: NDArray[np.float64] = field(default_factory=_none)
    nuisance: NDArray[np.float64] = field(default_factory=_none)
    controls: NDArray[np.int64] = field(default_factory=lambda: np.empty(0, np.int64))
    price: NDArray[np.float64] | None = None
    reliability: NDArray[np.float64] | None = None
    own: NDArray[np.int64] | None = None
    context: RecipeContext = NOTHING_KNOWN
    values: NDArray[np.floating[Any]] | None = None
    blocks: NDArray[np.int64] | None = None
    folds: FoldPlan | None = None
    allowed: NDArray[np.bool_] | None = None
    pair_site: NDArray[np.object_] | None = None

    @property
    def units(self) -> NDArray[np.int64]:
        """What is drawn as a whole: `blocks`, or the subjects."""
        return self.subjects if self.blocks is None else self.blocks

    @property
    def n_samples(self) -> int:
        """Number of samples."""
        return len(self.weights)


@dataclass(frozen=True, slots=True, eq=False)
class Split:
    """Rows that teach and rows that are tested, with all that was drawn for them.

    Attributes
    ----------
    training, test : ndarray of int64
        Rows; `test` may be empty.
    pairs : SubsamplePlan
        Complementary pairs of the training rows.
    inner : tuple of Split
        Inner folds of the training rows.
    """

    training: NDArray[np.int64]
    test: NDArray[np.int64]
    pairs: SubsamplePlan = field(default_factory=lambda: SubsamplePlan(()))
    inner: "tuple[Split, ...]" = ()
