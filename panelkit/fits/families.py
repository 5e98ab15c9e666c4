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
    from panelkit.fits.kernel_algebra import DEPTH

from panelkit.fits.refits import WORKING, Refits

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

    def start(self, refits: Refits) -> None:
        """Set the linear predictors from which the null model is fitted."""
        ...

    def solve(
        self, refits: Refits, pending: NDArray[np.int64], rules: SolveRules
    ) -> None:
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

    def survival(
        self, rows: NDArray[np.int64] | None = None
    ) -> NDArray[np.int64] | None:
        """Return what the Cox kernels read of rows, (5, n); None for other families."""
        if self.family != "cox":
            return None
        here = slice(None) if rows is None else rows
        time, stratum = self.y[here], self.strata[here]
        order = np.lexsort((-time, stratum))
        time, stratum = time[order], stratum[order]
        new_stratum = np.r_[True, stratum[1:] != stratum[:-1]]
        new_time = new_stratum | np.r_[True, time[1:] != time[:-1]]
        starts = np.flatnonzero(new_time)
        group = np.cumsum(new_time) - 1
        table = np.empty((5, len(order)), np.int64)
        table[kernel_scalar.ORDER] = order
        table[kernel_scalar.TIE_START] = starts[group]
        table[kernel_scalar.TIE_END] = np.append(starts[1:], len(order))[group]
        strata_starts = np.flatnonzero(new_stratum)
        table[kernel_scalar.STRATUM] = strata_starts[np.cumsum(new_stratum) - 1]
        table[kernel_scalar.EVENT] = self.event[here] > 0.5
        return table

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
        self.code = problem.code
        self.y = _padded(rows, problem.y, widest)
        self.survival: NDArray[np.int64] | None = None
        if problem.family == "cox":
            self.survival = np.zeros((len(rows), 5, widest), np.int64)
            for b, chosen in enumerate(rows):
                table = problem.survival(chosen)
                assert table is not None
                self.survival[b, :, : len(chosen)] = table

    def start(self, refits: Refits) -> None:
        """Start from zero, or from the log-odds of the classes."""
        if self.code == kernel_scalar.BINOMIAL:
            share = (refits.weight * self.y).sum(axis=1)
            refits.b0[:, 0] = np.log(share / (1.0 - share))
            refits.eta[:, 0] = refits.b0[:, :1]

    def solve(
        self, refits: Refits, pending: NDArray[np.int64], rules: SolveRules
    ) -> None:
        """Solve the pending refits at their present penalty."""
        m = int(refits.state[pending, WORKING].max())
        n = refits.Z.shape[2]
        kernel_scalar.solve_chunk(
            self.code,
            self.survival,
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
            np.empty((6, n)),
            np.empty((6, m)),
            np.empty(m, np.int64),
            np.empty((m, n)),
            np.empty((DEPTH, m + 1)),
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

    def start(self, refits: Refits) -> None:
        """Start from the log shares of the classes that each refit has."""
        with np.errstate(divide="ignore"):
            logs = np.where(self.share > 0.0, np.log(self.share), ABSENT)
        refits.b0[:] = logs
        refits.eta[:] = logs[:, :, None]

    def solve(
        self, refits: Refits, pending: NDArray[np.int64], rules: SolveRules
    ) -> None:
        """Solve the pending refits at their present penalty."""
        m = int(refits.state[pending, WORKING].max())
        k, n = refits.eta.shape[1:]
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
            np.empty((5, k, n)),
            np.empty((3, k)),
            np.empty((2, k, m + 1)),
            np.empty((3, m)),
            np.empty(m, np.int64),
            np.empty((DEPTH, (m + 1) * k)),
            np.ones(n),
        )
