"""Several features of one analyte become one."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.config import STEPS
from panelkit.errors import InputDataError
from panelkit.preparation.filter import training_moments
from panelkit.preparation.step import COLLAPSE, Learnt, choice, nothing
from panelkit.preparation.values import Values
from panelkit.records import RecipeContext

__all__ = ["Collapse"]


@dataclass(frozen=True, slots=True)
class Collapse:
    """Leaves one feature for each analyte of the feature sheet.

    Attributes
    ----------
    rule : str
        ``highest-mean`` and ``highest-variance`` keep the feature that has it on the
        training rows; ``median`` writes the median of all its features into the first.
    """

    name: ClassVar[str] = "collapse"
    place: ClassVar[str] = COLLAPSE
    assay: ClassVar[bool] = True

    rule: str = choice(
        STEPS.collapse_rule, ("highest-mean", "highest-variance", "median")
    )

    def words(self) -> str:
        """Return what the step does."""
        if self.rule == "median":
            return "features of one analyte replaced by their median"
        what = self.rule.removeprefix("highest-")
        return f"of one analyte's features the one with the highest training {what}"

    def check(self, context: RecipeContext) -> None:
        """Refuse a cohort whose feature sheet has no analytes.

        Raises
        ------
        InputDataError
            No analyte is known.
        """
        if context.analyte is None:
            raise InputDataError(
                code="no-analytes",
                where="[preparation] discovery, step 'collapse'",
                what="no analyte is known for any feature",
                accepted="a feature sheet with a column 'analyte'",
                next_step="Add it, or take the step out of the recipe",
            )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return which feature stands for which, and reasons for the others.

        Raises
        ------
        InputDataError
            The feature sheet has no analytes.
        """
        self.check(context)
        mean, variance = training_moments(values, rows)
        height = variance if self.rule == "highest-variance" else mean
        reasons = np.full(values.n_features, "", object)
        stands_for = np.full(values.n_features, -1, np.int64)
        features: dict[str, list[int]] = {}
        analytes = context.analyte if context.analyte is not None else reasons
        for j in np.flatnonzero(values.included):
            if analyte := str(analytes[j]):
                features.setdefault(analyte, []).append(int(j))
        for analyte, probes in features.items():
            chosen = probes[0]
            if self.rule != "median":
                rank = np.where(np.isnan(height[probes]), -np.inf, height[probes])
                chosen = probes[int(rank.argmax())]
            for probe in probes:
                stands_for[probe] = chosen
                if probe != chosen:
                    reasons[probe] = f"{context.name(chosen)} stands for {analyte}"
        return {"stands_for": stands_for, "reasons": reasons}

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with one feature an analyte.

        With the rule ``median`` they are a matrix of the fold's own.
        """
        del context
        values = values.without(learnt["reasons"])
        if self.rule != "median":
            return values
        matrix = np.empty((values.n_features, values.n_samples), np.float32)
        for here, tile in values.tiles():
            matrix[here] = tile
        for chosen, probes in _several(learnt["stands_for"]):
            part = np.sort(values.part(probes).astype(np.float64), axis=0)
            count = (~np.isnan(part)).sum(axis=0)
            each = np.arange(part.shape[1])
            low = part[np.maximum(count - 1, 0) // 2, each]
            high = part[np.minimum(count // 2, len(part) - 1), each]
            matrix[chosen] = np.where(count, 0.5 * (low + high), np.nan)
        return values.own(matrix)

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the features that have to be measured for the markers' analytes."""
        if self.rule != "median":
            return nothing()
        of_markers = learnt["stands_for"][markers]
        several = [
            probes
            for chosen, probes in _several(learnt["stands_for"])
            if chosen in of_markers
        ]
        return np.concatenate([nothing(), *several])


def _several(
    stands_for: NDArray[np.int64],
) -> list[tuple[int, NDArray[np.int64]]]:
    """Return the features of each analyte that has more than one."""
    order = np.argsort(stands_for, kind="stable")
    chosen, start = np.unique(stands_for[order], return_index=True)
    groups = np.split(order, start[1:])
    return [
        (int(one), probes)
        for one, probes in zip(chosen, groups, strict=True)
        if one >= 0 and len(probes) > 1
    ]
