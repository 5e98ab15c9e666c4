"""Steps that bring each sample onto another scale."""

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION, STEPS
from panelkit.errors import InputDataError
from panelkit.preparation.step import SCALE, Learnt, nothing, number
from panelkit.preparation.values import TILE, Values
from panelkit.records import RecipeContext

__all__ = ["Log2", "MValues"]


def _range(values: NDArray[np.floating[Any]]) -> tuple[float, float]:
    """Return the smallest and the largest measured value, tile by tile."""
    low, high = np.inf, -np.inf
    for start in range(0, len(values), TILE):
        tile = values[start : start + TILE]
        measured = np.isfinite(tile)
        low = min(low, float(np.min(tile, where=measured, initial=np.inf)))
        high = max(high, float(np.max(tile, where=measured, initial=-np.inf)))
    return low, high


class _OnItsOwn(ABC):
    """A step whose every value needs nothing but itself."""

    place: ClassVar[str] = SCALE
    assay: ClassVar[bool] = True

    @abstractmethod
    def change(self, values: NDArray[np.floating[Any]]) -> None:
        """Change the values, features by samples, in place."""

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return nothing: there is nothing to learn."""
        del values, rows, context
        return {}

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values after the step, as a matrix of the fold's own."""
        del learnt, context
        matrix = np.empty((values.n_features, values.n_samples), np.float32)
        for here, tile in values.tiles():
            changed = tile.astype(np.float64)
            self.change(changed)
            matrix[here] = changed
        return values.own(matrix)

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return no feature."""
        del learnt, markers
        return nothing()


@dataclass(frozen=True, slots=True)
class Log2(_OnItsOwn):
    """log2(value + offset).

    Attributes
    ----------
    offset : float
        Added before the logarithm.
    """

    name: ClassVar[str] = "log2"

    offset: float = number(PREPARATION.log2_offset, 0.0)

    def words(self) -> str:
        """Return what the step does."""
        return f"log2 of each value plus {self.offset:g}"

    def change(self, values: NDArray[np.floating[Any]]) -> None:
        """Replace each value by log2(value + offset), in place.

        Raises
        ------
        InputDataError
            A value plus the offset is not positive.
        """
        smallest, _ = _range(values)
        if smallest + self.offset <= 0.0:
            raise InputDataError(
                code="negative-before-log2",
                where="expression matrix",
                what=f"a value of {smallest:g} has no logarithm with offset "
                f"{self.offset:g}",
                accepted="log2 takes values above minus the offset",
                next_step="Set [preparation] discovery without 'log2' if the values "
                "are logarithms already, or raise log2_offset",
            )
        for start in range(0, len(values), TILE):
            tile = values[start : start + TILE]
            np.add(tile, self.offset, out=tile)
            np.log2(tile, out=tile)


@dataclass(frozen=True, slots=True)
class MValues(_OnItsOwn):
    """log2((beta + offset) / (1 - beta + offset)) of shares between 0 and 1.

    Attributes
    ----------
    offset : float
        Keeps shares of 0 and 1 finite.

    References
    ----------
    Du et al. 2010, BMC Bioinformatics 11:587 (M-value of a beta value).
    """

    name: ClassVar[str] = "m-values"

    offset: float = number(STEPS.m_value_offset, 0.0, above=True)

    def words(self) -> str:
        """Return what the step does."""
        return f"M-values: log2 of share over rest, {self.offset:g} added to both"

    def change(self, values: NDArray[np.floating[Any]]) -> None:
        """Replace each share by its M-value, in place.

        Raises
        ------
        InputDataError
            A value outside 0 to 1.
        """
        low, high = _range(values)
        if low < 0.0 or high > 1.0:
            raise InputDataError(
                code="no-share",
                where="expression matrix",
                what=f"values from {low:g} to {high:g} are no shares",
                accepted="'m-values' takes beta values from 0 to 1",
                next_step="Take 'm-values' out of the recipe",
            )
        for start in range(0, len(values), TILE):
            tile = values[start : start + TILE]
            rest = 1.0 - tile + self.offset
            np.add(tile, self.offset, out=tile)
            np.divide(tile, rest, out=tile)
            np.log2(tile, out=tile)
