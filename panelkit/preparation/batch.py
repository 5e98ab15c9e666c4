"""Centring by batch, with what happens to an unseen batch defined."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.config import STEPS
from panelkit.errors import InputDataError, name_some
from panelkit.preparation.step import BATCHES, Learnt, choice, nothing
from panelkit.preparation.values import Values
from panelkit.records import RecipeContext

__all__ = ["BatchCentre"]


@dataclass(frozen=True, slots=True)
class BatchCentre:
    """Moves each batch's training mean to the training rows' mean, feature by feature.

    A sample without a batch is in an unseen one.

    Neither the outcome nor held-out rows enter. With classes spread unevenly over
    batches, part of their difference is taken out with the batch; no later step can
    bring it back.

    Attributes
    ----------
    unseen : str
        A batch that no training row belongs to is left where it is (``grand-mean``:
        it is taken to lie at the training rows' mean) or refused (``refuse``).

    References
    ----------
    Nygaard, Rodland & Hovig 2016, Biostatistics 17:29 (why the outcome must not enter).
    """

    name: ClassVar[str] = "batch-centre"
    place: ClassVar[str] = BATCHES
    assay: ClassVar[bool] = True

    unseen: str = choice(STEPS.unseen_batch, ("grand-mean", "refuse"))

    def words(self) -> str:
        """Return what the step does."""
        unseen = "left as it is" if self.unseen == "grand-mean" else "refused"
        return (
            "each batch's training mean moved to the training rows' mean; an unseen "
            f"batch is {unseen}"
        )

    def check(self, context: RecipeContext) -> None:
        """Refuse a cohort without batches.

        Raises
        ------
        InputDataError
            The cohort has no batches.
        """
        _batches(context)

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the batches of the training rows and how far each is moved.

        Raises
        ------
        InputDataError
            The cohort has no batches.
        """
        batch = _batches(context)[rows]
        known = np.unique(batch[batch != ""])
        left = np.zeros((values.n_features, len(known)))
        for here, tile in values.tiles(rows):
            each = tile.astype(np.float64)
            grand = _means(each)
            for b, name in enumerate(known):
                moved = grand - _means(each[:, batch == name])
                left[here, b] = np.where(np.isfinite(moved), moved, 0.0)
        return {"batches": known, "shifts": left}

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with a shift for each batch.

        Raises
        ------
        InputDataError
            The cohort has no batches, or an unseen batch is to be refused.
        """
        batch, known = _batches(context), learnt["batches"]
        unseen = sorted(set(batch) - set(known))
        if unseen and self.unseen == "refuse":
            raise InputDataError(
                code="unseen-batch",
                where="[preparation] discovery, step 'batch-centre'",
                what="no training row belongs to batch "
                f"{name_some([repr(name) for name in unseen])}",
                accepted="batches of the training rows, since unseen = 'refuse'",
                next_step="Write unseen = 'grand-mean' to leave such batches as they "
                "are",
            )
        return values.shifted(
            learnt["shifts"], (known[:, None] == batch).astype(np.float64)
        )

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return no feature: each marker has its own frozen shifts."""
        del learnt, markers
        return nothing()


def _batches(context: RecipeContext) -> NDArray[np.object_]:
    if context.batch is None:
        raise InputDataError(
            code="no-batches",
            where="[preparation] discovery, step 'batch-centre'",
            what="the cohort names no batches",
            accepted="a column of the sample sheet under [cohort] batch",
            next_step="Name it, or take the step out of the recipe",
        )
    return np.array(["" if b is None else str(b) for b in context.batch], object)


def _means(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return means of measured values along rows; NaN without one."""
    there = ~np.isnan(values)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(there, values, 0.0).sum(axis=1) / there.sum(axis=1)
    return np.asarray(mean, np.float64)
