"""The recipe: which steps, learnt on which rows, applied to which."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.errors import StudyFileError, name_some
from panelkit.preparation.steps import PER_SAMPLE, fill_with_median, filter_features
from panelkit.preparation.view import DesignView
from panelkit.records import RecipeState

__all__ = ["LEARNT", "Recipe", "default_steps"]

LEARNT = ("filter", "median-fill")


def default_steps(scale: str) -> tuple[str, ...]:
    """Return the discovery steps for data on the scale that was found.

    Parameters
    ----------
    scale : str
        ``"linear"`` and ``"counts"`` get a logarithm first; everything else does not.

    Returns
    -------
    tuple of str
        Names of steps in order.
    """
    first = ("log2",) if scale in ("linear", "counts") else ()
    return (*first, *LEARNT)


@dataclass(frozen=True, slots=True)
class Recipe:
    """The discovery part of a recipe.

    Attributes
    ----------
    steps : tuple of str
        Per-sample steps, then learnt steps.
    log2_offset : float
        Added before the logarithm.
    max_missing_share : float
        Largest share of training rows in which a feature may be missing.

    Raises
    ------
    StudyFileError
        An unknown step, or a per-sample step behind a learnt one.
    """

    steps: tuple[str, ...]
    log2_offset: float = PREPARATION.log2_offset
    max_missing_share: float = PREPARATION.max_missing_share

    def __post_init__(self) -> None:
        known = (*PER_SAMPLE, *LEARNT)
        unknown = [step for step in self.steps if step not in known]
        if unknown:
            raise StudyFileError(
                code="unknown-step",
                where="[preparation] discovery",
                what=f"no such step: {name_some(unknown)}",
                accepted=f"steps are {name_some(known)}",
                next_step="Correct the name or leave the key out for the default",
            )
        learnt = [step in LEARNT for step in self.steps]
        if learnt != sorted(learnt):
            raise StudyFileError(
                code="step-order",
                where="[preparation] discovery",
                what=f"a per-sample step behind a learnt one (got {list(self.steps)})",
                accepted="per-sample steps first, then learnt steps",
                next_step="Put them in that order",
            )
        repeated = len(set(self.steps)) < len(self.steps)
        if repeated or "median-fill" not in self.steps:
            raise StudyFileError(
                code="step-missing-or-repeated",
                where="[preparation] discovery",
                what=f"a step is repeated or 'median-fill' is missing (got "
                f"{list(self.steps)})",
                accepted="each step once, 'median-fill' among them, since every fit "
                "needs a value in every cell",
                next_step="Correct the list or leave the key out for the default",
            )

    def base(self, values: NDArray[np.floating[Any]]) -> NDArray[np.floating[Any]]:
        """Return the matrix after the per-sample steps, a copy where there are any.

        Parameters
        ----------
        values : ndarray of shape (n_features, n_samples)
            The cohort's values; never changed.

        Returns
        -------
        ndarray
            C-contiguous, of the same type.
        """
        per_sample = [step for step in self.steps if step in PER_SAMPLE]
        if not per_sample:
            return np.ascontiguousarray(values)
        base = np.array(values, order="C", copy=True)
        for step in per_sample:
            PER_SAMPLE[step](base, self.log2_offset)
        return base

    def learn(
        self,
        base: NDArray[np.floating[Any]],
        rows: NDArray[np.int64],
        barred: NDArray[np.object_],
    ) -> RecipeState:
        """Learn from training rows.

        Parameters
        ----------
        base : ndarray of shape (n_features, n_samples)
            The matrix after the per-sample steps.
        rows : ndarray of int64
            Training rows; no value of another row is read.
        barred : ndarray of shape (n_features,), object
            Reason why a feature may not be used whatever the data say, or ``""``.

        Returns
        -------
        RecipeState
            Fills and which features stay.
        """
        reasons = np.array(barred, object)
        if "filter" in self.steps:
            filtered = filter_features(base, rows, self.max_missing_share)
            reasons = np.where(reasons == "", filtered, reasons)
        fill = fill_with_median(base, rows)
        unmeasured = np.isnan(fill)
        reasons[unmeasured & (reasons == "")] = "not measured on any training row"
        fill[unmeasured] = 0.0
        return RecipeState(fill=fill, included=reasons == "", reasons=reasons)

    def apply(
        self,
        state: RecipeState,
        base: NDArray[np.floating[Any]],
        rows: NDArray[np.int64],
    ) -> NDArray[np.float64]:
        """Return the prepared matrix of any rows, features by rows, float64."""
        return self.view(state, base).columns(np.arange(len(base)), rows)

    def view(self, state: RecipeState, base: NDArray[np.floating[Any]]) -> DesignView:
        """Return the view through which a fold's fits read the shared base."""
        return DesignView(base, state)
