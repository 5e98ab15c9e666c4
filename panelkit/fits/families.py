"""Families of outcomes: what the engine needs to know of each.

A family says how many linear predictors it has, what a null model starts from and which
kernel solves a refit. The engine itself knows no family.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from panelkit.fits.kernel_cache import kernel_cache

with kernel_cache():
    from panelkit.fits import kernel_grouped, kernel_scalar
    from panelkit.fits.kernel_paths import WORKING

__all__ = ["FAMILIES", "Family", "Problem", "SolveRules", "Solver"]

Family = Literal["gaussian", "binomial", "cox", "multinomial"]
FAMILIES: tuple[Family, ...] = ("gaussian", "binomial", "cox", "multinomial")
ABSENT = -1e6  # linear predictor of a class that a subsample does not have


class SolveRules(NamedTuple):
    """How a penalty is solved: share of the L1 part, tolerance, Newton steps."""

    mixing: float
    tol: float
    steps: int


class Solver(Protocol):
    """Solves the refits of one block; holds their outcomes."""

    def start(self, refits: Any) -> None:
        """Set the linear predictors from which the null model is fitted."""
        ...

    def solve(self, refits: Any, pending: NDArray[np.int64], rules: SolveRules) -> None:
        """Solve the pending refits at their present penalty."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class Problem:
    """Family, outcome and observation weights of all samples.

    Attributes
    ----------
    family : {"gaussian", "binomial", "cox", "multinomial"}
        Kind of outcome.
    y : ndarray of shape (n_samples,)
        Value, 0 or 1, time, or class number from 0.
    event : ndarray of shape (n_samples,)
        Cox: 1.0 where the time is an event, 0.0 where it is censored.
    strata : ndarray of shape (n_samples,), int64
        Cox: samples are compared within a stratum only.
    weights : ndarray of shape (n_samples,)
        Positive observation weights.
    n_classes : int
        Multinomial: number of classes; else 1.
    efron : bool
        Cox: how tied events are treated (else Breslow's way).
    """

    family: Family
    y: NDArray[np.float64]
    event: NDArray[np.float64]
    strata: NDArray[np.int64]
    weights: NDArray[np.float64]
    n_classes: int = 1
    efron: bool = True

    @property
    def code(self) -> int:
        """Number by which the scalar kernels know the family."""
        if self.family == "cox":
            ties = (kernel_scalar.COX_BRESLOW, kernel_scalar.COX_EFRON)
            return int(ties[self.efron])
        codes = {
            "gaussian": kernel_scalar.GAUSSIAN,
            "binomial": kernel_scalar.BINOMIAL,
        }
        return int(codes[self.family])

    def order(self, rows: NDArray[np.int64] | None = None) -> NDArray[np.int64]:
        """Return rows by stratum, then descending time; one zero but for Cox."""
        if self.family != "cox":
            return np.zeros(1, np.int64)
        here = slice(None) if rows is None else rows
        return np.lexsort((-self.y[here], self.strata[here]))

    def start(
        self, share: NDArray[np.float64], rows: NDArray[np.int64] | None = None
    ) -> float:
        """Return a ridge fit's first intercept: the log-odds of two classes, else 0."""
        if self.family != "binomial":
            return 0.0
        mean = float((share * self.y[slice(None) if rows is None else rows]).sum())
        return float(np.log(mean / (1.0 - mean)))

    @property
    def n_predictors(self) -> int:
        """Linear predictors of a refit."""
        return self.n_classes

    def solver(
        self, rows: Sequence[NDArray[np.int64]], weight: NDArray[np.float64]
    ) -> Solver:
        """Return what solves refits on the given rows."""
        if self.family == "multinomial":
            return _Grouped(self, rows, weight)
        return _Scalar(self, rows)


def _padded(
    rows: Sequence[NDArray[np.int64]], values: NDArray[Any], width: int
) -> NDArray[Any]:
    """Return each refit's own values, padded with zeros to one width."""
    table = np.zeros((len(rows), width), values.dtype)
    for b, chosen in enumerate(rows):
        table[b, : min(width, len(chosen))] = values[chosen][:width]
    return table


class _Scalar:
    """Gaussian, binomial, Cox: one linear predictor."""

    def __init__(self, problem: Problem, rows: Sequence[NDArray[np.int64]]) -> None:
        widest = max(len(chosen) for chosen in rows)
        survival = problem.family == "cox"
        self.code = problem.code
        self.y = _padded(rows, problem.y, widest)
        # only Cox reads these three; the others carry one column of them
        width = widest if survival else 1
        self.event = _padded(rows, problem.event, width)
        self.strata = _padded(rows, problem.strata, width)
        self.order = np.zeros((len(rows), width), np.int64)
        if survival:
            for b, chosen in enumerate(rows):
                self.order[b, : len(chosen)] = problem.order(chosen)

    def start(self, refits: Any) -> None:
        """Start from zero, or from the log-odds of the classes."""
        if self.code == kernel_scalar.BINOMIAL:
            share = (refits.weight * self.y).sum(axis=1)
            refits.b0[:, 0] = np.log(share / (1.0 - share))
            refits.eta[:, 0] = refits.b0[:, :1]

    def solve(self, refits: Any, pending: NDArray[np.int64], rules: SolveRules) -> None:
        """Solve the pending refits at their present penalty."""
        kernel_scalar.solve_chunk(
            self.code,
            pending,
            refits.now,
            rules.mixing,
            rules.tol,
            rules.steps,
            refits.Z,
            refits.state[:, WORKING],
            refits.n_rows,
            self.y,
            self.event,
            self.strata,
            self.order,
            refits.weight,
            refits.pull,
            refits.beta,
            refits.b0,
            refits.eta,
            refits.r,
            refits.grad,
            refits.violation,
        )


class _Grouped:
    """Multinomial: one linear predictor a class, features enter for all together."""

    def __init__(
        self,
        problem: Problem,
        rows: Sequence[NDArray[np.int64]],
        weight: NDArray[np.float64],
    ) -> None:
        widest = max(len(chosen) for chosen in rows)
        self.y = _padded(rows, problem.y, widest)
        self.share = np.zeros((len(rows), problem.n_classes))
        for b, chosen in enumerate(rows):
            np.add.at(
                self.share[b],
                problem.y[chosen].astype(np.int64),
                weight[b, : len(chosen)],
            )

    def start(self, refits: Any) -> None:
        """Start from the log shares of the classes that each refit has."""
        with np.errstate(divide="ignore"):
            logs = np.where(self.share > 0.0, np.log(self.share), ABSENT)
        refits.b0[:] = logs
        refits.eta[:] = logs[:, :, None]

    def solve(self, refits: Any, pending: NDArray[np.int64], rules: SolveRules) -> None:
        """Solve the pending refits at their present penalty."""
        kernel_grouped.solve_chunk(
            pending,
            refits.now,
            rules.mixing,
            rules.tol,
            rules.steps,
            refits.Z,
            refits.state[:, WORKING],
            refits.n_rows,
            self.y,
            refits.weight,
            refits.pull,
            refits.beta,
            refits.b0,
            refits.eta,
            refits.r,
            refits.grad,
            refits.violation,
        )
