"""What a comparison is given and what it hands back."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.procedure import Learnt, Procedure

__all__ = ["Comparison", "FoldWork", "LearntToo"]


@dataclass(frozen=True, slots=True, eq=False)
class FoldWork:
    """One fold with all that the procedure learnt there.

    Attributes
    ----------
    procedure : Procedure
        What was repeated.
    data : ProcedureData
        Shared data; only ``split.training`` may teach.
    split : Split
        Training and test rows.
    learnt : Learnt
        Panels, tuning, predictions.
    repeat : int
        Which repeat of the folds this is.
    """

    procedure: Procedure
    data: ProcedureData
    split: Split
    learnt: Learnt
    repeat: int = 0


@dataclass(frozen=True, slots=True, eq=False)
class LearntToo:
    """What a comparison learnt in a fold.

    Attributes
    ----------
    predicted : mapping of str to ndarray of shape ([n_classes, ]n_test)
        Linear predictors of the test rows, by name.
    figures : mapping of str to ndarray
        Further figures, of one shape in every fold.
    """

    predicted: Mapping[str, NDArray[np.float64]] = field(default_factory=dict)
    figures: Mapping[str, NDArray[np.float64]] = field(default_factory=dict)


class Comparison(Protocol):
    """Learns something else on a fold's training rows."""

    def __call__(self, work: FoldWork) -> LearntToo:
        """Return predictions of the test rows, and figures."""
        ...
