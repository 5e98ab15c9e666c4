"""Ratios to reference features, which are chosen on the training rows."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.config import STEPS
from panelkit.errors import InputDataError, name_some
from panelkit.preparation.missing import medians
from panelkit.preparation.step import BATCHES, Learnt, choice, names, whole
from panelkit.preparation.values import Values
from panelkit.records import RecipeContext

__all__ = [
    "ReferenceRatio",
    "factor_variation",
    "pairwise_variation",
    "stability_order",
    "variance_components",
]

MEASURES = ("pairwise-variation", "variance-components")


def pairwise_variation(logs: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return each reference's mean standard deviation of log ratios to the others.

    Parameters
    ----------
    logs : ndarray of shape (n_references, n_samples), float64
        Log2 values, complete.

    Returns
    -------
    ndarray of shape (n_references,), float64
        The measure M; small is stable.

    References
    ----------
    Vandesompele et al. 2002, Genome Biology 3:research0034 (expression stability M).
    """
    ratios = logs[:, None, :] - logs[None, :, :]
    spread = ratios.std(axis=2, ddof=1)
    return np.asarray(spread.sum(axis=1) / (len(logs) - 1), np.float64)


def variance_components(logs: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return each reference's own variance, beside what samples have in common.

    One group of samples is taken: groups by outcome would look at the outcome.

    Parameters
    ----------
    logs : ndarray of shape (n_references, n_samples), float64
        Log2 values of at least three references, complete.

    Returns
    -------
    ndarray of shape (n_references,), float64
        Unbiased, so it may be below 0; small is stable.

    References
    ----------
    Andersen, Jensen & Orntoft 2004, Cancer Research 64:5245.
    """
    k, n = logs.shape
    residual = logs - logs.mean(axis=1)[:, None] - logs.mean(axis=0) + logs.mean()
    spread = (residual**2).sum(axis=1) / ((n - 1) * (1.0 - 2.0 / k))
    return np.asarray(spread - spread.sum() / (k * (k - 1)), np.float64)


def stability_order(logs: NDArray[np.float64], measure: str) -> NDArray[np.int64]:
    """Return references from the most to the least stable.

    By pairwise variation the least stable is dropped, again and again; the last two
    cannot be told apart and stand in their own order.

    Parameters
    ----------
    logs : ndarray of shape (n_references, n_samples), float64
        Log2 values, complete.
    measure : str
        ``pairwise-variation`` or ``variance-components``; two references and fewer
        are left in their own order.

    Returns
    -------
    ndarray of shape (n_references,), int64
        Positions; of equals the first is the more stable one.

    References
    ----------
    Vandesompele et al. 2002, Genome Biology 3:research0034; Andersen, Jensen & Orntoft
    2004, Cancer Research 64:5245.
    """
    left = np.arange(len(logs))
    if len(left) < 3:
        return left
    if measure == "variance-components":
        variance = np.maximum(variance_components(logs), 0.0)
        return np.argsort(variance, kind="stable")
    dropped: list[int] = []
    while len(left) > 2:
        found = pairwise_variation(logs[left])
        worst = len(left) - 1 - int(found[::-1].argmax())
        dropped.append(int(left[worst]))
        left = np.delete(left, worst)
    return np.array([*left, *reversed(dropped)], np.int64)


def factor_variation(
    logs: NDArray[np.float64], order: NDArray[np.int64]
) -> NDArray[np.float64]:
    """Return how much each further reference changes the normalisation factor.

    Parameters
    ----------
    logs : ndarray of shape (n_references, n_samples), float64
        Log2 values, complete.
    order : ndarray of int64
        From `stability_order`.

    Returns
    -------
    ndarray of shape (n_references - 2,), float64
        V for 2 against 3 references, 3 against 4, and so on.

    References
    ----------
    Vandesompele et al. 2002, Genome Biology 3:research0034 (pairwise variation V).
    """
    count = np.arange(1, len(order) + 1)
    factors = np.cumsum(logs[order], axis=0) / count[:, None]
    return np.asarray((factors[1:-1] - factors[2:]).std(axis=1, ddof=1), np.float64)


@dataclass(frozen=True, slots=True)
class ReferenceRatio:
    """Subtracts the mean log of reference features from every feature of a sample.

    Attributes
    ----------
    features : tuple of str
        Ids of the references to choose from; empty takes the features whose role is
        ``reference``.
    measure : str
        ``pairwise-variation`` or ``variance-components``.
    references : int
        How many are chosen on the training rows; all where there are no more.

    References
    ----------
    Vandesompele et al. 2002, Genome Biology 3:research0034; Andersen, Jensen & Orntoft
    2004, Cancer Research 64:5245.
    """

    name: ClassVar[str] = "reference-ratio"
    place: ClassVar[str] = BATCHES
    assay: ClassVar[bool] = True

    features: tuple[str, ...] = names()
    measure: str = choice(STEPS.reference_measure, MEASURES)
    references: int = whole(STEPS.reference_number, 1)

    def words(self) -> str:
        """Return what the step does."""
        among = name_some(self.features) if self.features else "features of that role"
        return (
            f"log ratio to the mean log of {self.references} references, chosen on the "
            f"training rows by {self.measure} among {among}"
        )

    def check(self, context: RecipeContext) -> None:
        """Refuse a cohort without the references.

        Raises
        ------
        InputDataError
            There is none, or one is unknown.
        """
        self.candidates(context)

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the chosen references and what stands for a missing one.

        Raises
        ------
        InputDataError
            No reference, an unknown one, or one that no training row has.
        """
        known = self.candidates(context)
        part = values.part(known, rows).astype(np.float64)
        single = Values(
            part,
            np.empty((len(known), 0)),
            np.empty((0, part.shape[1])),
            np.full(len(known), np.nan),
            np.full(len(known), "", object),
        )
        fill = medians(single, np.arange(part.shape[1]))
        if np.isnan(fill).any():
            empty = [context.name(int(j)) for j in known[np.isnan(fill)]]
            raise InputDataError(
                code="reference-not-measured",
                where="[preparation], step 'reference-ratio'",
                what=f"no training row has a value of {name_some(empty)}",
                accepted="references with measured values",
                next_step="Take it out of the references",
            )
        logs = np.where(np.isnan(part), fill[:, None], part)
        chosen = stability_order(logs, self.measure)[: self.references]
        chosen = np.sort(chosen)
        return {"references": known[chosen], "fill": fill[chosen]}

    def candidates(self, context: RecipeContext) -> NDArray[np.int64]:
        """Return the positions of the references to choose from.

        Raises
        ------
        InputDataError
            There is none, or one is unknown.
        """
        if not self.features:
            role = np.array([], object) if context.role is None else context.role
            found = np.flatnonzero(np.array([each == "reference" for each in role]))
            if not len(found):
                raise InputDataError(
                    code="no-references",
                    where="[preparation], step 'reference-ratio'",
                    what="no feature has the role 'reference'",
                    accepted="features of that role in the feature sheet, or "
                    "features = [...] beside the step",
                    next_step="Name the references",
                )
            return found.astype(np.int64)
        ids = context.features if context.features is not None else np.array([], object)
        place = {str(name): j for j, name in enumerate(ids)}
        unknown = [name for name in self.features if name not in place]
        if unknown:
            raise InputDataError(
                code="unknown-reference",
                where="[preparation], step 'reference-ratio', parameter 'features'",
                what=f"the matrix has no feature {name_some(unknown)}",
                accepted="feature ids as the expression matrix writes them",
                next_step="Correct the ids",
            )
        return np.array(sorted({place[name] for name in self.features}), np.int64)

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with a shift for each sample."""
        del context
        part = values.part(learnt["references"]).astype(np.float64)
        logs = np.where(np.isnan(part), learnt["fill"][:, None], part)
        total = np.zeros(values.n_samples)
        for reference in logs:  # in one order, whatever the number of samples
            total += reference
        return values.shifted(
            np.ones((values.n_features, 1)), -(total / len(logs))[None, :]
        )

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the references, which are assays of their own."""
        del markers
        return np.asarray(learnt["references"], np.int64)
