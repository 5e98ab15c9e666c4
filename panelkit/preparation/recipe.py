"""The recipe: which steps, learnt on which rows, applied to which."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.preparation.entries import (
    check_assay,
    check_order,
    steps_from,
    table_of,
)
from panelkit.preparation.references import ReferenceRatio
from panelkit.preparation.step import FILTER, NeedsContext, PerSample, Step
from panelkit.preparation.values import Values, starting_values
from panelkit.preparation.view import DesignView
from panelkit.records import RecipeContext, RecipeState, StepState

__all__ = ["Recipe"]

NOTHING_KNOWN = RecipeContext()


@dataclass(frozen=True, slots=True)
class Recipe:
    """A list of steps: the discovery part or the assay part.

    Attributes
    ----------
    steps : sequence of str, mapping or Step
        A step's name, or a table with ``step`` and its parameters, in order.
    log2_offset : float
        Offset of ``log2`` where its entry gives none.
    max_missing_share : float
        Of ``filter`` where its entry gives none.
    part : str
        Key of [preparation] that it comes from, for errors.
    chain : tuple of Step
        The steps themselves.

    Raises
    ------
    StudyFileError
        An unknown step or parameter, or an order without sense.
    """

    steps: Sequence[str | Mapping[str, Any] | Step]
    log2_offset: float = PREPARATION.log2_offset
    max_missing_share: float = PREPARATION.max_missing_share
    part: str = "discovery"
    chain: tuple[Step, ...] = field(init=False, repr=False)

    def __post_init__(self) -> None:
        defaults = {
            "log2": {"offset": self.log2_offset},
            "filter": {"max_missing_share": self.max_missing_share},
        }
        where = f"[preparation] {self.part}"
        chain = steps_from(self.steps, defaults, where)
        check_order(chain, where)
        if self.part == "assay":
            check_assay(chain, where)
        object.__setattr__(self, "chain", chain)

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the steps, in order."""
        return tuple(step.name for step in self.chain)

    def tables(self) -> list[dict[str, Any]]:
        """Return the steps as the study file writes them, every parameter given."""
        return [table_of(step) for step in self.chain]

    def words(self) -> tuple[str, ...]:
        """Return each step in words."""
        return tuple(f"{step.name}: {step.words()}" for step in self.chain)

    @property
    def _n_shared(self) -> int:
        """Number of leading steps that learn nothing: done once for all folds."""
        count = 0
        while count < len(self.chain) and isinstance(self.chain[count], PerSample):
            count += 1
        return count

    def check(self, context: RecipeContext) -> None:
        """Refuse a cohort that lacks what a step needs beside the values.

        Raises
        ------
        InputDataError
            No batches, analytes, references or replicates, as the step says.
        """
        for step in self.chain:
            if isinstance(step, NeedsContext):
                step.check(context)

    def reference_candidates(self, context: RecipeContext) -> NDArray[np.int64]:
        """Return the features that references are chosen among, ascending."""
        found = [
            step.candidates(context)
            for step in self.chain
            if isinstance(step, ReferenceRatio)
        ]
        return np.unique(np.concatenate([np.empty(0, np.int64), *found]))

    def base(self, values: NDArray[np.floating[Any]]) -> NDArray[np.floating[Any]]:
        """Return the matrix that all folds share, a copy where a step changes it.

        Parameters
        ----------
        values : ndarray of shape (n_features, n_samples)
            The cohort's values; never changed.

        Returns
        -------
        ndarray
            C-contiguous, of the same type.
        """
        shared = self.chain[: self._n_shared]
        if not shared:
            return np.ascontiguousarray(values)
        base = np.array(values, order="C", copy=True)
        for step in shared:
            if isinstance(step, PerSample):
                step.change(base)
        return base

    def prepare(
        self,
        base: NDArray[np.floating[Any]],
        rows: NDArray[np.int64],
        barred: NDArray[np.object_],
        context: RecipeContext = NOTHING_KNOWN,
    ) -> tuple[RecipeState, DesignView]:
        """Learn from training rows, and return what the fits read.

        Parameters
        ----------
        base : ndarray of shape (n_features, n_samples)
            From `base`.
        rows : ndarray of int64
            Training rows; nothing of another row enters the state.
        barred : ndarray of shape (n_features,), object
            Reason why a feature may not be used whatever the data say, or ``""``.
        context : RecipeContext
            What steps may read beside the values.

        Returns
        -------
        state : RecipeState
            What was learnt.
        view : DesignView
            All rows, prepared.
        """
        rows = np.sort(rows)  # sums over rows then have one order
        values = starting_values(base, barred)
        learnt = []
        for step in self.chain[self._n_shared :]:
            found = step.learn(values, rows, context)
            values = step.apply(values, found, context)
            if step.place != FILTER and set(found) - {"fill"}:
                learnt.append(StepState(step.name, found))
            else:
                learnt.append(StepState(step.name, {}))
        fill = values.fill.copy()
        reasons = values.reasons.copy()
        unmeasured = np.isnan(fill)
        reasons[unmeasured & (reasons == "")] = "not measured on any training row"
        fill[unmeasured] = 0.0
        state = RecipeState(
            fill=fill, included=reasons == "", reasons=reasons, steps=tuple(learnt)
        )
        return state, _view(values, state)

    def learn(
        self,
        base: NDArray[np.floating[Any]],
        rows: NDArray[np.int64],
        barred: NDArray[np.object_],
        context: RecipeContext = NOTHING_KNOWN,
    ) -> RecipeState:
        """Learn from training rows; see `prepare`.

        Returns
        -------
        RecipeState
            Fills, which features stay, and what each step learnt.
        """
        return self.prepare(base, rows, barred, context)[0]

    def apply(
        self,
        state: RecipeState,
        base: NDArray[np.floating[Any]],
        rows: NDArray[np.int64],
        context: RecipeContext = NOTHING_KNOWN,
    ) -> NDArray[np.float64]:
        """Return the prepared matrix of any rows, from those rows alone.

        Parameters
        ----------
        state : RecipeState
            From `learn`.
        base : ndarray of shape (n_features, n_samples)
            From `base`, of any samples.
        rows : ndarray of int64
            Which of them.
        context : RecipeContext
            Of the samples of `base`.

        Returns
        -------
        ndarray of shape (n_features, n_rows), float64
            Each sample the same bits whatever else is prepared with it.
        """
        part = np.take(base, rows, axis=1)
        view = self.view(state, part, context.at(rows))
        return view.columns(np.arange(len(base)), np.arange(len(rows)))

    def view(
        self,
        state: RecipeState,
        base: NDArray[np.floating[Any]],
        context: RecipeContext = NOTHING_KNOWN,
    ) -> DesignView:
        """Return the view through which a fold's fits read the shared base.

        Parameters
        ----------
        state : RecipeState
            From `learn`.
        base : ndarray of shape (n_features, n_samples)
            From `base`, of any samples.
        context : RecipeContext
            Of the samples of `base`.

        Returns
        -------
        DesignView
            Shares `base` unless a step needs a matrix of the fold's own.
        """
        values = starting_values(base)
        for step, found in zip(self.chain[self._n_shared :], state.steps, strict=False):
            if found.arrays or isinstance(step, PerSample):
                values = step.apply(values, found.arrays, context)
        return _view(values, state)


def _view(values: Values, state: RecipeState) -> DesignView:
    corrections = (values.left, values.right) if values.left.shape[1] else None
    return DesignView(values.matrix, state, corrections)
